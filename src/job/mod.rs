//! A whole job on one file: read, audit, condition, report, write. The program and a batch run the same functions.

mod chain;
mod comparison;
mod conditioning;
mod derivative;
mod edges;
mod examination;
mod intake;
mod integral;
mod origin;
mod split;
mod target;
mod work;

pub use comparison::compare;
pub use conditioning::{condition, plan};
pub use examination::audit;
pub use target::Target;

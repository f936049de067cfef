//! A whole job on one file: read, audit, condition, report, write. The program and a batch run the same functions.

mod comparison;
mod conditioning;
mod edges;
mod examination;
mod intake;
mod origin;
mod repairs;
mod target;
mod work;

pub use comparison::compare;
pub use conditioning::{condition, condition_parts, plan};
pub use examination::audit;
pub use target::Target;

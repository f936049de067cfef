//! A whole job on one file: read, audit, condition, report, write. The program and a batch run the same functions.

mod conditioning;
mod examination;
mod intake;
mod target;

pub use conditioning::{condition, plan};
pub use examination::audit;
pub use target::Target;

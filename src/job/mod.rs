//! A whole job on one file: read, audit, condition, report, write. The program and a batch run the same functions.

mod comparison;
mod conditioning;
mod edges;
mod examination;
mod intake;
mod origin;
mod picture;
mod preparation;
mod repairs;
mod running;
mod target;
mod work;

pub use comparison::compare;
pub use conditioning::{Audited, Bench, Prepared, condition, condition_parts, plan, prepare};
pub use examination::audit;
pub use target::{PageFiles, Target};

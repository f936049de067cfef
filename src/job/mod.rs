//! A whole job on one file: read, audit, condition, report, write. The program and a batch run the same functions.

mod archiving;
mod comparison;
mod conditioning;
mod edges;
mod examination;
mod intake;
mod origin;
mod picture;
mod preparation;
mod restoration;
mod running;
mod target;
mod work;

pub use archiving::compress;
pub use comparison::compare;
pub use conditioning::{Audited, Bench, Prepared, condition, plan, prepare};
pub use examination::{Examined, audit, examine};
pub use restoration::{Damage, restore};
pub use target::{PageFiles, Target};

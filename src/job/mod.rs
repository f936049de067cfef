//! A whole job on one file: read, audit, condition, report, write. The program and a batch run the same functions.

mod archiving;
mod bound;
mod chain;
mod comparison;
mod conditioning;
mod derivative;
mod edges;
mod examination;
mod intake;
mod integral;
mod judgement;
mod origin;
mod passage;
mod picture;
mod preparation;
mod requirement;
mod restoration;
mod running;
mod spectrum;
mod split;
mod target;
mod work;

pub use archiving::compress;
pub use comparison::compare;
pub use conditioning::{Audited, Bench, Prepared, condition, plan, prepare};
pub use examination::{Examined, audit, examine};
pub use restoration::{Damage, restore};
pub use spectrum::spectrum;
pub use target::{PageFiles, Target};

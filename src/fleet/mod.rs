//! Many records by one recipe: planned before any work, in parallel, resumable, in shards, merged.

mod attempt;
mod batch;
mod group;
mod line;
mod list;
mod manifest;
mod name;
mod plan;
mod recipe;
mod resume;
mod shard;

pub use batch::{Batch, End, Tally, run};
pub use list::{Item, Separator, read as read_list};
pub use manifest::read as read_manifest;
pub use name::Template;
pub use plan::{Plan, Planned, results_of};
pub use recipe::Recipe;
pub use shard::Shard;

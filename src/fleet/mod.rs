//! Many records by one recipe: planned before any work, in parallel, resumable, in shards, merged.

mod attempt;
mod batch;
mod gathering;
mod group;
mod line;
mod list;
mod manifest;
mod merge;
mod name;
mod overview;
mod plan;
mod recipe;
mod resume;
mod shard;
mod table;

pub use batch::{Batch, End, Tally, run};
pub use list::{Item, Separator, read as read_list};
pub use manifest::read as read_manifest;
pub use merge::{Order, Stale, merge};
pub use name::Template;
pub use overview::Overview;
pub use plan::{Plan, Planned, results_of};
pub use recipe::Recipe;
pub use shard::Shard;

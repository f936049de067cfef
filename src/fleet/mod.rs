//! Many records by one recipe: planned before any work, in parallel, resumable, in shards, merged.

mod agreement;
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
mod page;
mod plan;
mod ranking;
mod recipe;
mod resume;
mod shard;
mod summary;
mod table;

pub use batch::{Batch, End, Tally, run};
pub use list::{Item, Separator, read as read_list};
pub use manifest::read as read_manifest;
pub use merge::{Order, Stale, files_of, merge};
pub use name::Template;
pub use overview::Overview;
pub use page::overview_page;
pub use plan::{Plan, Planned, results_of};
pub use ranking::Ranked;
pub use recipe::Recipe;
pub use shard::Shard;
pub use summary::{EdgeErrors, FailureGroup, Summary};

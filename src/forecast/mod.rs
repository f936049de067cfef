//! The record continued past both ends by what its own past says, and how far that can be trusted.

mod combination;
mod evidence;
pub mod member;
mod response;
mod variance;

pub use combination::Forecast;
pub use evidence::{Evidence, LONGEST_HISTORY};
pub use response::{Response, Shape};

//! The record continued past both ends by what its own past says, and how far that can be trusted.

mod response;

pub use response::{Response, Shape};

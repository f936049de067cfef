//! Conditions finite records (accelerometer logs, measured profiles) with the assumption at their two ends made explicit.
//!
//! The order of the modules below is the order of the data and of permitted imports.

pub mod place;
pub mod error;
pub mod unit;
pub mod numeric;
pub mod record;
pub mod ends;
pub mod baseline;
pub mod forecast;
pub mod metric;
pub mod verdict;

//! Conditions finite records (accelerometer logs, measured profiles) with the assumption at their two ends made explicit.
//!
//! The order of the modules below is the order of the data and of permitted imports.

pub mod place;
pub mod error;
pub mod unit;
pub mod numeric;
pub mod record;
pub mod read;
pub mod audit;
pub mod regularise;
pub mod ends;
pub mod baseline;
pub mod basis;
pub mod operator;
pub mod forecast;
pub mod condition;
pub mod metric;
pub mod verdict;
pub mod settings;
pub mod report;
pub mod write;
pub mod job;

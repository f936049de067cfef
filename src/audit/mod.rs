//! What is in a record and whether it is fit for use.

pub mod stamps;

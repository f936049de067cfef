//! What can be measured about a record's ends, as explanation and veto.

pub mod join;

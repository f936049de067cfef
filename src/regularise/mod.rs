//! From a record as read to one of uniform, finite samples.

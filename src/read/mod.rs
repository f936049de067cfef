//! Reads records from files and pipes.

pub mod wav;

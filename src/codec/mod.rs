//! Archives of records with an error that is guaranteed.
mod block;
mod bytes;
pub mod cast;
mod coder;
mod cosine;
pub mod goal;
mod predictor;
pub mod search;
mod stepwise;

//! Turns integers into as few bytes as their own past allows: adaptive models, mixed, behind one range coder.

mod integers;
mod mixing;
mod range;
mod scale;

pub use integers::{Hint, Integers};
pub use range::{Binary, Decoder, Encoder, Meter};

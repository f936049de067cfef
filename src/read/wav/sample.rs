//! Stored samples as numbers: integers as a fraction of full scale, floats as they are.

use super::chunk::{Order, cell};
use super::format::WaveFormat;
use crate::record::SampleType;

/// Appends the samples of channel `index` in `block`, which holds whole frames.
///
/// Integers of up to 8 bits are offset binary, (x - 128) / 128; all others two's complement, left-aligned in their
/// container, so that dividing by half the container's range is dividing by 2^(bits - 1) (IBM and Microsoft, "Multimedia
/// Programming Interface and Data Specifications 1.0", 1991; same rule in WAVEFORMATEXTENSIBLE).
pub(super) fn append(format: &WaveFormat, index: usize, block: &[u8], out: &mut Vec<f64>) {
    let (frame, at) = (format.frame(), index * format.container);
    let little = format.order == Order::Little;
    match (format.sample_type, format.container) {
        (SampleType::Float(_), 4) if little => push(block, frame, at, out, |c| f64::from(f32::from_le_bytes(c))),
        (SampleType::Float(_), 4) => push(block, frame, at, out, |c| f64::from(f32::from_be_bytes(c))),
        (SampleType::Float(_), _) if little => push(block, frame, at, out, f64::from_le_bytes),
        (SampleType::Float(_), _) => push(block, frame, at, out, f64::from_be_bytes),
        (SampleType::Integer(_), 1) => push(block, frame, at, out, |[x]| (f64::from(x) - 128.0) / 128.0),
        (SampleType::Integer(_), 2) if little => {
            push(block, frame, at, out, |c| f64::from(i16::from_le_bytes(c)) / P15)
        }
        (SampleType::Integer(_), 2) => push(block, frame, at, out, |c| f64::from(i16::from_be_bytes(c)) / P15),
        (SampleType::Integer(_), 3) if little => {
            push(block, frame, at, out, |[a, b, c]| f64::from(i32::from_le_bytes([0, a, b, c])) / P31);
        }
        (SampleType::Integer(_), 3) => {
            push(block, frame, at, out, |[a, b, c]| f64::from(i32::from_be_bytes([a, b, c, 0])) / P31);
        }
        (SampleType::Integer(_), 4) if little => {
            push(block, frame, at, out, |c| f64::from(i32::from_le_bytes(c)) / P31)
        }
        (SampleType::Integer(_), 4) => push(block, frame, at, out, |c| f64::from(i32::from_be_bytes(c)) / P31),
        (SampleType::Integer(_), 5) => push(block, frame, at, out, |c: [u8; 5]| wide(&c, little)),
        (SampleType::Integer(_), 6) => push(block, frame, at, out, |c: [u8; 6]| wide(&c, little)),
        (SampleType::Integer(_), 7) => push(block, frame, at, out, |c: [u8; 7]| wide(&c, little)),
        (SampleType::Integer(_), _) => push(block, frame, at, out, |c: [u8; 8]| wide(&c, little)),
    }
}

/// How valid bits sit in a wider container, as the values show.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Seat {
    /// In the upper bits, the rest zero: what the format prescribes.
    Left,
    /// In the lower bits, against the format.
    Right,
    /// All bits of the container are used.
    Full,
}

/// Where `bits` valid bits sit in a container of `container` bytes, judged over all channels.
///
/// Containers of more than four bytes are taken as the format prescribes.
pub(super) fn seat<'a>(channels: impl Iterator<Item = &'a [f64]>, bits: u16, container: usize) -> Seat {
    let spare = 8 * container as u32 - u32::from(bits);
    if spare == 0 || !(2..=4).contains(&container) {
        return Seat::Left;
    }
    let half = half_range(container);
    let (mut left, mut right) = (true, true);
    for &value in channels.flatten() {
        let stored = (value * half) as i64;
        left &= stored & ((1 << spare) - 1) == 0;
        // Both forms are met: sign-extended, and the upper bits left zero.
        right &= stored >> bits == 0 || stored >> (bits - 1) == -1;
        if !left && !right {
            return Seat::Full;
        }
    }
    if left { Seat::Left } else { Seat::Right }
}

/// Turns values read as left-aligned into what they are when the valid bits sit in the lower bits.
pub(super) fn from_right(values: &mut [f64], bits: u16, container: usize) {
    let (half, unused) = (half_range(container), 64 - u32::from(bits));
    for value in values {
        let extended = ((*value * half) as i64) << unused >> unused;
        *value = extended as f64 / (1_i64 << (bits - 1)) as f64;
    }
}

const P15: f64 = 32_768.0;
const P31: f64 = 2_147_483_648.0;

/// 2^(8 x container - 1), for containers of up to four bytes.
fn half_range(container: usize) -> f64 {
    (1_u64 << (8 * container - 1)) as f64
}

/// A number of 5 to 8 bytes as a fraction of full scale, rounded to the 53 bits of a double.
fn wide(bytes: &[u8], little: bool) -> f64 {
    let mut whole = [0; 8];
    let number = if little {
        whole[8 - bytes.len()..].copy_from_slice(bytes);
        i64::from_le_bytes(whole)
    } else {
        whole[..bytes.len()].copy_from_slice(bytes);
        i64::from_be_bytes(whole)
    };
    number as f64 / 9_223_372_036_854_775_808.0
}

#[inline(always)]
fn push<const N: usize>(block: &[u8], frame: usize, at: usize, out: &mut Vec<f64>, number: impl Fn([u8; N]) -> f64) {
    if frame == N {
        out.extend(block.as_chunks::<N>().0.iter().map(|&bytes| number(bytes)));
    } else {
        out.extend(block.chunks_exact(frame).map(|row| number(cell(row, at))));
    }
}

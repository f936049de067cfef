//! The header of a WAV file whose length is known beforehand: RIFF, or RF64 past 4 GiB.

use serde::{Deserialize, Serialize};

/// How one sample is stored in a WAV file.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum WaveEncoding {
    /// 16-bit integers.
    Pcm16,
    /// 24-bit integers, packed in three bytes.
    Pcm24,
    /// 32-bit integers.
    Pcm32,
    /// 32-bit IEEE floats.
    #[default]
    Float32,
    /// 64-bit IEEE floats.
    Float64,
}

/// The encodings and their names on the command line.
pub static WAVE_ENCODINGS: &[(&str, WaveEncoding)] = &[
    ("pcm16", WaveEncoding::Pcm16),
    ("pcm24", WaveEncoding::Pcm24),
    ("pcm32", WaveEncoding::Pcm32),
    ("float32", WaveEncoding::Float32),
    ("float64", WaveEncoding::Float64),
];

impl WaveEncoding {
    /// Bytes of one sample.
    pub fn bytes(self) -> usize {
        match self {
            WaveEncoding::Pcm16 => 2,
            WaveEncoding::Pcm24 => 3,
            WaveEncoding::Pcm32 | WaveEncoding::Float32 => 4,
            WaveEncoding::Float64 => 8,
        }
    }

    /// True for IEEE floats.
    pub fn is_float(self) -> bool {
        matches!(self, WaveEncoding::Float32 | WaveEncoding::Float64)
    }

    /// Name on the command line.
    pub fn name(self) -> &'static str {
        WAVE_ENCODINGS.iter().find(|(_, encoding)| *encoding == self).map_or("", |(name, _)| name)
    }
}

/// The bytes before the first sample, for `frames` frames of `channels` channels.
///
/// Up to two channels of 16-bit integers or floats get the plain header; everything else the extensible one, as its
/// definition demands (Microsoft, "Multiple channel audio data and WAVE files", 2001), without loudspeaker positions. Past
/// 4 GiB the sizes move into a `ds64` chunk (EBU Tech 3306).
pub(super) fn header(frames: u64, channels: u16, rate_hz: u32, encoding: WaveEncoding) -> Vec<u8> {
    let align = channels * encoding.bytes() as u16;
    let data = frames.saturating_mul(u64::from(align));
    let float = encoding.is_float();
    let extensible = channels > 2 || !(float || encoding == WaveEncoding::Pcm16);
    let tag: u16 = if float { 3 } else { 1 };
    let bits = 8 * encoding.bytes() as u16;

    let mut format = Vec::new();
    put16(&mut format, if extensible { 0xfffe } else { tag });
    put16(&mut format, channels);
    put32(&mut format, rate_hz);
    put32(&mut format, rate_hz.saturating_mul(u32::from(align)));
    put16(&mut format, align);
    put16(&mut format, bits);
    if extensible {
        put16(&mut format, 22);
        put16(&mut format, bits);
        put32(&mut format, 0);
        put16(&mut format, tag);
        format.extend_from_slice(&[0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71]);
    } else if float {
        put16(&mut format, 0);
    }

    // "WAVE", the chunk heads, their contents, the pad byte; `fact` is due for everything but integer PCM.
    let fact = if float { 12 } else { 0 };
    let small = 4 + 8 + format.len() as u64 + fact + 8 + data.saturating_add(data % 2);
    let large = u32::try_from(small).is_err();
    let mut out = Vec::new();
    out.extend_from_slice(if large { b"RF64" } else { b"RIFF" });
    put32(&mut out, if large { u32::MAX } else { small as u32 });
    out.extend_from_slice(b"WAVE");
    if large {
        out.extend_from_slice(b"ds64");
        put32(&mut out, 28);
        for size in [small.saturating_add(36), data, frames] {
            out.extend_from_slice(&size.to_le_bytes());
        }
        put32(&mut out, 0);
    }
    out.extend_from_slice(b"fmt ");
    put32(&mut out, format.len() as u32);
    out.extend_from_slice(&format);
    if float {
        out.extend_from_slice(b"fact");
        put32(&mut out, 4);
        put32(&mut out, u32::try_from(frames).unwrap_or(u32::MAX));
    }
    out.extend_from_slice(b"data");
    put32(&mut out, if large { u32::MAX } else { data as u32 });
    out
}

fn put16(out: &mut Vec<u8>, value: u16) {
    out.extend_from_slice(&value.to_le_bytes());
}

fn put32(out: &mut Vec<u8>, value: u32) {
    out.extend_from_slice(&value.to_le_bytes());
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sizes_past_four_gibibytes_move_into_ds64() {
        // EBU Tech 3306, section 3: RF64, -1, WAVE, ds64 with RIFF size, data size, sample count; data size -1.
        let frames = 1 << 30;
        let bytes = header(frames, 1, 1000, WaveEncoding::Float64);
        assert_eq!(&bytes[..20], b"RF64\xff\xff\xff\xffWAVEds64\x1c\0\0\0");
        let word = |at: usize| u64::from_le_bytes(bytes[at..at + 8].try_into().unwrap());
        assert_eq!((word(20), word(28), word(36)), (bytes.len() as u64 - 8 + 8 * frames, 8 * frames, frames));
        assert_eq!(&bytes[bytes.len() - 8..], b"data\xff\xff\xff\xff");
    }

    #[test]
    fn the_largest_plain_file_stays_plain() {
        // A PCM header of 44 bytes: its RIFF size is 36 more than the data, and 2^32 - 1 is the largest word.
        let most = (u64::from(u32::MAX) - 36) / 2;
        assert_eq!(&header(most, 1, 1000, WaveEncoding::Pcm16)[..4], b"RIFF");
        assert_eq!(&header(most + 1, 1, 1000, WaveEncoding::Pcm16)[..4], b"RF64");
    }
}

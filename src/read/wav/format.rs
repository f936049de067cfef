//! The `fmt ` chunk: how many channels, how fast, and how one sample is stored.

use super::chunk::{Chunk, Order, Stream, cell};
use crate::error::{Error, Finding, Result};
use crate::record::SampleType;

/// What the `fmt ` chunk says, checked.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct WaveFormat {
    pub order: Order,
    pub channels: usize,
    pub rate_hz: u32,
    pub sample_type: SampleType,
    /// Bytes that hold one sample of one channel.
    pub container: usize,
    /// True where the container was taken from the block align of a plain header: the data must then bear it out.
    pub container_guessed: bool,
}

impl WaveFormat {
    /// Bytes of one frame: a sample of every channel.
    pub(super) fn frame(&self) -> usize {
        self.channels * self.container
    }
}

/// Content bytes of the longest `fmt ` chunk known (WAVEFORMATEXTENSIBLE).
const LONGEST: usize = 40;
const PCM: u16 = 1;
const FLOAT: u16 = 3;
const EXTENSIBLE: u16 = 0xfffe;

/// Bytes 4 to 15 of the sub-format identifiers that are made of a format tag, `xxxxxxxx-0000-0010-8000-00aa00389b71`, in
/// little-endian and in big-endian files (Microsoft, "Multiple channel audio data and WAVE files", 2001).
const TAGGED: [[u8; 12]; 2] =
    [[0, 0, 0x10, 0, 0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71], [0, 0, 0, 0x10, 0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71]];

/// Coded formats met in the field, by tag (RFC 2361, "WAVE and AVI Codec Registries", 1998).
#[rustfmt::skip]
const CODED: &[(u16, &str)] = &[
    (0x0002, "Microsoft ADPCM"), (0x0006, "A-law"), (0x0007, "mu-law"), (0x0010, "OKI ADPCM"), (0x0011, "IMA ADPCM"),
    (0x0014, "G.723 ADPCM"), (0x0031, "GSM 6.10"), (0x0040, "G.721 ADPCM"), (0x0050, "MPEG"), (0x0055, "MPEG layer 3"),
];

/// Reads the content of a `fmt ` chunk.
///
/// # Errors
/// `Malformed` for a chunk cut short, a coded format, no channels, or bits that make no sample.
pub(super) fn read(
    stream: &mut Stream<'_>,
    chunk: &Chunk,
    order: Order,
    findings: &mut Vec<Finding>,
) -> Result<WaveFormat> {
    let mut content = [0; LONGEST];
    let stated = usize::try_from(chunk.size).unwrap_or(usize::MAX);
    let want = stated.min(LONGEST);
    let got = stream.fill(&mut content[..want])?;
    stream.skip(u64::from(chunk.size) - want as u64)?;
    parse(&content[..got], order, findings).map_err(|error| error.at(chunk.place()))
}

fn parse(content: &[u8], order: Order, findings: &mut Vec<Finding>) -> Result<WaveFormat> {
    if content.len() < 16 {
        return Err(Error::malformed(format!("a format chunk of {} bytes, 16 are the least", content.len())));
    }
    let outer = order.u16(content, 0);
    let channels = usize::from(order.u16(content, 2));
    let block_align = usize::from(order.u16(content, 12));
    let stored_bits = order.u16(content, 14);
    let (tag, bits) =
        if outer == EXTENSIBLE { extension(content, order, stored_bits, findings)? } else { (outer, stored_bits) };
    if channels == 0 {
        return Err(Error::malformed("the header states 0 channels"));
    }
    let mut container = usize::from(stored_bits.div_ceil(8));
    let sample_type = match tag {
        PCM if bits == 0 || stored_bits > 64 => {
            return Err(Error::malformed(format!("integer samples of {stored_bits} bits; 1 to 64 are read")));
        }
        PCM => SampleType::Integer(bits),
        FLOAT if !matches!(stored_bits, 32 | 64) => {
            return Err(Error::malformed(format!("float samples of {stored_bits} bits; 32 and 64 are read")));
        }
        FLOAT => SampleType::Float(stored_bits),
        tag => return Err(coded(tag)),
    };
    // Plain headers with 17 to 24 bits in four bytes are met in the field: the header's only trace of it is the block align.
    let container_guessed = outer == PCM && container == 3 && block_align == channels * 4;
    if container_guessed {
        container = 4;
    } else if block_align != channels * container {
        let text = format!(
            "the header states frames of {block_align} bytes; {channels} channels x {container} bytes = {} were used",
            channels * container
        );
        findings.push(Finding::new("block_align", text));
    }
    let (rate_hz, bytes_a_second) = (order.u32(content, 4), order.u32(content, 8));
    // The one other trace of the rate in the file. 0 is what some writers leave there.
    let fits = [block_align, channels * container].map(|frame| u64::from(rate_hz) * frame as u64);
    if bytes_a_second != 0 && !fits.contains(&u64::from(bytes_a_second)) {
        let text = format!(
            "the header states {bytes_a_second} bytes a second, but {rate_hz} Hz makes that {}: one of them is wrong",
            fits[1]
        );
        findings.push(Finding::new("byte_rate", text));
    }
    Ok(WaveFormat { order, channels, rate_hz, sample_type, container, container_guessed })
}

/// Format tag and valid bits of a WAVEFORMATEXTENSIBLE header.
fn extension(content: &[u8], order: Order, stored_bits: u16, findings: &mut Vec<Finding>) -> Result<(u16, u16)> {
    if content.len() < LONGEST {
        return Err(Error::malformed(format!(
            "an extensible format chunk of {} bytes, {LONGEST} are the least",
            content.len()
        )));
    }
    let tag = order.u32(content, 24);
    let rest = cell::<12>(content, 28);
    let (Ok(tag), true) = (u16::try_from(tag), TAGGED.contains(&rest)) else {
        let digits: String = content[24..LONGEST].iter().map(|byte| format!("{byte:02x}")).collect();
        return Err(Error::malformed(format!("sub-format {digits} is not read; integer PCM and IEEE float are")));
    };
    let valid = order.u16(content, 18);
    if valid > stored_bits {
        return Err(Error::malformed(format!("{valid} valid bits in samples of {stored_bits} bits")));
    }
    if valid == 0 {
        let text = format!("the header states 0 valid bits; all {stored_bits} bits of a sample were used");
        findings.push(Finding::new("valid_bits", text));
        return Ok((tag, stored_bits));
    }
    Ok((tag, valid))
}

fn coded(tag: u16) -> Error {
    let name = CODED.iter().find(|(known, _)| *known == tag).map_or("unknown", |(_, name)| name);
    Error::malformed(format!("format tag 0x{tag:04x} ({name}) is not read; integer PCM and IEEE float are"))
        .remedy("convert the file to PCM first")
}

//! The `data` chunk: interleaved frames, block by block into one vector a channel.

use rayon::prelude::*;

use super::Options;
use super::chunk::{Chunk, Stream};
use super::format::WaveFormat;
use super::sample::{self, Seat};
use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::read::refuse_beyond;
use crate::record::{RawChannel, SampleType};
use crate::unit::Unit;

/// How far the chunk reaches by its header.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Extent {
    /// That many bytes.
    Stated(u64),
    /// Not known when it was written: to the end of the file.
    Open,
}

/// How the chunk ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Ending {
    AsStated,
    Streamed,
    Truncated,
}

/// The samples, and how the chunk ended.
pub(super) struct Data {
    pub channels: Vec<RawChannel>,
    /// Bytes of content that were there.
    pub bytes: u64,
    pub ending: Ending,
}

/// Bytes read at a time: what the second-level cache holds while each channel is picked from it.
const BLOCK_BYTES: usize = 1 << 20;

/// Reads the content of the data chunk.
///
/// # Errors
/// `Malformed` for a chunk cut short, less than one frame, a float that is not finite; `Usage` for an unknown channel;
/// `Unsupported` for an empty chunk.
pub(super) fn read(
    stream: &mut Stream<'_>,
    chunk: &Chunk,
    format: &WaveFormat,
    extent: Extent,
    options: &Options<'_>,
    findings: &mut Vec<Finding>,
) -> Result<Data> {
    let start = stream.position();
    let at_chunk = |error: Error| error.at(chunk.place());
    let mut kept = selection(format.channels, options).map_err(at_chunk)?;
    if let Extent::Stated(stated) = extent {
        let samples = (stated / format.frame() as u64).saturating_mul(kept.len() as u64);
        refuse_beyond(options.memory, samples.saturating_mul(8), "the record alone").map_err(at_chunk)?;
    }
    let bytes = decode(stream, format, extent, &mut kept)?;
    let place = Place::byte(start + bytes, Some("data"));
    let ending = match extent {
        Extent::Open => {
            let text = format!("the size of the data was left open; read to the end of the file, {bytes} bytes");
            findings.push(Finding::new("streamed", text).at(chunk.place()));
            Ending::Streamed
        }
        Extent::Stated(stated) if stated == bytes => Ending::AsStated,
        Extent::Stated(stated) => {
            let text = format!("the file is cut short: the header states {stated} bytes of data, {bytes} are there");
            if !options.allow_truncated {
                let remedy = "take what is there with --allow-truncated";
                return Err(Error::malformed(text).at(place).remedy(remedy));
            }
            findings.push(Finding::new("truncated", text).at(place.clone()));
            Ending::Truncated
        }
    };
    let frame = format.frame() as u64;
    if bytes < frame {
        return Err(at_chunk(match bytes {
            0 => Error::unsupported("the data chunk holds no samples"),
            _ => Error::malformed(format!("a sample of every channel takes {frame} bytes, the data chunk has {bytes}")),
        }));
    }
    if let rest @ 1.. = bytes % frame {
        let text = format!("the last {rest} bytes are part of a frame of {frame} bytes; dropped");
        findings.push(Finding::new("partial_frame", text).at(place));
    }
    reject_not_finite(&kept, start, format).map_err(at_chunk)?;
    settle_bits(&mut kept, format, findings).map_err(at_chunk)?;
    Ok(Data { channels: kept.into_iter().map(|column| column.channel(format)).collect(), bytes, ending })
}

/// A channel being filled.
struct Column {
    index: usize,
    values: Vec<f64>,
    /// First sample that is not finite, and how many there are.
    faults: Option<(usize, usize)>,
}

impl Column {
    fn take(&mut self, format: &WaveFormat, block: &[u8]) {
        let before = self.values.len();
        sample::append(format, self.index, block, &mut self.values);
        if matches!(format.sample_type, SampleType::Float(_)) {
            let count = self.values[before..].iter().filter(|v| !v.is_finite()).count();
            if count > 0 {
                let first = before + self.values[before..].iter().position(|v| !v.is_finite()).unwrap_or(0);
                let (first, earlier) = self.faults.unwrap_or((first, 0));
                self.faults = Some((first, earlier + count));
            }
        }
    }

    fn channel(mut self, format: &WaveFormat) -> RawChannel {
        self.values.shrink_to_fit();
        RawChannel {
            name: name(self.index),
            unit: Unit::full_scale(),
            values: self.values,
            missing: Vec::new(),
            missing_spelling: None,
            full_scale: matches!(format.sample_type, SampleType::Integer(_)).then_some(1.0),
        }
    }
}

fn name(index: usize) -> String {
    format!("ch{}", index + 1)
}

/// Reads whole frames into the columns and returns the bytes that were there, a partial last frame included.
fn decode(stream: &mut Stream<'_>, format: &WaveFormat, extent: Extent, columns: &mut [Column]) -> Result<u64> {
    let frame = format.frame();
    let size = (BLOCK_BYTES / frame).max(1) * frame;
    let mut block = vec![0; size];
    let mut bytes = 0_u64;
    loop {
        let want = match extent {
            Extent::Open => size,
            Extent::Stated(stated) => usize::try_from(stated - bytes).unwrap_or(usize::MAX).min(size),
        };
        let got = stream.fill(&mut block[..want])?;
        bytes += got as u64;
        let frames = &block[..got - got % frame];
        // Blocks of a small file are not worth the hand-over to another thread.
        if frames.len() < BLOCK_BYTES / 2 {
            columns.iter_mut().for_each(|column| column.take(format, frames));
        } else {
            columns.par_iter_mut().for_each(|column| column.take(format, frames));
        }
        if got < want || got == 0 {
            return Ok(bytes);
        }
    }
}

/// The channels to keep, in file order.
fn selection(channels: usize, options: &Options<'_>) -> Result<Vec<Column>> {
    let mut kept = vec![options.channels.is_none(); channels];
    for wanted in options.channels.unwrap_or_default() {
        let digits = wanted.strip_prefix("ch").or_else(|| wanted.strip_prefix('#'));
        let number = digits.and_then(|digits| digits.parse::<usize>().ok());
        match number.filter(|n| (1..=channels).contains(n) && digits == Some(&n.to_string())) {
            Some(n) => kept[n - 1] = true,
            None => {
                let remedy =
                    if channels == 1 { "it has ch1".to_owned() } else { format!("it has ch1 to ch{channels}") };
                return Err(Error::usage(format!("the file has no channel {wanted:?}")).remedy(remedy));
            }
        }
    }
    let column = |index| Column { index, values: Vec::new(), faults: None };
    Ok((0..channels).filter(|&index| kept[index]).map(column).collect())
}

fn reject_not_finite(columns: &[Column], start: u64, format: &WaveFormat) -> Result<()> {
    let faulty = columns.iter().filter_map(|column| column.faults.map(|(first, _)| (first, column)));
    let Some((first, column)) = faulty.min_by_key(|(first, column)| (*first, column.index)) else { return Ok(()) };
    let count: usize = columns.iter().filter_map(|column| column.faults).map(|(_, count)| count).sum();
    let value = column.values.get(first).copied().unwrap_or(f64::NAN);
    let others = if count > 1 { format!(" ({count} of them in the file)") } else { String::new() };
    let place = Place {
        channel: Some(name(column.index)),
        sample: Some(first as u64),
        ..Place::byte(start + first as u64 * format.frame() as u64 + (column.index * format.container) as u64, None)
    };
    Err(Error::malformed(format!("not a finite number: {value}{others}"))
        .at(place)
        .remedy("keep the other channels with --channel"))
}

/// Settles where the valid bits sit in a wider container, and says what the numbers lose or assume.
fn settle_bits(columns: &mut [Column], format: &WaveFormat, findings: &mut Vec<Finding>) -> Result<()> {
    let SampleType::Integer(bits) = format.sample_type else { return Ok(()) };
    let container = format.container;
    let seat = sample::seat(columns.iter().map(|column| column.values.as_slice()), bits, container);
    match seat {
        Seat::Left => {}
        Seat::Full if format.container_guessed => {
            let text = format!("neither {bits} bits in 3 bytes nor in 4: header and data contradict each other");
            return Err(Error::malformed(text));
        }
        Seat::Full => {
            let text = format!("the header states {bits} valid bits, the data use all {} bits", 8 * container);
            findings.push(Finding::new("valid_bits", text));
        }
        Seat::Right => {
            columns.iter_mut().for_each(|column| sample::from_right(&mut column.values, bits, container));
            let text =
                format!("{bits} valid bits sit in the lower bits of {container} bytes, against the format; read so");
            findings.push(Finding::new("right_aligned", text));
        }
    }
    if format.container_guessed {
        let text =
            format!("the header states {bits} bits in frames of {} bytes; read as 4 bytes a sample", format.frame());
        findings.push(Finding::new("container", text));
    }
    if bits > 54 {
        findings
            .push(Finding::new("rounded", format!("samples of {bits} bits are rounded to the 53 bits of a double")));
    }
    Ok(())
}

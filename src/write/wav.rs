//! Writes WAV files of integers or IEEE floats; nothing is ever clipped.

use std::io::Write;

use rayon::prelude::*;

use super::blocks::pump;
use super::wave_header::{WaveEncoding, header};
use super::{Content, Writer};
use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::record::{Axis, Channel, Format};

/// RIFF WAVE.
pub(super) const WRITER: Writer = Writer {
    format: Format::Wav,
    name: "wav",
    extensions: &["wav", "wave"],
    about: "WAV, 32-bit floats unless --encoding says otherwise",
    check,
    write,
};

fn check(content: &Content<'_>) -> Result<Vec<Finding>> {
    let record = content.record;
    rate_hz(record.axis())?;
    channel_count(content)?;
    if !content.extra.is_empty() || content.shown.is_some() {
        return Err(Error::unsupported("a WAV file has no room for extra columns or blank cells")
            .remedy("write text with --format csv"));
    }
    let channels: Vec<Channel<'_>> = record.channels().collect();
    let faults: Vec<Option<Error>> =
        channels.par_iter().map(|channel| check_range(channel, content.encoding).err()).collect();
    if let Some(error) = faults.into_iter().flatten().next() {
        return Err(error);
    }
    let mut findings = Vec::new();
    if record.axis().start() != 0.0 {
        let text = format!("a WAV file keeps no start; {} {} is lost", record.axis().start(), record.axis().unit());
        findings.push(Finding::new("wav_start", text));
    }
    for channel in channels.iter().filter(|channel| !channel.unit.is_unknown() && channel.unit.label() != "FS") {
        let text = format!("a WAV file keeps no unit; its numbers are in {}", channel.unit);
        findings.push(Finding::new("wav_unit", text).at(Place::channel(channel.name)));
    }
    Ok(findings)
}

fn write(content: &Content<'_>, sink: &mut (dyn Write + Send)) -> Result<()> {
    check(content)?;
    let record = content.record;
    let (len, encoding) = (record.len(), content.encoding);
    let count = channel_count(content)?;
    sink.write_all(&header(len as u64, count, rate_hz(record.axis())?, encoding))?;
    let channels: Vec<&[f64]> = record.channels().map(|channel| channel.samples).collect();
    let frame = channels.len() * encoding.bytes();
    let rows = (JOB_BYTES / frame).max(1);
    let mut next = 0;
    let batch = || {
        let starts: Vec<usize> = (next..len).step_by(rows).take(BATCH).collect();
        next = starts.last().map_or(len, |last| last + rows);
        Ok((!starts.is_empty()).then_some(starts))
    };
    pump(sink, batch, |&start, out| {
        let end = len.min(start + rows);
        out.resize((end - start) * frame, 0);
        for (index, samples) in channels.iter().enumerate() {
            store(&samples[start..end], encoding, frame, index * encoding.bytes(), out);
        }
        Ok(())
    })?;
    if (len as u64 * frame as u64) % 2 == 1 {
        sink.write_all(&[0])?;
    }
    Ok(sink.flush()?)
}

/// Bytes that one worker makes at a time, and the number of such blocks in flight.
const JOB_BYTES: usize = 256 << 10;
const BATCH: usize = 16;

/// Puts samples into every `frame`-th place of `out`, from `at` on. Integers are x times 2^(bits - 1), rounded to the
/// nearest, halves to even; no dither.
fn store(samples: &[f64], encoding: WaveEncoding, frame: usize, at: usize, out: &mut [u8]) {
    match encoding {
        WaveEncoding::Pcm16 => put(samples, frame, at, out, |v| (integer(v, 16) as i16).to_le_bytes()),
        WaveEncoding::Pcm24 => put(samples, frame, at, out, |v| {
            let [a, b, c, _] = (integer(v, 24) as i32).to_le_bytes();
            [a, b, c]
        }),
        WaveEncoding::Pcm32 => put(samples, frame, at, out, |v| (integer(v, 32) as i32).to_le_bytes()),
        WaveEncoding::Float32 => put(samples, frame, at, out, |v| (v as f32).to_le_bytes()),
        WaveEncoding::Float64 => put(samples, frame, at, out, f64::to_le_bytes),
    }
}

#[inline(always)]
fn put<const N: usize>(samples: &[f64], frame: usize, at: usize, out: &mut [u8], bytes: impl Fn(f64) -> [u8; N]) {
    for (row, &value) in out.chunks_exact_mut(frame).zip(samples) {
        if let Some(cell) = row.get_mut(at..at + N) {
            cell.copy_from_slice(&bytes(value));
        }
    }
}

fn integer(value: f64, bits: u32) -> f64 {
    (value * (1_u64 << (bits - 1)) as f64).round_ties_even()
}

fn check_range(channel: &Channel<'_>, encoding: WaveEncoding) -> Result<()> {
    let beyond = |v: f64| match encoding {
        WaveEncoding::Float32 => !(v as f32).is_finite(),
        WaveEncoding::Float64 => false,
        integers => {
            let bits = 8 * integers.bytes() as u32;
            let half = (1_u64 << (bits - 1)) as f64;
            !(-half..half).contains(&integer(v, bits))
        }
    };
    let Some(first) = channel.samples.iter().position(|&v| beyond(v)) else { return Ok(()) };
    let peak = channel.samples.iter().fold(0.0, |peak: f64, v| peak.max(v.abs()));
    let place = Place { sample: Some(first as u64), ..Place::channel(channel.name) };
    let (limit, remedy) = if encoding.is_float() {
        ("the range of a 32-bit float".to_owned(), "write --encoding float64")
    } else {
        (
            format!("full scale of {}", encoding.name()),
            "write --encoding float32, or scale the channel with --calibrate",
        )
    };
    let text = format!("{} is beyond {limit}; the peak is {peak}", channel.samples[first]);
    Err(Error::unsupported(text).at(place).remedy(remedy))
}

fn channel_count(content: &Content<'_>) -> Result<u16> {
    let count = content.record.channel_count();
    let most = usize::from(u16::MAX) / content.encoding.bytes();
    match u16::try_from(count) {
        Ok(fits) if count <= most => Ok(fits),
        _ => {
            let text = format!("a WAV file holds {most} channels of {}, not {count}", content.encoding.name());
            Err(Error::unsupported(text).remedy("choose channels with --channel, or write text with --format csv"))
        }
    }
}

/// The rate as the header's whole number.
fn rate_hz(axis: &Axis) -> Result<u32> {
    if !axis.is_time() {
        return Err(Error::unsupported(format!("a WAV file has a time axis, the record one in {}", axis.unit()))
            .remedy("write text with --format csv"));
    }
    let (rate, whole) = (axis.rate_base(), axis.rate_base().round());
    // Two roundings lie between a rate and the reciprocal of its step; 1e-12 is a sample in 10^12.
    if (rate - whole).abs() <= 1e-12 * rate && (1.0..=f64::from(u32::MAX)).contains(&whole) {
        return Ok(whole as u32);
    }
    Err(Error::unsupported(format!("a WAV file states a whole number of Hz up to 2^32 - 1, the rate is {rate} Hz"))
        .remedy("bring it to a whole rate with --resample, or write text with --format csv"))
}

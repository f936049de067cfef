//! Reads WAV files: integers of 1 to 64 bits and IEEE floats, plain and extensible headers, RIFF, RIFX and RF64.

mod chunk;
mod data;
mod format;
mod sample;

use std::io::Read;

use crate::error::{Error, Finding, Result};
use crate::place::{Place, escape};
use crate::record::{Format, Layout, RawRecord, Source, StatedRate, WaveLayout};
use crate::unit::Unit;
use chunk::{Chunk, Order, Pad, Stream};
use format::WaveFormat;

/// What the caller wants of a WAV file.
#[derive(Debug, Clone, Copy, Default)]
pub struct Options<'a> {
    /// Take what is there of a file that is cut short.
    pub allow_truncated: bool,
    /// Channels to keep, by name (`ch1`, `ch2`, ...) or number (`#1`); all of them where `None`. They come in file order.
    pub channels: Option<&'a [String]>,
    /// A rate given by the user: a header that states 0 Hz is then no error.
    pub rate_hz: Option<f64>,
    /// Most bytes of memory that the samples may take.
    pub memory: Option<u64>,
}

/// True when the first bytes are those of a RIFF, RIFX, RF64 or BW64 file, or the name says `.wav`.
pub fn is_wave(first: &[u8], extension: &str) -> bool {
    [b"RIFF", b"RIFX", b"RF64", b"BW64"].iter().any(|magic| first.starts_with(*magic)) || extension == "wav"
}

/// Reads a WAV file to its last byte, in one pass. Values are fractions of full scale (unit `FS`), channels are called
/// `ch1`, `ch2`, ...; `source.sha256` is left empty.
///
/// # Errors
/// `Malformed` with byte and chunk where the file is not a WAV file, is coded, is cut short, or holds a number that is not
/// finite; `Usage` for a channel that the file does not have; `Unsupported` for a file without samples; `Io` where the
/// stream fails.
pub fn read(stream: &mut dyn Read, name: &str, options: &Options<'_>) -> Result<RawRecord> {
    let mut walk = Walk { stream: Stream::new(stream), large: None, findings: Vec::new(), order: Order::Little };
    let file = Place::file(name);
    let mut record = walk.record(options).map_err(|error| error.at(file.clone()))?;
    record.source.path = name.to_owned();
    record.source.bytes = walk.stream.position();
    record.findings = walk.findings.into_iter().map(|finding| finding.at(file.clone())).collect();
    Ok(record)
}

/// Size word of a chunk whose size stands elsewhere or was not known when it was written.
const OPEN: u32 = u32::MAX;

/// Sizes of an RF64 file (EBU Tech 3306, "MBWF / RF64"; ITU-R BS.2088).
#[derive(Debug, Clone, Copy, Default)]
struct Large {
    riff: u64,
    data: u64,
}

struct Walk<'a> {
    stream: Stream<'a>,
    /// Present in RF64 files.
    large: Option<Large>,
    findings: Vec<Finding>,
    order: Order,
}

impl Walk<'_> {
    fn record(&mut self, options: &Options<'_>) -> Result<RawRecord> {
        let riff_size = self.head()?;
        let mut format: Option<WaveFormat> = None;
        let mut data: Option<data::Data> = None;
        let mut data_before_format: Option<Chunk> = None;
        loop {
            if data.is_some() && self.riff_end(riff_size).is_some_and(|end| self.stream.position() >= end) {
                break;
            }
            let Some(chunk) = self.stream.chunk(self.order)? else { break };
            let mut size = u64::from(chunk.size);
            match &chunk.id {
                b"ds64" if self.large.is_some() => self.sizes(&chunk)?,
                b"fmt " => {
                    let found = format::read(&mut self.stream, &chunk, self.order, &mut self.findings)?;
                    if format.as_ref().is_some_and(|known| *known != found) {
                        return Err(Error::malformed("a second format chunk contradicts the first").at(chunk.place()));
                    }
                    if let Some(before) = data_before_format {
                        return Err(Error::malformed("the data chunk stands before the format chunk")
                            .at(before.place())
                            .remedy("a file read in one pass needs the format first; write it anew"));
                    }
                    check_rate(&found, options).map_err(|error| error.at(chunk.place()))?;
                    format = Some(found);
                }
                b"data" => match (&format, &data) {
                    (_, Some(_)) => {
                        return Err(Error::malformed("a second data chunk; a WAV file holds one").at(chunk.place()));
                    }
                    (None, None) => {
                        data_before_format = Some(chunk);
                        self.stream.skip(size)?;
                    }
                    (Some(format), None) => {
                        let extent = self.extent(&chunk, riff_size);
                        let found = data::read(&mut self.stream, &chunk, format, extent, options, &mut self.findings)?;
                        size = found.bytes;
                        data = Some(found);
                    }
                },
                _ => self.pass(&chunk)?,
            }
            if self.stream.pad(size)? == Pad::Missing {
                self.missing_pad(&chunk, data.as_ref());
            }
        }
        let Some(format) = format else {
            return Err(Error::malformed("there is no format chunk").at(Place::byte(self.stream.position(), None)));
        };
        let Some(data) = data else {
            return Err(Error::malformed("there is no data chunk").at(Place::byte(self.stream.position(), None)));
        };
        self.check_end(riff_size, &data)?;
        let rate = f64::from(format.rate_hz);
        let stated =
            StatedRate { rate_base: rate, unit: Unit::parse("s"), given: false, origin: "WAV header".to_owned() };
        let layout = WaveLayout { rate_hz: format.rate_hz, sample_type: format.sample_type, channels: format.channels };
        Ok(RawRecord {
            source: Source { path: String::new(), sha256: String::new(), bytes: 0, format: Format::Wav },
            channels: data.channels,
            stamps: None,
            stated_rate: (format.rate_hz > 0).then_some(stated),
            metadata: Vec::new(),
            findings: Vec::new(),
            layout: Layout::Wave(layout),
        })
    }

    /// Reads the first twelve bytes and returns the size word among them.
    fn head(&mut self) -> Result<u32> {
        let mut head = [0; 12];
        let got = self.stream.fill(&mut head)?;
        if got == 0 {
            return Err(Error::malformed("the file is empty"));
        }
        let start = Place::byte(0, None);
        match &head[..4] {
            b"RIFF" => {}
            b"RIFX" => self.order = Order::Big,
            b"RF64" | b"BW64" => self.large = Some(Large::default()),
            other => {
                let found = escape(&String::from_utf8_lossy(&other[..got.min(4)]));
                return Err(Error::malformed(format!("not a WAV file: it starts with \"{found}\"")).at(start));
            }
        }
        if got < head.len() {
            return Err(Error::malformed(format!("the file ends after {got} bytes, inside its header")).at(start));
        }
        if &head[8..] != b"WAVE" {
            let found = escape(&String::from_utf8_lossy(&head[8..]));
            return Err(Error::malformed(format!("not a WAV file: a RIFF file of kind \"{found}\"")).at(start));
        }
        Ok(self.order.u32(&head, 4))
    }

    /// Where the RIFF chunk ends by its own account; `None` where it gives none.
    fn riff_end(&self, size: u32) -> Option<u64> {
        let size = match self.large {
            Some(large) if size == OPEN => large.riff,
            _ => u64::from(size),
        };
        (size != 0 && size != u64::from(OPEN)).then_some(size.saturating_add(8))
    }

    /// How far the data chunk reaches.
    fn extent(&self, chunk: &Chunk, riff_size: u32) -> data::Extent {
        let streamed = match self.large {
            Some(large) if chunk.size == OPEN && large.data != 0 => return data::Extent::Stated(large.data),
            _ if chunk.size == OPEN => true,
            // A size of 0 that was never filled in, unless the RIFF size leaves room for chunks after an empty one.
            _ => chunk.size == 0 && self.riff_end(riff_size).is_none_or(|end| end <= self.stream.position()),
        };
        if streamed { data::Extent::Open } else { data::Extent::Stated(u64::from(chunk.size)) }
    }

    /// Reads the sizes of an RF64 file.
    fn sizes(&mut self, chunk: &Chunk) -> Result<()> {
        let mut content = [0; 16];
        let want = content.len().min(usize::try_from(chunk.size).unwrap_or(usize::MAX));
        if self.stream.fill(&mut content[..want])? < content.len() {
            return Err(Error::malformed("the chunk of 64-bit sizes is cut short").at(chunk.place()));
        }
        self.large = Some(Large { riff: self.order.u64(&content, 0), data: self.order.u64(&content, 8) });
        self.stream.skip(u64::from(chunk.size) - want as u64).map(|_| ())
    }

    /// Passes over a chunk that says nothing about samples.
    fn pass(&mut self, chunk: &Chunk) -> Result<()> {
        let size = u64::from(chunk.size);
        let got = self.stream.skip(size)?;
        if got < size {
            let text = format!("the chunk states {size} bytes, {got} are there");
            self.findings.push(Finding::new("cut_chunk", text).at(chunk.place()));
        }
        Ok(())
    }

    fn missing_pad(&mut self, chunk: &Chunk, data: Option<&data::Data>) {
        // A file cut short, or read to its end, has its own remark; so has a chunk that passed the end.
        let explained = data.is_some_and(|data| data.ending != data::Ending::AsStated)
            || self.findings.iter().any(|finding| finding.code == "cut_chunk");
        if !explained {
            let text = "the chunk has an odd size and no pad byte after it; read without one";
            self.findings.push(Finding::new("no_pad_byte", text).at(chunk.place()));
        }
    }

    /// Compares the end of the file with the size that its head states.
    fn check_end(&mut self, riff_size: u32, data: &data::Data) -> Result<()> {
        let read = self.stream.position();
        let left = self.stream.skip(u64::MAX)?;
        let total = read + left;
        let stated = self.riff_end(riff_size);
        // One byte either way is a pad byte that was counted but not written, or written but not counted.
        let fits = stated.is_some_and(|end| end.abs_diff(total) <= 1);
        if fits || data.ending != data::Ending::AsStated {
            return Ok(());
        }
        let size = self.large.filter(|_| riff_size == OPEN).map_or(u64::from(riff_size), |large| large.riff);
        let mut text = format!("the header states a RIFF size of {size}, the file makes it {}", total - 8);
        if left > 0 {
            text.push_str(&format!("; the last {left} bytes were not read"));
        }
        self.findings.push(Finding::new("riff_size", text).at(Place::byte(4, None)));
        Ok(())
    }
}

fn check_rate(format: &WaveFormat, options: &Options<'_>) -> Result<()> {
    if format.rate_hz == 0 && options.rate_hz.is_none() {
        return Err(Error::malformed("the header states a sampling rate of 0 Hz").remedy("give the rate with --rate"));
    }
    Ok(())
}

//! What an archive says of its record: axis, channels, layout of the source, notes, provenance.

use minicbor::Decoder;

use super::cbor::{self, Map, read_array, read_map};
use crate::codec::cast::Cast;
use crate::error::{Error, Result};

/// The header of an archive.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Header {
    /// Rows of the record.
    pub rows: u64,
    /// Time or length axis, where there is one.
    pub axis: Option<ArchivedAxis>,
    /// Channels, in the order of the source.
    pub channels: Vec<ArchivedChannel>,
    /// How the source was laid out; `None` writes a plain table.
    pub layout: Option<ArchivedLayout>,
    /// `key = value` lines of the source.
    pub notes: Vec<(String, String)>,
    /// What was archived, and by what.
    pub origin: Option<Origin>,
}

/// The axis.
#[derive(Debug, Clone, PartialEq)]
pub struct ArchivedAxis {
    /// Unit of `tick` and `first`, or of the rate.
    pub unit: String,
    /// Name of the column of stamps; empty where there was none.
    pub name: String,
    /// Size of a tick in the unit.
    pub tick: f64,
    /// The first stamp in ticks.
    pub first: i64,
    /// Civil time of the first row (RFC 3339), where the source told it.
    pub civil: Option<String>,
    /// How ticks follow from rows.
    pub rule: Rule,
}

/// How ticks since the first stamp follow from rows.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Rule {
    /// Row n stands at floor((2 n p + q) / (2 q)) ticks: p / q ticks a row, to the nearest.
    Even(u64, u64),
    /// They are coded losslessly, as the channel after the last.
    Coded,
    /// Rows a second (or metre) as p / q, stated and not shown by stamps.
    Stated(u64, u64),
    /// The same rate where no plain fraction tells it.
    StatedDouble(f64),
}

/// One channel.
#[derive(Debug, Clone, PartialEq)]
pub struct ArchivedChannel {
    /// Name.
    pub name: String,
    /// Unit as the source spells it.
    pub unit: String,
    /// What restored samples are rounded to.
    pub cast: Cast,
    /// The bound, in words.
    pub bound: String,
    /// The bound in the channel's unit: of the largest error, or of the RMS error; `None` where there is none.
    pub error: Option<f64>,
}

/// How the source was laid out.
#[derive(Debug, Clone, PartialEq)]
pub enum ArchivedLayout {
    /// Delimited text.
    Table {
        /// Field separator.
        delimiter: u8,
        /// Decimal mark.
        decimal: u8,
        /// Line end.
        newline: String,
        /// The lines above the data, where they still fit what is restored.
        head: Option<String>,
        /// Columns: 0 for the stamps, k for channel k - 1.
        columns: Vec<u64>,
    },
    /// RIFF WAVE.
    Wave {
        /// Sampling rate of the header.
        rate_hz: u32,
        /// Bits of a sample.
        bits: u16,
        /// True for IEEE floats.
        float: bool,
    },
}

/// Provenance.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Origin {
    /// Name of the source, without its folder.
    pub name: String,
    /// Its SHA-256, lower-case hex.
    pub sha256: String,
    /// Its bytes.
    pub bytes: u64,
    /// The program and its version.
    pub tool: String,
    /// The settings, as the command line spells them.
    pub settings: String,
}

impl Header {
    /// As CBOR.
    pub fn encode(&self) -> Vec<u8> {
        let mut map = Map::default();
        map.count(0, self.rows);
        if let Some(axis) = &self.axis {
            map.map(1, axis.encode());
        }
        map.array(2, self.channels.iter().map(|channel| channel.encode().finish()));
        if let Some(layout) = &self.layout {
            map.map(3, layout.encode());
        }
        if !self.notes.is_empty() {
            map.array(64, self.notes.iter().map(|(key, value)| cbor::pair_item(key, value)));
        }
        if let Some(origin) = &self.origin {
            let mut own = Map::default();
            own.text(0, &origin.name);
            own.text(1, &origin.sha256);
            own.count(2, origin.bytes);
            own.text(3, &origin.tool);
            own.text(4, &origin.settings);
            map.map(65, own);
        }
        map.finish()
    }

    /// From CBOR.
    ///
    /// # Errors
    /// `Malformed` for what is no header, or one of a newer version.
    pub fn decode(bytes: &[u8]) -> Result<Header> {
        let mut header = Header::default();
        let mut decoder = Decoder::new(bytes);
        read_map(&mut decoder, |key, d| {
            match key {
                0 => header.rows = cbor::count(d)?,
                1 => header.axis = Some(ArchivedAxis::decode(d)?),
                2 => header.channels = read_array(d, ArchivedChannel::decode)?,
                3 => header.layout = Some(ArchivedLayout::decode(d)?),
                64 => {
                    header.notes = read_array(d, |d| {
                        let pair = read_array(d, cbor::text)?;
                        <[String; 2]>::try_from(pair)
                            .map(|[key, value]| (key, value))
                            .map_err(|_| Error::malformed("a note that is no pair"))
                    })?;
                }
                65 => {
                    let mut origin = Origin::default();
                    read_map(d, |key, d| {
                        match key {
                            0 => origin.name = cbor::text(d)?,
                            1 => origin.sha256 = cbor::text(d)?,
                            2 => origin.bytes = cbor::count(d)?,
                            3 => origin.tool = cbor::text(d)?,
                            4 => origin.settings = cbor::text(d)?,
                            _ => return Ok(false),
                        }
                        Ok(true)
                    })?;
                    header.origin = Some(origin);
                }
                _ => return Ok(false),
            }
            Ok(true)
        })?;
        if decoder.position() != bytes.len() {
            return Err(Error::malformed("bytes after the header"));
        }
        if header.channels.is_empty() || header.rows == 0 {
            return Err(Error::malformed("an archive of no channels or no rows"));
        }
        Ok(header)
    }

    /// Streams of the archive: the channels, and the stamps where they are coded.
    pub fn streams(&self) -> usize {
        let coded = self.axis.as_ref().is_some_and(|axis| axis.rule == Rule::Coded);
        self.channels.len() + usize::from(coded)
    }

    /// What samples of a stream are rounded to.
    pub fn cast(&self, stream: usize) -> Cast {
        self.channels.get(stream).map_or(Cast::Double, |channel| channel.cast)
    }
}

impl ArchivedAxis {
    fn encode(&self) -> Map {
        let mut map = Map::default();
        map.text(0, &self.unit);
        match self.rule {
            Rule::Even(p, q) | Rule::Stated(p, q) => {
                map.count(1, if matches!(self.rule, Rule::Even(..)) { 0 } else { 2 });
                map.array(2, [p, q].into_iter().map(cbor::count_item));
            }
            Rule::Coded => map.count(1, 1),
            Rule::StatedDouble(rate) => {
                map.count(1, 3);
                map.double(2, rate);
            }
        }
        if matches!(self.rule, Rule::Even(..) | Rule::Coded) {
            map.text(3, &self.name);
            map.double(4, self.tick);
            map.signed(5, self.first);
        }
        if let Some(civil) = &self.civil {
            map.text(6, civil);
        }
        map
    }

    fn decode(decoder: &mut Decoder<'_>) -> Result<ArchivedAxis> {
        let mut axis = ArchivedAxis {
            unit: String::new(),
            name: String::new(),
            tick: 1.0,
            first: 0,
            civil: None,
            rule: Rule::Coded,
        };
        let mut kind = None;
        read_map(decoder, |key, d| {
            match (key, kind) {
                (0, _) => axis.unit = cbor::text(d)?,
                (1, _) => kind = Some(cbor::count(d)?),
                (2, Some(0 | 2)) => {
                    let pair = read_array(d, cbor::count)?;
                    match pair[..] {
                        [p, q] if p > 0 && q > 0 && q < 1 << 62 => {
                            axis.rule = if kind == Some(0) { Rule::Even(p, q) } else { Rule::Stated(p, q) };
                        }
                        _ => return Err(Error::malformed("an axis without a rate")),
                    }
                }
                (2, Some(3)) => axis.rule = Rule::StatedDouble(cbor::double(d)?),
                (3, _) => axis.name = cbor::text(d)?,
                (4, _) => axis.tick = cbor::double(d)?,
                (5, _) => axis.first = cbor::signed(d)?,
                (6, _) => axis.civil = Some(cbor::text(d)?),
                _ => return Ok(false),
            }
            Ok(true)
        })?;
        let matches = match axis.rule {
            Rule::Even(..) => kind == Some(0),
            Rule::Coded => kind == Some(1),
            Rule::Stated(..) => kind == Some(2),
            Rule::StatedDouble(rate) => kind == Some(3) && rate > 0.0,
        };
        if matches && axis.tick > 0.0 { Ok(axis) } else { Err(Error::malformed("an axis of an unknown kind")) }
    }

    /// Ticks of row `row` since the first stamp, where a rule gives them.
    pub fn ticks(&self, row: u64) -> Option<i64> {
        match self.rule {
            Rule::Even(p, q) => {
                let (row, p, q) = (u128::from(row), u128::from(p), u128::from(q));
                i64::try_from((2 * row * p + q) / (2 * q)).ok()
            }
            _ => None,
        }
    }
}

impl ArchivedChannel {
    fn encode(&self) -> Map {
        let mut map = Map::default();
        map.text(0, &self.name);
        map.text(1, &self.unit);
        match self.cast {
            Cast::Double => {}
            Cast::Single => map.count(2, 1),
            Cast::Grid { numerator, denominator } => {
                map.count(2, 2);
                map.double(3, numerator);
                map.double(4, denominator);
            }
        }
        if !self.bound.is_empty() {
            map.text(64, &self.bound);
        }
        if let Some(error) = self.error {
            map.double(65, error);
        }
        map
    }

    fn decode(decoder: &mut Decoder<'_>) -> Result<ArchivedChannel> {
        let mut channel = ArchivedChannel {
            name: String::new(),
            unit: String::new(),
            cast: Cast::Double,
            bound: String::new(),
            error: None,
        };
        let (mut kind, mut parts) = (0, [1.0, 1.0]);
        read_map(decoder, |key, d| {
            match key {
                0 => channel.name = cbor::text(d)?,
                1 => channel.unit = cbor::text(d)?,
                2 => kind = cbor::count(d)?,
                3 => parts[0] = cbor::double(d)?,
                4 => parts[1] = cbor::double(d)?,
                64 => channel.bound = cbor::text(d)?,
                65 => channel.error = Some(cbor::double(d)?),
                _ => return Ok(false),
            }
            Ok(true)
        })?;
        let [numerator, denominator] = parts;
        channel.cast = match kind {
            0 => Cast::Double,
            1 => Cast::Single,
            2 if numerator > 0.0 && denominator > 0.0 => Cast::Grid { numerator, denominator },
            _ => return Err(Error::malformed("numbers of an unknown kind")),
        };
        Ok(channel)
    }
}

impl ArchivedLayout {
    fn encode(&self) -> Map {
        let mut map = Map::default();
        match self {
            ArchivedLayout::Table { delimiter, decimal, newline, head, columns } => {
                map.count(0, 0);
                map.count(1, u64::from(*delimiter));
                map.count(2, u64::from(*decimal));
                map.text(3, newline);
                if let Some(head) = head {
                    map.text(4, head);
                }
                map.array(5, columns.iter().copied().map(cbor::count_item));
            }
            ArchivedLayout::Wave { rate_hz, bits, float } => {
                map.count(0, 1);
                map.count(1, u64::from(*rate_hz));
                map.count(2, u64::from(*bits));
                map.count(3, u64::from(*float));
            }
        }
        map
    }

    fn decode(decoder: &mut Decoder<'_>) -> Result<ArchivedLayout> {
        let (mut kind, mut numbers) = (None, [0_u64; 3]);
        let (mut newline, mut head, mut columns) = (String::new(), None, Vec::new());
        read_map(decoder, |key, d| {
            match (key, kind) {
                (0, _) => kind = Some(cbor::count(d)?),
                (1 | 2, _) => numbers[key as usize - 1] = cbor::count(d)?,
                (3, Some(0)) => newline = cbor::text(d)?,
                (3, Some(1)) => numbers[2] = cbor::count(d)?,
                (4, Some(0)) => head = Some(cbor::text(d)?),
                (5, Some(0)) => columns = read_array(d, cbor::count)?,
                _ => return Ok(false),
            }
            Ok(true)
        })?;
        let wrong = || Error::malformed("a layout of an unknown kind");
        match kind {
            Some(0) => {
                let byte = |n: u64| u8::try_from(n).ok().filter(u8::is_ascii).ok_or_else(wrong);
                Ok(ArchivedLayout::Table {
                    delimiter: byte(numbers[0])?,
                    decimal: byte(numbers[1])?,
                    newline,
                    head,
                    columns,
                })
            }
            Some(1) => Ok(ArchivedLayout::Wave {
                rate_hz: u32::try_from(numbers[0]).map_err(|_| wrong())?,
                bits: u16::try_from(numbers[1]).map_err(|_| wrong())?,
                float: numbers[2] == 1,
            }),
            _ => Err(wrong()),
        }
    }
}

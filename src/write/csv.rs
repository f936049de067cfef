//! Writes delimited text: a result back into the form of the table it came from, or a plain new table.

use std::io::Write;

use super::blocks::pump;
use super::field::push_field;
use super::header::free_name;
use super::number;
use super::stamp::StampRule;
use super::{Cells, Content, Digits, Extra, Writer, table};
use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::record::{Channel, Format};

/// Delimited text.
pub(super) const WRITER: Writer = Writer {
    format: Format::Csv,
    name: "csv",
    extensions: &["csv", "txt", "tsv", "dat", "asc"],
    about: "delimited text, in the form of the input where that is text",
    check,
    write,
};

fn check(content: &Content<'_>) -> Result<Vec<Finding>> {
    let len = content.record.len();
    for extra in content.extra {
        if extra.cells.count() != len {
            let text = format!("column {:?} has {} cells for {len} samples", extra.name, extra.cells.count());
            return Err(Error::usage(text));
        }
    }
    match content.origin {
        Some(origin) => table::check(content, origin).map(|()| Vec::new()),
        None => Ok(Vec::new()),
    }
}

fn write(content: &Content<'_>, sink: &mut (dyn Write + Send)) -> Result<()> {
    match content.origin {
        Some(origin) => table::write(content, origin, sink),
        None => write_plain(content, sink),
    }
}

/// Rows formatted at a time by one worker: some 100 kB of text.
const BLOCK_ROWS: usize = 4096;
/// Blocks in flight.
const BATCH: usize = 16;

/// A table of its own: stamps, channels, extra columns; commas, points, line feeds.
fn write_plain(content: &Content<'_>, sink: &mut (dyn Write + Send)) -> Result<()> {
    let axis = content.record.axis();
    let channels: Vec<Channel<'_>> = content.record.channels().collect();
    let mut head = Vec::new();
    let letter = if axis.is_time() { "t" } else { "x" };
    push_field(&mut head, &format!("{letter} [{}]", axis.unit().label()), b',');
    for channel in &channels {
        head.push(b',');
        push_field(&mut head, &named(channel.name, channel.unit.label()), b',');
    }
    let mut taken: Vec<String> = channels.iter().map(|channel| channel.name.to_owned()).collect();
    for extra in content.extra {
        head.push(b',');
        push_field(&mut head, &free_name(extra.name, &mut taken), b',');
    }
    head.push(b'\n');
    sink.write_all(&head)?;
    let (rule, len) = (StampRule::of(axis), content.record.len());
    let mut next = 0;
    let batch = || {
        let starts: Vec<usize> = (next..len).step_by(BLOCK_ROWS).take(BATCH).collect();
        next = starts.last().map_or(len, |last| last + BLOCK_ROWS);
        Ok((!starts.is_empty()).then_some(starts))
    };
    pump(sink, batch, |&start, out| {
        for n in start..len.min(start + BLOCK_ROWS) {
            number::push(out, rule.stamp(n), Digits::Shortest, b'.');
            for (index, channel) in channels.iter().enumerate() {
                out.push(b',');
                if !content.is_blank(index, n) {
                    number::push(out, channel.samples[n], content.digits, b'.');
                }
            }
            for extra in content.extra {
                out.push(b',');
                push_cell(out, extra, n, content.digits, b'.')?;
            }
            out.push(b'\n');
        }
        Ok(())
    })
}

/// `name [unit]`, or the name alone.
pub(super) fn named(name: &str, unit: &str) -> String {
    if unit.is_empty() { name.to_owned() } else { format!("{name} [{unit}]") }
}

/// Appends a cell of an extra column: nothing where it is blank.
///
/// # Errors
/// `Usage` for a number that is not finite.
pub(super) fn push_cell(out: &mut Vec<u8>, extra: &Extra<'_>, n: usize, digits: Digits, decimal: u8) -> Result<()> {
    match extra.cells {
        Cells::Flags(flags) => out.extend(flags.get(n).copied().flatten().map(|flag| b'0' + u8::from(flag))),
        Cells::Numbers(numbers) => match numbers.get(n).copied().flatten() {
            Some(value) if value.is_finite() => number::push(out, value, digits, decimal),
            Some(value) => {
                let place = Place { sample: Some(n as u64), ..Place::channel(extra.name) };
                return Err(Error::usage(format!("not a finite number: {value}")).at(place));
            }
            None => {}
        },
    }
    Ok(())
}

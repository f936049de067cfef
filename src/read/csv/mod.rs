//! Delimited text: encoding, separator and decimal mark, header and units, stamps and values, found together and said.
//!
//! The text is cut into lines (`blocks`), the start of the data and the dialect are found jointly (`dialect`), the lines
//! above name the columns (`header`, `name`, `metadata`), each column gets its role (`column`), and all rows are read to exact
//! floats and integer ticks (`rows`, `number`, `ticks`, `table`). What ends the data is judged by `ending`.

mod blocks;
mod civil;
mod clock;
mod column;
mod decimals;
mod dialect;
mod encoding;
mod ending;
mod field;
mod header;
mod metadata;
mod missing;
mod name;
mod number;
mod opening;
mod rows;
mod table;
mod ticks;

use std::io::{Cursor, Read};
use std::sync::Arc;

use super::{Intake, ReadOptions};
use crate::error::{Error, Finding, Result};
use crate::place::{Place, escape};
use crate::record::{
    ColumnRole, Encoding, Format, Layout, RawChannel, RawRecord, RowLines, Source, TableLayout, TextSource,
};
use blocks::{Blocks, Held};
use missing::Missing;
use opening::Opening;
use rows::{Plan, Rows, Task};

pub(in crate::read) use encoding::Decoded;

/// Bytes of a block: fits the cache of one core together with its numbers.
const BLOCK: usize = 1 << 20;
/// Bytes first looked at for the encoding and the start of the data.
const WINDOW: usize = 256 << 10;
/// Files up to this size are held in memory for the writer; larger ones are read again.
const HELD: usize = 16 << 20;

/// Reads a table from a stream that stands at its first byte.
pub(super) fn read(intake: &mut Intake<'_>, options: &ReadOptions) -> Result<RawRecord> {
    read_in_blocks(intake, options, BLOCK)
}

fn read_in_blocks(intake: &mut Intake<'_>, options: &ReadOptions, block_bytes: usize) -> Result<RawRecord> {
    let mut first = Vec::new();
    (&mut *intake.stream).take(WINDOW as u64).read_to_end(&mut first)?;
    let (encoding, guessed) = encoding::detect(&first, first.len() < WINDOW);
    let text = Decoded::new(Cursor::new(first).chain(&mut *intake.stream), encoding)?;
    let hold = if intake.path.is_some() { HELD } else { usize::MAX };
    let mut blocks = Blocks::new(text, block_bytes, hold);
    let opening = opening::open(&mut blocks, options)?;
    blocks.skip(opening.data_start);

    let plan = plan(&opening, blocks.newline, options);
    let first_line = opening.found.first as u64 + 1;
    let mut table = table::read(&mut blocks, &plan, first_line, opening.quoted, options)?;
    let text = match (blocks.held, intake.path) {
        (Held::Text(text, _), _) => TextSource::Held(Arc::new(text)),
        (Held::No, Some(path)) => TextSource::File(path.to_owned()),
        (Held::No, None) => return Err(Error::io("the text of a stream was not kept")),
    };
    let mut findings = if guessed { vec![guess(encoding)] } else { Vec::new() };
    findings.extend(opening.header.findings.iter().chain(&opening.roles.findings).cloned());
    findings.append(&mut table.findings);
    assemble(opening, table.rows, text, encoding, findings).map(|mut record| {
        record.source.path = intake.name.to_owned();
        record
    })
}

/// What to do with each field.
fn plan(opening: &Opening, newline: u8, options: &ReadOptions) -> Plan {
    let mut tasks = vec![Task::Skip; opening.header.columns.len()];
    tasks.resize(opening.found.fields, Task::Empty);
    for (channel, &field) in opening.roles.channels.iter().enumerate() {
        tasks[field] = Task::Value(channel);
    }
    if let Some((field, _)) = opening.roles.stamps {
        tasks[field] = Task::Stamp;
    }
    Plan {
        dialect: opening.found.dialect,
        newline,
        tasks,
        channels: opening.roles.channels.len(),
        missing: Missing::new(&options.missing, opening.found.dialect.decimal),
        form: opening.roles.stamps.map(|(_, form)| form),
    }
}

/// Puts the record together.
fn assemble(
    opening: Opening,
    mut rows: Rows,
    text: TextSource,
    encoding: Encoding,
    mut findings: Vec<Finding>,
) -> Result<RawRecord> {
    let Opening { found, header, roles, metadata, head, data_start, newline, .. } = opening;
    let first_line = found.first as u64 + 1;
    let mut lines = RowLines::new();
    lines.append(&rows.lines, first_line);
    if lines.rows() == 0 {
        return Err(Error::malformed("there are no data rows").at(Place::line(first_line)));
    }
    if let Some(&line) = rows.nul_lines.first() {
        let text = format!("{} lines of NUL bytes are left out as lost", rows.nul_lines.len());
        findings.push(Finding::new("lost_rows", text).at(Place::line(first_line + line)));
    }
    let mut stamps = None;
    if let (Some(ticks), Some((field, _))) = (rows.ticks.take(), roles.stamps) {
        let (found, remarks) = clock::stamps(ticks, &header.columns[field].name, roles.stamps_unit, &lines)?;
        let place = Place::field(first_line, field as u64 + 1);
        findings.extend(remarks.into_iter().map(|remark| remark.at(place.clone())));
        stamps = Some(found);
    }
    let mut columns = vec![ColumnRole::Untouched; found.fields];
    roles.channels.iter().enumerate().for_each(|(channel, &field)| columns[field] = ColumnRole::Channel(channel));
    if let Some((field, _)) = roles.stamps {
        columns[field] = ColumnRole::Stamps;
    }
    let mut channels = Vec::with_capacity(roles.channels.len());
    for ((&field, values), (missing, missing_spelling)) in roles.channels.iter().zip(rows.values).zip(rows.missing) {
        let (name, unit) = (header.columns[field].name.clone(), header.columns[field].unit.clone());
        let channel = RawChannel { name, unit, values, missing, missing_spelling, full_scale: None };
        findings.extend(sparse(&channel).map(|finding| finding.at(Place::field(first_line, field as u64 + 1))));
        channels.push(channel);
    }
    let layout = TableLayout {
        text,
        encoding,
        delimiter: found.dialect.delimiter,
        decimal: found.dialect.decimal,
        thousands: found.dialect.thousands,
        head,
        header_line: header.names.filter(|lines| lines.len() == 1).map(|lines| lines.start),
        units_line: header.units.filter(|lines| lines.len() == 1).map(|lines| lines.start),
        data_start: data_start as u64,
        data_line: first_line,
        columns,
        lines,
        newline,
    };
    let source = Source { path: String::new(), sha256: String::new(), bytes: 0, format: Format::Csv };
    let stated_rate = metadata::stated_rate(&metadata);
    Ok(RawRecord { source, channels, stamps, stated_rate, metadata, findings, layout: Layout::Table(layout) })
}

/// A remark on a channel that has a value on fewer than half of the rows: it was sampled at a lower rate of its own.
fn sparse(channel: &RawChannel) -> Option<Finding> {
    let rows = channel.values.len();
    if channel.missing.len() * 2 <= rows || channel.missing.len() + 2 > rows {
        return None;
    }
    let present: Vec<usize> = (0..rows).filter(|&row| !channel.values[row].is_nan()).collect();
    let stride = present[1] - present[0];
    let name = escape(&channel.name);
    let text = if stride > 1 && present.windows(2).all(|pair| pair[1] - pair[0] == stride) {
        format!("channel \"{name}\" has a value on one row in {stride} only: it has a rate of its own")
    } else {
        format!("channel \"{name}\" has a value on {} of {rows} rows only", present.len())
    };
    Some(Finding::new("sparse_channel", text))
}

fn guess(encoding: Encoding) -> Finding {
    let text = match encoding {
        Encoding::Utf16Le | Encoding::Utf16Be => {
            "the text is read as UTF-16, which its zero bytes show: there is no byte order mark"
        }
        _ => "the text is no UTF-8 and is read as windows-1252",
    };
    Finding::new("encoding_guessed", text)
}

/// Text from a file for a message: quoted, shortened, without control characters.
fn shown(text: &[u8]) -> String {
    const LONGEST: usize = 40;
    let text = String::from_utf8_lossy(text);
    let short: String = text.chars().take(LONGEST).collect();
    let dots = if short.len() < text.len() { "..." } else { "" };
    format!("\"{}{dots}\"", escape(&short))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Everything a reader gives, in a form that does not depend on how it is kept.
    fn told(text: &[u8], options: &ReadOptions, block_bytes: usize) -> String {
        let mut stream = text;
        let mut intake = Intake { stream: &mut stream, name: "a.csv", path: None };
        let record = match read_in_blocks(&mut intake, options, block_bytes) {
            Ok(record) => record,
            Err(error) => return error.to_string(),
        };
        let lines: Vec<Option<u64>> =
            (0..record.channels[0].values.len()).map(|row| record.row_place(row).line).collect();
        let bits: Vec<Vec<u64>> =
            record.channels.iter().map(|c| c.values.iter().map(|value| value.to_bits()).collect()).collect();
        let missing: Vec<_> = record.channels.iter().map(|c| (&c.missing, &c.missing_spelling)).collect();
        format!("{lines:?} {bits:?} {missing:?} {:?} {:?}", record.stamps, record.findings)
    }

    #[test]
    fn the_size_of_the_blocks_changes_nothing() {
        let rows = |row: fn(usize) -> String| (0..60).map(row).collect::<String>();
        let fixtures = [
            format!("t,a,b\n{}", rows(|n| format!("{}.{},{n},-{n}.5e-3\n", n / 10, n % 10))),
            format!("t;a\r\n{}", rows(|n| format!("{},{};{n}\r\n\r\n", n / 10, n % 10))),
            format!("t a\r{}", rows(|n| format!("  {n}.25   {n}  \r"))),
            format!("t,a,note\n{}", rows(|n| format!("{n}.5,{},\"a \"\"{n}\"\"\n, b\"\n", n * n))),
            format!("t,a,note\n{}", rows(|n| format!("{n}.5,{n},{}\n", if n > 40 { "\"x, y\"" } else { "z" }))),
            format!("time,a\n{}", rows(|n| format!("23:59:{n:02}.5,{n}\n"))) + "00:00:00.5,60\n",
            format!("date,a\n{}", rows(|n| format!("{:02}/01/2026 10:00:00,{n}\n", 1 + n % 20))),
            format!(
                "t,a,b\n{}",
                rows(|n| format!(
                    "{n}.5,{},{}\n",
                    if n % 7 == 3 { "NA" } else { "1" },
                    if n % 9 > 0 { "" } else { "2" }
                ))
            ),
            format!("t,a\n{}end of run\n\nsecond line", rows(|n| format!("{n}.5,{n}\n"))),
            format!("t,a\n{}60.5", rows(|n| format!("{n}.5,{n}\n"))),
            format!("t,a\n{}60.5,x\n61.5,3\n", rows(|n| format!("{n}.5,{n}\n"))),
            format!("t,a\n{}60.5,\"1\n61.5,3\n", rows(|n| format!("{n}.5,{n}\n"))),
            format!("t,a\n{}\0\0\0\0\0\0\0\0\0\0\0\n61.5,3\n", rows(|n| format!("{n}.5,{n}\n"))),
            format!("t,a\n{}0.123456789012345678901,7\n", rows(|n| format!("0.{n:02},{n}\n"))),
            format!("t,a\n{}", rows(|n| format!("{},{n}\n", 1_772_359_200_123_456_000_i64 + n as i64))),
        ];
        let declared = ReadOptions { missing: vec!["NUL".into(), "x".into()], ..ReadOptions::default() };
        for text in &fixtures {
            for options in [&ReadOptions::default(), &declared] {
                let whole = told(text.as_bytes(), options, BLOCK);
                for block_bytes in [1, 2, 3, 7, 16, 33, 64, 100, 257, 1000] {
                    assert_eq!(told(text.as_bytes(), options, block_bytes), whole, "{block_bytes}: {text}");
                }
            }
        }
    }
}

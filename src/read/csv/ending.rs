//! What follows the last row: a row cut short, a footer, or the line at which reading must stop with an error.

use std::io::Read;

use super::blocks::Blocks;
use super::field::{Look, MOST, fields, look};
use super::rows::{Cause, Fault, Plan, Rows};
use super::shown;
use crate::error::{Error, Finding, Result};
use crate::place::Place;

/// Bytes after a fault in which the same fault is counted.
const COUNTED: u64 = 64 << 20;

/// What was found from the faulty line to the end of the text.
#[derive(Debug, Default)]
struct Rest {
    /// Lines that are not blank, the faulty one included.
    lines: u64,
    /// True when a line is a row again.
    data: bool,
    /// Fields with the very same faulty text in the same column, the first included.
    same: u64,
}

/// Decides about the line at which reading stopped; the blocks stand at its start. Gives remarks where it ends the data.
///
/// # Errors
/// `Malformed` in every other case.
pub(super) fn settle<R: Read>(
    blocks: &mut Blocks<R>,
    plan: &Plan,
    fault: &Fault,
    line_number: u64,
    quoted: bool,
    allow_truncated: bool,
) -> Result<Vec<Finding>> {
    let place =
        Place { line: Some(line_number), column: fault.field.map(|field| field as u64 + 1), ..Place::default() };
    if fault.cause == Cause::OpenQuote {
        let error = Error::malformed("a quote is opened on this line and never closed").at(Place::line(line_number));
        return Err(error.remedy("close it, or remove the quotes"));
    }
    let (first, rest) = remainder(blocks, plan, fault, quoted)?;
    let cells = fields(&first, plan.dialect.delimiter);
    let leading = cells.first().map_or(Look::Missing, |cell| look(cell, plan.dialect, &plan.missing));
    let begun = matches!(leading, Look::Number | Look::Stamp);
    if !rest.data {
        let cut = match fault.cause {
            Cause::Fields(count) => count < plan.tasks.len(),
            Cause::NotANumber(_) | Cause::NotAStamp(_) => {
                !blocks.is_terminated() && fault.field == Some(cells.len() - 1)
            }
            _ => false,
        };
        if begun && cut && rest.lines == 1 {
            let text = format!("the last row is cut short and dropped: {}", shown(&first));
            return Ok(vec![Finding::new("last_row_cut", text).at(Place::line(line_number))]);
        }
        let text_cause =
            matches!(fault.cause, Cause::Fields(_) | Cause::NotANumber(_) | Cause::NotAStamp(_) | Cause::NotEmpty(_));
        if text_cause && !begun {
            let text =
                format!("{} lines after the data are no rows and left out, from {} on", rest.lines, shown(&first));
            return Ok(vec![Finding::new("footer", text).at(Place::line(line_number))]);
        }
        if let (Cause::Nul(count), true) = (&fault.cause, allow_truncated) {
            let text = format!("the data end in {count} NUL bytes: what they replace is lost");
            return Ok(vec![Finding::new("truncated", text).at(Place::line(line_number))]);
        }
    }
    Err(error(plan, fault, &first, &rest).at(place))
}

/// The faulty line, and what follows it.
fn remainder<R: Read>(blocks: &mut Blocks<R>, plan: &Plan, fault: &Fault, quoted: bool) -> Result<(Vec<u8>, Rest)> {
    let counted = matches!(fault.cause, Cause::NotANumber(_)).then_some(fault.field).flatten();
    let (mut first, mut rest, mut bytes) = (None::<Vec<u8>>, Rest::default(), 0);
    let mut text = Vec::new();
    // Line by line: whatever is faulty here hardly keeps quotes in order.
    while let Some(block) = blocks.next(None)? {
        for line in block.split(|&byte| byte == plan.newline).filter(|line| !line.trim_ascii().is_empty()) {
            rest.lines += 1;
            let is_row = || plan.read(line, quoted, Rows::new(plan)).1.is_none();
            if first.is_none() {
                first = Some(line.trim_ascii().to_vec());
                if let Some(field) = counted {
                    text = fields(line, plan.dialect.delimiter)
                        .get(field)
                        .map(|cell| cell.text.to_vec())
                        .unwrap_or_default();
                }
                rest.same = 1;
            } else if !rest.data && is_row() {
                rest.data = true;
            } else if let Some(field) = counted
                && fields(line, plan.dialect.delimiter).get(field).is_some_and(|cell| *cell.text == *text)
            {
                rest.same += 1;
            }
        }
        bytes += block.len() as u64;
        blocks.recycle(block);
        if rest.data && (counted.is_none() || bytes > COUNTED) {
            break;
        }
    }
    Ok((first.unwrap_or_default(), rest))
}

fn error(plan: &Plan, fault: &Fault, line: &[u8], rest: &Rest) -> Error {
    let more = if rest.same > 1 { format!(" ({} more like it below)", rest.same - 1) } else { String::new() };
    match &fault.cause {
        Cause::Fields(count) => {
            let count = if *count > MOST { format!("more than {MOST}") } else { count.to_string() };
            let what = format!("{count} fields where the rows above have {}: {}", plan.tasks.len(), shown(line));
            Error::malformed(what).remedy("correct the line; if it ends the data, remove what follows")
        }
        Cause::NotANumber(text) => Error::malformed(format!("not a number: {text}{more}")).remedy(format!(
            "declare it with --missing {}, or choose other columns with --channel",
            text.trim_matches('"')
        )),
        Cause::Grouped(text) => Error::malformed(format!("two separators in {text}"))
            .remedy("say which mark stands between thousands with --thousands"),
        Cause::TooLarge(text) => Error::malformed(format!("beyond the range of a 64-bit float: {text}")),
        Cause::NotAStamp(text) if text == "\"\"" => Error::malformed("the row has no time stamp")
            .remedy("remove the row, or say --time-column none and give --rate"),
        Cause::NotAStamp(text) => Error::malformed(format!("not a time stamp like those above: {text}"))
            .remedy("correct it, or say --time-column none and give --rate"),
        Cause::NotEmpty(text) => {
            Error::malformed(format!("text after the last separator, which ends all rows above: {text}"))
        }
        Cause::Nul(count) => {
            let error = Error::malformed(format!("{count} NUL bytes: data were lost here, as by a loss of power"));
            match (plan.form.is_some(), rest.data) {
                (true, true) => error.remedy("declare the rows lost with --missing NUL: the stamps then show the gap"),
                (false, true) => error.remedy("cut the file here: without stamps the length of the loss is unknown"),
                (_, false) => error.remedy("nothing follows: read what is there with --allow-truncated"),
            }
        }
        Cause::Quote | Cause::OpenQuote => {
            Error::malformed(format!("a quote that cannot be understood: {}", shown(line)))
        }
    }
}

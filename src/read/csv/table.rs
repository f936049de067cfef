//! All rows of the data block, read in blocks side by side and joined in order.

use std::io::Read;

use super::blocks::Blocks;
use super::ending::settle;
use super::rows::{Cause, Plan, Rows};
use crate::error::{Finding, Result};
use crate::place::Place;
use crate::read::{ReadOptions, refuse_beyond};

/// The data block as read.
#[derive(Debug)]
pub(super) struct Table {
    pub(super) rows: Rows,
    pub(super) findings: Vec<Finding>,
}

/// Blocks that a thread gets at a time: the last one to finish keeps the others waiting only a little.
const PER_THREAD: usize = 2;

impl Table {
    /// Joins the next rows in order, and keeps their memory.
    fn join(&mut self, parts: &mut Vec<Rows>, spare: &mut Vec<Rows>, plan: &Plan) {
        for part in parts.drain(..) {
            self.rows.append(&part);
            spare.push(part.cleared(plan));
        }
    }
}

/// Reads all rows of a text whose next line is line `first_line` (from 1). The result does not depend on the size of the
/// blocks nor on the number of threads.
///
/// # Errors
/// `Malformed` at the first line that is no row, unless it ends the data; `Unsupported` beyond the bound on memory.
pub(super) fn read<R: Read>(
    blocks: &mut Blocks<R>,
    plan: &Plan,
    first_line: u64,
    mut quoted: bool,
    options: &ReadOptions,
) -> Result<Table> {
    let columns = (plan.channels + usize::from(plan.form.is_some())) as u64;
    let mut table = Table { rows: Rows::new(plan), findings: Vec::new() };
    let count = PER_THREAD * rayon::current_num_threads().max(1);
    let mut quotes = quoted.then_some(plan.dialect.delimiter);
    let mut batch = blocks.batch(count, quotes)?;
    // What the last batch gave, and memory for the next one.
    let (mut parts, mut spare) = (Vec::new(), Vec::new());
    while !batch.is_empty() {
        let mut slots = Vec::new();
        let mut next = Ok(Vec::new());
        if batch.len() == 1 && blocks.is_drained() {
            table.join(&mut parts, &mut spare, plan);
            slots.push(Some(plan.read(&batch[0], quoted, Rows::new(plan))));
        } else {
            slots.resize_with(batch.len(), || None);
            // This thread joins what is parsed and reads on while the others work on what is read.
            rayon::in_place_scope(|scope| {
                for (slot, block) in slots.iter_mut().zip(&batch) {
                    let rows = spare.pop().unwrap_or_else(|| Rows::new(plan));
                    scope.spawn(move |_| *slot = Some(plan.read(block, quoted, rows)));
                }
                table.join(&mut parts, &mut spare, plan);
                next = blocks.batch(count, quotes);
            });
        }
        let mut fault = None;
        for (index, slot) in slots.into_iter().enumerate() {
            let Some((rows, found)) = slot else { continue };
            parts.push(rows);
            if let Some(found) = found {
                fault = Some((index, found));
                break;
            }
        }
        refuse_beyond(options.memory, table.rows.lines.rows() * columns * 8, "the record alone")?;
        let Some((index, fault)) = fault else {
            batch.into_iter().for_each(|block| blocks.recycle(block));
            batch = next?;
            continue;
        };
        table.join(&mut parts, &mut spare, plan);
        let mut rest = batch[index].split_off(fault.byte);
        let following = batch.drain(index + 1..).chain(next?);
        following.for_each(|block| rest.extend_from_slice(&block));
        blocks.push_back(rest);
        if fault.cause == Cause::Quote && !quoted {
            quoted = true;
            quotes = Some(plan.dialect.delimiter);
            batch = blocks.batch(count, quotes)?;
            continue;
        }
        table.findings.extend(settle(
            blocks,
            plan,
            &fault,
            first_line + table.rows.line_count,
            quoted,
            options.allow_truncated,
        )?);
        return Ok(table);
    }
    table.join(&mut parts, &mut spare, plan);
    refuse_beyond(options.memory, table.rows.lines.rows() * columns * 8, "the record alone")?;
    if !blocks.is_terminated() {
        let line = first_line + table.rows.line_count - 1;
        let text = "the file does not end in a line end: the last value may be cut";
        table.findings.push(Finding::new("no_final_line_end", text).at(Place::line(line)));
    }
    Ok(table)
}

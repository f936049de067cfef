//! The text in blocks of whole lines, so that a file of any size is read in little memory.

use std::io::Read;

use super::field::record_end;
use crate::error::{Error, Result};
use crate::place::Place;

/// Longest line, in bytes.
pub(super) const LONGEST_LINE: usize = 64 << 20;

/// Text that is kept for the writer, which copies untouched fields from it.
#[derive(Debug)]
pub(super) enum Held {
    /// All text so far, up to a limit in bytes.
    Text(Vec<u8>, usize),
    /// The limit was passed; the file can be read again.
    No,
}

/// A stream of text, cut at line ends.
pub(super) struct Blocks<R> {
    text: R,
    /// Bytes read and not handed out.
    pending: Vec<u8>,
    ended: bool,
    /// Bytes handed out.
    position: u64,
    /// Last byte read.
    last: Option<u8>,
    pub(super) newline: u8,
    pub(super) held: Held,
    /// Bytes of a block.
    size: usize,
    spare: Vec<Vec<u8>>,
}

impl<R: Read> Blocks<R> {
    /// Blocks of about `size` bytes; up to `hold` bytes of text are kept.
    pub(super) fn new(text: R, size: usize, hold: usize) -> Blocks<R> {
        Blocks {
            text,
            pending: Vec::new(),
            ended: false,
            position: 0,
            last: None,
            newline: b'\n',
            held: Held::Text(Vec::new(), hold),
            size: size.max(1),
            spare: Vec::new(),
        }
    }

    /// The next `bytes` bytes without taking them, fewer at the end of the text; true when that is all.
    pub(super) fn peek(&mut self, bytes: usize) -> Result<(&[u8], bool)> {
        let mut pending = std::mem::take(&mut self.pending);
        let read = self.read_up_to(&mut pending, bytes);
        self.pending = pending;
        read?;
        Ok((&self.pending, self.ended))
    }

    /// Passes over the next `bytes` bytes, which have been peeked at.
    pub(super) fn skip(&mut self, bytes: usize) {
        self.pending.drain(..bytes);
        self.position += bytes as u64;
    }

    /// Gives back text that was handed out last.
    pub(super) fn push_back(&mut self, mut text: Vec<u8>) {
        self.position -= text.len() as u64;
        text.append(&mut self.pending);
        self.pending = text;
    }

    /// True when nothing is left beyond what was handed out.
    pub(super) fn is_drained(&self) -> bool {
        self.ended && self.pending.is_empty()
    }

    /// True when the text ends in a line end, or is empty.
    pub(super) fn is_terminated(&self) -> bool {
        self.last.is_none_or(|last| last == self.newline)
    }

    /// Takes back the memory of a block.
    pub(super) fn recycle(&mut self, mut block: Vec<u8>) {
        if self.spare.len() < 64 && block.capacity() <= 4 * self.size.max(1 << 16) {
            block.clear();
            self.spare.push(block);
        }
    }

    /// Up to `count` blocks; fewer at the end of the text.
    pub(super) fn batch(&mut self, count: usize, quotes: Option<u8>) -> Result<Vec<Vec<u8>>> {
        let mut batch = Vec::with_capacity(count);
        while batch.len() < count {
            match self.next(quotes)? {
                Some(block) => batch.push(block),
                None => break,
            }
        }
        Ok(batch)
    }

    /// The next block of whole lines; of whole records where quotes may hold line ends and the separator `quotes` is given.
    /// At the end of the text a quote may be left open.
    pub(super) fn next(&mut self, quotes: Option<u8>) -> Result<Option<Vec<u8>>> {
        let mut block = std::mem::replace(&mut self.pending, self.spare.pop().unwrap_or_default());
        let (mut want, mut searched) = (self.size, 0);
        loop {
            self.read_up_to(&mut block, want)?;
            let all = self.ended && want >= block.len();
            let seen = want.min(block.len());
            let cut = match quotes {
                None => memchr::memrchr(self.newline, &block[searched..seen]).map(|at| searched + at + 1),
                Some(delimiter) => last_record_end(&block[..seen], delimiter, self.newline, all),
            };
            let cut = if all { Some(block.len()) } else { cut };
            if let Some(cut) = cut.filter(|&cut| cut > 0 || block.is_empty()) {
                self.pending.clear();
                self.pending.extend_from_slice(&block[cut..]);
                block.truncate(cut);
                self.position += cut as u64;
                return Ok((!block.is_empty()).then_some(block));
            }
            if want >= LONGEST_LINE {
                let what = format!("a line of more than {} MiB starts here", LONGEST_LINE >> 20);
                let remedy = if quotes.is_some() { "is a quote never closed?" } else { "is this a text file?" };
                return Err(Error::malformed(what).at(Place::byte(self.position, None)).remedy(remedy));
            }
            searched = seen;
            want = want.saturating_mul(2).min(LONGEST_LINE);
        }
    }

    fn read_up_to(&mut self, buffer: &mut Vec<u8>, bytes: usize) -> Result<()> {
        if self.ended || buffer.len() >= bytes {
            return Ok(());
        }
        let before = buffer.len();
        let wanted = (bytes - before) as u64;
        let read = self.text.by_ref().take(wanted).read_to_end(buffer)?;
        self.ended = (read as u64) < wanted;
        self.last = buffer[before..].last().copied().or(self.last);
        if let Held::Text(held, limit) = &mut self.held {
            if held.len() + read > *limit {
                self.held = Held::No;
            } else {
                held.extend_from_slice(&buffer[before..]);
            }
        }
        Ok(())
    }
}

/// End of the last whole record in `text`; an unfinished one at the end counts when `all`.
fn last_record_end(text: &[u8], delimiter: u8, newline: u8, all: bool) -> Option<usize> {
    let mut end = 0;
    while let Some(next) = (end < text.len()).then(|| record_end(text, end, delimiter, newline)).flatten() {
        if next == text.len() && text.last() != Some(&newline) && !all {
            break;
        }
        end = next;
    }
    (end > 0).then_some(end)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn blocks_are_whole_lines_and_lose_nothing() {
        let text = b"a,\"x\ny\",1\nbb\n\n\"q\"\"\n\",2\nlast";
        for size in 1..40 {
            for quotes in [None, Some(b',')] {
                let mut blocks = Blocks::new(&text[..], size, 100);
                let mut joined = Vec::new();
                while let Some(block) = blocks.next(quotes).expect("short lines") {
                    joined.extend_from_slice(&block);
                    assert!(block.ends_with(b"\n") || joined.len() == text.len());
                    assert!(quotes.is_none() || block.iter().filter(|&&byte| byte == b'"').count() % 2 == 0);
                }
                assert_eq!(joined, text);
                assert!(!blocks.is_terminated() && matches!(&blocks.held, Held::Text(held, _) if held == text));
            }
        }
    }

    #[test]
    fn an_endless_line_is_refused_in_bounded_memory() {
        let endless = std::io::repeat(b'1').take(1 << 30);
        let mut blocks = Blocks::new(endless, 1 << 20, 0);
        let error = blocks.next(None).map(|_| ()).expect_err("no line end");
        assert!(error.to_string().starts_with("byte 0: a line of more than 64 MiB"), "{error}");
        assert!(matches!(blocks.held, Held::No));
    }
}

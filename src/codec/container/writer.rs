//! Writes an archive from first to last byte; the sink need not seek.

use std::io::Write;

use super::{END, Gaps, Header, MAGIC, VERSION};
use crate::codec::block::Coded;
use crate::codec::bytes::put_count;
use crate::error::Result;

/// An archive being written.
pub struct Writer<W> {
    sink: W,
    index: Vec<u8>,
    blocks: u64,
    bytes: u64,
}

impl<W: Write> Writer<W> {
    /// Writes the header.
    ///
    /// # Errors
    /// Those of the sink.
    pub fn start(sink: W, header: &Header) -> Result<Writer<W>> {
        let mut out = MAGIC.to_vec();
        out.push(VERSION);
        let text = header.encode();
        put_count(&mut out, text.len() as u64);
        out.extend(text);
        let mut writer = Writer { sink, index: Vec::new(), blocks: 0, bytes: 0 };
        writer.sealed(out)?;
        Ok(writer)
    }

    /// Writes a block of `rows` rows of a stream from row `first` on; returns its bytes.
    ///
    /// # Errors
    /// Those of the sink.
    pub fn block(&mut self, stream: usize, first: u64, rows: usize, gaps: &Gaps, coded: Option<&Coded>) -> Result<u64> {
        let mut body = Vec::new();
        put_count(&mut body, stream as u64);
        put_count(&mut body, first);
        put_count(&mut body, rows as u64);
        put_count(&mut body, gaps.len() as u64);
        for (before, missing) in gaps {
            put_count(&mut body, *before as u64);
            put_count(&mut body, *missing as u64);
        }
        body.push(coded.map_or(1, |coded| coded.mode.number()));
        body.extend(coded.iter().flat_map(|coded| &coded.payload));
        let mut out = Vec::with_capacity(body.len() + 10);
        put_count(&mut out, body.len() as u64);
        out.extend(body);
        let bytes = self.sealed(out)?;
        for value in [stream as u64, first, rows as u64, bytes] {
            put_count(&mut self.index, value);
        }
        self.blocks += 1;
        Ok(bytes)
    }

    /// Writes the index and the end; returns the bytes of the whole.
    ///
    /// # Errors
    /// Those of the sink.
    pub fn finish(mut self) -> Result<u64> {
        let mut out = vec![0];
        put_count(&mut out, self.blocks);
        out.append(&mut self.index);
        let length = self.sealed(out)?;
        let mut tail = (length as u32).to_le_bytes().to_vec();
        tail.extend(END);
        self.sink.write_all(&tail)?;
        self.sink.flush()?;
        Ok(self.bytes + tail.len() as u64)
    }

    /// Bytes and their checksum.
    fn sealed(&mut self, mut out: Vec<u8>) -> Result<u64> {
        let sum = crc32c::crc32c(&out);
        out.extend(sum.to_le_bytes());
        self.sink.write_all(&out)?;
        self.bytes += out.len() as u64;
        Ok(out.len() as u64)
    }
}

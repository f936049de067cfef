//! Walks the chunks of a RIFF file in one pass, so that a pipe reads like a file.

use std::io::{ErrorKind, Read};

use crate::error::{Error, Result};
use crate::place::Place;

/// Byte order of every number in the file: `RIFF` is little-endian, `RIFX` big-endian.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Order {
    Little,
    Big,
}

impl Order {
    /// The 16-bit number at `at`; 0 where the bytes end sooner.
    pub(super) fn u16(self, bytes: &[u8], at: usize) -> u16 {
        let cell = cell::<2>(bytes, at);
        if self == Order::Little { u16::from_le_bytes(cell) } else { u16::from_be_bytes(cell) }
    }

    /// The 32-bit number at `at`; 0 where the bytes end sooner.
    pub(super) fn u32(self, bytes: &[u8], at: usize) -> u32 {
        let cell = cell::<4>(bytes, at);
        if self == Order::Little { u32::from_le_bytes(cell) } else { u32::from_be_bytes(cell) }
    }

    /// The 64-bit number at `at`; 0 where the bytes end sooner.
    pub(super) fn u64(self, bytes: &[u8], at: usize) -> u64 {
        let cell = cell::<8>(bytes, at);
        if self == Order::Little { u64::from_le_bytes(cell) } else { u64::from_be_bytes(cell) }
    }
}

/// The head of a chunk.
#[derive(Debug, Clone, Copy)]
pub(super) struct Chunk {
    /// Four characters such as `fmt `.
    pub id: [u8; 4],
    /// Bytes of content, as the header states them.
    pub size: u32,
    /// Offset of the head in the file.
    pub start: u64,
}

impl Chunk {
    /// The identifier as text.
    pub(super) fn name(&self) -> String {
        String::from_utf8_lossy(&self.id).into_owned()
    }

    /// Where the chunk stands.
    pub(super) fn place(&self) -> Place {
        Place::byte(self.start, Some(&self.name()))
    }
}

/// What follows the content of a chunk of odd size.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Pad {
    /// None is due, or the zero byte is there.
    Fine,
    /// It is due and missing.
    Missing,
}

/// The file as a stream of bytes with a count and a few bytes of look-ahead.
pub(super) struct Stream<'a> {
    inner: &'a mut dyn Read,
    /// Bytes read but not yet consumed.
    ahead: Vec<u8>,
    position: u64,
}

impl<'a> Stream<'a> {
    pub(super) fn new(inner: &'a mut dyn Read) -> Self {
        Self { inner, ahead: Vec::new(), position: 0 }
    }

    /// Bytes consumed so far.
    pub(super) fn position(&self) -> u64 {
        self.position
    }

    /// Fills `buffer` as far as the stream goes and tells how far that was.
    pub(super) fn fill(&mut self, buffer: &mut [u8]) -> Result<usize> {
        let held = self.ahead.len().min(buffer.len());
        buffer[..held].copy_from_slice(&self.ahead[..held]);
        self.ahead.drain(..held);
        let got = held + self.pull(&mut buffer[held..])?;
        self.position += got as u64;
        Ok(got)
    }

    /// Passes over up to `count` bytes and tells how many there were.
    pub(super) fn skip(&mut self, count: u64) -> Result<u64> {
        let mut scratch = vec![0; usize::try_from(count).unwrap_or(usize::MAX).min(SKIP_BYTES)];
        let mut done = 0;
        while done < count {
            let step = usize::try_from(count - done).unwrap_or(usize::MAX).min(scratch.len());
            let got = self.fill(&mut scratch[..step])?;
            done += got as u64;
            if got < step {
                break;
            }
        }
        Ok(done)
    }

    /// The next chunk head; `None` at the end of the file, also where fewer than eight bytes are left.
    pub(super) fn chunk(&mut self, order: Order) -> Result<Option<Chunk>> {
        let start = self.position;
        let mut head = [0; 8];
        if self.fill(&mut head)? < head.len() {
            return Ok(None);
        }
        Ok(Some(Chunk { id: cell(&head, 0), size: order.u32(&head, 4), start }))
    }

    /// Passes over the pad byte that is due after `size` bytes of content.
    ///
    /// Chunks start on even offsets; an odd one is followed by one zero byte (IBM and Microsoft, "Multimedia Programming
    /// Interface and Data Specifications 1.0", 1991). Some writers leave it out: then the next identifier starts at once.
    pub(super) fn pad(&mut self, size: u64) -> Result<Pad> {
        if size.is_multiple_of(2) {
            return Ok(Pad::Fine);
        }
        let next = self.peek(5)?;
        let identifier = |bytes: &[u8]| bytes.len() == 4 && bytes.iter().all(|b| matches!(b, 0x20..=0x7e));
        let (unpadded, padded) = (next.get(..4).is_some_and(identifier), next.get(1..5).is_some_and(identifier));
        match next.first() {
            None => Ok(Pad::Missing),
            Some(&first) if first != 0 && unpadded && !padded => Ok(Pad::Missing),
            Some(_) => self.skip(1).map(|_| Pad::Fine),
        }
    }

    /// Up to `count` of the next bytes without consuming them.
    fn peek(&mut self, count: usize) -> Result<&[u8]> {
        if self.ahead.len() < count {
            let mut more = vec![0; count - self.ahead.len()];
            let got = self.pull(&mut more)?;
            self.ahead.extend_from_slice(&more[..got]);
        }
        Ok(&self.ahead[..count.min(self.ahead.len())])
    }

    /// Reads from the underlying stream until `buffer` is full or the stream ends.
    fn pull(&mut self, buffer: &mut [u8]) -> Result<usize> {
        let mut got = 0;
        while got < buffer.len() {
            match self.inner.read(&mut buffer[got..]) {
                Ok(0) => break,
                Ok(count) => got += count,
                Err(error) if error.kind() == ErrorKind::Interrupted => {}
                Err(error) => {
                    let place = Place::byte(self.position + got as u64, None);
                    return Err(Error::io(format!("cannot read: {error}")).at(place));
                }
            }
        }
        Ok(got)
    }
}

const SKIP_BYTES: usize = 64 * 1024;

/// `N` bytes at `at`, zero where the bytes end sooner.
pub(super) fn cell<const N: usize>(bytes: &[u8], at: usize) -> [u8; N] {
    bytes.get(at..).and_then(|rest| rest.first_chunk::<N>()).copied().unwrap_or([0; N])
}

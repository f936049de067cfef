//! The fingerprint of a file, taken while it is read or written; of a long one on a thread of its own.

use std::io::{self, Read};
use std::sync::mpsc::{Receiver, SyncSender, TryRecvError, sync_channel};
use std::thread::{Builder, JoinHandle};

use sha2::{Digest, Sha256};

/// SHA-256 (FIPS 180-4) of bytes that come in parts.
pub struct Fingerprint {
    bytes: u64,
    way: Way,
}

enum Way {
    /// Digested as they come.
    Here(Sha256),
    /// Collected, and digested by another thread.
    Aside(Aside),
}

/// Bytes from which on a thread is worth its start.
const LONG: u64 = 1 << 20;
/// Bytes handed over at a time, and how many such parts may wait.
const PART: usize = 256 << 10;
const WAITING: usize = 8;

struct Aside {
    part: Vec<u8>,
    parts: SyncSender<Vec<u8>>,
    spare: Receiver<Vec<u8>>,
    thread: JoinHandle<Sha256>,
}

impl Default for Fingerprint {
    fn default() -> Self {
        Fingerprint { bytes: 0, way: Way::Here(Sha256::new()) }
    }
}

impl Fingerprint {
    /// Adds the next bytes.
    pub fn update(&mut self, bytes: &[u8]) {
        if let Way::Here(digest) = &mut self.way
            && self.bytes < LONG
            && self.bytes + bytes.len() as u64 >= LONG
            && let Some(aside) = Aside::start(digest.clone())
        {
            self.way = Way::Aside(aside);
        }
        self.bytes += bytes.len() as u64;
        match &mut self.way {
            Way::Here(digest) => digest.update(bytes),
            Way::Aside(aside) => aside.update(bytes),
        }
    }

    /// Number of bytes so far.
    pub fn bytes(&self) -> u64 {
        self.bytes
    }

    /// The digest of the bytes so far as lower-case hex.
    pub fn so_far(&mut self) -> String {
        // What follows is digested here: whoever asks has written nearly all.
        let digest = match std::mem::replace(&mut self.way, Way::Here(Sha256::new())) {
            Way::Here(digest) => digest,
            Way::Aside(aside) => aside.finish(),
        };
        self.way = Way::Here(digest.clone());
        digest.finalize().iter().map(|byte| format!("{byte:02x}")).collect()
    }

    /// The digest as lower-case hex, and the number of bytes.
    pub fn finish(mut self) -> (String, u64) {
        (self.so_far(), self.bytes)
    }
}

impl Aside {
    /// `None` where the system has no thread to give.
    fn start(mut digest: Sha256) -> Option<Aside> {
        let (parts, incoming) = sync_channel::<Vec<u8>>(WAITING);
        let (back, spare) = sync_channel(WAITING + 2);
        let work = move || {
            for part in incoming {
                digest.update(&part);
                // A full or closed way back only means that the part is not used again.
                let _ = back.try_send(part);
            }
            digest
        };
        let thread = Builder::new().name("fingerprint".to_owned()).spawn(work).ok()?;
        Some(Aside { part: Vec::with_capacity(PART), parts, spare, thread })
    }

    fn update(&mut self, mut bytes: &[u8]) {
        while !bytes.is_empty() {
            let (now, rest) = bytes.split_at(bytes.len().min(PART - self.part.len()));
            self.part.extend_from_slice(now);
            bytes = rest;
            if self.part.len() == PART {
                let next = match self.spare.try_recv() {
                    Ok(mut spare) => {
                        spare.clear();
                        spare
                    }
                    Err(TryRecvError::Empty | TryRecvError::Disconnected) => Vec::with_capacity(PART),
                };
                self.hand_over(next);
            }
        }
    }

    fn hand_over(&mut self, next: Vec<u8>) {
        // The other thread listens until this end is dropped: it never goes first.
        let _ = self.parts.send(std::mem::replace(&mut self.part, next));
    }

    fn finish(mut self) -> Sha256 {
        self.hand_over(Vec::new());
        drop(self.parts);
        // Digesting cannot panic; were it to, that is a defect that must not turn into a wrong fingerprint.
        self.thread.join().unwrap_or_else(|defect| std::panic::resume_unwind(defect))
    }
}

/// Passes a stream on and keeps the fingerprint of its bytes as stored.
pub(super) struct Fingerprinted<R> {
    stream: R,
    fingerprint: Fingerprint,
}

impl<R: Read> Fingerprinted<R> {
    pub(super) fn new(stream: R) -> Self {
        Fingerprinted { stream, fingerprint: Fingerprint::default() }
    }

    /// Reads what a format reader left unread (trailing chunks, a footer) and gives digest (lower-case hex) and count.
    pub(super) fn finish(mut self) -> io::Result<(String, u64)> {
        io::copy(&mut self, &mut io::sink())?;
        Ok(self.fingerprint.finish())
    }
}

impl<R: Read> Read for Fingerprinted<R> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let count = self.stream.read(buffer)?;
        self.fingerprint.update(&buffer[..count]);
        Ok(count)
    }
}

/// Fails at the end of the stream when its bytes are not the ones fingerprinted before.
pub(super) struct Unchanged<R> {
    stream: R,
    fingerprint: Fingerprint,
    expected: String,
}

impl<R: Read> Unchanged<R> {
    pub(super) fn new(stream: R, expected: String) -> Self {
        Unchanged { stream, fingerprint: Fingerprint::default(), expected }
    }
}

impl<R: Read> Read for Unchanged<R> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let count = self.stream.read(buffer)?;
        self.fingerprint.update(&buffer[..count]);
        // The end may be asked for more than once; once the digest has been compared there is nothing more to say.
        if count == 0 && !buffer.is_empty() && !self.expected.is_empty() {
            let expected = std::mem::take(&mut self.expected);
            if std::mem::take(&mut self.fingerprint).finish().0 != expected {
                return Err(io::Error::other("the file has changed since it was read"));
            }
        }
        Ok(count)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_digest_is_that_of_the_standard() {
        // FIPS 180-2, appendix B.1: SHA-256 of "abc".
        let expected = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
        let (digest, bytes) = Fingerprinted::new(&b"abc"[..]).finish().expect("memory can be read");
        assert_eq!((digest.as_str(), bytes), (expected, 3));
        assert!(io::copy(&mut Unchanged::new(&b"abc"[..], expected.into()), &mut io::sink()).is_ok());
        assert!(io::copy(&mut Unchanged::new(&b"abd"[..], expected.into()), &mut io::sink()).is_err());
    }

    #[test]
    fn a_long_stream_has_the_digest_of_the_standard() {
        // FIPS 180-2, appendix B.3: SHA-256 of a million "a"; here in parts that end on either side of the handover.
        let expected = "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0";
        let million = vec![b'a'; 1_000_000];
        assert_eq!(Fingerprinted::new(&million[..]).finish().map(|(digest, _)| digest).ok().as_deref(), Some(expected));
        let long = vec![b'b'; (LONG as usize) * 3 + 77];
        let whole: String = Sha256::digest(&long).iter().map(|byte| format!("{byte:02x}")).collect();
        for part in [1 << 12, PART - 1, PART, LONG as usize + 1, long.len()] {
            let mut fingerprint = Fingerprint::default();
            long.chunks(part).for_each(|bytes| fingerprint.update(bytes));
            assert_eq!(fingerprint.so_far(), whole, "parts of {part}");
            assert_eq!(fingerprint.finish(), (whole.clone(), long.len() as u64), "parts of {part}");
        }
        assert!(io::copy(&mut Unchanged::new(&long[..], whole.clone()), &mut io::sink()).is_ok());
        assert!(io::copy(&mut Unchanged::new(&long[1..], whole), &mut io::sink()).is_err());
    }
}

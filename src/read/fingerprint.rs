//! The fingerprint of a file, taken while it is read.

use std::io::{self, Read};

use sha2::{Digest, Sha256};

/// Passes a stream on and keeps the SHA-256 and the count of its bytes as stored.
pub(super) struct Fingerprinted<R> {
    stream: R,
    digest: Sha256,
    bytes: u64,
}

impl<R: Read> Fingerprinted<R> {
    pub(super) fn new(stream: R) -> Self {
        Fingerprinted { stream, digest: Sha256::new(), bytes: 0 }
    }

    /// Reads what a format reader left unread (trailing chunks, a footer) and gives digest (lower-case hex) and count.
    pub(super) fn finish(mut self) -> io::Result<(String, u64)> {
        io::copy(&mut self, &mut io::sink())?;
        Ok((hex(&self.digest.finalize()), self.bytes))
    }
}

impl<R: Read> Read for Fingerprinted<R> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let count = self.stream.read(buffer)?;
        self.digest.update(&buffer[..count]);
        self.bytes += count as u64;
        Ok(count)
    }
}

/// Fails at the end of the stream when its bytes are not the ones fingerprinted before.
pub(super) struct Unchanged<R> {
    stream: Fingerprinted<R>,
    expected: String,
}

impl<R: Read> Unchanged<R> {
    pub(super) fn new(stream: R, expected: String) -> Self {
        Unchanged { stream: Fingerprinted::new(stream), expected }
    }
}

impl<R: Read> Read for Unchanged<R> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let count = self.stream.read(buffer)?;
        if count == 0 && !buffer.is_empty() && hex(&self.stream.digest.clone().finalize()) != self.expected {
            return Err(io::Error::other("the file has changed since it was read"));
        }
        Ok(count)
    }
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
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
}

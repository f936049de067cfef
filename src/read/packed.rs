//! Files packed by gzip or Zstandard, unpacked while they are read, in bounded memory and not without end.

use std::io::{self, BufRead, BufReader, Read};

use flate2::bufread::MultiGzDecoder;
use ruzstd::decoding::errors::{FrameDecoderError, ReadFrameHeaderError};
use ruzstd::decoding::{BlockDecodingStrategy, FrameDecoder};

use crate::error::Error;
use crate::place::Place;

/// How a file is packed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Packing {
    /// RFC 1952.
    Gzip,
    /// RFC 8878.
    Zstandard,
}

/// First bytes, packing, and the extensions that go with it.
static PACKINGS: &[(&[u8], Packing, &[&str])] =
    &[(b"\x1f\x8b", Packing::Gzip, &["gz", "gzip"]), (b"\x28\xb5\x2f\xfd", Packing::Zstandard, &["zst", "zstd"])];

/// Unpacked bytes from which the ratio is watched: short files cost nothing.
const WATCHED_FROM: u64 = 64 << 20;
/// Unpacked bytes for each stored one that no table of numbers comes near: rows count up, noise does not repeat.
const LARGEST_RATIO: u64 = 400;
/// Largest history that a Zstandard frame may ask to be kept: what its own tool allows without an option.
const LARGEST_WINDOW: u64 = 128 << 20;

impl Packing {
    /// How the file that starts with `first` is packed, if it is.
    pub(super) fn of(first: &[u8]) -> Option<Packing> {
        PACKINGS.iter().find(|(magic, ..)| first.starts_with(magic)).map(|(_, packing, _)| *packing)
    }

    /// True for an extension (lower case) of a packed file.
    pub(super) fn is_extension(extension: &str) -> bool {
        PACKINGS.iter().any(|(.., extensions)| extensions.contains(&extension))
    }

    /// Name for messages.
    fn name(self) -> &'static str {
        match self {
            Packing::Gzip => "gzip",
            Packing::Zstandard => "Zstandard",
        }
    }
}

/// A packed stream as what it holds.
pub(super) struct Unpacked<R: Read> {
    packing: Packing,
    decoder: Decoder<R>,
    /// Bytes given out.
    given: u64,
    /// A stream that ends too early is taken as far as it goes.
    tolerant: bool,
    truncated: bool,
}

enum Decoder<R: Read> {
    Gzip(MultiGzDecoder<BufReader<Stored<R>>>),
    Zstandard { frames: Box<FrameDecoder>, source: BufReader<Stored<R>>, begun: bool },
}

impl<R: Read> Unpacked<R> {
    /// The contents of `stream`, which stands at its first byte. With `tolerant`, one that ends too early is read as far as
    /// it goes.
    pub(super) fn new(stream: R, packing: Packing, tolerant: bool) -> Unpacked<R> {
        let source = BufReader::with_capacity(64 << 10, Stored { stream, bytes: 0, ended: false });
        let decoder = match packing {
            Packing::Gzip => Decoder::Gzip(MultiGzDecoder::new(source)),
            Packing::Zstandard => {
                let mut frames = Box::new(FrameDecoder::new());
                frames.set_max_window_size(LARGEST_WINDOW);
                Decoder::Zstandard { frames, source, begun: false }
            }
        };
        Unpacked { packing, decoder, given: 0, tolerant, truncated: false }
    }

    /// True once a stream that ends too early was taken as far as it goes.
    pub(super) fn is_truncated(&self) -> bool {
        self.truncated
    }

    fn stored(&self) -> &Stored<R> {
        match &self.decoder {
            Decoder::Gzip(decoder) => decoder.get_ref().get_ref(),
            Decoder::Zstandard { source, .. } => source.get_ref(),
        }
    }

    /// An error of the decoder in our words; errors of the stream itself pass.
    fn refusal(&self, what: &str, cause: Option<io::Error>) -> io::Error {
        if let Some(error) = cause
            .filter(|error| error.raw_os_error().is_some() || error.get_ref().is_some_and(|inner| inner.is::<Error>()))
        {
            return error;
        }
        let stored = self.stored();
        let error = if stored.ended {
            Error::malformed(format!("the {} data end too early, after {} bytes", self.packing.name(), stored.bytes))
                .remedy("--allow-truncated reads what is there")
        } else {
            Error::malformed(format!("the {} data are damaged near here: {what}", self.packing.name()))
                .remedy("fetch the file again")
        };
        io::Error::new(io::ErrorKind::InvalidData, error.at(Place::byte(stored.bytes, None)))
    }
}

impl<R: Read> Read for Unpacked<R> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        if self.truncated || buffer.is_empty() {
            return Ok(0);
        }
        let outcome = match &mut self.decoder {
            Decoder::Gzip(decoder) => decoder.read(buffer).map_err(|error| (error.to_string(), Some(error))),
            Decoder::Zstandard { frames, source, begun } => next(frames, source, begun, buffer),
        };
        let count = match outcome {
            Ok(count) => count,
            Err((_, Some(error))) if error.kind() == io::ErrorKind::Interrupted => return Err(error),
            Err(_) if self.tolerant && self.stored().ended => {
                self.truncated = true;
                return Ok(0);
            }
            Err((what, cause)) => return Err(self.refusal(&what, cause)),
        };
        self.given += count as u64;
        let stored = self.stored().bytes;
        if self.given > WATCHED_FROM && self.given / LARGEST_RATIO > stored {
            let what =
                format!("{stored} stored bytes unpack to more than {} MiB: no record does that", self.given >> 20);
            let error = Error::malformed(what).at(Place::byte(stored, None)).remedy("unpack it first if it is one");
            return Err(io::Error::new(io::ErrorKind::InvalidData, error));
        }
        Ok(count)
    }
}

/// What a decoder says, and the error of the stream where it was that.
type Trouble = (String, Option<io::Error>);

/// The next bytes of consecutive frames, each checked against its checksum; 0 at the end.
fn next<R: Read>(
    frames: &mut FrameDecoder,
    source: &mut BufReader<Stored<R>>,
    begun: &mut bool,
    buffer: &mut [u8],
) -> Result<usize, Trouble> {
    let stream = |error: io::Error| (error.to_string(), Some(error));
    loop {
        if !*begun {
            if source.fill_buf().map_err(stream)?.is_empty() {
                return Ok(0);
            }
            match frames.init(&mut *source) {
                Ok(()) => *begun = true,
                Err(FrameDecoderError::ReadFrameHeaderError(ReadFrameHeaderError::SkipFrame { length, .. })) => {
                    let skipped = io::copy(&mut source.by_ref().take(u64::from(length)), &mut io::sink());
                    skipped.map_err(stream)?;
                    continue;
                }
                Err(error) => return Err((error.to_string(), None)),
            }
        }
        while frames.can_collect() == 0 && !frames.is_finished() {
            frames
                .decode_blocks(&mut *source, BlockDecodingStrategy::UptoBlocks(1))
                .map_err(|error| (error.to_string(), None))?;
        }
        let count = frames.read(buffer).map_err(stream)?;
        if count > 0 {
            return Ok(count);
        }
        if let (Some(stated), Some(found)) = (frames.get_checksum_from_data(), frames.get_calculated_checksum())
            && stated != found
        {
            return Err(("the checksum does not fit".to_owned(), None));
        }
        *begun = false;
    }
}

/// Counts stored bytes and knows the end.
struct Stored<R> {
    stream: R,
    bytes: u64,
    ended: bool,
}

impl<R: Read> Read for Stored<R> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let count = self.stream.read(buffer)?;
        self.bytes += count as u64;
        self.ended |= count == 0 && !buffer.is_empty();
        Ok(count)
    }
}

#[cfg(test)]
mod tests {
    use std::io::Write;

    use super::*;

    fn gzip(bytes: &[u8]) -> Vec<u8> {
        let mut encoder = flate2::write::GzEncoder::new(Vec::new(), flate2::Compression::default());
        encoder.write_all(bytes).and_then(|()| encoder.finish()).expect("memory takes it")
    }

    fn zstandard(bytes: &[u8]) -> Vec<u8> {
        ruzstd::encoding::compress_to_vec(bytes, ruzstd::encoding::CompressionLevel::Fastest)
    }

    fn unpack(stored: &[u8], tolerant: bool) -> io::Result<(Vec<u8>, bool)> {
        let packing = Packing::of(stored).expect("packed");
        let mut unpacked = Unpacked::new(stored, packing, tolerant);
        let mut bytes = Vec::new();
        unpacked.read_to_end(&mut bytes)?;
        Ok((bytes, unpacked.is_truncated()))
    }

    #[test]
    fn members_and_frames_follow_each_other() {
        let text: Vec<u8> = (0..20_000).flat_map(|n| format!("{n},{}\n", n * n % 977).into_bytes()).collect();
        for pack in [gzip, zstandard] {
            let stored = [pack(&text[..7000]), pack(&text[7000..])].concat();
            assert_eq!(unpack(&stored, false).expect("sound").0, text);
        }
        // RFC 8878, section 3.1.2: a skippable frame of three bytes.
        let skipped = [zstandard(b"a"), b"\x50\x2a\x4d\x18\x03\0\0\0xyz".to_vec(), zstandard(b"b")].concat();
        assert_eq!(unpack(&skipped, false).expect("sound").0, b"ab");
    }

    #[test]
    fn every_cut_and_every_flip_is_noticed() {
        let text: Vec<u8> = (0..300).flat_map(|n| format!("{n},{}\n", n * n % 977).into_bytes()).collect();
        for pack in [gzip, zstandard] {
            let stored = pack(&text);
            for cut in 4..stored.len() {
                let error = unpack(&stored[..cut], false).expect_err("cut");
                assert!(error.to_string().contains("end too early"), "{cut}: {error}");
                let (bytes, truncated) = unpack(&stored[..cut], true).expect("tolerated");
                assert!(truncated && text.starts_with(&bytes), "{cut}");
            }
            // RFC 8878, section 3.1.1.1.1: a Zstandard frame need not have a checksum.
            if Packing::of(&stored) == Some(Packing::Zstandard) && stored[4] & 4 == 0 {
                continue;
            }
            for at in 4..stored.len() {
                let mut flipped = stored.clone();
                flipped[at] ^= 0x10;
                // Time stamps, names and idle bits say nothing about the contents.
                if let Ok((bytes, _)) = unpack(&flipped, false) {
                    assert!(bytes == text, "{at}");
                }
            }
        }
    }

    #[test]
    fn a_bomb_is_refused_in_bounded_memory() {
        let stored = gzip(&vec![b'0'; 80 << 20]);
        let mut unpacked = Unpacked::new(&stored[..], Packing::Gzip, false);
        let error = io::copy(&mut unpacked, &mut io::sink()).expect_err("a bomb");
        assert!(error.to_string().contains("no record does that"), "{error}");
    }
}

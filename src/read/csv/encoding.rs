//! From stored bytes to UTF-8 text: byte order marks, UTF-16, and windows-1252 where the bytes are no UTF-8.

use std::io::{self, Read};

use encoding_rs::{Decoder, UTF_16BE, UTF_16LE, WINDOWS_1252};

use crate::record::Encoding;

/// Bytes converted at a time.
const CHUNK: usize = 64 << 10;

/// How the text is stored, judged by its first bytes; `whole` when there are no more. True when that is a guess.
///
/// UTF-8 unless the bytes are none; a character cut by the end of an incomplete beginning does not count.
pub(super) fn detect(first: &[u8], whole: bool) -> (Encoding, bool) {
    match first {
        [0xef, 0xbb, 0xbf, ..] => return (Encoding::Utf8Marked, false),
        [0xff, 0xfe, ..] => return (Encoding::Utf16Le, false),
        [0xfe, 0xff, ..] => return (Encoding::Utf16Be, false),
        _ => {}
    }
    let pairs = first.chunks_exact(2).take(32);
    if pairs.len() >= 4 && pairs.clone().all(|pair| pair[0] != 0 && pair[1] == 0) {
        return (Encoding::Utf16Le, true);
    }
    if pairs.len() >= 4 && pairs.clone().all(|pair| pair[0] == 0 && pair[1] != 0) {
        return (Encoding::Utf16Be, true);
    }
    match std::str::from_utf8(first) {
        Err(error) if error.error_len().is_some() || whole => (Encoding::Windows1252, true),
        _ => (Encoding::Utf8, false),
    }
}

/// A stream of text as UTF-8 without a byte order mark. UTF-8 passes through unchecked.
pub(in crate::read) struct Decoded<R> {
    stream: R,
    decoder: Option<Decoder>,
    ready: Vec<u8>,
    given: usize,
    ended: bool,
}

impl<R: Read> Decoded<R> {
    /// The text of a stream that stands at its first byte.
    ///
    /// # Errors
    /// When the stream cannot be read.
    pub(in crate::read) fn new(stream: R, encoding: Encoding) -> io::Result<Decoded<R>> {
        let (decoder, mark) = match encoding {
            Encoding::Utf8 => (None, 0),
            Encoding::Utf8Marked => (None, 3),
            // Mark included: these decoders drop it, and there may be none.
            Encoding::Utf16Le => (Some(UTF_16LE.new_decoder_with_bom_removal()), 0),
            Encoding::Utf16Be => (Some(UTF_16BE.new_decoder_with_bom_removal()), 0),
            Encoding::Windows1252 => (Some(WINDOWS_1252.new_decoder_without_bom_handling()), 0),
        };
        let mut decoded = Decoded { stream, decoder, ready: Vec::new(), given: 0, ended: false };
        io::copy(&mut decoded.stream.by_ref().take(mark), &mut io::sink())?;
        Ok(decoded)
    }
}

impl<R: Read> Read for Decoded<R> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let Some(decoder) = &mut self.decoder else { return self.stream.read(buffer) };
        while self.given == self.ready.len() && !self.ended {
            let mut raw = vec![0; CHUNK];
            let count = loop {
                match self.stream.read(&mut raw) {
                    Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
                    other => break other?,
                }
            };
            self.ended = count == 0;
            self.ready.resize(decoder.max_utf8_buffer_length(count).unwrap_or(4 * CHUNK + 16), 0);
            let (_, _, written, _) = decoder.decode_to_utf8(&raw[..count], &mut self.ready, self.ended);
            self.ready.truncate(written);
            self.given = 0;
        }
        let count = buffer.len().min(self.ready.len() - self.given);
        buffer[..count].copy_from_slice(&self.ready[self.given..self.given + count]);
        self.given += count;
        Ok(count)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn text(bytes: &[u8]) -> (Encoding, String) {
        let (encoding, _) = detect(bytes, true);
        let mut text = String::new();
        Decoded::new(bytes, encoding)
            .and_then(|mut decoded| decoded.read_to_string(&mut text))
            .expect("memory can be read");
        (encoding, text)
    }

    #[test]
    fn every_encoding_gives_the_same_text() {
        let expected = "t;a [m/s\u{b2}]\n0;1\n";
        let units: Vec<u16> = expected.encode_utf16().collect();
        let le: Vec<u8> = units.iter().flat_map(|u| u.to_le_bytes()).collect();
        let be: Vec<u8> = units.iter().flat_map(|u| u.to_be_bytes()).collect();
        for (encoding, bytes) in [
            (Encoding::Utf8, expected.as_bytes().to_vec()),
            (Encoding::Utf8Marked, ["\u{feff}", expected].concat().into_bytes()),
            (Encoding::Utf16Le, [&[0xff, 0xfe][..], &le].concat()),
            (Encoding::Utf16Be, [&[0xfe, 0xff][..], &be].concat()),
            (Encoding::Windows1252, b"t;a [m/s\xb2]\n0;1\n".to_vec()),
        ] {
            assert_eq!(text(&bytes), (encoding, expected.to_owned()));
        }
    }

    #[test]
    fn a_character_cut_by_the_beginning_is_no_fault() {
        assert_eq!(detect("a\u{b2}".as_bytes().get(..2).unwrap_or_default(), false), (Encoding::Utf8, false));
        assert_eq!(detect(b"a\xb2", true), (Encoding::Windows1252, true));
    }
}

//! Where in the input something stands: the file, line, column, byte, channel and sample of a remark or an error.

use std::fmt;

use serde::Serialize;

/// A place in the input. Every part is optional; lines, columns count from 1, bytes and samples from 0.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize)]
pub struct Place {
    /// The path as the user gave it, `-` for standard input.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub file: Option<String>,
    /// Line of a text file, from 1.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub line: Option<u64>,
    /// Column of a text file (field number, from 1).
    #[serde(skip_serializing_if = "Option::is_none")]
    pub column: Option<u64>,
    /// Byte offset in the file, from 0.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub byte: Option<u64>,
    /// Chunk of a RIFF file, such as `fmt `.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub chunk: Option<String>,
    /// Channel name.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub channel: Option<String>,
    /// Sample index, from 0.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub sample: Option<u64>,
}

impl Place {
    /// A place known only by its file.
    pub fn file(path: impl Into<String>) -> Self {
        Self { file: Some(path.into()), ..Self::default() }
    }

    /// A line (from 1) of a text file.
    pub fn line(line: u64) -> Self {
        Self { line: Some(line), ..Self::default() }
    }

    /// A line and field (both from 1) of a text file.
    pub fn field(line: u64, column: u64) -> Self {
        Self { line: Some(line), column: Some(column), ..Self::default() }
    }

    /// A byte offset (from 0) inside a chunk of a RIFF file.
    pub fn byte(byte: u64, chunk: Option<&str>) -> Self {
        Self { byte: Some(byte), chunk: chunk.map(str::to_owned), ..Self::default() }
    }

    /// A channel by name.
    pub fn channel(name: impl Into<String>) -> Self {
        Self { channel: Some(name.into()), ..Self::default() }
    }

    /// This place, with what it leaves open taken from `outer`: the innermost wins.
    #[must_use]
    pub fn within(self, outer: &Place) -> Self {
        Self {
            file: self.file.or_else(|| outer.file.clone()),
            line: self.line.or(outer.line),
            column: self.column.or(outer.column),
            byte: self.byte.or(outer.byte),
            chunk: self.chunk.or_else(|| outer.chunk.clone()),
            channel: self.channel.or_else(|| outer.channel.clone()),
            sample: self.sample.or(outer.sample),
        }
    }

    /// True when nothing is known.
    pub fn is_nowhere(&self) -> bool {
        *self == Self::default()
    }
}

impl fmt::Display for Place {
    /// `file:line:column`, or `file: byte 44, chunk "data"`, then the channel and sample where they are known.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut parts = Vec::new();
        if let Some(byte) = self.byte {
            parts.push(format!("byte {byte}"));
        }
        if let Some(chunk) = &self.chunk {
            parts.push(format!("chunk {chunk:?}"));
        }
        if let Some(channel) = &self.channel {
            parts.push(format!("channel {channel:?}"));
        }
        if let Some(sample) = self.sample {
            parts.push(format!("sample {sample}"));
        }
        let mut head = self.file.as_deref().map(escape).unwrap_or_default();
        if let Some(line) = self.line {
            let file_or_line = if head.is_empty() { "line " } else { ":" };
            head.push_str(&format!("{file_or_line}{line}"));
            if let Some(column) = self.column {
                head.push_str(&format!(":{column}"));
            }
        }
        match (head.is_empty(), parts.is_empty()) {
            (_, true) => f.write_str(&head),
            (true, false) => f.write_str(&parts.join(", ")),
            (false, false) => write!(f, "{head}: {}", parts.join(", ")),
        }
    }
}

/// Text that came from a file, safe to show in a terminal: control characters are written as escapes.
pub fn escape(text: &str) -> String {
    text.chars()
        .flat_map(|c| {
            let hostile = c.is_control()
                || matches!(c, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}');
            let escaped: Box<dyn Iterator<Item = char>> =
                if hostile { Box::new(c.escape_unicode()) } else { Box::new(std::iter::once(c)) };
            escaped
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_innermost_place_wins() {
        let inner = Place::field(3, 7);
        let outer = Place { line: Some(1), ..Place::file("bad.csv") };
        assert_eq!(inner.within(&outer).to_string(), "bad.csv:3:7");
    }

    #[test]
    fn riff_places_name_byte_and_chunk() {
        let place = Place::byte(44, Some("data")).within(&Place::file("a.wav"));
        assert_eq!(place.to_string(), "a.wav: byte 44, chunk \"data\"");
    }

    #[test]
    fn control_characters_never_reach_a_terminal() {
        assert_eq!(escape("a\x1b[31mb"), "a\\u{1b}[31mb");
    }
}

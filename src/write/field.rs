//! Fields of a line of delimited text: found with their quotes and blanks, and quoted where they must be.

use memchr::{memchr, memchr_iter, memchr2};

/// Where one field stands in a line.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Span {
    /// First byte of the field proper: after leading blanks and the opening quote.
    pub start: usize,
    /// One past its last byte: before the closing quote and trailing blanks.
    pub end: usize,
    /// First byte that belongs to the field at all, its leading blanks included.
    pub outer_start: usize,
    /// One past its last byte of all: where the delimiter or the line's end is.
    pub outer_end: usize,
}

/// The fields of a line without its line end; `delimiter` blank means runs of blanks.
pub(super) struct Fields<'a> {
    line: &'a [u8],
    delimiter: u8,
    next: Option<usize>,
}

impl<'a> Fields<'a> {
    pub(super) fn new(line: &'a [u8], delimiter: u8) -> Self {
        Self { line, delimiter, next: Some(0) }
    }
}

impl Iterator for Fields<'_> {
    type Item = Span;

    fn next(&mut self) -> Option<Span> {
        let (line, outer_start) = (self.line, self.next?);
        let blanks =
            line[outer_start..].iter().take_while(|&&b| is_blank(b) && (b != self.delimiter || b == b' ')).count();
        let mut start = outer_start + blanks;
        if self.delimiter == b' ' && start == line.len() {
            self.next = None;
            return None;
        }
        if line.get(start) == Some(&b'"') {
            start += 1;
            let end = closing_quote(line, start);
            let outer_end = self.delimiter_from((end + 1).min(line.len()));
            self.advance(outer_end);
            return Some(Span { start, end, outer_start, outer_end });
        }
        let outer_end = self.delimiter_from(start);
        let trailing = line[start..outer_end].iter().rev().take_while(|&&b| is_blank(b)).count();
        self.advance(outer_end);
        Some(Span { start, end: outer_end - trailing, outer_start, outer_end })
    }
}

impl Fields<'_> {
    fn delimiter_from(&self, from: usize) -> usize {
        let rest = &self.line[from..];
        let found = if self.delimiter == b' ' { memchr2(b' ', b'\t', rest) } else { near(self.delimiter, rest) };
        found.map_or(self.line.len(), |at| from + at)
    }

    fn advance(&mut self, outer_end: usize) {
        let step = usize::from(self.delimiter != b' ');
        self.next = (outer_end < self.line.len()).then_some(outer_end + step);
    }
}

/// Where `byte` stands first. Numbers are short: looking at them byte by byte takes less time than setting out for more.
fn near(byte: u8, text: &[u8]) -> Option<usize> {
    const NEAR: usize = 24;
    let (head, tail) = text.split_at(text.len().min(NEAR));
    head.iter().position(|&b| b == byte).or_else(|| memchr(byte, tail).map(|at| at + NEAR))
}

/// Appends a field, in quotes where it holds a delimiter, a quote or a line end (RFC 4180, section 2, rules 6 and 7).
pub(super) fn push_field(out: &mut Vec<u8>, field: &str, delimiter: u8) {
    let hostile = |b: u8| b == delimiter || (delimiter == b' ' && b == b'\t') || matches!(b, b'"' | b'\n' | b'\r');
    if !field.bytes().any(hostile) {
        return out.extend_from_slice(field.as_bytes());
    }
    out.push(b'"');
    out.extend_from_slice(field.replace('"', "\"\"").as_bytes());
    out.push(b'"');
}

/// The end of the row that starts at `from`: the index of its line end outside quotes, and the number of lines up to there;
/// `None` where the text ends sooner. Only a quote at the start of a field opens one, as in RFC 4180.
pub(super) fn row_end(text: &[u8], from: usize, delimiter: u8, line_end: u8) -> Option<(usize, u64)> {
    let (mut at, mut lines) = (from, 1);
    loop {
        let found = at + memchr2(line_end, b'"', &text[at..])?;
        if text[found] == line_end {
            return Some((found, lines));
        }
        at = found + 1;
        let before = text[from..found].iter().rfind(|&&byte| byte == delimiter || !is_blank(byte));
        if before.is_none_or(|&byte| byte == delimiter) || (delimiter == b' ' && is_blank(text[found - 1])) {
            let close = closing_quote(text, at);
            lines += memchr_iter(line_end, &text[at..close]).count() as u64;
            at = (close + 1).min(text.len());
        }
    }
}

/// Blanks that may stand around a field.
fn is_blank(byte: u8) -> bool {
    matches!(byte, b' ' | b'\t')
}

/// The quote that closes a field; a doubled quote is one quote of its content.
fn closing_quote(line: &[u8], from: usize) -> usize {
    let mut at = from;
    while let Some(found) = memchr(b'"', &line[at..]) {
        at += found;
        if line.get(at + 1) != Some(&b'"') {
            return at;
        }
        at += 2;
    }
    line.len()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn fields(line: &str, delimiter: u8) -> Vec<&str> {
        Fields::new(line.as_bytes(), delimiter).map(|span| &line[span.start..span.end]).collect()
    }

    #[test]
    fn fields_are_found_in_every_style() {
        assert_eq!(fields("0, 1.5 ,,x", b','), ["0", "1.5", "", "x"]);
        assert_eq!(fields("a,b,", b','), ["a", "b", ""]);
        assert_eq!(fields("\"1,5\",\"a \"\"b\"\"\",2", b','), ["1,5", "a \"\"b\"\"", "2"]);
        assert_eq!(fields("  0.1   -2 \t3  ", b' '), ["0.1", "-2", "3"]);
        assert_eq!(fields("1\t\t3", b'\t'), ["1", "", "3"]);
        assert_eq!(fields("", b','), [""]);
        assert_eq!(fields("\"open", b','), ["open"]);
    }

    #[test]
    fn a_quoted_line_end_ends_no_row() {
        assert_eq!(row_end(b"a,\"b\nc\"\nd", 0, b',', b'\n'), Some((7, 2)));
        assert_eq!(row_end(b"x\n \"a \"\"b\nc\" ,1\n", 2, b',', b'\n'), Some((15, 2)));
        assert_eq!(row_end(b"abc", 0, b',', b'\n'), None);
        assert_eq!(row_end(b"a,\"open\n", 0, b',', b'\n'), None);
        // Inches: a quote inside a field is a character like any other.
        assert_eq!(row_end(b"1,5\" pipe\n2", 0, b',', b'\n'), Some((9, 1)));
        assert_eq!(row_end(b"1 \"a\n\" 2\n", 0, b' ', b'\n'), Some((8, 2)));
    }

    #[test]
    fn fields_are_quoted_where_they_must_be() {
        let mut out = Vec::new();
        for field in ["plain", "a,b", "say \"x\""] {
            push_field(&mut out, field, b',');
            out.push(b'|');
        }
        assert_eq!(out, b"plain|\"a,b\"|\"say \"\"x\"\"\"|");
    }
}

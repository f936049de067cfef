//! The fields of one line of text: where they end, and what each looks like.

use std::borrow::Cow;

use super::missing::Missing;
use super::{civil, number};

/// Most fields of a line that are looked at; the rest of a longer line is passed over.
pub(super) const MOST: usize = 65_535;

/// How fields are separated and numbers printed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Dialect {
    /// Separator; blank stands for runs of blanks and tabs.
    pub(super) delimiter: u8,
    /// Decimal mark.
    pub(super) decimal: u8,
    /// Mark between groups of three digits.
    pub(super) thousands: Option<u8>,
}

/// One field: its text without surrounding blanks and quotes.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Field<'a> {
    pub(super) text: Cow<'a, [u8]>,
    pub(super) quoted: bool,
}

impl Field<'_> {
    /// The text, with what is no UTF-8 replaced.
    pub(super) fn string(&self) -> String {
        String::from_utf8_lossy(&self.text).into_owned()
    }
}

/// What a field looks like under one dialect.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Look {
    /// A number.
    Number,
    /// A number with marks between groups of digits that were not declared.
    Grouped,
    /// A date, a clock time, or both.
    Stamp,
    /// A spelling of a missing value.
    Missing,
    /// Anything else.
    Text,
}

/// Splits the record that starts at `from` into fields and gives the byte behind its line end; `None` when a quote is still
/// open at the end of `text`. Only a quote at the start of a field opens one, as in RFC 4180; a doubled quote inside is one.
pub(super) fn split<'a>(
    text: &'a [u8],
    from: usize,
    delimiter: u8,
    newline: u8,
    fields: &mut Vec<Field<'a>>,
) -> Option<usize> {
    fields.clear();
    let blanks = delimiter == b' ';
    let mut at = from;
    loop {
        at += blank_count(&text[at..], delimiter);
        if blanks && !fields.is_empty() && at_end(text, at, newline) {
            // Blanks before the line end separate nothing.
            at += text[at..].iter().position(|&byte| byte == newline).unwrap_or(text.len() - at);
            break;
        }
        let quoted = text.get(at) == Some(&b'"');
        let mut content = Cow::Borrowed(&text[..0]);
        if quoted {
            (content, at) = quotation(text, at + 1)?;
        }
        let start = at;
        at += text[at..].iter().position(|&b| b == newline || separates(b, delimiter)).unwrap_or(text.len() - at);
        let rest = text[start..at].trim_ascii();
        if !quoted {
            content = Cow::Borrowed(rest);
        } else if !rest.is_empty() {
            content.to_mut().extend_from_slice(rest);
        }
        fields.push(Field { text: content, quoted });
        if fields.len() > MOST {
            at += memchr::memchr(newline, &text[at..]).unwrap_or(text.len() - at);
        }
        match text.get(at) {
            Some(&byte) if byte != newline => at += 1,
            _ => break,
        }
    }
    Some(if at < text.len() { at + 1 } else { at })
}

/// The byte behind the line end of the record that starts at `from`; `None` as for `split`.
pub(super) fn record_end(text: &[u8], from: usize, delimiter: u8, newline: u8) -> Option<usize> {
    let mut at = from;
    loop {
        at += blank_count(&text[at..], delimiter);
        if text.get(at) == Some(&b'"') {
            at = quotation_end(text, at + 1)?;
        }
        at += text[at..].iter().position(|&b| b == newline || separates(b, delimiter)).unwrap_or(text.len() - at);
        match text.get(at) {
            Some(&byte) if byte != newline => at += 1,
            Some(_) => return Some(at + 1),
            None => return Some(at),
        }
    }
}

/// The fields of one whole line; a quote left open runs to the line's end.
pub(super) fn fields(line: &[u8], delimiter: u8) -> Vec<Field<'_>> {
    let mut fields = Vec::new();
    fields_into(line, delimiter, &mut fields);
    fields
}

/// As `fields`, into a vector that is lent.
pub(super) fn fields_into<'a>(line: &'a [u8], delimiter: u8, fields: &mut Vec<Field<'a>>) {
    // A line holds no line end, so any byte that cannot occur in it will do; an open quote is then text.
    if split(line, 0, delimiter, b'\n', fields).is_none() {
        let plain = line.split(|&byte| separates(byte, delimiter)).map(<[u8]>::trim_ascii);
        fields.clear();
        fields.extend(
            plain
                .filter(|text| delimiter != b' ' || !text.is_empty())
                .take(MOST + 1)
                .map(|text| Field { text: Cow::Borrowed(text), quoted: false }),
        );
    }
}

/// Longest text that is looked at as a number, in bytes.
const LONGEST_NUMBER: usize = 4096;

/// What `field` looks like.
pub(super) fn look(field: &Field<'_>, dialect: Dialect, missing: &Missing) -> Look {
    let text: &[u8] = &field.text;
    if text.len() > LONGEST_NUMBER {
        return Look::Text;
    }
    match number(text, dialect) {
        Some(value) if missing.sentinel(value) => Look::Missing,
        Some(_) => Look::Number,
        None if missing.spelling(text) => Look::Missing,
        None if civil::parse(text).is_some() => Look::Stamp,
        None if grouped(text, dialect.decimal) => Look::Grouped,
        None => Look::Text,
    }
}

/// The whole of `text` as a number, with declared group marks removed.
pub(super) fn number(text: &[u8], dialect: Dialect) -> Option<f64> {
    // Between blanks, `0,` is a whole number and a comma rather than a decimal number without decimals.
    let bare_mark = dialect.delimiter == b' ' && dialect.decimal == b',' && text.ends_with(b",");
    if let Some(value) = number::whole(text, dialect.decimal) {
        return (!bare_mark).then_some(value);
    }
    let mark = dialect.thousands.filter(|mark| text.contains(mark))?;
    grouped_by(text, mark, dialect.decimal).then(|| {
        let plain: Vec<u8> = text.iter().copied().filter(|&byte| byte != mark).collect();
        number::whole(&plain, dialect.decimal)
    })?
}

/// True for `1.200,50`, `1,200,300.5`, `1'200.5`: groups of three, then the decimal mark or several groups.
pub(super) fn grouped(text: &[u8], decimal: u8) -> bool {
    // The first group has three digits at most, and a mark follows it.
    let signed = usize::from(matches!(text.first(), Some(b'-' | b'+')));
    let digits = text[signed..].iter().take(4).take_while(|byte| byte.is_ascii_digit()).count();
    if !(1..=3).contains(&digits) || !matches!(text.get(signed + digits), Some(b'.' | b',' | b'\'' | b' ')) {
        return false;
    }
    [b'.', b',', b'\'', b' ']
        .iter()
        .filter(|&&mark| mark != decimal && text.contains(&mark))
        .any(|&mark| grouped_by(text, mark, decimal) && (text.contains(&decimal) || mark == b'\'' || mark == b' '))
}

/// True when the digits before the decimal mark stand in groups of three, the first of one to three.
fn grouped_by(text: &[u8], mark: u8, decimal: u8) -> bool {
    let unsigned = text.strip_prefix(b"-").or_else(|| text.strip_prefix(b"+")).unwrap_or(text);
    let whole = unsigned.split(|&byte| byte == decimal || byte == b'e' || byte == b'E').next().unwrap_or_default();
    let mut groups = whole.split(|&byte| byte == mark);
    let digits = |group: &[u8]| !group.is_empty() && group.iter().all(u8::is_ascii_digit);
    mark != decimal
        && groups.next().is_some_and(|first| digits(first) && first.len() <= 3)
        && groups.all(|group| digits(group) && group.len() == 3)
        && number::scan(&unsigned[whole.len()..], decimal).is_none_or(|rest| rest.len == unsigned.len() - whole.len())
}

/// True for a byte that ends a field.
#[inline]
pub(super) fn separates(byte: u8, delimiter: u8) -> bool {
    byte == delimiter || (delimiter == b' ' && byte == b'\t')
}

/// Number of blanks at the start of `text`; a tab is one unless it separates fields.
#[inline]
pub(super) fn blank_count(text: &[u8], delimiter: u8) -> usize {
    text.iter().take_while(|&&byte| byte == b' ' || (byte == b'\t' && delimiter != b'\t')).count()
}

fn at_end(text: &[u8], at: usize, newline: u8) -> bool {
    match text.get(at) {
        None => true,
        Some(&byte) => byte == newline || (byte == b'\r' && text.get(at + 1).is_none_or(|&next| next == newline)),
    }
}

/// Text of a quotation whose first byte is `from`, and the byte behind its closing quote.
fn quotation(text: &[u8], from: usize) -> Option<(Cow<'_, [u8]>, usize)> {
    let end = quotation_end(text, from)?;
    let inner = &text[from..end - 1];
    if !inner.contains(&b'"') {
        return Some((Cow::Borrowed(inner.trim_ascii()), end));
    }
    let mut plain = Vec::with_capacity(inner.len());
    let mut at = 0;
    while at < inner.len() {
        plain.push(inner[at]);
        at += if inner[at] == b'"' { 2 } else { 1 };
    }
    Some((Cow::Owned(plain.trim_ascii().to_vec()), end))
}

fn quotation_end(text: &[u8], from: usize) -> Option<usize> {
    let mut at = from;
    loop {
        at += memchr::memchr(b'"', text.get(at..)?)? + 1;
        if text.get(at) != Some(&b'"') {
            return Some(at);
        }
        at += 1;
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    fn strings(line: &str, delimiter: u8) -> Vec<String> {
        fields(line.as_bytes(), delimiter).iter().map(Field::string).collect()
    }

    #[test]
    fn fields_are_trimmed_and_quotes_removed() {
        assert_eq!(strings("0.1, \"1,5\" ,x\r", b','), ["0.1", "1,5", "x"]);
        assert_eq!(strings("  1   2\t3  ", b' '), ["1", "2", "3"]);
        assert_eq!(strings("a,,", b','), ["a", "", ""]);
        assert_eq!(strings("\"say \"\"x\"\"\",5\" pipe", b','), ["say \"x\"", "5\" pipe"]);
        assert_eq!(strings("\"open,1", b','), ["\"open", "1"]);
        assert_eq!(strings("", b','), [""]);
    }

    #[test]
    fn looks_depend_on_the_decimal_mark() {
        let comma = Dialect { delimiter: b';', decimal: b',', thousands: None };
        let point = Dialect { delimiter: b',', decimal: b'.', thousands: None };
        let look_of = |text: &str, dialect| {
            look(&Field { text: Cow::Borrowed(text.as_bytes()), quoted: false }, dialect, &Missing::default())
        };
        assert_eq!(look_of("1,5", comma), Look::Number);
        assert_eq!(look_of("1,5", point), Look::Text);
        assert_eq!(look_of("1.200,50", comma), Look::Grouped);
        assert_eq!(look_of("1,200.50", point), Look::Grouped);
        assert_eq!(look_of("1.20,50", comma), Look::Text);
        assert_eq!(look_of("10:00:00", point), Look::Stamp);
        assert_eq!(look_of("n/a", point), Look::Missing);
        assert_eq!(number(b"1.200,50", Dialect { thousands: Some(b'.'), ..comma }), Some(1200.5));
        assert_eq!(number(b"1.20,50", Dialect { thousands: Some(b'.'), ..comma }), None);
    }

    proptest! {
        /// Against the csv crate 1.4, an independent reader of RFC 4180.
        #[test]
        fn quoted_records_are_split_as_by_the_csv_crate(
            cells in proptest::collection::vec(proptest::collection::vec("[ab,;\"\n]{0,5}", 2..4), 1..5),
            delimiter in prop_oneof![Just(b','), Just(b';')],
        ) {
            let mut writer = csv::WriterBuilder::new().flexible(true).delimiter(delimiter).from_writer(Vec::new());
            for row in &cells {
                writer.write_record(row).expect("memory takes all");
            }
            let text = writer.into_inner().expect("memory takes all");
            let mut reader = csv::ReaderBuilder::new().flexible(true).has_headers(false).delimiter(delimiter).from_reader(&text[..]);
            let (mut at, mut found) = (0, Vec::new());
            for record in reader.byte_records() {
                let record = record.expect("own text is valid");
                let end = split(&text, at, delimiter, b'\n', &mut found).expect("all quotes are closed");
                prop_assert_eq!(record_end(&text, at, delimiter, b'\n'), Some(end));
                let own: Vec<Vec<u8>> = found.iter().map(|field| field.text.to_vec()).collect();
                let theirs: Vec<Vec<u8>> = record.iter().map(|field| field.trim_ascii().to_vec()).collect();
                prop_assert_eq!(own, theirs);
                at = end;
            }
            prop_assert_eq!(at, text.len());
        }
    }
}

//! The ways in which loggers and spreadsheets say that a value is missing.

use super::number;

/// Spellings understood without being declared, in lower case.
const USUAL: &[&str] = &[
    "",
    "nan",
    "-nan",
    "+nan",
    "na",
    "n/a",
    "#n/a",
    "#na",
    "#nv",
    "null",
    "none",
    "nil",
    "-",
    "--",
    "---",
    "----",
    "-----",
    "inf",
    "+inf",
    "-inf",
    "infinity",
    "+infinity",
    "-infinity",
    "1.#ind",
    "-1.#ind",
    "1.#qnan",
    "-1.#qnan",
    "1.#inf",
    "-1.#inf",
    "#value!",
    "#div/0!",
    "#num!",
];

/// What counts as a missing value in one file.
#[derive(Debug, Clone, Default)]
pub(super) struct Missing {
    declared: Vec<Vec<u8>>,
    sentinels: Vec<f64>,
    nul_rows: bool,
}

impl Missing {
    /// The usual spellings and the declared ones; a declared number is a sentinel in whatever spelling.
    pub(super) fn new(declared: &[String], decimal: u8) -> Missing {
        let trimmed = declared.iter().map(|token| token.trim());
        Missing {
            sentinels: trimmed
                .clone()
                .filter_map(|token| {
                    number::whole(token.as_bytes(), b'.').or_else(|| number::whole(token.as_bytes(), decimal))
                })
                .collect(),
            nul_rows: trimmed.clone().any(|token| token == "NUL"),
            declared: trimmed.map(|token| token.as_bytes().to_vec()).collect(),
        }
    }

    /// True when the trimmed `text`, which is no number, is a spelling of a missing value.
    pub(super) fn spelling(&self, text: &[u8]) -> bool {
        let usual = text.len() <= 10 && {
            let mut lower = [0_u8; 10];
            lower[..text.len()].copy_from_slice(text);
            lower.make_ascii_lowercase();
            USUAL.iter().any(|usual| usual.as_bytes() == &lower[..text.len()])
        };
        usual || self.declared.iter().any(|token| token == text)
    }

    /// True when a number was declared to mean a missing value.
    #[inline]
    pub(super) fn sentinel(&self, value: f64) -> bool {
        self.sentinels.contains(&value)
    }

    /// True when any number was.
    #[inline]
    pub(super) fn has_sentinels(&self) -> bool {
        !self.sentinels.is_empty()
    }

    /// True when lines of NUL bytes were declared to be lost rows.
    pub(super) fn nul_rows(&self) -> bool {
        self.nul_rows
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn usual_spellings_are_known_and_numbers_only_when_declared() {
        let missing = Missing::new(&[], b'.');
        for text in ["", "nan", "NaN", "NA", "N/A", "null", "#N/A", "-", "1.#IND", "inf", "----"] {
            assert!(missing.spelling(text.as_bytes()), "{text}");
        }
        assert!(
            !missing.spelling(b"x") && !missing.spelling(b"a long text that is none") && !missing.sentinel(-9999.0)
        );
        let declared = Missing::new(&["-9999".into(), " x ".into()], b'.');
        assert!(declared.sentinel(-9999.0) && !declared.sentinel(9999.0) && declared.spelling(b"x"));
    }
}

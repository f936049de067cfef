//! Names of inputs and outputs: as lists give them, as results show them, and outputs made by a template.

use std::ffi::OsString;
use std::path::{Component, Path, PathBuf};

use serde::{Deserialize, Serialize};

use crate::error::{Error, Result};
use crate::place::escape;

/// The folder of result files inside the output folder.
pub const RESULTS: &str = "results";

/// A name as results show it. Names are bytes; JSON is text.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Shown {
    /// The name, with U+FFFD for what is no UTF-8.
    pub path: String,
    /// Its bytes in hex, where it is no UTF-8.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub path_bytes: Option<String>,
}

impl Shown {
    /// The shown form of a name.
    pub fn of(path: &Path) -> Shown {
        let bytes = path.as_os_str().as_encoded_bytes();
        let path_bytes = path.to_str().is_none().then(|| bytes.iter().map(|byte| format!("{byte:02x}")).collect());
        Shown { path: path.to_string_lossy().into_owned(), path_bytes }
    }

    /// The name again; `None` where its bytes are no name.
    pub fn name(&self) -> Option<PathBuf> {
        let Some(hex) = &self.path_bytes else { return Some(PathBuf::from(&self.path)) };
        let digits = hex.as_bytes().chunks(2).map(|pair| u8::from_str_radix(std::str::from_utf8(pair).ok()?, 16).ok());
        path_of(digits.collect::<Option<Vec<u8>>>()?)
    }
}

/// The path of which these are the bytes; `None` where the system has no such paths.
pub fn path_of(bytes: Vec<u8>) -> Option<PathBuf> {
    #[cfg(unix)]
    {
        use std::os::unix::ffi::OsStringExt;
        Some(PathBuf::from(OsString::from_vec(bytes)))
    }
    #[cfg(not(unix))]
    {
        String::from_utf8(bytes).ok().map(PathBuf::from)
    }
}

/// How output names follow from input names, such as `{folder}/{stem}_clean.{ext}`.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Template {
    parts: Vec<Part>,
}

#[derive(Debug, Clone, PartialEq, Eq)]
enum Part {
    Text(String),
    Name,
    Stem,
    Extension,
    Folder,
    Number,
}

const WORDS: &[(&str, Part)] = &[
    ("name", Part::Name),
    ("stem", Part::Stem),
    ("ext", Part::Extension),
    ("folder", Part::Folder),
    ("number", Part::Number),
];

impl Default for Template {
    /// The input's own name.
    fn default() -> Template {
        Template { parts: vec![Part::Name] }
    }
}

impl Template {
    /// From text with `{name}` (file name), `{stem}` (without extension), `{ext}`, `{folder}` (folders as given, without a
    /// root) and `{number}` (place in the list, from 0, six digits).
    ///
    /// # Errors
    /// `Usage` for other words in braces.
    pub fn parse(text: &str) -> Result<Template> {
        let wrong = |what: String| {
            let words: Vec<String> = WORDS.iter().map(|(word, _)| format!("{{{word}}}")).collect();
            Error::usage(format!("--name \"{}\": {what}", escape(text))).remedy(format!("use {}", words.join(" ")))
        };
        let (mut parts, mut rest) = (Vec::new(), text);
        while let Some(open) = rest.find(['{', '}']) {
            parts.push(Part::Text(rest[..open].to_owned()));
            let Some((word, after)) = rest[open..].strip_prefix('{').and_then(|inner| inner.split_once('}')) else {
                return Err(wrong("a brace without its partner".to_owned()));
            };
            let known = WORDS.iter().find(|(known, _)| *known == word);
            parts.push(known.ok_or_else(|| wrong(format!("unknown word \"{}\"", escape(word))))?.1.clone());
            rest = after;
        }
        parts.push(Part::Text(rest.to_owned()));
        parts.retain(|part| *part != Part::Text(String::new()));
        Ok(Template { parts })
    }

    /// The output's name for an input, relative to the output folder.
    ///
    /// # Errors
    /// `Usage` where that would not lie inside the folder.
    pub fn expand(&self, input: &Path, number: u64) -> Result<PathBuf> {
        let mut name = OsString::new();
        for part in &self.parts {
            match part {
                Part::Text(text) => name.push(text),
                Part::Name => name.push(input.file_name().unwrap_or_default()),
                Part::Stem => name.push(input.file_stem().unwrap_or_default()),
                Part::Extension => name.push(input.extension().unwrap_or_default()),
                Part::Number => name.push(format!("{number:06}")),
                Part::Folder => {
                    let folders = input.parent().unwrap_or(Path::new("")).components();
                    let plain = folders.filter(|part| matches!(part, Component::Normal(_)));
                    name.push(plain.collect::<PathBuf>());
                }
            }
        }
        let text = PathBuf::from(name);
        // An empty {folder} leaves a slash in front.
        let inner = text.strip_prefix("/").ok().filter(|_| self.parts.first() == Some(&Part::Folder)).unwrap_or(&text);
        inside(inner).map_err(|error| match error.advice() {
            Some(_) => error,
            None => error.remedy("give it an output name by --name or in a manifest"),
        })
    }
}

/// The name in plain form: no `.`, no repeated separators.
///
/// # Errors
/// `Usage` for a name that is empty, leads out of the output folder or into the folder of results.
pub fn inside(name: &Path) -> Result<PathBuf> {
    let wrong = |what: &str| Error::usage(format!("output name \"{}\": {what}", escape(&name.to_string_lossy())));
    let mut plain = PathBuf::new();
    for part in name.components() {
        match part {
            Component::Normal(part) => plain.push(part),
            Component::CurDir => {}
            _ => return Err(wrong("leads out of the output folder").remedy("name a file inside it")),
        }
    }
    if plain.as_os_str().is_empty() || name.as_os_str().as_encoded_bytes().ends_with(b"/") {
        return Err(wrong("not the name of a file"));
    }
    if plain.starts_with(RESULTS) {
        return Err(wrong("that folder is kept for result files").remedy("choose another name"));
    }
    Ok(plain)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn outputs_are_named_after_inputs() {
        for (template, input, output) in [
            ("{name}", "/data/run 1/ax.csv", "ax.csv"),
            ("{folder}/{stem}_clean.{ext}", "/data/./run1/ax.csv", "data/run1/ax_clean.csv"),
            ("{folder}/{name}", "ax.csv", "ax.csv"),
            ("{number}.wav", "x.csv", "000007.wav"),
            ("a/{stem}", "../up/x.csv", "a/x"),
        ] {
            let found = Template::parse(template).expect(template).expand(Path::new(input), 7);
            assert_eq!(found.expect(template), Path::new(output), "{template}");
        }
    }

    #[test]
    fn outputs_stay_in_their_folder() {
        for template in ["/tmp/{name}", "../{name}", "results/{name}", "", "x/../../y", "{stem}/"] {
            let found = Template::parse(template).and_then(|t| t.expand(Path::new("a.csv"), 0));
            assert!(found.is_err(), "{template}: {found:?}");
        }
        for template in ["{stam}", "{", "}", "{stem"] {
            assert!(Template::parse(template).is_err(), "{template}");
        }
    }

    #[cfg(unix)]
    #[test]
    fn names_that_are_no_text_come_back_from_json() {
        for bytes in [&b"a\xff.csv"[..], b"a\nb.csv", "ä.csv".as_bytes()] {
            let path = path_of(bytes.to_vec()).expect("a path");
            let json = serde_json::to_string(&Shown::of(&path)).expect("JSON");
            assert_eq!(serde_json::from_str::<Shown>(&json).expect("JSON").name(), Some(path), "{json}");
        }
    }
}

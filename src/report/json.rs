//! JSON as the schema documents it: no NaN, one trailing newline.

use serde::Serialize;

use crate::error::{Error, Result};

/// Pretty JSON with a newline at the end. Numbers that are not finite become `null`.
///
/// # Errors
/// `Io` when a value cannot be represented, which no report contains.
pub fn to_json<T: Serialize>(value: &T) -> Result<String> {
    let mut text = serde_json::to_string_pretty(value).map_err(|e| Error::io(format!("no JSON: {e}")))?;
    text.push('\n');
    Ok(text)
}

//! Spikes: single samples that stand out are replaced before anything else is done.

use crate::error::{Error, Result};

use super::corner::quoted;
use super::step::{Effect, Frame, Setting};
use super::treatment::Treatments;

#[derive(Debug)]
struct Despike;

/// Reads the argument of `--despike`.
pub(super) fn despike(text: &str) -> Result<Box<dyn Setting>> {
    match text.trim() {
        "fill" => Ok(Box::new(Despike)),
        other => Err(Error::usage(format!("{}: no way to treat spikes", quoted(other)))
            .remedy("write fill to replace them; audit lists them without touching anything")),
    }
}

impl Setting for Despike {
    fn resolve(&self, _: &Frame<'_>) -> Result<Effect> {
        Ok(Effect { treatments: Treatments { despike: true, ..Treatments::default() }, ..Effect::default() })
    }
}

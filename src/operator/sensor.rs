//! Correction of a sensor, cable or amplifier by its calibration table: the inverse of its measured response.

use std::path::PathBuf;
use std::sync::Arc;

use realfft::num_complex::Complex;

use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::read::{self, Input, ReadOptions};

use super::calibration::{BOOST, Calibration, Coarse};
use super::corner::figure;
use super::gain::{Gain, Series};
use super::step::{CornerPoint, Effect, Frame, Part, Setting, Stage};

#[derive(Debug)]
struct Correct {
    path: String,
    sha256: String,
    table: Arc<Calibration>,
}

/// Reads the table that `--response` names: columns of frequency, gain and phase.
pub(super) fn response(text: &str) -> Result<Box<dyn Setting>> {
    let path = text.trim();
    if path.is_empty() || path == "-" {
        return Err(Error::usage("no table").remedy("name a CSV file with the columns frequency, gain, phase"));
    }
    let options = ReadOptions { time_column: Some("none".to_owned()), ..ReadOptions::default() };
    let place = || Place::file(path);
    let raw = read::read(Input::Path(PathBuf::from(path)), &options).map_err(|error| error.at(place()))?;
    let columns: Vec<_> = raw.channels.iter().map(|c| (c.name.as_str(), c.unit.label(), c.values.as_slice())).collect();
    let table = Calibration::from_columns(&columns).map_err(|error| error.at(place()))?;
    Ok(Box::new(Correct { path: path.to_owned(), sha256: raw.source.sha256, table: Arc::new(table) }))
}

impl Setting for Correct {
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let (axis, table) = (frame.axis, &self.table);
        if !axis.is_time() {
            return Err(Error::usage(format!("{}: the record's axis is a length in {}", frame.option, axis.unit()))
                .remedy("correct records in time"));
        }
        let (rate_hz, nyquist_hz) = (axis.rate_base(), 0.5 * axis.rate_base());
        let [low, high] = table.span_hz();
        if low >= nyquist_hz {
            return Err(Error::unsupported(format!(
                "{} {}: the table begins at {} Hz, and the record ends at {} Hz",
                frame.option,
                self.path,
                figure(low),
                figure(nyquist_hz)
            ))
            .remedy("give a table of the record's own band"));
        }
        let findings = self.remarks(nyquist_hz);
        // Edges are judged by the fastest structure that four samples show.
        let top = high.min(0.25 * rate_hz);
        let points = [(low, "lowest of the table"), (top, "highest of the table")];
        let corners = points
            .into_iter()
            .filter(|&(hz, _)| hz < nyquist_hz && (hz < top || hz == top))
            .map(|(hz, text)| CornerPoint { text: text.to_owned(), cycles: hz / rate_hz })
            .collect();
        let part = Part {
            kind: "response",
            key: "response",
            value: self.path.clone(),
            stage: Stage::Response,
            corners,
            gain: Arc::new(Inverse { table: table.clone(), sha256: self.sha256.clone(), rate_hz }),
        };
        Ok(Effect { parts: vec![part], findings, ..Effect::default() })
    }
}

impl Correct {
    fn remarks(&self, nyquist_hz: f64) -> Vec<Finding> {
        let (table, path) = (&self.table, &self.path);
        let [_, high] = table.span_hz();
        let mut findings = Vec::new();
        let mut tell = |code, text: String| findings.push(Finding::new(code, text).at(Place::file(path)));
        if !table.has_phase() {
            let text =
                "the table has no phase: magnitudes are corrected and delays are not, which changes the wave form";
            tell("response_without_phase", text.to_owned());
        }
        if let Some(Coarse { from_hz, to_hz, decibels, degrees }) = table.coarsest() {
            let text = format!(
                "coarse between {} and {} Hz, where the response changes by {} dB and {} degrees: a resonance between points \
                 cannot be corrected",
                figure(from_hz),
                figure(to_hz),
                figure((decibels * 10.0).round() / 10.0),
                figure(degrees.round())
            );
            tell("response_coarse", text);
        }
        if let Some([from, to]) = table.limited_hz() {
            let (from, to) = (figure(from), figure(to));
            let span = if from == to { format!("at {to} Hz") } else { format!("between {from} and {to} Hz") };
            let text = format!("the correction is limited to {} dB {span}", figure(20.0 * BOOST.log10()));
            tell("response_limited", text);
        }
        if high < nyquist_hz {
            let text = format!(
                "the table ends at {} Hz and the record at {} Hz: the last point is held between them",
                figure(high),
                figure(nyquist_hz)
            );
            tell("response_held", text);
        }
        findings
    }
}

/// The limited inverse at a sampling rate.
#[derive(Debug)]
struct Inverse {
    table: Arc<Calibration>,
    sha256: String,
    rate_hz: f64,
}

impl Gain for Inverse {
    fn at(&self, f: f64) -> f64 {
        self.response(f).norm()
    }
    fn response(&self, f: f64) -> Complex<f64> {
        self.table.inverse(f * self.rate_hz)
    }
    fn is_real(&self) -> bool {
        false
    }
    fn series(&self) -> Series {
        // Held gain and a phase in proportion to frequency: a delay, exp(i w d), to the fifth power.
        let (gain, per_hz) = self.table.at_zero();
        let delay = per_hz * self.rate_hz / std::f64::consts::TAU;
        let mut power = gain;
        let terms: Vec<f64> = (0..6)
            .map(|k| {
                let term = power;
                power *= delay / f64::from(k + 1);
                term
            })
            .collect();
        Series::of_quotient(&terms, &[1.0])
    }
    fn fingerprint(&self) -> Option<&str> {
        Some(&self.sha256)
    }
    fn extent_samples(&self) -> f64 {
        4.0 * self.rate_hz / self.table.span_hz()[0]
    }
    fn highest(&self) -> f64 {
        (self.table.span_hz()[1] / self.rate_hz).min(0.5)
    }
}

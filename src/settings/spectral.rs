//! What is asked of a spectrum: method, segments, window, bands, lines.

use std::fmt;
use std::str::FromStr;

use crate::baseline::BaselineKind;
use crate::condition::ExtensionChoice;
use crate::error::{Error, Result};
use crate::operator::{Corner, Range};
use crate::place::escape;
use crate::record::Axis;
use crate::spectrum::{Detrend, Fraction, WINDOWS, Window};

/// Options of a spectrum; `default()` is Welch's density under a Hann window.
#[derive(Debug, Clone)]
pub struct SpectrumOptions {
    /// Density or coefficients.
    pub method: Method,
    /// Window of the segments.
    pub window: &'static Window,
    /// Share by which segments overlap; what suits the window when `None`.
    pub overlap: Option<f64>,
    /// Length of a segment; chosen from the record when `None`.
    pub segment: Option<SegmentLength>,
    /// What is taken off first.
    pub detrend: Detrend,
    /// Confidence of the limits, 0 to 1.
    pub confidence: f64,
    /// Bands whose RMS is wanted.
    pub bands: Vec<Range>,
    /// Octave or one-third-octave levels.
    pub octaves: Option<Fraction>,
    /// Spectral lines listed at most.
    pub lines: usize,
    /// The road class of a profile.
    pub road: bool,
    /// A second extension to lay over the first.
    pub against: Option<Against>,
}

impl Default for SpectrumOptions {
    fn default() -> Self {
        SpectrumOptions {
            method: Method::default(),
            window: &WINDOWS[0],
            overlap: None,
            segment: None,
            detrend: Detrend::default(),
            confidence: 0.95,
            bands: Vec::new(),
            octaves: None,
            lines: 5,
            road: false,
            against: None,
        }
    }
}

/// How the spectrum is formed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Method {
    /// Averaged windowed segments.
    #[default]
    Welch,
    /// Sine tapers, their number chosen line by line.
    Adaptive,
    /// So many sine tapers at every line.
    Sine(u32),
    /// The coefficients in the basis of the ends.
    Basis,
}

impl FromStr for Method {
    type Err = Error;

    fn from_str(text: &str) -> Result<Self> {
        let count = text.strip_prefix("sine:").and_then(|count| count.parse().ok());
        match (text, count) {
            ("welch", _) => Ok(Method::Welch),
            ("sine", _) => Ok(Method::Adaptive),
            ("basis", _) => Ok(Method::Basis),
            (_, Some(count)) => Ok(Method::Sine(count)),
            _ => Err(Error::usage(format!("not a method: \"{}\"", escape(text)))
                .remedy("use welch, sine, sine:COUNT or basis")),
        }
    }
}

impl fmt::Display for Method {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Method::Welch => f.write_str("welch"),
            Method::Adaptive => f.write_str("sine"),
            Method::Sine(count) => write!(f, "sine:{count}"),
            Method::Basis => f.write_str("basis"),
        }
    }
}

/// The length of a segment as asked for.
#[derive(Debug, Clone, PartialEq)]
pub enum SegmentLength {
    /// In samples.
    Samples(usize),
    /// As a duration or length, or by the spacing of its lines.
    Cycle(Corner),
}

impl SegmentLength {
    /// In samples on an axis.
    ///
    /// # Errors
    /// `Usage` for a time on a length axis or the reverse.
    pub fn resolve(&self, axis: &Axis) -> Result<usize> {
        match self {
            SegmentLength::Samples(count) => Ok(*count),
            SegmentLength::Cycle(corner) => {
                if corner.measure().is_time() != axis.is_time() {
                    return Err(Error::usage(format!("--segment {corner}: the record's axis is in {}", axis.unit()))
                        .remedy("give it in samples, or as a piece of the axis"));
                }
                let samples = (axis.rate_base() / corner.frequency()).round();
                if samples > axis.len() as f64 {
                    return Err(Error::unsupported(format!("--segment {corner}: longer than the record"))
                        .remedy("give a shorter one"));
                }
                Ok(samples as usize)
            }
        }
    }
}

impl FromStr for SegmentLength {
    type Err = Error;

    fn from_str(text: &str) -> Result<Self> {
        if let Ok(count) = text.trim().parse() {
            return Ok(SegmentLength::Samples(count));
        }
        Corner::parse(text).map(SegmentLength::Cycle).map_err(|error| {
            Error::usage(error.what())
                .remedy("write samples (512), a duration (2s), or the spacing of its lines (0.5Hz)")
        })
    }
}

/// A second extension, with its baseline where one is named.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Against {
    /// The extension.
    pub extension: ExtensionChoice,
    /// Its baseline.
    pub baseline: Option<BaselineKind>,
}

impl FromStr for Against {
    type Err = Error;

    fn from_str(text: &str) -> Result<Self> {
        let (extension, baseline) = text.split_once('+').map_or((text, None), |(a, b)| (a, Some(b)));
        Ok(Against { extension: extension.parse()?, baseline: baseline.map(str::parse).transpose()? })
    }
}

/// A share such as `50%` or `0.5`, within 0 to below 1.
pub fn share(text: &str) -> Result<f64> {
    let text = text.trim();
    let value = match text.strip_suffix('%') {
        Some(percent) => percent.trim().parse::<f64>().map(|v| v / 100.0),
        None => text.parse::<f64>(),
    };
    value.ok().filter(|v| (0.0..1.0).contains(v)).ok_or_else(|| {
        Error::usage(format!("\"{}\" is no share from 0 to below 1", escape(text))).remedy("write it as in 50% or 0.5")
    })
}

/// `octave`, `third` or `none`.
pub fn fraction(text: &str) -> Result<Option<Fraction>> {
    match text {
        "none" => Ok(None),
        "octave" => Ok(Some(Fraction::Octave)),
        "third" => Ok(Some(Fraction::Third)),
        _ => Err(Error::usage(format!("\"{}\" is not known", escape(text))).remedy("use third, octave or none")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn spellings_are_understood_and_faults_refused() {
        for text in ["welch", "sine", "sine:7", "basis"] {
            assert_eq!(text.parse::<Method>().expect("a method").to_string(), text);
        }
        for text in ["sine:", "sine:x", "sine:-1", "Welch", ""] {
            assert!(text.parse::<Method>().is_err(), "{text}");
        }
        let axis = Axis::from_rate_hz(200.0, 2400, crate::record::RateSource::Given).expect("an axis");
        for (text, samples) in [("512", 512), ("2s", 400), ("0.5Hz", 400), ("500ms", 100)] {
            assert_eq!(text.parse::<SegmentLength>().and_then(|s| s.resolve(&axis)), Ok(samples), "{text}");
        }
        assert!("2mm".parse::<SegmentLength>().expect("a length").resolve(&axis).is_err());
        assert!("-3".parse::<SegmentLength>().is_err() && "2".parse::<SegmentLength>().is_ok());
        assert_eq!((share("50%"), share("0.25")), (Ok(0.5), Ok(0.25)));
        for text in ["100%", "1", "-1%", "x", "NaN", "inf"] {
            assert!(share(text).is_err(), "{text}");
        }
        let against: Against = "odd+line".parse().expect("an extension with its baseline");
        assert_eq!(against.baseline, Some(BaselineKind::Line));
        assert!("odd+curve".parse::<Against>().is_err() && "+line".parse::<Against>().is_err());
    }
}

//! What a page draws of one conditioned channel beside its ends: before, after, and what the operators did by frequency.

use crate::basis::Planner;
use crate::operator::Chain;
use crate::record::{Axis, Channel};
use crate::report::page::{Passage, Spectra, thinned_along};
use crate::report::{ChannelReport, Picture};
use crate::spectrum::{self, Density, Detrend, Segments};
use crate::unit::Unit;

/// Points kept of a spectrum.
const KEPT: usize = 1000;
/// Shorter records get no density: its segments would hold too little.
const SHORTEST: usize = 64;

/// The passage of a channel through a chain; `axis` is that of the output.
pub fn passage(
    raw: Channel<'_>,
    output: &[f64],
    axis: &Axis,
    chain: &Chain,
    report: &ChannelReport,
    picture: Option<Picture>,
    planner: &Planner,
) -> Passage {
    let before = density(raw.samples, raw.axis.rate_base(), planner);
    let after = density(output, axis.rate_base(), planner);
    let spectra = before.zip(after).map(|(before, after)| Spectra {
        frequency_unit: axis.frequency_label(),
        units: [&report.unit_in, &report.unit].map(|unit| unit_of(unit, axis)),
        gain: gain(&before, chain, raw.axis.step_base()),
        before: points(&before),
        after: points(&after),
    });
    Passage::of(raw, output, axis, report.unit == report.unit_in, picture, spectra)
}

/// Welch's density in Hann segments of an eighth of the record, which show what an operator does without drowning it in detail.
fn density(samples: &[f64], rate: f64, planner: &Planner) -> Option<Density> {
    if samples.len() < SHORTEST {
        return None;
    }
    let window = spectrum::window("hann").ok()?;
    let segments = Segments::new(samples.len(), (samples.len() / 8).clamp(32, 1 << 16), window.overlap).ok()?;
    spectrum::welch(samples, rate, segments, window, Detrend::default(), planner).ok()
}

/// The lines above zero that have a logarithm.
fn points(density: &Density) -> Vec<[f64; 2]> {
    let kept = (1..density.len()).filter(|&k| density.values[k] > 0.0 && density.values[k].is_finite());
    let (places, values): (Vec<f64>, Vec<f64>) = kept.map(|k| (density.frequency(k), density.values[k])).unzip();
    thinned_along(&places, &values, KEPT)
}

/// The gain at the lines of a density, without the powers of frequency of integrals and derivatives.
fn gain(density: &Density, chain: &Chain, step: f64) -> Vec<[f64; 2]> {
    let places: Vec<f64> = (1..density.len()).map(|k| density.frequency(k)).collect();
    let values: Vec<f64> = places.iter().map(|frequency| chain.gain((frequency * step).min(0.5))).collect();
    thinned_along(&places, &values, KEPT)
}

fn unit_of(unit: &Unit, axis: &Axis) -> String {
    if unit.is_unknown() { String::new() } else { format!("({unit})²/{}", axis.frequency_label()) }
}

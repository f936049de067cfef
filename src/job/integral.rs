//! What a run tells of an integral: its constants, its uncertainty, the warnings, and the columns beside it.

use crate::audit::endstate::EndState;
use crate::basis::Planner;
use crate::condition::{self, Integral, Outcome, default_baseline, scaling};
use crate::ends::{Ends, Parity};
use crate::error::{Finding, Result};
use crate::integral::{Band, HighPass, Solver, Trial, corner_for, high_pass_area};
use crate::numeric::{floor, least_squares, quantum, sum};
use crate::operator::{Chain, Request};
use crate::place::Place;
use crate::record::Channel;
use crate::report::{Amount, CornerReport, IntegralReport, SigmaReport, figure};
use crate::settings::{Beside, Settings};
use crate::verdict::Tolerance;

use super::chain::objection;

/// Report, remarks and columns of one integrated channel.
pub struct Formed {
    pub report: IntegralReport,
    pub notes: Vec<Finding>,
    pub columns: Vec<Column>,
    /// Standard deviation of the result, sample by sample.
    pub deviations: Vec<f64>,
    /// The record less offset and drift, filtered, whose integral the result is.
    pub corrected: Vec<f64>,
}

/// A column that stands beside the channels.
#[derive(Debug, Clone)]
pub struct Column {
    /// Name with its unit, as the header shows it.
    pub name: String,
    /// One value a sample.
    pub values: Vec<f64>,
}

/// A standard deviation above this share of the peak is warned about, and so is a drift that moves the result by it.
const MUCH: f64 = 0.1;
/// Share of the peak that a high-pass is named for where nothing is asked.
const WANTED: f64 = 0.05;
/// A net displacement above so many standard deviations is one that a high-pass destroys.
const CERTAIN: f64 = 3.0;
/// End error of least-squares constants, in amplitudes over cycles in the record: without drift and with it, measured on
/// steady records of a few tones.
const LEAST_SQUARES_ERROR: [f64; 2] = [1.5, 2.1];

/// Of the integral of one channel; `past` is the continuation that was used, if any.
pub fn form(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    outcome: &Outcome,
    past: Option<[&[f64]; 2]>,
    planner: &Planner,
) -> Result<Option<Formed>> {
    let Some(integral) = &outcome.integral else { return Ok(None) };
    let (samples, axis, output) = (channel.samples, channel.axis, &outcome.output);
    let (turns, unit) = (chain.turns(), &outcome.unit);
    let (_, factor) = scaling(channel, chain);
    let first = outcome.ends.first_position();
    let peak = output.iter().map(|v| v.abs()).fold(0.0, f64::max);

    let noise = floor::sigma(samples).max(quantum::step(samples) / 12f64.sqrt());
    let sigma = |high: bool| -> Result<Vec<f64>> {
        let band = band(chain, integral, high)?;
        Ok((0..samples.len()).map(|n| band.deviation(n as f64 + first) * noise * factor.abs()).collect())
    };
    let deviations = sigma(true)?;
    let largest = (0..deviations.len()).max_by(|&a, &b| deviations[a].total_cmp(&deviations[b])).unwrap_or(0);
    let relative = |value: f64| if peak > 0.0 { value / peak } else { 0.0 };
    let sigma_report = SigmaReport {
        largest: deviations[largest],
        at: axis.stamp(largest),
        first: deviations[0],
        middle: deviations[deviations.len() / 2],
        last: deviations[deviations.len() - 1],
        relative: relative(deviations[largest]),
    };

    let wanted = match settings.target_sigma.as_ref().map(|t| t.resolve("--target-sigma", unit)).transpose()? {
        Some(Tolerance::Absolute(value)) => value,
        Some(Tolerance::Share(share)) => share * peak,
        None => WANTED * peak,
    };
    let area = high_pass_area(|u| chain.shape().high_pass(u), turns);
    let cycles = corner_for(wanted / factor.abs(), noise, area, turns);
    let corner = (cycles > 0.0 && cycles < 0.5).then(|| CornerReport {
        sigma: wanted,
        frequency: cycles * axis.rate_base(),
        unit: axis.frequency_label(),
    });

    let (slow_share, cycles_in_record) = slow(output, planner)?;
    let corrected = condition::corrected(channel, chain, outcome, past, planner)?;
    let difference = reintegration(channel, chain, outcome, &corrected, planner)?;

    let step = axis.step_base();
    let amount = |value: f64, times: i32| {
        let (unit, factor) = channel.unit.turned(times, axis.unit());
        Amount { value: value * step.powi(-times) * factor, unit }
    };
    let twice = |value: f64| (turns == -2).then(|| amount(value, -2));
    let report = IntegralReport {
        times: -turns,
        conditions: chain.conditions().to_string(),
        end_state: EndState::of(samples),
        initial_first: amount(integral.constants.first, -1),
        initial_second: twice(integral.constants.second),
        offset: amount(integral.constants.offset, 0),
        drift: amount(integral.constants.drift, 1),
        final_first: amount(integral.arrival.first, -1),
        final_second: twice(integral.arrival.second),
        noise: Amount { value: noise, unit: channel.unit.clone() },
        noise_density: (2.0 * noise * noise * step).sqrt(),
        sigma: sigma_report,
        corner,
        peak,
        slow_share,
        reintegration_difference: difference,
        reintegration_relative: relative(difference),
    };
    let net = net_displacement(chain, integral, factor, &sigma)?;
    let notes = Warnings { channel, chain, integral, report: &report, factor, cycles_in_record, net, output }.all();
    let column = |what: &str, unit: &crate::unit::Unit, values: Vec<f64>| {
        let unit = if unit.is_unknown() { String::new() } else { format!(" [{}]", unit.label()) };
        Column { name: format!("{} {what}{unit}", channel.name), values }
    };
    let mut columns = Vec::new();
    if settings.beside.contains(&Beside::Sigma) {
        columns.push(column("sigma", unit, deviations.clone()));
    }
    if settings.beside.contains(&Beside::Corrected) {
        columns.push(column("corrected", channel.unit, corrected.clone()));
    }
    Ok(Some(Formed { report, notes, columns, deviations, corrected }))
}

/// The band of noise 1, with the high-pass that follows the integral or without it.
fn band(chain: &Chain, integral: &Integral, high: bool) -> Result<Band> {
    let second = chain.high_pass().filter(|_| high);
    let gain = |f: f64| chain.integral().map_or(1.0, |pass| pass.gain(f));
    let high_gain = |f: f64| second.map_or(1.0, |second| second.gain(f));
    Band::of(&Trial {
        solver: &integral.resolved.solver,
        turns: chain.turns(),
        gain: &gain,
        high: second.and_then(|s| s.lowest_corner()).map(|corner| HighPass { gain: &high_gain, corner }),
        length: integral.length,
        offset_samples: integral.resolved.offset_samples,
    })
}

/// The displacement from start to end that a high-pass takes out, with its standard deviation; `None` where none is known
/// or nothing takes it out.
fn net_displacement(
    chain: &Chain,
    integral: &Integral,
    factor: f64,
    sigma: &impl Fn(bool) -> Result<Vec<f64>>,
) -> Result<Option<(f64, f64)>> {
    let fitted = matches!(integral.resolved.solver, Solver::Steady { .. } | Solver::ZeroMean);
    if chain.high_pass().is_none() || fitted {
        return Ok(None);
    }
    let (constants, arrival) = (&integral.constants, &integral.arrival);
    let net = if chain.turns() == -1 { arrival.first - constants.first } else { arrival.second - constants.second };
    Ok(Some(((net * factor).abs(), sigma(false)?.last().copied().unwrap_or(0.0))))
}

/// Share of the mean square about the mean that is slower than one cycle in the record, and the cycles in the record of
/// the strongest cosine.
fn slow(output: &[f64], planner: &Planner) -> Result<(f64, f64)> {
    let plan = planner.plan(Ends::EVEN, output.len())?;
    let mut work = output.to_vec();
    plan.forward(&mut work, &mut vec![0.0; plan.scratch_len()]);
    let total = sum::sum_of_squares(work.get(1..).unwrap_or_default());
    let strongest = (1..work.len()).max_by(|&a, &b| work[a].abs().total_cmp(&work[b].abs())).unwrap_or(0);
    let share = if total > 0.0 { work[1] * work[1] / total } else { 0.0 };
    Ok((share, strongest as f64 / 2.0))
}

/// Integrates the corrected record as an integral without a high-pass is formed by default, fits the constants that it
/// cannot know, and takes the largest difference to the output.
fn reintegration(
    channel: Channel<'_>,
    chain: &Chain,
    outcome: &Outcome,
    corrected: &[f64],
    planner: &Planner,
) -> Result<f64> {
    let request = Request::parse("integrate", if chain.turns() == -1 { "1" } else { "2" })?;
    let (plain, _) = Chain::resolve(&[request], chain.shape(), channel.axis, corrected.len())?;
    let ends = match outcome.ends {
        Ends::Mirror { left: Parity::Even, right: Parity::Even, .. } | Ends::Periodic => outcome.ends,
        other => Ends::EVEN.seated(other.seat()),
    };
    let channel = Channel { samples: corrected, ..channel };
    let again = condition::condition(channel, &plain, ends, default_baseline(ends, &plain), planner)?.output;
    let apart = || outcome.output.iter().zip(&again).enumerate().map(|(n, (a, b))| (n as f64, a - b));
    let degree = if chain.turns() == -1 { 0 } else { 1 };
    let constants = least_squares::polynomial(apart(), -0.5, again.len() as f64 - 0.5, degree);
    Ok(apart().map(|(x, difference)| (difference - constants.at(x)).abs()).fold(0.0, f64::max))
}

struct Warnings<'a> {
    channel: Channel<'a>,
    chain: &'a Chain,
    integral: &'a Integral,
    report: &'a IntegralReport,
    factor: f64,
    cycles_in_record: f64,
    net: Option<(f64, f64)>,
    output: &'a [f64],
}

impl Warnings<'_> {
    fn all(&self) -> Vec<Finding> {
        let found =
            [self.noise(), self.end_state(), self.least_squares(), self.drift(), self.slow(), self.net_displacement()];
        let place = || Place::channel(self.channel.name);
        found.into_iter().flatten().map(|(code, text)| Finding::new(code, text).at(place())).collect()
    }

    fn filtered(&self) -> bool {
        self.chain.high_pass().is_some()
    }

    fn shown(&self, value: f64) -> String {
        let unit = self.channel.unit.turned(self.chain.turns(), self.channel.axis.unit()).0;
        format!("{} {unit}", figure(value, 3)).trim_end().to_owned()
    }

    fn noise(&self) -> Option<(&'static str, String)> {
        let sigma = &self.report.sigma;
        (sigma.relative > MUCH).then(|| {
            let text = format!(
                "the record's noise leaves the integral uncertain by {} (standard deviation) at {} {}: {} % of its peak",
                self.shown(sigma.largest),
                figure(sigma.at, 6),
                self.channel.axis.unit(),
                figure(100.0 * sigma.relative, 3)
            );
            ("integral_uncertain", text)
        })
    }

    fn end_state(&self) -> Option<(&'static str, String)> {
        let objection = objection(self.chain.conditions(), self.report.end_state?, self.filtered())?;
        Some(("end_conditions_doubtful", objection.text))
    }

    fn least_squares(&self) -> Option<(&'static str, String)> {
        let Solver::Steady { drift } = self.integral.resolved.solver else { return None };
        if self.filtered() || self.chain.turns() == -1 || self.cycles_in_record <= 0.0 {
            return None;
        }
        let amplitude = std::f64::consts::SQRT_2 * sum::rms(self.output);
        let error = LEAST_SQUARES_ERROR[usize::from(drift)] * amplitude / self.cycles_in_record;
        let text = format!(
            "the least-squares constants are expected to be wrong by about {} at the ends: {} cycles of the strongest \
             component in the record; --highpass takes most of that out",
            self.shown(error),
            figure(self.cycles_in_record, 3)
        );
        Some(("end_constants_uncertain", text))
    }

    fn drift(&self) -> Option<(&'static str, String)> {
        if self.chain.turns() != -2 || self.filtered() {
            return None;
        }
        let moved = (self.integral.constants.drift * self.integral.length.powi(3) / 12.0 * self.factor).abs();
        (moved > MUCH * self.report.peak).then(|| {
            let text = format!(
                "the solved drift of {} {} moves the end by {}: without it the result would be another",
                figure(self.report.drift.value, 3),
                self.report.drift.unit,
                self.shown(moved)
            );
            ("drift_decides", text)
        })
    }

    fn slow(&self) -> Option<(&'static str, String)> {
        (self.report.slow_share > MUCH && !self.filtered()).then(|| {
            let text = format!(
                "{} % of the result's mean square is slower than one cycle in the record: the end conditions decide it",
                figure(100.0 * self.report.slow_share, 3)
            );
            ("slower_than_record", text)
        })
    }

    fn net_displacement(&self) -> Option<(&'static str, String)> {
        let (net, deviation) = self.net?;
        (net > CERTAIN * deviation && net > 0.0).then(|| {
            let text = format!(
                "the end conditions give a net change of {} from start to end (standard deviation {}), and --highpass \
                 takes it out",
                self.shown(net),
                self.shown(deviation)
            );
            ("highpass_takes_net_change", text)
        })
    }
}

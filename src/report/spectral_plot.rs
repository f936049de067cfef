//! The picture of a spectrum as SVG: densities with their limits, or coefficients, over logarithmic axes.

use plotters::coord::combinators::LogCoord;
use plotters::prelude::*;
use plotters::style::Color;

use super::plot::{COLOURS, DASHES, failed, legend_line};
use crate::error::{Error, Result};
use crate::place::escape;
use crate::report::{ChannelSpectrum, SpectrumReport, Trace};

const WIDTH: u32 = 1200;
const HEIGHT: u32 = 560;
/// Points drawn for a curve at most; each stands for the smallest and the largest value of its stretch.
const POINTS: usize = 2000;
/// Decades shown below the largest density at most; half as many of amplitudes.
const DECADES: f64 = 10.0;

/// An SVG with one panel a channel.
///
/// # Errors
/// `Unsupported` when every density is zero; `Io` when the drawing fails.
pub fn spectrum_svg(report: &SpectrumReport) -> Result<String> {
    let drawn: Vec<(&ChannelSpectrum, Vec<Curve<'_>>)> = report
        .channels
        .iter()
        .map(|channel| (channel, curves(channel)))
        .filter(|(_, curves)| !curves.is_empty())
        .collect();
    if drawn.is_empty() {
        return Err(Error::unsupported("every channel is silent, so there is no picture"));
    }
    let mut text = String::new();
    {
        let area = SVGBackend::with_string(&mut text, (WIDTH, HEIGHT * drawn.len() as u32)).into_drawing_area();
        area.fill(&WHITE).map_err(failed)?;
        for ((channel, curves), block) in drawn.iter().zip(area.split_evenly((drawn.len(), 1))) {
            draw(channel, curves, &block)?;
        }
        area.present().map_err(failed)?;
    }
    Ok(text)
}

/// What is drawn of a trace.
struct Curve<'a> {
    trace: &'a Trace,
    /// Frequency and value, both above zero.
    line: Vec<(f64, f64)>,
    /// Frequency, lower and upper limit.
    limits: Vec<(f64, f64, f64)>,
}

fn curves(channel: &ChannelSpectrum) -> Vec<Curve<'_>> {
    let curve = |trace| {
        let (line, limits) = points(trace);
        Curve { trace, line, limits }
    };
    channel.traces.iter().map(curve).filter(|curve| !curve.line.is_empty()).collect()
}

/// Frequency, lower and upper limit.
type Limited = (f64, f64, f64);

/// Points of a trace at frequencies above zero; silent lines are left out, since a logarithm has none.
fn points(trace: &Trace) -> (Vec<(f64, f64)>, Vec<Limited>) {
    if let Some(series) = trace.density.as_ref().and_then(|density| density.series.as_ref()) {
        let line = thinned(&series.frequency, |k| series.density[k]);
        let lower = thinned(&series.frequency, |k| series.lower[k]);
        let upper = thinned(&series.frequency, |k| series.upper[k]);
        let limits = lower.iter().zip(&upper).map(|(a, b)| (a.0, a.1, b.1)).collect();
        return (line, limits);
    }
    match trace.coefficients.as_ref().and_then(|found| found.series.as_ref()) {
        Some(series) => (thinned(&series.frequency, |k| series.amplitude[k].abs()), Vec::new()),
        None => (Vec::new(), Vec::new()),
    }
}

/// At most [`POINTS`] points that keep the smallest and the largest value of every stretch.
fn thinned(frequency: &[f64], value: impl Fn(usize) -> f64) -> Vec<(f64, f64)> {
    let kept: Vec<usize> =
        (0..frequency.len()).filter(|&k| frequency[k] > 0.0 && value(k) > 0.0 && value(k).is_finite()).collect();
    let stretch = kept.len().div_ceil(POINTS / 2).max(1);
    if stretch == 1 || kept.len() <= POINTS {
        return kept.into_iter().map(|k| (frequency[k], value(k))).collect();
    }
    let mut found = Vec::new();
    for part in kept.chunks(stretch) {
        let extreme = |better: &dyn Fn(f64, f64) -> bool| {
            part.iter().copied().reduce(|a, b| if better(value(b), value(a)) { b } else { a })
        };
        if let (Some(low), Some(high)) = (extreme(&|b, a| b < a), extreme(&|b, a| b > a)) {
            let (first, second) = (low.min(high), low.max(high));
            found.push((frequency[first], value(first)));
            if second != first {
                found.push((frequency[second], value(second)));
            }
        }
    }
    found
}

type Area<'a> = DrawingArea<SVGBackend<'a>, plotters::coord::Shift>;
type Chart<'a, 'b> = ChartContext<'a, SVGBackend<'b>, Cartesian2d<LogCoord<f64>, LogCoord<f64>>>;

fn draw(channel: &ChannelSpectrum, curves: &[Curve<'_>], block: &Area<'_>) -> Result<()> {
    let first = curves[0].trace;
    let (what, frequency_unit) = match (&first.density, &first.coefficients) {
        (Some(density), _) => {
            let share = 100.0 * density.confidence;
            (format!("density [{}], band: {share} % limits", density.unit), density.frequency_unit)
        }
        (None, Some(found)) => (format!("amplitude of the coefficients{}", bracketed(first)), found.frequency_unit),
        (None, None) => return Ok(()),
    };
    let title = format!("{}: {what}", escape(&channel.name));
    let block = block.titled(&title, ("sans-serif", 18)).map_err(failed)?;
    let (head, panel) = block.split_vertically(26);
    let step = WIDTH as i32 / (curves.len() as i32 + 1);
    for (index, curve) in curves.iter().enumerate() {
        legend_line(&head, index, 20 + step * index as i32, &escape(&curve.trace.label))?;
    }
    let mut x = (f64::INFINITY, 0.0_f64);
    let mut y = (f64::INFINITY, 0.0_f64);
    for curve in curves {
        for &(f, v) in &curve.line {
            x = (x.0.min(f), x.1.max(f));
            y = (y.0.min(v), y.1.max(v));
        }
        for &(_, low, high) in &curve.limits {
            y = (y.0.min(low), y.1.max(high));
        }
    }
    let decades = if first.density.is_some() { DECADES } else { DECADES / 2.0 };
    y.0 = y.0.max(y.1 * 10_f64.powf(-decades));
    // One point, or one value: an axis needs a width.
    let widened = |(low, high): (f64, f64)| if high > low * 1.01 { low..high } else { low / 2.0..high * 2.0 };
    let along = if frequency_unit == "Hz" { "frequency" } else { "spatial frequency" };
    let mut chart: Chart<'_, '_> = ChartBuilder::on(&panel)
        .margin(8)
        .margin_right(28)
        .x_label_area_size(40)
        .y_label_area_size(84)
        .build_cartesian_2d(widened(x).log_scale(), widened((y.0 / 1.5, y.1 * 1.5)).log_scale())
        .map_err(failed)?;
    let value = if first.density.is_some() { "density" } else { "amplitude" };
    let unit = match &first.density {
        Some(density) => format!(" [{}]", density.unit),
        None => bracketed(first),
    };
    chart
        .configure_mesh()
        .x_desc(format!("{along} [{frequency_unit}]"))
        .y_desc(format!("{value}{unit}"))
        .label_style(("sans-serif", 13))
        .light_line_style(RGBColor(235, 235, 235))
        .x_label_formatter(&|v| short(*v))
        .y_label_formatter(&|v| short(*v))
        .draw()
        .map_err(failed)?;
    let floor = y.0 / 1.5;
    for (index, curve) in curves.iter().enumerate() {
        add(&mut chart, curve, index, floor)?;
    }
    Ok(())
}

fn add(chart: &mut Chart<'_, '_>, curve: &Curve<'_>, index: usize, floor: f64) -> Result<()> {
    let colour = COLOURS[index % COLOURS.len()];
    let mut outline: Vec<(f64, f64)> = curve.limits.iter().map(|(f, low, _)| (*f, low.max(floor))).collect();
    outline.extend(curve.limits.iter().rev().map(|(f, _, high)| (*f, high.max(floor))));
    if !outline.is_empty() {
        chart.draw_series(std::iter::once(Polygon::new(outline, colour.mix(0.18)))).map_err(failed)?;
    }
    let style = colour.stroke_width(if index == 0 { 2 } else { 1 });
    let (dash, gap) = DASHES[index % DASHES.len()];
    // What lies below the picture is left out, not drawn along its edge.
    for piece in curve.line.split(|(_, value)| *value < floor).filter(|piece| !piece.is_empty()) {
        let points = piece.iter().copied();
        if gap == 0 {
            chart.draw_series(LineSeries::new(points, style)).map_err(failed)?;
        } else {
            chart.draw_series(DashedLineSeries::new(points, dash, gap, style)).map_err(failed)?;
        }
    }
    let marks = curve.trace.lines.iter().filter_map(|found| {
        let nearest =
            curve.line.iter().min_by(|a, b| (a.0 - found.frequency).abs().total_cmp(&(b.0 - found.frequency).abs()))?;
        (nearest.1 >= floor).then(|| Circle::new(*nearest, 4, colour.stroke_width(1)))
    });
    chart.draw_series(marks).map_err(failed)?;
    Ok(())
}

fn bracketed(trace: &Trace) -> String {
    if trace.unit.is_unknown() { String::new() } else { format!(" [{}]", trace.unit) }
}

/// A tick in short: axes step by multiplication, whose rounding nobody wants to read.
fn short(value: f64) -> String {
    let rounded: f64 = format!("{value:.3e}").parse().unwrap_or(value);
    if (1e-3..1e5).contains(&rounded) { format!("{rounded}") } else { format!("{rounded:e}") }
}

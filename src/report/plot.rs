//! The picture of a comparison as SVG: the record with every continuation past its ends, and the outputs over the edges.

use plotters::prelude::*;
use plotters::style::Color;

use crate::error::{Error, Result};
use crate::place::escape;
use crate::record::Axis;
use crate::report::TrustedReport;
use crate::verdict::Unjudged;

/// What is drawn for one channel.
#[derive(Debug, Clone)]
pub struct Picture {
    /// Channel name.
    pub name: String,
    /// Unit of the record.
    pub unit_in: String,
    /// Unit of the output.
    pub unit: String,
    /// The record's axis.
    pub axis: Axis,
    /// The record.
    pub record: Vec<f64>,
    /// The forecast first, then the candidates; none where nothing was judged.
    pub curves: Vec<Curve>,
    /// Standard deviation of the output under the forecast, by distance from the left and the right end.
    pub deviation: [Vec<f64>; 2],
    /// Edge zone at each end, in samples.
    pub zone: usize,
    /// What `condition` would take.
    pub takes: String,
    /// Its trusted span.
    pub trusted: Option<TrustedReport>,
    /// Why there is nothing but the record to draw.
    pub not_judged: Option<Unjudged>,
}

/// One extension.
#[derive(Debug, Clone)]
pub struct Curve {
    /// Its name.
    pub name: &'static str,
    /// Samples past the left and the right end, counted outwards.
    pub past: [Vec<f64>; 2],
    /// The output over the record.
    pub output: Vec<f64>,
}

/// Okabe and Ito (2008), "Color Universal Design": distinct for colour-blind readers. Forecast first.
pub(super) const COLOURS: [RGBColor; 8] = [
    RGBColor(0, 0, 0),
    RGBColor(230, 159, 0),
    RGBColor(86, 180, 233),
    RGBColor(0, 158, 115),
    RGBColor(213, 94, 0),
    RGBColor(204, 121, 167),
    RGBColor(0, 114, 178),
    RGBColor(140, 130, 20), // a darker yellow: the published one vanishes on white paper
];

/// Dash and gap in pixels, the second code beside colour; no gap is a solid line.
pub(super) const DASHES: [(u32, u32); 8] = [(1, 0), (10, 4), (2, 3), (6, 3), (12, 3), (4, 4), (8, 6), (3, 6)];

const WIDTH: u32 = 1200;
const HEIGHT: u32 = 760;
/// Half the samples shown at each end of a record that was not judged.
const ALONE: usize = 200;

/// An SVG with one block a channel: four panels, or the record at its two ends where nothing was judged.
///
/// # Errors
/// `Io` when the drawing fails.
pub fn svg(pictures: &[Picture]) -> Result<String> {
    let mut text = String::new();
    {
        let height = |picture: &Picture| if picture.curves.is_empty() { HEIGHT / 2 } else { HEIGHT };
        let total = pictures.iter().map(height).sum::<u32>().max(1);
        let area = SVGBackend::with_string(&mut text, (WIDTH, total)).into_drawing_area();
        area.fill(&WHITE).map_err(failed)?;
        let mut rest = area.clone();
        for picture in pictures {
            let (block, below) = rest.split_vertically(height(picture));
            draw(picture, &block)?;
            rest = below;
        }
        area.present().map_err(failed)?;
    }
    Ok(text)
}

type Area<'a> = DrawingArea<SVGBackend<'a>, plotters::coord::Shift>;

fn draw(picture: &Picture, block: &Area<'_>) -> Result<()> {
    let name = escape(&picture.name);
    let title = match picture.not_judged {
        Some(reason) => format!("{name}: not judged: {reason}; condition would take {}", picture.takes),
        None => format!("{name}: condition would take {}", picture.takes),
    };
    let block = block.titled(&title, ("sans-serif", 20)).map_err(failed)?;
    let (head, panels) = block.split_vertically(26);
    legend(picture, &head)?;
    if picture.curves.is_empty() {
        for (side, panel) in panels.split_evenly((1, 2)).iter().enumerate() {
            continuations(picture, side, panel)?;
        }
        return Ok(());
    }
    let panels = panels.split_evenly((2, 2));
    for side in [0, 1] {
        continuations(picture, side, &panels[side])?;
        outputs(picture, side, &panels[2 + side])?;
    }
    Ok(())
}

/// The names in their colours and dashes.
fn legend(picture: &Picture, area: &Area<'_>) -> Result<()> {
    let step = WIDTH as i32 / (picture.curves.len() as i32 + 1);
    for (index, curve) in picture.curves.iter().enumerate() {
        legend_line(area, index, 20 + step * index as i32, curve.name)?;
    }
    Ok(())
}

/// One name of a legend in the colour and dash of its curve, from `x` on.
pub(super) fn legend_line(area: &Area<'_>, index: usize, x: i32, name: &str) -> Result<()> {
    let (dash, gap) = DASHES[index % DASHES.len()];
    let style = COLOURS[index % COLOURS.len()].stroke_width(2);
    let mut from = x;
    while from < x + 34 {
        let to = if gap == 0 { x + 34 } else { (from + dash as i32).min(x + 34) };
        area.draw(&PathElement::new(vec![(from, 12), (to, 12)], style)).map_err(failed)?;
        from = to + gap.max(1) as i32;
    }
    area.draw(&Text::new(name.to_owned(), (x + 40, 5), ("sans-serif", 14))).map_err(failed)?;
    Ok(())
}

/// The record near one end and every continuation past it.
fn continuations(picture: &Picture, side: usize, area: &Area<'_>) -> Result<()> {
    let len = picture.record.len();
    let past = picture.curves.first().map_or(ALONE, |curve| curve.past[side].len());
    let shown = (2 * past).clamp(8.min(len), len);
    let inside: Vec<(f64, f64)> =
        indices(side, len, shown).map(|n| (stamp(picture, n as i64), picture.record[n])).collect();
    let lines: Vec<Vec<(f64, f64)>> = picture
        .curves
        .iter()
        .map(|curve| {
            let outwards = curve.past[side].iter().enumerate();
            let place = |k: usize| if side == 0 { -1 - k as i64 } else { (len + k) as i64 };
            // From the record's last sample outwards, so that the eye follows without a gap.
            let end = if side == 0 { 0 } else { len - 1 };
            let start = std::iter::once((stamp(picture, end as i64), picture.record[end]));
            start.chain(outwards.map(|(k, v)| (stamp(picture, place(k)), *v))).collect()
        })
        .collect();
    let end = if side == 0 { "left" } else { "right" };
    let beyond = if lines.is_empty() { "at" } else { "and continuations past" };
    let caption = format!("record {beyond} the {end} end");
    let all = lines.iter().flatten().chain(&inside);
    let mut chart = panel(picture, area, &caption, &picture.unit_in, all)?;
    for (index, line) in lines.iter().enumerate().rev() {
        add(&mut chart, line, index)?;
    }
    let record = RGBColor(90, 90, 90).stroke_width(2);
    chart.draw_series(LineSeries::new(inside, record)).map_err(failed)?;
    Ok(())
}

/// The outputs over the edge zone of one end, with two standard deviations about the forecast's.
fn outputs(picture: &Picture, side: usize, area: &Area<'_>) -> Result<()> {
    let len = picture.record.len();
    let shown = (picture.zone + picture.zone / 2).clamp(8.min(len), len);
    let point = |curve: &Curve, n: usize| (stamp(picture, n as i64), curve.output[n]);
    let lines: Vec<Vec<(f64, f64)>> =
        picture.curves.iter().map(|curve| indices(side, len, shown).map(|n| point(curve, n)).collect()).collect();
    let deviation = |n: usize| {
        let distance = if side == 0 { n } else { len - 1 - n };
        2.0 * picture.deviation[side].get(distance).copied().unwrap_or(0.0)
    };
    let forecast = &picture.curves[0];
    let mut band: Vec<(f64, f64)> =
        indices(side, len, shown).map(|n| (stamp(picture, n as i64), forecast.output[n] + deviation(n))).collect();
    band.extend(indices(side, len, shown).rev().map(|n| (stamp(picture, n as i64), forecast.output[n] - deviation(n))));
    let end = if side == 0 { "left" } else { "right" };
    let mark = if picture.trusted.is_some() { ", upright line: trusted span" } else { "" };
    let caption = format!("outputs near the {end} end, grey: forecast ± 2 s.d.{mark}");
    let mut chart = panel(picture, area, &caption, &picture.unit, lines.iter().flatten().chain(&band))?;
    let grey = RGBColor(120, 120, 120).mix(0.3);
    chart.draw_series(std::iter::once(Polygon::new(band, grey))).map_err(failed)?;
    for (index, line) in lines.iter().enumerate().rev() {
        add(&mut chart, line, index)?;
    }
    if let Some(trusted) = &picture.trusted {
        let x = if side == 0 { trusted.from } else { trusted.to };
        let heights = chart.plotting_area().get_y_range();
        let line = PathElement::new(vec![(x, heights.start), (x, heights.end)], BLACK.mix(0.5));
        let inside = chart.plotting_area().get_x_range().contains(&x);
        chart.draw_series(inside.then_some(line)).map_err(failed)?;
    }
    Ok(())
}

type Chart<'a, 'b> = ChartContext<
    'a,
    SVGBackend<'b>,
    Cartesian2d<plotters::coord::types::RangedCoordf64, plotters::coord::types::RangedCoordf64>,
>;

fn panel<'a, 'b, 'p>(
    picture: &Picture,
    area: &'a Area<'b>,
    caption: &str,
    unit: &str,
    points: impl Iterator<Item = &'p (f64, f64)>,
) -> Result<Chart<'a, 'b>> {
    let (mut x, mut y) = ((f64::INFINITY, f64::NEG_INFINITY), (f64::INFINITY, f64::NEG_INFINITY));
    for &(px, py) in points.filter(|p| p.1.is_finite()) {
        x = (x.0.min(px), x.1.max(px));
        y = (y.0.min(py), y.1.max(py));
    }
    let largest = y.0.abs().max(y.1.abs());
    let margin = match y.1 - y.0 {
        // A constant stands in the middle of a range whose labels tell something.
        0.0 => {
            if largest > 0.0 {
                0.1 * largest
            } else {
                1.0
            }
        }
        height => (0.05 * height).max(1e-9 * largest),
    };
    let mut chart = ChartBuilder::on(area)
        .caption(caption, ("sans-serif", 15))
        .margin(8)
        .x_label_area_size(40)
        .y_label_area_size(70)
        .build_cartesian_2d(x.0..x.1, y.0 - margin..y.1 + margin)
        .map_err(failed)?;
    let along = if picture.axis.is_time() { "time" } else { "position" };
    let value = if unit.is_empty() { escape(&picture.name) } else { format!("{} [{unit}]", escape(&picture.name)) };
    chart
        .configure_mesh()
        .x_desc(format!("{along} [{}]", picture.axis.unit()))
        .y_desc(value)
        .label_style(("sans-serif", 13))
        .light_line_style(WHITE)
        .x_labels(7)
        .y_labels(6)
        .draw()
        .map_err(failed)?;
    Ok(chart)
}

fn add(chart: &mut Chart<'_, '_>, line: &[(f64, f64)], index: usize) -> Result<()> {
    let style = COLOURS[index % COLOURS.len()].stroke_width(if index == 0 { 2 } else { 1 });
    let (dash, gap) = DASHES[index % DASHES.len()];
    let points = line.iter().copied().filter(|p| p.1.is_finite());
    if gap == 0 {
        chart.draw_series(LineSeries::new(points, style)).map_err(failed)?;
    } else {
        chart.draw_series(DashedLineSeries::new(points, dash, gap, style)).map_err(failed)?;
    }
    Ok(())
}

/// The samples within `shown` of one end, in time order.
fn indices(side: usize, len: usize, shown: usize) -> std::ops::Range<usize> {
    if side == 0 { 0..shown } else { len - shown..len }
}

fn stamp(picture: &Picture, n: i64) -> f64 {
    picture.axis.start() + n as f64 * picture.axis.step()
}

pub(super) fn failed(error: impl std::fmt::Display) -> Error {
    Error::io(format!("the picture could not be drawn: {error}"))
}

//! A figure as markup: a vector drawing that stretches with the page, with its labels as text beside it.

use maud::{Markup, html};

use crate::place::escape;
use crate::report::page::tick::{Scale, Tick};
use crate::report::page::{Choice, Figure, FigureSet, Line, Spacing, Stretch};
use crate::report::text::figure as shown;

/// The drawing's own units, both ways: the page stretches it to whatever room there is.
const FIELD: f64 = 1000.0;
/// How much farther than what is always shown an option may stretch the axis: a wild continuation must not flatten the rest.
const STRETCH: f64 = 0.6;
/// Rows of the table beside a figure, at most.
const ROWS: usize = 24;

/// Figures that share a choice. The choice works without scripts: hidden lines follow the checked button.
pub fn figure_set(set: &FigureSet, id: usize) -> Markup {
    html! {
        div class="set" {
            @if let Some(choice) = &set.choice {
                (buttons(choice, id))
            }
            div class="figures" {
                @for (index, figure) in set.figures.iter().enumerate() {
                    (drawn(figure, set.choice.as_ref(), &format!("f{id}-{index}")))
                }
            }
        }
    }
}

fn buttons(choice: &Choice, id: usize) -> Markup {
    html! {
        span class="legend" id={ "q" (id) } { (choice.legend) ": " }
        @for (index, option) in choice.options.iter().enumerate() {
            input type="radio" name={ "q" (id) } id={ "q" (id) "-" (index) } checked[index == choice.first]
                aria-describedby={ "q" (id) };
            label for={ "q" (id) "-" (index) } { (escape(option)) }
        }
    }
}

/// Axes of a figure: across, and upwards with the options held to a sensible stretch.
fn scales(figure: &Figure, choice: Option<&Choice>) -> (Scale, Scale) {
    let all = || figure.lines.iter().flat_map(|line| &line.points);
    let banded = || figure.bands.iter().flat_map(|band| &band.points);
    let spans = figure.spans.iter().flat_map(|span| [span.from, span.to]);
    let across = all().map(|p| p[0]).chain(banded().map(|p| p[0])).chain(spans);
    let first = choice.map(|choice| choice.first);
    let steady = |line: &&Line| line.option.is_none() || line.option == first;
    let limits = || banded().flat_map(|p| [p[1], p[2]]);
    let kept = figure.lines.iter().filter(steady).flat_map(|line| &line.points).map(|p| p[1]).chain(limits());
    let kept = Scale::over(figure.y.spacing, kept, 0.06);
    let every = Scale::over(figure.y.spacing, all().map(|p| p[1]).chain(limits()), 0.06);
    (Scale::over(figure.x.spacing, across, 0.0), every.within(kept, STRETCH))
}

fn drawn(figure: &Figure, choice: Option<&Choice>, id: &str) -> Markup {
    let (across, upwards) = scales(figure, choice);
    let (x_origin, y_origin) = (across.origin().unwrap_or(0.0), upwards.origin().unwrap_or(0.0));
    let data = |scale: &Scale, spacing: Spacing| {
        let [low, high] = scale.limits();
        format!("{low} {high} {}", if spacing == Spacing::Linear { "linear" } else { "decades" })
    };
    html! {
        figure class="chart" id=(id) {
            figcaption { (escape(&figure.title)) }
            div class="plot" {
                div class="y-name" { span { (escape(&counted(&figure.y.label(), y_origin))) } }
                div class="y-ticks" aria-hidden="true" {
                    @for tick in upwards.ticks(5, y_origin) { (label(&tick, "bottom")) }
                }
                div class={ "field" @if framed(figure) { " framed" } } role="img" tabindex="0" aria-label=(escape(&figure.description))
                    data-x=(data(&across, figure.x.spacing)) data-y=(data(&upwards, figure.y.spacing))
                    data-x-unit=(escape(&figure.x.unit)) data-y-unit=(escape(&figure.y.unit)) {
                    (field(figure, &across, &upwards, x_origin, y_origin))
                }
                div class="x-ticks" aria-hidden="true" {
                    @for tick in across.ticks(5, x_origin) { (label(&tick, "left")) }
                }
                div class="x-name" { (escape(&counted(&figure.x.label(), x_origin))) }
            }
            (key(figure))
            p class="readout" aria-live="polite" {}
            (beside(figure))
        }
    }
}

/// True where the figure tells the record from what lies past it.
fn framed(figure: &Figure) -> bool {
    figure.spans.iter().any(|span| span.kind == Stretch::Record)
}

/// `time [s], from 1764000000`.
fn counted(label: &str, origin: f64) -> String {
    if origin == 0.0 { label.to_owned() } else { format!("{label}, counted from {origin}") }
}

fn label(tick: &Tick, side: &str) -> Markup {
    html! { span style=(format!("{side}:{:.2}%", 100.0 * tick.at)) { (tick.text) } }
}

/// The drawing: stretches of the axis, grid, bands, lines.
fn field(figure: &Figure, across: &Scale, upwards: &Scale, x_origin: f64, y_origin: f64) -> Markup {
    let vertical = across.ticks(5, x_origin).into_iter().map(|tick| format!("M{0:.1} 0V1000", FIELD * tick.at));
    let level = upwards.ticks(5, y_origin).into_iter().map(|tick| format!("M0 {0:.1}H1000", FIELD * (1.0 - tick.at)));
    let grid: String = vertical.chain(level).collect();
    html! {
        svg viewBox="0 0 1000 1000" preserveAspectRatio="none" aria-hidden="true" focusable="false" {
            @for span in &figure.spans {
                @if let (Some(from), Some(to)) = (across.at(span.from), across.at(span.to)) {
                    rect class={ "span " (span.kind.style()) } x=(format!("{:.1}", FIELD * from.clamp(0.0, 1.0)))
                        width=(format!("{:.1}", FIELD * (to.clamp(0.0, 1.0) - from.clamp(0.0, 1.0)).max(0.0)))
                        y=(if span.kind == Stretch::Trusted { "975" } else { "0" })
                        height=(if span.kind == Stretch::Trusted { "25" } else { "1000" }) {}
                }
            }
            path class="grid" d=(grid) {}
            @for band in &figure.bands {
                path class={ "band b" (band.style) } d=(outline(&band.points, across, upwards)) {}
            }
            @for line in &figure.lines {
                path class={ "line s" (line.style) @if let Some(option) = line.option { " o" (option) } }
                    data-name=(escape(&line.name)) d=(path(&line.points, across, upwards)) {}
            }
        }
    }
}

/// The path through the points that have a place; a gap where one has none.
fn path(points: &[[f64; 2]], across: &Scale, upwards: &Scale) -> String {
    let mut text = String::new();
    let mut open = false;
    for &[x, y] in points {
        match (across.at(x), upwards.at(y)) {
            (Some(x), Some(y)) => {
                text.push(if open { 'L' } else { 'M' });
                text.push_str(&place(x, y));
                open = true;
            }
            _ => open = false,
        }
    }
    text
}

/// Along the upper limits and back along the lower ones.
fn outline(points: &[[f64; 3]], across: &Scale, upwards: &Scale) -> String {
    let corner = |x: f64, y: f64| Some(place(across.at(x)?, upwards.at(y)?));
    let upper = points.iter().filter_map(|&[x, _, high]| corner(x, high));
    let lower = points.iter().rev().filter_map(|&[x, low, _]| corner(x, low));
    let corners: Vec<String> = upper.chain(lower).collect();
    if corners.is_empty() { String::new() } else { format!("M{}Z", corners.join("L")) }
}

/// Numbers short enough for a small page, fine enough for any screen; far outside is as good as just outside.
fn place(x: f64, y: f64) -> String {
    format!("{:.1} {:.1}", FIELD * x, (FIELD * (1.0 - y)).clamp(-2.0 * FIELD, 3.0 * FIELD))
}

/// Names in their colours and dashes.
fn key(figure: &Figure) -> Markup {
    // By style: what is drawn last, on top, is not named last.
    let mut lines: Vec<&Line> = figure.lines.iter().collect();
    lines.sort_by_key(|line| line.style);
    html! {
        ul class="key" {
            @for line in lines {
                @if !line.name.is_empty() {
                    li class=(line.option.map(|option| format!("o{option}")).unwrap_or_default()) {
                        svg viewBox="0 0 40 10" aria-hidden="true" { path class={ "line s" (line.style) } d="M0 5H40" {} }
                        (escape(&line.name))
                    }
                }
            }
            @for band in &figure.bands {
                li {
                    svg viewBox="0 0 40 10" aria-hidden="true" { path class={ "band b" (band.style) } d="M0 0H40V10H0Z" {} }
                    (escape(&band.name))
                }
            }
            @for span in &figure.spans {
                li {
                    svg viewBox="0 0 40 10" aria-hidden="true" {
                        rect class={ "span " (span.kind.style()) } x="0" y="0" width="40" height="10" {}
                    }
                    (span.kind.label())
                }
            }
        }
    }
}

/// The figure as a table: places along the longest line, and what every line has nearest to them.
fn beside(figure: &Figure) -> Markup {
    let Some(longest) = figure.lines.iter().max_by_key(|line| line.points.len()) else { return html! {} };
    let count = longest.points.len();
    let rows = count.min(ROWS);
    let places: Vec<f64> = (0..rows).map(|row| longest.points[row * (count - 1) / (rows - 1).max(1)][0]).collect();
    html! {
        details class="numbers" {
            summary { "In numbers" }
            div class="scroll" tabindex="0" {
                table {
                    caption { (rows) " of " (count) " places drawn; all of them stand in the CSV beside this page" }
                    thead { tr {
                        th scope="col" { (escape(&figure.x.label())) }
                        @for line in &figure.lines { th scope="col" { (escape(&line.name)) } }
                    } }
                    tbody {
                        @for place in &places {
                            tr {
                                th scope="row" { (shown(*place, 7)) }
                                @for line in &figure.lines { td { (nearest(line, *place)) } }
                            }
                        }
                    }
                }
            }
        }
    }
}

/// A line's value at a place; a dash outside it.
fn nearest(line: &Line, place: f64) -> String {
    let (Some(first), Some(last)) = (line.points.first(), line.points.last()) else { return "\u{2013}".to_owned() };
    if place < first[0] || place > last[0] {
        return "\u{2013}".to_owned();
    }
    let after = line.points.partition_point(|p| p[0] < place).min(line.points.len() - 1);
    let before = after.saturating_sub(1);
    let nearer = if place - line.points[before][0] < line.points[after][0] - place { before } else { after };
    let value = line.points[nearer][1];
    if value.is_finite() { shown(value, 4) } else { "\u{2013}".to_owned() }
}

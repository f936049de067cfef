//! A report page as plain data: what it says, shows and tabulates, before any markup.

mod archived;
mod chart;
mod compared;
mod conditioned;
mod content;
mod figures;
mod html;
mod restored;
mod shared;
mod spectral;
mod thin;
mod tick;

use serde::Serialize;

pub use archived::archive_page;
pub use compared::comparison_page;
pub use conditioned::condition_page;
pub use content::{Passage, Spectra, Stack};
pub use figures::{figures_csv, figures_json};
pub use html::html;
pub use restored::{Close, Restoration};
pub use shared::{DRAWN, command_line, options, quoted};
pub use spectral::spectrum_page;
pub use thin::{thinned, thinned_along, thinned_with_gaps};

/// Points on a page at most, over all figures: a browser opens that many at once without a pause.
pub const POINTS: usize = 18_000;

/// A whole page.
#[derive(Debug, Clone)]
pub struct Page {
    /// What the page is about: command and record.
    pub title: String,
    /// What was asked, in one line.
    pub asked: String,
    /// The answer: one sentence a channel, each with its deciding figure.
    pub answers: Vec<Answer>,
    /// The rest, in the order in which an analyst decides.
    pub sections: Vec<Section>,
    /// What results of this kind may and may not be used for.
    pub caution: String,
}

/// The answer for one channel.
#[derive(Debug, Clone)]
pub struct Answer {
    /// Whose it is.
    pub name: String,
    /// The deciding figure with its unit.
    pub figure: String,
    /// The sentence.
    pub sentence: String,
}

/// A part of a page with a heading.
#[derive(Debug, Clone)]
pub struct Section {
    /// Heading.
    pub heading: String,
    /// What it shows, in order.
    pub blocks: Vec<Block>,
}

/// One thing in a section.
#[derive(Debug, Clone)]
pub enum Block {
    /// A sub-heading.
    Heading(String),
    /// A paragraph.
    Text(String),
    /// Remarks.
    List(Vec<String>),
    /// Text as typed.
    Code(String),
    /// A table.
    Table(Table),
    /// Figures that share a choice.
    Figures(FigureSet),
}

/// A table.
#[derive(Debug, Clone)]
pub struct Table {
    /// What it shows.
    pub caption: String,
    /// Column headings with units.
    pub head: Vec<String>,
    /// Rows; the first cell names the row.
    pub rows: Vec<Vec<Cell>>,
}

/// A cell.
#[derive(Debug, Clone)]
pub enum Cell {
    /// Words.
    Text(String),
    /// A number shown to so many significant digits; the page carries all of it. A dash where there is none.
    Number(Option<f64>, usize),
}

/// Figures side by side, with at most one choice over all of them.
#[derive(Debug, Clone)]
pub struct FigureSet {
    /// What is chosen among, and the choices; empty where everything is shown.
    pub choice: Option<Choice>,
    /// The figures.
    pub figures: Vec<Figure>,
}

/// A choice of what is drawn.
#[derive(Debug, Clone)]
pub struct Choice {
    /// What is chosen.
    pub legend: String,
    /// The options; `Line::option` counts in here.
    pub options: Vec<String>,
    /// The one that is shown first.
    pub first: usize,
}

/// A figure: lines and bands over one axis.
#[derive(Debug, Clone, Serialize)]
pub struct Figure {
    /// What it shows.
    pub title: String,
    /// What a reader should see in it, for those who do not see it.
    pub description: String,
    /// Across.
    pub x: Quantity,
    /// Upwards.
    pub y: Quantity,
    /// Lines, later ones above.
    pub lines: Vec<Line>,
    /// Bands behind the lines.
    pub bands: Vec<Band>,
    /// Stretches of the axis.
    pub spans: Vec<Span>,
}

/// What an axis shows.
#[derive(Debug, Clone, Serialize)]
pub struct Quantity {
    /// Its name.
    pub name: String,
    /// Its unit; empty where unknown.
    pub unit: String,
    /// How it is spaced.
    pub spacing: Spacing,
}

/// How an axis is spaced.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Spacing {
    /// Evenly.
    Linear,
    /// By decades; numbers that are not positive are left out.
    Logarithmic,
}

/// A line.
#[derive(Debug, Clone, Serialize)]
pub struct Line {
    /// Its name.
    pub name: String,
    /// Colour and dash, by number.
    pub style: usize,
    /// The option of the choice that shows it; always shown without.
    #[serde(skip)]
    pub option: Option<usize>,
    /// Places and values in the units of the axes.
    pub points: Vec<[f64; 2]>,
}

/// A band: place, lower and upper limit.
#[derive(Debug, Clone, Serialize)]
pub struct Band {
    /// Its name.
    pub name: String,
    /// Colour, by number.
    pub style: usize,
    /// Place, lower and upper limit.
    pub points: Vec<[f64; 3]>,
}

/// A stretch of the axis.
#[derive(Debug, Clone, Serialize)]
pub struct Span {
    /// What it is.
    pub kind: Stretch,
    /// First place.
    pub from: f64,
    /// Last place.
    pub to: f64,
}

/// What a stretch of the axis is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Stretch {
    /// The record itself: outside it, everything is assumed.
    Record,
    /// Trusted output.
    Trusted,
}

impl Stretch {
    /// In words.
    pub const fn label(self) -> &'static str {
        match self {
            Stretch::Record => "inside the record",
            Stretch::Trusted => "trusted output",
        }
    }

    /// The name of its style.
    pub const fn style(self) -> &'static str {
        match self {
            Stretch::Record => "record",
            Stretch::Trusted => "trusted",
        }
    }
}

impl Quantity {
    /// An evenly spaced axis.
    pub fn linear(name: impl Into<String>, unit: impl Into<String>) -> Quantity {
        Quantity { name: name.into(), unit: unit.into(), spacing: Spacing::Linear }
    }

    /// An axis by decades.
    pub fn logarithmic(name: impl Into<String>, unit: impl Into<String>) -> Quantity {
        Quantity { name: name.into(), unit: unit.into(), spacing: Spacing::Logarithmic }
    }

    /// `acceleration [m/s2]`.
    pub fn label(&self) -> String {
        if self.unit.is_empty() { self.name.clone() } else { format!("{} [{}]", self.name, self.unit) }
    }
}

impl Cell {
    /// Words.
    pub fn text(text: impl Into<String>) -> Cell {
        Cell::Text(text.into())
    }
}

impl Page {
    /// All figures in the order of the page.
    pub fn figures(&self) -> impl Iterator<Item = &Figure> {
        self.sections.iter().flat_map(|section| &section.blocks).flat_map(|block| match block {
            Block::Figures(set) => set.figures.as_slice(),
            _ => &[],
        })
    }
}

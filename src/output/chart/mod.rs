//! Charts: plain data in, one SVG out.
//!
//! ```text
//! Figure { x axis, panes: plots and strips over it, key, table, notes } -draw-> SVG text
//! ```
//!
//! A figure is finished data: its figures are in the units that are shown, its words are the words that are shown. Drawing places
//! them, in millimetres, and computes nothing else. The same figure gives the same bytes. Labels never overlap: one that finds no
//! free place is left out, since the key and the table name everything.
//!
//! Colours are those of M. Okabe and K. Ito, "Color Universal Design", 2008, as given by B. Wong, "Points of view: Color blindness",
//! Nature Methods 8, 2011; each goes with a dash pattern, so that the lines are told apart in grey print too.

mod draw;
mod ink;
mod label;
mod markup;
mod pane;
mod scale;
mod strip;
mod text;

pub use draw::draw;
pub use ink::{Colour, Dash, Stroke};
pub use scale::{clock, ticks};
pub use text::width;

/// Where a drawing is going to stand.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Surface {
    /// In a file of its own: on its own paper, dark where the reader's system is.
    #[default]
    StandAlone,
    /// Inside a page, whose text colour it takes; the page may set `--chart-ink`, `--chart-paper` and `--chart-c0` to `--chart-c7`.
    Embedded,
}

/// Panes one above the other over one axis.
#[derive(Clone, Debug, Default)]
pub struct Figure {
    /// Begins the ids in the drawing: letters, digits and hyphens; different for each drawing of a page.
    pub id: String,
    /// Heading.
    pub title: String,
    /// Lines under it.
    pub subtitle: Vec<String>,
    /// What is to be seen, in words, for those who cannot see it.
    pub description: String,
    /// The common axis.
    pub x: Axis,
    /// From top to bottom.
    pub panes: Vec<Pane>,
    /// Names of the lines, in columns.
    pub key: Vec<KeyColumn>,
    /// Below all.
    pub table: Option<Table>,
    /// At the foot, wrapped.
    pub notes: Vec<String>,
}

/// An axis.
#[derive(Clone, Debug, Default)]
pub struct Axis {
    /// What it measures, with its unit.
    pub label: String,
    /// First and last value.
    pub range: (f64, f64),
    /// How values are written.
    pub kind: AxisKind,
}

/// How the values of an axis are written.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub enum AxisKind {
    /// As numbers.
    #[default]
    Number,
    /// As times of day: a value is s from the start, which is so many s after midnight.
    Clock {
        /// s after midnight.
        starts: f64,
    },
}

/// One pane.
#[derive(Clone, Debug)]
pub enum Pane {
    /// Lines and marks over the common axis.
    Plot(Plot),
    /// Bars in rows over the common axis.
    Strip(Strip),
}

/// Lines and marks.
#[derive(Clone, Debug, Default)]
pub struct Plot {
    /// Height, mm.
    pub height: f64,
    /// The upright axis.
    pub y: Axis,
    /// Curves.
    pub curves: Vec<Curve>,
    /// Marks.
    pub marks: Vec<Mark>,
    /// Shaded stretches of the common axis.
    pub bands: Vec<Band>,
    /// Level lines.
    pub rules: Vec<Rule>,
}

/// A curve through points.
#[derive(Clone, Debug, Default)]
pub struct Curve {
    /// What it is, for hovering and for programs.
    pub name: String,
    /// Further figures for programs: `data-KEY="value"`.
    pub data: Vec<(&'static str, String)>,
    /// Labels to write at it, the best first; none: it is named in the key only.
    pub labels: Vec<String>,
    /// How it is drawn.
    pub stroke: Stroke,
    /// Points, x rising; a NaN breaks the curve.
    pub points: Vec<[f64; 2]>,
    /// What is said of a point when hovering there.
    pub say: Vec<String>,
    /// Stretch of x on which it is underlaid.
    pub underlaid: Option<(f64, f64)>,
}

/// A mark at a point.
#[derive(Clone, Debug, Default)]
pub struct Mark {
    /// Where.
    pub at: [f64; 2],
    /// Its form.
    pub shape: Shape,
    /// Its colour.
    pub colour: Colour,
    /// Labels, the best first.
    pub labels: Vec<String>,
    /// Whether the label is left out rather than put further away.
    pub modest: bool,
    /// Its figures, for hovering.
    pub say: String,
    /// Figures for programs.
    pub data: Vec<(&'static str, String)>,
}

/// Forms of marks.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Shape {
    /// A full disc.
    #[default]
    Disc,
    /// A ring.
    Ring,
    /// A ring with a cross in it.
    CrossedRing,
    /// A short stroke across: where a curve ends.
    End,
    /// A small square: where a curve begins.
    Square,
}

/// A shaded stretch of the common axis.
#[derive(Clone, Debug, Default)]
pub struct Band {
    /// From and to.
    pub range: (f64, f64),
    /// Its colour.
    pub colour: Colour,
    /// Labels, the best first.
    pub labels: Vec<String>,
    /// Its figures, for hovering.
    pub say: String,
}

/// A level line.
#[derive(Clone, Debug, Default)]
pub struct Rule {
    /// Where.
    pub at: f64,
    /// How it is drawn.
    pub stroke: Stroke,
    /// What it is; written in the margin.
    pub label: String,
}

/// Rows of bars.
#[derive(Clone, Debug, Default)]
pub struct Strip {
    /// From top to bottom.
    pub rows: Vec<Bars>,
}

/// One row of bars.
#[derive(Clone, Debug, Default)]
pub struct Bars {
    /// Whose.
    pub name: String,
    /// From and to, in order, not overlapping.
    pub bars: Vec<(f64, f64)>,
    /// Their colour.
    pub colour: Colour,
    /// Written at the end of the row.
    pub note: String,
}

/// Lines under one heading of the key.
#[derive(Clone, Debug, Default)]
pub struct KeyColumn {
    /// Heading.
    pub heading: String,
    /// What the lines are.
    pub entries: Vec<KeyEntry>,
}

/// One line of the key.
#[derive(Clone, Debug, Default)]
pub struct KeyEntry {
    /// A sample of the line; none: a mark or nothing.
    pub stroke: Option<Stroke>,
    /// A sample of the mark.
    pub shape: Option<(Shape, Colour)>,
    /// A sample of what underlies.
    pub underlaid: bool,
    /// Its short name in the picture, if it has one.
    pub tag: String,
    /// What it is.
    pub text: String,
}

/// A table below the panes.
#[derive(Clone, Debug, Default)]
pub struct Table {
    /// Heading.
    pub title: String,
    /// Its columns.
    pub columns: Vec<Column>,
    /// As long as the columns.
    pub rows: Vec<Vec<String>>,
}

/// A column of a table.
#[derive(Clone, Debug, Default)]
pub struct Column {
    /// Its name.
    pub heading: String,
    /// The unit of its figures, under the name.
    pub unit: String,
    /// How it is set.
    pub align: Align,
}

/// How a column is set.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Align {
    /// Words.
    #[default]
    Left,
    /// Figures.
    Right,
}

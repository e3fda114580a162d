//! The whole figure: heading, panes under each other, key, table, notes.

use super::ink::{FACES, PAPER, Stroke, style};
use super::label::Area;
use super::markup::{Anchor, Markup, Type, filled, number, stroked};
use super::pane::{Frame, LABEL, NAME, plot, shape};
use super::scale::{Scale, ticks, written};
use super::strip::{ROW, strip};
use super::text::{escaped, shortened, width, wrapped};
use super::{Align, Colour, Dash, Figure, KeyColumn, KeyEntry, Pane, Surface, Table};

/// Width of the paper, mm: that of A4 less its margins.
const WIDTH: f64 = 180.0;
const EDGE: f64 = 3.0;
/// Left of the panes: names and figures of the upright axes.
const LEFT: f64 = 19.0;
/// Right of them: labels of curves that end there.
const RIGHT: f64 = 33.0;
const BETWEEN: f64 = 5.0;
const TITLE: f64 = 4.2;
const SMALL: f64 = 2.45;
const LINE: f64 = 3.9;
/// Length of a sample in the key.
const SAMPLE: f64 = 9.0;

/// Draws a figure.
///
/// # Example
/// ```
/// use dutybank::output::chart::{Axis, Curve, Figure, Pane, Plot, Surface, draw};
///
/// let curve = Curve { name: "system".into(), points: vec![[0.0, 10.0], [50.0, 22.0]], ..Curve::default() };
/// let axis = |label: &str, end| Axis { label: label.into(), range: (0.0, end), ..Axis::default() };
/// let plot = Plot { height: 40.0, y: axis("Head, m", 30.0), curves: vec![curve], ..Plot::default() };
/// let figure = Figure { id: "one".into(), x: axis("Flow, L/s", 60.0), panes: vec![Pane::Plot(plot)], ..Figure::default() };
/// let svg = draw(&figure, Surface::Embedded);
/// assert!(svg.starts_with("<svg") && svg.contains("data-name=\"system\""));
/// ```
pub fn draw(figure: &Figure, surface: Surface) -> String {
    let mut out = Markup::default();
    let mut y = EDGE;
    y = heading(&mut out, figure, y);
    y = panes(&mut out, figure, y);
    y = key(&mut out, &figure.key, y);
    if let Some(table) = &figure.table {
        y = self::table(&mut out, table, y);
    }
    y = notes(&mut out, &figure.notes, y);
    wrapped_up(figure, surface, y + EDGE, &out.finish())
}

fn wrapped_up(figure: &Figure, surface: Surface, height: f64, body: &str) -> String {
    let id = &figure.id;
    let (w, h) = (number(WIDTH), number(height));
    let size = match surface {
        Surface::StandAlone => format!(" width=\"{w}mm\" height=\"{h}mm\""),
        Surface::Embedded => " width=\"100%\"".to_owned(),
    };
    let mut out = Markup::default();
    if surface == Surface::StandAlone {
        out.raw("<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n");
    }
    out.raw(&format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" id=\"{id}\"{size} viewBox=\"0 0 {w} {h}\" role=\"img\" \
         aria-labelledby=\"{id}-title {id}-desc\" font-family=\"{}\" text-rendering=\"geometricPrecision\">\n",
        escaped(FACES)
    ));
    out.raw(&format!(
        "<title id=\"{id}-title\">{}</title>\n<desc id=\"{id}-desc\">{}</desc>\n<style>{}</style>\n",
        escaped(&figure.title),
        escaped(&figure.description),
        style(id, surface)
    ));
    if surface == Surface::StandAlone {
        let paper = format!(" class=\"paper\" fill=\"{PAPER}\"");
        out.rectangle([0.0, 0.0], [WIDTH, height], &paper);
        out.raw("\n");
    }
    out.raw(body);
    out.raw("</svg>\n");
    out.finish()
}

fn heading(out: &mut Markup, figure: &Figure, mut y: f64) -> f64 {
    let room = WIDTH - 2.0 * EDGE;
    if !figure.title.is_empty() {
        y += TITLE;
        out.text(
            [EDGE, y],
            &shortened(&figure.title, TITLE, room),
            Type::of(TITLE).bold(),
        );
    }
    for line in figure
        .subtitle
        .iter()
        .flat_map(|text| wrapped(text, NAME, room))
    {
        y += 1.45 * NAME;
        out.text([EDGE, y], &line, Type::of(NAME));
    }
    y + BETWEEN
}

fn panes(out: &mut Markup, figure: &Figure, mut y: f64) -> f64 {
    let (left, right) = (LEFT, WIDTH - RIGHT);
    let x = Scale {
        values: figure.x.range,
        paper: (left, right),
    };
    let marked = ticks(figure.x.range, figure.x.kind, 12);
    for pane in &figure.panes {
        let height = match pane {
            Pane::Plot(plot) => plot.height,
            Pane::Strip(strip) => ROW * strip.rows.len() as f64,
        };
        let frame = Frame {
            area: Area {
                left,
                top: y,
                right,
                bottom: y + height,
            },
            margin: RIGHT - EDGE,
            edge: EDGE,
        };
        match pane {
            Pane::Plot(pane) => plot(out, pane, frame, x, &marked),
            Pane::Strip(pane) => strip(out, pane, frame, x, &marked),
        }
        y += height + BETWEEN;
    }
    y -= BETWEEN;
    let words = written(&marked, figure.x.kind);
    y += 1.3 * LABEL;
    for (value, word) in marked.iter().zip(&words) {
        out.text(
            [x.at(*value), y],
            word,
            Type::of(LABEL).anchored(Anchor::Middle),
        );
    }
    y += 1.5 * NAME;
    let set = Type::of(NAME).anchored(Anchor::Middle);
    out.text([0.5 * (left + right), y], &figure.x.label, set);
    y + BETWEEN
}

fn key(out: &mut Markup, columns: &[KeyColumn], y: f64) -> f64 {
    let columns: Vec<&KeyColumn> = columns
        .iter()
        .filter(|column| !column.entries.is_empty())
        .collect();
    let mut lowest = y;
    let mut next = EDGE;
    for (column, room) in columns.iter().zip(key_widths(&columns)) {
        let left = next;
        next += room;
        let mut y = if column.heading.is_empty() {
            y
        } else {
            y + LABEL
        };
        let heading = shortened(&column.heading, LABEL, room - 2.0);
        out.text([left, y], &heading, Type::of(LABEL).bold());
        for entry in &column.entries {
            y += LINE;
            self::entry(out, entry, [left, y], room - 2.0);
        }
        lowest = lowest.max(y);
    }
    if columns.is_empty() {
        y
    } else {
        lowest + BETWEEN + 1.0
    }
}

/// What each column needs; the widest give way where that is too much.
fn key_widths(columns: &[&KeyColumn]) -> Vec<f64> {
    const APART: f64 = 5.0;
    let need = |entry: &KeyEntry| {
        SAMPLE + 2.7 + width(&entry.tag, LABEL).max(2.6) + width(&entry.text, LABEL)
    };
    let mut widths: Vec<f64> = columns
        .iter()
        .map(|column| {
            let entries = column.entries.iter().map(need);
            APART + entries.fold(width(&column.heading, LABEL), f64::max)
        })
        .collect();
    shrink(&mut widths, |_| true, WIDTH - 2.0 * EDGE);
    widths
}

/// Narrows the widest of those that may be narrowed until all fit the room, or none has much left.
fn shrink(widths: &mut [f64], may: impl Fn(usize) -> bool, room: f64) {
    const STEP: f64 = 2.0;
    const LEAST: f64 = 8.0;
    loop {
        let over = widths.iter().sum::<f64>() - room;
        let free = (0..widths.len()).filter(|i| may(*i) && widths[*i] > LEAST);
        let Some(widest) = free.max_by(|a, b| widths[*a].total_cmp(&widths[*b])) else {
            return;
        };
        if over <= 0.0 {
            return;
        }
        widths[widest] -= over.min(STEP);
    }
}

fn entry(out: &mut Markup, entry: &KeyEntry, [left, y]: [f64; 2], room: f64) {
    let middle = y - 0.36 * LABEL;
    let (from, to) = ([left, middle], [left + SAMPLE, middle]);
    if entry.underlaid {
        let colour = entry.stroke.map_or(Colour::Ink, |stroke| stroke.colour);
        let under = Stroke {
            colour,
            dash: Dash::Solid,
            width: 2.4,
        };
        out.line(
            from,
            to,
            &format!("{} stroke-opacity=\"0.2\"", stroked(under)),
        );
    }
    if let Some(stroke) = entry.stroke {
        out.line(from, to, &stroked(stroke));
    }
    if let Some((form, colour)) = entry.shape {
        shape(out, [left + 0.5 * SAMPLE, middle], form, colour);
    }
    let mut x = left + SAMPLE + 1.5;
    if !entry.tag.is_empty() {
        out.text([x, y], &entry.tag, Type::of(LABEL).bold());
        x += width(&entry.tag, LABEL).max(2.6) + 1.2;
    }
    out.text(
        [x, y],
        &shortened(&entry.text, LABEL, left + room - x),
        Type::of(LABEL),
    );
}

fn table(out: &mut Markup, table: &Table, mut y: f64) -> f64 {
    const GAP: f64 = 3.0;
    const SIZES: [f64; 3] = [LABEL, 2.4, 2.25];
    let gaps = GAP * table.columns.len().saturating_sub(1) as f64;
    let room = WIDTH - 2.0 * EDGE - gaps;
    let fits = |size: &f64| column_widths(table, *size).iter().sum::<f64>() <= room;
    let size = SIZES.into_iter().find(fits).unwrap_or(SIZES[2]);
    let mut widths = column_widths(table, size);
    shrink(&mut widths, |i| table.columns[i].align == Align::Left, room);
    let line = |out: &mut Markup, y: f64, cells: &mut dyn Iterator<Item = &str>, colour: Colour| {
        let mut x = EDGE;
        for ((cell, wide), column) in cells.zip(&widths).zip(&table.columns) {
            let set = Type::of(size).coloured(colour);
            let cell = shortened(cell, size, *wide + 0.01);
            match column.align {
                Align::Left => out.text([x, y], &cell, set),
                Align::Right => out.text([x + wide, y], &cell, set.anchored(Anchor::End)),
            }
            x += wide + GAP;
        }
    };
    let columns = || table.columns.iter();
    y += LABEL;
    out.text([EDGE, y], &table.title, Type::of(LABEL).bold());
    y += LINE + 1.0;
    line(
        out,
        y,
        &mut columns().map(|column| column.heading.as_str()),
        Colour::Grey,
    );
    y += 0.8 * LINE;
    line(
        out,
        y,
        &mut columns().map(|column| column.unit.as_str()),
        Colour::Grey,
    );
    y += 0.2;
    for row in &table.rows {
        y += LINE;
        line(out, y, &mut row.iter().map(String::as_str), Colour::Ink);
    }
    y + BETWEEN
}

/// What the widest cell of each column needs.
fn column_widths(table: &Table, size: f64) -> Vec<f64> {
    let of_column = |(i, column): (usize, &super::Column)| {
        let heading = width(&column.heading, size).max(width(&column.unit, size));
        let cells = table.rows.iter().filter_map(|row| row.get(i));
        cells.map(|cell| width(cell, size)).fold(heading, f64::max)
    };
    table.columns.iter().enumerate().map(of_column).collect()
}

fn notes(out: &mut Markup, notes: &[String], mut y: f64) -> f64 {
    let room = WIDTH - 2.0 * EDGE;
    for line in notes.iter().flat_map(|note| wrapped(note, SMALL, room)) {
        y += 1.4 * SMALL;
        out.raw(&format!("<g{}>", filled(Colour::Grey)));
        out.text([EDGE, y], &line, Type::of(SMALL).coloured(Colour::Grey));
        out.close();
    }
    y
}

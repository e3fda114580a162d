//! The picture as a whole.

use super::{
    Telling, combined_stroke, heads, own_flow, point_shape, rows, sentences, system_stroke,
};
use crate::output::chart::{
    Align, Axis, Colour, Column, Figure, KeyColumn, KeyEntry, Pane, Shape, Table,
};
use crate::output::grid::Cell;
use crate::study::curves::CombinedCurve;
use crate::units::Kind;

/// The picture; `id` begins the ids in it.
pub fn figure(telling: &Telling, id: &str) -> Figure {
    let mut panes = vec![Pane::Plot(heads::plot(telling))];
    panes.extend(own_flow::plots(telling).into_iter().map(Pane::Plot));
    let lower = panes.len() > 1;
    let flow = telling.symbol(Kind::Flow);
    let over = if lower {
        format!("Flow, {flow} (head: through the station; below it: through one pump)")
    } else {
        format!("Flow, {flow}")
    };
    Figure {
        id: id.to_owned(),
        title: match telling.title {
            "" => "Pump and system curves".to_owned(),
            title => title.to_owned(),
        },
        subtitle: sentences::heading(telling),
        description: sentences::description(telling),
        x: Axis {
            label: over,
            range: (0.0, telling.flow(largest_flow(telling))),
            ..Axis::default()
        },
        panes,
        key: vec![given(telling), asked(telling), marks(telling)],
        table: Some(table(telling)),
        notes: sentences::notes(telling),
    }
}

/// As far as anything is drawn.
fn largest_flow(telling: &Telling) -> f64 {
    let systems = telling.curves.systems.iter();
    let last = systems.filter_map(|system| system.points.last());
    last.map(|point| point.flow).fold(0.0, f64::max)
}

fn given(telling: &Telling) -> KeyColumn {
    let curves = telling.curves;
    let mut entries: Vec<KeyEntry> = (0..curves.combined.len())
        .map(|position| KeyEntry {
            stroke: Some(combined_stroke(curves, position)),
            underlaid: curves.combined[position].preferred.is_some(),
            tag: telling.number(position),
            text: key_words(telling, &curves.combined[position]),
            shape: None,
        })
        .collect();
    if !heads::own(telling).is_empty() {
        entries.push(KeyEntry {
            stroke: Some(heads::OWN),
            text: "pump itself, without its branch".to_owned(),
            ..KeyEntry::default()
        });
    }
    KeyColumn {
        heading: "Pumps, branch losses taken off".to_owned(),
        entries,
    }
}

/// In a further case its pumps too.
fn key_words(telling: &Telling, curve: &CombinedCurve) -> String {
    let words = telling.combined(curve);
    match curve.case {
        0 => words,
        case => format!("{words} ({})", telling.set(case, &curve.running)),
    }
}

fn asked(telling: &Telling) -> KeyColumn {
    let entry = |position| KeyEntry {
        stroke: Some(system_stroke(position)),
        tag: telling.letter(position),
        text: telling.system(position),
        ..KeyEntry::default()
    };
    KeyColumn {
        heading: "System".to_owned(),
        entries: (0..telling.curves.systems.len()).map(entry).collect(),
    }
}

/// Only the marks that occur.
fn marks(telling: &Telling) -> KeyColumn {
    let points = &telling.curves.points;
    let (low, high) = telling.preferred();
    let occurs = |shape: Shape| {
        points
            .iter()
            .any(|point| point_shape(telling, point) == shape)
    };
    let mark = |shape, colour, text: &str| KeyEntry {
        shape: Some((shape, colour)),
        text: text.to_owned(),
        ..KeyEntry::default()
    };
    let mut entries = Vec::new();
    if telling
        .curves
        .combined
        .iter()
        .any(|curve| curve.preferred.is_some())
    {
        entries.push(KeyEntry {
            underlaid: true,
            text: format!(
                "preferred: {:.0} to {:.0} % of BEP",
                100.0 * low,
                100.0 * high
            ),
            ..KeyEntry::default()
        });
    }
    for (shape, text) in [
        (Shape::Disc, "operating point"),
        (Shape::Ring, "a pump outside it"),
        (Shape::CrossedRing, "off its curve, idle, NPSH short"),
    ] {
        if occurs(shape) {
            entries.push(mark(shape, Colour::Ink, text));
        }
    }
    entries.push(mark(Shape::Square, Colour::Ink, "shut-off head"));
    entries.push(mark(Shape::End, Colour::Ink, "end of a pump's curve"));
    KeyColumn {
        heading: "Marks".to_owned(),
        entries,
    }
}

/// The operating points in figures.
fn table(telling: &Telling) -> Table {
    let grid = rows::points(telling);
    let units = telling.units;
    let filled = |i: &usize| {
        let cells = grid.rows.iter().map(|row| &row[*i]);
        cells.into_iter().any(|cell| match cell {
            Cell::Text(text) => !text.is_empty() && text != "-",
            Cell::Figure(value) | Cell::Plain(value, _) => value.is_some(),
        })
    };
    let shown: Vec<usize> = (0..grid.columns.len()).filter(filled).collect();
    let heading = |i: &usize| {
        let column = &grid.columns[*i];
        let symbol = column
            .kind
            .map_or(column.unit.as_str(), |kind| units.unit(kind).symbol);
        let align = if column.kind.is_some() || !symbol.is_empty() {
            Align::Right
        } else {
            Align::Left
        };
        Column {
            heading: column.heading.clone(),
            unit: symbol.to_owned(),
            align,
        }
    };
    let cell = |row: &[Cell], i: &usize| match (&row[*i], grid.columns[*i].kind) {
        (Cell::Text(text), _) => text.clone(),
        (Cell::Figure(Some(value)), Some(kind)) => units.number(kind, *value),
        _ => "-".to_owned(),
    };
    Table {
        title: grid.title.clone(),
        columns: shown.iter().map(heading).collect(),
        rows: grid
            .rows
            .iter()
            .map(|row| shown.iter().map(|i| cell(row, i)).collect())
            .collect(),
    }
}

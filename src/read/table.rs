//! Columns from a CSV file: headings are names with their unit in brackets, `flow [L/s]`.

use super::context::Context;
use super::models::{COLUMNS, Columns};
use super::yaml::{Form, Marked, Scalar, shortened};
use crate::diagnostic::{Diagnostic, nearest};
use crate::units::{Unit, spellings};

/// Fetches a file that a system file names, by the name it gives.
pub type Load<'a> = &'a dyn Fn(&str) -> std::io::Result<Vec<u8>>;

/// Most rows of a curve.
const MOST_ROWS: usize = 10_000;

/// A column of the file: which of `COLUMNS`, and its unit if the heading gives one.
type Target<'a> = (usize, Option<&'a str>);

/// Reads the columns of a curve.
pub(super) fn read(cx: &mut Context, file: &Marked, what: &str, load: Load) -> Option<Columns> {
    let name = cx.text(file, &format!("`file` of {what}"))?;
    let bytes = match load(&name) {
        Ok(bytes) => bytes,
        Err(why) => {
            let help = "the path is taken from the folder of the system file";
            fail(cx, file, format!("`{name}` cannot be read: {why}"), help);
            return None;
        }
    };
    let Ok(text) = std::str::from_utf8(&bytes) else {
        let help = "save the file as UTF-8 (plain ASCII is UTF-8 too)";
        fail(cx, file, format!("`{name}` is no UTF-8 text"), help);
        return None;
    };
    let mut reader = csv::ReaderBuilder::new()
        .trim(csv::Trim::All)
        .comment(Some(b'#'))
        .flexible(true)
        .from_reader(text.as_bytes());
    // Text that is in memory and UTF-8 always makes records; what is in them is looked at below.
    let headings = reader.headers().cloned().unwrap_or_default();
    let targets = targets(cx, file, &name, &headings)?;
    let mut columns = Columns {
        places: [file.place; 5],
        ..Columns::default()
    };
    for &(i, _) in &targets {
        columns.columns[i] = Some(Vec::new());
    }
    let mut whole = true;
    for (row, record) in reader.records().flatten().enumerate() {
        let line = record.position().map_or(0, csv::Position::line);
        if row >= MOST_ROWS {
            let help = "a curve needs a few dozen points";
            let message = format!("`{name}` has more than {MOST_ROWS} rows");
            fail(cx, file, message, help);
            return None;
        }
        if record.len() != targets.len() {
            let message = format!(
                "line {line} of `{name}` must have {} figures, found {}",
                targets.len(),
                record.len()
            );
            let help = "every line needs one figure for each heading, with commas between them";
            fail(cx, file, message, help);
            whole = false;
            continue;
        }
        for (field, &(i, unit)) in record.iter().zip(&targets) {
            let label = format!("`{}` in line {line} of `{name}`", COLUMNS[i].0);
            let value = figure(cx, file, &label, field, (i, unit));
            whole &= value.is_some();
            columns.columns[i].get_or_insert_default().extend(value);
        }
    }
    whole.then_some(columns)
}

fn fail(cx: &mut Context, file: &Marked, message: String, help: &str) {
    cx.push(Diagnostic::error("csv", file.place, message).help(help));
}

/// What the headings stand for.
fn targets<'a>(
    cx: &mut Context,
    file: &Marked,
    name: &str,
    headings: &'a csv::StringRecord,
) -> Option<Vec<Target<'a>>> {
    let names: Vec<&str> = COLUMNS.iter().map(|(name, ..)| *name).collect();
    let mut targets: Vec<Target> = Vec::new();
    let mut whole = true;
    for heading in headings {
        let (column, unit) = split_heading(heading);
        let mut refuse = |message: String, help: String| {
            fail(cx, file, message, &help);
            whole = false;
        };
        let Some(i) = names.iter().position(|name| *name == column) else {
            let known = names.join("`, `");
            let help = match nearest(column, names.iter().copied()) {
                Some(near) => format!("did you mean `{near}`? Columns are `{known}`"),
                None => format!("columns are `{known}`"),
            };
            let column = shortened(column);
            refuse(format!("`{name}` has a column `{column}`"), help);
            continue;
        };
        if targets.iter().any(|(other, _)| *other == i) {
            let help = "remove one of the two".to_owned();
            refuse(format!("`{name}` has the column `{column}` twice"), help);
            continue;
        }
        let kind = COLUMNS[i].1;
        let measures_kind =
            |unit: &str| Unit::parse(unit).is_some_and(|unit| unit.kind == kind.dimension());
        if let Some(unit) = unit.filter(|unit| !measures_kind(unit)) {
            let message = format!(
                "the column `{column}` of `{name}` must be {}, found the unit `{}`",
                kind.with_article(),
                shortened(unit)
            );
            let fits: Vec<&str> = spellings(kind).collect();
            refuse(message, format!("units that fit: {}", fits.join(", ")));
            continue;
        }
        targets.push((i, unit));
    }
    if targets.is_empty() && whole {
        let help = "its first line holds the headings, for example `flow [m3/h],head [m]`";
        fail(cx, file, format!("`{name}` is empty"), help);
        return None;
    }
    whole.then_some(targets)
}

/// A figure with its heading's unit, as if both stood in the system file.
fn figure(
    cx: &mut Context,
    file: &Marked,
    label: &str,
    field: &str,
    (i, unit): Target,
) -> Option<f64> {
    let (_, kind, bound) = COLUMNS[i];
    let text = match unit {
        Some(unit) if !field.is_empty() => format!("{field} {unit}"),
        _ => field.to_owned(),
    };
    let cell = Marked {
        place: file.place,
        value: Form::Scalar(Scalar::text(&text)),
    };
    cx.quantity(&cell, label, kind, bound)
}

/// `head [m]` into its name and unit.
fn split_heading(heading: &str) -> (&str, Option<&str>) {
    match heading.split_once('[') {
        Some((name, unit)) => (name.trim(), Some(unit.trim_end_matches(']').trim())),
        None => (heading, None),
    }
}

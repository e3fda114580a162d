//! Columns from a CSV file: headings are names with their unit in brackets, `flow [L/s]`.

use super::context::{Bound, Context, found};
use super::models::{COLUMNS, Columns};
use super::yaml::Marked;
use crate::diagnostic::{Diagnostic, nearest};
use crate::units::Quantity;

/// Fetches a file that a system file names, by the name it gives.
pub type Load<'a> = &'a dyn Fn(&str) -> std::io::Result<Vec<u8>>;

/// Most rows of a curve.
const MOST_ROWS: usize = 10_000;

/// Reads the columns of a curve.
pub(super) fn read(cx: &mut Context, file: &Marked, what: &str, load: Load) -> Option<Columns> {
    let name = cx.text(file, &format!("`file` of {what}"))?;
    let mut fail = |message: String, help: Option<String>| {
        let mut diagnostic = Diagnostic::error("csv", file.place, message);
        diagnostic.help = help;
        cx.diagnostics.push(diagnostic);
    };
    let bytes = match load(&name) {
        Ok(bytes) => bytes,
        Err(why) => {
            let help = "the path is taken from the folder of the system file".to_owned();
            fail(format!("`{name}` cannot be read: {why}"), Some(help));
            return None;
        }
    };
    let mut reader = csv::ReaderBuilder::new()
        .trim(csv::Trim::All)
        .comment(Some(b'#'))
        .from_reader(bytes.as_slice());
    let headings = match reader.headers() {
        Ok(headings) => headings.clone(),
        Err(why) => {
            fail(format!("`{name}` cannot be read: {why}"), None);
            return None;
        }
    };
    let names: Vec<&str> = COLUMNS.iter().map(|(name, ..)| *name).collect();
    let mut columns = Columns {
        places: [file.place; 5],
        ..Columns::default()
    };
    let mut targets = Vec::new();
    for heading in &headings {
        let (column, unit) = split_heading(heading);
        let Some(i) = names.iter().position(|name| *name == column) else {
            let near = nearest(column, names.iter().copied());
            let help = near.map(|near| format!("did you mean `{near}`?"));
            fail(
                format!(
                    "`{name}` has a column `{column}`; known are `{}`",
                    names.join("`, `")
                ),
                help,
            );
            return None;
        };
        if columns.columns[i].replace(Vec::new()).is_some() {
            fail(format!("`{name}` has the column `{column}` twice"), None);
            return None;
        }
        targets.push((i, unit));
    }
    for (row, record) in reader.records().enumerate() {
        let line = row + 2;
        let record = match record {
            Ok(record) => record,
            Err(why) => {
                fail(format!("`{name}` cannot be read: {why}"), None);
                return None;
            }
        };
        if row >= MOST_ROWS {
            fail(format!("`{name}` has more than {MOST_ROWS} rows"), None);
            return None;
        }
        for (field, &(i, unit)) in record.iter().zip(&targets) {
            let (column, kind, bound) = COLUMNS[i];
            let text = unit.map_or(field.to_owned(), |unit| format!("{field} {unit}"));
            let quantity: Result<Quantity, _> = crate::units::parse_quantity(&text);
            let value = match quantity {
                Ok(quantity) => quantity
                    .to_si(kind, &cx.units)
                    .map_err(|why| why.to_string()),
                Err(why) => Err(why.to_string()),
            };
            match value {
                Ok(value) if in_bound(value, bound) => {
                    columns.columns[i].get_or_insert_default().push(value);
                }
                Ok(_) => {
                    let message =
                        format!("`{name}`, record {line}: `{column}` is out of range: `{text}`");
                    cx.error("out-of-range", file.place, message);
                    return None;
                }
                Err(why) => {
                    let message = format!(
                        "`{name}`, record {line}: `{column}` is {}",
                        found_text(&text)
                    );
                    cx.push(Diagnostic::error("csv", file.place, message).help(why));
                    return None;
                }
            }
        }
    }
    Some(columns)
}

fn in_bound(value: f64, bound: Bound) -> bool {
    match bound {
        Bound::Any => true,
        Bound::NotNegative => value >= 0.0,
        Bound::Positive => value > 0.0,
        Bound::Share => (0.0..=1.0).contains(&value),
        Bound::ShareBelowOne => (0.0..1.0).contains(&value),
    }
}

fn found_text(text: &str) -> String {
    found(&Marked {
        place: crate::diagnostic::Place::default(),
        value: super::yaml::Form::Scalar(text.into()),
    })
}

/// `head [m]` into its name and unit.
fn split_heading(heading: &str) -> (&str, Option<&str>) {
    match heading.split_once('[') {
        Some((name, unit)) => (name.trim(), Some(unit.trim_end_matches(']').trim())),
        None => (heading, None),
    }
}

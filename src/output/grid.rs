//! A table as data, and its two forms: text for people, CSV for programs.

use comfy_table::{CellAlignment, ContentArrangement, Table, presets};

use crate::units::{Kind, UnitSet};

/// One column.
#[derive(Clone, Debug)]
pub struct Column {
    /// Heading for people.
    pub heading: String,
    /// Name for programs; its unit is added in brackets.
    pub name: String,
    /// What its figures are; none: text, or plain numbers.
    pub kind: Option<Kind>,
}

/// One entry.
#[derive(Clone, Debug, PartialEq)]
pub enum Cell {
    /// Words.
    Text(String),
    /// A figure of the column's kind, SI; none where it does not exist.
    Figure(Option<f64>),
    /// A figure of no kind that has a unit, with its decimals for people.
    Plain(Option<f64>, usize),
}

/// A table.
#[derive(Clone, Debug)]
pub struct Grid {
    /// What it shows.
    pub title: String,
    /// Name for programs, such as a file name.
    pub name: String,
    /// Its columns.
    pub columns: Vec<Column>,
    /// Its rows, as long as the columns.
    pub rows: Vec<Vec<Cell>>,
}

impl Column {
    /// Words.
    pub fn text(heading: &str, name: &str) -> Self {
        Self {
            heading: heading.to_owned(),
            name: name.to_owned(),
            kind: None,
        }
    }

    /// Figures of a kind.
    pub fn figure(heading: &str, name: &str, kind: Kind) -> Self {
        Self {
            kind: Some(kind),
            ..Self::text(heading, name)
        }
    }
}

impl Grid {
    /// For people: headings with their units under them, figures aligned.
    pub fn text(&self, units: &UnitSet) -> String {
        let mut table = Table::new();
        table
            .load_style(presets::NOTHING)
            .set_content_arrangement(ContentArrangement::Disabled);
        let unit = |column: &Column| column.kind.map_or("", |kind| units.unit(kind).symbol);
        let with_units = self.columns.iter().any(|column| column.kind.is_some());
        let heading = |column: &Column| {
            if with_units {
                format!("{}\n{}", column.heading, unit(column))
            } else {
                column.heading.clone()
            }
        };
        table.set_header(self.columns.iter().map(heading));
        for row in &self.rows {
            let cells =
                row.iter()
                    .zip(&self.columns)
                    .map(|(cell, column)| match cell {
                        Cell::Text(text) => text.clone(),
                        Cell::Figure(value) => match (value, column.kind) {
                            (Some(value), Some(kind)) => units.number(kind, *value),
                            _ => "-".to_owned(),
                        },
                        Cell::Plain(value, decimals) => value
                            .map_or_else(|| "-".to_owned(), |value| format!("{value:.decimals$}")),
                    });
            table.add_row(cells);
        }
        for (i, column) in table.column_iter_mut().enumerate() {
            let numbers = self.rows.iter().any(|row| !matches!(row[i], Cell::Text(_)));
            column.set_padding((0, 2));
            column.set_cell_alignment(if numbers {
                CellAlignment::Right
            } else {
                CellAlignment::Left
            });
        }
        let body: Vec<String> = table
            .lines()
            .map(|line| format!("  {}", line.trim_end()))
            .collect();
        format!("{}\n{}\n", self.title, body.join("\n"))
    }

    /// For programs: one heading per column with its unit, figures at full precision, empty where there is none.
    ///
    /// # Errors
    /// Those of writing.
    pub fn csv(&self, units: &UnitSet) -> Result<Vec<u8>, csv::Error> {
        let mut writer = csv::Writer::from_writer(Vec::new());
        let heading = |column: &Column| match column.kind {
            Some(kind) => format!("{} [{}]", column.name, units.unit(kind).symbol),
            None => column.name.clone(),
        };
        writer.write_record(self.columns.iter().map(heading))?;
        for row in &self.rows {
            writer.write_record(row.iter().zip(&self.columns).map(
                |(cell, column)| match cell {
                    Cell::Text(text) => text.clone(),
                    Cell::Figure(value) => match (value, column.kind) {
                        (Some(value), Some(kind)) => plain(units.from_si(kind, *value)),
                        _ => String::new(),
                    },
                    Cell::Plain(value, _) => value.map_or_else(String::new, plain),
                },
            ))?;
        }
        writer
            .into_inner()
            .map_err(|error| error.into_error().into())
    }
}

/// Shortest text that reads back as the same number; zero without a sign.
fn plain(value: f64) -> String {
    format!("{}", if value == 0.0 { 0.0 } else { value })
}

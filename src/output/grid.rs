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
    /// Unit to show where there is no kind.
    pub unit: String,
}

/// One entry.
#[derive(Clone, Debug, PartialEq)]
pub enum Cell {
    /// Words.
    Text(String),
    /// A figure of the column's kind, SI; none where it does not exist.
    Figure(Option<f64>),
    /// A figure that is in the column's own unit already, with its decimals for people.
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
        Self::in_unit(heading, name, "")
    }

    /// Words or plain numbers in a unit of their own, such as `2 x 44.1` L/s.
    pub fn in_unit(heading: &str, name: &str, unit: &str) -> Self {
        Self {
            heading: heading.to_owned(),
            name: name.to_owned(),
            kind: None,
            unit: unit.to_owned(),
        }
    }

    /// Figures of a kind.
    pub fn figure(heading: &str, name: &str, kind: Kind) -> Self {
        Self {
            kind: Some(kind),
            ..Self::text(heading, name)
        }
    }

    /// The symbol of its unit; empty if it has none.
    pub(super) fn symbol<'a>(&'a self, units: &'a UnitSet) -> &'a str {
        self.kind.map_or(&self.unit, |kind| units.unit(kind).symbol)
    }
}

impl Grid {
    /// For people: headings with their units under them, figures aligned, columns that say nothing left out.
    pub fn text(&self, units: &UnitSet) -> String {
        let shown = self.shown_columns();
        let mut table = Table::new();
        table
            .load_style(presets::NOTHING)
            .set_content_arrangement(ContentArrangement::Disabled);
        let with_units = shown
            .iter()
            .any(|i| !self.columns[*i].symbol(units).is_empty());
        table.set_header(shown.iter().map(|i| {
            let column = &self.columns[*i];
            match with_units {
                true => format!("{}\n{}", column.heading, column.symbol(units)),
                false => column.heading.clone(),
            }
        }));
        for row in &self.rows {
            table.add_row(shown.iter().map(|i| self.shown(&row[*i], *i, units)));
        }
        for (column, i) in table.column_iter_mut().zip(&shown) {
            let numbers = self
                .rows
                .iter()
                .any(|row| !matches!(row[*i], Cell::Text(_)));
            column.set_padding((0, 2));
            column.set_cell_alignment(match numbers {
                true => CellAlignment::Right,
                false => CellAlignment::Left,
            });
        }
        let body: Vec<String> = table
            .lines()
            .map(|line| format!("  {}", line.trim_end()))
            .collect();
        format!("{}\n{}\n", self.title, body.join("\n"))
    }

    /// Positions of the columns that say something.
    pub(super) fn shown_columns(&self) -> Vec<usize> {
        let columns = 0..self.columns.len();
        columns.filter(|i| self.is_filled(*i)).collect()
    }

    /// An entry for people.
    pub(super) fn shown(&self, cell: &Cell, column: usize, units: &UnitSet) -> String {
        let absent = || "-".to_owned();
        match (cell, self.columns[column].kind) {
            (Cell::Text(text), _) => text.clone(),
            (Cell::Figure(Some(value)), Some(kind)) => units.number(kind, *value),
            (Cell::Figure(_), _) => absent(),
            (Cell::Plain(value, decimals), _) => {
                value.map_or_else(absent, |value| format!("{value:.decimals$}"))
            }
        }
    }

    /// Whether any row says something in that column.
    fn is_filled(&self, column: usize) -> bool {
        self.rows.iter().any(|row| match &row[column] {
            Cell::Text(text) => !text.is_empty(),
            Cell::Figure(value) | Cell::Plain(value, _) => value.is_some(),
        })
    }

    /// For programs: one heading per column with its unit, figures at full precision, empty where there is none.
    ///
    /// # Errors
    /// Those of writing.
    pub fn csv(&self, units: &UnitSet) -> Result<Vec<u8>, csv::Error> {
        let mut writer = csv::Writer::from_writer(Vec::new());
        let heading = |column: &Column| match column.symbol(units) {
            "" => column.name.clone(),
            symbol => format!("{} [{symbol}]", column.name),
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

//! Tables of a page.

use maud::{Markup, html};

use crate::network::Network;
use crate::output::grid::{Cell, Column, Grid};
use crate::units::{Kind, UnitSet};

/// A table with its title, headings and units; columns that say nothing are left out.
pub(super) fn table(grid: &Grid, units: &UnitSet) -> Markup {
    let shown = grid.shown_columns();
    let with_units = shown
        .iter()
        .any(|i| !grid.columns[*i].symbol(units).is_empty());
    html! {
        div class="scroll" tabindex="0" role="region" aria-label=(grid.title) {
            table {
                caption { (grid.title) }
                thead {
                    tr { @for i in &shown { th scope="col" class=(class(grid, *i)) {
                        (grid.columns[*i].heading)
                        @if with_units { br; span class="unit" { (grid.columns[*i].symbol(units)) } }
                    } } }
                }
                tbody {
                    @for row in &grid.rows {
                        tr { @for i in &shown { td class=(class(grid, *i)) { (grid.shown(&row[*i], *i, units)) } } }
                    }
                }
            }
        }
    }
}

/// The table turned: what heads columns heads rows, and each row becomes a column under its first entry. Rows that say the same nothing
/// everywhere, zeros, are named under it.
pub(super) fn turned(grid: &Grid, units: &UnitSet) -> Markup {
    let is_zero = |cell: &Cell| match cell {
        Cell::Figure(value) | Cell::Plain(value, _) => value.is_none_or(|value| value == 0.0),
        Cell::Text(_) => false,
    };
    let (zero, said): (Vec<usize>, Vec<usize>) = grid
        .shown_columns()
        .into_iter()
        .filter(|i| *i > 0)
        .partition(|i| grid.rows.iter().all(|row| is_zero(&row[*i])));
    let zero: Vec<&str> = zero
        .iter()
        .map(|i| grid.columns[*i].heading.as_str())
        .collect();
    html! {
        div class="scroll" tabindex="0" role="region" aria-label=(grid.title) {
            table {
                caption { (grid.title) }
                thead { tr {
                    th scope="col" class="words" { (grid.columns[0].heading) }
                    th scope="col" class="words" { span class="unit" { "unit" } }
                    @for row in &grid.rows { th scope="col" class="figure" { (grid.shown(&row[0], 0, units)) } }
                } }
                tbody {
                    @for i in said {
                        tr {
                            th scope="row" class="words" { (grid.columns[i].heading) }
                            td class="words" { span class="unit" { (grid.columns[i].symbol(units)) } }
                            @for row in &grid.rows { td class="figure" { (grid.shown(&row[i], i, units)) } }
                        }
                    }
                }
            }
        }
        @if !zero.is_empty() { p { "None in any run: " (zero.join(", ")) "." } }
    }
}

fn class(grid: &Grid, column: usize) -> &'static str {
    let figures = grid
        .rows
        .iter()
        .any(|row| !matches!(row[column], Cell::Text(_)));
    if figures { "figure" } else { "words" }
}

/// A card of names and values.
pub(super) fn card(rows: &[(&str, String)]) -> Markup {
    html! {
        dl class="scorecard" { @for (name, value) in rows { div { dt { (name) } dd { (value) } } } }
    }
}

/// The curve of each pump model, at the points it was given by.
pub(super) fn models(network: &Network) -> Vec<Grid> {
    network
        .models()
        .iter()
        .map(|model| {
            let rows = model.head.abscissas().into_iter().map(|q| {
                let required = model.npsh_required.as_ref().map(|curve| curve.at(q).value);
                let power = model.shaft_power(q, network.fluid().density, network.gravity());
                vec![
                    Cell::Figure(Some(q)),
                    Cell::Figure(Some(model.head.at(q).value)),
                    Cell::Figure(model.efficiency(q)),
                    Cell::Figure(power),
                    Cell::Figure(required),
                ]
            });
            Grid {
                title: format!("Curve of {}", model.name),
                name: "curve".to_owned(),
                columns: vec![
                    Column::figure("flow", "flow", Kind::Flow),
                    Column::figure("head", "head", Kind::Length),
                    Column::figure("efficiency", "efficiency", Kind::Percent),
                    Column::figure("shaft power", "power", Kind::Power),
                    Column::figure("NPSH required", "npsh_required", Kind::Length),
                ],
                rows: rows.collect(),
            }
        })
        .collect()
}

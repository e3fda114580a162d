//! The combination table.

use super::grid::{Cell, Column, Grid};
use super::words::Words;
use crate::network::{Need, Target};
use crate::study::caution::Caution;
use crate::study::duty::{Combination, Outcome};
use crate::study::limit::About;
use crate::units::{Kind, UnitSet};

/// Joules in a kilowatt-hour.
const KILOWATT_HOUR: f64 = 3.6e6;

/// A row before it is placed, with what it is sorted by.
pub struct Row {
    cells: Vec<Cell>,
    /// Room left under the tightest limit or need; the worst state has the least.
    pub room: f64,
}

/// The columns: the same for all cases.
pub fn columns(needs: &[Need], units: &UnitSet) -> Vec<Column> {
    let mut columns = vec![
        Column::text("case", "case"),
        Column::text("running", "running"),
        Column::figure("total", "flow", Kind::Flow),
        Column::in_unit("each", "flow_each", units.unit(Kind::Flow).symbol),
        Column::in_unit("of BEP", "share_of_bep", "%"),
        Column::figure("shaft", "shaft_power", Kind::Power),
        Column::in_unit("motor", "motor_load", "%"),
        Column::figure("NPSH spare", "npsh_margin", Kind::Length),
        Column::in_unit("energy", "specific_energy", "kWh/m3"),
    ];
    columns.extend(needs.iter().map(|need| {
        let kind = match need.target {
            Target::PressureAt(_) => Kind::Pressure,
            Target::FlowInto(_) | Target::FlowIn(_) => Kind::Flow,
        };
        Column::figure(&need.name, &format!("room_{}", need.name), kind)
    }));
    columns.push(Column::text("needs", "needs"));
    columns.push(Column::text("limit that binds", "binding_limit"));
    columns
}

/// One row.
pub fn row(words: &Words, case: &str, needs: &[Need], combination: &Combination) -> Row {
    let network = words.network;
    let name = |pump: &crate::part::PumpId| network.pump(*pump).name.as_str();
    let running: Vec<&str> = combination.running.iter().map(name).collect();
    let mut cells = vec![Cell::Text(case.to_owned()), Cell::Text(running.join(" + "))];
    let outcome = match &combination.outcome {
        Ok(outcome) => outcome,
        Err(error) => {
            cells.extend([
                Cell::Figure(None),
                Cell::Text("-".into()),
                Cell::Text("-".into()),
                Cell::Figure(None),
                Cell::Text("-".into()),
                Cell::Figure(None),
                Cell::Plain(None, 3),
            ]);
            cells.extend(needs.iter().map(|_| Cell::Figure(None)));
            cells.extend([
                Cell::Text("no balance".into()),
                Cell::Text(error.message(network)),
            ]);
            return Row {
                cells,
                room: f64::NEG_INFINITY,
            };
        }
    };
    let assessment = &outcome.assessment;
    let each = |figure: &dyn Fn(usize) -> String| {
        let figures: Vec<String> = combination
            .running
            .iter()
            .map(|pump| figure(pump.index()))
            .collect();
        listed(&figures)
    };
    let whole = |value: Option<f64>| {
        value.map_or_else(|| "-".to_owned(), |value| format!("{:.0}", 100.0 * value))
    };
    let margin = combination
        .running
        .iter()
        .filter_map(|pump| assessment.pumps[pump.index()].npsh_margin())
        .min_by(f64::total_cmp);
    cells.extend([
        Cell::Figure(Some(assessment.delivered)),
        Cell::Text(each(&|i| {
            words.units.number(Kind::Flow, assessment.pumps[i].flow)
        })),
        Cell::Text(each(&|i| whole(assessment.pumps[i].share_of_bep))),
        Cell::Figure(outcome.shaft_power),
        Cell::Text(each(&|i| whole(assessment.pumps[i].motor_load))),
        Cell::Figure(margin),
        Cell::Plain(
            outcome.specific_energy.map(|energy| energy / KILOWATT_HOUR),
            3,
        ),
    ]);
    let rooms: Vec<Option<f64>> = needs
        .iter()
        .zip(&assessment.needs)
        .map(|(need, value)| value.value.map(|value| -need.shortfall(value)))
        .collect();
    cells.extend(rooms.iter().map(|room| Cell::Figure(*room)));
    cells.push(Cell::Text(needs_word(outcome, needs)));
    cells.push(Cell::Text(limit_word(words, outcome)));
    let unmet = assessment.needs.iter().any(|need| !need.met);
    let room = outcome.limit.map_or(f64::INFINITY, |limit| limit.room);
    Row {
        cells,
        room: if unmet { room.min(-1.0) } else { room },
    }
}

fn needs_word(outcome: &Outcome, needs: &[Need]) -> String {
    let met = outcome
        .assessment
        .needs
        .iter()
        .filter(|need| need.met)
        .count();
    match (met, needs.len()) {
        (_, 0) => String::new(),
        (met, all) if met == all => "met".to_owned(),
        (0, _) => "NOT MET".to_owned(),
        (met, all) => format!("{met} of {all} met"),
    }
}

fn limit_word(words: &Words, outcome: &Outcome) -> String {
    let Some(limit) = &outcome.limit else {
        return String::new();
    };
    let text = words.limit(limit);
    let held_shut = |caution: &Caution| match caution {
        Caution::HeldShut { pump, .. } => limit.about == About::Pump(*pump),
        _ => false,
    };
    if outcome.assessment.cautions.iter().any(held_shut) {
        text + ": held shut"
    } else {
        text
    }
}

/// `2 x 44.1` for equal figures, `46.9 + 37.9` for others.
pub(super) fn listed(figures: &[String]) -> String {
    match figures {
        [] => "-".to_owned(),
        [one] => one.clone(),
        [first, rest @ ..] if rest.iter().all(|figure| figure == first) => {
            if first == "-" {
                first.clone()
            } else {
                format!("{} x {first}", figures.len())
            }
        }
        _ => figures.join(" + "),
    }
}

/// The table, rows in the order given.
pub fn grid(title: &str, columns: Vec<Column>, rows: Vec<Row>) -> Grid {
    Grid {
        title: title.to_owned(),
        name: "combinations".to_owned(),
        columns,
        rows: rows.into_iter().map(|row| row.cells).collect(),
    }
}

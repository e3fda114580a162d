//! Regulating parts: what each one holds, and what that takes.

use serde_json::{Value, json};

use super::grid::{Cell, Column, Grid};
use super::json::figure;
use crate::network::Network;
use crate::part::RegulatorId;
use crate::part::regulator::{Regulates, RegulatorState};
use crate::study::assessment::Assessment;
use crate::units::{Kind, UnitSet};

/// A state in words.
pub fn state_word(state: RegulatorState) -> &'static str {
    match state {
        RegulatorState::Regulating => "regulating",
        RegulatorState::WideOpen => "wide open",
        RegulatorState::Shut => "shut",
    }
}

/// Those that hold a pressure and those that look at a flow apart, as their figures have different units.
pub fn grids(network: &Network, assessment: &Assessment) -> Vec<Grid> {
    let parts = [
        (true, Kind::Pressure, "held_pressures", "Held pressures"),
        (false, Kind::Flow, "regulated_flows", "Regulated flows"),
    ];
    let grids = parts.map(|(pressure, kind, name, title)| {
        let chosen = network
            .regulator_ids()
            .filter(|id| network.regulator(*id).regulates.holds_pressure() == pressure);
        Grid {
            title: title.to_owned(),
            name: name.to_owned(),
            columns: vec![
                Column::text("part", "part"),
                Column::text("looks at", "looks_at"),
                Column::text("state", "state"),
                Column::figure("set", "set", kind),
                Column::figure("found", "found", kind),
                Column::figure("flow", "flow", Kind::Flow),
                Column::figure("head loss", "head_loss", Kind::Length),
            ],
            rows: chosen.map(|id| row(network, assessment, id)).collect(),
        }
    });
    grids
        .into_iter()
        .filter(|grid| !grid.rows.is_empty())
        .collect()
}

fn row(network: &Network, assessment: &Assessment, id: RegulatorId) -> Vec<Cell> {
    let does = &assessment.regulators[id.index()];
    vec![
        Cell::Text(network.regulator_name(id)),
        Cell::Text(looks_at(network, id)),
        Cell::Text(state_word(does.state).to_owned()),
        Cell::Figure(Some(does.set)),
        Cell::Figure(does.felt),
        Cell::Figure(Some(does.flow)),
        Cell::Figure(does.head_loss),
    ]
}

/// The node, line or pump whose figure a part feels.
fn looks_at(network: &Network, id: RegulatorId) -> String {
    let line = network.line(network.line_of_regulator(id));
    match network.regulator(id).regulates {
        Regulates::Downstream => network.node(line.to).name.clone(),
        Regulates::Upstream => network.node(line.from).name.clone(),
        Regulates::Flow => line.name.clone(),
        Regulates::MinimumFlow { pump } => network.pump(pump).name.clone(),
    }
}

/// By name.
pub fn json(network: &Network, units: &UnitSet, assessment: &Assessment) -> Value {
    let each = network.regulator_ids().map(|id| {
        let does = &assessment.regulators[id.index()];
        let kind = match network.regulator(id).regulates.holds_pressure() {
            true => Kind::Pressure,
            false => Kind::Flow,
        };
        let value = json!({
            "state": state_word(does.state),
            "looks_at": looks_at(network, id),
            "set": figure(units, kind, Some(does.set)),
            "found": figure(units, kind, does.felt),
            "flow": figure(units, Kind::Flow, Some(does.flow)),
            "head_loss": figure(units, Kind::Length, does.head_loss),
        });
        (network.regulator_name(id), value)
    });
    Value::Object(each.collect())
}

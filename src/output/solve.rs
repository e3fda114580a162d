//! The tables of one solved state.

use super::grid::{Cell, Column, Grid};
use super::words::Words;
use crate::network::{Need, Network, Target};
use crate::solve::LineState;
use crate::study::assessment::Assessment;
use crate::study::mains::{self, Main};
use crate::units::Kind;

/// A line's state in a word.
pub fn state_word(state: LineState) -> &'static str {
    match state {
        LineState::Closed => "closed",
        LineState::Stopped => "stopped",
        LineState::Checked => "checked",
        LineState::Open => "open",
    }
}

/// Needs, pumps, lines, nodes and mains, in that order; `thresholds` are the pumps' threshold speeds, one per pump.
pub fn grids(
    words: &Words,
    needs: &[Need],
    assessment: &Assessment,
    thresholds: &[Option<f64>],
) -> Vec<Grid> {
    let network = words.network;
    let mut grids = needs_grids(needs, assessment);
    if !network.pumps().is_empty() {
        grids.push(pumps(network, assessment, thresholds));
    }
    grids.extend(super::regulators::grids(network, assessment));
    grids.push(lines(network, assessment));
    grids.push(nodes(network, assessment));
    let mains = mains::states(network, &assessment.lines, &assessment.pumps);
    if !mains.is_empty() {
        grids.push(self::mains(network, &mains));
    }
    grids
}

/// Flow needs and pressure needs apart, as their figures have different units.
fn needs_grids(needs: &[Need], assessment: &Assessment) -> Vec<Grid> {
    let is_pressure = |need: &Need| matches!(need.target, Target::PressureAt(_));
    let mut grids = Vec::new();
    for (pressure, kind, name, title) in [
        (false, Kind::Flow, "needs", "Needs"),
        (true, Kind::Pressure, "pressure_needs", "Pressure needs"),
    ] {
        let rows: Vec<Vec<Cell>> = needs
            .iter()
            .zip(&assessment.needs)
            .filter(|(need, _)| is_pressure(need) == pressure)
            .map(|(need, value)| {
                let short = value.value.map(|value| -need.shortfall(value));
                vec![
                    Cell::Text(need.name.clone()),
                    Cell::Figure(value.value),
                    Cell::Figure(need.at_least),
                    Cell::Figure(need.at_most),
                    Cell::Text(if value.met { "met" } else { "NOT MET" }.to_owned()),
                    Cell::Figure(short),
                ]
            })
            .collect();
        if !rows.is_empty() {
            grids.push(Grid {
                title: title.to_owned(),
                name: name.to_owned(),
                columns: vec![
                    Column::text("need", "need"),
                    Column::figure("value", "value", kind),
                    Column::figure("at least", "at_least", kind),
                    Column::figure("at most", "at_most", kind),
                    Column::text("", "met"),
                    Column::figure("room", "room", kind),
                ],
                rows,
            });
        }
    }
    grids
}

fn pumps(network: &Network, assessment: &Assessment, thresholds: &[Option<f64>]) -> Grid {
    let has_threshold = thresholds.iter().any(Option::is_some);
    let rows = network.pump_ids().zip(&assessment.pumps).map(|(id, pump)| {
        let state = match (
            pump.running,
            assessment.lines[network.line_of(id).index()].state,
        ) {
            (true, LineState::Open) => "runs".to_owned(),
            (true, LineState::Checked) => "held shut".to_owned(),
            (true, state) => format!("runs, {}", state_word(state)),
            (false, _) => "stopped".to_owned(),
        };
        let mut cells = vec![
            Cell::Text(network.pump(id).name.clone()),
            Cell::Text(state),
            Cell::Figure(Some(pump.flow)),
            Cell::Figure(pump.head),
            Cell::Plain(pump.share_of_bep.map(|share| 100.0 * share), 0),
            Cell::Figure(pump.efficiency),
            Cell::Figure(pump.shaft_power.filter(|_| pump.running)),
            Cell::Plain(pump.motor_load.map(|load| 100.0 * load), 0),
            Cell::Figure(pump.npsh_available),
            Cell::Figure(pump.npsh_required),
            Cell::Figure(pump.suction_pressure),
        ];
        if has_threshold {
            let threshold = thresholds[id.index()];
            cells.push(Cell::Plain(threshold.map(|speed| 100.0 * speed), 1));
        }
        cells
    });
    let mut grid = Grid {
        title: "Pumps".to_owned(),
        name: "pumps".to_owned(),
        columns: vec![
            Column::text("pump", "pump"),
            Column::text("", "state"),
            Column::figure("flow", "flow", Kind::Flow),
            Column::figure("head", "head", Kind::Length),
            Column::in_unit("of BEP", "share_of_bep", "%"),
            Column::figure("effic.", "efficiency", Kind::Percent),
            Column::figure("shaft", "shaft_power", Kind::Power),
            Column::in_unit("motor", "motor_load", "%"),
            Column::figure("NPSHa", "npsh_available", Kind::Length),
            Column::figure("NPSHr", "npsh_required", Kind::Length),
            Column::figure("suction", "suction_pressure", Kind::Pressure),
        ],
        rows: rows.collect(),
    };
    if has_threshold {
        let column = Column::in_unit("zero below", "threshold_speed", "% speed");
        grid.columns.push(column);
    }
    grid
}

/// Velocity, retention and the first screen for surge.
fn mains(network: &Network, mains: &[Main]) -> Grid {
    let rows = mains.iter().map(|main| {
        vec![
            Cell::Text(network.line(main.line).name.clone()),
            Cell::Figure(Some(main.velocity)),
            Cell::Plain(Some(main.retention / 60.0), 1),
            Cell::Plain(Some(main.wave_speed), 0),
            Cell::Text(
                if main.wave_speed_known {
                    ""
                } else {
                    "rigid wall"
                }
                .to_owned(),
            ),
            Cell::Figure(Some(main.surge_head)),
            Cell::Plain(Some(main.return_time), 1),
        ]
    });
    Grid {
        title: "Mains, and a first screen for surge that clears nothing".to_owned(),
        name: "mains".to_owned(),
        columns: vec![
            Column::text("main", "main"),
            Column::figure("velocity", "velocity", Kind::Velocity),
            Column::in_unit("water stays", "retention", "min"),
            Column::in_unit("wave speed", "wave_speed", "m/s"),
            Column::text("", "wave_speed_of"),
            Column::figure("a v / g", "surge_head", Kind::Length),
            Column::in_unit("2 L / a", "return_time", "s"),
        ],
        rows: rows.collect(),
    }
}

fn lines(network: &Network, assessment: &Assessment) -> Grid {
    let rows = network
        .lines()
        .iter()
        .zip(&assessment.lines)
        .map(|(line, does)| {
            vec![
                Cell::Text(line.name.clone()),
                Cell::Text(network.node(line.from).name.clone()),
                Cell::Text(network.node(line.to).name.clone()),
                Cell::Text(state_word(does.state).to_owned()),
                Cell::Figure(Some(does.flow)),
                Cell::Figure(does.velocity),
                Cell::Figure(does.head_loss),
            ]
        });
    Grid {
        title: "Lines".to_owned(),
        name: "lines".to_owned(),
        columns: vec![
            Column::text("line", "line"),
            Column::text("from", "from"),
            Column::text("to", "to"),
            Column::text("state", "state"),
            Column::figure("flow", "flow", Kind::Flow),
            Column::figure("velocity", "velocity", Kind::Velocity),
            Column::figure("head loss", "head_loss", Kind::Length),
        ],
        rows: rows.collect(),
    }
}

fn nodes(network: &Network, assessment: &Assessment) -> Grid {
    let rows = network
        .nodes()
        .iter()
        .zip(&assessment.nodes)
        .map(|(node, does)| {
            vec![
                Cell::Text(node.name.clone()),
                Cell::Figure(does.head),
                Cell::Figure(does.pressure),
            ]
        });
    Grid {
        title: "Nodes".to_owned(),
        name: "nodes".to_owned(),
        columns: vec![
            Column::text("node", "node"),
            Column::figure("head", "head", Kind::Length),
            Column::figure("pressure", "pressure", Kind::Pressure),
        ],
        rows: rows.collect(),
    }
}

/// Cautions as a table, for CSV.
pub fn cautions(words: &Words, assessment: &Assessment) -> Grid {
    let rows = assessment.cautions.iter().map(|caution| {
        vec![
            Cell::Text(caution.code().to_owned()),
            Cell::Text(words.about(caution).to_owned()),
            Cell::Text(words.caution(caution)),
        ]
    });
    Grid {
        title: "Cautions".to_owned(),
        name: "cautions".to_owned(),
        columns: vec![
            Column::text("code", "code"),
            Column::text("about", "about"),
            Column::text("caution", "caution"),
        ],
        rows: rows.collect(),
    }
}

//! The plotted points as rows for programs, and the operating points as a table.

use super::{Remark, Telling};
use crate::output::duty::listed;
use crate::output::grid::{Cell, Column, Grid};
use crate::part::PumpId;
use crate::solve::operation::PumpOperation;
use crate::study::curves::{CombinedCurve, FlowHead, OperatingPoint};
use crate::units::Kind;

/// The operating points, one a row.
pub fn points(telling: &Telling) -> Grid {
    let units = telling.units;
    let row = |point: &OperatingPoint| {
        let curve = &telling.curves.combined[point.combined];
        let each = |figure: &dyn Fn(&PumpOperation) -> String| {
            let figures: Vec<String> = point.pumps.iter().map(|(_, pump)| figure(pump)).collect();
            Cell::Text(listed(&figures))
        };
        let share = |pump: &PumpOperation| {
            let share = pump.share_of_bep;
            share.map_or_else(|| "-".to_owned(), |share| format!("{:.0}", 100.0 * share))
        };
        vec![
            Cell::Text(telling.tag(point)),
            Cell::Text(telling.case(point.case).to_owned()),
            Cell::Text(telling.set(point.case, &curve.running)),
            Cell::Figure(Some(point.at.flow)),
            Cell::Figure(Some(point.at.head)),
            each(&|pump| units.number(Kind::Flow, pump.flow)),
            each(&share),
            Cell::Figure(point.npsh_margin()),
            Cell::Text(Remark::of(point).words().to_owned()),
        ]
    };
    Grid {
        title: "Operating points".to_owned(),
        name: "points".to_owned(),
        columns: vec![
            Column::text("point", "point"),
            Column::text("case", "case"),
            Column::text("running", "running"),
            Column::figure("flow", "flow", Kind::Flow),
            Column::figure("head", "head", Kind::Length),
            Column::in_unit("each", "flow_each", units.unit(Kind::Flow).symbol),
            Column::in_unit("of BEP", "share_of_bep", "%"),
            Column::figure("NPSH spare", "npsh_margin", Kind::Length),
            Column::text("remark", "remark"),
        ],
        rows: telling.curves.points.iter().map(row).collect(),
    }
}

/// What stands before the figures of a row.
#[derive(Clone, Default)]
struct Head {
    what: &'static str,
    tag: String,
    case: String,
    running: String,
    pump: String,
}

impl Head {
    fn row(&self, figures: Figures) -> Vec<Cell> {
        let words = [self.what, &self.tag, &self.case, &self.running, &self.pump];
        let values = [
            figures.flow,
            figures.head,
            figures.efficiency,
            figures.shaft_power,
            figures.npsh_required,
            figures.npsh_available,
            figures.share_of_bep,
        ];
        let words = words.map(|word| Cell::Text(word.to_owned()));
        words.into_iter().chain(values.map(Cell::Figure)).collect()
    }
}

/// The figures of a row; those that do not apply are none.
#[derive(Clone, Copy, Default)]
struct Figures {
    flow: Option<f64>,
    head: Option<f64>,
    efficiency: Option<f64>,
    shaft_power: Option<f64>,
    npsh_required: Option<f64>,
    npsh_available: Option<f64>,
    share_of_bep: Option<f64>,
}

impl From<&FlowHead> for Figures {
    fn from(point: &FlowHead) -> Self {
        Self {
            flow: Some(point.flow),
            head: Some(point.head),
            ..Self::default()
        }
    }
}

impl From<&PumpOperation> for Figures {
    fn from(pump: &PumpOperation) -> Self {
        Self {
            flow: Some(pump.flow),
            head: pump.head,
            efficiency: pump.efficiency,
            shaft_power: pump.shaft_power,
            npsh_required: pump.npsh_required,
            npsh_available: pump.npsh_available,
            share_of_bep: pump.share_of_bep,
        }
    }
}

/// Every point of every curve, and the operating points with what each pump does there.
pub fn rows(telling: &Telling) -> Grid {
    let mut rows = Vec::new();
    let curves = telling.curves;
    for (position, system) in curves.systems.iter().enumerate() {
        let head = Head {
            what: "system curve",
            tag: telling.letter(position),
            case: telling.cases_for_programs(&system.cases),
            ..Head::default()
        };
        rows.extend(system.points.iter().map(|point| head.row(point.into())));
    }
    for (position, curve) in curves.combined.iter().enumerate() {
        combined(telling, position, curve, &mut rows);
    }
    for point in &curves.points {
        operating_point(telling, point, &mut rows);
    }
    for pump in &curves.pumps {
        let head = Head {
            what: "pump curve",
            case: telling.cases_for_programs(&[pump.case]),
            pump: telling.names(pump.case, &pump.pumps),
            ..Head::default()
        };
        rows.extend(pump.points.iter().map(|point| {
            // its inlet on a bench tells nothing of the suction
            let npsh_available = None;
            head.row(Figures {
                npsh_available,
                ..point.into()
            })
        }));
    }
    for suction in &curves.suctions {
        let network = telling.network(suction.cases[0]);
        let head = Head {
            what: "suction curve",
            case: telling.cases_for_programs(&suction.cases),
            running: suction
                .beside
                .map_or_else(String::new, |pumps| pumps.to_string()),
            pump: network.pump(suction.pump).name.clone(),
            ..Head::default()
        };
        rows.extend(suction.points.iter().map(|(flow, available)| {
            head.row(Figures {
                flow: Some(*flow),
                npsh_available: Some(*available),
                ..Figures::default()
            })
        }));
    }
    Grid {
        title: "Curves".to_owned(),
        name: "curves".to_owned(),
        columns: columns(),
        rows,
    }
}

fn columns() -> Vec<Column> {
    let mut columns: Vec<Column> = ["what", "tag", "case", "running", "pump"]
        .map(|name| Column::text(name, name))
        .to_vec();
    columns.extend(
        [
            ("flow", Kind::Flow),
            ("head", Kind::Length),
            ("efficiency", Kind::Percent),
            ("shaft_power", Kind::Power),
            ("npsh_required", Kind::Length),
            ("npsh_available", Kind::Length),
            ("share_of_bep", Kind::Percent),
        ]
        .map(|(name, kind)| Column::figure(name, name, kind)),
    );
    columns
}

fn combined(telling: &Telling, position: usize, curve: &CombinedCurve, rows: &mut Vec<Vec<Cell>>) {
    let head = |what| Head {
        what,
        tag: telling.number(position),
        case: telling.cases_for_programs(&[curve.case]),
        running: telling.names(curve.case, &curve.running),
        ..Head::default()
    };
    let whole = if curve.stage.is_some() {
        "stage curve"
    } else {
        "combined curve"
    };
    rows.extend(
        curve
            .points
            .iter()
            .map(|point| head(whole).row(point.into())),
    );
    rows.extend(
        curve
            .beyond
            .iter()
            .map(|point| head("past the end").row(point.into())),
    );
    let mut mark = |what, point: Option<&FlowHead>| {
        rows.extend(point.map(|point| head(what).row(point.into())));
    };
    mark("shut-off", curve.points.first());
    mark("end of curve", curve.points.last());
    if let Some((low, high)) = curve.preferred {
        let at = |flow: f64| curve.points.iter().find(|point| point.flow == flow);
        mark("preferred from", at(low));
        mark("preferred to", at(high));
    }
}

fn operating_point(telling: &Telling, point: &OperatingPoint, rows: &mut Vec<Vec<Cell>>) {
    let curve = &telling.curves.combined[point.combined];
    let head = |what, pump: Option<PumpId>| Head {
        what,
        tag: telling.tag(point),
        case: telling.cases_for_programs(&[point.case]),
        running: telling.names(point.case, &curve.running),
        pump: pump.map_or_else(String::new, |id| {
            telling.network(point.case).pump(id).name.clone()
        }),
    };
    rows.push(head("operating point", None).row((&point.at).into()));
    for (id, pump) in &point.pumps {
        rows.push(head("pump at point", Some(*id)).row(pump.into()));
    }
}

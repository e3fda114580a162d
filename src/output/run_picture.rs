//! A run as a picture: levels with their alarm, start and stop lines, flows, and who ran when.

use super::chart::{
    Align, Axis, AxisKind, Band, Bars, Colour, Column, Curve, Dash, Figure, KeyColumn, KeyEntry,
    Pane, Plot, Rule, Strip, Stroke, Table,
};
use super::shift::Telling;
use crate::network::NodeId;
use crate::part::PumpId;
use crate::shift::{Call, Follow, Plan, Row, Trip, columns};
use crate::study::ranking::Run;
use crate::units::Kind;

/// Most tanks that are drawn.
const MOST_TANKS: usize = 6;
const HOUR: f64 = 3600.0;
const LEVELS: f64 = 58.0;
const FLOWS: f64 = 30.0;

/// What the picture shows, taken from the rows as they come.
#[derive(Clone, Debug, Default)]
pub struct Traces {
    tanks: Vec<TankTrace>,
    pumps: Vec<PumpTrace>,
}

#[derive(Clone, Debug)]
struct TankTrace {
    node: NodeId,
    /// Positions of level, inflow, outflow and spill in a row.
    columns: [usize; 4],
    /// Time and level, SI.
    level: Vec<[f64; 2]>,
    inflow: Vec<[f64; 2]>,
    outflow: Vec<[f64; 2]>,
    spills: Vec<(f64, f64)>,
}

#[derive(Clone, Debug)]
struct PumpTrace {
    pump: PumpId,
    column: usize,
    runs: Vec<(f64, f64)>,
}

impl Traces {
    /// For the columns of a run.
    pub fn new(telling: &Telling) -> Self {
        let all = columns(telling.network, telling.shift);
        let find = |name: &str, figure: &str| {
            all.iter()
                .position(|column| column.name == name && column.figure == figure)
        };
        let tank = |node: NodeId| {
            let name = &telling.network.node(node).name;
            let figures = ["level", "inflow", "outflow", "spill"];
            let [level, inflow, outflow, spill] = figures.map(|figure| find(name, figure));
            Some(TankTrace {
                node,
                columns: [level?, inflow?, outflow?, spill?],
                level: Vec::new(),
                inflow: Vec::new(),
                outflow: Vec::new(),
                spills: Vec::new(),
            })
        };
        let pump = |pump: PumpId| {
            Some(PumpTrace {
                pump,
                column: find(&telling.network.pump(pump).name, "running")?,
                runs: Vec::new(),
            })
        };
        Self {
            tanks: telling
                .shift
                .tanks
                .iter()
                .filter_map(|it| tank(it.node))
                .collect(),
            pumps: telling.network.pump_ids().filter_map(pump).collect(),
        }
    }

    /// Takes a row in.
    pub fn row(&mut self, row: Row<'_>) {
        let at = row.time;
        for tank in &mut self.tanks {
            let [level, inflow, outflow, spill] = tank.columns.map(|column| row.values[column]);
            tank.level.push([at, level]);
            for (trace, value) in [(&mut tank.inflow, inflow), (&mut tank.outflow, outflow)] {
                // What an event changes, changes at once.
                if let (Some([_, before]), false) = (trace.last().copied(), row.events.is_empty()) {
                    trace.push([at, before]);
                }
                trace.push([at, value]);
            }
            stretch(&mut tank.spills, at, spill > 0.0);
        }
        for pump in &mut self.pumps {
            stretch(&mut pump.runs, at, row.values[pump.column] > 0.5);
        }
    }
}

/// Opens, carries on or ends the last stretch; an open one has no end.
fn stretch(stretches: &mut Vec<(f64, f64)>, at: f64, on: bool) {
    match (stretches.last_mut(), on) {
        (Some(last), false) if last.1.is_infinite() => last.1 = at,
        (Some(last), true) if last.1.is_infinite() => {}
        (_, true) => stretches.push((at, f64::INFINITY)),
        (_, false) => {}
    }
}

/// The picture of a run; `answer` is what became of it in plain words.
pub fn figure(
    telling: &Telling,
    plan: &Plan,
    run: &Run,
    traces: &Traces,
    title: &str,
    answer: &str,
) -> Figure {
    let mut panes = Vec::new();
    for tank in traces.tanks.iter().take(MOST_TANKS) {
        panes.push(Pane::Plot(levels(telling, plan, tank)));
        panes.extend(flows(telling, tank).map(Pane::Plot));
    }
    panes.push(Pane::Strip(strip(telling, run, traces)));
    let mut notes: Vec<String> = Vec::new();
    if traces.tanks.len() > MOST_TANKS {
        notes.push(format!(
            "{} more tanks are not drawn.",
            traces.tanks.len() - MOST_TANKS
        ));
    }
    notes.extend(super::CAUTION.lines().map(str::to_owned));
    let heading = if title.is_empty() {
        "Run over the shift"
    } else {
        title
    };
    Figure {
        id: "run".to_owned(),
        title: heading.to_owned(),
        subtitle: std::iter::once(format!("Plan {}", run.plan))
            .chain(answer.lines().map(str::to_owned))
            .collect(),
        description: format!(
            "Levels and running pumps over time. {}",
            answer.replace('\n', " ")
        ),
        x: Axis {
            label: "Time of day".to_owned(),
            range: (0.0, run.ends_at.max(1.0)),
            kind: AxisKind::Clock {
                starts: telling.shift.starts,
            },
        },
        key: key(&panes),
        panes,
        table: Some(table(telling, run)),
        notes,
    }
}

const LEVEL: Stroke = stroke(Colour::Blue, Dash::Solid, 0.5);
const INFLOW: Stroke = stroke(Colour::Green, Dash::Long, 0.4);
const OUTFLOW: Stroke = stroke(Colour::Ink, Dash::Solid, 0.25);
const START: Stroke = stroke(Colour::Green, Dash::Short, 0.3);
const STOP: Stroke = stroke(Colour::Purple, Dash::DashDot, 0.3);
const BRIM: Stroke = stroke(Colour::Vermillion, Dash::Solid, 0.3);
const ALARM: Stroke = stroke(Colour::Vermillion, Dash::Long, 0.3);
const TRIP: Stroke = stroke(Colour::Vermillion, Dash::Dots, 0.3);

const fn stroke(colour: Colour, dash: Dash, width: f64) -> Stroke {
    Stroke {
        colour,
        dash,
        width,
    }
}

fn levels(telling: &Telling, plan: &Plan, tank: &TankTrace) -> Plot {
    let units = telling.units;
    let name = &telling.network.node(tank.node).name;
    let convert = |[at, level]: &[f64; 2]| [*at, units.from_si(Kind::Length, *level)];
    let points: Vec<[f64; 2]> = tank.level.iter().map(convert).collect();
    let rules = rules(telling, plan, tank.node);
    let of_rules = rules.iter().map(|rule| rule.at);
    let highest = points
        .iter()
        .map(|point| point[1])
        .chain(of_rules)
        .fold(0.0, f64::max);
    let say = |point: &[f64; 2]| {
        let level = units.number(Kind::Length, units.to_si(Kind::Length, point[1]));
        format!(
            "{} {name} at {level} {}",
            telling.clock(point[0]),
            units.unit(Kind::Length).symbol
        )
    };
    // so many under the pointer that none is far, so few that the file stays small
    let every = points.len().div_ceil(200).max(1);
    Plot {
        height: LEVELS,
        y: Axis {
            label: format!("Level of {name}, {}", units.unit(Kind::Length).symbol),
            range: (0.0, 1.06 * highest),
            ..Axis::default()
        },
        curves: vec![Curve {
            name: format!("level of {name}"),
            data: vec![("kind", "level".to_owned())],
            stroke: LEVEL,
            say: points
                .iter()
                .enumerate()
                .map(|(i, point)| {
                    if i % every == 0 {
                        say(point)
                    } else {
                        String::new()
                    }
                })
                .collect(),
            points,
            ..Curve::default()
        }],
        bands: spills(telling, tank),
        rules,
        marks: Vec::new(),
    }
}

fn spills(telling: &Telling, tank: &TankTrace) -> Vec<Band> {
    let name = &telling.network.node(tank.node).name;
    let end = tank.level.last().map_or(0.0, |point| point[0]);
    let band = |(from, to): &(f64, f64)| Band {
        range: (*from, to.min(end)),
        colour: Colour::Vermillion,
        labels: vec!["spills".to_owned()],
        say: format!(
            "{name} spills from {} to {}",
            telling.clock(*from),
            telling.clock(to.min(end))
        ),
    };
    tank.spills.iter().map(band).collect()
}

/// Level lines of a tank: brim, alarm, low-level trips, starts and stops; what lies at one level shares a line.
fn rules(telling: &Telling, plan: &Plan, node: NodeId) -> Vec<Rule> {
    let units = telling.units;
    let mut lines: Vec<(f64, Stroke, Vec<String>)> = Vec::new();
    let mut add = |at: f64, stroke: Stroke, name: String| match lines
        .iter_mut()
        .find(|(level, _, _)| (level - at).abs() < 1e-9)
    {
        Some((_, _, names)) if names.contains(&name) => {}
        Some((_, _, names)) => names.push(name),
        None => lines.push((at, stroke, vec![name])),
    };
    let tank = telling.shift.tanks.iter().find(|tank| tank.node == node);
    if let Some(tank) = tank {
        add(tank.brim, BRIM, "overflow".to_owned());
        if let Some(alarm) = tank.alarm {
            add(alarm, ALARM, "alarm".to_owned());
        }
    }
    let of_tank = |trip: &&Trip| trip.tank == node;
    for trip in plan.trips.iter().filter(of_tank) {
        add(trip.level, TRIP, "trip".to_owned());
    }
    for group in &plan.groups {
        let Call::Bands(bands) = &group.call else {
            continue;
        };
        if bands.follow != Follow::Level(node) {
            continue;
        }
        for (k, step) in bands.steps.iter().enumerate() {
            let number = if bands.steps.len() > 1 {
                format!(" {}", k + 1)
            } else {
                String::new()
            };
            add(step.start, START, format!("start{number}"));
            add(step.stop, STOP, format!("stop{number}"));
        }
    }
    lines
        .into_iter()
        .map(|(at, stroke, names)| Rule {
            at: units.from_si(Kind::Length, at),
            stroke,
            label: format!("{} {}", counted(&names), units.number(Kind::Length, at)),
        })
        .collect()
}

/// `stop 1, stop 2, stop 3` becomes `stop 1, 2, 3`.
fn counted(names: &[String]) -> String {
    let mut out = String::new();
    let mut last = "";
    for name in names {
        let (word, number) = name.split_once(' ').unwrap_or((name, ""));
        let next = if word == last && !number.is_empty() {
            number
        } else {
            name
        };
        if !out.is_empty() {
            out.push_str(", ");
        }
        out.push_str(next);
        last = word;
    }
    out
}

/// What flows in and out; none where nothing does.
fn flows(telling: &Telling, tank: &TankTrace) -> Option<Plot> {
    let units = telling.units;
    let name = &telling.network.node(tank.node).name;
    let curve = |what: &str, trace: &[[f64; 2]], stroke| Curve {
        name: format!("{what} of {name}"),
        data: vec![("kind", what.to_owned())],
        stroke,
        points: trace
            .iter()
            .map(|[at, flow]| [*at, units.from_si(Kind::Flow, *flow)])
            .collect(),
        ..Curve::default()
    };
    let curves = vec![
        curve("outflow", &tank.outflow, OUTFLOW),
        curve("inflow", &tank.inflow, INFLOW),
    ];
    let values = curves
        .iter()
        .flat_map(|curve| &curve.points)
        .map(|point| point[1]);
    let (low, high) = values.fold((0.0, 0.0), |(low, high), value| {
        (f64::min(low, value), f64::max(high, value))
    });
    (high > low).then(|| Plot {
        height: FLOWS,
        y: Axis {
            label: format!("Flow, {}", units.unit(Kind::Flow).symbol),
            range: (1.08 * low, 1.08 * high),
            ..Axis::default()
        },
        curves,
        ..Plot::default()
    })
}

fn strip(telling: &Telling, run: &Run, traces: &Traces) -> Strip {
    let row = |trace: &PumpTrace| {
        let score = run
            .score
            .pumps
            .iter()
            .find(|score| score.pump == trace.pump);
        let note = score.map_or_else(String::new, |score| {
            let word = if score.starts == 1 { "start" } else { "starts" };
            format!("{} {word}, {:.1} h", score.starts, score.run_time / HOUR)
        });
        Bars {
            name: telling.network.pump(trace.pump).name.clone(),
            bars: trace
                .runs
                .iter()
                .map(|(from, to)| (*from, to.min(run.ends_at)))
                .collect(),
            colour: Colour::Blue,
            note,
        }
    };
    Strip {
        rows: traces.pumps.iter().map(row).collect(),
    }
}

/// The lines that occur.
fn key(panes: &[Pane]) -> Vec<KeyColumn> {
    let mut strokes: Vec<Stroke> = Vec::new();
    for pane in panes {
        if let Pane::Plot(plot) = pane {
            strokes.extend(plot.curves.iter().map(|curve| curve.stroke));
            strokes.extend(plot.rules.iter().map(|rule| rule.stroke));
        }
    }
    let column = |entries: &[(Stroke, &str)]| KeyColumn {
        heading: String::new(),
        entries: entries
            .iter()
            .filter(|(stroke, _)| strokes.contains(stroke))
            .map(|(stroke, text)| KeyEntry {
                stroke: Some(*stroke),
                text: (*text).to_owned(),
                ..KeyEntry::default()
            })
            .collect(),
    };
    vec![
        column(&[(LEVEL, "level"), (INFLOW, "inflow"), (OUTFLOW, "outflow")]),
        column(&[(START, "start"), (STOP, "stop")]),
        column(&[
            (BRIM, "overflow"),
            (ALARM, "alarm"),
            (TRIP, "low-level trip"),
        ]),
    ]
}

/// The figures that a reader looks for first.
fn table(telling: &Telling, run: &Run) -> Table {
    const KILOWATT_HOUR: f64 = 3.6e6;
    let units = telling.units;
    let energy = |joules: Option<f64>| {
        joules.map_or_else(
            || "-".to_owned(),
            |joules| format!("{:.1}", joules / KILOWATT_HOUR),
        )
    };
    let rows = run.score.pumps.iter().map(|pump| {
        vec![
            telling.network.pump(pump.pump).name.clone(),
            pump.starts.to_string(),
            pump.worst_hour_starts.to_string(),
            format!("{:.2}", pump.run_time / HOUR),
            units.number(Kind::Volume, pump.volume),
            energy(pump.energy),
        ]
    });
    let column = |heading: &str, unit: &str| Column {
        heading: heading.to_owned(),
        unit: unit.to_owned(),
        align: Align::Right,
    };
    Table {
        title: "Pumps".to_owned(),
        columns: vec![
            Column {
                align: Align::Left,
                ..column("pump", "")
            },
            column("starts", ""),
            column("most in an hour", ""),
            column("run", "h"),
            column("volume", units.unit(Kind::Volume).symbol),
            column("energy", "kWh"),
        ],
        rows: rows.collect(),
    }
}

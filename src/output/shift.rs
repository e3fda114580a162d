//! A run over time: the plain answer, the scorecard, events and rows.

use serde_json::{Map, Value, json};

use super::grid::{Cell, Column, Grid};
use super::json::{figure, number};
use crate::network::Network;
use crate::shift::{Event, Score, Shift, What, Why};
use crate::study::ranking::{Measure, Run};
use crate::study::starts;
use crate::units::{Kind, UnitSet};

const MINUTE: f64 = 60.0;
const HOUR: f64 = 3600.0;
const DAY: f64 = 86_400.0;
const KILOWATT_HOUR: f64 = 3.6e6;

/// What the words of a run need at hand.
#[derive(Clone, Copy)]
pub struct Telling<'a> {
    /// For names.
    pub network: &'a Network,
    /// For figures.
    pub units: &'a UnitSet,
    /// For times of day.
    pub shift: &'a Shift,
}

impl Telling<'_> {
    fn write(&self, kind: Kind, value: f64) -> String {
        self.units.with_unit(kind, value)
    }

    /// Time of day to the second, and the day where it is not the first.
    pub fn clock(&self, time: f64) -> String {
        let seconds = (self.shift.starts + time).round();
        let day = (seconds / DAY).floor();
        let s = (seconds - day * DAY) as u32;
        let clock = format!("{:02}:{:02}:{:02}", s / 3600, s / 60 % 60, s % 60);
        if day > 0.0 {
            format!("day {} {clock}", day as u64 + 1)
        } else {
            clock
        }
    }

    /// An event in plain words, with its time.
    pub fn event(&self, event: &Event) -> String {
        format!("{} {}", self.clock(event.time), self.happening(event))
    }

    /// An event in plain words without its time.
    pub fn happening(&self, event: &Event) -> String {
        event.words(self.network, &|kind, value| self.write(kind, value))
    }

    fn cause(&self, event: &Event) -> String {
        event.cause(self.network, &|kind, value| self.write(kind, value))
    }

    /// What became of it, in a few sentences: what went wrong first, then how each tank ended.
    pub fn answer(&self, story: &Story, score: &Score, ends_at: f64) -> String {
        let mut out = Vec::new();
        let to_spare = |time: f64| {
            let spare = ends_at - time;
            if spare < 30.0 {
                "as the shift ends".to_owned()
            } else {
                format!("{} before the shift ends", span(spare))
            }
        };
        for tank in &score.tanks {
            let name = &self.network.node(tank.node).name;
            if tank.spilled > 0.0 {
                let first = story.first(What::Spills, name, self.network);
                let since = first.map_or_else(String::new, |event| {
                    format!(", first at {}", self.clock(event.time))
                });
                out.push(format!(
                    "{name} spills {}{since}.",
                    self.write(Kind::Volume, tank.spilled)
                ));
            }
            if tank.above_alarm > 0.0 {
                out.push(format!(
                    "{name} stands {} above its alarm.",
                    span(tank.above_alarm)
                ));
            }
            if let Some(event) = story.first(What::Empty, name, self.network) {
                out.push(format!(
                    "{name} is empty at {}, {}.",
                    self.clock(event.time),
                    to_spare(event.time)
                ));
            }
            if tank.unmet > 0.0 {
                out.push(format!(
                    "{} drawn from {name} were not met.",
                    self.write(Kind::Volume, tank.unmet)
                ));
            }
        }
        if let Some(event) = story.last_stop.as_ref().filter(|_| !story.running) {
            out.push(format!(
                "The last pump stops at {} ({}), {}.",
                self.clock(event.time),
                self.cause(event),
                to_spare(event.time)
            ));
        }
        for tank in &score.tanks {
            out.push(format!(
                "{} goes from {} to {}, between {} and {}.",
                self.network.node(tank.node).name,
                self.write(Kind::Length, tank.start_level),
                self.write(Kind::Length, tank.end_level),
                self.write(Kind::Length, tank.lowest),
                self.write(Kind::Length, tank.highest)
            ));
        }
        out.join("\n") + "\n"
    }

    /// The columns of the time series as they head a CSV file: time first, what happened last.
    pub fn headings(&self) -> Vec<String> {
        let columns = crate::shift::columns(self.network, self.shift);
        let mut headings = vec!["time [s]".to_owned()];
        headings.extend(columns.iter().map(|column| match column.kind {
            Some(kind) => format!(
                "{}.{} [{}]",
                column.name,
                column.figure,
                self.units.unit(kind).symbol
            ),
            None => format!("{}.{}", column.name, column.figure),
        }));
        headings.push("event".to_owned());
        headings
    }

    /// The kinds of the time series' columns, time and events aside.
    pub fn kinds(&self) -> Vec<Option<Kind>> {
        let columns = crate::shift::columns(self.network, self.shift);
        columns.iter().map(|column| column.kind).collect()
    }

    /// One object, as fixed for results over time.
    pub fn json(&self, run: &Run) -> Value {
        let units = self.units;
        let score = &run.score;
        let volume = |value: f64| figure(units, Kind::Volume, Some(value));
        let length = |value: f64| figure(units, Kind::Length, Some(value));
        let energy = |value: Option<f64>| number(value.map(|joules| joules / KILOWATT_HOUR));
        let tanks: Map<String, Value> = score
            .tanks
            .iter()
            .map(|tank| {
                let value = json!({
                    "start_level": length(tank.start_level), "end_level": length(tank.end_level),
                    "lowest": length(tank.lowest), "highest": length(tank.highest),
                    "volume_in": volume(tank.volume_in), "volume_out": volume(tank.volume_out),
                    "spilled": volume(tank.spilled), "unmet": volume(tank.unmet),
                    "above_alarm_min": number(Some(tank.above_alarm / MINUTE)),
                    "below_trip_min": number(Some(tank.below_trip / MINUTE)),
                    "empty_min": number(Some(tank.empty / MINUTE)),
                });
                (self.network.node(tank.node).name.clone(), value)
            })
            .collect();
        let pumps: Map<String, Value> = score
            .pumps
            .iter()
            .map(|pump| {
                let value = json!({
                    "starts": pump.starts, "worst_hour_starts": pump.worst_hour_starts,
                    "hours": number(Some(pump.run_time / HOUR)), "volume": volume(pump.volume),
                    "shaft_energy": energy(pump.shaft_energy), "energy": energy(pump.energy),
                    "held_shut_min": number(Some(pump.held_shut / MINUTE)),
                    "past_end_min": number(Some(pump.past_end / MINUTE)),
                    "least_npsh_margin": figure(units, Kind::Length, pump.least_npsh_margin),
                });
                (self.network.pump(pump.pump).name.clone(), value)
            })
            .collect();
        let events: Vec<Value> = run
            .events
            .iter()
            .map(|event| {
                json!({
                    "time": number(Some(event.time)), "what": event.what.word(),
                    "who": event.who.name(self.network), "why": self.cause(event),
                })
            })
            .collect();
        json!({
            "units": {
                "length": units.unit(Kind::Length).symbol, "volume": units.unit(Kind::Volume).symbol, "energy": "kWh",
            },
            "plan": run.plan,
            "ends_at": number(Some(run.ends_at)),
            "tanks": tanks,
            "pumps": pumps,
            "score": {
                "spilled": volume(score.spilled), "unmet": volume(score.unmet), "starts": score.starts,
                "worst_hour_starts": score.worst_hour_starts, "pumped": volume(score.pumped),
                "energy": energy(score.energy), "kWh_per_m3": energy(score.specific_energy),
                "peak_kW": number(score.peak_power.map(|watts| watts / 1000.0)),
                "cost": number(score.cost), "corrected_cost": number(score.corrected_cost()),
                "carbon_kg": number(score.carbon), "owed": volume(score.owed),
            },
            "events": events,
            "balance": {"volume_error": number(Some(score.volume_error))},
        })
    }
}

/// The few events that the plain answer needs, kept while a run streams by.
#[derive(Clone, Debug, Default)]
pub struct Story {
    firsts: Vec<Event>,
    last_stop: Option<Event>,
    running: bool,
    on: u32,
}

impl Story {
    /// Takes an event in.
    pub fn tell(&mut self, event: &Event) {
        match event.what {
            What::Start => self.on += 1,
            What::Stop | What::Trip if event.why != Why::Time => {
                self.on = self.on.saturating_sub(1);
                self.last_stop = Some(*event);
            }
            What::Spills | What::Empty => {
                let known = |other: &Event| other.what == event.what && other.who == event.who;
                if !self.firsts.iter().any(known) {
                    self.firsts.push(*event);
                }
            }
            _ => {}
        }
        self.running = self.on > 0;
    }

    fn first(&self, what: What, name: &str, network: &Network) -> Option<&Event> {
        self.firsts
            .iter()
            .find(|event| event.what == what && event.who.name(network) == name)
    }
}

/// `43 min`, `7 h 17 min`, `3 d 4 h`: whole minutes that are surely there.
fn span(seconds: f64) -> String {
    let minutes = (seconds / MINUTE).floor() as u64;
    match (minutes / 1440, minutes / 60 % 24, minutes % 60) {
        (0, 0, m) => format!("{m} min"),
        (0, h, m) => format!("{h} h {m} min"),
        (d, h, _) => format!("{d} d {h} h"),
    }
}

/// The scorecard of one or more runs: a row a plan.
pub fn scores(network: &Network, runs: &[&Run]) -> Grid {
    let minutes = |name: &str, heading: &str| Column::in_unit(heading, name, "min");
    let mut columns = vec![
        Column::text("plan", "plan"),
        Column::figure("spilled", "spilled", Kind::Volume),
        Column::figure("unmet", "unmet", Kind::Volume),
        minutes("above_alarm", "alarm"),
        minutes("below_trip", "trip"),
        minutes("held_shut", "held shut"),
        minutes("past_end", "past curve"),
        minutes("below_least_flow", "low flow"),
        minutes("outside_preferred", "off region"),
        Column::figure("NPSH spare", "least_npsh_margin", Kind::Length),
        Column::text("starts", "starts"),
        Column::text("worst/h", "worst_hour_starts"),
        Column::in_unit("run", "hours", "h"),
        Column::figure("pumped", "pumped", Kind::Volume),
        Column::in_unit("energy", "energy", "kWh"),
        Column::in_unit("specific", "specific_energy", "kWh/m3"),
        Column::text("cost", "cost"),
        Column::text("corrected", "corrected_cost"),
        Column::in_unit("peak", "peak", "kW"),
        Column::in_unit("CO2", "carbon", "kg"),
        Column::figure("owed", "owed", Kind::Volume),
    ];
    let tanks = runs.first().map_or(&[][..], |run| &run.score.tanks);
    for tank in tanks {
        let name = &network.node(tank.node).name;
        columns.push(Column::figure(
            &format!("{name} low"),
            &format!("{name}.lowest"),
            Kind::Length,
        ));
        columns.push(Column::figure(
            "high",
            &format!("{name}.highest"),
            Kind::Length,
        ));
        columns.push(Column::figure(
            "end",
            &format!("{name}.end_level"),
            Kind::Length,
        ));
    }
    let rows = runs.iter().map(|run| {
        let score = &run.score;
        let in_minutes = |seconds: f64| Cell::Plain(Some(seconds / MINUTE), 0);
        let kilowatt_hours = |joules: Option<f64>, decimals| {
            Cell::Plain(joules.map(|joules| joules / KILOWATT_HOUR), decimals)
        };
        let hours: f64 = score.pumps.iter().map(|pump| pump.run_time / HOUR).sum();
        let mut cells = vec![
            Cell::Text(run.plan.clone()),
            Cell::Figure(Some(score.spilled)),
            Cell::Figure(Some(score.unmet)),
            in_minutes(score.above_alarm),
            in_minutes(score.below_trip),
            in_minutes(score.held_shut),
            in_minutes(score.past_end),
            in_minutes(score.below_least_flow),
            in_minutes(score.outside_preferred),
            Cell::Figure(score.least_npsh_margin),
            Cell::Plain(Some(f64::from(score.starts)), 0),
            Cell::Plain(Some(f64::from(score.worst_hour_starts)), 0),
            Cell::Plain(Some(hours), 1),
            Cell::Figure(Some(score.pumped)),
            kilowatt_hours(score.energy, 1),
            kilowatt_hours(score.specific_energy, 4),
            Cell::Plain(score.cost, 2),
            Cell::Plain(score.corrected_cost(), 2),
            Cell::Plain(score.peak_power.map(|watts| watts / 1000.0), 1),
            Cell::Plain(score.carbon, 1),
            Cell::Figure(Some(score.owed)),
        ];
        for tank in &score.tanks {
            cells.extend(
                [tank.lowest, tank.highest, tank.end_level].map(|level| Cell::Figure(Some(level))),
            );
        }
        cells
    });
    Grid {
        title: "Scorecard".to_owned(),
        name: "scores".to_owned(),
        columns,
        rows: rows.collect(),
    }
}

/// The scorecard of one run by name and value, what does not occur left out.
pub fn card_rows(telling: &Telling, run: &Run) -> Vec<(&'static str, String)> {
    let score = &run.score;
    let mut rows: Vec<(&'static str, String)> = Vec::new();
    for measure in Measure::ALL {
        let value = measure.of(score);
        let shown = match measure {
            Measure::Spilled => ("spilled", telling.write(Kind::Volume, score.spilled)),
            Measure::Unmet => ("drawn in vain", telling.write(Kind::Volume, score.unmet)),
            Measure::Alarm => ("above alarm", format!("{value:.0} min")),
            Measure::Trip => ("below trip", format!("{value:.0} min")),
            Measure::HeldShut => ("pump time held shut", format!("{value:.0} min")),
            Measure::PastEnd => ("pump time past the curve", format!("{value:.0} min")),
            Measure::LeastFlow => ("pump time below least flow", format!("{value:.0} min")),
            Measure::OutsidePreferred => (
                "pump time outside the preferred region",
                format!("{value:.0} min"),
            ),
            Measure::Starts => {
                let worst = score.worst_hour_starts;
                (
                    "starts",
                    format!("{} (at most {worst} of one pump in an hour)", score.starts),
                )
            }
            Measure::Energy => {
                let specific = score.specific_energy.map_or_else(String::new, |joules| {
                    format!(", {:.4} kWh/m3", joules / KILOWATT_HOUR)
                });
                let energy = score.energy.unwrap_or(0.0) / KILOWATT_HOUR;
                ("electrical energy", format!("{energy:.1} kWh{specific}"))
            }
            Measure::Cost => {
                let corrected = score.corrected_cost().unwrap_or(0.0);
                let cost = score.cost.unwrap_or(0.0);
                (
                    "cost",
                    format!("{cost:.2} ({corrected:.2} with the end level made good)"),
                )
            }
            Measure::Peak => ("peak over 15 min", format!("{value:.1} kW")),
        };
        if value > 0.0 {
            rows.push(shown);
        }
    }
    if let Some(carbon) = score.carbon {
        rows.push(("CO2", format!("{carbon:.1} kg")));
    }
    rows.push((
        "books closed to",
        format!("{:.0e} of the throughput", score.volume_error),
    ));
    rows
}

/// The scorecard of one run as people read it: figure under figure.
pub fn card(telling: &Telling, run: &Run) -> String {
    let rows = card_rows(telling, run);
    let width = rows.iter().map(|(name, _)| name.len()).max().unwrap_or(0);
    let lines: Vec<String> = rows
        .iter()
        .map(|(name, value)| format!("  {name:width$}  {value}"))
        .collect();
    format!("Scorecard of {}\n{}\n", run.plan, lines.join("\n"))
}

/// The pumps of a run.
pub fn pumps(network: &Network, run: &Run) -> Grid {
    let rows = run.score.pumps.iter().map(|pump| {
        vec![
            Cell::Text(network.pump(pump.pump).name.clone()),
            Cell::Plain(Some(f64::from(pump.starts)), 0),
            Cell::Plain(Some(f64::from(pump.worst_hour_starts)), 0),
            Cell::Plain(starts::allowed(network, pump.pump), 0),
            Cell::Plain(Some(pump.run_time / HOUR), 2),
            Cell::Figure(Some(pump.volume)),
            Cell::Plain(pump.shaft_energy.map(|joules| joules / KILOWATT_HOUR), 1),
            Cell::Plain(pump.energy.map(|joules| joules / KILOWATT_HOUR), 1),
            Cell::Figure(pump.least_npsh_margin),
        ]
    });
    Grid {
        title: "Pumps".to_owned(),
        name: "pumps".to_owned(),
        columns: vec![
            Column::text("pump", "pump"),
            Column::text("starts", "starts"),
            Column::text("worst/h", "worst_hour_starts"),
            Column::text("may/h", "starts_allowed"),
            Column::in_unit("run", "hours", "h"),
            Column::figure("volume", "volume", Kind::Volume),
            Column::in_unit("shaft", "shaft_energy", "kWh"),
            Column::in_unit("energy", "energy", "kWh"),
            Column::figure("NPSH spare", "least_npsh_margin", Kind::Length),
        ],
        rows: rows.collect(),
    }
}

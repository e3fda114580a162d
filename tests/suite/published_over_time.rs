//! Published cases over time, a folder each in `tests/published_over_time`; see its README for the form.

use dutybank::read::{Document, OverTime, System};
use dutybank::shift::{Plan, Record, Shift, What, Who, columns, run};
use serde_yaml::Value;
use std::path::Path;

struct Case {
    system: System,
    over_time: OverTime,
}

impl Case {
    fn read(folder: &Path, case: Option<&str>) -> Self {
        let load = |name: &str| std::fs::read(folder.join(name));
        let text = std::fs::read(folder.join("network.yaml")).unwrap();
        let document = Document::parse(&text).unwrap();
        let cases = document.cases().unwrap();
        let changes = case.map_or_else(Vec::new, |name| {
            cases
                .iter()
                .find(|case| case.name == name)
                .unwrap()
                .changes
                .clone()
        });
        let shown = |problems: dutybank::diagnostic::Diagnostics| {
            problems.render(document.text(), "network.yaml", false)
        };
        let system = document
            .system(&changes, &load)
            .map_err(shown)
            .unwrap_or_else(|e| panic!("{e}"));
        let over_time = document
            .over_time(&system, &changes, &load)
            .map_err(shown)
            .unwrap_or_else(|e| panic!("{e}"));
        Self { system, over_time }
    }

    fn run(&self, shift: &Shift) -> Record {
        let none = Plan::default();
        let plan = self.over_time.plans.first().unwrap_or(&none);
        let mut record = Record::new();
        let outcome = run(&self.system.network, shift, plan, &mut record).unwrap();
        assert!(outcome.score.volume_error < 1e-9);
        record
    }

    /// A figure of the time series at a time.
    fn at(&self, name: &str, figure: &str, time: f64) -> f64 {
        let network = &self.system.network;
        let mut shift = self.over_time.shift.clone();
        shift.lasts = if time > 0.0 { time } else { 1.0 };
        let record = self.run(&shift);
        let column = columns(network, &shift)
            .iter()
            .position(|column| column.name == name && column.figure == figure)
            .unwrap_or_else(|| panic!("no column {name}.{figure}"));
        let row = if time > 0.0 {
            record.times().len() - 1
        } else {
            0
        };
        record.column(column)[row]
    }

    /// When a level is reached for the first time.
    fn time_at_level(&self, tank: &str, level: f64) -> f64 {
        let node = self.system.network.find_node(tank).unwrap();
        let mut shift = self.over_time.shift.clone();
        let tank = shift
            .tanks
            .iter_mut()
            .find(|tank| tank.node == node)
            .unwrap();
        let what = if level == 0.0 {
            What::Empty
        } else if level > tank.level {
            What::Alarm
        } else {
            What::AlarmOver
        };
        tank.alarm = (level > 0.0).then_some(level);
        let record = self.run(&shift);
        let found = record
            .events()
            .iter()
            .find(|event| event.what == what && event.who == Who::Node(node));
        found
            .unwrap_or_else(|| panic!("{:?}", record.events()))
            .time
    }

    /// From the last start but one to the last, so that how it began plays no part.
    fn cycle_time(&self, pump: &str) -> f64 {
        let pump = self.system.network.find_pump(pump).unwrap();
        let record = self.run(&self.over_time.shift);
        let starts: Vec<f64> = record
            .events()
            .iter()
            .filter(|event| event.what == What::Start && event.who == Who::Pump(pump))
            .map(|event| event.time)
            .collect();
        starts[starts.len() - 1] - starts[starts.len() - 2]
    }

    fn figure(&self, of: &str, row: &Value) -> f64 {
        let quantity = |key: &str| {
            let text = row[key].as_str().unwrap();
            let (number, _) = text.split_once(' ').unwrap();
            number.parse::<f64>().unwrap()
        };
        match of.split('.').collect::<Vec<_>>().as_slice() {
            ["tanks", tank, "time_at_level"] => self.time_at_level(tank, quantity("level")),
            ["tanks", tank, "level"] => self.at(tank, "level", quantity("at")),
            ["lines", line, "flow"] => self.at(line, "flow", quantity("at")),
            ["pumps", pump, "npsh_available"] => self.at(pump, "npsh_available", quantity("at")),
            ["pumps", pump, "cycle_time"] => self.cycle_time(pump),
            ["pumps", pump, "starts_per_hour"] => 3600.0 / self.cycle_time(pump),
            _ => panic!("unknown figure {of}"),
        }
    }
}

#[test]
fn every_published_case_over_time_is_met_within_its_tolerance() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/published_over_time");
    let mut checked = 0;
    for entry in std::fs::read_dir(folder).unwrap() {
        let folder = entry.unwrap().path();
        if !folder.is_dir() {
            continue;
        }
        let expected = std::fs::read_to_string(folder.join("expected.yaml")).unwrap();
        let expected: Value = serde_yaml::from_str(&expected).unwrap();
        for row in expected["expect"].as_sequence().unwrap() {
            let of = row["of"].as_str().unwrap();
            let case = Case::read(&folder, row["case"].as_str());
            let scale = match row["unit"].as_str().unwrap() {
                "s" | "m" | "m3/s" | "1/h" => 1.0,
                "h" => 3600.0,
                "d" => 86_400.0,
                unit => panic!("unit {unit}"),
            };
            let found = case.figure(of, row) / scale;
            let (value, tolerance) = (
                row["value"].as_f64().unwrap(),
                row["tolerance"].as_f64().unwrap(),
            );
            assert!(
                (found - value).abs() <= tolerance,
                "{}: {of} is {found}, expected {value} within {tolerance}",
                folder.display()
            );
            checked += 1;
        }
    }
    assert!(checked >= 18, "{checked}");
}

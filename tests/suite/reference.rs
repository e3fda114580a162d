//! The demo systems, as written and in each of their cases, against a second solver that shares no code and no method with
//! this one.
//!
//! Expected figures: tests/reference (least content and a root finder of SciPy, laws written anew); its README says how they
//! are made. Data of the systems: invented.

use std::path::Path;

use dutybank::read::{Change, Document, System};
use dutybank::solve::{LineState, Solution, Solver, operation};
use dutybank::units::Kind;
use serde_json::Value;

/// Flows to this share of the largest one.
const FLOW: f64 = 1e-6;
/// Heads, m.
const HEAD: f64 = 1e-5;
/// Figures that follow from the two, to this share of themselves.
const FIGURE: f64 = 1e-6;

struct Comparison {
    compared: usize,
    wrong: Vec<String>,
}

impl Comparison {
    fn number(&mut self, what: &str, found: Option<f64>, expected: &Value, tolerance: f64) {
        self.compared += 1;
        let expected = expected.as_f64();
        let agrees = match (found, expected) {
            (Some(found), Some(expected)) => (found - expected).abs() <= tolerance,
            (None, None) => true,
            _ => false,
        };
        if !agrees {
            self.wrong
                .push(format!("{what}: {found:?}, expected {expected:?}"));
        }
    }

    fn word(&mut self, what: &str, found: &str, expected: &Value) {
        self.compared += 1;
        if expected.as_str() != Some(found) {
            self.wrong
                .push(format!("{what}: {found}, expected {expected}"));
        }
    }

    fn system(&mut self, name: &str, system: &System, expected: &Value) {
        let mut solver = Solver::new(&system.network);
        match solver.solve(system.network.settings()) {
            Ok(solution) => {
                self.nodes(name, system, solution, &expected["nodes"]);
                self.lines(name, system, solution, &expected["lines"]);
                self.pumps(name, system, solution, &expected["pumps"]);
            }
            Err(error) => self
                .wrong
                .push(format!("{name}: {}", error.message(&system.network))),
        }
    }

    fn nodes(&mut self, name: &str, system: &System, solution: &Solution, expected: &Value) {
        let network = &system.network;
        assert_eq!(expected.as_object().unwrap().len(), network.nodes().len());
        for id in network.node_ids() {
            let node = &network.node(id).name;
            let expected = &expected[node];
            let found = operation::node(network, network.settings(), solution, id);
            let units = &system.units;
            let per_metre = units.from_si(Kind::Length, 1.0);
            self.number(
                &format!("{name}: {node}.head"),
                found.head.map(|head| units.from_si(Kind::Length, head)),
                &expected["head"],
                HEAD * per_metre,
            );
            // the pressure of that much head
            let weight = network.fluid().density * network.gravity();
            self.number(
                &format!("{name}: {node}.pressure"),
                found.pressure.map(|p| units.from_si(Kind::Pressure, p)),
                &expected["pressure"],
                units.from_si(Kind::Pressure, HEAD * weight),
            );
        }
    }

    fn lines(&mut self, name: &str, system: &System, solution: &Solution, expected: &Value) {
        let network = &system.network;
        assert_eq!(expected.as_object().unwrap().len(), network.lines().len());
        let largest = solution
            .flows()
            .iter()
            .fold(0.0, |m: f64, q| m.max(q.abs()));
        for id in network.line_ids() {
            let line = &network.line(id).name;
            let expected = &expected[line];
            self.number(
                &format!("{name}: {line}.flow"),
                Some(system.units.from_si(Kind::Flow, solution.flow(id))),
                &expected["flow"],
                FLOW * system.units.from_si(Kind::Flow, largest),
            );
            let state = match solution.state(id) {
                LineState::Open => "open",
                LineState::Checked => "checked",
                LineState::Stopped => "stopped",
                LineState::Closed => "closed",
            };
            self.word(&format!("{name}: {line}.state"), state, &expected["state"]);
        }
    }

    fn pumps(&mut self, name: &str, system: &System, solution: &Solution, expected: &Value) {
        let network = &system.network;
        for id in network.pump_ids() {
            let pump = &network.pump(id).name;
            let expected = &expected[pump];
            let found = operation::pump(network, network.settings(), solution, id);
            let in_unit =
                |kind, value: Option<f64>| value.map(|value| system.units.from_si(kind, value));
            // The reference leaves out what a sheet does not give, and everything of a pump at rest but its flow.
            let figures = [
                ("head", in_unit(Kind::Length, found.head)),
                ("efficiency", in_unit(Kind::Percent, found.efficiency)),
                ("shaft_power", in_unit(Kind::Power, found.shaft_power)),
                (
                    "npsh_available",
                    in_unit(Kind::Length, found.npsh_available),
                ),
                ("npsh_required", in_unit(Kind::Length, found.npsh_required)),
                ("share_of_bep", found.share_of_bep),
            ];
            for (figure, value) in figures {
                let Some(expected) = expected.get(figure) else {
                    continue;
                };
                let size = expected.as_f64().map_or(1.0, |value| value.abs().max(1.0));
                self.number(
                    &format!("{name}: {pump}.{figure}"),
                    value,
                    expected,
                    FIGURE * size + 1e-5 * f64::from(u8::from(figure == "npsh_available")),
                );
            }
        }
    }
}

#[test]
fn every_demo_system_agrees_with_the_second_solver() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let mut all = Comparison {
        compared: 0,
        wrong: Vec::new(),
    };
    let mut names: Vec<_> = std::fs::read_dir(root.join("networks"))
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|ending| ending == "yaml"))
        .collect();
    names.sort();
    assert!(names.len() >= 7);
    let mut states = 0;
    for path in names {
        let name = path.file_stem().unwrap().to_string_lossy().into_owned();
        let expected = root.join(format!("tests/reference/expected/{name}.json"));
        let text = std::fs::read_to_string(&expected)
            .unwrap_or_else(|why| panic!("{}: {why}", expected.display()));
        let expected: Value = serde_json::from_str(&text).unwrap();
        let document = Document::parse(&std::fs::read(&path).unwrap()).unwrap();
        let load = |file: &str| std::fs::read(root.join("networks").join(file));
        let system = |changes: &[Change]| {
            document.system(changes, &load).unwrap_or_else(|problems| {
                panic!("{}", problems.render(document.text(), &name, false))
            })
        };
        all.system(&name, &system(&[]), &expected["as written"]);
        states += 1;
        let cases = document.cases().unwrap();
        let expected_cases = expected["cases"].as_object().unwrap();
        for case in &cases {
            let Some(expected) = expected_cases.get(&case.name) else {
                panic!("{name}: no expected figures for case `{}`", case.name);
            };
            let what = format!("{name}, {}", case.name);
            all.system(&what, &system(&case.changes), expected);
            states += 1;
        }
        assert_eq!(cases.len(), expected_cases.len(), "{name}");
    }
    println!("{} figures of {states} states compared", all.compared);
    assert!(all.compared > 1000, "only {} figures", all.compared);
    assert!(
        all.wrong.is_empty(),
        "{} of {} figures differ:\n{}",
        all.wrong.len(),
        all.compared,
        all.wrong.join("\n")
    );
}

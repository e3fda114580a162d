//! Published and closed-form systems: each folder of tests/published is a network, where it comes from, and what is expected.

use std::path::{Path, PathBuf};

use dutybank::read::{Document, System};
use dutybank::solve::{LineState, Solution, Solver, operation};
use dutybank::units::{Unit, parse_quantity};
use serde::Deserialize;

#[derive(Deserialize)]
struct Expected {
    #[allow(dead_code)]
    source: String,
    expect: Vec<Row>,
}

#[derive(Deserialize)]
struct Row {
    of: String,
    value: serde_yaml::Value,
    unit: Option<String>,
    #[serde(default)]
    tolerance: f64,
    #[allow(dead_code)]
    basis: String,
}

fn folders() -> Vec<PathBuf> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/published");
    let entries = std::fs::read_dir(root)
        .unwrap()
        .map(|entry| entry.unwrap().path());
    let mut folders: Vec<PathBuf> = entries
        .filter(|path| path.join("network.yaml").exists())
        .collect();
    folders.sort();
    folders
}

fn read(folder: &Path) -> System {
    let path = folder.join("network.yaml");
    let load = |name: &str| std::fs::read(folder.join(name));
    let document = Document::parse(&std::fs::read(&path).unwrap()).unwrap();
    document.system(&[], &load).unwrap_or_else(|d| {
        panic!(
            "{}\n{}",
            path.display(),
            d.render(document.text(), "network.yaml", false)
        )
    })
}

/// The figure that `of` names, in SI.
fn figure(system: &System, solution: &Solution, of: &str) -> Option<f64> {
    let network = &system.network;
    let settings = network.settings();
    let (kind, rest) = of.split_once('.').unwrap();
    let (name, figure) = rest.rsplit_once('.').unwrap();
    match kind {
        "nodes" => {
            let id = network
                .find_node(name)
                .unwrap_or_else(|| panic!("nothing is called {name}"));
            match figure {
                "head" => solution.head(id),
                "pressure" => operation::node(network, settings, solution, id).pressure,
                "pressure_head" => solution
                    .head(id)
                    .map(|head| head - network.elevation(id, settings)),
                _ => panic!("no figure {figure}"),
            }
        }
        "lines" => {
            let id = network
                .find_line(name)
                .unwrap_or_else(|| panic!("nothing is called {name}"));
            let line = operation::line(network, solution, id);
            match figure {
                "flow" => Some(line.flow),
                "velocity" => line.velocity,
                "head_loss" => line.head_loss,
                _ => panic!("no figure {figure}"),
            }
        }
        "pumps" => {
            let id = network
                .find_pump(name)
                .unwrap_or_else(|| panic!("nothing is called {name}"));
            let pump = operation::pump(network, settings, solution, id);
            match figure {
                "flow" => Some(pump.flow),
                "head" => pump.head,
                "shaft_power" => pump.shaft_power,
                _ => panic!("no figure {figure}"),
            }
        }
        _ => panic!("no kind {kind}"),
    }
}

fn state(system: &System, solution: &Solution, of: &str) -> &'static str {
    let name = of
        .strip_prefix("lines.")
        .and_then(|of| of.strip_suffix(".state"))
        .unwrap();
    match solution.state(system.network.find_line(name).unwrap()) {
        LineState::Open => "open",
        LineState::Checked => "checked",
        LineState::Stopped => "stopped",
        LineState::Closed => "closed",
    }
}

#[test]
fn every_published_system_is_met_within_its_tolerance() {
    let folders = folders();
    assert!(
        folders.len() >= 25,
        "only {} published systems were found",
        folders.len()
    );
    let mut wrong = Vec::new();
    let mut rows = 0;
    for folder in folders {
        let name = folder.file_name().unwrap().to_string_lossy().into_owned();
        let system = read(&folder);
        let mut solver = Solver::new(&system.network);
        let solution = solver.solve(system.network.settings()).unwrap();
        let text = std::fs::read_to_string(folder.join("expected.yaml")).unwrap();
        let expected: Expected = serde_yaml::from_str(&text).unwrap();
        for row in expected.expect {
            rows += 1;
            if let Some(expected) = row.value.as_str() {
                let found = state(&system, solution, &row.of);
                if found != expected {
                    wrong.push(format!(
                        "{name}: {} is {found}, expected {expected}",
                        row.of
                    ));
                }
                continue;
            }
            let unit = Unit::parse(row.unit.as_deref().unwrap()).unwrap();
            let found = unit.from_si(figure(&system, solution, &row.of).unwrap());
            let expected = row.value.as_f64().unwrap();
            // the figure's own rounding when its tolerance is closer than that of f64
            let off = (found - expected).abs();
            if off.is_nan() || off > row.tolerance.max(1e-15) {
                wrong.push(format!(
                    "{name}: {} is {found}, expected {expected} +- {}",
                    row.of, row.tolerance
                ));
            }
        }
    }
    assert!(rows > 100, "only {rows} figures were found");
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// Rows of a table under tests/published/tables.
pub fn table(name: &str) -> (csv::StringRecord, Vec<csv::StringRecord>) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/published/tables")
        .join(name);
    let mut reader = csv::ReaderBuilder::new()
        .comment(Some(b'#'))
        .from_path(path)
        .unwrap();
    let headings = reader.headers().unwrap().clone();
    (headings, reader.records().map(Result::unwrap).collect())
}

fn inputs(text: &str) -> std::collections::HashMap<&str, f64> {
    let units = dutybank::units::UnitSet::si();
    text.split(';')
        .filter_map(|pair| pair.split_once('='))
        .map(|(name, quantity)| {
            let quantity = parse_quantity(quantity).unwrap();
            let value = match quantity.unit() {
                Some(unit) => quantity.to_si(unit.kind, &units).unwrap(),
                None => quantity.number(),
            };
            (name.trim(), value)
        })
        .collect()
}

/// The affinity rows: flow, head and power of a pump at another speed.
#[test]
fn affinity_rows_follow_from_the_pump_law() {
    use dutybank::part::HeadLaw;
    use dutybank::part::curve::Curve;
    use dutybank::part::pump::PumpLaw;
    let (_, rows) = table("affinity.csv");
    let mut checked = 0;
    for row in rows.iter().filter(|row| &row[0] == "affinity") {
        let given = inputs(&row[2]);
        let (Some(n1), Some(n2)) = (given.get("n1"), given.get("n2")) else {
            continue;
        };
        let s = n2 / n1;
        let unit = Unit::parse(&row[5]).unwrap();
        let (expected, tolerance): (f64, f64) = (row[4].parse().unwrap(), row[6].parse().unwrap());
        let found = if let Some(flow) = given.get("flow").filter(|_| row[3].starts_with('Q')) {
            flow * s
        } else if let Some(head) = given.get("head").filter(|_| row[3].starts_with('H')) {
            // a pump of that head at a flow of 1 m3/s, asked at the flow that the law says
            let curve = Curve::through(&[0.0, 1.0, 2.0], &[1.5 * head, *head, 0.1 * head]).unwrap();
            -PumpLaw {
                head: &curve,
                ratio: s,
                wear: 0.0,
            }
            .loss(s)
            .head
        } else if let Some(power) = given.get("power").filter(|_| row[3].starts_with('P')) {
            power * s.powi(3)
        } else {
            continue;
        };
        checked += 1;
        let found = unit.from_si(found);
        assert!(
            (found - expected).abs() <= tolerance,
            "{}: {found}, expected {expected}",
            &row[1]
        );
    }
    assert!(checked >= 9, "only {checked} rows were checked");
}

/// Colebrook–White and laminar factors, through the law of a pipe.
#[test]
fn friction_factors_equal_the_table() {
    use dutybank::part::HeadLaw;
    use dutybank::part::friction::Friction;
    let (_, rows) = table("friction.csv");
    let (g, nu, bore) = (9.80665, 1.0034e-6, 0.25);
    let mut worst: f64 = 0.0;
    let mut checked = 0;
    for row in rows
        .iter()
        .filter(|row| row[0].starts_with("laminar") || row[0].starts_with("colebrook"))
    {
        let (re, e, f): (f64, f64, f64) = (
            row[1].parse().unwrap(),
            row[2].parse().unwrap_or(0.0),
            row[3].parse().unwrap(),
        );
        if re > 2000.0 && re < 4000.0 {
            continue;
        }
        let law = Friction::roughness(bore, bore, e * bore, nu, g);
        let velocity = re * nu / bore;
        let q = velocity * std::f64::consts::FRAC_PI_4 * bore * bore;
        let found = law.loss(q).head / (velocity * velocity / (2.0 * g));
        worst = worst.max((found / f - 1.0).abs());
        checked += 1;
    }
    assert!(checked > 60, "only {checked} rows were checked");
    assert!(worst < 1e-8, "worst relative difference {worst:e}");
}

/// Hazen–Williams: the table gives three roundings of the law; ours, 10.667 and 4.871, lies within their spread of 0.3 %.
#[test]
fn hazen_williams_losses_lie_within_the_spread_of_the_roundings() {
    use dutybank::part::HeadLaw;
    use dutybank::part::friction::Friction;
    let (headings, rows) = table("hazen_williams.csv");
    let column = |name: &str| headings.iter().position(|heading| heading == name).unwrap();
    let (q, d, l, c) = (
        column("flow [m3/s]"),
        column("bore [m]"),
        column("length [m]"),
        column("c"),
    );
    let losses: Vec<usize> = headings
        .iter()
        .enumerate()
        .filter(|(_, h)| ["from_velocity [m]", "from_foot_form [m]", "rounded [m]"].contains(h))
        .map(|(i, _)| i)
        .collect();
    assert_eq!(losses.len(), 3);
    for row in rows {
        let value = |i: usize| row[i].parse::<f64>().unwrap();
        let found = Friction::hazen_williams(value(l), value(d), value(c))
            .loss(value(q))
            .head;
        let all: Vec<f64> = losses.iter().map(|&i| value(i)).collect();
        let low = all.iter().copied().fold(f64::INFINITY, f64::min);
        let high = all.iter().copied().fold(0.0, f64::max);
        assert!(
            found > low * 0.999 && found < high * 1.001,
            "{found} outside {low}..{high}"
        );
    }
}

//! Parts that throttle themselves: closed forms, states, and random networks that must be certified and consistent.
//!
//! All data invented.

use dutybank::network::{Network, NodeKind, RegulatorSetting};
use dutybank::part::quadratic::QuadraticLoss;
use dutybank::part::regulator::RegulatorState::{Regulating, Shut, WideOpen};
use dutybank::part::regulator::{Regulates, Regulator, RegulatorState};
use dutybank::read::{self, Change, Document};
use dutybank::solve::operation::{self, RegulatorOperation};
use dutybank::solve::{Solution, SolveError, Solver};

use dutybank::shift::{Plan, Record, Shape, Shift, Tank, What, run};

use crate::description::{Description, Piece};
use crate::random::{self, Random, Range};

const GRAVITY: f64 = 9.80665;
/// Water at 20 C, IAPWS (tests/published/tables/water.csv).
const DENSITY: f64 = 998.2;

fn network(text: &str) -> Network {
    read::system(text)
        .unwrap_or_else(|why| panic!("{why}"))
        .network
}

fn solved(network: &Network) -> Solution {
    Solver::new(network)
        .solve(network.settings())
        .unwrap_or_else(|why| panic!("{}", why.message(network)))
        .clone()
}

fn does(network: &Network, solution: &Solution, name: &str) -> RegulatorOperation {
    let id = network
        .regulator_ids()
        .find(|id| network.regulator_name(*id) == name)
        .unwrap_or_else(|| panic!("{name}"));
    operation::regulator(network, network.settings(), solution, id)
}

fn flow(network: &Network, solution: &Solution, line: &str) -> f64 {
    solution.flow(network.find_line(line).unwrap())
}

fn head(network: &Network, solution: &Solution, node: &str) -> f64 {
    solution.head(network.find_node(node).unwrap()).unwrap()
}

#[track_caller]
fn near(found: f64, expected: f64, tolerance: f64) {
    assert!(
        (found - expected).abs() <= tolerance,
        "{found} is not {expected}"
    );
}

/// k of a loss of `r` s2/m5 in a bore of 100 mm: h = K v2/2g.
fn k(r: f64) -> f64 {
    let area = std::f64::consts::FRAC_PI_4 * 0.01;
    r * 2.0 * GRAVITY * area * area
}

/// From a tower at 40 m through a reducing part to a node at 5 m, and on to a pond through a fixed loss.
fn reduced(tower: f64, pond: f64, bar: f64) -> Network {
    let (up, body, down) = (k(400.0), k(100.0), k(500.0));
    network(&format!(
        "
nodes: {{tower: {{reservoir: {tower} m}}, zone: {{point: 5 m}}, pond: {{reservoir: {pond} m}}}}
lines:
  reducer: {{from: tower, to: zone, parts: [loss: {{k: {up}, bore: 100 mm}}, hold_downstream: {{pressure: {bar} bar, k: {body}, bore: 100 mm}}]}}
  out: {{from: zone, to: pond, loss: {{k: {down}, bore: 100 mm}}}}
"
    ))
}

#[test]
fn a_reducing_part_in_a_series_of_losses_holds_its_outlet() {
    // zone held at z + p/(rho g); q = sqrt((h - pond)/r); added = tower - h - (r_up + r_body) q2
    let net = reduced(40.0, 2.0, 1.0);
    let solution = solved(&net);
    let held = 5.0 + 1e5 / (net.fluid().density * GRAVITY);
    let q = ((held - 2.0) / 500.0_f64).sqrt();
    near(head(&net, &solution, "zone"), held, 1e-8);
    near(flow(&net, &solution, "reducer"), q, 1e-10);
    let part = does(&net, &solution, "reducer.hold_downstream");
    assert_eq!(part.state, Regulating);
    near(part.head_loss.unwrap(), 40.0 - held - 400.0 * q * q, 1e-7);
    near(part.felt.unwrap(), 1e5, 1e-4);
    near(net.fluid().density, DENSITY, 0.1);
}

#[test]
fn a_reducing_part_stands_wide_open_where_its_outlet_stays_below() {
    // wide open: q = sqrt((40 - 2)/1000), zone at 2 + 500 q2 = 21 m, below 5 m + 2 bar = 25.4 m
    let net = reduced(40.0, 2.0, 2.0);
    let solution = solved(&net);
    let part = does(&net, &solution, "reducer.hold_downstream");
    assert_eq!(part.state, WideOpen);
    near(flow(&net, &solution, "reducer"), 0.038_f64.sqrt(), 1e-10);
    near(head(&net, &solution, "zone"), 21.0, 1e-8);
    near(part.head_loss.unwrap(), 3.8, 1e-8);
}

#[test]
fn a_reducing_part_is_shut_by_a_higher_outlet_and_lets_nothing_back() {
    // the pond stands above the held head, in one case above the tower too
    for (tower, pond) in [(40.0, 30.0), (40.0, 50.0)] {
        let net = reduced(tower, pond, 1.0);
        let solution = solved(&net);
        let part = does(&net, &solution, "reducer.hold_downstream");
        assert_eq!((part.state, part.flow, part.head_loss), (Shut, 0.0, None));
        near(head(&net, &solution, "zone"), pond, 1e-9);
    }
}

#[test]
fn a_dead_end_behind_a_reducing_part_stands_at_its_set_pressure() {
    let net = network(
        "
nodes: {tower: {reservoir: 40 m}, zone: {point: 5 m}, far: {point: 1 m}}
lines:
  reducer: {from: tower, to: zone, hold_downstream: {pressure: 1 bar, k: 3, bore: 100 mm}}
  end: {from: zone, to: far, pipe: {length: 50 m, bore: 100 mm, roughness: 0.1 mm}}
",
    );
    let solution = solved(&net);
    let held = 5.0 + 1e5 / (net.fluid().density * GRAVITY);
    near(head(&net, &solution, "far"), held, 1e-9);
    assert_eq!(flow(&net, &solution, "end"), 0.0);
}

/// Two reducing parts in series, the second fed by the first, draws behind each.
#[test]
fn reducing_parts_in_series_hold_one_after_the_other() {
    let net = network(
        "
nodes:
  tower: {reservoir: 80 m}
  upper: {point: {elevation: 20 m, draw: 12 m3/h}}
  lower: {point: {elevation: 0 m, draw: 20 m3/h}}
lines:
  first: {from: tower, to: upper, hold_downstream: {pressure: 3 bar, k: 3, bore: 100 mm}}
  second: {from: upper, to: lower, parts: [pipe: {length: 300 m, bore: 100 mm, roughness: 0.1 mm}, hold_downstream: {pressure: 2 bar, k: 3}]}
",
    );
    let solution = solved(&net);
    let weight = net.fluid().density * GRAVITY;
    near(head(&net, &solution, "upper"), 20.0 + 3e5 / weight, 1e-8);
    near(head(&net, &solution, "lower"), 2e5 / weight, 1e-8);
    near(3600.0 * flow(&net, &solution, "first"), 32.0, 1e-9);
    assert!(solution.balance().iterations < 40);
}

const RELIEF: &str = "
nodes: {sump: {reservoir: 0 m}, header: {point: {elevation: 1 m, draw: DRAW}}}
lines:
  pump_line: {from: sump, to: header, pump: {model: m, elevation: 0 m}}
  relief: {from: header, to: sump, hold_upstream: {pressure: 4 bar, k: 2, bore: 100 mm}}
pump_models:
  m: {head_polynomial: [60, 0, -0.004], flow_limit: 100 m3/h}
";

#[test]
fn a_relief_part_returns_to_suction_what_keeps_the_header_at_its_pressure() {
    // H = 60 - 0.004 Q2 (m, m3/h), header held at 1 m + 4 bar while the pump would give more there
    let held = |net: &Network| 1.0 + 4e5 / (net.fluid().density * GRAVITY);
    for draw in [0.0, 20.0, 60.0, 75.0] {
        let net = network(&RELIEF.replace("DRAW", &format!("{draw} m3/h")));
        let solution = solved(&net);
        let part = does(&net, &solution, "relief.hold_upstream");
        let at_set = ((60.0 - held(&net)) / 0.004_f64).sqrt();
        if draw < at_set {
            assert_eq!(part.state, Regulating);
            near(head(&net, &solution, "header"), held(&net), 1e-8);
            near(3600.0 * part.flow, at_set - draw, 1e-6);
        } else {
            assert_eq!((part.state, part.flow), (Shut, 0.0));
            near(
                head(&net, &solution, "header"),
                60.0 - 0.004 * draw * draw,
                1e-8,
            );
        }
    }
}

#[test]
fn a_relief_part_that_is_too_small_stands_wide_open() {
    // 60 - 0.004 Q2 = K v2/2g with all of Q through it, above 4 bar
    let net = network(
        &RELIEF
            .replace("DRAW", "0")
            .replace("k: 2, bore: 100 mm", "k: 2, bore: 20 mm"),
    );
    let solution = solved(&net);
    let part = does(&net, &solution, "relief.hold_upstream");
    assert_eq!(part.state, WideOpen);
    let area = std::f64::consts::FRAC_PI_4 * 0.0004;
    let r = 2.0 / (2.0 * GRAVITY * area * area);
    let q = (60.0 / (0.004 * 3600.0 * 3600.0 + r)).sqrt();
    near(part.flow, q, 1e-10);
    assert!(part.felt.unwrap() > 4e5);
}

#[test]
fn a_limiter_binds_above_its_flow_and_only_there() {
    let text = |limit: &str| {
        format!(
            "
nodes: {{tower: {{reservoir: 22 m}}, pond: {{reservoir: 2 m}}}}
lines:
  main: {{from: tower, to: pond, parts: [loss: {{k: {}, bore: 100 mm}}, limit_flow: {{flow: {limit}, k: {}, bore: 100 mm}}]}}
",
            k(400.0),
            k(100.0)
        )
    };
    // unlimited: sqrt(20/500) = 0.2 m3/s
    let net = network(&text("0.25 m3/s"));
    let solution = solved(&net);
    let part = does(&net, &solution, "main.limit_flow");
    assert_eq!(part.state, WideOpen);
    near(part.flow, 0.2, 1e-12);
    let net = network(&text("0.15 m3/s"));
    let solution = solved(&net);
    let part = does(&net, &solution, "main.limit_flow");
    assert_eq!(part.state, Regulating);
    near(part.flow, 0.15, 1e-10);
    near(part.head_loss.unwrap(), 20.0 - 400.0 * 0.0225, 1e-7);
    // backwards it is an open body
    let back = text("0.15 m3/s").replace("from: tower, to: pond", "from: pond, to: tower");
    let net = network(&back);
    near(flow(&net, &solved(&net), "main"), -0.2, 1e-12);
}

const RECIRCULATION: &str = "
nodes: {sump: {reservoir: 0 m}, flange: {point: 0 m}, header: {point: {elevation: 1 m, draw: DRAW}}}
lines:
  duty: {from: sump, to: flange, pump: {model: m, elevation: 0 m, running: RUNS}}
  forward: {from: flange, to: header, check_valve: {k: 1, bore: 100 mm}}
  back: {from: flange, to: sump, minimum_flow: {pump: duty, flow: 30 m3/h, k: BODY, bore: 50 mm}}
pump_models:
  m: {head_polynomial: [60, 0, -0.004], flow_limit: 100 m3/h}
";

fn recirculating(draw: &str, runs: &str, body: f64) -> (Network, Solution) {
    let text = RECIRCULATION
        .replace("DRAW", draw)
        .replace("RUNS", runs)
        .replace("BODY", &body.to_string());
    let net = network(&text);
    let solution = solved(&net);
    (net, solution)
}

#[test]
fn a_recirculation_line_opens_below_the_minimum_flow_and_keeps_it() {
    for draw in [0.0, 5.0, 29.0] {
        let (net, solution) = recirculating(&format!("{draw} m3/h"), "true", 4.0);
        let part = does(&net, &solution, "back.minimum_flow");
        assert_eq!(part.state, Regulating, "{draw}");
        near(3600.0 * flow(&net, &solution, "duty"), 30.0, 1e-6);
        near(3600.0 * part.flow, 30.0 - draw, 1e-6);
        near(part.head_loss.unwrap(), 60.0 - 0.004 * 900.0, 1e-6);
    }
    let (net, solution) = recirculating("31 m3/h", "true", 4.0);
    let part = does(&net, &solution, "back.minimum_flow");
    assert_eq!((part.state, part.flow), (Shut, 0.0));
    // too narrow to carry it: wide open, and the pump stays below its minimum
    let (net, solution) = recirculating("0", "true", 4000.0);
    let part = does(&net, &solution, "back.minimum_flow");
    assert_eq!(part.state, WideOpen);
    assert!(part.felt.unwrap() < 30.0 / 3600.0);
}

#[test]
fn the_recirculation_line_of_a_pump_that_stands_is_shut() {
    let text = RECIRCULATION
        .replace("DRAW", "0")
        .replace("RUNS", "false")
        .replace("BODY", "4");
    let net = network(&text);
    let solution = solved(&net);
    let part = does(&net, &solution, "back.minimum_flow");
    assert_eq!((part.state, part.flow), (Shut, 0.0));
}

/// Two reducing parts side by side that are set alike share the flow by an equal further loss; a limiter and a reducing part
/// in one line: the one with less room rules.
#[test]
fn parts_set_alike_share_and_parts_in_one_line_take_turns() {
    let net = network(
        "
nodes: {tower: {reservoir: 40 m}, zone: {point: {elevation: 5 m, draw: 36 m3/h}}}
lines:
  reducer: {from: tower, to: zone, count: 2, hold_downstream: {pressure: 1 bar, k: 3, bore: 100 mm}}
",
    );
    let solution = solved(&net);
    near(3600.0 * flow(&net, &solution, "reducer.1"), 18.0, 1e-9);
    near(3600.0 * flow(&net, &solution, "reducer.2"), 18.0, 1e-9);
    let both = |limit: f64| {
        network(&format!(
            "
nodes: {{tower: {{reservoir: 40 m}}, zone: {{point: 5 m}}, pond: {{reservoir: 2 m}}}}
lines:
  in: {{from: tower, to: zone, parts: [hold_downstream: {{pressure: 1 bar, k: {body}, bore: 100 mm}}, limit_flow: {{flow: {limit} m3/s, k: {body}, bore: 100 mm}}]}}
  out: {{from: zone, to: pond, loss: {{k: {}, bore: 100 mm}}}}
",
            k(500.0),
            body = k(50.0)
        ))
    };
    for (limit, holder, limiter) in [(1.0, Regulating, WideOpen), (0.1, WideOpen, Regulating)] {
        let net = both(limit);
        let solution = solved(&net);
        assert_eq!(does(&net, &solution, "in.hold_downstream").state, holder);
        assert_eq!(does(&net, &solution, "in.limit_flow").state, limiter);
    }
}

#[test]
fn settings_and_changes_reach_a_regulating_part() {
    let text = RELIEF.replace("DRAW", "10 m3/h");
    let document = Document::parse(text.as_bytes()).unwrap();
    let none = |_: &str| Err(std::io::Error::other("none"));
    let with = |path: &str, value: &str| {
        let system = document.system(&[Change::new(path, value)], &none).unwrap();
        let solution = solved(&system.network);
        does(&system.network, &solution, "relief.hold_upstream")
    };
    assert_eq!(with("relief.hold_upstream.pressure", "3 bar").set, 3e5);
    assert_eq!(with("relief.pressure", "3 bar").state, Regulating);
    assert_eq!(with("relief.open", "false").state, Shut);
    let net = network(&text);
    let id = net.regulator_ids().next().unwrap();
    let mut settings = net.settings().clone();
    let mut solver = Solver::new(&net);
    for bar in [4.0, 2.0, 5.9, 4.0] {
        settings.regulator_mut(id).set = bar * 1e5;
        let solution = solver.resolve(&settings).unwrap();
        near(
            operation::regulator(&net, &settings, solution, id)
                .felt
                .unwrap(),
            bar.min(5.7) * 1e5,
            if bar < 5.0 { 1.0 } else { 2e4 },
        );
    }
    settings.regulator_mut(id).open = false;
    let solution = solver.resolve(&settings).unwrap();
    assert_eq!(solution.regulation(id).state, Shut);
}

#[test]
fn what_cannot_be_held_is_named() {
    let text = "
nodes: {tower: {reservoir: 40 m}, mid: {point: 5 m}, end: {point: {elevation: 5 m, draw: 40 m3/h}}}
lines:
  feed: {from: tower, to: mid, loss: {k: 3, bore: 100 mm}}
  hold: {from: mid, to: end, PART}
";
    for (part, expected) in [
        (
            "hold_upstream: {pressure: 5 bar, k: 3, bore: 100 mm}",
            "`hold.hold_upstream` cannot hold its pressure",
        ),
        (
            "limit_flow: {flow: 39 m3/h, k: 3, bore: 100 mm}",
            "lets 39 m3/h pass",
        ),
    ] {
        let text = text.replace("PART", part);
        let message = match read::system(&text) {
            Err(rejected) => rejected.to_string(),
            Ok(system) => Solver::new(&system.network)
                .solve(system.network.settings())
                .unwrap_err()
                .message(&system.network),
        };
        assert!(message.contains(expected), "{message}");
    }
}

/// The tank gives its limit while its level is above r q2, then what its level lets through: sqrt(z) falls by t/(2 A sqrt(r)).
#[test]
fn a_limiter_below_a_draining_tank_stands_wide_open_from_the_level_that_needs_it_no_more() {
    let (area, r, limit) = (2.0, 4e4, 0.005);
    let net = network(&format!(
        "
nodes: {{tank: {{tank: {{floor: 0 m, depth: 5 m, area: {area} m2, level: 4 m}}}}, pond: {{reservoir: 0 m}}}}
lines: {{out: {{from: tank, to: pond, limit_flow: {{flow: {limit} m3/s, k: {}, bore: 100 mm}}}}}}
",
        k(r)
    ));
    let tank = net.find_node("tank").unwrap();
    let shift = Shift {
        lasts: 1600.0,
        report_every: Some(400.0),
        tanks: vec![Tank::open(tank, Shape::Upright { area }, 5.0, 4.0)],
        ..Shift::default()
    };
    let mut record = Record::new();
    run(&net, &shift, &Plan::default(), &mut record).unwrap();
    let turns: Vec<(What, f64)> = record.events().iter().map(|e| (e.what, e.time)).collect();
    let open = turns.iter().find(|(what, _)| *what == What::WideOpen);
    // 2 m2 x (4 m - r q2) / q
    near(open.unwrap_or_else(|| panic!("{turns:?}")).1, 1200.0, 1e-5);
    let level = |time: f64| {
        let row = record.times().iter().position(|t| (t - time).abs() < 1e-6);
        record.column(0)[row.unwrap()]
    };
    near(level(800.0), 2.0, 1e-9);
    near(level(1600.0), 0.25, 1e-6);
}

/// `tests/reference/regulating.py`: every combination of states tried, each solved by scipy.optimize.root.
#[test]
fn generated_networks_agree_with_an_independent_solution() {
    let file =
        std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference/regulating.json");
    let cases: serde_json::Value =
        serde_json::from_str(&std::fs::read_to_string(file).unwrap()).unwrap();
    let cases = cases.as_array().unwrap();
    assert!(cases.len() >= 40);
    let mut wrong = Vec::new();
    let (mut figures, mut most, mut certain) = (0, 0, 0);
    for (i, case) in cases.iter().enumerate() {
        let net = network(case["text"].as_str().unwrap());
        let solution = solved(&net);
        most = most.max(solution.balance().iterations);
        certain += u32::from(solution.balance().certain_path);
        for (name, expected) in case["heads"].as_object().unwrap() {
            let (found, expected) = (head(&net, &solution, name), expected.as_f64().unwrap());
            figures += 1;
            if (found - expected).abs() > 1e-6 {
                wrong.push(format!("{i}: {name} at {found}, not {expected}"));
            }
        }
        for (name, expected) in case["flows"].as_object().unwrap() {
            let (found, expected) = (flow(&net, &solution, name), expected.as_f64().unwrap());
            figures += 1;
            if (found - expected).abs() > 1e-8 {
                wrong.push(format!("{i}: {name} carries {found}, not {expected}"));
            }
        }
        for (name, expected) in case["states"].as_object().unwrap() {
            let found = dutybank::output::regulators::state_word(does(&net, &solution, name).state);
            figures += 1;
            if Some(found) != expected.as_str() {
                wrong.push(format!("{i}: {name} is {found}, not {expected}"));
            }
        }
    }
    println!(
        "{figures} figures of {} networks, at most {most} iterations, {certain} by the certain path",
        cases.len()
    );
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// What the answer says of each part, looked at from outside: by heads and flows alone.
pub fn consistent(net: &Network, solution: &Solution) -> Result<(), String> {
    let weight = net.fluid().density * GRAVITY;
    for id in net.regulator_ids() {
        let part = operation::regulator(net, net.settings(), solution, id);
        let what = net.regulator(id).regulates;
        let room = part.felt.map(|felt| what.room(part.set, felt).value);
        let small = match what {
            Regulates::Downstream | Regulates::Upstream => 1e-6 * weight,
            Regulates::Flow | Regulates::MinimumFlow { .. } => 1e-7 * part.set + 1e-11,
        };
        let name = net.regulator_name(id);
        let fits = match (part.state, room) {
            (_, None) => true,
            (RegulatorState::Regulating, Some(room)) => {
                room.abs() <= small && part.head_loss.unwrap() >= 0.0
            }
            (RegulatorState::WideOpen, Some(room)) => room >= -small,
            (RegulatorState::Shut, Some(_)) => part.flow == 0.0,
        };
        if !fits {
            return Err(format!("{name}: {part:?}, room {room:?}"));
        }
    }
    Ok(())
}

/// A random network with up to four regulating parts, set to what its plain answer makes likely to matter.
fn with_regulators(seed: u64) -> Option<Description> {
    let plain = random::network(seed, 4 + (seed % 25) as usize, Range::Ordinary);
    let solution = Solver::new(&plain).solve(plain.settings()).ok()?.clone();
    let mut description = Description::of(&plain);
    let mut random = Random(seed ^ 0x5eed);
    let weight = plain.fluid().density * GRAVITY;
    for _ in 0..1 + random.below(4) {
        let at = random.below(description.lines.len());
        let id = plain.line_ids().nth(at)?;
        let line = &mut description.lines[at];
        if matches!(line.parts.last(), Some(Piece::Regulator(..))) {
            continue;
        }
        let q = solution.flow(id);
        let point = |node: usize| match description.nodes[node].kind {
            NodeKind::Point { elevation } => Some(elevation),
            _ => None,
        };
        let node = |node: usize| plain.node_ids().nth(node);
        let pressure = |at: usize, off: f64| {
            let head = solution.head(node(at)?)?;
            Some(weight * (head - point(at)? + off))
        };
        let off = random.between(-8.0, 8.0);
        let (regulates, set) = match random.below(3) {
            0 => (Regulates::Downstream, pressure(line.to, off)),
            1 => (Regulates::Upstream, pressure(line.from, off)),
            _ => (
                Regulates::Flow,
                (q > 1e-6).then(|| q * random.between(0.3, 1.3)),
            ),
        };
        let Some(set) = set else { continue };
        let regulator = Regulator {
            regulates,
            wide_open: QuadraticLoss::minor(random.between(0.5, 10.0), 0.2, GRAVITY),
        };
        let setting = RegulatorSetting { open: true, set };
        line.parts.push(Piece::Regulator(regulator, setting, None));
    }
    Some(description)
}

#[test]
fn random_networks_are_certified_and_consistent_whatever_their_order() {
    let (mut solved, mut refused, mut certain, mut states) = (0, 0, 0, [0; 3]);
    let mut most = 0;
    let mut wrong = Vec::new();
    for seed in 0..random::many(600) {
        let Some(description) = with_regulators(seed) else {
            continue;
        };
        let net = description.build();
        if net.regulators().is_empty() {
            continue;
        }
        let answer = Solver::new(&net).solve(net.settings()).cloned();
        let mut turned = description.clone();
        turned.lines.reverse();
        let other = turned.build();
        let second = Solver::new(&other).solve(other.settings()).cloned();
        match (&answer, &second) {
            (Ok(first), Ok(second)) => {
                solved += 1;
                certain += u32::from(first.balance().certain_path);
                most = most.max(first.balance().iterations);
                wrong.extend(consistent(&net, first).err().map(|why| (seed, why)));
                for id in net.regulator_ids() {
                    states[first.regulation(id).state as usize] += 1;
                }
                let size = first.flows().iter().fold(0.0, |m: f64, q| m.max(q.abs()));
                for line in net.line_ids() {
                    let name = &net.line(line).name;
                    let (a, b) = (first.flow(line), flow(&other, second, name));
                    if (a - b).abs() > 1e-6 * size + 1e-8 {
                        wrong.push((seed, format!("{name}: {a} or {b}")));
                        break;
                    }
                }
            }
            (Err(SolveError::NotHeld { .. } | SolveError::Unreachable(_)), Err(_)) => refused += 1,
            (first, second) => wrong.push((
                seed,
                format!(
                    "{:?} or {:?}",
                    first.as_ref().map(|_| ()).map_err(|why| why.message(&net)),
                    second
                        .as_ref()
                        .map(|_| ())
                        .map_err(|why| why.message(&other))
                ),
            )),
        }
    }
    println!(
        "{solved} solved, {refused} refused, {certain} by the certain path, at most {most} iterations; states {states:?}"
    );
    for (seed, why) in &wrong {
        println!("{seed}: {why}");
    }
    assert!(wrong.is_empty());
    assert!(solved >= 200 && states.iter().all(|count| *count >= 20));
}

//! The curves: what is solved for them, against closed forms, against the whole network and against demo systems solved apart.

mod drawing;
mod svg;

use dutybank::network::Network;
use dutybank::part::PumpId;
use dutybank::read::{Document, System};
use dutybank::solve::operation::{self, Place};
use dutybank::study::curves::{
    Branching, Case, CombinedCurve, Curves, CurvesError, FlowHead, curves,
};

const L_S: f64 = 1e-3;
const M3_H: f64 = 1.0 / 3600.0;

pub const NETWORKS: [&str; 7] = [
    "starter",
    "mill_pond_transfer",
    "meadow_lift_station",
    "two_lift_high_reservoir",
    "plant_cooling_loop",
    "orchard_sprinkler_loop",
    "pressure_drum_feed",
];

/// The file as it stands and each of its cases.
pub fn systems(network: &str) -> Vec<(String, System)> {
    let path = format!("{}/networks/{network}.yaml", env!("CARGO_MANIFEST_DIR"));
    of_text(&std::fs::read_to_string(path).unwrap())
}

pub fn of_text(text: &str) -> Vec<(String, System)> {
    let document = Document::parse(text.as_bytes()).unwrap();
    let none = |_: &str| Err(std::io::Error::other("no files here"));
    let mut systems = vec![(String::new(), document.system(&[], &none).unwrap())];
    for case in document.cases().unwrap() {
        systems.push((case.name, document.system(&case.changes, &none).unwrap()));
    }
    systems
}

pub fn drawn(systems: &[(String, System)], bank: Option<&str>) -> Result<Curves, CurvesError> {
    let case = |(_, system): &(String, System)| system.network.pump_ids().collect();
    let cases: Vec<Case> = systems
        .iter()
        .map(|named| Case {
            network: &named.1.network,
            switched: case(named),
        })
        .collect();
    curves(&cases, bank)
}

fn of(network: &str) -> (Vec<(String, System)>, Curves) {
    let systems = systems(network);
    let curves = drawn(&systems, None).unwrap();
    (systems, curves)
}

fn near(a: f64, b: f64, tolerance: f64, what: &str) {
    assert!((a - b).abs() <= tolerance, "{what}: {a} against {b}");
}

fn at(points: &[FlowHead], flow: f64) -> Option<f64> {
    points
        .iter()
        .find(|point| point.flow == flow)
        .map(|point| point.head)
}

/// Flow (m3/s) of the point of a case with so many pumps.
fn point(systems: &[(String, System)], curves: &Curves, case: &str, running: &[&str]) -> f64 {
    let found = curves.points.iter().find(|point| {
        let (name, system) = &systems[point.case];
        let named: Vec<&str> = curves.combined[point.combined]
            .running
            .iter()
            .map(|id| system.network.pump(*id).name.as_str())
            .collect();
        name == case && named == running
    });
    found
        .unwrap_or_else(|| panic!("no point of {case} with {running:?}"))
        .at
        .flow
}

/// The whole network, the pumps' side and the system's side are solved apart; they meet at the same heads.
#[test]
fn operating_points_lie_on_both_curves() {
    let mut seen = 0;
    for name in NETWORKS {
        let (_, curves) = of(name);
        for point in &curves.points {
            let system = &curves.systems[point.system];
            let combined = &curves.combined[point.combined];
            let asked = at(&system.points, point.at.flow).unwrap();
            let given = at(&combined.points, point.at.flow)
                .or_else(|| at(&combined.beyond, point.at.flow))
                .unwrap();
            // the certificate of a solution: heads balance to 1e-8 m along each line
            near(asked, point.at.head, 1e-6, name);
            near(given, point.at.head, 1e-6, name);
            seen += 1;
        }
        assert!(curves.idle.is_empty(), "{name}: {:?}", curves.idle);
    }
    assert!(seen > 40, "{seen} points");
}

/// Demo systems (a) to (d), solved apart from this program with SciPy: see the networks' reference tests; here to the figures
/// that were printed.
#[test]
fn operating_points_are_those_of_the_demo_systems() {
    let (systems, curves) = of("mill_pond_transfer");
    let both = ["transfer.1", "transfer.2"];
    for (case, running, flow) in [
        ("", &both[..1], 60.6),
        ("", &both[..], 88.3),
        ("old pipe", &both[..], 79.3),
        ("new pipe", &both[..], 92.6),
        ("both pumps worn", &both[..], 85.1),
        ("bigger main", &both[..1], 66.8),
        ("bigger main", &both[..], 111.6),
    ] {
        near(
            point(&systems, &curves, case, running),
            flow * L_S,
            0.1 * L_S,
            case,
        );
    }
    let (systems, curves) = of("meadow_lift_station");
    let lift = ["lift.1", "lift.2", "lift.3"];
    for (pumps, flow) in [(1, 63.0), (2, 100.3), (3, 118.5)] {
        near(
            point(&systems, &curves, "", &lift[..pumps]),
            flow * L_S,
            0.15 * L_S,
            "meadow",
        );
    }
    let (systems, curves) = of("two_lift_high_reservoir");
    let lifts = ["lower_lift", "upper_lift"];
    for (case, flow) in [
        ("", 56.1),
        ("source low", 55.3),
        ("lower pump worn", 52.9),
        ("source low, lower pump worn", 51.9),
        ("source low, lower pump badly worn", 50.1),
        ("source low, lower pump worn, upper slowed", 46.3),
        ("upper slowed", 53.2),
    ] {
        near(
            point(&systems, &curves, case, &lifts),
            flow * L_S,
            0.1 * L_S,
            case,
        );
    }
    let (systems, curves) = of("plant_cooling_loop");
    for (running, flow) in [
        (&["big.1", "big.2"][..], 906.0),
        (&["big.1", "small"][..], 804.0),
        (&["big.1", "big.2", "small"][..], 946.0),
    ] {
        near(
            point(&systems, &curves, "", running),
            flow * M3_H,
            1.0 * M3_H,
            "plant",
        );
    }
}

/// Head of a pump at a flow less what the other parts of its line lose there: the modified curve as people draw it by hand.
#[test]
fn a_pump_alone_gives_its_head_less_its_branch() {
    for name in [
        "mill_pond_transfer",
        "meadow_lift_station",
        "pressure_drum_feed",
    ] {
        let (systems, curves) = of(name);
        let network = &systems[0].1.network;
        let settings = network.settings();
        let alone = &curves.combined[0];
        let line = network.line(network.line_of(alone.running[0]));
        for point in &alone.points {
            let lost = |part| operation::part_loss(network, settings, part, point.flow);
            let by_hand: f64 = -line.parts.iter().map(lost).sum::<f64>();
            near(point.head, by_hand, 1e-7, name);
        }
    }
}

/// n equal pumps carry n times one's flow at the same head.
#[test]
fn equal_pumps_side_by_side_add_their_flows() {
    let (systems, curves) = of("meadow_lift_station");
    let network = &systems[0].1.network;
    let settings = network.settings();
    for n in [2usize, 3] {
        let curve = &curves.combined[n - 1];
        assert_eq!(curve.running.len(), n);
        let line = network.line(network.line_of(curve.running[0]));
        for point in &curve.points {
            let each = point.flow / n as f64;
            let lost = |part| operation::part_loss(network, settings, part, each);
            near(
                point.head,
                -line.parts.iter().map(lost).sum::<f64>(),
                1e-7,
                "meadow",
            );
        }
    }
}

/// Two lifts in series add their heads at the same flow; each stage alone is drawn but has no point.
#[test]
fn lifts_in_series_add_their_heads() {
    let (_, curves) = of("two_lift_high_reservoir");
    assert_eq!(curves.stages.len(), 2);
    let alone: Vec<&CombinedCurve> = curves
        .combined
        .iter()
        .filter(|curve| curve.stage.is_some())
        .collect();
    assert_eq!(alone.len(), 2);
    let both = &curves.combined[0];
    let mut compared = 0;
    for point in &both.points {
        if let (Some(lower), Some(upper)) = (
            at(&alone[0].points, point.flow),
            at(&alone[1].points, point.flow),
        ) {
            near(point.head, lower + upper, 1e-7, "series");
            compared += 1;
        }
    }
    assert!(compared > 50);
    // static head: from 103 m to 262 m
    near(curves.systems[0].points[0].head, 159.0, 1e-4, "static head");
}

/// Mill pond: best efficiency at 50 L/s, so 35 to 60 L/s for one pump and twice that for two; ends at 70 and 140 L/s; static heads
/// 21 m less the level.
#[test]
fn marks_stand_where_the_data_sheet_puts_them() {
    let (systems, curves) = of("mill_pond_transfer");
    for (n, curve) in [(1.0, &curves.combined[0]), (2.0, &curves.combined[1])] {
        let (low, high) = curve.preferred.unwrap();
        near(low, n * 35.0 * L_S, 1e-9, "preferred from");
        near(high, n * 60.0 * L_S, 1e-9, "preferred to");
        near(
            curve.points.last().unwrap().flow,
            n * 70.0 * L_S,
            1e-9,
            "end",
        );
        near(curve.points[0].head, 44.0, 1e-4, "shut-off");
        assert!(curve.beyond.is_empty());
    }
    for (case, level) in [("", 3.0), ("full tank", 4.5), ("low level", 0.9)] {
        let position = systems.iter().position(|(name, _)| name == case).unwrap();
        let system = curves
            .systems
            .iter()
            .find(|system| system.cases.contains(&position));
        near(system.unwrap().points[0].head, 21.0 - level, 1e-4, case);
    }
    // what only switches or changes pumps has the system curve of the file as it stands
    let worn = systems
        .iter()
        .position(|(name, _)| name == "second pump worn")
        .unwrap();
    assert!(curves.systems[0].cases.contains(&worn));
}

/// The weaker pump's check valve stays shut until the head has fallen to its shut-off head: the combined curve is that of the stronger alone
/// until there. Shut-off heads 42 m and 36 m, demo system (d).
#[test]
fn a_weaker_pump_joins_at_its_shutoff_head() {
    let (systems, curves) = of("plant_cooling_loop");
    let network = &systems[0].1.network;
    let named = |curve: &&CombinedCurve, names: &[&str]| {
        let mut running = curve
            .running
            .iter()
            .map(|id| network.pump(*id).name.as_str());
        curve.case == 0 && running.by_ref().eq(names.iter().copied())
    };
    let find = |names: &[&str]| {
        curves
            .combined
            .iter()
            .find(|curve| named(curve, names))
            .unwrap()
    };
    let (big, with_small) = (find(&["big.1"]), find(&["big.1", "small"]));
    let model = network.model(network.find_pump("big.1").unwrap());
    for point in &with_small.points {
        let big_alone = model.head.at(point.flow).value;
        if big_alone > 36.0 {
            near(point.head, big_alone, 1e-7, "small held shut");
        } else {
            assert!(point.head > big_alone - 1e-9);
        }
    }
    // one big pump alone would deliver 156 % of best efficiency, past its curve's end at 588 m3/h
    assert!(!big.beyond.is_empty());
    near(
        big.points.last().unwrap().flow,
        588.0 * M3_H,
        1e-9,
        "end of the big pump",
    );
    let alone = curves
        .points
        .iter()
        .find(|point| point.combined == 0)
        .unwrap();
    assert_eq!(alone.pumps[0].1.place, Place::PastEnd);
    assert!(
        with_small
            .points
            .windows(2)
            .all(|pair| pair[1].head < pair[0].head + 1e-12)
    );
}

/// NPSH available = (barometer - vapour pressure)/(density g) + level - elevation of the pump - loss of the suction pipe.
#[test]
fn npsh_available_follows_the_suction() {
    let (systems, curves) = of("mill_pond_transfer");
    assert_eq!(curves.suctions.len(), 3, "three levels");
    for suction in &curves.suctions {
        let network = &systems[suction.cases[0]].1.network;
        let fluid = network.fluid();
        let weight = fluid.density * network.gravity();
        let level = network
            .settings()
            .level(network.find_node("tank_a").unwrap());
        let at_rest = (network.barometer() - fluid.vapour_pressure.unwrap()) / weight + level - 1.6;
        let suction_pipe = network
            .line(network.line_of(suction.pump))
            .parts
            .iter()
            .take(2);
        let lost = |flow: f64| -> f64 {
            let parts = suction_pipe.clone();
            // pipe and its minor losses stand before the pump
            parts
                .take_while(|part| !matches!(part, dutybank::part::Part::Pump(_)))
                .map(|part| operation::part_loss(network, network.settings(), part, flow))
                .sum()
        };
        for (flow, available) in &suction.points {
            near(*available, at_rest - lost(*flow), 1e-7, "NPSH available");
        }
    }
}

#[test]
fn pump_curves_are_those_of_the_data_sheet() {
    let (_, curves) = of("mill_pond_transfer");
    let new = &curves.pumps[0];
    assert_eq!(new.pumps.len(), 2);
    near(
        new.best_efficiency_flow.unwrap(),
        50.0 * L_S,
        1e-12,
        "best efficiency",
    );
    let last = new.points.last().unwrap();
    // the sheet's last row
    near(last.flow, 70.0 * L_S, 1e-9, "flow");
    near(last.head.unwrap(), 22.4, 1e-6, "head");
    near(last.efficiency.unwrap(), 0.69, 1e-7, "efficiency");
    near(last.npsh_required.unwrap(), 7.2, 1e-6, "NPSH");
    // wear: 5 % less head and efficiency at the same power
    let worn = curves
        .pumps
        .iter()
        .find(|pump| pump.pumps.len() == 2 && pump.case > 0)
        .unwrap();
    let worn = worn.points.last().unwrap();
    near(worn.head.unwrap(), 0.95 * 22.4, 1e-6, "worn head");
    near(
        worn.shaft_power.unwrap(),
        last.shaft_power.unwrap(),
        1e-6,
        "worn power",
    );
}

#[test]
fn what_makes_a_system_branch_is_told() {
    let network = |name| systems(name);
    for plain in [
        "starter",
        "mill_pond_transfer",
        "plant_cooling_loop",
        "two_lift_high_reservoir",
    ] {
        assert_eq!(of(plain).1.branchings, [], "{plain}");
    }
    let orchard = of("orchard_sprinkler_loop").1;
    assert!(matches!(orchard.branchings.as_slice(), [Branching::Draws(nodes)] if nodes.len() == 4));
    let two_lift = network("two_lift_high_reservoir");
    let lower = drawn(&two_lift, Some("lower_lift")).unwrap();
    assert_eq!(lower.stages.len(), 1);
    let upper_pump = two_lift[0].1.network.find_pump("upper_lift").unwrap();
    assert_eq!(lower.branchings, [Branching::OtherPumps(vec![upper_pump])]);
    // the same flow, whichever header one looks from
    near(
        lower.points[0].at.flow,
        of("two_lift_high_reservoir").1.points[0].at.flow,
        1e-9,
        "lower",
    );
    let two_ends = of_text(
        "
nodes: {a: {reservoir: 0 m}, h: {point: 0 m}, b: {reservoir: 10 m}, c: {reservoir: 12 m}}
lines:
  p: {from: a, to: h, count: 2, parts: [{pump: {model: m, elevation: 0 m}}, {check_valve: {k: 1, bore: 100 mm}}]}
  x: {from: h, to: b, pipe: {length: 100 m, bore: 100 mm, roughness: 0.1 mm}}
  y: {from: h, to: c, pipe: {length: 100 m, bore: 100 mm, roughness: 0.1 mm}}
  z: {from: h, to: a, parts: [{valve: {k: 900, bore: 50 mm}}]}
pump_models: {m: {curve: {flow: [0, 40, 80], head: [30, 26, 14]}}}
",
    );
    let found = drawn(&two_ends, None).unwrap();
    assert!(
        matches!(found.branchings.as_slice(), [Branching::SeveralEnds(nodes)] if nodes.len() == 3)
    );
    for point in &found.points {
        near(
            at(&found.systems[0].points, point.at.flow).unwrap(),
            point.at.head,
            1e-6,
            "two ends",
        );
    }
}

#[test]
fn a_way_round_the_pumps_is_seen() {
    let systems = of_text(
        "
nodes: {a: {reservoir: 2 m}, s: {point: 0 m}, h: {point: 0 m}, b: {outlet: 10 m}}
lines:
  suction: {from: a, to: s, pipe: {length: 10 m, bore: 150 mm, roughness: 0.1 mm}}
  p: {from: s, to: h, count: 2, parts: [{pump: {model: m, elevation: 0 m}}, {check_valve: {k: 1, bore: 100 mm}}]}
  bypass: {from: h, to: s, parts: [{valve: {k: 900, bore: 50 mm}}]}
  main: {from: h, to: b, pipe: {length: 300 m, bore: 150 mm, roughness: 0.1 mm}}
pump_models: {m: {curve: {flow: [0, 40, 80], head: [30, 26, 14], npsh_required: [1, 2, 3]}}}
",
    );
    let found = drawn(&systems, None).unwrap();
    assert_eq!(found.branchings, [Branching::WayRound]);
    for point in &found.points {
        let (system, combined) = (&found.systems[0], &found.combined[point.combined]);
        let asked = at(&system.points, point.at.flow).unwrap();
        let given =
            at(&combined.points, point.at.flow).or_else(|| at(&combined.beyond, point.at.flow));
        near(asked, point.at.head, 1e-6, "system");
        near(given.unwrap(), point.at.head, 1e-6, "pumps");
    }
    // the suction is shared: one pump alone has more than one of two
    let beside: Vec<Option<usize>> = found
        .suctions
        .iter()
        .map(|suction| suction.beside)
        .collect();
    assert_eq!(beside, [Some(1), Some(2)]);
    let last = |k: usize| found.suctions[k].points.last().unwrap().1;
    assert!(last(0) > last(1) + 0.01);
}

/// Too slow for the static head, a pump gives nothing: no point, but it is told.
#[test]
fn a_set_that_moves_nothing_is_told() {
    let text = "
nodes: {a: {reservoir: 0 m}, h: {point: 0 m}, b: {outlet: 25 m}}
lines:
  p: {from: a, to: h, count: 2, parts: [{pump: {model: m, elevation: 0 m}}, {check_valve: {k: 1, bore: 100 mm}}]}
  main: {from: h, to: b, pipe: {length: 300 m, bore: 150 mm, roughness: 0.1 mm}}
pump_models: {m: {curve: {flow: [0, 40, 80], head: [30, 26, 14]}}}
cases: {slowed: {p.speed: 90 %}}
";
    let found = drawn(&of_text(text), None).unwrap();
    // 0.81 x 30 m = 24.3 m < 25 m
    assert_eq!(found.idle.len(), 1);
    assert!(found.idle[0].case == 1 && found.idle[0].error.is_none());
    assert_eq!(found.points.len(), 2);
}

#[test]
fn a_bank_that_grows_in_a_case_is_drawn_in_that_case() {
    let text = std::fs::read_to_string(format!(
        "{}/networks/mill_pond_transfer.yaml",
        env!("CARGO_MANIFEST_DIR")
    ))
    .unwrap()
    .replace("cases:\n", "cases:\n  third pump: {transfer.count: 3}\n");
    let systems = of_text(&text);
    let found = drawn(&systems, None).unwrap();
    let three = ["transfer.1", "transfer.2", "transfer.3"];
    // demo system (a): three pumps 99.2 L/s
    near(
        point(&systems, &found, "third pump", &three),
        99.2 * L_S,
        0.1 * L_S,
        "three",
    );
}

#[test]
fn many_unlike_pumps_are_added_one_by_one() {
    let mut text = "
nodes: {a: {reservoir: 0 m}, h: {point: 0 m}, b: {outlet: 10 m}}
pump_models: {m: {curve: {flow: [0, 40, 80], head: [30, 26, 14]}}}
lines:
  main: {from: h, to: b, pipe: {length: 300 m, bore: 250 mm, roughness: 0.1 mm}}
"
    .to_owned();
    for k in 1..=12 {
        text.push_str(&format!(
            "  p{k}: {{from: a, to: h, parts: [{{pump: {{model: m, elevation: 0 m}}}}, {{check_valve: {{k: {k}, bore: 100 mm}}}}]}}\n"
        ));
    }
    let found = drawn(&of_text(&text), None).unwrap();
    assert!(found.one_by_one);
    let sizes: Vec<usize> = found
        .combined
        .iter()
        .map(|curve| curve.running.len())
        .collect();
    assert_eq!(sizes, [1, 2, 3, 4, 5, 6, 7, 8]);
}

#[test]
fn what_cannot_be_drawn_is_an_error() {
    let systems = systems("starter");
    assert_eq!(
        drawn(&systems, Some("dutty")).unwrap_err(),
        CurvesError::NoBank("dutty".to_owned())
    );
    let none = of_text(
        "nodes: {a: {reservoir: 1 m}, b: {reservoir: 0 m}}\nlines: {m: {from: a, to: b, pipe: {length: 1 m, bore: 1 m, roughness: 0.1 mm}}}",
    );
    assert_eq!(drawn(&none, None).unwrap_err(), CurvesError::NoPumps);
    assert_eq!(curves(&[], None).unwrap_err(), CurvesError::NoPumps);
}

#[test]
fn only_the_pumps_named_are_switched() {
    let systems = systems("plant_cooling_loop");
    let network: &Network = &systems[0].1.network;
    let small: PumpId = network.find_pump("small").unwrap();
    let found = curves(
        &[Case {
            network,
            switched: vec![small],
        }],
        None,
    )
    .unwrap();
    // both big pumps run throughout; with them the small one, or not at all: that set is the one left out
    let sizes: Vec<usize> = found
        .combined
        .iter()
        .map(|curve| curve.running.len())
        .collect();
    assert_eq!(sizes, [3]);
}

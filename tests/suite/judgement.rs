//! Limits, cautions and mains, against the demo systems' figures and closed forms.

use dutybank::network::LimitName;
use dutybank::read::{Change, Document, System};
use dutybank::solve::Solver;
use dutybank::study::assessment::{Assessment, assess};
use dutybank::study::caution::Caution;
use dutybank::study::limit::{About, Limit, LimitKind};
use dutybank::study::mains;
use dutybank::study::threshold::threshold_speed;

fn read(text: &str, changes: &[(&str, &str)]) -> System {
    let document = Document::parse(text.as_bytes()).unwrap();
    let changes: Vec<Change> = changes
        .iter()
        .map(|(path, value)| Change::new(path, value))
        .collect();
    let none = |_: &str| Err(std::io::Error::other("none"));
    document.system(&changes, &none).unwrap_or_else(|problems| {
        panic!("{}", problems.render(text, "test", false));
    })
}

fn judged(system: &System) -> Assessment {
    let network = &system.network;
    let settings = network.settings();
    let solution = Solver::new(network).solve(settings).unwrap().clone();
    assess(network, &system.needs, settings, &solution)
}

fn limit(system: &System, assessment: &Assessment, about: &str, kind: LimitKind) -> Limit {
    let network = &system.network;
    let name = |limit: &Limit| match limit.about {
        About::Pump(pump) => network.pump(pump).name.clone(),
        About::Line(line) => network.line(line).name.clone(),
    };
    let same = |limit: &Limit| {
        std::mem::discriminant(&limit.kind) == std::mem::discriminant(&kind) && name(limit) == about
    };
    *assessment.limits.iter().find(|limit| same(limit)).unwrap()
}

fn codes(assessment: &Assessment) -> Vec<&'static str> {
    assessment.cautions.iter().map(Caution::code).collect()
}

const MILL_POND: &str = include_str!("../../networks/mill_pond_transfer.yaml");
const MEADOW: &str = include_str!("../../networks/meadow_lift_station.yaml");
const TWO_LIFT: &str = include_str!("../../networks/two_lift_high_reservoir.yaml");
const PLANT: &str = include_str!("../../networks/plant_cooling_loop.yaml");

/// Demo systems (invented), their figures solved apart from this program with SciPy.
#[test]
fn one_pump_alone_loads_its_motor_and_leaves_its_region() {
    let system = read(MILL_POND, &[("transfer.2.running", "false")]);
    let assessment = judged(&system);
    let find = |kind| limit(&system, &assessment, "transfer.1", kind);
    assert!((find(LimitKind::Motor).value - 0.98).abs() < 0.005);
    assert!((find(LimitKind::PreferredHigh).value - 1.21).abs() < 0.005);
    assert_eq!(codes(&assessment), ["outside-preferred"]);
    // the bell: 0.62 m asked at 60.6 L/s
    assert!((find_line(&system, &assessment, "transfer.1").bound - 0.62).abs() < 0.005);
    // the bigger main: 134 % of best efficiency, motor at its rating
    let system = read(
        MILL_POND,
        &[("transfer.2.running", "false"), ("main.bore", "312.7 mm")],
    );
    let assessment = judged(&system);
    let share = limit(&system, &assessment, "transfer.1", LimitKind::PreferredHigh);
    assert!((share.value - 1.34).abs() < 0.005 && share.is_broken());
    let npsh = limit(&system, &assessment, "transfer.1", LimitKind::NpshRequired);
    assert!((npsh.value / npsh.bound - 1.50).abs() < 0.02, "{npsh:?}");
}

fn find_line(system: &System, assessment: &Assessment, line: &str) -> Limit {
    limit(system, assessment, line, LimitKind::Submergence)
}

#[test]
fn surge_bound_and_retention_of_the_main() {
    let system = read(MILL_POND, &[]);
    let assessment = judged(&system);
    let mains = mains::states(&system.network, &assessment.lines, &assessment.pumps);
    assert_eq!(mains.len(), 1);
    // a 1100 m/s, dv 1.65 m/s: 185 m, 2 L / a 2.6 s (demo figures, the velocity rounded up there)
    assert!((mains[0].surge_head - 185.0).abs() < 2.0);
    assert!((mains[0].return_time - 2.6).abs() < 0.05);
    // V / Q by hand: pi/4 0.262^2 1450 m / 88.3 L/s
    let volume = std::f64::consts::FRAC_PI_4 * 0.262f64.powi(2) * 1450.0;
    assert!((mains[0].retention - volume / 0.0883).abs() < 1.0);
}

#[test]
fn slow_water_in_a_sewage_main_is_said_only_where_asked() {
    let system = read(
        MEADOW,
        &[
            ("lift.2.running", "false"),
            ("lift.3.running", "false"),
            ("rising_main.bore", "400 mm"),
        ],
    );
    assert!(codes(&judged(&system)).contains(&"main-slow"));
    let without = MEADOW.replace("velocity_low: {value", "velocity_high: {value");
    let system = read(&without, &[("rising_main.bore", "400 mm")]);
    assert_eq!(system.network.limits().value(LimitName::VelocityLow), None);
}

/// Demo system (c), solved by hand there: both shut off 15.4 bar at the upper outlet, 16.5 bar with heads 5 % high; the reservoir's static
/// head through leaking check valves 16.8 bar at the low point.
#[test]
fn pressures_at_shutoff_and_behind_leaking_check_valves() {
    let with_tolerance = |percent: &str| {
        let limits = format!("limits: {{shutoff_tolerance: {percent} %}}\nneeds:");
        let system = read(&TWO_LIFT.replacen("needs:", &limits, 1), &[]);
        let assessment = judged(&system);
        let at_shutoff = limit(&system, &assessment, "leg_2", LimitKind::RatingAtShutoff);
        let leaking = limit(&system, &assessment, "leg_1b", LimitKind::RatingIfLeaking);
        (
            at_shutoff.value / 1e5,
            leaking.value / 1e5,
            codes(&assessment),
        )
    };
    let (nominal, leaking, said) = with_tolerance("0");
    assert!((nominal - 15.4).abs() < 0.06, "{nominal}");
    assert!((leaking - 16.8).abs() < 0.06, "{leaking}");
    assert!(!said.contains(&"line-pressure-at-shutoff"));
    let (high, _, said) = with_tolerance("5");
    assert!((high - 16.5).abs() < 0.06, "{high}");
    assert!(said.contains(&"line-pressure-at-shutoff"));
}

#[test]
fn a_pump_on_static_head_delivers_nothing_below_its_threshold_speed() {
    // demo (d): the small pump beside both large ones at full speed gives nothing below 91.8 %, a large one beside the other below 65 %
    let system = read(PLANT, &[]);
    let mut solver = Solver::new(&system.network);
    let small = system.network.find_pump("small").unwrap();
    let found = threshold_speed(&mut solver, system.network.settings(), small).unwrap();
    assert!((found - 0.918).abs() < 0.0006, "{found}");
    let mut settings = system.network.settings().clone();
    settings.pump_mut(small).running = false;
    let second = system.network.find_pump("big.2").unwrap();
    let found = threshold_speed(&mut solver, &settings, second).unwrap();
    assert!((found - 0.65).abs() < 0.006, "{found}");
}

const PAIR: &str = "
nodes: {pond: {reservoir: 2 m}, header: {point: 0 m}, tower: {reservoir: 12 m}}
lines:
  duty:
    from: pond
    to: header
    count: 2
    parts: [{pump: {model: P, elevation: 0 m}}, {check_valve: {k: 2, bore: 150 mm}}]
  main: {from: header, to: tower, pipe: {length: 400 m, bore: 200 mm, roughness: 0.1 mm}}
pump_models:
  P:
    speed: 1450 rpm
    minimum_flow: 30 m3/h
    preferred: {from: 80 %, to: 110 %}
    casing: {pressure: 2 bar, volume: 10 L}
    curve: {flow: [0, 60, 120, 180], head: [HEADS], efficiency: [0, 60, 75, 70]}
    motor: {rated: 11 kW}
";

#[test]
fn the_makers_limits_come_before_the_defaults() {
    let system = read(&PAIR.replace("HEADS", "20, 19, 16, 10"), &[]);
    let assessment = judged(&system);
    let least = limit(&system, &assessment, "duty.1", LimitKind::MinimumFlow);
    assert!((least.bound * 3600.0 - 30.0).abs() < 1e-9);
    let low = limit(&system, &assessment, "duty.1", LimitKind::PreferredLow);
    assert!((low.bound - 0.8).abs() < 1e-12);
    // 2 m of water and 20 m of head raised by 5 %, over the casing at 0 m: 998.2 x 9.80665 x 23 m
    let casing = limit(&system, &assessment, "duty.1", LimitKind::CasingAtShutoff);
    assert!((casing.value - 998.2 * 9.80665 * 23.0).abs() < 20.0);
    assert!(casing.is_broken());
}

#[test]
fn a_pump_held_shut_heats_its_water() {
    let system = read(
        &PAIR.replace("HEADS", "20, 19, 16, 10"),
        &[("duty.2.speed", "60 %")],
    );
    let assessment = judged(&system);
    let heat = assessment
        .cautions
        .iter()
        .find_map(|caution| match caution {
            Caution::HeldShut { heat, .. } => Some(*heat),
            _ => None,
        });
    let heat = heat.expect("the slow pump is held shut");
    // P / (rho V c), 10 L of water
    let rate = heat.power.unwrap() / (998.2 * 0.010 * 4186.0);
    assert!((heat.rate.unwrap() / rate - 1.0).abs() < 1e-3);
}

#[test]
fn flat_and_drooping_curves_are_named_where_pumps_stand_side_by_side() {
    let flat = read(&PAIR.replace("HEADS", "17, 16.8, 16, 10"), &[]);
    assert!(codes(&judged(&flat)).contains(&"flat-curve"));
    let alone = read(
        &PAIR.replace("HEADS", "17, 16.8, 16, 10"),
        &[("duty.2.running", "false")],
    );
    assert!(!codes(&judged(&alone)).contains(&"flat-curve"));
    // droops from 16 to 17 m; back at 16 m at 120 m3/h
    let droops = read(&PAIR.replace("HEADS", "16, 17, 16, 10"), &[]);
    let model = &droops.network.models()[0];
    assert!((model.hunts_below().unwrap() * 3600.0 - 120.0).abs() < 1e-6);
}

#[test]
fn nothing_is_said_of_a_station_in_good_order() {
    for text in [MILL_POND, TWO_LIFT] {
        let system = read(text, &[]);
        let said = codes(&judged(&system));
        let true_of_two_lift = ["line-pressure-at-shutoff", "line-pressure-if-leaking"];
        assert!(
            said.iter().all(|code| true_of_two_lift.contains(code)),
            "{said:?}"
        );
    }
}

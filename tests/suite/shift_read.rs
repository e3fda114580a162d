//! What a file says about time: read whole, and told what is wrong where it stands. All data invented.

use dutybank::diagnostic::Diagnostics;
use dutybank::read::{Document, OverTime, System};
use dutybank::shift::{Between, Call, FaultKind, Follow, Gas, HoldStyle, Rotate, Shape, run};

fn read(text: &str, files: &[(&str, &str)]) -> Result<(System, OverTime), String> {
    let load = |name: &str| {
        let found = files.iter().find(|file| file.0 == name);
        found
            .map(|file| file.1.as_bytes().to_vec())
            .ok_or_else(|| std::io::Error::other("not there"))
    };
    let document = Document::parse(text.as_bytes()).map_err(|error| error.to_string())?;
    let shown = |problems: Diagnostics| problems.render(document.text(), "station.yaml", false);
    let system = document.system(&[], &load).map_err(shown)?;
    let over_time = document.over_time(&system, &[], &load).map_err(shown)?;
    Ok((system, over_time))
}

const STATION: &str = r#"
units: {base: metric, flow: L/s}
nodes:
  well: {tank: {floor: 0 m, depth: 4 m, diameter: 6 m, level: 1 m, alarm: 2.5 m, overflow: 3.2 m, trip: 0.5 m, reset: 0.8 m,
                inflow: [{rate: 1, times: dry}, {times: storm}], draw: 2}}
  drum: {tank: {floor: 1 m, lying: {diameter: 1.6 m, length: 4 m}, level: 0.8 m, pressure: 2 bar, cushion: {vessel: 9 m3, exponent: 1.3}}}
  pit: {tank: {floor: 0 m, volumes: {level: [0, 1, 2], volume: [0, 3, 10]}, level: 0.5 m}}
  header: {point: {elevation: 0 m, draw: {rate: 3, times: dry}}}
  away: {outlet: 8 m}
lines:
  duty:
    from: well
    to: header
    count: 2
    parts:
      - pump: {model: P, elevation: 0 m}
      - check_valve: {k: 2, bore: 200 mm}
  main: {from: header, to: away, pipe: {length: 100 m, bore: 200 mm, roughness: 0.1 mm}}
  fill: {from: header, to: drum, pipe: {length: 50 m, bore: 50 mm, roughness: 0.1 mm}}
  bleed: {from: drum, to: pit, pipe: {length: 5 m, bore: 20 mm, roughness: 0.1 mm}}
pump_models:
  P:
    speed: 1450 rpm
    curve: {flow: [0, 30, 60, 90], head: [22, 20, 15, 7], efficiency: [0, 60, 75, 60]}
    motor: {rated: 15 kW, efficiency: 90 %}
schedules:
  dry: {repeat: 24 h, between: straight, points: {"00:00": 20, "06:30": 40, "12:00:30": 30, "20 h": 25}}
  storm: {file: storm.csv}
  crew: {repeat: 24 h, points: {"00:00": 0, "08:00": 1}}
shift: {starts: "22:00", lasts: 8 h, report_every: 5 min}
staging:
  bands:
    - pumps: [duty]
      follow: {level: well}
      steps: [{start: 1.5 m, stop: 0.9 m}, {start: 1.8 m, stop: 1.2 m}]
      windows: [{from: "17:00", to: "21:00", steps: [{start: 1.8 m, stop: 0.9 m}, {start: 2.1 m, stop: 1.2 m}]}]
      rotate: least_hours
      begins_with: 1
      min_run: 2 min
      min_rest: 5 min
      stagger: 15 s
      max_starts_per_hour: 6
      up_delay: 5 s
      exercise: {every: 7 d, lasts: 10 min}
      restart_after: 30 s
  held:
    - pumps: [duty.1, duty.2]
      hold: {flow: main, at: 40, speed: {least: 60 %, most: 100 %}, style: trim, up_at: 98 %}
  by the clock:
    - {pumps: [duty.2], clock: crew}
faults:
  - {at: "01:00", trip: duty.1, lasts: 2 h}
  - {at: 30 min, power_out: true, lasts: 10 min}
  - {at: "23:00", stuck_open: duty}
  - {at: 1 h, fouls: {line: duty.2, loss: 2 m, flow: 50}}
tariff: {rate: 0.18, windows: [{from: "23:00", to: "07:00", rate: 0.10}], demand_charge: 9, carbon: 0.3}
"#;

const STORM: &str = "time [h], flow [L/s]\n0, 0\n23, 60\n26, 0\n";

#[test]
fn everything_over_time_is_read() {
    let (system, read) = read(STATION, &[("storm.csv", STORM)]).unwrap_or_else(|e| panic!("{e}"));
    let shift = &read.shift;
    assert_eq!(
        (shift.starts, shift.lasts, shift.report_every),
        (79_200.0, 28_800.0, Some(300.0))
    );
    let [well, drum, pit] = shift.tanks.as_slice() else {
        panic!()
    };
    assert!(matches!(well.shape, Shape::Upright { area } if (area - 28.274).abs() < 1e-3));
    assert_eq!((well.brim, well.alarm, well.level), (3.2, Some(2.5), 1.0));
    assert_eq!(well.inflows.len(), 2);
    assert!((well.inflows[0].rate - 1e-3).abs() < 1e-18 && well.inflows[1].rate == 1.0);
    assert!((well.draws[0].rate - 2e-3).abs() < 1e-18);
    assert!(
        matches!(
            drum.shape,
            Shape::Cylinder {
                diameter: 1.6,
                length: 4.0
            }
        ) && drum.brim == 1.6
    );
    assert!(matches!(
        drum.gas,
        Gas::Cushion {
            vessel: 9.0,
            exponent: 1.3,
            ..
        }
    ));
    assert!(
        matches!(&pit.shape, Shape::Table { volumes, .. } if volumes[2] == 10.0) && pit.brim == 2.0
    );
    assert_eq!(shift.draws.len(), 1);
    assert_eq!(shift.schedules[1].at(23.0 * 3600.0).0, 0.06);
    let dry = &shift.schedules[0];
    assert_eq!(dry.at(6.5 * 3600.0).0, 40.0);
    assert_ne!(
        dry,
        &dutybank::shift::Schedule::new(vec![(0.0, 20.0)], Between::Steps, None).unwrap()
    );

    let [bands, held, clock] = read.plans.as_slice() else {
        panic!()
    };
    let group = &bands.groups[0];
    assert_eq!(
        (group.name.as_str(), group.pumps.len(), group.begins_with),
        ("duty", 2, Some(1))
    );
    assert_eq!(
        (group.min_run, group.min_rest, group.stagger),
        (120.0, 300.0, 15.0)
    );
    assert_eq!(
        (group.rotate, group.max_starts_per_hour, bands.restart_after),
        (Rotate::LeastHours, Some(6), 30.0)
    );
    let Call::Bands(rule) = &group.call else {
        panic!()
    };
    assert_eq!(
        rule.follow,
        Follow::Level(system.network.find_node("well").unwrap())
    );
    assert_eq!(
        (
            rule.steps[1].start,
            rule.windows[0].steps[1].start,
            rule.up_delay
        ),
        (1.8, 2.1, 5.0)
    );
    let Call::Hold(hold) = held.groups[0].call else {
        panic!()
    };
    assert_eq!(
        (hold.at, hold.speeds, hold.style, hold.up_at),
        (0.04, (0.6, 1.0), HoldStyle::Trim, 0.98)
    );
    assert!(matches!(clock.groups[0].call, Call::Clock(2)));
    assert_eq!(bands.trips[0].pumps.len(), 2);
    assert_eq!((bands.trips[0].level, bands.trips[0].reset), (0.5, 0.8));

    assert_eq!(shift.faults.len(), 5);
    assert_eq!(
        (shift.faults[0].at, shift.faults[0].lasts),
        (10_800.0, Some(7200.0))
    );
    assert_eq!(
        (shift.faults[1].at, shift.faults[1].kind),
        (1800.0, FaultKind::PowerOut)
    );
    assert_eq!(shift.faults[3].at, 3600.0);
    assert!(matches!(shift.faults[4].kind, FaultKind::Fouling(_, r) if (r - 800.0).abs() < 1e-9));
    let tariff = shift.tariff.as_ref().unwrap();
    assert!(
        (tariff.rate_at(0.0) * 3.6e6 - 0.10).abs() < 1e-12
            && (tariff.demand_charge - 0.009).abs() < 1e-15
    );

    for plan in &read.plans {
        let outcome = run(&system.network, shift, plan, &mut ());
        let outcome = outcome.unwrap_or_else(|error| panic!("{}: {error}", plan.name));
        assert!(
            outcome.score.volume_error < 1e-9,
            "{}: {:e}",
            plan.name,
            outcome.score.volume_error
        );
    }
}

#[test]
fn what_is_wrong_is_told_where_it_stands() {
    for (right, wrong, says) in [
        (
            "follow: {level: well}",
            "follow: {level: wel}",
            "did you mean `well`?",
        ),
        (
            "follow: {level: well}",
            "follow: {level: header}",
            "is no tank",
        ),
        (
            "follow: {level: well}",
            "follow: {}",
            "must look at one thing",
        ),
        (
            "{start: 1.5 m, stop: 0.9 m}, {start: 1.8 m, stop: 1.2 m}]\n",
            "{start: 1.5 m, stop: 1.5 m}]\n",
            "starts and stops at the same value",
        ),
        (
            "rotate: least_hours",
            "rotate: sometimes",
            "it is `never`, `each_start` or `least_hours`",
        ),
        ("min_run: 2 min", "min_run: 2", "must be a time"),
        ("begins_with: 1", "begins_with: 1.5", "whole number"),
        (
            "pumps: [duty]\n",
            "pumps: [duty.1]\n",
            "2 steps but 1 pumps",
        ),
        ("pumps: [duty]\n", "pumps: [duty, duty.1]\n", "twice"),
        ("clock: crew", "clock: crow", "did you mean `crew`?"),
        ("times: storm", "times: strom", "did you mean `storm`?"),
        ("\"06:30\": 40", "\"06:75\": 40", "is no time"),
        ("\"06:30\": 40", "\"00:00:00\": 40", "does not come after"),
        ("reset: 0.8 m", "reset: 0.4 m", "must lie above its `trip`"),
        ("alarm: 2.5 m", "alarm: 5 m", "above its depth"),
        (
            "lying: {diameter: 1.6 m, length: 4 m}",
            "lying: {diameter: 1.6 m}",
            "needs `length`",
        ),
        ("vessel: 9 m3", "vessel: 5 m3", "no more than the liquid"),
        ("volume: [0, 3, 10]", "volume: [0, 3, 2]", "have to rise"),
        (
            "stuck_open: duty}",
            "stuck_open: main}",
            "has no check valve",
        ),
        (
            "power_out: true",
            "power_out: true, trip: duty.1",
            "a fault is one thing",
        ),
        ("at: \"01:00\"", "at: early", "must be a time"),
        ("rate: 0.18,", "", "needs `rate`"),
        (
            "shift: {starts: \"22:00\", lasts: 8 h,",
            "shift: {starts: \"22:00\",",
            "needs `lasts`",
        ),
        ("file: storm.csv", "file: gone.csv", "cannot be read"),
        (
            "exercise: {every: 7 d, lasts: 10 min}",
            "exercise: {every: 7 d}",
            "needs `lasts`",
        ),
        ("style: trim", "style: slim", "`common`"),
        (
            "hold: {flow: main",
            "clock: crew\n      hold: {flow: main",
            "does not say what calls",
        ),
    ] {
        assert!(STATION.contains(right), "{right}");
        let text = STATION.replacen(right, wrong, 1);
        let problems = match read(&text, &[("storm.csv", STORM)]) {
            Err(problems) => problems,
            Ok(_) => panic!("read though wrong: {wrong}"),
        };
        assert!(problems.contains(says), "{wrong}: {problems}");
        assert!(problems.contains("station.yaml:"), "{problems}");
    }
}

#[test]
fn the_station_of_the_demo_runs_from_its_file() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
    let text = std::fs::read_to_string(folder.join("meadow_lift_station.yaml")).unwrap();
    let (system, over_time) = read(&text, &[]).unwrap_or_else(|e| panic!("{e}"));
    assert_eq!(over_time.plans.len(), 3);
    for (plan, starts) in over_time.plans.iter().zip([58, 58, 137]) {
        let outcome = run(&system.network, &over_time.shift, plan, &mut ()).unwrap();
        assert!(
            outcome.score.starts.abs_diff(starts) <= 2,
            "{}: {}",
            plan.name,
            outcome.score.starts
        );
        assert!(outcome.score.volume_error < 1e-12);
    }
}

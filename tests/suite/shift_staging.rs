//! Rules, timers, trips and faults on the wet well: what they promise holds whatever the inflow does. All data invented.

use crate::meadow::{self, Meadow, NARROW, WIDE_STEPPED};
use dutybank::network::CheckCondition;
use dutybank::part::PumpId;
use dutybank::shift::{
    Bands, Between, Call, Event, Exercise, Fault, FaultKind, Follow, Hold, HoldStyle, Outcome,
    Plan, Record, Rotate, Schedule, Shift, ShiftError, Step, Trip, Varying, Wait, What, Who, Why,
    run,
};

fn record(meadow: &Meadow, shift: &Shift, plan: &Plan) -> (Record, Outcome) {
    let mut record = Record::new();
    let outcome = run(&meadow.network, shift, plan, &mut record).unwrap();
    assert!(
        outcome.score.volume_error < 1e-12,
        "{:e}",
        outcome.score.volume_error
    );
    (record, outcome)
}

fn times(record: &Record, pump: PumpId, what: What) -> Vec<f64> {
    let of = |event: &&Event| event.who == Who::Pump(pump) && event.what == what;
    record
        .events()
        .iter()
        .filter(of)
        .map(|event| event.time)
        .collect()
}

/// Starts, and stops by rule or by force, of one pump, in order.
fn runs(record: &Record, pump: PumpId) -> Vec<(f64, What)> {
    record
        .events()
        .iter()
        .filter(|event| event.who == Who::Pump(pump))
        .filter(|event| matches!(event.what, What::Start | What::Stop | What::Trip))
        .map(|event| (event.time, event.what))
        .collect()
}

fn bands(plan: &mut Plan) -> &mut Bands {
    match &mut plan.groups[0].call {
        Call::Bands(bands) => bands,
        _ => panic!(),
    }
}

#[test]
fn the_shortest_run_and_rest_are_never_broken_but_by_a_trip() {
    let meadow = meadow::station();
    for (steps, min_run, min_rest) in [
        (NARROW, 400.0, 900.0),
        (WIDE_STEPPED, 1200.0, 60.0),
        (NARROW, 120.0, 2400.0),
    ] {
        let mut plan = meadow::plan(&meadow, &steps, Rotate::Never);
        plan.groups[0].min_run = min_run;
        plan.groups[0].min_rest = min_rest;
        let well = meadow.network.find_node("wet_well").unwrap();
        plan.trips.push(Trip {
            tank: well,
            level: 0.6,
            reset: 0.8,
            pumps: meadow.pumps.clone(),
        });
        let mut tripped = 0;
        for storm in [false, true] {
            let (record, _) = record(&meadow, &meadow::day(&meadow, storm, 1.0), &plan);
            for &pump in &meadow.pumps {
                for pair in runs(&record, pump).windows(2) {
                    let passed = pair[1].0 - pair[0].0;
                    match pair[1].1 {
                        What::Start => assert!(passed >= min_rest - 1e-6, "{pair:?}"),
                        What::Stop => assert!(passed >= min_run - 1e-6, "{pair:?}"),
                        _ => tripped += 1,
                    }
                }
            }
        }
        assert!(tripped > 0 || min_run < 1000.0);
    }
}

#[test]
fn inside_its_band_a_rule_does_nothing() {
    let meadow = meadow::station();
    let plan = meadow::plan(&meadow, &WIDE_STEPPED, Rotate::EachStart);
    let (record, _) = record(&meadow, &meadow::day(&meadow, true, 1.0), &plan);
    for event in record.events() {
        let row = record
            .times()
            .iter()
            .position(|t| *t == event.time)
            .unwrap();
        let level = record.column(0)[row];
        if let (What::Start | What::Stop, Why::At(Follow::Level(_), at)) = (event.what, event.why) {
            assert!((level - at).abs() < 1e-9, "{level} {event:?}");
            let known = if event.what == What::Start {
                [1.5, 1.8, 2.1]
            } else {
                [0.9, 1.2, 1.5]
            };
            assert!(known.contains(&at));
        }
    }
}

#[test]
fn a_trip_overrides_and_lets_go_higher() {
    let meadow = meadow::station();
    let mut plan = meadow::plan(&meadow, &[(1.5, 0.2)], Rotate::Never);
    let well = meadow.network.find_node("wet_well").unwrap();
    plan.trips.push(Trip {
        tank: well,
        level: 0.7,
        reset: 1.0,
        pumps: meadow.pumps.clone(),
    });
    let (record, outcome) = record(&meadow, &meadow::day(&meadow, false, 1.0), &plan);
    let tank = outcome.score.tanks[0];
    assert!((tank.lowest - 0.7).abs() < 1e-9);
    // the step is still on when the trip lets go: the pump comes back at the reset
    let first = record
        .events()
        .iter()
        .find(|event| event.what == What::Reset)
        .unwrap();
    let again = times(&record, meadow.pumps[0], What::Start);
    assert!(again.contains(&first.time));
    assert!(record.events().iter().all(|event| event.what != What::Stop));
    assert!(tank.below_trip < 1e-3, "{}", tank.below_trip);
}

#[test]
fn starts_are_staggered_and_locked() {
    let meadow = meadow::station();
    let mut plan = meadow::plan(
        &meadow,
        &[(1.2, 0.9), (1.2, 0.9), (1.2, 0.9)],
        Rotate::Never,
    );
    plan.groups[0].stagger = 20.0;
    let (run_, _) = record(&meadow, &meadow::day(&meadow, false, 1.3), &plan);
    let first: Vec<f64> = meadow
        .pumps
        .iter()
        .map(|pump| times(&run_, *pump, What::Start)[0])
        .collect();
    assert_eq!(first, [0.0, 20.0, 40.0]);
    let wait = run_
        .events()
        .iter()
        .find(|event| event.time == 20.0 && event.what == What::Start);
    assert_eq!(wait.unwrap().wait, Some(Wait::Stagger));

    let mut plan = meadow::plan(&meadow, &NARROW, Rotate::Never);
    plan.groups[0].max_starts_per_hour = Some(3);
    let (_, outcome) = record(&meadow, &meadow::day(&meadow, true, 1.0), &plan);
    assert!(outcome.score.worst_hour_starts <= 3);
    assert_eq!(outcome.score.spilled, 0.0);
}

#[test]
fn a_failed_pump_is_replaced_at_once() {
    let meadow = meadow::station();
    let plan = meadow::plan(&meadow, &WIDE_STEPPED, Rotate::Never);
    let mut shift = meadow::day(&meadow, false, 1.6);
    shift.faults.push(Fault {
        at: 200.0,
        lasts: Some(3600.0),
        kind: FaultKind::PumpOut(meadow.pumps[0]),
    });
    let (record, _) = record(&meadow, &shift, &plan);
    assert_eq!(times(&record, meadow.pumps[0], What::Trip), [200.0]);
    let next = record
        .events()
        .iter()
        .find(|event| event.who == Who::Pump(meadow.pumps[1]) && event.what == What::Start);
    let next = next.unwrap();
    assert_eq!(next.time, 200.0);
    assert_eq!(next.why, Why::InPlaceOf(meadow.pumps[0]));
    let write = |_, figure: f64| format!("{figure:.2}");
    assert_eq!(
        next.words(&meadow.network, &write),
        "lift.2 started: in place of lift.1"
    );
    assert!(
        times(&record, meadow.pumps[0], What::Start)
            .iter()
            .any(|t| *t > 3800.0)
    );
}

#[test]
fn power_fails_and_pumps_come_back_one_by_one() {
    let meadow = meadow::station();
    let mut plan = meadow::plan(&meadow, &WIDE_STEPPED, Rotate::Never);
    plan.groups[0].stagger = 15.0;
    plan.restart_after = 30.0;
    let mut shift = meadow::day(&meadow, true, 1.0);
    // At 15:30 the storm brings 0.12 m3/s: from 2 m to 3.2 m takes 28.27 m2 some 5 min.
    let at = 15.5 * 3600.0;
    shift.faults.push(Fault {
        at,
        lasts: Some(1800.0),
        kind: FaultKind::PowerOut,
    });
    let (record, outcome) = record(&meadow, &shift, &plan);
    let tripped = record
        .events()
        .iter()
        .filter(|event| event.what == What::Trip)
        .count();
    assert!((1..=3).contains(&tripped));
    let back = at + 1800.0 + 30.0;
    let starts: Vec<f64> = record
        .events()
        .iter()
        .filter(|event| event.what == What::Start && event.time >= at)
        .map(|event| event.time)
        .take(3)
        .collect();
    assert_eq!(starts, [back, back + 15.0, back + 30.0]);
    let spills = record
        .events()
        .iter()
        .find(|event| event.what == What::Spills)
        .unwrap();
    assert!(spills.time > at + 150.0 && spills.time < at + 900.0);
    assert!(outcome.score.spilled > 50.0);
    assert!(
        record
            .events()
            .iter()
            .any(|event| event.what == What::StopsSpilling)
    );
}

#[test]
fn a_check_valve_that_sticks_open_lets_water_back() {
    let meadow = meadow::station();
    let plan = meadow::plan(&meadow, &WIDE_STEPPED, Rotate::Never);
    let mut shift = meadow::day(&meadow, false, 1.0);
    let line = meadow.network.find_line("lift.3").unwrap();
    let through = |kind: Option<FaultKind>, shift: &mut Shift| {
        shift.faults = kind
            .map(|kind| Fault {
                at: 0.0,
                lasts: None,
                kind,
            })
            .into_iter()
            .collect();
        record(&meadow, shift, &plan).1.score.energy.unwrap()
    };
    let well = through(None, &mut shift);
    // Standing pumps let nothing pass here, stuck or not.
    let stuck = through(
        Some(FaultKind::CheckStuck(line, CheckCondition::StuckOpen)),
        &mut shift,
    );
    assert!((stuck / well - 1.0).abs() < 1e-9);
    let fouled = FaultKind::Fouling(meadow.network.find_line("lift.1").unwrap(), 500.0);
    // 500 m at 1 m3/s are 2 m at 63 L/s: less flow, more time
    assert!(through(Some(fouled), &mut shift) > 1.01 * well);
}

#[test]
fn the_clock_calls_pumps() {
    let meadow = meadow::station();
    let mut shift = meadow::day(&meadow, false, 1.0);
    let counts = vec![
        (0.0, 0.0),
        (6.0 * 3600.0, 1.0),
        (9.0 * 3600.0, 2.0),
        (10.0 * 3600.0, 0.0),
    ];
    shift
        .schedules
        .push(Schedule::new(counts, Between::Steps, Some(86_400.0)).unwrap());
    let mut plan = meadow::plan(&meadow, &WIDE_STEPPED, Rotate::Never);
    plan.groups[0].call = Call::Clock(2);
    let (record, outcome) = record(&meadow, &shift, &plan);
    assert_eq!(times(&record, meadow.pumps[0], What::Start), [21_600.0]);
    assert_eq!(times(&record, meadow.pumps[1], What::Start), [32_400.0]);
    assert_eq!(times(&record, meadow.pumps[1], What::Stop), [36_000.0]);
    assert!(outcome.score.spilled > 100.0);
    assert!(
        record
            .events()
            .iter()
            .any(|event| event.what == What::Empty)
    );
}

#[test]
fn a_pump_that_stood_for_long_is_exercised() {
    let meadow = meadow::station();
    let mut plan = meadow::plan(&meadow, &WIDE_STEPPED, Rotate::Never);
    plan.groups[0].exercise = Some(Exercise {
        every: 8.0 * 3600.0,
        lasts: 120.0,
    });
    let (record, outcome) = record(&meadow, &meadow::day(&meadow, false, 1.0), &plan);
    for &pump in &meadow.pumps[1..] {
        let starts = times(&record, pump, What::Start);
        let stops = times(&record, pump, What::Stop);
        assert_eq!(starts.len(), 2, "{starts:?}");
        assert!((stops[0] - starts[0] - 120.0).abs() < 1e-6);
    }
    assert!((outcome.score.pumps[2].run_time - 240.0).abs() < 1e-6);
}

#[test]
fn delays_hold_a_step_back() {
    let meadow = meadow::station();
    let mut plan = meadow::plan(&meadow, &WIDE_STEPPED, Rotate::Never);
    bands(&mut plan).up_delay = 45.0;
    let (record, outcome) = record(&meadow, &meadow::day(&meadow, false, 1.0), &plan);
    let reached = |t: f64| {
        let rows = record.times().iter().zip(record.column(0));
        rows.filter(|(time, _)| **time <= t)
            .last()
            .map(|(_, level)| *level)
    };
    for start in times(&record, meadow.pumps[0], What::Start) {
        assert!(reached(start).unwrap() > 1.5);
    }
    assert!(outcome.score.tanks[0].highest > 1.5 + 45.0 * 0.014 / 28.3 * 0.9);
}

#[test]
fn rules_that_chatter_are_named() {
    let meadow = meadow::station();
    let main = meadow.network.find_line("main").unwrap();
    let mut plan = meadow::plan(&meadow, &WIDE_STEPPED, Rotate::Never);
    plan.name = "by_flow".to_owned();
    plan.groups[0].begins_with = Some(1);
    plan.groups[0].name = "lift".to_owned();
    // With one pump more the flow jumps past the stop, with one fewer it falls past the start.
    *bands(&mut plan) = Bands {
        follow: Follow::Flow(main),
        steps: vec![
            Step {
                start: 0.02,
                stop: 0.08,
            },
            Step {
                start: 0.06,
                stop: 0.09,
            },
        ],
        windows: Vec::new(),
        up_delay: 0.0,
        down_delay: 0.0,
    };
    let mut shift = meadow::day(&meadow, false, 1.0);
    shift.tanks[0].inflows = vec![Varying::steady(0.08)];
    let error = run(&meadow.network, &shift, &plan, &mut ()).unwrap_err();
    let message = error.message(&meadow.network, &|_, figure| format!("{figure:.2} m3/s"));
    assert!(
        matches!(error, ShiftError::Chatter { step: 1 | 2, .. }),
        "{error:?}"
    );
    assert!(
        message.contains("by_flow, lift") && message.contains("main at"),
        "{message}"
    );
}

fn holding(meadow: &Meadow, figure: Follow, at: f64, style: HoldStyle) -> Plan {
    let mut plan = meadow::plan(meadow, &WIDE_STEPPED, Rotate::Never);
    plan.groups[0].call = Call::Hold(Hold {
        figure,
        at,
        empties: true,
        speeds: (0.5, 1.0),
        style,
        up_at: 0.97,
        up_delay: 30.0,
        down_at: 0.90,
        down_delay: 60.0,
    });
    plan
}

#[test]
fn speed_holds_a_level() {
    let meadow = meadow::station();
    let well = meadow.network.find_node("wet_well").unwrap();
    for style in [HoldStyle::Common, HoldStyle::Trim] {
        let plan = holding(&meadow, Follow::Level(well), 1.2, style);
        let (record, outcome) = record(&meadow, &meadow::day(&meadow, false, 1.2), &plan);
        let tank = outcome.score.tanks[0];
        let write = |_, figure: f64| format!("{figure:.4}");
        let told =
            |event: &Event| format!("{:.0} {}", event.time, event.words(&meadow.network, &write));
        let events: Vec<String> = record.events().iter().map(told).collect();
        assert!(
            tank.highest < 1.5 && tank.lowest > 1.0,
            "{tank:?} {events:#?}"
        );
        // one pump carries 63 L/s at most, so at 62 L/s it is near its top speed
        assert!(outcome.score.starts >= 2, "{events:#?}");
    }
}

#[test]
fn speed_holds_a_flow_and_a_pressure() {
    let meadow = meadow::station();
    let main = meadow.network.find_line("main").unwrap();
    let header = meadow.network.find_node("header").unwrap();
    let mut shift = meadow::day(&meadow, false, 1.5);
    shift.tanks[0].inflows = vec![Varying::steady(0.055)];
    shift.lasts = 7200.0;
    let position = |name: &str, figure: &str| {
        dutybank::shift::columns(&meadow.network, &shift)
            .iter()
            .position(|column| column.name == name && column.figure == figure)
            .unwrap()
    };
    let plan = holding(&meadow, Follow::Flow(main), 0.055, HoldStyle::Common);
    let (run_, _) = record(&meadow, &shift, &plan);
    for flow in run_.column(position("main", "flow")) {
        assert!((flow - 0.055).abs() < 1e-9);
    }
    let pressure = 12.0 * 998.2 * meadow::GRAVITY;
    let plan = holding(&meadow, Follow::Pressure(header), pressure, HoldStyle::Trim);
    let (run_, _) = record(&meadow, &shift, &plan);
    for found in run_.column(position("header", "pressure")) {
        assert!((found / pressure - 1.0).abs() < 1e-9);
    }
    let speed = run_.column(position("lift.1", "speed"))[0];
    assert!(speed > 0.8 && speed < 1.0);
}

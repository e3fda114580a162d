//! Tanks in their stations: a pond emptied within a shift, ports above a surface, a gas cushion, draws that cannot be met.

use crate::meadow::{GRAVITY, Sheet, fluid, loss, pipe};
use dutybank::network::{End, Network, NetworkBuilder, NodeKind, PumpSetting};
use dutybank::part::friction::{Friction, Pipe};
use dutybank::part::pump::Pump;
use dutybank::part::quadratic::QuadraticLoss;
use dutybank::part::{Part, PumpId};
use dutybank::shift::{
    Bands, Call, Follow, Gas, Group, Outcome, Plan, Record, Shape, Shift, Step, Tank, Varying,
    What, columns, run,
};

const TRANSFER: Sheet = Sheet {
    shutoff: 44.0,
    point: (0.05, 33.0),
    efficiency: &[
        (0.0, 0.0),
        (10.0, 32.0),
        (20.0, 55.0),
        (30.0, 70.0),
        (40.0, 78.0),
        (50.0, 80.0),
        (60.0, 77.0),
        (70.0, 69.0),
    ],
    best: 50.0,
    rated: 22e3,
    motor: 0.93,
    npsh: &[2.6, 2.7, 2.9, 3.3, 4.0, 4.8, 5.9, 7.2],
};

/// The pond with `pumps` transfer pumps; all data invented, figures solved apart from this program with SciPy.
fn pond(pumps: usize, roughness: f64, inflow: f64) -> (Network, Shift) {
    let mut net = NetworkBuilder::new(fluid(), GRAVITY, 10.35 * 998.2 * GRAVITY);
    let pond = net.node("pond", NodeKind::Tank { floor: 0.0 }, 0.0, 4.5);
    let header = net.node("header", NodeKind::Point { elevation: 0.0 }, 0.0, 0.0);
    let outfall = net.node("outfall", NodeKind::Outlet { elevation: 21.0 }, 0.0, 0.0);
    let model = net.model(TRANSFER.model("transfer"));
    for i in 1..=pumps {
        let pump = Pump {
            name: format!("transfer.{i}"),
            model,
            elevation: 1.6,
            elevation_given: true,
            when_stopped: None,
        };
        let id = net.pump(pump, PumpSetting::NEW);
        let parts = vec![
            pipe(25.0, 0.2027, 0.1e-3),
            loss(4.0, 0.2027),
            Part::Pump(id),
            pipe(10.0, 0.2027, 0.1e-3),
            loss(4.5, 0.2027),
        ];
        net.line(format!("transfer.{i}"), pond, header, parts);
    }
    let main = vec![pipe(1450.0, 0.262, roughness), loss(8.0, 0.262)];
    net.line("main", header, outfall, main);
    let network = net.build().unwrap();
    let tank = Tank {
        inflows: vec![Varying::steady(inflow)],
        ..Tank::open(pond, Shape::Upright { area: 420.0 }, 5.0, 4.5)
    };
    let shift = Shift {
        lasts: 24.0 * 3600.0,
        tanks: vec![tank],
        ..Shift::default()
    };
    (network, shift)
}

/// Hours until the pond is at 0.9 m.
fn hours_to_empty(pumps: usize, roughness: f64, inflow: f64) -> f64 {
    let (network, shift) = pond(pumps, roughness, inflow);
    let pond = network.find_node("pond").unwrap();
    let bands = Bands {
        follow: Follow::Level(pond),
        steps: vec![
            Step {
                start: 4.5,
                stop: 0.9,
            };
            pumps
        ],
        windows: Vec::new(),
        up_delay: 0.0,
        down_delay: 0.0,
    };
    let ids: Vec<PumpId> = network.pump_ids().collect();
    let plan = Plan {
        name: "empty it".to_owned(),
        groups: vec![Group::new("transfer", ids, Call::Bands(bands))],
        ..Plan::default()
    };
    let mut record = Record::new();
    run(&network, &shift, &plan, &mut record).unwrap();
    let stop = record
        .events()
        .iter()
        .find(|event| event.what == What::Stop)
        .unwrap();
    stop.time / 3600.0
}

/// The pond's drain times as the demo prints them, to their last digit.
#[test]
fn the_pond_is_empty_when_the_demo_says() {
    for (pumps, roughness, inflow, hours, digit) in [
        (1, 0.25e-3, 0.03, 13.9, 0.05),
        (2, 0.25e-3, 0.03, 7.28, 0.005),
        (1, 0.25e-3, 0.0, 6.98, 0.005),
        (2, 0.25e-3, 0.0, 4.79, 0.005),
        (2, 1.0e-3, 0.03, 8.61, 0.005),
    ] {
        let found = hours_to_empty(pumps, roughness, inflow);
        assert!((found - hours).abs() <= digit, "{found} for {hours}");
    }
}

/// Both ends: what leaves, stops at its port; what enters, falls freely from it.
#[test]
fn nothing_leaves_through_a_port_above_the_surface() {
    let mut net = NetworkBuilder::new(fluid(), GRAVITY, 101_325.0);
    let high = net.node("high", NodeKind::Tank { floor: 5.0 }, 0.0, 2.0);
    let low = net.node("low", NodeKind::Tank { floor: 0.0 }, 0.0, 0.0);
    let drain = net.line("drain", high, low, vec![pipe(20.0, 0.1, 1e-4)]);
    net.port(drain, End::From, 0.8);
    net.port(drain, End::To, 1.5);
    let network = net.build().unwrap();
    let shift = Shift {
        lasts: 4.0 * 3600.0,
        report_every: Some(60.0),
        tanks: vec![
            Tank::open(high, Shape::Upright { area: 10.0 }, 3.0, 2.0),
            Tank::open(low, Shape::Upright { area: 6.0 }, 3.0, 0.0),
        ],
        ..Shift::default()
    };
    let mut record = Record::new();
    let outcome = run(&network, &shift, &Plan::default(), &mut record).unwrap();
    let [high, low] = [outcome.score.tanks[0], outcome.score.tanks[1]];
    assert!((high.end_level - 0.8).abs() < 1e-6, "{}", high.end_level);
    assert!((low.end_level - 1.2 * 10.0 / 6.0).abs() < 1e-6);
    let covered = record
        .events()
        .iter()
        .find(|event| event.what == What::PortCovered);
    let covered = covered
        .unwrap_or_else(|| panic!("{:?}", record.events()))
        .time;
    let row = record.times().iter().position(|t| *t == covered).unwrap();
    let level = columns(&network, &shift)
        .iter()
        .position(|column| column.name == "low" && column.figure == "level")
        .unwrap();
    assert!((record.column(level)[row] - 1.5).abs() < 1e-7);
    assert!(
        record
            .events()
            .iter()
            .any(|event| event.what == What::Empty)
    );
}

/// A vessel whose gas cushion follows p V = const, staged on its pressure; a draw empties it between two runs of the pump.
fn booster() -> (Network, Shift, Plan) {
    let mut net = NetworkBuilder::new(fluid(), GRAVITY, 101_325.0);
    let source = net.node("source", NodeKind::Reservoir, 0.0, 1.0);
    let vessel = net.node("vessel", NodeKind::Tank { floor: 0.0 }, 0.0, 0.5);
    let model = net.model(TRANSFER.model("booster"));
    let pump = Pump {
        name: "booster".to_owned(),
        model,
        elevation: 0.0,
        elevation_given: true,
        when_stopped: None,
    };
    let id = net.pump(pump, PumpSetting::NEW);
    let check = Part::CheckValve(QuadraticLoss::new(1000.0));
    net.line("booster", source, vessel, vec![Part::Pump(id), check]);
    let network = net.build().unwrap();
    let tank = Tank {
        gas: Gas::Cushion {
            vessel: 8.0,
            pressure: 2.0e5,
            exponent: 1.0,
        },
        draws: vec![Varying::steady(0.01)],
        ..Tank::open(vessel, Shape::Upright { area: 4.0 }, 1.9, 0.5)
    };
    let shift = Shift {
        lasts: 3600.0,
        report_every: Some(10.0),
        tanks: vec![tank],
        ..Shift::default()
    };
    let bands = Bands {
        follow: Follow::Pressure(vessel),
        steps: vec![Step {
            start: 2.0e5,
            stop: 3.5e5,
        }],
        windows: Vec::new(),
        up_delay: 0.0,
        down_delay: 0.0,
    };
    let plan = Plan {
        name: "pressure".to_owned(),
        groups: vec![Group::new("booster", vec![id], Call::Bands(bands))],
        ..Plan::default()
    };
    (network, shift, plan)
}

#[test]
fn a_gas_cushion_is_staged_on_its_pressure() {
    let (network, shift, plan) = booster();
    let mut record = Record::new();
    let outcome = run(&network, &shift, &plan, &mut record).unwrap();
    assert!(outcome.score.starts > 3, "{:?}", record.events());
    let rows = |what: What| {
        let events = record
            .events()
            .iter()
            .filter(move |event| event.what == what);
        events.map(|event| {
            record
                .times()
                .iter()
                .position(|t| *t == event.time)
                .unwrap()
        })
    };
    let weight = 998.2 * GRAVITY;
    let pressure = |row: usize| {
        let level = record.column(0)[row];
        let gas = (2.0e5 + 101_325.0) * (8.0 - 2.0) / (8.0 - 4.0 * level) - 101_325.0;
        gas + weight * level
    };
    for row in rows(What::Start) {
        assert!(
            record.times()[row] == 0.0 || (pressure(row) - 2.0e5).abs() < 1.0,
            "{}",
            pressure(row)
        );
    }
    for row in rows(What::Stop) {
        assert!((pressure(row) - 3.5e5).abs() < 1.0, "{}", pressure(row));
    }
    assert!(outcome.score.volume_error < 1e-12);
}

/// A town at a point draws from a tower; when the tower is empty its draw is not met, and is booked.
#[test]
fn a_draw_that_cannot_be_met_is_booked() {
    let mut net = NetworkBuilder::new(fluid(), GRAVITY, 101_325.0);
    let tower = net.node("tower", NodeKind::Tank { floor: 20.0 }, 0.0, 1.0);
    let town = net.node("town", NodeKind::Point { elevation: 0.0 }, 0.02, 0.0);
    let friction = Friction::fixed_factor(200.0, 0.2, 0.02, GRAVITY);
    let main = Part::Pipe(Pipe {
        length: 200.0,
        bore: 0.2,
        friction,
    });
    net.line("main", tower, town, vec![main]);
    let network = net.build().unwrap();
    let shift = Shift {
        lasts: 3600.0,
        tanks: vec![Tank::open(tower, Shape::Upright { area: 20.0 }, 3.0, 1.0)],
        ..Shift::default()
    };
    let mut record = Record::new();
    let outcome: Outcome = run(&network, &shift, &Plan::default(), &mut record).unwrap();
    let empty = record
        .events()
        .iter()
        .find(|event| event.what == What::Empty)
        .unwrap();
    assert!((empty.time - 1000.0).abs() < 1e-6, "{}", empty.time);
    assert!(
        record
            .events()
            .iter()
            .any(|event| event.what == What::Unmet)
    );
    assert!(
        (outcome.score.unmet - 0.02 * 2600.0).abs() < 1e-6,
        "{}",
        outcome.score.unmet
    );
}

/// The same station with every line the other way round runs the same.
#[test]
fn a_mirrored_network_runs_alike() {
    let ends = |mirrored: bool| {
        let mut net = NetworkBuilder::new(fluid(), GRAVITY, 101_325.0);
        let tank = |net: &mut NetworkBuilder, name: &str, level| {
            net.node(name, NodeKind::Tank { floor: 0.0 }, 0.0, level)
        };
        let (a, b) = (tank(&mut net, "a", 2.0), tank(&mut net, "b", 1.0));
        let mid = net.node("mid", NodeKind::Point { elevation: 0.0 }, 0.001, 0.0);
        for (name, from, to) in [("one", a, mid), ("two", mid, b)] {
            let (from, to) = if mirrored { (to, from) } else { (from, to) };
            net.line(name, from, to, vec![pipe(50.0, 0.15, 1e-4)]);
        }
        let network = net.build().unwrap();
        let shift = Shift {
            lasts: 600.0,
            tanks: vec![
                Tank::open(
                    a,
                    Shape::Cylinder {
                        diameter: 3.0,
                        length: 4.0,
                    },
                    2.9,
                    2.0,
                ),
                Tank::open(b, Shape::Upright { area: 9.0 }, 3.0, 1.0),
            ],
            ..Shift::default()
        };
        run(&network, &shift, &Plan::default(), &mut ())
            .unwrap()
            .score
            .tanks
    };
    for (a, b) in ends(false).iter().zip(ends(true)) {
        assert!((a.end_level - b.end_level).abs() < 1e-9);
        assert!((a.volume_out - b.volume_out).abs() < 1e-9);
    }
}

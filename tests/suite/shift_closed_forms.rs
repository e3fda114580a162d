//! Runs whose course is known in closed form.

use crate::meadow::GRAVITY;
use dutybank::fluid::Fluid;
use dutybank::network::{Network, NetworkBuilder, NodeId, NodeKind, PumpSetting};
use dutybank::part::curve::Curve;
use dutybank::part::friction::{Friction, Pipe};
use dutybank::part::pump::performance::Scaling;
use dutybank::part::pump::{PowerCurve, Pump, PumpModel};
use dutybank::part::quadratic::QuadraticLoss;
use dutybank::part::{Part, PumpId};
use dutybank::shift::{
    Bands, Call, Event, Follow, Group, Plan, Record, Rotate, Shape, Shift, Step, Tank, Varying,
    What, run,
};

const G: f64 = 9.81;

fn water() -> Fluid {
    Fluid {
        density: 998.2,
        kinematic_viscosity: 1.004e-6,
        vapour_pressure: None,
    }
}

fn builder() -> NetworkBuilder {
    NetworkBuilder::new(water(), G, 101_325.0)
}

fn shift(lasts: f64, report_every: f64, tanks: Vec<Tank>) -> Shift {
    Shift {
        lasts,
        report_every: Some(report_every),
        tanks,
        ..Shift::default()
    }
}

/// Runs with the pumps as the network has them.
fn record(network: &Network, shift: &Shift, plan: &Plan) -> Record {
    let mut record = Record::new();
    let outcome = run(network, shift, plan, &mut record).unwrap();
    assert!(
        outcome.score.volume_error < 1e-11,
        "{:e}",
        outcome.score.volume_error
    );
    record
}

fn time_of(record: &Record, what: What) -> f64 {
    let event = record.events().iter().find(|event| event.what == what);
    event
        .unwrap_or_else(|| panic!("{:?}", record.events()))
        .time
}

/// Level (first column) at a reported time.
fn level_at(record: &Record, time: f64) -> f64 {
    let row = record
        .times()
        .iter()
        .position(|t| (t - time).abs() < 1e-6)
        .unwrap();
    record.column(0)[row]
}

/// Y. A. Çengel, J. M. Cimbala, Fluid Mechanics, solutions to chapter 14, the pool drained through 25 m of 50 mm pipe with f = 0.022
/// (printed 88 480 s and 24.6 h; the last picometre of head, below which the solver holds the outlet shut, is a millionth of that time): t = (D0^2/D^2) sqrt(2 z (1 + fL/D)/g); level z (1 - t/T)^2.
#[test]
fn pool_drains_through_a_pipe() {
    let mut net = builder();
    let pool = net.node("pool", NodeKind::Tank { floor: 0.0 }, 0.0, 2.0);
    let air = net.node("air", NodeKind::Outlet { elevation: 0.0 }, 0.0, 0.0);
    let friction = Friction::fixed_factor(25.0, 0.05, 0.022, G);
    let pipe = Part::Pipe(Pipe {
        length: 25.0,
        bore: 0.05,
        friction,
    });
    let jet = Part::Loss(QuadraticLoss::minor(1.0, 0.05, G));
    net.line("out", pool, air, vec![pipe, jet]);
    let network = net.build().unwrap();
    let exact = 100.0 / 0.0025 * (2.0 * 2.0 * (1.0 + 0.022 * 25.0 / 0.05) / G).sqrt();
    let area = std::f64::consts::PI * 25.0;
    let tank = Tank::open(pool, Shape::Upright { area }, 3.0, 2.0);
    let run = record(
        &network,
        &shift(100_000.0, exact / 4.0, vec![tank]),
        &Plan::default(),
    );
    let empty = time_of(&run, What::Empty);
    assert!((empty - 88_480.0).abs() < 1.0, "{empty}");
    assert!((empty - exact).abs() < 0.1, "{}", empty - exact);
    for (share, level) in [(0.25, 1.125), (0.5, 0.5), (0.75, 0.125)] {
        let found = level_at(&run, share * exact);
        assert!((found - level).abs() < 1e-7, "{found} for {level}");
    }
}

/// A. K. Choudhary, Om Prakash, Fluid Mechanics, example 6.17: a tank of 1.2 m under 3 m of head empties through an orifice of 50 mm with
/// Cd = 0.6. Figure derived here: t = 2 A sqrt(h) / (Cd a sqrt(2 g)) = 750.779412 s.
#[test]
fn tank_drains_through_an_orifice() {
    let mut net = builder();
    let tank = net.node("tank", NodeKind::Tank { floor: 0.0 }, 0.0, 3.0);
    let air = net.node("air", NodeKind::Outlet { elevation: 0.0 }, 0.0, 0.0);
    let effective = 0.6 * 0.00196349541;
    let orifice = QuadraticLoss::new(1.0 / (2.0 * G * effective * effective));
    net.line("orifice", tank, air, vec![Part::Loss(orifice)]);
    let network = net.build().unwrap();
    let shape = Shape::Upright { area: 1.13097336 };
    let tank = Tank::open(tank, shape, 4.0, 3.0);
    let run = record(&network, &shift(900.0, 100.0, vec![tank]), &Plan::default());
    let empty = time_of(&run, What::Empty);
    assert!((empty - 750.779412).abs() < 2e-3, "{empty}");
}

/// Two tanks of 2 m2 and 0.8 m2 joined by an orifice of 0.1 m with Cd = 0.7, levels 1.5 m and 0 m. Closed form derived here:
/// t = 2 A1 A2/(A1 + A2)/(Cd a sqrt(2 g)) (sqrt h1 - sqrt h2).
#[test]
fn two_tanks_equalise() {
    let mut net = builder();
    let one = net.node("one", NodeKind::Tank { floor: 0.0 }, 0.0, 1.5);
    let two = net.node("two", NodeKind::Tank { floor: 0.0 }, 0.0, 0.0);
    let effective = 0.7 * 0.00785398163;
    let orifice = QuadraticLoss::new(1.0 / (2.0 * G * effective * effective));
    net.line("orifice", one, two, vec![Part::Loss(orifice)]);
    let network = net.build().unwrap();
    let tanks = vec![
        Tank {
            alarm: Some(1.5 - 1.0 / 3.5),
            ..Tank::open(one, Shape::Upright { area: 2.0 }, 2.0, 1.5)
        },
        Tank::open(two, Shape::Upright { area: 0.8 }, 2.0, 0.0),
    ];
    // Long after they are level it still has to be quick.
    let run = record(&network, &shift(3600.0, 60.0, tanks), &Plan::default());
    // At a difference of 0.5 m level one stands at 1.21428571 m.
    let time = time_of(&run, What::AlarmOver);
    assert!((time - 24.2929776).abs() < 1e-4, "{time}");
    let last = *run.column(0).last().unwrap();
    // Resting there they stay within a millionth.
    assert!((last - 1.5 * 2.0 / 2.8).abs() < 2e-6, "{last}");
    // At 60 s they are level already: 57.4778022 s.
    assert!((level_at(&run, 60.0) - 1.5 * 2.0 / 2.8).abs() < 1e-6);
}

/// White, Fluid Mechanics, problem 6.27: laminar drain through a capillary, Z = (h + Z0) exp(-C t) - h, C = rho g d^4/(32 mu L D^2);
/// numbers chosen here.
#[test]
fn tank_drains_through_a_capillary() {
    let fluid = Fluid {
        density: 900.0,
        kinematic_viscosity: 0.1 / 900.0,
        vapour_pressure: None,
    };
    let mut net = NetworkBuilder::new(fluid, G, 101_325.0);
    let tank = net.node("tank", NodeKind::Tank { floor: 0.0 }, 0.0, 1.0);
    let air = net.node("air", NodeKind::Outlet { elevation: -0.5 }, 0.0, 0.0);
    let friction = Friction::roughness(2.0, 0.01, 0.0, fluid.kinematic_viscosity, G);
    let pipe = Part::Pipe(Pipe {
        length: 2.0,
        bore: 0.01,
        friction,
    });
    net.line("capillary", tank, air, vec![pipe]);
    let network = net.build().unwrap();
    let shape = Shape::Upright {
        area: std::f64::consts::PI / 16.0,
    };
    let tank = Tank::open(tank, shape, 1.5, 1.0);
    let run = record(
        &network,
        &shift(21_000.0, 19909.1592 / 2.0, vec![tank]),
        &Plan::default(),
    );
    let empty = time_of(&run, What::Empty);
    assert!((empty - 19909.1592).abs() < 1e-3, "{empty}");
    let half = level_at(&run, 19909.1592 / 2.0);
    assert!((half - 0.366025404).abs() < 1e-8, "{half}");
}

/// A pump H = H0 - c q2 with a rising main r q2, its head points dense enough for the cubic through them.
fn parabolic(net: &mut NetworkBuilder, shutoff: f64, c: f64, end: f64) -> PumpId {
    let flows: Vec<f64> = (0..=2000).map(|i| end * f64::from(i) / 2000.0).collect();
    let heads: Vec<f64> = flows.iter().map(|q| shutoff - c * q * q).collect();
    let model = net.model(PumpModel {
        name: format!("model {shutoff}"),
        speed: None,
        impeller: None,
        head: Curve::through(&flows, &heads).unwrap(),
        power: PowerCurve::Unknown,
        npsh_required: None,
        best_efficiency_flow: None,
        motor: None,
        drive: None,
        maker: dutybank::part::pump::MakerLimits::default(),
        scaling: Scaling::default(),
    });
    let pump = Pump {
        name: "pump".to_owned(),
        model,
        elevation: 0.0,
        elevation_given: true,
        when_stopped: None,
    };
    net.pump(pump, PumpSetting::NEW)
}

/// Derived here: a pump H = 30 - 5000 q2 fills 50 m2 through r = 3000 from 10 m to 18 m above its source in
/// t = 2 A sqrt(c + r) (sqrt(H0 - h0) - sqrt(H0 - h1)) = 9016.13323 s; at half that time the level is 14.2540333 m.
#[test]
fn pump_fills_a_tank() {
    let mut net = builder();
    let low = net.node("low", NodeKind::Reservoir, 0.0, 0.0);
    let tank = net.node("tank", NodeKind::Tank { floor: 0.0 }, 0.0, 10.0);
    let pump = parabolic(&mut net, 30.0, 5000.0, 0.08);
    let check = Part::CheckValve(QuadraticLoss::new(3000.0));
    net.line("fill", low, tank, vec![Part::Pump(pump), check]);
    let network = net.build().unwrap();
    let tank = Tank {
        alarm: Some(18.0),
        ..Tank::open(tank, Shape::Upright { area: 50.0 }, 20.0, 10.0)
    };
    let exact = 9016.13323;
    let run = record(
        &network,
        &shift(10_000.0, exact / 2.0, vec![tank]),
        &Plan::default(),
    );
    let filled = time_of(&run, What::Alarm);
    assert!((filled - exact).abs() < 1e-4, "{filled}");
    assert!((level_at(&run, exact / 2.0) - 14.2540333).abs() < 1e-6);
}

/// A sump that a pump of one flow empties, whatever the level: a curve so steep that the level does not matter.
fn sump(inflow: f64) -> (Network, Shift, Plan) {
    let mut net = builder();
    let sump = net.node("sump", NodeKind::Tank { floor: 0.0 }, 0.0, 1.0);
    let away = net.node("away", NodeKind::Outlet { elevation: 1.0 }, 0.0, 0.0);
    // 1e7 m of head at no flow fall to nothing at 0.05 m3/s: 1 m of level changes the flow by 5e-9 m3/s.
    let model = net.model(PumpModel {
        name: "displacement".to_owned(),
        speed: None,
        impeller: None,
        head: Curve::through(&[0.0, 0.1], &[1e7, -1e7]).unwrap(),
        power: PowerCurve::Unknown,
        npsh_required: None,
        best_efficiency_flow: None,
        motor: None,
        drive: None,
        maker: dutybank::part::pump::MakerLimits::default(),
        scaling: Scaling::default(),
    });
    let pump = Pump {
        name: "pump".to_owned(),
        model,
        elevation: 0.0,
        elevation_given: true,
        when_stopped: None,
    };
    let pump = net.pump(pump, PumpSetting::NEW);
    net.line("pump", sump, away, vec![Part::Pump(pump)]);
    let network = net.build().unwrap();
    let tank = Tank {
        inflows: vec![Varying::steady(inflow)],
        ..Tank::open(sump, Shape::Upright { area: 3.0 }, 2.0, 1.0)
    };
    let steps = vec![Step {
        start: 1.5,
        stop: 0.5,
    }];
    let plan = one_group(vec![pump], Follow::Level(sump), steps);
    (network, shift(3600.0, 600.0, vec![tank]), plan)
}

fn one_group(pumps: Vec<PumpId>, follow: Follow, steps: Vec<Step>) -> Plan {
    let bands = Bands {
        follow,
        steps,
        windows: Vec::new(),
        up_delay: 0.0,
        down_delay: 0.0,
    };
    Plan {
        name: "plan".to_owned(),
        groups: vec![Group::new("pumps", pumps, Call::Bands(bands))],
        ..Plan::default()
    }
}

/// MIL-HDBK-1005/9A, section 2.5.3.6, equations (1) and (2): t = (V/D) (1/(1 - Q/D) + 1/(Q/D)); numbers chosen here. Shortest at Q = D/2: 4 V/D.
#[test]
fn sump_cycles() {
    for (inflow, cycle) in [(0.025, 240.0), (0.01, 375.0), (0.04, 375.0)] {
        let (network, shift, plan) = sump(inflow);
        let run = record(&network, &shift, &plan);
        let starts: Vec<&Event> = run
            .events()
            .iter()
            .filter(|e| e.what == What::Start)
            .collect();
        assert!(starts.len() > 5);
        for pair in starts.windows(2) {
            let found = pair[1].time - pair[0].time;
            assert!((found - cycle).abs() < 1e-5, "{found} for {cycle}");
        }
    }
}

fn find(network: &Network, name: &str) -> NodeId {
    network.find_node(name).unwrap()
}

/// A tank whose pump asks for more than flows in ends at its floor and passes on just that; the books stay closed.
#[test]
fn an_empty_tank_passes_on_what_flows_in() {
    let mut net = NetworkBuilder::new(water(), GRAVITY, 101_325.0);
    let tank = net.node("tank", NodeKind::Tank { floor: 0.0 }, 0.0, 1.0);
    let high = net.node("high", NodeKind::Outlet { elevation: 5.0 }, 0.0, 0.0);
    let pump = parabolic(&mut net, 30.0, 5000.0, 0.08);
    net.line("lift", tank, high, vec![Part::Pump(pump)]);
    let network = net.build().unwrap();
    let tank = Tank {
        inflows: vec![Varying::steady(0.01)],
        draws: vec![Varying::steady(0.004)],
        ..Tank::open(
            find(&network, "tank"),
            Shape::Upright { area: 10.0 },
            2.0,
            1.0,
        )
    };
    let shift = shift(7200.0, 60.0, vec![tank]);
    let mut rows = Record::new();
    let outcome = run(&network, &shift, &Plan::default(), &mut rows).unwrap();
    let empty = time_of(&rows, What::Empty);
    assert!(empty > 100.0 && empty < 600.0);
    let score = outcome.score.tanks[0];
    // the pump takes all, so what is drawn besides is not met
    assert!((score.unmet - 0.004 * (7200.0 - empty)).abs() < 1e-8);
    assert!((score.empty - (7200.0 - empty)).abs() < 1e-9);
    assert!((score.volume_out - (10.0 + 0.01 * 7200.0)).abs() < 1e-9);
    assert_eq!(score.end_level, 0.0);
    assert!(outcome.score.volume_error < 1e-12);
}

/// A full tank spills what is left over, and stops when the balance turns.
#[test]
fn a_full_tank_spills() {
    let (network, mut shift, mut plan) = sump(0.06);
    shift.tanks[0].alarm = Some(1.8);
    let outcome = run(&network, &shift, &plan, &mut ()).unwrap();
    // 0.06 in, 0.05 out: from 1.5 m at 25 s to 2 m takes 150 s, then 0.01 m3/s spills
    let score = outcome.score.tanks[0];
    let full = 25.0 + 0.5 * 3.0 / 0.01;
    assert!(
        (score.spilled - 0.01 * (3600.0 - full)).abs() < 5e-9 * 3600.0,
        "{}",
        score.spilled
    );
    assert!((score.above_alarm - (3600.0 - 25.0 - 0.3 * 3.0 / 0.01)).abs() < 1e-4);
    assert_eq!(score.end_level, 2.0);
    assert!(outcome.score.volume_error < 1e-12);
    plan.groups[0].rotate = Rotate::LeastHours;
    assert_eq!(outcome, run(&network, &shift, &plan, &mut ()).unwrap());
}

//! A wet well with three equal submersible pumps over one day: all data invented; figures solved apart from this program
//! with SciPy, in time steps of 2 s.
//!
//! ```text
//! inflow ──▶ wet_well ──▶ lift.1, lift.2, lift.3 ──▶ header ──▶ main ──▶ outfall
//! ```

use dutybank::fluid::Fluid;
use dutybank::network::{Network, NetworkBuilder, NodeKind, PumpSetting};
use dutybank::part::curve::Curve;
use dutybank::part::friction::{Friction, Pipe};
use dutybank::part::pump::performance::Scaling;
use dutybank::part::pump::{Efficiency, Motor, PowerCurve, Pump, PumpModel};
use dutybank::part::quadratic::QuadraticLoss;
use dutybank::part::{Part, PumpId};
use dutybank::shift::{
    Bands, Between, Call, Daily, Follow, Group, Plan, Rotate, Schedule, Shape, Shift, Step, Tank,
    Tariff, TariffWindow, Varying, Window,
};

pub const GRAVITY: f64 = 9.80665;
const DAY: f64 = 86_400.0;

pub fn fluid() -> Fluid {
    Fluid {
        density: 998.2,
        kinematic_viscosity: 1.004e-6,
        vapour_pressure: Some(0.24 * 998.2 * GRAVITY),
    }
}

pub fn pipe(length: f64, bore: f64, roughness: f64) -> Part {
    Part::Pipe(Pipe {
        length,
        bore,
        friction: Friction::roughness(length, bore, roughness, 1.004e-6, GRAVITY),
    })
}

pub fn loss(k: f64, bore: f64) -> Part {
    Part::Loss(QuadraticLoss::minor(k, bore, GRAVITY))
}

/// H = H0 - a q2 exactly, through a point; efficiencies rounded to whole per cent, joined by the monotone cubic.
pub struct Sheet<'s> {
    pub shutoff: f64,
    pub point: (f64, f64),
    /// L/s and %.
    pub efficiency: &'s [(f64, f64)],
    pub best: f64,
    pub rated: f64,
    pub motor: f64,
    pub npsh: &'s [f64],
}

impl Sheet<'_> {
    pub fn model(&self, name: &str) -> PumpModel {
        let a = (self.shutoff - self.point.1) / (self.point.0 * self.point.0);
        let head = |q: f64| self.shutoff - a * q * q;
        let flows: Vec<f64> = self.efficiency.iter().map(|point| 1e-3 * point.0).collect();
        let end = flows[flows.len() - 1];
        let fine: Vec<f64> = (0..=700).map(|i| end * f64::from(i) / 700.0).collect();
        let heads: Vec<f64> = fine.iter().map(|q| head(*q)).collect();
        let efficiencies: Vec<f64> = self.efficiency.iter().map(|point| 1e-2 * point.1).collect();
        PumpModel {
            name: name.to_owned(),
            speed: None,
            impeller: None,
            head: Curve::through(&fine, &heads).unwrap(),
            power: PowerCurve::Efficiency(Curve::through(&flows, &efficiencies).unwrap()),
            npsh_required: Some(Curve::through(&flows, self.npsh).unwrap()),
            best_efficiency_flow: Some(1e-3 * self.best),
            motor: Some(Motor {
                rated: self.rated,
                efficiency: Some(Efficiency::Fixed(self.motor)),
            }),
            drive: None,
            maker: dutybank::part::pump::MakerLimits::default(),
            scaling: Scaling::default(),
        }
    }
}

const SUBMERSIBLE: Sheet = Sheet {
    shutoff: 22.0,
    point: (0.055, 14.6),
    efficiency: &[
        (0.0, 0.0),
        (11.0, 30.0),
        (22.0, 51.0),
        (33.0, 65.0),
        (44.0, 72.0),
        (55.0, 74.0),
        (66.0, 72.0),
        (77.0, 64.0),
    ],
    best: 55.0,
    rated: 15e3,
    motor: 0.90,
    npsh: &[1.5, 1.6, 1.7, 2.0, 2.5, 3.1, 3.9, 4.9],
};

pub struct Meadow {
    pub network: Network,
    pub pumps: Vec<PumpId>,
}

pub fn station() -> Meadow {
    let mut net = NetworkBuilder::new(fluid(), GRAVITY, 10.35 * 998.2 * GRAVITY);
    let well = net.node("wet_well", NodeKind::Tank { floor: 0.0 }, 0.0, 1.3);
    let header = net.node("header", NodeKind::Point { elevation: 0.0 }, 0.0, 0.0);
    let outfall = net.node("outfall", NodeKind::Outlet { elevation: 10.2 }, 0.0, 0.0);
    let model = net.model(SUBMERSIBLE.model("submersible"));
    let mut pumps = Vec::new();
    for i in 1..=3 {
        let pump = Pump {
            name: format!("lift.{i}"),
            model,
            elevation: 0.0,
            elevation_given: true,
            when_stopped: None,
        };
        let id = net.pump(pump, PumpSetting::NEW);
        let branch = vec![
            Part::Pump(id),
            pipe(6.0, 0.2027, 0.3e-3),
            loss(3.5, 0.2027),
            Part::CheckValve(QuadraticLoss::NONE),
        ];
        net.line(format!("lift.{i}"), well, header, branch);
        pumps.push(id);
    }
    let main = vec![pipe(900.0, 0.3127, 0.6e-3), loss(6.0, 0.3127)];
    net.line("main", header, outfall, main);
    Meadow {
        network: net.build().unwrap(),
        pumps,
    }
}

fn hours(points: &[(f64, f64)]) -> Vec<(f64, f64)> {
    points.iter().map(|(h, q)| (3600.0 * h, 1e-3 * q)).collect()
}

pub fn dry_inflow() -> Schedule {
    let points = [
        (0.0, 26.0),
        (2.0, 18.0),
        (4.0, 14.0),
        (6.0, 22.0),
        (7.5, 52.0),
        (9.0, 62.0),
        (12.0, 45.0),
        (15.0, 38.0),
        (18.0, 50.0),
        (20.0, 58.0),
        (22.0, 42.0),
    ];
    Schedule::new(hours(&points), Between::Straight, Some(DAY)).unwrap()
}

pub fn storm_inflow() -> Schedule {
    let points = [
        (13.5, 0.0),
        (14.5, 60.0),
        (15.25, 80.0),
        (16.5, 80.0),
        (17.5, 30.0),
        (20.0, 0.0),
    ];
    Schedule::new(hours(&points), Between::Straight, Some(DAY)).unwrap()
}

pub fn tariff() -> Tariff {
    let per_kwh = 1.0 / 3.6e6;
    let window = |from: f64, to: f64, rate: f64| TariffWindow {
        daily: Daily {
            from: 3600.0 * from,
            to: 3600.0 * to,
        },
        rate: rate * per_kwh,
    };
    Tariff {
        rate: 0.18 * per_kwh,
        windows: vec![window(23.0, 7.0, 0.10), window(17.0, 21.0, 0.28)],
        demand_charge: 0.0,
    }
}

pub fn day(meadow: &Meadow, storm: bool, level: f64) -> Shift {
    let well = meadow.network.find_node("wet_well").unwrap();
    let area = std::f64::consts::PI * 9.0;
    let steady = |times| Varying {
        rate: 1.0,
        times: Some(times),
    };
    let mut inflows = vec![steady(0)];
    if storm {
        inflows.push(steady(1));
    }
    let tank = Tank {
        alarm: Some(2.5),
        inflows,
        ..Tank::open(well, Shape::Upright { area }, 3.2, level)
    };
    Shift {
        starts: 0.0,
        lasts: DAY,
        report_every: Some(300.0),
        tanks: vec![tank],
        schedules: vec![dry_inflow(), storm_inflow()],
        tariff: Some(tariff()),
        ..Shift::default()
    }
}

pub fn plan(meadow: &Meadow, steps: &[(f64, f64)], rotate: Rotate) -> Plan {
    let well = meadow.network.find_node("wet_well").unwrap();
    let steps: Vec<Step> = steps
        .iter()
        .map(|&(start, stop)| Step { start, stop })
        .collect();
    let bands = Bands {
        follow: Follow::Level(well),
        steps,
        windows: Vec::new(),
        up_delay: 0.0,
        down_delay: 0.0,
    };
    let mut group = Group::new("lift", meadow.pumps.clone(), Call::Bands(bands));
    group.rotate = rotate;
    Plan {
        name: "bands".to_owned(),
        groups: vec![group],
        ..Plan::default()
    }
}

pub const WIDE_COMMON: [(f64, f64); 3] = [(1.5, 0.9), (1.8, 0.9), (2.1, 0.9)];
pub const WIDE_STEPPED: [(f64, f64); 3] = [(1.5, 0.9), (1.8, 1.2), (2.1, 1.5)];
pub const NARROW: [(f64, f64); 3] = [(1.15, 0.9), (1.35, 1.1), (1.55, 1.3)];

/// The peak-hour window of the tariff hold: starts 0.35 m higher.
pub fn hold_peak(plan: &mut Plan) {
    let Call::Bands(bands) = &mut plan.groups[0].call else {
        return;
    };
    let steps = bands.steps.iter().map(|step| Step {
        start: step.start + 0.35,
        stop: step.stop,
    });
    bands.windows.push(Window {
        daily: Daily {
            from: 17.0 * 3600.0,
            to: 21.0 * 3600.0,
        },
        steps: steps.collect(),
    });
}

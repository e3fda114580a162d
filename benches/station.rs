//! The station that is timed here and by the NumPy/SciPy peer: four pumps in parallel, 12 lines, 6 unknown heads.
//!
//! Invented data. Source, suction main, suction header `s`; four pump lines with check valves to `d1`..`d4`; four discharge
//! pipes to the header `x`; two rising mains side by side to the sink; a recirculation line with an orifice from `x` back to `s`.

use dutybank::fluid::Fluid;
use dutybank::network::{Network, NetworkBuilder, NodeKind, PumpSetting};
use dutybank::part::Part;
use dutybank::part::curve::Curve;
use dutybank::part::friction::{Friction, Pipe};
use dutybank::part::pump::performance::Scaling;
use dutybank::part::pump::{PowerCurve, Pump, PumpModel};
use dutybank::part::quadratic::QuadraticLoss;

const G: f64 = 9.80665;
const NU: f64 = 1.0034e-6;

pub fn station() -> Network {
    let fluid = Fluid {
        density: 998.2,
        kinematic_viscosity: NU,
        vapour_pressure: Some(2339.0),
    };
    let mut net = NetworkBuilder::new(fluid, G, 101_325.0);
    let source = net.node("source", NodeKind::Reservoir, 0.0, 3.0);
    let sink = net.node("sink", NodeKind::Reservoir, 0.0, 24.0);
    let mut point = |name: String| net.node(name, NodeKind::Point { elevation: 0.0 }, 0.0, 0.0);
    let (s, x) = (point("s".into()), point("x".into()));
    let d: Vec<_> = (1..=4).map(|k| point(format!("d{k}"))).collect();
    let pipe = |length: f64, bore: f64| {
        let friction = Friction::roughness(length, bore, 1e-4, NU, G);
        Part::Pipe(Pipe {
            length,
            bore,
            friction,
        })
    };
    net.line("suction_main", source, s, vec![pipe(30.0, 0.4)]);
    let flow = [0.0, 0.02, 0.04, 0.06, 0.08, 0.1];
    let head = [44.0, 43.2, 40.8, 36.8, 31.2, 24.0];
    let model = net.model(PumpModel {
        name: "P".into(),
        speed: None,
        impeller: None,
        head: Curve::through(&flow, &head).unwrap(),
        power: PowerCurve::Unknown,
        npsh_required: None,
        best_efficiency_flow: Some(0.07),
        motor: None,
        drive: None,
        maker: dutybank::part::pump::MakerLimits::default(),
        scaling: Scaling::default(),
    });
    for (k, &d) in d.iter().enumerate() {
        let setting = PumpSetting {
            wear: 0.02 * k as f64,
            ..PumpSetting::NEW
        };
        let name = format!("pump.{}", k + 1);
        let pump = Pump {
            name: name.clone(),
            model,
            elevation: 0.0,
            elevation_given: true,
            when_stopped: None,
        };
        let pump = Part::Pump(net.pump(pump, setting));
        let check = Part::CheckValve(QuadraticLoss::minor(2.0, 0.2, G));
        net.line(name, s, d, vec![pipe(3.0, 0.2), pump, check]);
    }
    for (k, &d) in d.iter().enumerate() {
        net.line(
            format!("discharge.{}", k + 1),
            d,
            x,
            vec![pipe(8.0 + k as f64, 0.2)],
        );
    }
    net.line("main.1", x, sink, vec![pipe(900.0, 0.35)]);
    net.line("main.2", x, sink, vec![pipe(900.0, 0.3)]);
    let orifice = Part::Loss(QuadraticLoss::minor(150.0, 0.1, G));
    net.line("recirculation", x, s, vec![pipe(20.0, 0.1), orifice]);
    net.build().unwrap()
}

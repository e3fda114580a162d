//! Pumps side by side and one after the other: what holds whatever their curves.

use dutybank::fluid::Fluid;
use dutybank::network::{LineId, Network, NetworkBuilder, NodeId, NodeKind, PumpSetting};
use dutybank::part::Part;
use dutybank::part::curve::Curve;
use dutybank::part::friction::{Friction, Pipe};
use dutybank::part::pump::performance::Scaling;
use dutybank::part::pump::{PowerCurve, Pump, PumpModel};
use dutybank::part::quadratic::QuadraticLoss;
use dutybank::solve::Solver;
use proptest::prelude::*;

use crate::random;

const GRAVITY: f64 = 9.80665;

/// Invented: a falling curve by shut-off head (m), end of curve (m3/s), share of head lost there and power of the fall.
#[derive(Clone, Copy, Debug)]
struct Shape {
    shutoff: f64,
    end: f64,
    fall: f64,
    power: f64,
}

fn shape() -> impl Strategy<Value = Shape> {
    (5.0..60.0, 0.01..0.2, 0.3..0.9, 1.2..2.6).prop_map(|(shutoff, end, fall, power)| Shape {
        shutoff,
        end,
        fall,
        power,
    })
}

struct Maker {
    net: NetworkBuilder,
    fluid: Fluid,
}

impl Maker {
    fn new() -> Self {
        let fluid = Fluid::water(293.15).unwrap();
        Self {
            net: NetworkBuilder::new(fluid, GRAVITY, 101_325.0),
            fluid,
        }
    }

    fn reservoir(&mut self, name: &str, level: f64) -> NodeId {
        self.net.node(name, NodeKind::Reservoir, 0.0, level)
    }

    fn point(&mut self, name: &str) -> NodeId {
        let kind = NodeKind::Point { elevation: 0.0 };
        self.net.node(name, kind, 0.0, 0.0)
    }

    fn pump(&mut self, name: &str, shape: Shape) -> Part {
        let flow: Vec<f64> = (0..6).map(|i| shape.end * f64::from(i) / 5.0).collect();
        let fall = |q: f64| shape.fall * (q / shape.end).powf(shape.power);
        let head: Vec<f64> = flow
            .iter()
            .map(|q| shape.shutoff * (1.0 - fall(*q)))
            .collect();
        let model = self.net.model(PumpModel {
            name: format!("model of {name}"),
            speed: None,
            impeller: None,
            head: Curve::through(&flow, &head).unwrap(),
            power: PowerCurve::Unknown,
            npsh_required: None,
            best_efficiency_flow: None,
            motor: None,
            drive: None,
            maker: dutybank::part::pump::MakerLimits::default(),
            scaling: Scaling::default(),
        });
        let pump = Pump {
            name: name.into(),
            model,
            elevation: 0.0,
            elevation_given: true,
            when_stopped: None,
        };
        Part::Pump(self.net.pump(pump, PumpSetting::NEW))
    }

    fn pipe(&self, length: f64, bore: f64) -> Part {
        let viscosity = self.fluid.kinematic_viscosity;
        let friction = Friction::roughness(length, bore, 1e-4, viscosity, GRAVITY);
        Part::Pipe(Pipe {
            length,
            bore,
            friction,
        })
    }

    fn bank(&mut self, count: usize, from: NodeId, to: NodeId, shape: Shape) -> Vec<LineId> {
        (0..count)
            .map(|i| {
                let name = format!("duty.{i}");
                let pump = self.pump(&name, shape);
                let check = Part::CheckValve(QuadraticLoss::minor(2.0, 0.2, GRAVITY));
                let parts = vec![self.pipe(6.0, 0.2), pump, check];
                self.net.line(name, from, to, parts)
            })
            .collect()
    }

    fn build(self) -> Network {
        self.net.build().unwrap()
    }
}

fn close(a: f64, b: f64, relative: f64) -> bool {
    (a - b).abs() <= relative * a.abs().max(b.abs()) + 1e-12
}

proptest! {
    #![proptest_config(random::cases(200))]

    /// Seen from a header, n equal pumps are n times one pump at the head that stands there.
    #[test]
    fn n_equal_pumps_carry_n_times_one(
        shape in shape(),
        count in 1_usize..7,
        lift in -5.0..30.0,
        length in 10.0..3000.0,
    ) {
        let mut maker = Maker::new();
        let pond = maker.reservoir("pond", 1.0);
        let header = maker.point("header");
        let tower = maker.reservoir("tower", lift);
        let lines = maker.bank(count, pond, header, shape);
        let main = maker.pipe(length, 0.3);
        let main = maker.net.line("main", header, tower, vec![main]);
        let network = maker.build();
        let mut solver = Solver::new(&network);
        let together = solver.solve(network.settings()).unwrap();
        let total = together.flow(main);
        for line in &lines {
            prop_assert!(close(count as f64 * together.flow(*line), total, 1e-9));
        }

        let mut maker = Maker::new();
        let pond = maker.reservoir("pond", 1.0);
        let header = maker.reservoir("header", together.head(header).unwrap());
        let lines = maker.bank(1, pond, header, shape);
        let network = maker.build();
        let alone = Solver::new(&network).solve(network.settings()).unwrap().flow(lines[0]);
        // A flow just above none is known no better than the square root of the head's last digits.
        prop_assert!(close(count as f64 * alone, total, 1e-6), "{alone} {total}");
    }

    /// Two pumps in one line are the same two in two lines with a point between, where the first one's head stands.
    #[test]
    fn two_in_series_add_head(
        first in shape(),
        second in shape(),
        lift in 0.0..40.0,
        length in 10.0..3000.0,
    ) {
        let mut maker = Maker::new();
        let pond = maker.reservoir("pond", 1.0);
        let tower = maker.reservoir("tower", lift);
        let parts = vec![maker.pump("a", first), maker.pump("b", second), maker.pipe(length, 0.25)];
        let line = maker.net.line("line", pond, tower, parts);
        let network = maker.build();
        let one_line = Solver::new(&network).solve(network.settings()).unwrap().flow(line);

        let mut maker = Maker::new();
        let pond = maker.reservoir("pond", 1.0);
        let between = maker.point("between");
        let after = maker.point("after");
        let tower = maker.reservoir("tower", lift);
        let (a, b, pipe) = (maker.pump("a", first), maker.pump("b", second), maker.pipe(length, 0.25));
        let a = maker.net.line("a", pond, between, vec![a]);
        maker.net.line("b", between, after, vec![b]);
        maker.net.line("pipe", after, tower, vec![pipe]);
        let network = maker.build();
        let mut solver = Solver::new(&network);
        let apart = solver.solve(network.settings()).unwrap();
        prop_assert!(close(one_line, apart.flow(a), 1e-7), "{one_line} {}", apart.flow(a));
        let head = |pump: usize, q: f64| network.models()[pump].head.at(q).value;
        let gained = apart.head(after).unwrap() - 1.0;
        let sum = head(0, one_line) + head(1, one_line);
        prop_assert!((gained - sum).abs() <= 1e-6 * (1.0 + sum.abs()), "{gained} {sum}");
    }

    /// A pump beside a stronger one is held shut by its check valve when the header stands above its shut-off head, and
    /// carries nothing back.
    #[test]
    fn a_check_valve_holds_the_weaker_pump(
        strong in shape(),
        weak in shape(),
        lift in 0.0..60.0,
        length in 10.0..3000.0,
    ) {
        let mut maker = Maker::new();
        let pond = maker.reservoir("pond", 0.0);
        let header = maker.point("header");
        let tower = maker.reservoir("tower", lift);
        let mut lines = Vec::new();
        for (name, shape) in [("strong", strong), ("weak", weak)] {
            let pump = maker.pump(name, shape);
            let check = Part::CheckValve(QuadraticLoss::minor(2.0, 0.2, GRAVITY));
            lines.push((maker.net.line(name, pond, header, vec![pump, check]), shape));
        }
        let main = maker.pipe(length, 0.25);
        maker.net.line("main", header, tower, vec![main]);
        let network = maker.build();
        let mut solver = Solver::new(&network);
        let solution = solver.solve(network.settings()).unwrap();
        let head = solution.head(header).unwrap();
        for (line, shape) in lines {
            let q = solution.flow(line);
            prop_assert!(q >= 0.0);
            if head > shape.shutoff + 1e-7 {
                prop_assert_eq!(q, 0.0);
            } else if head < shape.shutoff - 1e-7 {
                prop_assert!(q > 0.0);
            }
        }
    }
}

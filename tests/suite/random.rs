//! Seeded random networks: stations with unequal pumps, banks, check valves, loops, dead ends, outlets, draws.
//!
//! All data invented.

use dutybank::fluid::Fluid;
use dutybank::network::{Network, NetworkBuilder, NodeId, NodeKind, PumpSetting, ValveSetting};
use dutybank::part::Part;
use dutybank::part::curve::Curve;
use dutybank::part::friction::{Friction, Pipe};
use dutybank::part::pump::performance::Scaling;
use dutybank::part::pump::{Efficiency, Motor, PowerCurve, Pump, PumpModel};
use dutybank::part::quadratic::QuadraticLoss;
use dutybank::part::valve::{Characteristic, Valve};

pub const GRAVITY: f64 = 9.80665;

/// SplitMix64 (G. L. Steele, D. Lea, C. H. Flood, "Fast splittable pseudorandom number generators", OOPSLA 2014).
#[derive(Clone)]
pub struct Random(pub u64);

impl Random {
    pub fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    pub fn unit(&mut self) -> f64 {
        (self.bits() >> 11) as f64 / (1u64 << 53) as f64
    }

    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.unit()
    }

    /// Evenly over the logarithm.
    pub fn decades(&mut self, low: f64, high: f64) -> f64 {
        low * (high / low).powf(self.unit())
    }

    pub fn below(&mut self, n: usize) -> usize {
        (self.unit() * n as f64) as usize
    }

    pub fn chance(&mut self, p: f64) -> bool {
        self.unit() < p
    }
}

/// How many of something to look at: ten times as many as usual with `DUTYBANK_LONG=1`.
pub fn many(usual: u64) -> u64 {
    if std::env::var_os("DUTYBANK_LONG").is_some() {
        10 * usual
    } else {
        usual
    }
}

/// The same cases every time.
pub fn cases(usual: u64) -> proptest::test_runner::Config {
    proptest::test_runner::Config {
        cases: many(usual) as u32,
        rng_seed: proptest::test_runner::RngSeed::Fixed(1),
        failure_persistence: None,
        ..Default::default()
    }
}

/// How far from ordinary practice a network may go.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Range {
    /// Bores, lengths and heads as stations have them.
    Ordinary,
    /// Bores from 5 mm to 3 m, lengths from 10 mm to 50 km, oil, equal heads, huge and tiny draws.
    Wild,
}

/// A random network of about `lines` lines.
pub fn network(seed: u64, lines: usize, range: Range) -> Network {
    let mut random = Random(seed);
    let wild = range == Range::Wild;
    let fluid = if wild && random.chance(0.2) {
        Fluid {
            density: 880.0,
            kinematic_viscosity: random.decades(1e-5, 1e-3),
            vapour_pressure: Some(10.0),
        }
    } else {
        Fluid::water(random.between(278.15, 333.15)).unwrap()
    };
    let mut build = Maker {
        random,
        wild,
        fluid,
        net: NetworkBuilder::new(fluid, GRAVITY, 101_325.0),
        lines: 0,
    };
    build.nodes_and_lines(lines);
    build.net.build().unwrap()
}

struct Maker {
    random: Random,
    wild: bool,
    fluid: Fluid,
    net: NetworkBuilder,
    lines: usize,
}

impl Maker {
    fn nodes_and_lines(&mut self, wanted: usize) {
        let count = 2 + self.random.below(wanted.max(1));
        let level = self.random.between(0.0, 10.0);
        let mut nodes = vec![self.net.node("n0", NodeKind::Reservoir, 0.0, level)];
        for i in 1..count {
            let node = self.node(i);
            nodes.push(node);
            let other = nodes[self.random.below(i)];
            self.line_or_bank(other, node);
        }
        while self.lines < wanted && count > 2 {
            let (a, b) = (
                nodes[self.random.below(count)],
                nodes[self.random.below(count)],
            );
            if a != b {
                self.line_or_bank(a, b);
            }
        }
    }

    fn node(&mut self, i: usize) -> NodeId {
        let name = format!("n{i}");
        let random = &mut self.random;
        match random.below(10) {
            0 => {
                let level = if self.wild && random.chance(0.3) {
                    5.0
                } else {
                    random.between(0.0, 50.0)
                };
                self.net.node(name, NodeKind::Reservoir, 0.0, level)
            }
            1 => self.net.node(
                name,
                NodeKind::Outlet {
                    elevation: random.between(0.0, 30.0),
                },
                0.0,
                0.0,
            ),
            2 => {
                let floor = random.between(0.0, 20.0);
                self.net.node(
                    name,
                    NodeKind::Tank { floor },
                    0.0,
                    random.between(0.0, 4.0),
                )
            }
            _ => {
                let size = if self.wild {
                    random.decades(1e-9, 1.0)
                } else {
                    random.decades(1e-4, 2e-2)
                };
                let draw = match random.below(6) {
                    0 => size,
                    1 => -0.3 * size,
                    _ => 0.0,
                };
                self.net.node(
                    name,
                    NodeKind::Point {
                        elevation: random.between(0.0, 10.0),
                    },
                    draw,
                    0.0,
                )
            }
        }
    }

    /// Usually one line; sometimes a bank of equal or unequal pumps with check valves.
    fn line_or_bank(&mut self, from: NodeId, to: NodeId) {
        if self.random.chance(0.2) {
            let equal = self.random.chance(0.5);
            let model = self.model();
            for _ in 0..1 + self.random.below(4) {
                let model = if equal { model } else { self.model() };
                let mut parts = vec![self.pipe(), self.pump(model, 0.0)];
                parts.push(Part::CheckValve(QuadraticLoss::minor(
                    self.random.between(0.0, 3.0),
                    0.15,
                    GRAVITY,
                )));
                self.line(from, to, parts);
            }
            return;
        }
        let mut parts = Vec::new();
        if self.random.chance(0.85) {
            parts.push(self.pipe());
        }
        if parts.is_empty() || self.random.chance(0.4) {
            let bore = self.bore();
            parts.push(Part::Loss(QuadraticLoss::minor(
                self.random.between(0.1, 20.0),
                bore,
                GRAVITY,
            )));
        }
        if self.random.chance(0.1) {
            parts.push(self.valve());
        }
        if self.random.chance(0.15) {
            let model = self.model();
            let pump = self.pump(model, 0.1);
            parts.push(pump);
        }
        if self.random.chance(0.2) {
            parts.push(Part::CheckValve(QuadraticLoss::minor(
                self.random.between(0.0, 3.0),
                0.2,
                GRAVITY,
            )));
        }
        self.line(from, to, parts);
    }

    fn line(&mut self, from: NodeId, to: NodeId, parts: Vec<Part>) {
        self.net.line(format!("l{}", self.lines), from, to, parts);
        self.lines += 1;
    }

    fn bore(&mut self) -> f64 {
        if self.wild {
            self.random.decades(0.005, 3.0)
        } else {
            self.random.between(0.08, 0.5)
        }
    }

    fn pipe(&mut self) -> Part {
        let bore = self.bore();
        let random = &mut self.random;
        let length = if self.wild {
            random.decades(0.01, 5e4)
        } else {
            random.decades(1.0, 3000.0)
        };
        let friction = match random.below(8) {
            0 => Friction::hazen_williams(length, bore, random.between(80.0, 150.0)),
            1 => Friction::fixed_factor(length, bore, random.between(0.01, 0.04), GRAVITY),
            _ => {
                let roughness = if random.chance(0.1) {
                    0.0
                } else {
                    bore * random.decades(1e-6, 0.03)
                };
                Friction::roughness(
                    length,
                    bore,
                    roughness,
                    self.fluid.kinematic_viscosity,
                    GRAVITY,
                )
            }
        };
        Part::Pipe(Pipe {
            length,
            bore,
            friction,
        })
    }

    fn valve(&mut self) -> Part {
        let fully_open = QuadraticLoss::minor(self.random.between(0.1, 10.0), 0.2, GRAVITY);
        let characteristic = if self.random.chance(0.5) {
            Characteristic::Linear
        } else {
            Characteristic::EqualPercentage
        };
        let setting = ValveSetting {
            open: self.random.chance(0.8),
            opening: self.random.between(0.02, 1.0),
        };
        Part::Valve(self.net.valve(
            Valve {
                fully_open,
                characteristic,
            },
            setting,
        ))
    }

    fn model(&mut self) -> usize {
        let random = &mut self.random;
        let shutoff = random.between(5.0, 60.0);
        let end = random.decades(0.005, 0.2);
        let power = random.between(1.2, 2.6);
        let fall = random.between(0.3, 0.9);
        let points = 4 + random.below(6);
        let flow: Vec<f64> = (0..points)
            .map(|i| end * i as f64 / (points - 1) as f64)
            .collect();
        let head: Vec<f64> = flow
            .iter()
            .map(|q| shutoff * (1.0 - fall * (q / end).powf(power)))
            .collect();
        let efficiency: Vec<f64> = flow
            .iter()
            .map(|q| 3.1 * (q / end) * (1.0 - 0.72 * q / end))
            .collect();
        let name = format!("m{}", self.random.bits());
        self.net.model(PumpModel {
            name,
            speed: Some(24.0),
            impeller: None,
            head: Curve::through(&flow, &head).unwrap(),
            power: PowerCurve::Efficiency(Curve::through(&flow, &efficiency).unwrap()),
            npsh_required: None,
            best_efficiency_flow: Some(0.7 * end),
            motor: Some(Motor {
                rated: 2e4,
                efficiency: Some(Efficiency::Fixed(0.92)),
            }),
            drive: None,
            maker: dutybank::part::pump::MakerLimits::default(),
            scaling: Scaling::default(),
        })
    }

    fn pump(&mut self, model: usize, stopped_open: f64) -> Part {
        let random = &mut self.random;
        let setting = PumpSetting {
            running: random.chance(0.8),
            speed: if random.chance(0.5) {
                1.0
            } else {
                random.between(0.4, 1.1)
            },
            trim: 1.0,
            wear: if random.chance(0.7) {
                0.0
            } else {
                random.between(0.0, 0.3)
            },
            ..PumpSetting::NEW
        };
        let when_stopped = random
            .chance(stopped_open)
            .then(|| QuadraticLoss::minor(random.between(5.0, 50.0), 0.15, GRAVITY));
        let name = format!("p{}", random.bits());
        let pump = Pump {
            name,
            model,
            elevation: 0.0,
            elevation_given: true,
            when_stopped,
        };
        Part::Pump(self.net.pump(pump, setting))
    }
}

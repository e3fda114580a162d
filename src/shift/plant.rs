//! The right side of the equations of the run: given the time and the volumes, what flows where.
//!
//! Within one stretch between events the modes of the tanks, who runs and which way the schedules go are fixed; check valves,
//! outlets and ports are solved for at every evaluation, and one that changed is told as a flip.

mod balance;

use super::books::Books;
use super::energy::shaft_power;
use super::hold::Holding;
use super::plan::{Follow, Shift, Varying};
use crate::network::{End, LineId, Network, NodeId, Settings};
use crate::part::regulator::RegulatorState;
use crate::solve::{LineState, Solution, SolveError, Solver};

/// Which of the solvers: the run's own; the one for reports, so that reporting does not touch the run; and the one for
/// looking at places that the run may never come to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Side {
    Run,
    Report,
    Trial,
}

/// What a tank does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Mode {
    /// Its level moves.
    Free,
    /// Empty: passes on only what flows in.
    Floor,
    /// Full: spills what is left over.
    Brim,
}

/// Flow (m3/s) below which a balance counts as even.
pub(super) const STILL: f64 = 1e-12;

/// A flow that goes straight until the next corner of a schedule.
#[derive(Clone, Copy, Debug, Default)]
struct StraightFlow {
    value: f64,
    slope: f64,
    since: f64,
}

impl StraightFlow {
    fn at(&self, t: f64) -> f64 {
        self.value + self.slope * (t - self.since)
    }
}

/// A tank's place in the network and its present mode.
pub(super) struct TankState {
    pub node: NodeId,
    pub mode: Mode,
    pub capacity: f64,
    /// Volume at which nothing can leave any more: below all ports, if nobody else draws from it.
    pub floor: f64,
    pub start_volume: f64,
    /// Lines that end here, with +1 where forward flow comes in.
    joins: Vec<(LineId, f64)>,
    inflow: StraightFlow,
    draw: StraightFlow,
    passing: bool,
    /// How much more (m3/s) flows in than out while it is at its floor or brim, the sign such that above zero it leaves.
    pub leaving: f64,
}

struct PointState {
    node: NodeId,
    draw: StraightFlow,
    /// Its draw cannot be met at present.
    cut: bool,
}

pub(super) struct Plant<'a> {
    pub network: &'a Network,
    pub shift: &'a Shift,
    pub books: Books,
    pub settings: Settings,
    pub tanks: Vec<TankState>,
    points: Vec<PointState>,
    pub holds: Vec<Holding>,
    /// The followed figure of each group that does not follow a level.
    pub follows: Vec<Option<Follow>>,
    pub figures: Vec<f64>,
    /// Per line: its state when the stretch began.
    pub reference: Vec<u8>,
    /// Per line: not looked at for flips.
    pub ignored: Vec<bool>,
    /// The first line that is no longer as it was when the stretch began.
    pub flip: Option<LineId>,
    solvers: [Solver<'a>; 3],
    /// Solves done for the run itself.
    pub solves: u64,
}

impl<'a> Plant<'a> {
    pub fn new(network: &'a Network, shift: &'a Shift, follows: Vec<Option<Follow>>) -> Self {
        let settings = network.settings().clone();
        let joins = |node: NodeId| {
            let sign = |line: LineId| match network.line(line) {
                ends if ends.to == node => Some((line, 1.0)),
                ends if ends.from == node => Some((line, -1.0)),
                _ => None,
            };
            network.line_ids().filter_map(sign).collect()
        };
        let tanks = shift
            .tanks
            .iter()
            .map(|tank| TankState {
                node: tank.node,
                mode: Mode::Free,
                capacity: tank.capacity(),
                floor: if tank.draws.is_empty() {
                    tank.shape.volume(lowest_port(network, tank.node))
                } else {
                    0.0
                },
                start_volume: tank.shape.volume(tank.level),
                joins: joins(tank.node),
                inflow: StraightFlow::default(),
                draw: StraightFlow::default(),
                passing: false,
                leaving: 0.0,
            })
            .collect();
        let points = network
            .node_ids()
            .filter(|id| network.is_point(*id))
            .map(|node| PointState {
                node,
                draw: StraightFlow::default(),
                cut: false,
            })
            .collect();
        let lines = network.lines().len();
        Self {
            network,
            shift,
            books: Books {
                tanks: shift.tanks.len(),
                pumps: network.pumps().len(),
            },
            settings,
            tanks,
            points,
            holds: Vec::new(),
            figures: vec![f64::NAN; follows.len()],
            follows,
            reference: vec![0; lines],
            ignored: vec![false; lines],
            flip: None,
            solvers: std::array::from_fn(|_| Solver::new(network)),
            solves: 0,
        }
    }

    /// The last answer on a side.
    pub fn answer(&self, side: Side) -> &Solution {
        self.solvers[side as usize].last()
    }

    /// Takes the schedules' values and slopes just after `t`, and tries again what could not be met.
    pub fn refresh(&mut self, t: f64) {
        let shift = self.shift;
        let straight = |flows: &[Varying]| {
            let mut sum = StraightFlow {
                since: t,
                ..StraightFlow::default()
            };
            for flow in flows {
                let (value, slope) = flow
                    .times
                    .map_or((1.0, 0.0), |i| shift.schedules[i].at(shift.starts + t));
                sum.value += flow.rate * value;
                sum.slope += flow.rate * slope;
            }
            sum
        };
        for (state, tank) in self.tanks.iter_mut().zip(&shift.tanks) {
            state.inflow = straight(&tank.inflows);
            state.draw = straight(&tank.draws);
        }
        for point in &mut self.points {
            let mut draws = shift.draws.iter().filter(|draw| draw.node == point.node);
            point.cut = false;
            point.draw = match draws.next() {
                Some(first) => draws.fold(straight(&[first.draw]), |mut sum, next| {
                    let next = straight(&[next.draw]);
                    sum.value += next.value;
                    sum.slope += next.slope;
                    sum
                }),
                None => StraightFlow {
                    value: self.network.settings().draw(point.node),
                    ..StraightFlow::default()
                },
            };
        }
    }

    /// The next time after `t` at which a schedule turns.
    pub fn next_corner(&self, t: f64) -> f64 {
        let starts = self.shift.starts;
        let corner = |flow: &Varying| {
            flow.times.map_or(f64::INFINITY, |i| {
                self.shift.schedules[i].next_corner(starts + t) - starts
            })
        };
        let tanks = self
            .shift
            .tanks
            .iter()
            .flat_map(|tank| tank.inflows.iter().chain(&tank.draws));
        let draws = self.shift.draws.iter().map(|draw| &draw.draw);
        tanks.chain(draws).map(corner).fold(f64::INFINITY, f64::min)
    }

    /// Points whose draw cannot be met at present.
    pub fn cut_points(&self) -> impl Iterator<Item = NodeId> + '_ {
        self.points
            .iter()
            .filter(|point| point.cut)
            .map(|point| point.node)
    }

    /// Level of tank `i` at a volume, m.
    pub fn level(&self, i: usize, volume: f64) -> f64 {
        self.shift.tanks[i].shape.level(volume)
    }

    /// Rates of all sums at time `t` with the volumes `y`.
    ///
    /// # Errors
    /// The network has no answer.
    pub fn evaluate(
        &mut self,
        side: Side,
        t: f64,
        y: &[f64],
        rates: &mut [f64],
    ) -> Result<(), SolveError> {
        self.place(t, y);
        if self.holds.iter().any(Holding::works) {
            self.balance_held(side, t)?;
        } else {
            self.balance(side, t)?;
        }
        self.look(side);
        self.rate(side, t, rates);
        Ok(())
    }

    /// Puts levels, gas pressures and draws into the settings.
    fn place(&mut self, t: f64, y: &[f64]) {
        for ((state, tank), &volume) in self.tanks.iter_mut().zip(&self.shift.tanks).zip(y) {
            self.settings
                .set_level(state.node, tank.shape.level(volume));
            let gas = tank
                .gas
                .pressure(volume, state.start_volume, self.network.barometer());
            self.settings.set_gas_pressure(state.node, gas);
        }
        for point in &self.points {
            let draw = if point.cut { 0.0 } else { point.draw.at(t) };
            self.settings.set_draw(point.node, draw);
        }
    }

    /// Net flow into tank `i` in the last answer of a side, m3/s.
    pub(super) fn net_flow(&self, side: Side, t: f64, i: usize) -> f64 {
        let tank = &self.tanks[i];
        let (into, out) = line_flows(self.solvers[side as usize].last(), &tank.joins);
        into + tank.inflow.at(t) - out - tank.draw.at(t)
    }

    /// The value of a figure in the last answer of a side; NaN where it does not exist.
    pub(super) fn figure(&self, side: Side, follow: Follow) -> f64 {
        let answer = self.solvers[side as usize].last();
        match follow {
            Follow::Level(node) => self.settings.level(node),
            Follow::Pressure(node) => answer.head(node).map_or(f64::NAN, |head| {
                self.network.pressure(node, head, &self.settings)
            }),
            Follow::Flow(line) => answer.flow(line),
        }
    }

    /// Reads followed figures and line states off the answer.
    fn look(&mut self, side: Side) {
        for g in 0..self.follows.len() {
            if let Some(follow) = self.follows[g] {
                self.figures[g] = self.figure(side, follow);
            }
        }
        self.flip = None;
        for line in self.network.line_ids() {
            if !self.ignored[line.index()]
                && self.condition(side, line) != self.reference[line.index()]
            {
                self.flip = Some(line);
                break;
            }
        }
    }

    /// Makes the present states of the lines those that the stretch began with.
    pub fn set_reference(&mut self) {
        for line in self.network.line_ids() {
            self.reference[line.index()] = self.condition(Side::Run, line);
        }
        self.flip = None;
    }

    /// A line is held shut, carries water, has its first or its last port above the surface: bits of [`Self::condition`].
    pub const SHUT: u8 = 1;
    pub const OPEN: u8 = 2;
    pub const FROM_ABOVE: u8 = 4;
    pub const TO_ABOVE: u8 = 8;
    /// The first of the line's regulating parts that throttles, counted from one, times this.
    pub const REGULATES: u8 = 16;

    /// What a line does and which of its ports stand above a surface, in one number.
    pub fn condition(&self, side: Side, line: LineId) -> u8 {
        let state = match self.solvers[side as usize].last().state(line) {
            LineState::Checked => Self::SHUT,
            LineState::Open => Self::OPEN,
            LineState::Closed | LineState::Stopped => 0,
        } | self.regulating(side, line);
        if self.network.line(line).ports == [None, None] {
            return state;
        }
        let above = |end, bit| match self.network.above_surface(line, end, &self.settings) {
            Some(_) => bit,
            None => 0,
        };
        state | above(End::From, Self::FROM_ABOVE) | above(End::To, Self::TO_ABOVE)
    }

    fn regulating(&self, side: Side, line: LineId) -> u8 {
        let answer = self.solvers[side as usize].last();
        let mut parts = self.network.line(line).regulators();
        let throttles = |id| answer.regulation(id).state == RegulatorState::Regulating;
        parts
            .position(throttles)
            .map_or(0, |place| (place as u8 + 1) * Self::REGULATES)
    }

    fn rate(&self, side: Side, t: f64, rates: &mut [f64]) {
        let books = self.books;
        let answer = self.solvers[side as usize].last();
        for (i, tank) in self.tanks.iter().enumerate() {
            let (into, out) = line_flows(answer, &tank.joins);
            let into = into + tank.inflow.at(t);
            let draw = tank.draw.at(t);
            let (mut out, mut spilled, mut unmet) = (out + draw, 0.0, 0.0);
            match tank.mode {
                Mode::Free => {}
                Mode::Brim => spilled = (into - out).max(0.0),
                Mode::Floor if out > into => {
                    unmet = (out - into).min(draw);
                    out = into;
                }
                Mode::Floor => {}
            }
            rates[books.volume(i)] = into - out - spilled;
            rates[books.inflow(i)] = into;
            rates[books.outflow(i)] = out;
            rates[books.spilled(i)] = spilled;
            rates[books.unmet(i)] = unmet;
        }
        let cut = |sign: f64| -> f64 {
            let cut = self.points.iter().filter(|point| point.cut);
            cut.map(|point| (sign * point.draw.at(t)).max(0.0)).sum()
        };
        rates[books.point_unmet()] = cut(1.0);
        rates[books.point_spilled()] = cut(-1.0);
        let mut total = 0.0;
        for pump in self.network.pump_ids() {
            let i = pump.index();
            let q = answer.flow(self.network.line_of(pump));
            let shaft = shaft_power(self.network, &self.settings, pump, q);
            let speed = self.settings.pump(pump).speed;
            let model = self.network.model(pump);
            let electrical = shaft.and_then(|shaft| model.electrical_power(shaft, speed));
            let electrical = match electrical {
                None if !self.settings.pump(pump).running => 0.0,
                other => other.unwrap_or(f64::NAN),
            };
            rates[books.pumped(i)] = if self.settings.pump(pump).running {
                q
            } else {
                0.0
            };
            rates[books.shaft_energy(i)] = shaft.unwrap_or(f64::NAN);
            rates[books.energy(i)] = electrical;
            total += electrical;
        }
        rates[books.total_energy()] = total;
    }
}

/// The lowest end of a line at a tank, m above its floor.
fn lowest_port(network: &Network, node: NodeId) -> f64 {
    let lines = network.lines().iter();
    let ends = lines.flat_map(|line| [(line.from, line.ports[0]), (line.to, line.ports[1])]);
    let heights = ends
        .filter(|end| end.0 == node)
        .map(|end| end.1.unwrap_or(0.0));
    heights.min_by(f64::total_cmp).unwrap_or(0.0)
}

/// Sums of what lines bring to a tank and take from it, m3/s.
fn line_flows(answer: &Solution, joins: &[(LineId, f64)]) -> (f64, f64) {
    let (mut into, mut out) = (0.0, 0.0);
    for &(line, sign) in joins {
        let q = sign * answer.flow(line);
        if q > 0.0 {
            into += q;
        } else {
            out -= q;
        }
    }
    (into, out)
}

//! Regulating parts: the further losses at which every one of them is content.
//!
//! With its further losses `s` given, a network is a plain one whose one-way lines start later: both paths, islands and
//! floating sets serve as they are, and its answer is unique. What is left is a complementarity problem as large as there
//! are lines with regulating parts,
//!
//! ```text
//! s_i >= 0,   room_i(s) >= 0,   one of them zero while line i flows
//! ```
//!
//! *Outer steps*: a primal–dual active set. At the balance for the present `s`, units with more loss than room are ruled (their
//! room is to become zero), the others open wide or stay shut. With these states frozen a Newton iteration on heads, flows and
//! losses together finds the balance that they ask for: one solve with the factorised heads system per ruled unit, and a small
//! dense system in the changes `u` of the losses,
//!
//! ```text
//! A u = -room - (what comes of the rest),   A_ij = d room_i / d s_j
//! ```
//!
//! Then the network is balanced with the losses found, one-way lines free again, and the wishes are looked at anew.
//!
//! *Certain path*: opening one part further never lessens what it feels (the inverse of a heads system has its largest entry
//! of each column on the diagonal), so room_i rises with s_i and one part alone is found by bracketing, for certain. Several are bracketed in turn
//! until none moves, which is a nonlinear Gauss–Seidel method; outer steps from there finish.
//!
//! # Source
//! M. Hintermüller, K. Ito, K. Kunisch, "The primal-dual active set strategy as a semismooth Newton method", SIAM J. Optim. 13, 2002; J. M. Ortega, W. C. Rheinboldt,
//! "Iterative Solution of Nonlinear Equations in Several Variables", 1970, section 7.4 (Gauss–Seidel); M. Dowell, P. Jarratt, "A
//! modified regula falsi method", BIT 11, 1971 (the bracketing).

use super::newton::Effort;
use super::paths::Paths;
use super::response::{Response, solve_dense};
use super::system::{State, System};
use super::throttles::Felt;
use super::tolerance::HELD_HEAD;

/// Outer steps before the certain path is taken.
const LIMIT: u32 = 40;

/// Outer steps without a better state before that.
const PATIENCE: u32 = 6;

/// Iterations with the wishes as they are.
const FROZEN: u32 = 20;

/// Rounds of bracketing.
const ROUNDS: u32 = 30;

/// Balances of the certain path before it is given up.
const BALANCES: u32 = 5_000;

/// A loss beyond this went astray, m.
const ASTRAY: f64 = 1e6;

/// Loss beyond the verge of opening that keeps a line shut while others move, m: more than heads move in one step.
const FIRMLY: f64 = 1e3;

/// What a unit asks for at the present balance.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Wish {
    /// It is content.
    Stay,
    /// Its room is to become zero.
    Ruled,
    /// It is to add nothing.
    Open,
    /// It has no room and stands still: it is to stay shut whatever else moves.
    Shut,
    /// It stands still under its loss though it has room: it is to be ruled from the verge of opening.
    Reopen,
    /// It stands still, just so: content, but ready to flow when others move.
    Verge,
}

/// Scratch.
pub(super) struct Regulating {
    /// Per unit.
    wishes: Vec<Wish>,
    ruled: Vec<usize>,
    /// Of the ruled ones: the response of each one's room to each one's loss, by columns.
    matrix: Vec<f64>,
    right: Vec<f64>,
    /// Per unit: losses to go back to.
    kept: Vec<f64>,
    response: Response,
    pub(super) balances: u32,
}

impl Regulating {
    pub fn new(system: &System) -> Self {
        let units = system.throttles.lines.len();
        Self {
            wishes: vec![Wish::Stay; units],
            ruled: Vec::with_capacity(units),
            matrix: vec![0.0; units * units],
            right: vec![0.0; units],
            kept: vec![0.0; units],
            response: Response::new(system),
            balances: 0,
        }
    }

    /// Balances the network with every regulating part content; true if a certain path was needed. Whether they are
    /// content in the end, the certificate tells.
    pub fn settle(
        &mut self,
        paths: &mut Paths,
        system: &mut System,
        state: &mut State,
        effort: &mut Effort,
    ) -> bool {
        self.balances = 0;
        let mut certain = false;
        if self.steps(paths, system, state, effort, &mut certain) {
            return certain;
        }
        for unit in 0..system.throttles.lines.len() {
            system.throttle(unit, 0.0);
        }
        system.cold_start(state);
        for round in 0..ROUNDS {
            let moved = self.bracket_round(round, paths, system, state, effort);
            self.kept.copy_from_slice(&system.throttles.extra);
            if self.steps(paths, system, state, effort, &mut certain) {
                break;
            }
            for unit in 0..self.kept.len() {
                system.throttle(unit, self.kept[unit]);
            }
            if !moved || self.balances > BALANCES {
                break;
            }
        }
        true
    }

    /// Outer steps; true if all units came to be content.
    fn steps(
        &mut self,
        paths: &mut Paths,
        system: &mut System,
        state: &mut State,
        effort: &mut Effort,
        certain: &mut bool,
    ) -> bool {
        let (mut best, mut since_best) = (f64::INFINITY, 0);
        for _ in 0..LIMIT {
            *certain |= self.balance(paths, system, state, effort);
            let worst = self.look(system, state);
            if worst <= 1.0 {
                return true;
            }
            since_best = if worst < 0.9 * best {
                0
            } else {
                since_best + 1
            };
            best = best.min(worst);
            if !worst.is_finite() || since_best > PATIENCE || !self.step(system, state, effort) {
                return false;
            }
        }
        false
    }

    /// Balances the network with the present losses.
    pub(super) fn balance(
        &mut self,
        paths: &mut Paths,
        system: &mut System,
        state: &mut State,
        effort: &mut Effort,
    ) -> bool {
        self.balances += 1;
        let certain = paths.balance(system, state, effort);
        paths.settle(system, state);
        // What it feeds was filled no higher than it lets it: with that it holds itself shut.
        for unit in 0..system.throttles.lines.len() {
            let line = system.throttles.lines[unit];
            if system.throttles.acts[unit] && state.shut[line] {
                let push = system.push(state, line);
                if push > 0.0 {
                    system.throttle(unit, system.throttles.extra[unit] + push);
                }
            }
        }
        certain
    }

    /// Finds out what each unit wishes; returns how far the worst is from content, over its tolerance.
    fn look(&mut self, system: &System, state: &State) -> f64 {
        let throttles = &system.throttles;
        let mut worst: f64 = 0.0;
        for unit in 0..throttles.lines.len() {
            self.wishes[unit] = Wish::Stay;
            if !throttles.acts[unit] || throttles.leader[unit] != unit {
                continue;
            }
            if let Some(felt) = throttles.ruling(system, state, unit) {
                let (wish, off) = wish(system, state, unit, &felt);
                self.wishes[unit] = wish;
                // `max` passes a NaN over
                worst = if off.is_nan() { off } else { worst.max(off) };
            }
        }
        worst
    }

    /// One outer step: with the wishes as they are, a Newton iteration on heads, flows and losses together. False if that
    /// leads nowhere.
    fn step(&mut self, system: &mut System, state: &mut State, effort: &mut Effort) -> bool {
        self.prepare(system, state);
        let mut before = f64::INFINITY;
        for _ in 0..FROZEN {
            effort.iterations += 1;
            let Some(worst) = self.response.linearise(system, state, effort) else {
                return false;
            };
            let worst = self.ruled.iter().fold(worst, |worst, unit| {
                let felt = system.throttles.ruling(system, state, *unit);
                felt.map_or(worst, |felt| worst.max(felt.value.abs() / felt.tolerance))
            });
            // Rounding ends it, or a course that leads away.
            let done = worst <= 1.0 || worst < 1e4 && worst >= before;
            if done {
                break;
            }
            before = worst;
            if !self.choose(system, state) {
                return false;
            }
            self.response.advance(system, state);
            for unit in 0..system.throttles.lines.len() {
                let extra = system.throttles.extra[unit] + self.response.change[unit];
                system.throttle(unit, extra);
            }
        }
        self.land(system, state)
    }

    /// Takes the wishes over: who opens is open, who is ruled is in the equations.
    fn prepare(&mut self, system: &mut System, state: &mut State) {
        // One reopens at a time: several that each would make the others' opening needless need not fit together.
        let units = system.throttles.lines.len();
        let room = |unit: &usize| {
            let felt = system.throttles.ruling(system, state, *unit);
            felt.map_or(0.0, |felt| felt.head)
        };
        let reopens = |unit: &usize| self.wishes[*unit] == Wish::Reopen;
        let first = (0..units)
            .filter(reopens)
            .max_by(|a, b| room(a).total_cmp(&room(b)));
        self.ruled.clear();
        for unit in 0..units {
            match self.wishes[unit] {
                Wish::Reopen if first != Some(unit) => {}
                Wish::Reopen | Wish::Verge => {
                    self.wishes[unit] = reopen(system, state, unit);
                }
                _ => {}
            }
            match self.wishes[unit] {
                Wish::Ruled => self.ruled.push(unit),
                Wish::Open => throttle_all(system, state, unit, |_| 0.0),
                Wish::Shut => throttle_all(system, state, unit, |spare| spare.max(0.0) + FIRMLY),
                Wish::Stay | Wish::Reopen | Wish::Verge => {}
            }
        }
    }

    /// After the iteration: losses below zero and flows against the way of a line are no answer, but say which way it lies.
    fn land(&mut self, system: &mut System, state: &State) -> bool {
        let finite = |x: &f64| x.is_finite();
        if !state.flows.iter().all(finite) || !state.heads.iter().all(finite) {
            return false;
        }
        for unit in 0..system.throttles.lines.len() {
            if self.wishes[system.throttles.leader[unit]] != Wish::Ruled {
                continue;
            }
            let line = system.throttles.lines[unit];
            let backwards = state.flows[line] < 0.0;
            let extra = system.throttles.extra[unit];
            let one_way = system.sense[line] != 0.0;
            let new = if backwards && !one_way || !extra.is_finite() || extra.abs() > ASTRAY {
                0.0
            } else if backwards && extra > 0.0 {
                extra + FIRMLY
            } else {
                extra.max(0.0)
            };
            system.throttle(unit, new);
        }
        true
    }

    /// The changes of loss of the ruled ones that take their room away.
    fn choose(&mut self, system: &mut System, state: &State) -> bool {
        let n = self.ruled.len();
        for j in 0..n {
            self.response.change.fill(0.0);
            self.response.put(&system.throttles, self.ruled[j], 1.0);
            self.response.work_out(system, false);
            for i in 0..n {
                self.matrix[j * n + i] = self.felt(system, state, self.ruled[i]).1;
            }
        }
        self.response.change.fill(0.0);
        self.response.work_out(system, true);
        for i in 0..n {
            // A u = -room - (what comes of the rest)
            let (room, response) = self.felt(system, state, self.ruled[i]);
            self.right[i] = -room - response;
        }
        if !solve_dense(&mut self.matrix[..n * n], &mut self.right[..n]) {
            return false;
        }
        for i in 0..n {
            self.response
                .put(&system.throttles, self.ruled[i], self.right[i]);
        }
        self.response.work_out(system, true);
        true
    }

    /// The room of the part that rules a unit, and how it responds.
    fn felt(&self, system: &System, state: &State, unit: usize) -> (f64, f64) {
        let felt = system.throttles.ruling(system, state, unit);
        felt.map_or((0.0, 0.0), |felt| {
            let response = felt.slope * self.response.felt(system, &felt.feeler);
            (felt.value, response)
        })
    }
}

/// Sets the losses of a unit and of those that share it, told how much head each has to spare at no flow.
fn throttle_all(system: &mut System, state: &State, leader: usize, to: impl Fn(f64) -> f64) {
    for unit in leader..system.throttles.lines.len() {
        if system.throttles.leader[unit] == leader {
            let line = system.throttles.lines[unit];
            let spare = system.push(state, line) + system.throttles.extra[unit];
            system.throttle(unit, to(spare));
        }
    }
}

/// Brings a unit that stands still to the verge of opening, so that a step can take it from there.
fn reopen(system: &mut System, state: &mut State, leader: usize) -> Wish {
    let mut spare = f64::NEG_INFINITY;
    for unit in system.throttles.led_by(leader) {
        let line = system.throttles.lines[unit];
        spare = spare.max(system.push(state, line) + system.throttles.extra[unit]);
    }
    if spare <= 0.0 {
        return Wish::Open;
    }
    throttle_all(system, state, leader, |_| spare);
    for unit in system.throttles.led_by(leader) {
        let line = system.throttles.lines[unit];
        state.shut[line] &= system.push(state, line) < -HELD_HEAD.absolute;
    }
    Wish::Ruled
}

/// What a unit wishes, and how far it is from content, over its tolerance.
fn wish(system: &System, state: &State, unit: usize, felt: &Felt) -> (Wish, f64) {
    let extra = system.throttles.extra[unit];
    let off = felt.value / felt.tolerance;
    if system.all_stand_still(state, unit) {
        // Nothing flows: right if it has no room, or nothing would flow without its loss either.
        return match extra {
            _ if off < -1.0 => (Wish::Shut, 0.0),
            0.0 => (Wish::Stay, 0.0),
            _ if off <= 1.0 => (Wish::Verge, 0.0),
            _ => (Wish::Reopen, off),
        };
    }
    if off < 0.0 {
        return (Wish::Ruled, -off);
    }
    let off = off.min(extra / HELD_HEAD.absolute);
    let wish = match extra {
        0.0 => Wish::Stay,
        extra if extra > felt.head => Wish::Ruled,
        _ => Wish::Open,
    };
    (wish, off)
}

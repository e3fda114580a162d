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
//! *Outer steps*: a semismooth Newton method. At the balance for the present `s` the laws are made linear; units with more loss
//! than room are ruled (their room is to become zero), the others open wide. With `u` the change of losses,
//!
//! ```text
//! (sum_j y (dh_i - dh_other)) = sum_out y u - sum_in y u      y = 1/g'(q)
//! A u = -room over the ruled ones,  A_ij = d room_i / d s_j
//! ```
//!
//! one solve with the factorised heads system per ruled unit. The new loss is then read off the law at the flow and heads
//! foreseen, `s = h_from - h_to - g(q)`, which is exact where either alone decides.
//!
//! *Certain path*: opening one part further never lessens what it feels (the inverse of a heads system has its largest entry
//! of each column on the diagonal), so room_i rises with s_i and one part alone is found by bracketing, for certain. Several are bracketed in turn
//! until none moves, which is a nonlinear Gauss–Seidel method; outer steps from there finish.
//!
//! # Source
//! L. Qi, J. Sun, "A nonsmooth version of Newton's method", Mathematical Programming 58, 1993; J. M. Ortega, W. C. Rheinboldt,
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

/// Rounds of bracketing.
const ROUNDS: u32 = 30;

/// Balances of the certain path before it is given up.
const BALANCES: u32 = 5_000;

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

    /// One outer step; false if there is none.
    fn step(&mut self, system: &mut System, state: &mut State, effort: &mut Effort) -> bool {
        // One at a time: several that each would make the others' opening needless need not fit together.
        let room = |unit: &usize| {
            let felt = system.throttles.ruling(system, state, *unit);
            felt.map_or(0.0, |felt| felt.head)
        };
        let reopens = |unit: &usize| self.wishes[*unit] == Wish::Reopen;
        let first = (0..system.throttles.lines.len())
            .filter(reopens)
            .max_by(|a, b| room(a).total_cmp(&room(b)));
        if let Some(unit) = first {
            self.wishes[unit] = reopen(system, state, unit);
        }
        if !self.response.linearise(system, state, effort) || !self.choose(system, state) {
            return false;
        }
        self.response.work_out(system);
        for unit in 0..system.throttles.lines.len() {
            let line = system.throttles.lines[unit];
            let extra = system.throttles.extra[unit];
            let leader = system.throttles.leader[unit];
            let alone = system.throttles.led_by(leader).count() == 1;
            let new = match self.wishes[leader] {
                Wish::Stay | Wish::Reopen => extra,
                Wish::Open => 0.0,
                Wish::Shut => (system.push(state, line) + extra).max(0.0) + FIRMLY,
                Wish::Ruled if alone => {
                    let q = state.flows[line] + self.response.flow(system, line);
                    let drop = system.drop(state, line) + extra + self.response.drop(system, line);
                    // s = h_from - h_to - g(q)
                    drop - system.loss(line, q.max(0.0)).head
                }
                Wish::Ruled => extra + self.response.change[unit],
            };
            if !new.is_finite() {
                return false;
            }
            self.right[unit] = new.max(0.0);
        }
        self.response.advance(system, state);
        for unit in 0..system.throttles.lines.len() {
            system.throttle(unit, self.right[unit]);
        }
        true
    }

    /// The changes of loss: the opening ones give theirs up, the ruled ones take their room away.
    fn choose(&mut self, system: &mut System, state: &State) -> bool {
        let units = system.throttles.lines.len();
        self.ruled.clear();
        for unit in 0..units {
            if self.wishes[unit] == Wish::Ruled {
                self.ruled.push(unit);
            }
        }
        let n = self.ruled.len();
        for j in 0..n {
            self.response.change.fill(0.0);
            self.response.put(&system.throttles, self.ruled[j], 1.0);
            self.response.work_out(system);
            for i in 0..n {
                self.matrix[j * n + i] = self.felt(system, state, self.ruled[i]).1;
            }
        }
        self.response.change.fill(0.0);
        for unit in 0..units {
            if self.wishes[unit] == Wish::Open {
                let change = -system.throttles.extra[unit];
                self.response.put(&system.throttles, unit, change);
            }
        }
        self.response.work_out(system);
        for i in 0..n {
            // A u = -room - (what the opening ones do)
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

/// Brings a unit that stands still to the verge of opening, with the resistance of an ordinary flow, so that a step can take
/// it from there.
fn reopen(system: &mut System, state: &mut State, leader: usize) -> Wish {
    let led = |system: &System, unit: usize| system.throttles.leader[unit] == leader;
    let mut spare = f64::NEG_INFINITY;
    for unit in leader..system.throttles.lines.len() {
        if led(system, unit) {
            let line = system.throttles.lines[unit];
            spare = spare.max(system.push(state, line) + system.throttles.extra[unit]);
        }
    }
    if spare <= 0.0 {
        return Wish::Open;
    }
    for unit in leader..system.throttles.lines.len() {
        if led(system, unit) {
            let line = system.throttles.lines[unit];
            system.throttle(unit, spare);
            state.shut[line] &= system.push(state, line) < -HELD_HEAD.absolute;
        }
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
            _ if off <= 1.0 => (Wish::Stay, 0.0),
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

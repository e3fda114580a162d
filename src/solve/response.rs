//! How a balance answers, to first order, when the further losses of regulating parts change.

use super::newton::Effort;
use super::system::{State, System};
use super::throttles::{Feeler, Throttles};
use super::tolerance::SLOPE_FLOOR;
use crate::part::HeadLaw;

/// Scratch, and the last response.
pub(super) struct Response {
    /// Per line: conductance 1/g'(q), m3/s per m; zero where nothing flows or the flow follows from continuity.
    conductance: Vec<f64>,
    /// Per unknown and one for all held heads.
    step: Vec<f64>,
    /// Per node: change of head, m.
    rise: Vec<f64>,
    /// Per unit: the change of loss that this answers, m.
    pub change: Vec<f64>,
}

impl Response {
    pub fn new(system: &System) -> Self {
        let units = system.throttles.lines.len();
        let size = |n: usize| if units == 0 { 0 } else { n };
        Self {
            conductance: vec![0.0; size(system.roles.len())],
            step: vec![0.0; size(system.unknowns() + 1)],
            rise: vec![0.0; size(system.held.len())],
            change: vec![0.0; units],
        }
    }

    /// Makes the laws linear at the present flows; false if that cannot be done.
    pub fn linearise(&mut self, system: &mut System, state: &State, effort: &mut Effort) -> bool {
        effort.factorisations += 1;
        system.laws.evaluate(&state.flows);
        let System {
            laws,
            factor,
            live,
            throttles,
            start_flow,
            ..
        } = system;
        factor.clear();
        self.conductance.fill(0.0);
        for live in live.iter().filter(|live| !state.shut[live.index()]) {
            let line = live.index();
            let q = state.flows[line];
            let slope = if q == 0.0 && throttles.unit_of(line).is_some() {
                // What is on the verge of opening is flat there: the resistance of an ordinary flow says more.
                let law = laws.line(line);
                (law.loss(start_flow[line]).head - law.loss(0.0).head) / start_flow[line]
            } else {
                laws.loss_at(line, q).slope
            };
            let y = 1.0 / slope.max(SLOPE_FLOOR);
            self.conductance[line] = y;
            factor.join(live.from_unknown, live.to_unknown, live.slot, y);
        }
        factor.factorise()
    }

    /// Sets the change of loss of a unit and of those that share it.
    pub fn put(&mut self, throttles: &Throttles, unit: usize, change: f64) {
        for led in throttles.led_by(unit) {
            self.change[led] = change;
        }
    }

    /// Works the response to [`Self::change`] out.
    pub fn work_out(&mut self, system: &mut System) {
        // dq = y (dh_from - dh_to - u), and no node gains or loses by it:
        // sum_j y (dh_i - dh_other) = sum_out y u - sum_in y u
        self.step.fill(0.0);
        for (unit, &u) in self.change.iter().enumerate() {
            let line = system.throttles.lines[unit] as u32;
            if u == 0.0 {
                continue;
            }
            if let Ok(at) = system.live.binary_search_by_key(&line, |live| live.line) {
                let live = &system.live[at];
                let pull = self.conductance[live.index()] * u;
                self.step[live.from_unknown as usize] += pull;
                self.step[live.to_unknown as usize] -= pull;
            }
        }
        system.factor.solve(&mut self.step);
        for (rise, free) in self.rise.iter_mut().zip(&system.free) {
            *rise = free.map_or(0.0, |i| self.step[i as usize]);
        }
        let (throttles, change) = (&system.throttles, &self.change);
        let extra = |line| throttles.unit_of(line).map_or(0.0, |unit| change[unit]);
        system.spread_to_leaves(&mut self.rise, extra);
    }

    /// Change of the head difference along a line, its own further loss aside, m.
    pub fn drop(&self, system: &System, line: usize) -> f64 {
        let (from, to) = system.ends[line];
        self.rise[from as usize] - self.rise[to as usize]
    }

    /// Change of a line's flow, m3/s.
    pub fn flow(&self, system: &System, line: usize) -> f64 {
        let unit = system.throttles.unit_of(line);
        let change = unit.map_or(0.0, |unit| self.change[unit]);
        self.conductance[line] * (self.drop(system, line) - change)
    }

    /// Change of what a part feels.
    pub fn felt(&self, system: &System, feeler: &Feeler) -> f64 {
        if feeler.regulates.holds_pressure() {
            self.rise[feeler.at]
        } else {
            self.flow(system, feeler.at)
        }
    }

    /// Takes heads and flows of `state` on to where the response foresees them.
    pub fn advance(&self, system: &System, state: &mut State) {
        for (node, free) in system.free.iter().enumerate() {
            if free.is_some() {
                state.heads[node] += self.rise[node];
            }
        }
        for live in system.live.iter().filter(|live| !state.shut[live.index()]) {
            let line = live.index();
            let q = state.flows[line] + self.flow(system, line);
            // What would turn round is left to the balance.
            if live.sense * q >= 0.0 {
                state.flows[line] = q;
            }
        }
    }
}

/// Solves a small dense system by elimination with the largest pivots first; `matrix` by columns, `right` then holds the
/// answer. False if it has none.
pub(super) fn solve_dense(matrix: &mut [f64], right: &mut [f64]) -> bool {
    let n = right.len();
    for k in 0..n {
        let size = |row: &usize| matrix[k * n + row].abs();
        let Some(pivot) = (k..n).max_by(|a, b| size(a).total_cmp(&size(b))) else {
            return false;
        };
        if matrix[k * n + pivot].abs() < f64::MIN_POSITIVE.sqrt() {
            return false;
        }
        if pivot != k {
            right.swap(k, pivot);
            (0..n).for_each(|column| matrix.swap(column * n + k, column * n + pivot));
        }
        for row in k + 1..n {
            let share = matrix[k * n + row] / matrix[k * n + k];
            if share != 0.0 {
                for column in k..n {
                    matrix[column * n + row] -= share * matrix[column * n + k];
                }
                right[row] -= share * right[k];
            }
        }
    }
    for k in (0..n).rev() {
        let known: f64 = (k + 1..n).map(|j| matrix[j * n + k] * right[j]).sum();
        right[k] = (right[k] - known) / matrix[k * n + k];
    }
    right.iter().all(|x| x.is_finite())
}

#[cfg(test)]
mod tests {
    use super::solve_dense;

    #[test]
    fn a_dense_system_with_a_zero_first_pivot_is_solved() {
        // columns (0, 2, 1), (1, 1, 0), (3, 0, 4); x = (1, 2, 3)
        let mut matrix = vec![0.0, 2.0, 1.0, 1.0, 1.0, 0.0, 3.0, 0.0, 4.0];
        let mut right = vec![11.0, 4.0, 13.0];
        assert!(solve_dense(&mut matrix, &mut right));
        for (x, expected) in right.iter().zip([1.0, 2.0, 3.0]) {
            assert!((x - expected).abs() < 1e-14);
        }
        assert!(!solve_dense(&mut [1.0, 2.0, 2.0, 4.0], &mut [1.0, 1.0]));
    }
}

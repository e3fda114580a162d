//! How a balance answers, to first order, when the further losses of regulating parts change.
//!
//! ```text
//! line j:   dq = y (dh_from - dh_to - r - u)                    y = 1/g'(q),  r = g(q) + s - (h_from - h_to),  u: change of s
//! node i:   sum_j y (dh_i - dh_other) = e_i + sum_out y (r + u) - sum_in y (r + u)
//! ```

use super::newton::Effort;
use super::system::{State, System};
use super::throttles::{Feeler, Throttles};
use super::tolerance::{HEAD, SLOPE_FLOOR, flow_tolerance, rounding};
use crate::part::{HeadLaw, HeadLoss};

/// Scratch, and the last response.
pub(super) struct Response {
    /// Per line: conductance 1/g'(q), m3/s per m; zero where nothing flows or the flow follows from continuity.
    conductance: Vec<f64>,
    /// Per line: by how much its heads do not balance, m.
    residual: Vec<f64>,
    /// Per unknown and one for all held heads: by how much its flows do not balance, m3/s.
    imbalance: Vec<f64>,
    step: Vec<f64>,
    /// Per node: change of head, m.
    rise: Vec<f64>,
    /// Whether the response includes that to what does not balance yet.
    whole: bool,
    /// Per unit: the change of loss that this answers, m.
    pub change: Vec<f64>,
}

impl Response {
    pub fn new(system: &System) -> Self {
        let units = system.throttles.lines.len();
        let size = |n: usize| if units == 0 { 0 } else { n };
        Self {
            conductance: vec![0.0; size(system.roles.len())],
            residual: vec![0.0; size(system.roles.len())],
            imbalance: vec![0.0; size(system.unknowns() + 1)],
            step: vec![0.0; size(system.unknowns() + 1)],
            rise: vec![0.0; size(system.held.len())],
            whole: false,
            change: vec![0.0; units],
        }
    }

    /// Makes the laws linear at the present flows; returns how far these are from balance, over the tolerances; none if
    /// that cannot be done.
    pub fn linearise(
        &mut self,
        system: &mut System,
        state: &State,
        effort: &mut Effort,
    ) -> Option<f64> {
        effort.factorisations += 1;
        system.laws.evaluate(&state.flows);
        let System {
            laws,
            factor,
            live,
            free,
            draws,
            throttles,
            start_flow,
            ..
        } = system;
        factor.clear();
        self.conductance.fill(0.0);
        self.imbalance.fill(0.0);
        for (draw, unknown) in draws.iter().zip(free.iter()) {
            if let Some(i) = *unknown {
                self.imbalance[i as usize] = -draw;
            }
        }
        let (mut worst, mut largest_flow): (f64, f64) = (0.0, 0.0);
        for live in live.iter().filter(|live| !state.shut[live.index()]) {
            let line = live.index();
            let q = state.flows[line];
            let HeadLoss { head, slope } = laws.loss_at(line, q);
            let slope = if q == 0.0 && throttles.unit_of(line).is_some() {
                // What is on the verge of opening is flat there: the resistance of an ordinary flow says more.
                (laws.line(line).loss(start_flow[line]).head - head) / start_flow[line]
            } else {
                slope
            };
            let y = 1.0 / slope.max(SLOPE_FLOOR);
            let drop = live.drop(&state.heads);
            let size = state.heads[live.from as usize].abs() + drop.abs();
            let scale = HEAD.absolute + HEAD.relative * size + rounding(q, slope);
            worst = worst.max((head - drop).abs() / scale);
            largest_flow = largest_flow.max(q.abs());
            self.conductance[line] = y;
            self.residual[line] = head - drop;
            self.imbalance[live.from_unknown as usize] -= q;
            self.imbalance[live.to_unknown as usize] += q;
            factor.join(live.from_unknown, live.to_unknown, live.slot, y);
        }
        for unknown in free.iter().flatten() {
            let off = self.imbalance[*unknown as usize].abs();
            worst = worst.max(off / flow_tolerance(largest_flow));
        }
        factor.factorise().then_some(worst)
    }

    /// Sets the change of loss of a unit and of those that share it.
    pub fn put(&mut self, throttles: &Throttles, unit: usize, change: f64) {
        for led in throttles.led_by(unit) {
            self.change[led] = change;
        }
    }

    /// Works out the response to [`Self::change`] alone, or the `whole` one: to what does not balance yet too.
    pub fn work_out(&mut self, system: &mut System, whole: bool) {
        self.whole = whole;
        self.step.fill(0.0);
        if whole {
            self.step.copy_from_slice(&self.imbalance);
            for live in &system.live {
                let pull = self.conductance[live.index()] * self.residual[live.index()];
                self.step[live.from_unknown as usize] += pull;
                self.step[live.to_unknown as usize] -= pull;
            }
        }
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

    /// Change of a line's flow, m3/s.
    fn flow(&self, system: &System, line: usize) -> f64 {
        let unit = system.throttles.unit_of(line);
        let change = unit.map_or(0.0, |unit| self.change[unit]);
        let residual = if self.whole { self.residual[line] } else { 0.0 };
        let (from, to) = system.ends[line];
        let drop = self.rise[from as usize] - self.rise[to as usize];
        match self.conductance[line] {
            0.0 => 0.0,
            y => y * (drop - residual - change),
        }
    }

    /// Change of what a part feels.
    pub fn felt(&self, system: &System, feeler: &Feeler) -> f64 {
        if feeler.regulates.holds_pressure() {
            self.rise[feeler.at]
        } else {
            self.flow(system, feeler.at)
        }
    }

    /// Takes heads and flows of `state` on to where the response foresees them; flows may pass through the wrong sense.
    pub fn advance(&self, system: &System, state: &mut State) {
        for live in system.live.iter().filter(|live| !state.shut[live.index()]) {
            state.flows[live.index()] += self.flow(system, live.index());
        }
        for (head, rise) in state.heads.iter_mut().zip(&self.rise) {
            *head += rise;
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

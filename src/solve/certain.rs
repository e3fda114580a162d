//! The certain path: minimise the co-content in the heads alone.
//!
//! With rising laws each live line has one flow q(d) for a head difference d, zero for a one-way line held shut. The
//! co-content
//!
//! ```text
//! C(h) = sum_lines integral q(d) dd + sum_nodes draw h        dC/dh_i = sum out q - sum in q + draw_i
//! ```
//!
//! is convex and continuously differentiable, shut one-way lines included, so its minimum is the balance and no
//! toggling of states can cycle. Each iteration inverts every line exactly, takes a regularised Newton direction and
//! searches along it for a smaller slope.
//!
//! The regularisation grows with the imbalance and vanishes with it, which keeps the convergence quadratic even where the
//! minimum is not a single point (a node between two shut check valves).
//!
//! # Source
//! M. Collins, L. Cooper, R. Helgason, J. Kennington, L. LeBlanc, "Solving the pipe network analysis problem using
//! optimization techniques", Management Science 24, 1978; D. H. Li, M. Fukushima, L. Qi, N. Yamashita, "Regularized Newton methods
//! for convex minimization problems with singular solutions", Comput. Optim. Appl. 28, 2004.

use super::newton::Effort;
use super::system::{State, System};
use super::tolerance::flow_tolerance;

/// Slopes (m per m3/s) added to the solver's copy of every law, one after the other: a large one makes the problem
/// nearly linear, each smaller one starts from the answer to the one before. The last leaves a law that is flat at no
/// flow just invertible.
const EXTRA_SLOPES: [f64; 6] = [1e4, 1e2, 1.0, 1e-2, 1e-4, 1e-6];

/// Scratch of the certain path.
pub(super) struct Certain {
    /// Per node: slope of the co-content, m3/s.
    slope: Vec<f64>,
    /// Per live line: dq/dd.
    conductance: Vec<f64>,
    /// Per unknown.
    step: Vec<f64>,
    /// Heads from which the line search starts.
    base: Vec<f64>,
    extra_slope: f64,
    /// Regularisation over imbalance, 1/m: the inverse of the head over which it alone would make the imbalance up.
    damping: f64,
}

impl Certain {
    pub fn new(system: &System) -> Self {
        Self {
            slope: vec![0.0; system.held.len()],
            conductance: vec![0.0; system.roles.len()],
            step: vec![0.0; system.unknowns()],
            base: vec![0.0; system.held.len()],
            extra_slope: 0.0,
            damping: 0.0,
        }
    }

    /// Brings `state` close to the minimum: heads, flows and which one-way lines are shut. The fast path, started from
    /// there with the plain laws, finishes.
    pub fn approach(&mut self, system: &mut System, state: &mut State, effort: &mut Effort) {
        state.cold = false;
        self.damping = 1e-3;
        for extra in EXTRA_SLOPES {
            self.extra_slope = extra;
            self.minimise(system, state, effort);
        }
    }

    /// Newton with the present extra slope.
    fn minimise(&mut self, system: &mut System, state: &mut State, effort: &mut Effort) {
        const LIMIT: u32 = 50;
        let mut worst = self.evaluate(system, state);
        for _ in 0..LIMIT {
            let largest_flow = state.flows.iter().fold(0.0, |m: f64, q| m.max(q.abs()));
            if !worst.is_finite() || worst <= flow_tolerance(largest_flow) {
                break;
            }
            effort.iterations += 1;
            effort.factorisations += 1;
            if !self.direction(system, self.damping * worst) {
                break;
            }
            self.base.copy_from_slice(&state.heads);
            let before = worst;
            let Some(length) = self.search(system, state) else {
                break;
            };
            // Heads of a system far out of scale lie far away: let steps grow, and shrink where they overshoot.
            self.damping = (self.damping / (length * length * length)).clamp(1e-20, 1.0);
            worst = self.worst(system);
            // Rounding of the heads times the conductance is as far as this goes.
            if worst >= before && worst <= 1e-6 * (1.0 + largest_flow) {
                break;
            }
        }
    }

    /// Flows, conductances and slopes at the heads of `state`; returns the largest slope.
    fn evaluate(&mut self, system: &System, state: &mut State) -> f64 {
        self.slope.copy_from_slice(&system.draws);
        for live in &system.live {
            let line = live.index();
            let (from, to) = system.ends[line];
            let drop = system.drop(state, line);
            let sense = system.sense[line];
            let (q, conductance) =
                if sense != 0.0 && sense * (drop - system.loss(line, 0.0).head) <= 0.0 {
                    state.shut[line] = true;
                    (0.0, 0.0)
                } else {
                    state.shut[line] = false;
                    let start = if state.flows[line] == 0.0 {
                        system.start_flow[line]
                    } else {
                        state.flows[line]
                    };
                    invert(system, line, drop, start, self.extra_slope)
                };
            state.flows[line] = q;
            self.conductance[line] = conductance;
            self.slope[from as usize] += q;
            self.slope[to as usize] -= q;
        }
        self.worst(system)
    }

    fn worst(&self, system: &System) -> f64 {
        let free = self
            .slope
            .iter()
            .zip(&system.free)
            .filter(|(_, free)| free.is_some());
        free.fold(0.0, |m: f64, (slope, _)| {
            if slope.is_nan() {
                f64::NAN
            } else {
                m.max(slope.abs())
            }
        })
    }

    /// Newton direction with the regularisation; false if it could not be found.
    fn direction(&mut self, system: &mut System, regularisation: f64) -> bool {
        let factor = &mut system.factor;
        factor.clear();
        self.step.fill(0.0);
        for (slope, free) in self.slope.iter().zip(&system.free) {
            if let Some(i) = *free {
                factor.ground(i, regularisation);
                self.step[i as usize] = -slope;
            }
        }
        for live in &system.live {
            let y = self.conductance[live.index()];
            factor.join(live.from_unknown, live.to_unknown, live.slot, y);
        }
        let done = factor.factorise();
        if done {
            factor.solve(&mut self.step);
        }
        done
    }

    /// Moves along the direction until the slope along it is at most half of what it was. Returns the length of the move
    /// over the direction's own; none if there is no way down.
    fn search(&mut self, system: &System, state: &mut State) -> Option<f64> {
        let start = self.slope_along(system);
        if start >= 0.0 {
            return None;
        }
        let goal = 0.5 * start.abs();
        let (mut low, mut at_low) = (0.0, start);
        let mut high: Option<(f64, f64)> = None;
        let mut t = 1.0;
        for _ in 0..60 {
            let slope = self.try_step(system, state, t);
            if !slope.is_finite() {
                high = Some((t, f64::INFINITY));
            } else if slope.abs() <= goal || (t - low).abs() <= 1e-14 * t {
                return Some(t);
            } else if slope < 0.0 {
                (low, at_low) = (t, slope);
            } else {
                high = Some((t, slope));
            }
            t = match high {
                None => 2.0 * t,
                // secant, kept well inside the bracket
                Some((high, at_high)) => {
                    let share = if at_high.is_finite() {
                        at_low / (at_low - at_high)
                    } else {
                        0.5
                    };
                    low + (high - low) * share.clamp(0.1, 0.9)
                }
            };
        }
        Some(t)
    }

    fn try_step(&mut self, system: &System, state: &mut State, t: f64) -> f64 {
        for (node, free) in system.free.iter().enumerate() {
            if let Some(i) = *free {
                state.heads[node] = self.base[node] + t * self.step[i as usize];
            }
        }
        self.evaluate(system, state);
        self.slope_along(system)
    }

    fn slope_along(&self, system: &System) -> f64 {
        let free = self.slope.iter().zip(&system.free);
        free.filter_map(|(slope, free)| free.map(|i| slope * self.step[i as usize]))
            .sum()
    }
}

/// The flow at which a line loses `drop`, and its derivative: bracketed Newton on the law with its extra slope.
fn invert(system: &System, line: usize, drop: f64, start: f64, extra: f64) -> (f64, f64) {
    let law = |q: f64| {
        let loss = system.loss(line, q);
        // g(q) + x q - d
        (loss.head + extra * q - drop, loss.slope + extra)
    };
    let (mut low, mut high) = (f64::NEG_INFINITY, f64::INFINITY);
    let mut q = start;
    let mut slope = 1.0;
    for _ in 0..200 {
        let (value, derivative) = law(q);
        slope = derivative.max(extra);
        if value == 0.0 {
            break;
        }
        if value < 0.0 {
            low = q
        } else {
            high = q
        }
        let newton = q - value / slope;
        let next = if newton > low && newton < high {
            newton
        } else if low.is_finite() && high.is_finite() {
            0.5 * (low + high)
        } else {
            // not bracketed yet, and the step went nowhere
            2.0 * q - value.signum()
        };
        if (next - q).abs() <= 1e-15 * q.abs() || !next.is_finite() {
            break;
        }
        q = next;
    }
    (q, 1.0 / slope)
}

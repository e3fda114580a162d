//! The fast path: Newton on heads and flows together, one-way lines as a primal–dual active set.
//!
//! ```text
//! line j, open:   g(q) - (h_from - h_to) = 0          residual r
//! node i:         sum in q - sum out q - draw = 0     residual e
//! ```
//!
//! A Newton step changes an open line's flow by `dq = y (dh_from - dh_to - r)`, y = 1/g'(q). Put into the node balances, this
//! leaves a symmetric positive definite system in the changes of head:
//!
//! ```text
//! sum_j y (dh_i - dh_other) = e_i + sum_out y r - sum_in y r
//! ```
//!
//! Both are solved for as changes, never as new values: flows then meet the (linear) node balances to rounding even
//! where a tiny slope turns the rounding of a head into a large flow.
//!
//! A one-way line that would flow against its sense is shut, and opens again when the head along it exceeds the loss at
//! no flow: the active set of the complementarity problem, not a rule of thumb about valves.
//!
//! # Source
//! E. Todini, S. Pilati, "A gradient method for the analysis of pipe networks" (1987); M. Hintermüller, K. Ito, K. Kunisch, "The
//! primal-dual active set strategy as a semismooth Newton method", SIAM J. Optim. 13, 2002.

use super::islands::Islands;
use super::system::{State, System};
use super::tolerance::{HEAD, OPENING, SLOPE_FLOOR, flow_tolerance, rounding};

/// How the iterations ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Outcome {
    Converged,
    Stalled,
}

/// Iterations after which the fast path is given up.
const LIMIT: u32 = 80;

/// Iterations without a better state after which the fast path is given up.
const PATIENCE: u32 = 8;

/// Residual over its tolerance at which a converged state needs no further step.
const POLISHED: f64 = 1e-3;

/// Iterations done, and factorisations.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) struct Effort {
    pub iterations: u32,
    pub factorisations: u32,
}

/// Worst residuals over their tolerances.
struct Worst {
    head: f64,
    flow: f64,
}

/// What happens to one-way lines while iterating.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum OneWay {
    /// They shut and open as complementarity asks.
    Free,
    /// They stay as they are; their flows may pass through the wrong sense on the way.
    Frozen,
}

/// Scratch of the fast path.
pub(super) struct Newton {
    /// Per live line.
    residual: Vec<f64>,
    conductance: Vec<f64>,
    /// Per unknown and one for all held heads.
    imbalance: Vec<f64>,
    step: Vec<f64>,
    islands: Islands,
}

impl Newton {
    pub fn new(system: &System) -> Self {
        Self {
            residual: vec![0.0; system.roles.len()],
            conductance: vec![0.0; system.roles.len()],
            imbalance: vec![0.0; system.unknowns() + 1],
            step: vec![0.0; system.unknowns() + 1],
            islands: Islands::new(system),
        }
    }

    /// Iterates from `state` until both residuals are within tolerance and no one-way line changed.
    pub fn solve(
        &mut self,
        system: &mut System,
        state: &mut State,
        one_way: OneWay,
        effort: &mut Effort,
    ) -> Outcome {
        let mut settled = one_way == OneWay::Frozen
            || (shut_wrong_way(system, state) && !any_to_open(system, state));
        let mut polished = false;
        let mut best = f64::INFINITY;
        let mut since_best = 0;
        let mut stepped = false;
        for _ in 0..LIMIT {
            effort.iterations += 1;
            let Worst { head, flow } = self.evaluate(system, state);
            let worst = head.max(flow);
            if !(head + flow).is_finite() {
                return Outcome::Stalled;
            }
            // A step meets the node balances to rounding, whatever the laws, wherever any step can.
            if stepped && settled && flow > 1.0 && self.open_islands(system, state) {
                settled = false;
                since_best = 0;
                continue;
            }
            // One more step takes what has just come within tolerance to rounding: a tank that empties through a line asks for
            // the flow under its last nanometres, where a tolerance on heads says little.
            let good = worst <= 1.0 && settled;
            if good && (polished || worst <= POLISHED) {
                return Outcome::Converged;
            }
            polished = good;
            since_best = if worst < 0.9 * best {
                0
            } else {
                since_best + 1
            };
            best = best.min(worst);
            if since_best > PATIENCE {
                return Outcome::Stalled;
            }
            effort.factorisations += 1;
            if !system.factor.factorise() {
                return Outcome::Stalled;
            }
            system.factor.solve(&mut self.step);
            settled = self.advance(system, state, one_way);
            stepped = true;
        }
        Outcome::Stalled
    }

    fn open_islands(&mut self, system: &System, state: &mut State) -> bool {
        let largest_flow = state.flows.iter().fold(0.0, |m: f64, q| m.max(q.abs()));
        let tolerance = flow_tolerance(largest_flow);
        self.islands.open(system, state, tolerance)
    }

    /// Residuals at `state`, and the system for the next step; returns the worst residuals over their tolerances.
    fn evaluate(&mut self, system: &mut System, state: &mut State) -> Worst {
        system.laws.evaluate(&state.flows);
        let cold = std::mem::take(&mut state.cold);
        let System {
            laws,
            factor,
            live,
            free,
            draws,
            ..
        } = system;
        factor.clear();
        for (node, unknown) in free.iter().enumerate() {
            if let Some(i) = *unknown {
                self.imbalance[i as usize] = -draws[node];
            }
        }
        self.step.fill(0.0);
        let mut worst_head: f64 = 0.0;
        let mut largest_flow: f64 = 0.0;
        let mut sum = 0.0;
        for (k, live) in live.iter().enumerate() {
            let line = live.index();
            if state.shut[line] {
                continue;
            }
            let mut q = state.flows[line];
            let mut loss = laws.loss_at(line, q);
            if cold && live.passive {
                // Which way it flows is not known yet: from a standstill, with the resistance of an ordinary flow.
                loss.slope = (loss.head / q).abs();
                (loss.head, q) = (0.0, 0.0);
                state.flows[line] = 0.0;
            }
            let drop = live.drop(&state.heads);
            let r = loss.head - drop;
            // A law that is flat at no flow would leave the system singular there.
            let y = 1.0 / loss.slope.max(SLOPE_FLOOR);
            (self.residual[k], self.conductance[k]) = (r, y);
            let size = state.heads[live.from as usize].abs() + drop.abs();
            let scale = HEAD.absolute + HEAD.relative * size + rounding(q, loss.slope);
            worst_head = worst_head.max(r.abs() / scale);
            largest_flow = largest_flow.max(q.abs());
            sum += r;
            let (a, b) = (live.from_unknown as usize, live.to_unknown as usize);
            self.imbalance[a] -= q;
            self.imbalance[b] += q;
            self.step[a] += y * r;
            self.step[b] -= y * r;
            factor.join(live.from_unknown, live.to_unknown, live.slot, y);
        }
        // `max` passes a NaN over, a sum does not
        if !sum.is_finite() {
            return Worst {
                head: f64::NAN,
                flow: f64::NAN,
            };
        }
        let mut worst_flow: f64 = 0.0;
        for unknown in free.iter().flatten() {
            let e = self.imbalance[*unknown as usize];
            worst_flow = worst_flow.max(e.abs());
            self.step[*unknown as usize] += e;
        }
        Worst {
            head: worst_head,
            flow: worst_flow / flow_tolerance(largest_flow),
        }
    }

    /// Takes the step; true if no one-way line changed.
    fn advance(&mut self, system: &System, state: &mut State, one_way: OneWay) -> bool {
        if let Some(shared) = self.step.last_mut() {
            *shared = 0.0;
        }
        for (head, unknown) in state.heads.iter_mut().zip(&system.free) {
            if let Some(i) = *unknown {
                *head += self.step[i as usize];
            }
        }
        let mut settled = true;
        for (k, live) in system.live.iter().enumerate() {
            let line = live.index();
            if state.shut[line] {
                if one_way == OneWay::Free && system.push(state, line) > OPENING {
                    system.open_line(state, line);
                    settled = false;
                }
                continue;
            }
            let old = state.flows[line];
            let (y, r) = (self.conductance[k], self.residual[k]);
            let above = self.step[live.from_unknown as usize];
            let below = self.step[live.to_unknown as usize];
            let new = old + y * (above - below - r);
            if live.sense * new >= 0.0 || one_way == OneWay::Frozen {
                state.flows[line] = new;
                continue;
            }
            state.flows[line] = 0.0;
            // Where continuity alone makes it stand still, shutting it would leave its far end without a head.
            let rounding = 1e-15 * y * (above.abs() + below.abs() + r.abs()) + 1e-12 * old.abs();
            if live.sense * new < -rounding {
                state.shut[line] = true;
                settled = false;
            }
        }
        settled
    }
}

/// Shuts one-way lines that flow against their sense; true if there was none.
fn shut_wrong_way(system: &System, state: &mut State) -> bool {
    let mut none = true;
    for live in &system.live {
        let line = live.index();
        if live.sense * state.flows[line] < 0.0 {
            state.shut[line] = true;
            state.flows[line] = 0.0;
            none = false;
        }
    }
    none
}

/// Whether a line that the last answer held shut now has the head to open. A warm start may balance everywhere else.
fn any_to_open(system: &System, state: &State) -> bool {
    system.live.iter().any(|live| {
        let line = live.index();
        state.shut[line] && system.push(state, line) > OPENING
    })
}

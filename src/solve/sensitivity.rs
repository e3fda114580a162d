//! How a figure of the answer changes with the laws, draws and held heads: by the adjoint, one solve with the factorised
//! system for any number of parameters.
//!
//! # Method
//! With the flows q and the heads h of an answer, open lines and points obey
//!
//! ```text
//! F_line = g(q, p) - (h_from - h_to) = 0
//! F_node = sum in q - sum out q - draw = 0         J = dF/d(q, h) is symmetric but for a sign
//! ```
//!
//! so that of a figure Y(q, h, p)
//!
//! ```text
//! dY/dp = Y_p - mu F_p,      J' (mu, nu) = (Y_q, Y_h)
//! ```
//!
//! Eliminating mu leaves the very matrix that Newton's method factorises, y = 1/g'(q):
//!
//! ```text
//! sum_j y (nu_i - nu_other) = -Y_h,i - sum_out y Y_q + sum_in y Y_q
//! mu_j = y (Y_q,j + nu_from - nu_to)
//! ```
//!
//! Then -mu is what one metre more of loss in a line makes of the figure, nu what one m3/s more drawn at a point does, and the
//! sum of mu over the lines out of a held head, less that over the lines in, what one metre more held there does. Leaves and
//! their draws are passed on by hand, as the solver does.
//!
//! # Where it is not valid
//! Which one-way lines are shut must not change with the parameters. Where one is on the verge (open without flow, or shut with
//! the head to open it) the figure has a kink; then there is no gradient, and a caller has to solve on both sides. A head
//! that only shut one-way lines hold is not covered either.
//!
//! # Source
//! Adjoint sensitivities: D. G. Cacuci, "Sensitivity theory for nonlinear systems. I", J. Math. Phys. 22, 1981.

use super::Solution;
use super::operation::line_loss;
use super::solver::Solver;
use super::system::{Role, State, System};
use super::tolerance::SLOPE_FLOOR;
use crate::network::{End, LineId, Network, NodeId, Settings};

/// What a figure looks at: its derivatives by flows and heads, all else unchanged.
#[derive(Clone, Debug, PartialEq)]
pub struct Weights {
    /// Per line, figure per m3/s.
    pub flows: Vec<f64>,
    /// Per node, figure per m.
    pub heads: Vec<f64>,
}

impl Weights {
    /// Of a figure that looks at nothing.
    pub fn none(network: &Network) -> Self {
        Self {
            flows: vec![0.0; network.lines().len()],
            heads: vec![0.0; network.nodes().len()],
        }
    }
}

/// What a figure does when the network changes a little.
#[derive(Clone, Debug, PartialEq)]
pub struct Gradient {
    /// Per line, for one metre more of loss along it.
    pub by_loss: Vec<f64>,
    /// Per node, for one m3/s more drawn there.
    pub by_draw: Vec<f64>,
    /// Per node, for one metre more of head held there.
    pub by_head: Vec<f64>,
}

/// How two networks of the same parts differ as their equations see it, flows unchanged.
#[derive(Clone, Debug, PartialEq)]
pub struct Difference {
    /// Per line, loss at the flow of the answer, m.
    pub losses: Vec<f64>,
    /// Per node, m3/s.
    pub draws: Vec<f64>,
    /// Per node, held head, m.
    pub heads: Vec<f64>,
}

/// Why there is no gradient.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum NotSmooth {
    /// Nothing has been solved.
    Unsolved,
    /// A one-way line is about to open or shut.
    Verge(LineId),
    /// A regulating part of this line throttles: what it adds follows what it looks at.
    Regulated(LineId),
    /// Only shut one-way lines hold the head there.
    Undetermined(NodeId),
    /// The system cannot be factorised.
    Singular,
}

/// A head along a shut line this near to opening it is on the verge, m.
const NEAR_OPENING: f64 = 1e-6;
/// A flow this small in a one-way line is on the verge of standing still, m3/s.
const NEAR_STANDSTILL: f64 = 1e-9;

impl Difference {
    /// From `before` to `after`, each a network with its settings; they differ in figures only. Flows are those of `solution`.
    pub fn between(
        solution: &Solution,
        before: (&Network, &Settings),
        after: (&Network, &Settings),
    ) -> Self {
        let (network, _) = before;
        // Ends above a tank's surface lift the head along a line, as less loss would.
        let lift = |(network, settings): (&Network, &Settings), line| {
            let above = |end| network.above_surface(line, end, settings).unwrap_or(0.0);
            above(End::From) - above(End::To)
        };
        let loss = |side: (&Network, &Settings), line| {
            line_loss(side.0, side.1, line, solution.flow(line)) - lift(side, line)
        };
        let head = |side: (&Network, &Settings), node| side.0.fixed_head(node, side.1);
        Self {
            losses: network
                .line_ids()
                .map(|line| loss(after, line) - loss(before, line))
                .collect(),
            draws: network
                .node_ids()
                .map(|node| after.1.draw(node) - before.1.draw(node))
                .collect(),
            heads: network
                .node_ids()
                .map(|node| match (head(after, node), head(before, node)) {
                    (Some(after), Some(before)) => after - before,
                    _ => 0.0,
                })
                .collect(),
        }
    }
}

impl Gradient {
    /// Change of the figure with a small difference, beside what the figure itself sees of it.
    pub fn along(&self, difference: &Difference) -> f64 {
        let dot = |a: &[f64], b: &[f64]| -> f64 { a.iter().zip(b).map(|(a, b)| a * b).sum() };
        dot(&self.by_loss, &difference.losses)
            + dot(&self.by_draw, &difference.draws)
            + dot(&self.by_head, &difference.heads)
    }
}

/// The factorised system at an answer, ready for one figure after the other.
pub struct Sensitivities<'s, 'n> {
    system: &'s mut System<'n>,
    state: &'s State,
    /// Per line in use, dq/dh; zero for one that carries nothing.
    conductance: Vec<f64>,
    /// Per line, slope of its law.
    slopes: Vec<f64>,
    /// Per node, whether ways in use join it to a fixed head.
    joined: Vec<bool>,
    right: Vec<f64>,
}

impl<'n> Solver<'n> {
    /// Gradients at the last answer, found with the laws it was found with.
    ///
    /// ```
    /// use dutybank::solve::{Solver, sensitivity::Weights};
    ///
    /// let system = dutybank::read::system(include_str!("../../networks/starter.yaml"))?;
    /// let network = &system.network;
    /// let main = network.find_line("rising_main").unwrap();
    /// let mut solver = Solver::new(network);
    /// solver.solve(network.settings())?;
    ///
    /// // what a metre more of loss in the rising main does to the flow in it
    /// let mut flow = Weights::none(network);
    /// flow.flows[main.index()] = 1.0;
    /// let gradient = solver.sensitivities().unwrap().of(&flow).unwrap();
    /// assert!(gradient.by_loss[main.index()] < 0.0);
    /// # Ok::<(), Box<dyn std::error::Error>>(())
    /// ```
    ///
    /// # Errors
    /// [`NotSmooth`] where there is none.
    pub fn sensitivities(&mut self) -> Result<Sensitivities<'_, 'n>, NotSmooth> {
        if !self.solved {
            return Err(NotSmooth::Unsolved);
        }
        let (system, state) = (&mut self.system, &self.state);
        if let Some(line) = system.throttles.first_that_adds() {
            return Err(NotSmooth::Regulated(line));
        }
        if let Some(line) = on_the_verge(system, state) {
            return Err(NotSmooth::Verge(line));
        }
        let lines = system.roles.len();
        let mut sensitivities = Sensitivities {
            joined: joined(system, state),
            conductance: vec![0.0; lines],
            slopes: vec![0.0; lines],
            right: vec![0.0; system.unknowns() + 1],
            system,
            state,
        };
        sensitivities.factorise()?;
        Ok(sensitivities)
    }
}

/// The first one-way line that is about to open or shut.
fn on_the_verge(system: &System, state: &State) -> Option<LineId> {
    let one_way = system.live.iter().filter(|live| live.sense != 0.0);
    let mut verge = one_way.filter(|live| {
        let line = live.index();
        if state.shut[line] {
            system.push(state, line) > -NEAR_OPENING
        } else {
            live.sense * state.flows[line] < NEAR_STANDSTILL
        }
    });
    verge.next().map(|live| LineId(live.line))
}

/// Per node, whether open lines join it to a fixed head.
fn joined(system: &System, state: &State) -> Vec<bool> {
    let mut joined = system.fixed.clone();
    let mut stack: Vec<u32> = (0..joined.len() as u32)
        .filter(|node| joined[*node as usize])
        .collect();
    while let Some(here) = stack.pop() {
        for (line, next) in system.reach.lines_at(NodeId(here)) {
            let open = system.roles[line.index()] != Role::Idle && !state.shut[line.index()];
            if open && !std::mem::replace(&mut joined[next.index()], true) {
                stack.push(next.index() as u32);
            }
        }
    }
    joined
}

impl Sensitivities<'_, '_> {
    fn factorise(&mut self) -> Result<(), NotSmooth> {
        let (system, state) = (&mut *self.system, self.state);
        system.laws.evaluate(&state.flows);
        for (line, slope) in self.slopes.iter_mut().enumerate() {
            *slope = system.laws.loss_at(line, state.flows[line]).slope;
        }
        system.factor.clear();
        for live in &system.live {
            let line = live.index();
            if !state.shut[line] {
                let y = 1.0 / self.slopes[line].max(SLOPE_FLOOR);
                self.conductance[line] = y;
                system
                    .factor
                    .join(live.from_unknown, live.to_unknown, live.slot, y);
            }
        }
        match system.factor.factorise() {
            true => Ok(()),
            false => Err(NotSmooth::Singular),
        }
    }

    /// The gradient of a figure.
    ///
    /// # Errors
    /// [`NotSmooth::Undetermined`] where the figure looks at a head that only shut lines hold.
    pub fn of(&mut self, weights: &Weights) -> Result<Gradient, NotSmooth> {
        let system = &mut *self.system;
        let astray =
            (0..self.joined.len()).find(|&node| weights.heads[node] != 0.0 && !self.joined[node]);
        if let Some(node) = astray {
            return Err(NotSmooth::Undetermined(NodeId(node as u32)));
        }
        let Weights {
            mut flows,
            mut heads,
        } = weights.clone();
        let mut gradient = Gradient {
            by_loss: vec![0.0; flows.len()],
            by_draw: vec![0.0; heads.len()],
            by_head: vec![0.0; heads.len()],
        };
        // A leaf's head is its parent's less the loss on the way, at the flow that it draws.
        for leaf in &system.leaves {
            let (line, node) = (leaf.line as usize, leaf.node as usize);
            let towards = if system.ends[line].1 == leaf.node {
                1.0
            } else {
                -1.0
            };
            let weight = heads[node];
            heads[leaf.parent as usize] += weight;
            gradient.by_loss[line] -= towards * weight;
            flows[line] -= towards * weight * self.slopes[line];
        }
        self.right.fill(0.0);
        for (node, unknown) in system.free.iter().enumerate() {
            if let Some(i) = *unknown {
                self.right[i as usize] = -heads[node];
            }
        }
        for live in &system.live {
            let pull = self.conductance[live.index()] * flows[live.index()];
            self.right[live.from_unknown as usize] -= pull;
            self.right[live.to_unknown as usize] += pull;
        }
        system.factor.solve(&mut self.right);
        if let Some(shared) = self.right.last_mut() {
            *shared = 0.0;
        }
        for (node, unknown) in system.free.iter().enumerate() {
            if let Some(i) = *unknown {
                gradient.by_draw[node] = self.right[i as usize];
            }
        }
        for (node, fixed) in system.fixed.iter().enumerate() {
            if *fixed {
                gradient.by_head[node] = heads[node];
            }
        }
        for live in &system.live {
            let line = live.index();
            let nu = self.right[live.from_unknown as usize] - self.right[live.to_unknown as usize];
            let mu = self.conductance[line] * (flows[line] + nu);
            gradient.by_loss[line] = -mu;
            let (from, to) = (live.from as usize, live.to as usize);
            if system.fixed[from] {
                gradient.by_head[from] += mu;
            }
            if system.fixed[to] {
                gradient.by_head[to] -= mu;
            }
        }
        // What a leaf draws its line carries, and its parent with it.
        for leaf in system.leaves.iter().rev() {
            let (line, node) = (leaf.line as usize, leaf.node as usize);
            let towards = if system.ends[line].1 == leaf.node {
                1.0
            } else {
                -1.0
            };
            gradient.by_draw[node] = gradient.by_draw[leaf.parent as usize] + towards * flows[line];
        }
        Ok(gradient)
    }
}

//! The solver: the two paths in their order, and the answer that comes of them.

use super::certificate::{Balance, certify, regulation};
use super::near::Start;
use super::newton::Effort;
use super::paths::Paths;
use super::regulate::Regulating;
use super::solution::{Balances, LineState, Regulation, Solution};
use super::system::{Role, State, System};
use crate::network::{LineId, Network, NodeId, Passage, Settings, Standing, Unreachable};
use crate::part::RegulatorId;
use crate::part::curve::Cover;
use crate::part::regulator::Regulates;

/// Why there is no answer.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum SolveError {
    /// A draw that no water reaches, or an inflow that has nowhere to go.
    Unreachable(Unreachable),
    /// The best state found has a head far beyond anything physical: a flow is asked of a line that cannot carry it.
    Immense {
        /// Where.
        node: NodeId,
        /// Its head, m.
        head: f64,
    },
    /// The best state found does not balance along a line.
    LineUnbalanced {
        /// Where.
        line: LineId,
        /// By how much, m.
        by: f64,
    },
    /// The best state found does not balance at a node.
    NodeUnbalanced {
        /// Where.
        node: NodeId,
        /// By how much, m3/s.
        by: f64,
    },
    /// A regulating part cannot do what it is set to, whatever it adds.
    NotHeld {
        /// Which.
        regulator: RegulatorId,
        /// The room that it has, m of head or m3/s; negative beyond its set value.
        off: f64,
    },
}

impl SolveError {
    /// The message in the user's names.
    pub fn message(&self, network: &Network) -> String {
        match *self {
            Self::Unreachable(Unreachable { node, draw }) if draw > 0.0 => {
                format!(
                    "no water can reach node `{}`, which draws {:.6} m3/s",
                    network.node(node).name,
                    draw
                )
            }
            Self::Unreachable(Unreachable { node, draw }) => {
                format!(
                    "the inflow of {:.6} m3/s at node `{}` has nowhere to go",
                    -draw,
                    network.node(node).name
                )
            }
            Self::Immense { node, head } => {
                format!(
                    "no balance within reason: the head at node `{}` would be {head:.3e} m",
                    network.node(node).name
                )
            }
            Self::LineUnbalanced { line, by } => {
                format!(
                    "no balance was found: line `{}` is off by {by:.3e} m",
                    network.line(line).name
                )
            }
            Self::NodeUnbalanced { node, by } => {
                format!(
                    "no balance was found: node `{}` is off by {by:.3e} m3/s",
                    network.node(node).name
                )
            }
            Self::NotHeld { regulator, off } => {
                let name = network.regulator_name(regulator);
                let off = off.abs();
                let line = network.line(network.line_of_regulator(regulator));
                match network.regulator(regulator).regulates {
                    Regulates::Downstream => format!(
                        "`{name}` cannot hold its pressure: with all that it can add, node `{}` stays {off:.4} m off",
                        network.node(line.to).name
                    ),
                    Regulates::Upstream => format!(
                        "`{name}` cannot hold its pressure: what is drawn beyond it keeps node `{}` {off:.4} m off",
                        network.node(line.from).name
                    ),
                    Regulates::Flow => format!(
                        "`{name}` cannot limit its flow: what is drawn beyond it takes {off:.6} m3/s more"
                    ),
                    Regulates::MinimumFlow { pump } => format!(
                        "`{name}` cannot hold the flow of pump `{}`: it stays {off:.6} m3/s off",
                        network.pump(pump).name
                    ),
                }
            }
        }
    }
}

impl std::fmt::Display for SolveError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Unreachable(at) => write!(
                f,
                "a draw of {} m3/s at node {} cannot be met",
                at.draw,
                at.node.index()
            ),
            Self::Immense { node, head } => {
                write!(f, "the head at node {} would be {head:e} m", node.index())
            }
            Self::LineUnbalanced { line, by } => {
                write!(f, "line {} is off balance by {by:e} m", line.index())
            }
            Self::NodeUnbalanced { node, by } => {
                write!(f, "node {} is off balance by {by:e} m3/s", node.index())
            }
            Self::NotHeld { regulator, off } => {
                write!(f, "regulating part {} is off by {off:e}", regulator.index())
            }
        }
    }
}

impl std::error::Error for SolveError {}

/// Solves one network again and again. Everything that depends on the network alone is done in [`Solver::new`]; a solve
/// writes numbers only and allocates nothing.
pub struct Solver<'n> {
    pub(super) system: System<'n>,
    paths: Paths,
    regulating: Regulating,
    pub(super) state: State,
    pub(super) solution: Solution,
    scratch: Vec<f64>,
    pub(super) solved: bool,
    /// Whether the laws hold figures of a varied network.
    pub(super) varied: bool,
    /// Where near states are solved from.
    pub(super) start: Option<Start>,
}

impl<'n> Solver<'n> {
    /// For one network.
    pub fn new(network: &'n Network) -> Self {
        let system = System::new(network);
        let state = system.state();
        let (n, m) = (state.heads.len(), state.flows.len());
        Self {
            paths: Paths::new(&system),
            regulating: Regulating::new(&system),
            state,
            solution: Solution {
                heads: vec![f64::NAN; n],
                flows: vec![0.0; m],
                states: vec![LineState::Open; m],
                regulations: vec![Regulation::default(); network.regulators().len()],
                balance: Balance::default(),
            },
            scratch: vec![0.0; n],
            system,
            solved: false,
            varied: false,
            start: None,
        }
    }

    /// The network.
    pub fn network(&self) -> &'n Network {
        self.system.network
    }

    /// The last answer; before the first one every head in it is absent. Not to be used after an error.
    pub fn last(&self) -> &Solution {
        &self.solution
    }

    /// Solves from a cold start: the same settings give the same bits, whatever was solved before.
    ///
    /// # Errors
    /// See [`SolveError`].
    pub fn solve(&mut self, settings: &Settings) -> Result<&Solution, SolveError> {
        self.solved = false;
        self.system.throttles.reset();
        self.run(settings)
    }

    /// Solves starting from the last answer, which is quicker when little has changed; equal to [`Self::solve`] within the
    /// tolerances.
    ///
    /// # Errors
    /// See [`SolveError`].
    pub fn resolve(&mut self, settings: &Settings) -> Result<&Solution, SolveError> {
        self.run(settings)
    }

    /// The balances: one where all head curves fall; where a running pump's curve droops, the one with the larger flows
    /// and the one with the smaller, if they differ.
    ///
    /// # Errors
    /// See [`SolveError`].
    pub fn balances(&mut self, settings: &Settings) -> Result<Balances, SolveError> {
        let network = self.network();
        let droops = network
            .pump_ids()
            .any(|pump| settings.pump(pump).running && network.covers(pump).is_some());
        if !droops {
            let first = self.solve(settings)?.clone();
            return Ok(Balances {
                first,
                others: Vec::new(),
            });
        }
        let upper = self.through_cover(settings, Cover::Upper);
        let lower = self.through_cover(settings, Cover::Lower);
        match (upper, lower) {
            (Ok(first), Ok(other)) if !same_flows(&first, &other) => Ok(Balances {
                first,
                others: vec![other],
            }),
            (Ok(first), _) | (_, Ok(first)) => Ok(Balances {
                first,
                others: Vec::new(),
            }),
            (Err(_), Err(_)) => {
                let first = self.solve(settings)?.clone();
                Ok(Balances {
                    first,
                    others: Vec::new(),
                })
            }
        }
    }

    /// Solves with falling stand-ins for drooping curves first, then from there with the plain curves.
    fn through_cover(&mut self, settings: &Settings, cover: Cover) -> Result<Solution, SolveError> {
        self.system.throttles.reset();
        self.prepare(settings)?;
        self.solved = false;
        self.system.cold_start(&mut self.state);
        let mut effort = Effort::default();
        let network = self.system.network;
        self.system
            .laws
            .set(network, network, settings, Some(cover));
        self.iterate(&mut effort);
        self.system.laws.set(network, network, settings, None);
        self.finish(settings, effort).cloned()
    }

    fn prepare(&mut self, settings: &Settings) -> Result<(), SolveError> {
        let network = self.system.network;
        if std::mem::take(&mut self.varied) {
            self.system.laws.set_parts(network);
        }
        let prepared = self.system.prepare(network, settings, &mut self.state);
        // What was solved before no longer fits the layout if this failed half-way.
        self.solved &= prepared.is_ok();
        prepared.map_err(SolveError::Unreachable)
    }

    fn run(&mut self, settings: &Settings) -> Result<&Solution, SolveError> {
        self.prepare(settings)?;
        if std::mem::take(&mut self.solved) {
            self.system.warm_start(&mut self.state);
        } else {
            self.system.cold_start(&mut self.state);
        }
        self.finish(settings, Effort::default())
    }

    /// Balances the network, and lets what regulates find its place; true if the certain path was needed.
    fn iterate(&mut self, effort: &mut Effort) -> bool {
        let Self {
            system,
            paths,
            regulating,
            state,
            ..
        } = self;
        if system.throttles.is_empty() {
            paths.balance(system, state, effort)
        } else {
            regulating.settle(paths, system, state, effort)
        }
    }

    pub(super) fn finish(
        &mut self,
        settings: &Settings,
        mut effort: Effort,
    ) -> Result<&Solution, SolveError> {
        let certain_path = self.iterate(&mut effort);
        self.paths.settle(&self.system, &mut self.state);
        let balance = certify(&mut self.system, &self.state, &mut self.scratch)
            .map_err(|error| self.explain(settings, error))?;
        self.solved = true;
        self.solution.balance = Balance {
            iterations: effort.iterations,
            factorisations: effort.factorisations,
            certain_path,
            ..balance
        };
        self.report();
        Ok(&self.solution)
    }

    /// Looks for a reason behind a state that does not balance; only now is that worth the time.
    fn explain(&self, settings: &Settings, error: SolveError) -> SolveError {
        const IMMENSE: f64 = 1e6;
        let network = self.system.network;
        if let Some(at) = self.system.reach.unsatisfiable(network, settings) {
            return SolveError::Unreachable(at);
        }
        if let Some(error) = self.not_held(error) {
            return error;
        }
        let size = |node: &NodeId| self.state.heads[node.index()].abs();
        match network
            .node_ids()
            .max_by(|a, b| size(a).total_cmp(&size(b)))
        {
            Some(node) if size(&node) > IMMENSE => SolveError::Immense {
                node,
                head: self.state.heads[node.index()],
            },
            _ => error,
        }
    }

    /// The regulating part behind a state that does not balance: one that closed without end and still lets too much pass.
    fn not_held(&self, error: SolveError) -> Option<SolveError> {
        const WITHOUT_END: f64 = 1e4;
        if let SolveError::NotHeld { .. } = error {
            return Some(error);
        }
        let throttles = &self.system.throttles;
        let worst = (0..throttles.lines.len())
            .filter(|unit| throttles.acts[*unit] && throttles.extra[*unit] > WITHOUT_END)
            .find(|unit| !self.system.stands_still(&self.state, *unit))?;
        let ruling = throttles.ruling(&self.system, &self.state, worst)?;
        Some(SolveError::NotHeld {
            regulator: ruling.feeler.id,
            off: ruling.value,
        })
    }

    /// Puts the state into the answer: heads that mean nothing are left out, states are named.
    fn report(&mut self) {
        let Self {
            system,
            state,
            solution,
            ..
        } = self;
        let network = system.network;
        for (node, head) in network.node_ids().zip(&mut solution.heads) {
            let floating = system.floats(node);
            let means_nothing = match system.reach.standing(node) {
                Standing::Unserved => !system.fixed[node.index()],
                Standing::Joined => floating,
                Standing::Blind => false,
            };
            *head = if means_nothing {
                f64::NAN
            } else {
                state.heads[node.index()]
            };
        }
        solution.flows.copy_from_slice(&state.flows);
        for unit in 0..system.throttles.lines.len() {
            for (part, feeler) in system.throttles.feelers(unit).iter().enumerate() {
                solution.regulations[feeler.id.index()] = regulation(system, state, unit, part);
            }
        }
        for (line, line_state) in network.line_ids().zip(&mut solution.states) {
            let i = line.index();
            *line_state = match system.reach.passage(line) {
                Passage::Closed => LineState::Closed,
                Passage::Stopped => LineState::Stopped,
                Passage::Open => match system.roles[i] {
                    // one-way and standing still
                    Role::Live if system.sense[i] != 0.0 && state.flows[i] == 0.0 => {
                        LineState::Checked
                    }
                    Role::Idle if !system.holds_blind(state, i) => LineState::Checked,
                    Role::Live | Role::Leaf | Role::Idle => LineState::Open,
                },
            };
        }
    }
}

/// Whether two answers are the same balance.
fn same_flows(a: &Solution, b: &Solution) -> bool {
    let largest = a.flows.iter().fold(0.0, |m: f64, q| m.max(q.abs()));
    a.flows
        .iter()
        .zip(&b.flows)
        .all(|(p, q)| (p - q).abs() <= 1e-6 * largest + 1e-9)
}

//! The pumps' side: a stage's lines between a held head and a flow that is asked of them, as on a test bench.
//!
//! The head that they give at a flow is that of the pumps less what the branches lose, shared as the branches share it; a pump
//! too weak for it is held shut by its check valve.

use super::excerpt::{Excerpt, Stand};
use super::station::Stage;
use crate::network::{BuildError, End, Network, NodeId, NodeKind, Settings};
use crate::part::PumpId;
use crate::solve::Solver;
use crate::solve::operation::{self, PumpOperation};

/// Lines of a stage on their own.
pub(super) struct Bench {
    excerpt: Excerpt,
    from: NodeId,
    to: NodeId,
    /// Ids in the whole network and here.
    pumps: Vec<(PumpId, PumpId)>,
    /// Height (m) from which the branches fall freely into a tank.
    fall: f64,
}

/// What the pumps do at a flow.
#[derive(Clone, Debug)]
pub(super) struct Given {
    /// Head between the headers, m.
    pub head: f64,
    /// The pumps that run, by their ids in the whole network.
    pub pumps: Vec<(PumpId, PumpOperation)>,
}

impl Bench {
    /// Sets up the lines of a stage whose pumps all run as `settings` has them.
    ///
    /// # Errors
    /// [`BuildError`] where that makes no network.
    pub fn new(network: &Network, settings: &Settings, stage: &Stage) -> Result<Self, BuildError> {
        let runs = |line| {
            let mut pumps = network.line(line).pumps();
            pumps.all(|pump: PumpId| {
                settings.pump(pump).running || network.pump(pump).when_stopped.is_some()
            }) && network.above_surface(line, End::From, settings).is_none()
        };
        let excerpt = Excerpt::new(
            network,
            settings,
            |id| stage.lines.contains(&id) && runs(id),
            &[stage.from, stage.to],
            |id| Stand {
                kind: if id == stage.from {
                    NodeKind::Reservoir
                } else {
                    NodeKind::Point { elevation: 0.0 }
                },
                level: 0.0,
                draw: 0.0,
            },
        )?;
        let foreign = || BuildError::Foreign(String::new());
        let fall = |line: &crate::network::LineId| network.above_surface(*line, End::To, settings);
        let all = stage.pumps(network);
        Ok(Self {
            from: excerpt.node(stage.from).ok_or_else(foreign)?,
            to: excerpt.node(stage.to).ok_or_else(foreign)?,
            pumps: all
                .into_iter()
                .filter(|pump| settings.pump(*pump).running)
                .filter_map(|pump| Some((pump, excerpt.pump(pump)?)))
                .collect(),
            fall: stage.lines.first().and_then(fall).unwrap_or(0.0),
            excerpt,
        })
    }

    /// What the solver is to be made for.
    pub fn network(&self) -> &Network {
        &self.excerpt.network
    }

    /// What the pumps do when the stage gives `flow` out of a suction with that head.
    pub fn at(&self, solver: &mut Solver<'_>, flow: f64, suction_head: f64) -> Option<Given> {
        let network = &self.excerpt.network;
        let mut settings = network.settings().clone();
        settings.set_level(self.from, suction_head);
        settings.set_draw(self.to, flow);
        let solution = solver.solve(&settings).ok()?;
        let does = |pump| operation::pump(network, &settings, solution, pump);
        Some(Given {
            head: solution.head(self.to)? - suction_head - self.fall,
            pumps: self
                .pumps
                .iter()
                .map(|(id, here)| (*id, does(*here)))
                .collect(),
        })
    }
}

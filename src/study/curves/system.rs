//! The system's side: the head that all else asks of a station, whatever pumps stand in it.
//!
//! The station's lines are taken out and its flow Q is drawn at the node where their suctions meet and put in where their
//! branches meet. What is solved then is the head that the pumps have to give for that flow:
//!
//! ```text
//! H(Q) = head where the branches meet - head where the suctions meet
//! ```

use super::excerpt::{Excerpt, Stand};
use super::station::Stage;
use crate::network::{BuildError, LineId, Network, NodeId, Settings};
use crate::solve::{Solution, Solver};

/// A network without the lines of one stage.
pub(super) struct SystemSide {
    excerpt: Excerpt,
    from: NodeId,
    to: NodeId,
}

impl SystemSide {
    /// Takes the lines of a stage out.
    ///
    /// # Errors
    /// [`BuildError`] where nothing is left that holds a head.
    pub fn new(network: &Network, settings: &Settings, stage: &Stage) -> Result<Self, BuildError> {
        let excerpt = Excerpt::new(
            network,
            settings,
            |id| !stage.lines.contains(&id),
            &[stage.from, stage.to],
            |id| Stand::of(network, settings, id),
        )?;
        let foreign = || BuildError::Foreign(String::new());
        Ok(Self {
            from: excerpt.node(stage.from).ok_or_else(foreign)?,
            to: excerpt.node(stage.to).ok_or_else(foreign)?,
            excerpt,
        })
    }

    /// What the solver is to be made for.
    pub fn network(&self) -> &Network {
        &self.excerpt.network
    }

    fn solve<'s>(&self, solver: &'s mut Solver<'_>, flow: f64) -> Option<&'s Solution> {
        let mut settings = self.excerpt.network.settings().clone();
        settings.set_draw(self.from, settings.draw(self.from) + flow);
        settings.set_draw(self.to, settings.draw(self.to) - flow);
        solver.solve(&settings).ok()
    }

    /// Flow through some lines (ids of the whole network) while the station carries `flow`.
    pub fn flow_through(
        &self,
        solver: &mut Solver<'_>,
        flow: f64,
        lines: &[LineId],
    ) -> Option<f64> {
        let solution = self.solve(solver, flow)?;
        let carried = |id: &LineId| Some(solution.flow(self.excerpt.line(*id)?));
        lines.iter().map(carried).sum()
    }

    /// Heads at a station's flow: of the stage that was taken out, and of each other stage, inlet first.
    pub fn heads(
        &self,
        solver: &mut Solver<'_>,
        flow: f64,
        others: &[Stage],
    ) -> Option<Vec<(f64, f64)>> {
        let solution = self.solve(solver, flow)?;
        let pair = |from: Option<NodeId>, to: Option<NodeId>| {
            Some((solution.head(from?)?, solution.head(to?)?))
        };
        let own = pair(Some(self.from), Some(self.to));
        let rest = others
            .iter()
            .map(|stage| pair(self.excerpt.node(stage.from), self.excerpt.node(stage.to)));
        std::iter::once(own).chain(rest).collect()
    }
}

/// Head asked of a chain of stages at a flow through all of them, m: what each of them has to give, added up.
///
/// One stage is taken out; the others run, and what they give is part of the sum, so that it does not count which of their
/// pumps run as long as they let the flow pass.
pub(super) struct Asked<'n> {
    solver: Solver<'n>,
    side: &'n SystemSide,
    others: Vec<Stage>,
}

impl<'n> Asked<'n> {
    /// Of the stage taken out of `side` and `others` in series with it.
    pub fn new(side: &'n SystemSide, others: &[Stage]) -> Self {
        Self {
            solver: Solver::new(side.network()),
            side,
            others: others.to_vec(),
        }
    }

    /// At a flow; none where the system cannot pass it.
    pub fn at(&mut self, flow: f64) -> Option<f64> {
        let heads = self.side.heads(&mut self.solver, flow, &self.others)?;
        Some(heads.iter().map(|(from, to)| to - from).sum())
    }

    /// Head at the node where the suctions of the stage taken out meet.
    pub fn suction_head(&mut self, flow: f64) -> Option<f64> {
        let heads = self.side.heads(&mut self.solver, flow, &[])?;
        heads.first().map(|(from, _)| *from)
    }
}

//! Solving many states near one: other figures in the same network, each start the same.
//!
//! A study that draws figures solves thousands of states that differ little. Each is solved from the same state, never from the
//! one solved before it, so that an answer does not depend on what came before, nor on which of several solvers gave it.

use super::Solution;
use super::newton::Effort;
use super::solver::{SolveError, Solver};
use super::system::State;
use crate::network::{Settings, Varied};

/// The state that others are solved from.
pub(super) struct Start {
    network: Varied,
    settings: Settings,
    state: State,
    /// The system's layout that the state fits.
    layout: u64,
}

impl Solver<'_> {
    /// Solves this state cold and keeps it as the one that [`Self::solve_near`] starts from. `network` is made from the
    /// solver's own network by [`crate::network::Network::varied`].
    ///
    /// # Errors
    /// See [`SolveError`]; the state kept before is then gone.
    pub fn start_at(
        &mut self,
        network: &Varied,
        settings: &Settings,
    ) -> Result<&Solution, SolveError> {
        self.start = None;
        self.solve_cold(network, settings)?;
        self.start = Some(Start {
            network: network.clone(),
            settings: settings.clone(),
            state: self.state.clone(),
            layout: self.system.layout,
        });
        Ok(&self.solution)
    }

    /// Solves from the state kept by [`Self::start_at`], or cold if there is none. The same figures give the same bits,
    /// whatever was solved in between, on any solver with the same start. Equal to a cold solve within the tolerances;
    /// where a pump's curve droops it finds the balance on the side of the start.
    ///
    /// # Errors
    /// See [`SolveError`].
    pub fn solve_near(
        &mut self,
        network: &Varied,
        settings: &Settings,
    ) -> Result<&Solution, SolveError> {
        // What regulating parts add belongs to the last state solved, not to the start.
        let regulates = !self.system.throttles.is_empty();
        let Some(mut start) = self.start.take_if(|_| !regulates) else {
            return self.solve_cold(network, settings);
        };
        let prepared = self.return_to(&mut start);
        self.start = Some(start);
        prepared?;
        self.prepare_varied(network, settings)?;
        self.system.warm_start(&mut self.state);
        self.solved = false;
        self.finish(settings, Effort::default())
    }

    fn solve_cold(
        &mut self,
        network: &Varied,
        settings: &Settings,
    ) -> Result<&Solution, SolveError> {
        self.solved = false;
        self.system.throttles.reset();
        self.prepare_varied(network, settings)?;
        self.system.cold_start(&mut self.state);
        self.finish(settings, Effort::default())
    }

    /// Puts the state of the start in place, and the layout too where something else was laid out since.
    fn return_to(&mut self, start: &mut Start) -> Result<(), SolveError> {
        if self.system.layout != start.layout {
            self.prepare_varied(&start.network, &start.settings)?;
            start.layout = self.system.layout;
        }
        self.state.clone_from(&start.state);
        Ok(())
    }

    fn prepare_varied(&mut self, network: &Varied, settings: &Settings) -> Result<(), SolveError> {
        self.varied = true;
        self.system.laws.set_parts(network);
        let prepared = self.system.prepare(network, settings, &mut self.state);
        if prepared.is_err() {
            // What water can reach is followed anew next time; the layout is not what it was.
            self.system.layout += 1;
        }
        prepared.map_err(SolveError::Unreachable)
    }
}

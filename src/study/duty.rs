//! Every distinct set of running pumps, in the state that a case describes.

use super::assessment::{Assessment, assess_balances, electrical_power};
use super::limit::Limit;
use super::sets::{self, Group};
use crate::network::{Need, Network, Settings};
use crate::part::PumpId;
use crate::solve::{SolveError, Solver};

/// Most sets that are solved.
pub const MOST_SETS: usize = 4096;

/// One set of running pumps.
#[derive(Clone, Debug)]
pub struct Combination {
    /// The pumps that run.
    pub running: Vec<PumpId>,
    /// What comes of it, or why there is no balance.
    pub outcome: Result<Outcome, SolveError>,
}

/// What comes of a set.
#[derive(Clone, Debug)]
pub struct Outcome {
    /// The state.
    pub assessment: Assessment,
    /// The limit that binds first.
    pub limit: Option<Limit>,
    /// Shaft power of all running pumps, W.
    pub shaft_power: Option<f64>,
    /// Electrical energy per volume delivered, J/m3 (shaft energy where a motor's efficiency is not known).
    pub specific_energy: Option<f64>,
}

/// Too many sets.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct TooMany {
    /// How many there would be.
    pub sets: usize,
}

/// Solves every distinct set of `pumps`; the others stay as `settings` has them.
///
/// # Errors
/// [`TooMany`] past [`MOST_SETS`].
pub fn combinations(
    network: &Network,
    needs: &[Need],
    settings: &Settings,
    pumps: &[PumpId],
) -> Result<Vec<Combination>, TooMany> {
    let groups: Vec<Group> = sets::groups(network, settings, pumps);
    let count = sets::count(&groups);
    if count > MOST_SETS {
        return Err(TooMany { sets: count });
    }
    let mut solver = Solver::new(network);
    let mut changed = settings.clone();
    let solved = sets::all(&groups).into_iter().map(|running| {
        for pump in pumps {
            changed.pump_mut(*pump).running = running.contains(pump);
        }
        let outcome = solve(&mut solver, needs, &changed);
        Combination { running, outcome }
    });
    Ok(solved.collect())
}

/// One state, assessed; a second balance becomes a caution.
fn solve(solver: &mut Solver, needs: &[Need], settings: &Settings) -> Result<Outcome, SolveError> {
    let network = solver.network();
    let balances = solver.balances(settings)?;
    let assessment = assess_balances(network, needs, settings, &balances);
    let power = electrical_power(&assessment);
    let running = assessment.pumps.iter().filter(|pump| pump.running);
    Ok(Outcome {
        limit: assessment.binding_limit(),
        shaft_power: running.map(|pump| pump.shaft_power).sum(),
        specific_energy: power
            .filter(|_| assessment.delivered > 1e-9)
            .map(|(power, _)| power / assessment.delivered),
        assessment,
    })
}

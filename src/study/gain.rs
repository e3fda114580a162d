//! What each further pump of a bank really adds, and why it is not as much as the first.

use argmin::core::{CostFunction, Executor, State};
use argmin::solver::brent::BrentRoot;

use super::assessment::{Assessment, Caution, assess};
use crate::network::{Bank, LineId, Need, Network, NodeId, Settings};
use crate::part::PumpId;
use crate::solve::{SolveError, Solver};

/// The gain of a bank: how the flow grows with the number of its pumps that run.
#[derive(Clone, Debug)]
pub struct Gain {
    /// The bank's name.
    pub bank: String,
    /// Pumps that run beside the bank throughout.
    pub beside: Vec<PumpId>,
    /// One entry per number of pumps, from one.
    pub steps: Vec<Step>,
    /// Delivered flow that no number of such pumps passes, m3/s; none where there is no such end.
    pub end: Option<f64>,
}

/// One more pump of a bank.
#[derive(Clone, Debug)]
pub struct Step {
    /// The pump that is added.
    pub added: PumpId,
    /// Flow delivered with it, m3/s.
    pub delivered: f64,
    /// Share of the pumps' hydraulic power that friction takes.
    pub friction_share: Option<f64>,
    /// Running pumps that are held shut.
    pub held_shut: Vec<PumpId>,
}

/// The gain of each bank of two or more pumps, all other pumps as `settings` has them.
///
/// Banks whose states do not balance are left out.
pub fn gains(network: &Network, needs: &[Need], settings: &Settings) -> Vec<Gain> {
    let mut solver = Solver::new(network);
    network
        .banks()
        .iter()
        .filter_map(|bank| gain(&mut solver, needs, settings, bank).ok().flatten())
        .collect()
}

fn gain(
    solver: &mut Solver,
    needs: &[Need],
    settings: &Settings,
    bank: &Bank,
) -> Result<Option<Gain>, SolveError> {
    let network = solver.network();
    let pumps: Vec<PumpId> = bank
        .lines
        .iter()
        .flat_map(|line| network.line(*line).pumps())
        .collect();
    if pumps.len() < 2 || pumps.len() != bank.lines.len() {
        return Ok(None);
    }
    let mut changed = settings.clone();
    for pump in &pumps {
        changed.pump_mut(*pump).running = false;
    }
    let stopped = changed.clone();
    let beside = network
        .pump_ids()
        .filter(|pump| stopped.pump(*pump).running)
        .collect();
    let mut steps = Vec::new();
    for pump in &pumps {
        changed.pump_mut(*pump).running = true;
        let solution = solver.solve(&changed)?.clone();
        let assessment = assess(network, needs, &changed, &solution);
        steps.push(Step {
            added: *pump,
            delivered: assessment.delivered,
            friction_share: assessment.friction_share,
            held_shut: held_shut(&assessment),
        });
    }
    let end = end_flow(solver, needs, stopped, &pumps, bank.lines[0]);
    Ok(Some(Gain {
        bank: bank.name.clone(),
        beside,
        steps,
        end,
    }))
}

/// Running pumps that are held shut.
fn held_shut(assessment: &Assessment) -> Vec<PumpId> {
    let held = |caution: &Caution| match caution {
        Caution::HeldShut { pump } => Some(*pump),
        _ => None,
    };
    assessment.cautions.iter().filter_map(held).collect()
}

/// The flow at which the system asks the bank for the highest shut-off head among its pumps: each of ever so many pumps then
/// delivers next to nothing.
///
/// The bank is stopped and its flow Q put in at its one end and drawn at the other; Q is the root of (head gained between
/// the ends) - (shut-off head), by Brent's method (R. P. Brent, Algorithms for Minimization without Derivatives, 1973).
fn end_flow(
    solver: &mut Solver,
    needs: &[Need],
    stopped: Settings,
    pumps: &[PumpId],
    line: LineId,
) -> Option<f64> {
    let network = solver.network();
    let shutoff = |id: &PumpId| network.performance(*id, &stopped).head(0.0);
    let shutoff = pumps.iter().map(shutoff).fold(0.0, f64::max);
    let (from, to) = (network.line(line).from, network.line(line).to);
    if !network.is_point(from) && !network.is_point(to) {
        // nothing but the pumps' own lines between two fixed heads
        return None;
    }
    let solver = std::cell::RefCell::new(solver);
    let excess = Excess {
        solver: &solver,
        stopped: &stopped,
        from,
        to,
        shutoff,
    };
    // At no flow at all the water might stand anywhere; next to none shows the static head.
    let ends: f64 = pumps
        .iter()
        .map(|id| network.model(*id).end_of_curve())
        .sum();
    let (mut low, mut high) = (1e-6 * ends, ends);
    if excess.at(low)? >= 0.0 {
        return None;
    }
    while excess.at(high)? < 0.0 {
        (low, high) = (high, 2.0 * high);
        if high > 1e4 {
            return None;
        }
    }
    let found = Executor::new(&excess, BrentRoot::new(low, high, 1e-9 * high))
        .configure(|state| state.param(0.5 * (low + high)).max_iters(200))
        .run()
        .ok()?;
    let q = *found.state().get_best_param()?;
    let settings = excess.settings(q);
    let solution = solver.borrow_mut().solve(&settings).ok()?.clone();
    let delivered = assess(network, needs, &settings, &solution).delivered;
    // A need that looks at the bank itself sees no flow in its stopped lines.
    Some(if delivered > 0.0 { delivered } else { q })
}

/// Head that the system asks of a bank, less the bank's shut-off head, as a function of the bank's flow.
struct Excess<'a, 's, 'n> {
    solver: &'a std::cell::RefCell<&'s mut Solver<'n>>,
    stopped: &'a Settings,
    from: NodeId,
    to: NodeId,
    shutoff: f64,
}

impl Excess<'_, '_, '_> {
    fn settings(&self, q: f64) -> Settings {
        let mut settings = self.stopped.clone();
        settings.set_draw(self.from, settings.draw(self.from) + q);
        settings.set_draw(self.to, settings.draw(self.to) - q);
        settings
    }

    fn at(&self, q: f64) -> Option<f64> {
        let mut solver = self.solver.borrow_mut();
        let solution = solver.solve(&self.settings(q)).ok()?;
        Some(solution.head(self.to)? - solution.head(self.from)? - self.shutoff)
    }
}

impl CostFunction for &Excess<'_, '_, '_> {
    type Param = f64;
    type Output = f64;

    fn cost(&self, q: &f64) -> Result<f64, argmin::core::Error> {
        self.at(*q)
            .ok_or_else(|| argmin::core::Error::msg("no balance at this flow"))
    }
}

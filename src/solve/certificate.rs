//! The certificate: balances and complementarity recomputed from the answer, with the plain laws.

use super::solution::Regulation;
use super::solver::SolveError;
use super::system::{Role, State, System};
use super::tolerance::{CERTIFIED_HEAD, CERTIFIED_HELD, certified_flow, rounding};
use crate::network::{LineId, NodeId, Passage};
use crate::part::regulator::RegulatorState;
use crate::part::{HeadLaw, HeadLoss};

/// How good an answer is, and what it took.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Balance {
    /// Largest flow imbalance at a node, m3/s.
    pub worst_node: f64,
    /// Largest head imbalance along a line, m; for a line held shut, how far it is from being so.
    pub worst_line: f64,
    /// Newton iterations, both paths together.
    pub iterations: u32,
    /// Factorisations of the system in the heads.
    pub factorisations: u32,
    /// Whether the certain path was needed.
    pub certain_path: bool,
}

/// Recomputes the balances of `state`, whose leaves are settled. `imbalance` is scratch, one per node.
pub(super) fn certify(
    system: &mut System,
    state: &State,
    imbalance: &mut [f64],
) -> Result<Balance, SolveError> {
    let mut balance = Balance::default();
    let mut largest_flow: f64 = 0.0;
    imbalance.fill(0.0);
    system.laws.evaluate(&state.flows);
    for (line, &role) in system.roles.iter().enumerate() {
        let q = state.flows[line];
        let (from, to) = system.ends[line];
        imbalance[from as usize] -= q;
        imbalance[to as usize] += q;
        largest_flow = largest_flow.max(q.abs());
        if role == Role::Idle {
            continue;
        }
        let HeadLoss { head: loss, slope } = system.laws.loss_at(line, q);
        let (above, below) = (state.heads[from as usize], state.heads[to as usize]);
        let off = loss - system.drop(state, line);
        let off = if state.shut[line] {
            (-system.sense[line] * off).max(0.0)
        } else {
            off.abs()
        };
        let size = loss.abs().max(above.abs()).max(below.abs());
        let wrong_way = system.sense[line] * q < 0.0;
        let allowed = CERTIFIED_HEAD.absolute + CERTIFIED_HEAD.relative * size + rounding(q, slope);
        if off.is_nan() || off > allowed || wrong_way {
            return Err(SolveError::LineUnbalanced {
                line: LineId(line as u32),
                by: off,
            });
        }
        balance.worst_line = balance.worst_line.max(off);
    }
    let limit = certified_flow(largest_flow);
    for node in system.network.node_ids() {
        if !system.fixed[node.index()] {
            let off = (imbalance[node.index()] - system.own_draws[node.index()]).abs();
            if off.is_nan() || off > limit {
                return Err(SolveError::NodeUnbalanced {
                    node: NodeId(node.index() as u32),
                    by: off,
                });
            }
            balance.worst_node = balance.worst_node.max(off);
        }
    }
    certify_regulators(system, state)?;
    Ok(balance)
}

/// Recomputes what every regulating part has to do with: what it feels, and the loss that it adds.
///
/// ```text
/// flowing:    added loss >= 0, room >= 0, and no room wherever it is above zero
/// still:      no room, or too little head to flow
/// ```
fn certify_regulators(system: &System, state: &State) -> Result<(), SolveError> {
    for unit in 0..system.throttles.lines.len() {
        if !system.throttles.acts[unit] {
            continue;
        }
        let Some(ruling) = system.throttles.ruling(system, state, unit) else {
            continue;
        };
        let allowed = CERTIFIED_HELD * ruling.tolerance;
        let added = added_loss(system, state, unit);
        let no_loss = added <= CERTIFIED_HEAD.absolute;
        let still = system.stands_still(state, unit);
        if !still && added < -CERTIFIED_HEAD.absolute {
            let line = LineId(system.throttles.lines[unit] as u32);
            return Err(SolveError::LineUnbalanced { line, by: added });
        }
        let off = if still {
            if no_loss { 0.0 } else { ruling.value.max(0.0) }
        } else if no_loss {
            (-ruling.value).max(0.0)
        } else {
            ruling.value.abs()
        };
        if off.is_nan() || off > allowed {
            return Err(SolveError::NotHeld {
                regulator: ruling.feeler.id,
                off: ruling.value,
            });
        }
    }
    Ok(())
}

/// Head along a unit's line that its parts lose beyond their wide open loss: what the ends have less what the plain law
/// takes, m.
pub(super) fn added_loss(system: &System, state: &State, unit: usize) -> f64 {
    let line = system.throttles.lines[unit];
    let q = state.flows[line];
    let (from, to) = system.ends[line];
    let ends = state.heads[from as usize] - state.heads[to as usize];
    ends + system.throttles.base[unit] - system.laws.line(line).loss(q).head
}

/// What a regulating part does, and the loss it adds.
pub(super) fn regulation(system: &System, state: &State, unit: usize, part: usize) -> Regulation {
    let line = system.throttles.lines[unit];
    let feeler = &system.throttles.feelers(unit)[part];
    if system.reach.passage(LineId(line as u32)) != Passage::Open {
        return Regulation {
            state: RegulatorState::Shut,
            added: None,
        };
    }
    let ruling = system.throttles.ruling(system, state, unit);
    let rules = ruling.filter(|felt| felt.feeler.id == feeler.id);
    let holds = rules.is_some_and(|felt| felt.value.abs() <= CERTIFIED_HELD * felt.tolerance);
    let added = added_loss(system, state, unit).max(0.0);
    let throttles = holds && added > CERTIFIED_HEAD.absolute;
    let still = state.flows[line] == 0.0;
    if throttles {
        Regulation {
            state: RegulatorState::Regulating,
            added: Some(added),
        }
    } else if still && feeler.regulates.one_way() {
        Regulation {
            state: RegulatorState::Shut,
            added: None,
        }
    } else {
        Regulation {
            state: RegulatorState::WideOpen,
            added: Some(0.0),
        }
    }
}

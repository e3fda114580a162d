//! The certificate: balances and complementarity recomputed from the answer, with the plain laws.

use super::solver::SolveError;
use super::system::{Role, State, System};
use super::tolerance::{CERTIFIED_HEAD, certified_flow, rounding};
use crate::network::{LineId, NodeId};
use crate::part::HeadLoss;

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
    Ok(balance)
}

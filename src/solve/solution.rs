//! The answer: heads, flows and states that met their certificate.

use super::certificate::Balance;
use crate::network::{LineId, NodeId};
use crate::part::RegulatorId;
use crate::part::regulator::RegulatorState;

/// What a line does.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum LineState {
    /// A valve in it is shut.
    Closed,
    /// A pump in it is stopped and lets nothing pass.
    Stopped,
    /// Held shut by its check valve, or it leads to an outlet that the water does not reach.
    Checked,
    /// None of these.
    #[default]
    Open,
}

/// What a regulating part does.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Regulation {
    /// Its state.
    pub state: RegulatorState,
    /// Head that it loses beyond its wide open loss, m; none while it is shut.
    pub added: Option<f64>,
}

/// A solved network. Exists only if its balances, recomputed from the answer, met the tolerance.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Solution {
    pub(super) heads: Vec<f64>,
    pub(super) flows: Vec<f64>,
    pub(super) states: Vec<LineState>,
    pub(super) regulations: Vec<Regulation>,
    pub(super) balance: Balance,
}

impl Solution {
    /// Total head at a node, m above the datum; none at a node that no fixed head can reach.
    pub fn head(&self, node: NodeId) -> Option<f64> {
        let head = self.heads[node.index()];
        (!head.is_nan()).then_some(head)
    }

    /// Flow in a line, m3/s, positive from its `from` to its `to`.
    pub fn flow(&self, line: LineId) -> f64 {
        self.flows[line.index()]
    }

    /// What a line does.
    pub fn state(&self, line: LineId) -> LineState {
        self.states[line.index()]
    }

    /// What a regulating part does.
    pub fn regulation(&self, id: RegulatorId) -> Regulation {
        self.regulations[id.index()]
    }

    /// Flows of all lines, one per line, m3/s.
    pub fn flows(&self) -> &[f64] {
        &self.flows
    }

    /// How good the answer is.
    pub fn balance(&self) -> &Balance {
        &self.balance
    }
}

/// The balances found for one set of settings; more than one only where a running pump's head curve droops.
#[derive(Clone, Debug, PartialEq)]
pub struct Balances {
    /// The one with the largest flows.
    pub first: Solution,
    /// Those with smaller flows.
    pub others: Vec<Solution>,
}

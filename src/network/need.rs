//! What the system has to do: a flow or a pressure within limits.

use super::{LineId, NodeId};

/// A need and its limits, SI.
#[derive(Clone, Debug, PartialEq)]
pub struct Need {
    /// The user's name for it.
    pub name: String,
    /// What is asked.
    pub target: Target,
    /// Lowest value that meets it.
    pub at_least: Option<f64>,
    /// Highest value that meets it.
    pub at_most: Option<f64>,
}

/// What a need looks at.
#[derive(Clone, Debug, PartialEq)]
pub enum Target {
    /// Net flow that lines bring to a node, m3/s.
    FlowInto(NodeId),
    /// Flow in a line, or the sum over a bank, m3/s.
    FlowIn(Vec<LineId>),
    /// Gauge pressure at a node, Pa.
    PressureAt(NodeId),
}

impl Need {
    /// Whether `value` meets it; a figure that does not exist does not.
    pub fn is_met(&self, value: Option<f64>) -> bool {
        value.is_some_and(|value| self.shortfall(value) <= 0.0)
    }

    /// How far `value` is outside the limits; zero or less inside: minus the distance to the nearer limit.
    pub fn shortfall(&self, value: f64) -> f64 {
        let below = self
            .at_least
            .map_or(f64::NEG_INFINITY, |limit| limit - value);
        let above = self
            .at_most
            .map_or(f64::NEG_INFINITY, |limit| value - limit);
        below.max(above)
    }
}

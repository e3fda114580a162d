//! Regulating parts: what holds a pressure, limits a flow or keeps a pump above its minimum flow by throttling itself.
//!
//! A regulating part is an open body with a loss of its own, and a further loss `s` that it adds as it closes. It feels one
//! figure `x` (a pressure at an end of its line, the line's flow, a pump's flow) and compares it with its set value `c`. Its
//! *room* says how far the figure lies on the side where it may stand open:
//!
//! ```text
//! hold_downstream   room = c - x     x: head at the line's last node,  c: the head of the set pressure there
//! hold_upstream     room = x - c     x: head at the line's first node, c: likewise
//! limit_flow        room = c - x     x: flow of the line
//! minimum_flow      room = c - x     x: flow of the pump it protects
//! ```
//!
//! It closes no further than it must, which is a complementarity:
//!
//! ```text
//! s >= 0,   room >= 0,   s = 0 or room = 0      while water flows
//! q = 0  with room <= 0, or with too little head to flow
//! ```
//!
//! so there are three states: *wide open* (s = 0), *regulating* (room = 0) and *shut* (q = 0). All but `limit_flow` let nothing
//! back through their line. A part that is ideal in this sense has no droop: it holds its set value exactly.
//!
//! # Source
//! The states and their signs: common practice, no source. The form as complementarity: G. Isac, "Complementarity Problems",
//! Lecture Notes in Mathematics 1528, 1992, chapter 1 (definition).

use super::PumpId;
use super::quadratic::QuadraticLoss;

/// What a regulating part does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Regulates {
    /// Holds the pressure at its line's last node down to the set value (a reducing valve).
    Downstream,
    /// Holds the pressure at its line's first node up to the set value: opens when it is exceeded (a relief or
    /// back-pressure valve).
    Upstream,
    /// Lets no more than the set flow pass forward.
    Flow,
    /// Opens when the pump's flow falls below the set flow (a recirculation valve).
    MinimumFlow {
        /// The pump.
        pump: PumpId,
    },
}

/// A regulating part: what it does, and its loss when wide open.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Regulator {
    /// What it does.
    pub regulates: Regulates,
    /// Loss when wide open.
    pub wide_open: QuadraticLoss,
}

/// What a regulating part does at present.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum RegulatorState {
    /// It throttles so that its set value holds.
    Regulating,
    /// It adds nothing to its wide open loss.
    #[default]
    WideOpen,
    /// Nothing passes.
    Shut,
}

/// Room and its slope.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Room {
    /// How far the figure that is felt lies on the side where the part may stand open, in that figure's unit.
    pub value: f64,
    /// Derivative by the figure felt.
    pub slope: f64,
}

impl Regulates {
    /// The room at set value `set` when `felt` is felt.
    pub fn room(self, set: f64, felt: f64) -> Room {
        match self {
            // room = x - c
            Self::Upstream => Room {
                value: felt - set,
                slope: 1.0,
            },
            // room = c - x
            Self::Downstream | Self::Flow | Self::MinimumFlow { .. } => Room {
                value: set - felt,
                slope: -1.0,
            },
        }
    }

    /// Whether nothing comes back through the line it stands in.
    pub fn one_way(self) -> bool {
        self != Self::Flow
    }

    /// Whether it holds a pressure; else it looks at a flow.
    pub fn holds_pressure(self) -> bool {
        matches!(self, Self::Downstream | Self::Upstream)
    }

    /// The word by which files and results call it.
    pub fn word(self) -> &'static str {
        match self {
            Self::Downstream => "hold_downstream",
            Self::Upstream => "hold_upstream",
            Self::Flow => "limit_flow",
            Self::MinimumFlow { .. } => "minimum_flow",
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn room_is_above_zero_where_the_part_may_stand_open() {
        let pump = PumpId(0);
        for (regulates, felt, value) in [
            (Regulates::Downstream, 29.0, 1.0),
            (Regulates::Upstream, 29.0, -1.0),
            (Regulates::Flow, 32.0, -2.0),
            (Regulates::MinimumFlow { pump }, 31.0, -1.0),
        ] {
            let room = regulates.room(30.0, felt);
            assert_eq!(room.value, value);
            let rise = regulates.room(30.0, felt + 0.5).value - room.value;
            assert_eq!(rise, 0.5 * room.slope);
        }
    }
}

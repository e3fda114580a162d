//! A line, and what is known of it beside the laws of its parts.

use super::NodeId;
use crate::part::friction::Pipe;
use crate::part::{Part, PumpId, RegulatorId};

/// A line: one flow between two nodes through its parts, in order.
#[derive(Clone, Debug, PartialEq)]
pub struct Line {
    /// The user's name for it; a member of a bank is `bank.k`.
    pub name: String,
    /// First node.
    pub from: NodeId,
    /// Last node; flow is positive towards it.
    pub to: NodeId,
    /// Height (m) of its `from` and `to` end above the floor of the tank there; none: at the floor. Nothing leaves through
    /// an end above the surface, and what enters there falls freely from it.
    pub ports: [Option<f64>; 2],
    /// Its parts in the order in which water flowing forward meets them; at least one.
    pub parts: Vec<Part>,
    /// What limits are judged by, beside its flow.
    pub facts: LineFacts,
}

/// What is known of a line that its flow does not depend on; none: not known.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct LineFacts {
    /// Gauge pressure that its pipes are rated for, the lowest of them, Pa.
    pub rating: Option<f64>,
    /// Mean wave speed of its pipes, weighted by travel time, m/s.
    pub wave_speed: Option<f64>,
    /// The bell by which it draws from a tank or a reservoir.
    pub bell: Option<Bell>,
}

/// The open end by which a line draws from a free surface.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bell {
    /// Inner diameter of its mouth, m.
    pub diameter: f64,
    /// Elevation of its mouth, m above the datum.
    pub elevation: f64,
}

impl Line {
    /// Whether a check valve stands in the line.
    pub fn has_check_valve(&self) -> bool {
        self.parts
            .iter()
            .any(|part| matches!(part, Part::CheckValve(_)))
    }

    /// The regulating parts in the line, in order.
    pub fn regulators(&self) -> impl Iterator<Item = RegulatorId> + '_ {
        self.parts.iter().filter_map(|part| match part {
            Part::Regulator(id) => Some(*id),
            _ => None,
        })
    }

    /// The pumps in the line, in order.
    pub fn pumps(&self) -> impl Iterator<Item = PumpId> + '_ {
        self.parts.iter().filter_map(|part| match part {
            Part::Pump(id) => Some(*id),
            _ => None,
        })
    }

    /// The smallest bore among the line's pipes, m: where its velocity is highest.
    pub fn narrowest_bore(&self) -> Option<f64> {
        self.pipes().map(|pipe| pipe.bore).min_by(f64::total_cmp)
    }

    /// The bore of the line's longest pipe, m: that of a main whose station has narrower pipes.
    pub fn main_bore(&self) -> Option<f64> {
        self.pipes()
            .max_by(|a, b| a.length.total_cmp(&b.length))
            .map(|pipe| pipe.bore)
    }

    /// Length of the line's pipes, m.
    pub fn pipe_length(&self) -> f64 {
        self.pipes().map(|pipe| pipe.length).sum()
    }

    /// Volume of the line's pipes, m3.
    pub fn pipe_volume(&self) -> f64 {
        let area = |bore: f64| std::f64::consts::FRAC_PI_4 * bore * bore;
        self.pipes().map(|pipe| pipe.length * area(pipe.bore)).sum()
    }

    fn pipes(&self) -> impl Iterator<Item = &Pipe> {
        self.parts.iter().filter_map(|part| match part {
            Part::Pipe(pipe) => Some(pipe),
            _ => None,
        })
    }
}

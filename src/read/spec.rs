//! The file in typed form, in SI, each name with its place. Never leaves `read`.

use crate::diagnostic::Place;
use crate::fluid::Fluid;
use crate::network::{Bell, Limits};
use crate::part::curve::Curve;
use crate::part::pump::performance::Scaling;
use crate::part::pump::{Efficiency, MakerLimits, Motor, PowerCurve};
use crate::part::quadratic::QuadraticLoss;
use crate::part::valve::Characteristic;
use crate::units::SpeedValue;

/// Something and where it stands.
#[derive(Clone, Debug)]
pub(super) struct Placed<T> {
    pub value: T,
    pub place: Place,
}

#[derive(Clone, Debug)]
pub(super) struct Spec {
    pub title: Option<String>,
    pub site: SiteSpec,
    pub limits: Limits,
    pub names: Names,
    pub nodes: Vec<NodeSpec>,
    pub lines: Vec<LineSpec>,
    pub models: Vec<ModelSpec>,
    pub needs: Vec<NeedSpec>,
}

/// The names that the file gives, also to what could not be read: nobody who uses such a name is to blame.
#[derive(Clone, Debug, Default)]
pub(super) struct Names {
    /// None: the section is there and cannot be read, or it is missing though it must be there.
    pub nodes: Option<Vec<Placed<String>>>,
    /// As for nodes.
    pub lines: Option<Vec<Placed<String>>>,
    /// As for nodes.
    pub models: Option<Vec<Placed<String>>>,
    /// Where the nodes stand.
    pub nodes_place: Place,
}

/// Liquid and place.
#[derive(Clone, Copy, Debug)]
pub(super) struct SiteSpec {
    pub fluid: Fluid,
    pub gravity: f64,
    pub barometer: f64,
}

#[derive(Clone, Debug)]
pub(super) struct NodeSpec {
    pub name: String,
    pub kind: NodeKindSpec,
}

#[derive(Clone, Copy, Debug)]
pub(super) enum NodeKindSpec {
    Point {
        elevation: f64,
        draw: f64,
    },
    Reservoir {
        surface: f64,
        pressure: f64,
    },
    Outlet {
        elevation: f64,
    },
    Tank {
        floor: f64,
        level: f64,
        pressure: f64,
    },
}

/// A line, or a bank of them.
#[derive(Clone, Debug)]
pub(super) struct LineSpec {
    pub name: String,
    pub place: Place,
    pub from: Placed<String>,
    pub to: Placed<String>,
    pub ports: [Option<f64>; 2],
    pub bell: Option<Placed<Bell>>,
    /// Number in the bank; none: a single line.
    pub count: Option<u32>,
    pub parts: Vec<PartSpec>,
    /// Members of the bank that differ, by number from 1.
    pub members: Vec<(u32, Vec<PartSpec>)>,
}

#[derive(Clone, Debug)]
pub(super) struct PartSpec {
    pub place: Place,
    pub kind: PartKindSpec,
}

#[derive(Clone, Debug)]
pub(super) enum PartKindSpec {
    Pipe {
        length: f64,
        bore: f64,
        friction: FrictionSpec,
        k: f64,
        facts: PipeFacts,
    },
    Loss(LossSpec),
    Valve {
        loss: LossSpec,
        characteristic: Characteristic,
        open: bool,
        opening: f64,
    },
    CheckValve {
        loss: LossSpec,
        characteristic: Characteristic,
        opening: f64,
    },
    Equipment(QuadraticLoss),
    Pump(Box<PumpSpec>),
    Regulator(Box<RegulatorSpec>),
}

/// A part that throttles itself.
#[derive(Clone, Debug)]
pub(super) struct RegulatorSpec {
    pub regulates: RegulatesSpec,
    pub loss: LossSpec,
    /// Pressure (Pa) or flow (m3/s), and where it stands.
    pub set: Placed<f64>,
    pub open: bool,
}

#[derive(Clone, Debug)]
pub(super) enum RegulatesSpec {
    Downstream,
    Upstream,
    Flow,
    MinimumFlow(Placed<String>),
}

/// What a pipe says that its flow does not depend on.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct PipeFacts {
    pub rating: Option<f64>,
    pub wave_speed: Option<f64>,
}

#[derive(Clone, Copy, Debug)]
pub(super) enum FrictionSpec {
    Roughness(f64),
    HazenWilliams(f64),
    FixedFactor(f64),
}

/// A loss that may need the bore of a neighbouring pipe.
#[derive(Clone, Copy, Debug)]
pub(super) enum LossSpec {
    K { k: f64, bore: Option<f64> },
    Known(QuadraticLoss),
}

#[derive(Clone, Debug)]
pub(super) struct PumpSpec {
    pub name: Option<Placed<String>>,
    pub model: Placed<String>,
    pub elevation: Option<f64>,
    pub speed: Option<Placed<SpeedValue>>,
    pub impeller: Option<Placed<f64>>,
    pub wear: f64,
    pub leakage: Option<Placed<f64>>,
    pub running: bool,
    pub when_stopped: Option<LossSpec>,
}

#[derive(Clone, Debug)]
pub(super) struct ModelSpec {
    pub name: String,
    pub speed: Option<f64>,
    pub impeller: Option<f64>,
    pub head: Curve,
    pub power: PowerCurve,
    pub npsh_required: Option<Curve>,
    pub best_efficiency_flow: Option<f64>,
    pub motor: Option<Motor>,
    pub drive: Option<Efficiency>,
    pub maker: MakerLimits,
    pub scaling: Scaling,
}

#[derive(Clone, Debug)]
pub(super) struct NeedSpec {
    pub name: String,
    pub target: TargetSpec,
    pub at_least: Option<f64>,
    pub at_most: Option<f64>,
}

#[derive(Clone, Debug)]
pub(super) enum TargetSpec {
    FlowInto(Placed<String>),
    FlowIn(Placed<String>),
    PressureAt(Placed<String>),
}

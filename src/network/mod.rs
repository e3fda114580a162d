//! The network: nodes, lines and what stands in them, checked and immutable; and the settings that may change.
//!
//! Names appear here so that answers can be told in the user's words; nothing below this module looks at them. No
//! input or output.

mod build;
mod feasible;
mod figure;
mod judged;
mod limits;
mod line;
mod need;
mod reach;
mod settings;
mod spread;

pub use crate::part::pump::performance::AsBuilt;
pub use build::{BuildError, NetworkBuilder};
pub use figure::{Figure, PartFigure, Varied};
pub use limits::{LimitName, Limits, Measure};
pub use line::{Bell, Line, LineFacts};
pub use need::{Need, Target};
pub use reach::{Passage, Reach, Standing, Unreachable};
pub use settings::{
    CheckCondition, PumpSetting, RegulatorSetting, Settings, TankMode, ValveSetting,
};
pub use spread::{Shape, Spread};

use crate::fluid::Fluid;
use crate::part::pump::performance::{Condition, Performance};
use crate::part::pump::{Covers, Pump, PumpModel};
use crate::part::regulator::Regulator;
use crate::part::valve::Valve;
use crate::part::{Part, PumpId, RegulatorId, ValveId};

/// Which node of a network; handed out by the network alone.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct NodeId(pub(crate) u32);

/// Which line of a network; handed out by the network alone.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct LineId(pub(crate) u32);

impl NodeId {
    /// Position among the network's nodes.
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

impl LineId {
    /// Position among the network's lines.
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

/// A node: where lines meet, or where the system ends.
#[derive(Clone, Debug, PartialEq)]
pub struct Node {
    /// The user's name for it.
    pub name: String,
    /// What it is.
    pub kind: NodeKind,
}

/// What a node is. Elevations in m above the datum.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum NodeKind {
    /// Where lines meet; no storage.
    Point {
        /// Elevation.
        elevation: f64,
    },
    /// A free surface that stays where it is; its elevation and the gas pressure on it are settings.
    Reservoir,
    /// A tank; fixed at its level (a setting) in a steady solution.
    Tank {
        /// Elevation of the floor.
        floor: f64,
    },
    /// Free discharge to the open air; nothing comes back in.
    Outlet {
        /// Elevation of the discharge.
        elevation: f64,
    },
}

impl Node {
    /// Elevation of a point or outlet, or of a tank's floor, m; a reservoir has none but its surface.
    pub fn elevation(&self) -> Option<f64> {
        match self.kind {
            NodeKind::Point { elevation } | NodeKind::Outlet { elevation } => Some(elevation),
            NodeKind::Tank { floor } => Some(floor),
            NodeKind::Reservoir => None,
        }
    }
}

/// One of the two ends of a line.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum End {
    /// The first.
    From,
    /// The last.
    To,
}

/// A bank: equal lines side by side.
#[derive(Clone, Debug, PartialEq)]
pub struct Bank {
    /// The user's name for it.
    pub name: String,
    /// Its members.
    pub lines: Vec<LineId>,
}

/// Which way water can go through a line.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Direction {
    /// Both ways.
    Both,
    /// From `from` to `to` only.
    Forward,
    /// From `to` to `from` only.
    Backward,
    /// Neither: a check valve and an outlet face each other.
    Neither,
}

impl Direction {
    /// From what keeps water from flowing back, and from flowing forward.
    fn of(forward_only: bool, backward_only: bool) -> Self {
        match (forward_only, backward_only) {
            (false, false) => Self::Both,
            (true, false) => Self::Forward,
            (false, true) => Self::Backward,
            (true, true) => Self::Neither,
        }
    }

    /// Whether forward flow can pass.
    pub fn forward(self) -> bool {
        matches!(self, Self::Both | Self::Forward)
    }

    /// Whether backward flow can pass.
    pub fn backward(self) -> bool {
        matches!(self, Self::Both | Self::Backward)
    }
}

/// A network: names unique, each line joins two of its nodes and has a part, every figure finite and in range.
/// Immutable; what may change is in [`Settings`].
#[derive(Clone, Debug, PartialEq)]
pub struct Network {
    nodes: Vec<Node>,
    lines: Vec<Line>,
    directions: Vec<Direction>,
    /// Per line: a regulating part lets nothing back through it.
    held_one_way: Vec<bool>,
    banks: Vec<Bank>,
    pumps: Vec<Pump>,
    pump_lines: Vec<LineId>,
    valve_lines: Vec<LineId>,
    valves: Vec<Valve>,
    regulators: Vec<Regulator>,
    regulator_lines: Vec<LineId>,
    models: Vec<PumpModel>,
    covers: Vec<Option<Covers>>,
    settings: Settings,
    limits: Limits,
    fluid: Fluid,
    gravity: f64,
    barometer: f64,
}

impl Network {
    /// Nodes in order; `nodes()[id.index()]`.
    pub fn nodes(&self) -> &[Node] {
        &self.nodes
    }

    /// Lines in order.
    pub fn lines(&self) -> &[Line] {
        &self.lines
    }

    /// Banks in order.
    pub fn banks(&self) -> &[Bank] {
        &self.banks
    }

    /// Pumps in order.
    pub fn pumps(&self) -> &[Pump] {
        &self.pumps
    }

    /// Pump models in order.
    pub fn models(&self) -> &[PumpModel] {
        &self.models
    }

    /// A node.
    pub fn node(&self, id: NodeId) -> &Node {
        &self.nodes[id.index()]
    }

    /// A line.
    pub fn line(&self, id: LineId) -> &Line {
        &self.lines[id.index()]
    }

    /// A pump.
    pub fn pump(&self, id: PumpId) -> &Pump {
        &self.pumps[id.index()]
    }

    /// A pump's model.
    pub fn model(&self, id: PumpId) -> &PumpModel {
        &self.models[self.pump(id).model]
    }

    /// What a pump does when it runs under these settings, as a function of its flow.
    pub fn performance(&self, id: PumpId, settings: &Settings) -> Performance<'_> {
        self.performance_in(id, settings, self.fluid.kinematic_viscosity)
    }

    /// [`Self::performance`] in a liquid of this kinematic viscosity, m2/s.
    pub fn performance_in(
        &self,
        id: PumpId,
        settings: &Settings,
        viscosity: f64,
    ) -> Performance<'_> {
        let setting = settings.pump(id);
        let condition = Condition {
            speed: setting.speed,
            trim: setting.trim,
            wear: setting.wear,
            leakage: setting.leakage,
            built: setting.built,
        };
        Performance::new(self.model(id), condition, viscosity)
    }

    /// The line a pump stands in.
    pub fn line_of(&self, id: PumpId) -> LineId {
        self.pump_lines[id.index()]
    }

    /// The line a valve stands in.
    pub fn line_of_valve(&self, id: ValveId) -> LineId {
        self.valve_lines[id.index()]
    }

    /// A valve.
    pub fn valve(&self, id: ValveId) -> &Valve {
        &self.valves[id.index()]
    }

    /// Regulating parts in order.
    pub fn regulators(&self) -> &[Regulator] {
        &self.regulators
    }

    /// A regulating part.
    pub fn regulator(&self, id: RegulatorId) -> &Regulator {
        &self.regulators[id.index()]
    }

    /// The line a regulating part stands in.
    pub fn line_of_regulator(&self, id: RegulatorId) -> LineId {
        self.regulator_lines[id.index()]
    }

    /// A regulating part as users call it: `LINE.PART`.
    pub fn regulator_name(&self, id: RegulatorId) -> String {
        let line = self.line(self.line_of_regulator(id));
        format!("{}.{}", line.name, self.regulator(id).regulates.word())
    }

    /// All ids of regulating parts.
    pub fn regulator_ids(&self) -> impl ExactSizeIterator<Item = RegulatorId> + use<> {
        (0..self.regulators.len() as u32).map(RegulatorId)
    }

    /// The falling stand-ins for a pump's head curve, if that droops.
    pub fn covers(&self, id: PumpId) -> Option<&Covers> {
        self.covers[self.pump(id).model].as_ref()
    }

    /// Whether two lines hold the same parts in the same order, valves standing alike; names and elevations aside.
    pub fn equal_parts(&self, a: LineId, b: LineId, settings: &Settings) -> bool {
        let (a, b) = (&self.line(a).parts, &self.line(b).parts);
        let equal = |(a, b): (&Part, &Part)| match (a, b) {
            (Part::Pipe(a), Part::Pipe(b)) => a == b,
            (Part::Loss(a), Part::Loss(b)) | (Part::CheckValve(a), Part::CheckValve(b)) => a == b,
            (Part::Valve(a), Part::Valve(b)) => {
                self.valve(*a) == self.valve(*b) && settings.valve(*a) == settings.valve(*b)
            }
            (Part::Regulator(a), Part::Regulator(b)) => {
                let (what, other) = (self.regulator(*a), self.regulator(*b));
                what.wide_open == other.wide_open
                    && what.regulates.word() == other.regulates.word()
                    && settings.regulator(*a) == settings.regulator(*b)
            }
            (Part::Pump(a), Part::Pump(b)) => {
                self.pump(*a).model == self.pump(*b).model
                    && self.pump(*a).when_stopped == self.pump(*b).when_stopped
            }
            _ => false,
        };
        a.len() == b.len() && a.iter().zip(b).all(equal)
    }

    /// Which way water can go through a line as it stands: by its check valves, the outlets at its ends and the ports above
    /// a tank's surface.
    pub fn direction(&self, id: LineId, settings: &Settings) -> Direction {
        let standing = self.directions[id.index()];
        let stuck = settings.check(id) == CheckCondition::StuckOpen;
        let from = self.above_surface(id, End::From, settings).is_some();
        let to = self.above_surface(id, End::To, settings).is_some();
        if !(stuck || from || to) {
            return standing;
        }
        let checked = self.line(id).has_check_valve() && !stuck || self.held_one_way[id.index()];
        let outlet = |node: NodeId| matches!(self.node(node).kind, NodeKind::Outlet { .. });
        let ends = self.line(id);
        Direction::of(checked || outlet(ends.to) || to, outlet(ends.from) || from)
    }

    /// All node ids.
    pub fn node_ids(&self) -> impl ExactSizeIterator<Item = NodeId> + use<> {
        (0..self.nodes.len() as u32).map(NodeId)
    }

    /// All line ids.
    pub fn line_ids(&self) -> impl ExactSizeIterator<Item = LineId> + use<> {
        (0..self.lines.len() as u32).map(LineId)
    }

    /// All pump ids.
    pub fn pump_ids(&self) -> impl ExactSizeIterator<Item = PumpId> + use<> {
        (0..self.pumps.len() as u32).map(PumpId)
    }

    /// All valve ids.
    pub fn valve_ids(&self) -> impl ExactSizeIterator<Item = ValveId> + use<> {
        (0..self.valves.len() as u32).map(ValveId)
    }

    /// The node of that name.
    pub fn find_node(&self, name: &str) -> Option<NodeId> {
        self.nodes
            .iter()
            .position(|node| node.name == name)
            .map(|i| NodeId(i as u32))
    }

    /// The line of that name.
    pub fn find_line(&self, name: &str) -> Option<LineId> {
        self.lines
            .iter()
            .position(|line| line.name == name)
            .map(|i| LineId(i as u32))
    }

    /// The pump of that name.
    pub fn find_pump(&self, name: &str) -> Option<PumpId> {
        self.pumps
            .iter()
            .position(|pump| pump.name == name)
            .map(|i| PumpId(i as u32))
    }

    /// The settings as the network was built.
    pub fn settings(&self) -> &Settings {
        &self.settings
    }

    /// The limits that this system is judged by.
    pub fn limits(&self) -> &Limits {
        &self.limits
    }

    /// The liquid.
    pub fn fluid(&self) -> &Fluid {
        &self.fluid
    }

    /// Acceleration of gravity, m/s2.
    pub fn gravity(&self) -> f64 {
        self.gravity
    }

    /// Air pressure, absolute, Pa.
    pub fn barometer(&self) -> f64 {
        self.barometer
    }

    /// Whether a node is a point: no fixed head.
    pub fn is_point(&self, id: NodeId) -> bool {
        matches!(self.node(id).kind, NodeKind::Point { .. })
    }

    /// Total head (m above the datum) that a node is held at; none for a point and for a tank that passes on.
    pub fn fixed_head(&self, id: NodeId, settings: &Settings) -> Option<f64> {
        let level = settings.level(id);
        let gas = settings.gas_pressure(id) / (self.fluid.density * self.gravity);
        match self.node(id).kind {
            NodeKind::Point { .. } => None,
            NodeKind::Reservoir => Some(level + gas),
            NodeKind::Tank { .. } if settings.tank_mode(id) == TankMode::Passing => None,
            NodeKind::Tank { floor } => Some(floor + level + gas),
            NodeKind::Outlet { elevation } => Some(elevation),
        }
    }

    /// How far (m) an end of a line stands above the surface of the tank there; none where it is below the surface, or
    /// there is no tank that holds its head.
    pub fn above_surface(&self, line: LineId, end: End, settings: &Settings) -> Option<f64> {
        let line = self.line(line);
        let (node, port) = match end {
            End::From => (line.from, line.ports[0]),
            End::To => (line.to, line.ports[1]),
        };
        let above = port? - settings.level(node);
        let held = matches!(self.node(node).kind, NodeKind::Tank { .. })
            && settings.tank_mode(node) == TankMode::Held;
        (held && above > 0.0).then_some(above)
    }

    /// Elevation at which a node's pressure is stated, m; a reservoir's is its surface.
    pub fn elevation(&self, id: NodeId, settings: &Settings) -> f64 {
        match self.node(id).kind {
            NodeKind::Point { elevation } | NodeKind::Outlet { elevation } => elevation,
            NodeKind::Reservoir => settings.level(id),
            NodeKind::Tank { floor } => floor,
        }
    }

    /// Gauge pressure (Pa) at a node whose total head is `head`.
    ///
    /// p = rho g (head - elevation); at a reservoir its gas pressure, at a tank that at its floor, at an outlet 0.
    pub fn pressure(&self, id: NodeId, head: f64, settings: &Settings) -> f64 {
        match self.node(id).kind {
            NodeKind::Reservoir => settings.gas_pressure(id),
            NodeKind::Outlet { .. } => 0.0,
            NodeKind::Point { .. } | NodeKind::Tank { .. } => {
                self.fluid.density * self.gravity * (head - self.elevation(id, settings))
            }
        }
    }
}

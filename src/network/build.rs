//! Building a network piece by piece, with every guarantee of [`Network`] checked on the way.

use std::collections::HashSet;

use super::{
    Bank, Direction, End, Limits, Line, LineFacts, LineId, Network, Node, NodeId, NodeKind,
    PumpSetting, RegulatorSetting, Settings, ValveSetting,
};
use crate::fluid::Fluid;
use crate::part::pump::{Covers, Pump, PumpModel};
use crate::part::regulator::{Regulates, Regulator};
use crate::part::valve::Valve;
use crate::part::{Part, PumpId, RegulatorId, ValveId};

/// Why a network could not be built.
#[derive(Clone, Debug, PartialEq)]
pub enum BuildError {
    /// A name is used twice.
    NameTwice(String),
    /// A line has no part.
    EmptyLine(String),
    /// A line starts and ends at the same node.
    SelfLoop(String),
    /// A figure is not finite or out of range.
    OutOfRange {
        /// Of what.
        name: String,
        /// Which figure.
        figure: &'static str,
        /// Its value, SI.
        value: f64,
    },
    /// An id is not from this network, or a pump or valve stands in no line or in two.
    Foreign(String),
    /// A regulating part is to hold the pressure of a node whose head is fixed.
    NotHeld(String),
    /// No reservoir, tank or outlet holds a head.
    NoFixedHead,
    /// More than `u32::MAX` nodes or lines.
    TooLarge,
}

impl std::fmt::Display for BuildError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::NameTwice(name) => write!(f, "the name `{name}` is used twice"),
            Self::EmptyLine(name) => write!(f, "line `{name}` has no part"),
            Self::SelfLoop(name) => write!(f, "line `{name}` starts and ends at the same node"),
            Self::OutOfRange {
                name,
                figure,
                value,
            } => {
                write!(f, "{figure} of `{name}` is out of range: {value}")
            }
            Self::Foreign(name) => write!(
                f,
                "`{name}` refers to something that is not in this network, or twice"
            ),
            Self::NotHeld(name) => write!(
                f,
                "`{name}` cannot hold the pressure of a node that is no point"
            ),
            Self::NoFixedHead => write!(f, "no reservoir, tank or outlet holds a head"),
            Self::TooLarge => write!(f, "the network is too large"),
        }
    }
}

impl std::error::Error for BuildError {}

/// Collects nodes, pump models, pumps, valves and lines; [`NetworkBuilder::build`] checks them.
///
/// ```
/// use dutybank::fluid::Fluid;
/// use dutybank::network::{NetworkBuilder, NodeKind};
/// use dutybank::part::{Part, friction::{Friction, Pipe}};
///
/// let fluid = Fluid::water(293.15)?;
/// let mut net = NetworkBuilder::new(fluid, 9.80665, 101_325.0);
/// let tower = net.node("tower", NodeKind::Reservoir, 0.0, 30.0);
/// let tap = net.node("tap", NodeKind::Point { elevation: 2.0 }, 0.004, 0.0);
/// let friction = Friction::roughness(120.0, 0.08, 1e-4, fluid.kinematic_viscosity, 9.80665);
/// net.line("main", tower, tap, vec![Part::Pipe(Pipe { length: 120.0, bore: 0.08, friction })]);
/// let network = net.build()?;
/// assert_eq!(network.lines().len(), 1);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
pub struct NetworkBuilder {
    network: Network,
}

impl NetworkBuilder {
    /// Nothing yet but the liquid, gravity (m/s2) and air pressure (absolute, Pa).
    pub fn new(fluid: Fluid, gravity: f64, barometer: f64) -> Self {
        Self {
            network: Network {
                nodes: Vec::new(),
                lines: Vec::new(),
                directions: Vec::new(),
                held_one_way: Vec::new(),
                banks: Vec::new(),
                pumps: Vec::new(),
                pump_lines: Vec::new(),
                valve_lines: Vec::new(),
                valves: Vec::new(),
                regulators: Vec::new(),
                regulator_lines: Vec::new(),
                models: Vec::new(),
                covers: Vec::new(),
                settings: Settings::new(),
                limits: Limits::default(),
                fluid,
                gravity,
                barometer,
            },
        }
    }

    /// Adds a node with its draw (m3/s, at a point) and its level or surface (m, at a tank or reservoir).
    pub fn node(
        &mut self,
        name: impl Into<String>,
        kind: NodeKind,
        draw: f64,
        level: f64,
    ) -> NodeId {
        let id = NodeId(self.network.nodes.len() as u32);
        self.network.nodes.push(Node {
            name: name.into(),
            kind,
        });
        self.network.settings.add_node(draw, level, 0.0);
        id
    }

    /// Adds a pump model; returns its position for [`Pump::model`].
    pub fn model(&mut self, model: PumpModel) -> usize {
        self.network.covers.push(Covers::of(&model.head));
        self.network.models.push(model);
        self.network.models.len() - 1
    }

    /// Adds a pump; put its id into one line as [`Part::Pump`].
    pub fn pump(&mut self, pump: Pump, setting: PumpSetting) -> PumpId {
        let id = PumpId(self.network.pumps.len() as u32);
        self.network.pumps.push(pump);
        self.network.settings.add_pump(setting);
        id
    }

    /// Adds a valve; put its id into one line as [`Part::Valve`].
    pub fn valve(&mut self, valve: Valve, setting: ValveSetting) -> ValveId {
        let id = ValveId(self.network.valves.len() as u32);
        self.network.valves.push(valve);
        self.network.settings.add_valve(setting);
        id
    }

    /// Adds a regulating part; put its id into one line as [`Part::Regulator`].
    pub fn regulator(&mut self, regulator: Regulator, setting: RegulatorSetting) -> RegulatorId {
        let id = RegulatorId(self.network.regulators.len() as u32);
        self.network.regulators.push(regulator);
        self.network.settings.add_regulator(setting);
        id
    }

    /// Names the pump that a part with [`Regulates::MinimumFlow`] protects; lines may come in any order.
    pub fn protect(&mut self, id: RegulatorId, pump: PumpId) {
        if let Some(regulator) = self.network.regulators.get_mut(id.index()) {
            regulator.regulates = Regulates::MinimumFlow { pump };
        }
    }

    /// A pump added before, by its name.
    pub fn find_pump(&self, name: &str) -> Option<PumpId> {
        self.network.find_pump(name)
    }

    /// Names of the pumps added before.
    pub fn pump_names(&self) -> impl Iterator<Item = &str> {
        self.network.pumps.iter().map(|pump| pump.name.as_str())
    }

    /// Whether a pump stands in the line of that name.
    pub fn stands_in(&self, pump: PumpId, line: &str) -> bool {
        let line = self.network.lines.iter().find(|other| other.name == line);
        line.is_some_and(|line| line.pumps().any(|other| other == pump))
    }

    /// Name and kind of a node added before.
    pub fn named(&self, node: NodeId) -> (&str, &NodeKind) {
        let node = self.network.node(node);
        (&node.name, &node.kind)
    }

    /// Adds a line.
    pub fn line(
        &mut self,
        name: impl Into<String>,
        from: NodeId,
        to: NodeId,
        parts: Vec<Part>,
    ) -> LineId {
        let id = LineId(self.network.lines.len() as u32);
        self.network.lines.push(Line {
            name: name.into(),
            from,
            to,
            ports: [None, None],
            parts,
            facts: LineFacts::default(),
        });
        self.network.settings.add_line();
        id
    }

    /// Sets the height (m) of an end of a line above the floor of the tank there.
    pub fn port(&mut self, line: LineId, end: End, height: f64) {
        self.network.lines[line.index()].ports[end as usize] = Some(height);
    }

    /// Says what is known of a line that its flow does not depend on.
    pub fn facts(&mut self, line: LineId, facts: LineFacts) {
        self.network.lines[line.index()].facts = facts;
    }

    /// The limits that the system is judged by; the defaults if not given.
    pub fn limits(&mut self, limits: Limits) {
        self.network.limits = limits;
    }

    /// A model added before, by its position.
    pub fn model_at(&self, model: usize) -> Option<&PumpModel> {
        self.network.models.get(model)
    }

    /// Elevation (m) of a node added before; a reservoir's is its surface, a tank's its floor.
    pub fn elevation(&self, node: NodeId) -> f64 {
        self.network.elevation(node, &self.network.settings)
    }

    /// Whether a node added before has a free surface: a reservoir or a tank.
    pub fn has_free_surface(&self, node: NodeId) -> bool {
        let kind = self.network.node(node).kind;
        matches!(kind, NodeKind::Reservoir | NodeKind::Tank { .. })
    }

    /// Changes the settings the network starts with.
    pub fn settings_mut(&mut self) -> &mut Settings {
        &mut self.network.settings
    }

    /// Names lines that stand side by side as one bank.
    pub fn bank(&mut self, name: impl Into<String>, lines: Vec<LineId>) {
        self.network.banks.push(Bank {
            name: name.into(),
            lines,
        });
    }

    /// Checks the whole.
    ///
    /// # Errors
    /// The first [`BuildError`] found.
    pub fn build(mut self) -> Result<Network, BuildError> {
        self.check_size()?;
        self.check_names()?;
        self.check_nodes()?;
        self.check_lines()?;
        self.check_pumps()?;
        self.check_regulators()?;
        let network = &mut self.network;
        let one_way = |line: &Line| {
            line.regulators()
                .any(|id| network.regulators[id.index()].regulates.one_way())
        };
        network.held_one_way = network.lines.iter().map(one_way).collect();
        network.directions = network
            .lines
            .iter()
            .zip(&network.held_one_way)
            .map(|(line, one_way)| direction(line, *one_way, &network.nodes))
            .collect();
        Ok(self.network)
    }

    fn check_size(&self) -> Result<(), BuildError> {
        let limit = u32::MAX as usize / 4;
        let fits = self.network.nodes.len() < limit && self.network.lines.len() < limit;
        fits.then_some(()).ok_or(BuildError::TooLarge)
    }

    fn check_names(&self) -> Result<(), BuildError> {
        fn unique<'a>(names: impl Iterator<Item = &'a String>) -> Result<(), BuildError> {
            let mut seen = HashSet::new();
            for name in names {
                if !seen.insert(name) {
                    return Err(BuildError::NameTwice(name.clone()));
                }
            }
            Ok(())
        }
        unique(self.network.nodes.iter().map(|node| &node.name))?;
        unique(self.network.lines.iter().map(|line| &line.name))?;
        unique(self.network.pumps.iter().map(|pump| &pump.name))?;
        unique(self.network.models.iter().map(|model| &model.name))
    }

    fn check_nodes(&self) -> Result<(), BuildError> {
        let network = &self.network;
        for (id, node) in network.node_ids().zip(&network.nodes) {
            finite(&node.name, "draw", network.settings.draw(id))?;
            finite(&node.name, "level", network.settings.level(id))?;
            finite(&node.name, "pressure", network.settings.gas_pressure(id))?;
            match node.kind {
                NodeKind::Point { elevation } | NodeKind::Outlet { elevation } => {
                    finite(&node.name, "elevation", elevation)?;
                }
                NodeKind::Reservoir => {}
                NodeKind::Tank { floor } => finite(&node.name, "floor", floor)?,
            }
        }
        let holds_head = |node: &Node| !matches!(node.kind, NodeKind::Point { .. });
        network
            .nodes
            .iter()
            .any(holds_head)
            .then_some(())
            .ok_or(BuildError::NoFixedHead)
    }

    fn check_lines(&mut self) -> Result<(), BuildError> {
        let network = &mut self.network;
        let mut pump_lines = vec![None; network.pumps.len()];
        let mut valve_lines = vec![None; network.valves.len()];
        let mut regulator_lines = vec![None; network.regulators.len()];
        for (index, line) in network.lines.iter().enumerate() {
            let foreign = || BuildError::Foreign(line.name.clone());
            if line.from.index().max(line.to.index()) >= network.nodes.len() {
                return Err(foreign());
            }
            if line.from == line.to {
                return Err(BuildError::SelfLoop(line.name.clone()));
            }
            for port in line.ports.into_iter().flatten() {
                not_negative(&line.name, "port", port)?;
            }
            if line.parts.is_empty() {
                return Err(BuildError::EmptyLine(line.name.clone()));
            }
            for part in &line.parts {
                match part {
                    Part::Pump(id) => {
                        let place = pump_lines.get_mut(id.index()).ok_or_else(foreign)?;
                        if place.replace(LineId(index as u32)).is_some() {
                            return Err(foreign());
                        }
                    }
                    Part::Valve(id) => {
                        let place = valve_lines.get_mut(id.index()).ok_or_else(foreign)?;
                        if place.replace(LineId(index as u32)).is_some() {
                            return Err(foreign());
                        }
                    }
                    Part::Regulator(id) => {
                        let place = regulator_lines.get_mut(id.index()).ok_or_else(foreign)?;
                        if place.replace(LineId(index as u32)).is_some() {
                            return Err(foreign());
                        }
                    }
                    Part::Pipe(pipe) => {
                        above_zero(&line.name, "length", pipe.length)?;
                        above_zero(&line.name, "bore", pipe.bore)?;
                    }
                    Part::Loss(loss) | Part::CheckValve(loss) => {
                        not_negative(&line.name, "loss", loss.r())?
                    }
                }
            }
        }
        network.valve_lines = valve_lines
            .into_iter()
            .map(|line| line.ok_or_else(|| BuildError::Foreign("a valve".to_owned())))
            .collect::<Result<_, _>>()?;
        network.regulator_lines = regulator_lines
            .into_iter()
            .map(|line| line.ok_or_else(|| BuildError::Foreign("a regulating part".to_owned())))
            .collect::<Result<_, _>>()?;
        network.pump_lines = pump_lines
            .into_iter()
            .zip(&network.pumps)
            .map(|(line, pump)| line.ok_or_else(|| BuildError::Foreign(pump.name.clone())))
            .collect::<Result<_, _>>()?;
        Ok(())
    }

    fn check_pumps(&self) -> Result<(), BuildError> {
        let network = &self.network;
        for (id, pump) in network.pump_ids().zip(&network.pumps) {
            if pump.model >= network.models.len() {
                return Err(BuildError::Foreign(pump.name.clone()));
            }
            finite(&pump.name, "elevation", pump.elevation)?;
            let setting = network.settings.pump(id);
            above_zero(&pump.name, "speed", setting.speed)?;
            above_zero(&pump.name, "impeller", setting.trim)?;
            if !(0.0..1.0).contains(&setting.wear) {
                return Err(out_of_range(&pump.name, "wear", setting.wear));
            }
            // Where head rises with flow, so may the leakage, faster than the flow: then no one flow inside fits.
            let falls = network.covers(id).is_none();
            if !(0.0..1.0).contains(&setting.leakage) || setting.leakage > 0.0 && !falls {
                return Err(out_of_range(&pump.name, "leakage", setting.leakage));
            }
        }
        Ok(())
    }

    /// Set values, and that what a regulating part holds or feels is there to be held.
    fn check_regulators(&self) -> Result<(), BuildError> {
        let network = &self.network;
        for id in network.regulator_ids() {
            let name = network.regulator_name(id);
            let set = network.settings.regulator(id).set;
            let line = network.line(network.line_of_regulator(id));
            match network.regulator(id).regulates {
                Regulates::Downstream if !network.is_point(line.to) => {
                    return Err(BuildError::NotHeld(name));
                }
                Regulates::Upstream if !network.is_point(line.from) => {
                    return Err(BuildError::NotHeld(name));
                }
                Regulates::Downstream | Regulates::Upstream => finite(&name, "pressure", set)?,
                Regulates::Flow => above_zero(&name, "flow", set)?,
                Regulates::MinimumFlow { pump } => {
                    if pump.index() >= network.pumps.len() {
                        return Err(BuildError::Foreign(name));
                    }
                    above_zero(&name, "flow", set)?;
                }
            }
        }
        Ok(())
    }
}

/// Which way water can go, by check valves and regulating parts in the line and outlets at its ends.
fn direction(line: &Line, held_one_way: bool, nodes: &[Node]) -> Direction {
    let outlet = |id: NodeId| matches!(nodes[id.index()].kind, NodeKind::Outlet { .. });
    let forward_only = held_one_way || line.has_check_valve() || outlet(line.to);
    Direction::of(forward_only, outlet(line.from))
}

fn out_of_range(name: &str, figure: &'static str, value: f64) -> BuildError {
    BuildError::OutOfRange {
        name: name.to_owned(),
        figure,
        value,
    }
}

fn finite(name: &str, figure: &'static str, value: f64) -> Result<(), BuildError> {
    value
        .is_finite()
        .then_some(())
        .ok_or_else(|| out_of_range(name, figure, value))
}

fn above_zero(name: &str, figure: &'static str, value: f64) -> Result<(), BuildError> {
    (value.is_finite() && value > 0.0)
        .then_some(())
        .ok_or_else(|| out_of_range(name, figure, value))
}

fn not_negative(name: &str, figure: &'static str, value: f64) -> Result<(), BuildError> {
    (value.is_finite() && value >= 0.0)
        .then_some(())
        .ok_or_else(|| out_of_range(name, figure, value))
}

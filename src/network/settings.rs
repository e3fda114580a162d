//! What may change without rebuilding the network: which pumps run and how fast, valves, draws, levels.

use super::{LineId, NodeId, PumpId, ValveId};
use crate::part::RegulatorId;
use crate::part::pump::performance::AsBuilt;

/// How a pump is run.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PumpSetting {
    /// Whether it runs.
    pub running: bool,
    /// Speed over its model's speed, above zero.
    pub speed: f64,
    /// Impeller over the model's full impeller, above zero.
    pub trim: f64,
    /// Share of the head lost to wear, 0 to below 1.
    pub wear: f64,
    /// How it was built.
    pub built: AsBuilt,
    /// Flow that runs back inside at best efficiency, over best-efficiency flow, 0 to below 1.
    pub leakage: f64,
}

impl PumpSetting {
    /// Running, at the model's speed, untrimmed, unworn.
    pub const NEW: Self = Self {
        running: true,
        speed: 1.0,
        trim: 1.0,
        wear: 0.0,
        built: AsBuilt::AS_SHEET,
        leakage: 0.0,
    };

    /// Speed ratio times trim ratio: the one ratio of the affinity laws.
    pub fn ratio(&self) -> f64 {
        self.speed * self.trim
    }
}

/// How a valve stands.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ValveSetting {
    /// Whether it is open at all.
    pub open: bool,
    /// Opening, 0 to 1.
    pub opening: f64,
}

impl ValveSetting {
    /// Fully open.
    pub const OPEN: Self = Self {
        open: true,
        opening: 1.0,
    };
}

/// How a regulating part is set.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RegulatorSetting {
    /// Whether it works at all; else it is shut.
    pub open: bool,
    /// Its set value: gauge pressure (Pa) at the elevation of the node it holds, or flow (m3/s).
    pub set: f64,
}

/// Whether a tank holds its head.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum TankMode {
    /// It does: fixed at its level.
    #[default]
    Held,
    /// It does not: like a point it passes on what flows in, less its draw.
    Passing,
}

/// How the check valves of a line do.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum CheckCondition {
    /// They let nothing back.
    #[default]
    Working,
    /// They let water back as they let it forward.
    StuckOpen,
    /// They let nothing through.
    StuckShut,
}

/// One entry for each adjustable thing of a network. A change never changes the pattern of the equations.
#[derive(Clone, Debug, PartialEq)]
pub struct Settings {
    /// Per node: flow leaving the system there, m3/s; negative where it enters. Used at points.
    draws: Vec<f64>,
    /// Per node: a reservoir's surface (m above the datum) or a tank's level (m above its floor).
    levels: Vec<f64>,
    /// Per node: gas pressure on a reservoir's or tank's surface, gauge, Pa.
    gas_pressures: Vec<f64>,
    tank_modes: Vec<TankMode>,
    pumps: Vec<PumpSetting>,
    valves: Vec<ValveSetting>,
    regulators: Vec<RegulatorSetting>,
    checks: Vec<CheckCondition>,
    /// Per line: a further loss, m at 1 m3/s.
    foulings: Vec<f64>,
}

impl Settings {
    pub(super) fn new() -> Self {
        Self {
            draws: Vec::new(),
            levels: Vec::new(),
            gas_pressures: Vec::new(),
            tank_modes: Vec::new(),
            pumps: Vec::new(),
            valves: Vec::new(),
            regulators: Vec::new(),
            checks: Vec::new(),
            foulings: Vec::new(),
        }
    }

    pub(super) fn add_node(&mut self, draw: f64, level: f64, gas_pressure: f64) {
        self.draws.push(draw);
        self.levels.push(level);
        self.gas_pressures.push(gas_pressure);
        self.tank_modes.push(TankMode::Held);
    }

    pub(super) fn add_line(&mut self) {
        self.checks.push(CheckCondition::Working);
        self.foulings.push(0.0);
    }

    pub(super) fn add_pump(&mut self, setting: PumpSetting) {
        self.pumps.push(setting);
    }

    pub(super) fn add_valve(&mut self, setting: ValveSetting) {
        self.valves.push(setting);
    }

    pub(super) fn add_regulator(&mut self, setting: RegulatorSetting) {
        self.regulators.push(setting);
    }

    /// Flow leaving the system at a node, m3/s.
    pub fn draw(&self, id: NodeId) -> f64 {
        self.draws[id.index()]
    }

    /// Sets [`Self::draw`].
    pub fn set_draw(&mut self, id: NodeId, draw: f64) {
        self.draws[id.index()] = draw;
    }

    /// A reservoir's surface (m above the datum) or a tank's level (m above its floor).
    pub fn level(&self, id: NodeId) -> f64 {
        self.levels[id.index()]
    }

    /// Sets [`Self::level`].
    pub fn set_level(&mut self, id: NodeId, level: f64) {
        self.levels[id.index()] = level;
    }

    /// Gas pressure on a reservoir's or tank's surface, gauge, Pa.
    pub fn gas_pressure(&self, id: NodeId) -> f64 {
        self.gas_pressures[id.index()]
    }

    /// Sets [`Self::gas_pressure`].
    pub fn set_gas_pressure(&mut self, id: NodeId, pressure: f64) {
        self.gas_pressures[id.index()] = pressure;
    }

    /// Whether a tank holds its head.
    pub fn tank_mode(&self, id: NodeId) -> TankMode {
        self.tank_modes[id.index()]
    }

    /// Sets [`Self::tank_mode`]; means nothing for other nodes.
    pub fn set_tank_mode(&mut self, id: NodeId, mode: TankMode) {
        self.tank_modes[id.index()] = mode;
    }

    /// How the check valves of a line do.
    pub fn check(&self, id: LineId) -> CheckCondition {
        self.checks[id.index()]
    }

    /// Sets [`Self::check`]; means nothing for a line without a check valve.
    pub fn set_check(&mut self, id: LineId, condition: CheckCondition) {
        self.checks[id.index()] = condition;
    }

    /// A further loss at the first end of a line, where its strainer stands: h = r q |q|, r in m at 1 m3/s.
    pub fn fouling(&self, id: LineId) -> f64 {
        self.foulings[id.index()]
    }

    /// Sets [`Self::fouling`]; finite and not negative.
    pub fn set_fouling(&mut self, id: LineId, r: f64) {
        self.foulings[id.index()] = r;
    }

    /// How a pump is run.
    pub fn pump(&self, id: PumpId) -> &PumpSetting {
        &self.pumps[id.index()]
    }

    /// Changes how a pump is run.
    pub fn pump_mut(&mut self, id: PumpId) -> &mut PumpSetting {
        &mut self.pumps[id.index()]
    }

    /// How a valve stands.
    pub fn valve(&self, id: ValveId) -> &ValveSetting {
        &self.valves[id.index()]
    }

    /// How a regulating part is set.
    pub fn regulator(&self, id: RegulatorId) -> &RegulatorSetting {
        &self.regulators[id.index()]
    }

    /// Changes how a regulating part is set.
    pub fn regulator_mut(&mut self, id: RegulatorId) -> &mut RegulatorSetting {
        &mut self.regulators[id.index()]
    }

    /// Changes how a valve stands.
    pub fn valve_mut(&mut self, id: ValveId) -> &mut ValveSetting {
        &mut self.valves[id.index()]
    }
}

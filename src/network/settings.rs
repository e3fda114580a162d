//! What may change without rebuilding the network: which pumps run and how fast, valves, draws, levels.

use super::{NodeId, PumpId, ValveId};

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
}

impl PumpSetting {
    /// Running, at the model's speed, untrimmed, unworn.
    pub const NEW: Self = Self {
        running: true,
        speed: 1.0,
        trim: 1.0,
        wear: 0.0,
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

/// One entry for each adjustable thing of a network. A change never changes the pattern of the equations.
#[derive(Clone, Debug, PartialEq)]
pub struct Settings {
    /// Per node: flow leaving the system there, m3/s; negative where it enters. Used at points.
    draws: Vec<f64>,
    /// Per node: a reservoir's surface (m above the datum) or a tank's level (m above its floor).
    levels: Vec<f64>,
    pumps: Vec<PumpSetting>,
    valves: Vec<ValveSetting>,
}

impl Settings {
    pub(super) fn new() -> Self {
        Self {
            draws: Vec::new(),
            levels: Vec::new(),
            pumps: Vec::new(),
            valves: Vec::new(),
        }
    }

    pub(super) fn add_node(&mut self, draw: f64, level: f64) {
        self.draws.push(draw);
        self.levels.push(level);
    }

    pub(super) fn add_pump(&mut self, setting: PumpSetting) {
        self.pumps.push(setting);
    }

    pub(super) fn add_valve(&mut self, setting: ValveSetting) {
        self.valves.push(setting);
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

    /// Changes how a valve stands.
    pub fn valve_mut(&mut self, id: ValveId) -> &mut ValveSetting {
        &mut self.valves[id.index()]
    }
}

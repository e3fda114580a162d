//! What happens to a network over a shift, and the rules that decide which pumps run: data only.

use super::energy::Tariff;
use super::schedule::{Daily, Schedule};
use super::tank::Tank;
use crate::network::{CheckCondition, LineId, Network, NodeId, NodeKind};
use crate::part::PumpId;
use std::fmt;

/// A flow that may change by a schedule: `rate` times its value.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Varying {
    /// m3/s, or m3/s per unit of the schedule.
    pub rate: f64,
    /// Position among the shift's schedules.
    pub times: Option<usize>,
}

impl Varying {
    /// A flow that does not change.
    pub fn steady(rate: f64) -> Self {
        Self { rate, times: None }
    }
}

/// A draw at a point of the network that changes by a schedule; a negative one is an inflow.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PointDraw {
    /// The point.
    pub node: NodeId,
    /// The draw.
    pub draw: Varying,
}

/// What happens to the network, whatever the plan.
#[derive(Clone, Debug, Default)]
pub struct Shift {
    /// Time of day at which it starts, s since midnight.
    pub starts: f64,
    /// How long it lasts, s.
    pub lasts: f64,
    /// A row is reported every so many seconds; none: only at the start, at events and at the end.
    pub report_every: Option<f64>,
    /// One for each tank of the network.
    pub tanks: Vec<Tank>,
    /// Draws at points that change. Others are what the network's settings say.
    pub draws: Vec<PointDraw>,
    /// Schedules that flows and rules refer to by position.
    pub schedules: Vec<Schedule>,
    /// What fails, and when.
    pub faults: Vec<Fault>,
    /// What electricity costs.
    pub tariff: Option<Tariff>,
    /// CO2 per energy, kg/J.
    pub carbon: Option<f64>,
    /// Relative tolerance of the volumes in a step; none: 1e-9.
    pub tolerance: Option<f64>,
}

/// Something that fails for a while.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fault {
    /// When, s from the start of the shift.
    pub at: f64,
    /// For how long, s; none: to the end.
    pub lasts: Option<f64>,
    /// What.
    pub kind: FaultKind,
}

/// What fails.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum FaultKind {
    /// A pump trips out.
    PumpOut(PumpId),
    /// The check valves of a line stick.
    CheckStuck(LineId, CheckCondition),
    /// No power to any pump.
    PowerOut,
    /// A line's strainer fouls: a further loss of this many m at 1 m3/s, growing with the square of the flow, before its first pump.
    Fouling(LineId, f64),
}

/// Rules for all pumps that are not run by hand.
#[derive(Clone, Debug, Default)]
pub struct Plan {
    /// The user's name for it.
    pub name: String,
    /// Each owns its pumps.
    pub groups: Vec<Group>,
    /// What stops pumps whatever the groups say.
    pub trips: Vec<Trip>,
    /// How long (s) after power is back the first pump may start.
    pub restart_after: f64,
}

/// Pumps that are called together.
#[derive(Clone, Debug)]
pub struct Group {
    /// The user's name for it.
    pub name: String,
    /// In the order of call.
    pub pumps: Vec<PumpId>,
    /// What calls them.
    pub call: Call,
    /// How many steps are on at the start; none: those whose start is reached.
    pub begins_with: Option<usize>,
    /// Who is called next.
    pub rotate: Rotate,
    /// Shortest run, s; only a trip or a fault breaks it.
    pub min_run: f64,
    /// Shortest rest, s.
    pub min_rest: f64,
    /// Shortest time between two starts in the group, s.
    pub stagger: f64,
    /// A pump that started so often within an hour is passed over, unless the followed tank is above its alarm.
    pub max_starts_per_hour: Option<usize>,
    /// Pumps that stood for long are run for a while.
    pub exercise: Option<Exercise>,
}

impl Group {
    /// Pumps and what calls them, with no timers.
    pub fn new(name: impl Into<String>, pumps: Vec<PumpId>, call: Call) -> Self {
        Self {
            name: name.into(),
            pumps,
            call,
            begins_with: None,
            rotate: Rotate::Never,
            min_run: 0.0,
            min_rest: 0.0,
            stagger: 0.0,
            max_starts_per_hour: None,
            exercise: None,
        }
    }
}

/// What calls pumps.
#[derive(Clone, Debug)]
pub enum Call {
    /// A figure passing the bands of steps.
    Bands(Bands),
    /// A schedule (by position) whose value is how many run.
    Clock(usize),
    /// Speed holds a figure; more or fewer pumps as the speed reaches its ends.
    Hold(Hold),
}

/// The figure that a rule looks at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Follow {
    /// Level of a tank, m above its floor.
    Level(NodeId),
    /// Gauge pressure at a node, Pa.
    Pressure(NodeId),
    /// Flow in a line, m3/s.
    Flow(LineId),
}

/// Steps with hysteresis: step k runs k pumps.
#[derive(Clone, Debug)]
pub struct Bands {
    /// What they follow.
    pub follow: Follow,
    /// At ordinary times.
    pub steps: Vec<Step>,
    /// Other levels in parts of the day; the first that fits counts.
    pub windows: Vec<Window>,
    /// How long (s) the start must be passed before a step switches on.
    pub up_delay: f64,
    /// How long (s) the stop must be passed before it switches off.
    pub down_delay: f64,
}

/// Where a step switches; start above stop empties, start below stop fills.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Step {
    /// On.
    pub start: f64,
    /// Off.
    pub stop: f64,
}

impl Step {
    /// Whether it works downwards.
    pub fn empties(&self) -> bool {
        self.start > self.stop
    }
}

/// Levels of their own in a part of the day.
#[derive(Clone, Debug)]
pub struct Window {
    /// Which part.
    pub daily: Daily,
    /// As many as the ordinary steps.
    pub steps: Vec<Step>,
}

/// A figure held by speed.
#[derive(Clone, Copy, Debug)]
pub struct Hold {
    /// Which figure.
    pub figure: Follow,
    /// At what value.
    pub at: f64,
    /// Whether the level falls as the pumps run faster; only for a level.
    pub empties: bool,
    /// Lowest and highest speed over the model's.
    pub speeds: (f64, f64),
    /// Who changes speed.
    pub style: HoldStyle,
    /// Another pump is called when the speed is at or above this,
    pub up_at: f64,
    /// for so long, s.
    pub up_delay: f64,
    /// A pump is sent home when one fewer could hold the figure at or below this speed,
    pub down_at: f64,
    /// for so long, s.
    pub down_delay: f64,
}

/// Who changes speed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum HoldStyle {
    /// All that run, alike.
    Common,
    /// The last called; the others run at the highest speed.
    Trim,
}

/// Who is called next.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Rotate {
    /// The first in order.
    #[default]
    Never,
    /// The order turns by one place at each start: the first able from there on.
    EachStart,
    /// The one with the fewest hours.
    LeastHours,
}

/// Pumps that stood for long are run for a while, beside those called.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Exercise {
    /// After standing so long, s.
    pub every: f64,
    /// For so long, s.
    pub lasts: f64,
}

/// A low level that stops pumps at once.
#[derive(Clone, Debug, PartialEq)]
pub struct Trip {
    /// Level of which tank.
    pub tank: NodeId,
    /// Where it trips, m above the floor.
    pub level: f64,
    /// Where it lets go again, m.
    pub reset: f64,
    /// Whom it stops.
    pub pumps: Vec<PumpId>,
}

/// Why a shift or a plan cannot be run. Positions count from 0.
#[derive(Clone, Debug, PartialEq)]
pub enum PlanError {
    /// A tank of the network has no shape, or something is no tank.
    NoTank(String),
    /// A pump is in two groups or twice in one.
    PumpTwice(String),
    /// A group has fewer pumps than steps, or none.
    TooFewPumps(String),
    /// A step starts and stops at the same value, or a trip resets below it.
    NoBand(String),
    /// A window has another number of steps than the group.
    WindowSteps(String),
    /// A schedule that does not exist.
    NoSchedule(String),
    /// A figure is not finite or out of range.
    OutOfRange(String, &'static str),
}

impl fmt::Display for PlanError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::NoTank(name) => write!(f, "`{name}` is not a tank whose shape is known"),
            Self::PumpTwice(name) => write!(f, "pump `{name}` is called by more than one rule"),
            Self::TooFewPumps(name) => write!(f, "`{name}` has fewer pumps than steps"),
            Self::NoBand(name) => {
                write!(f, "`{name}` would switch on and off at the same value")
            }
            Self::WindowSteps(name) => {
                write!(f, "`{name}` has a window with another number of steps")
            }
            Self::NoSchedule(name) => write!(f, "`{name}` refers to a schedule that is not there"),
            Self::OutOfRange(name, figure) => write!(f, "{figure} of `{name}` is out of range"),
        }
    }
}

impl std::error::Error for PlanError {}

impl Shift {
    /// The tank at a node.
    pub(super) fn tank_at(&self, node: NodeId) -> Option<usize> {
        self.tanks.iter().position(|tank| tank.node == node)
    }

    /// Whether it can be run on that network.
    ///
    /// # Errors
    /// The first [`PlanError`] found.
    pub fn check(&self, network: &Network) -> Result<(), PlanError> {
        let outside = |name: &str, figure| PlanError::OutOfRange(name.to_owned(), figure);
        let positive = |x: f64| x > 0.0 && x.is_finite();
        if !(self.lasts >= 0.0 && self.lasts.is_finite() && self.starts.is_finite()) {
            return Err(outside("shift", "length"));
        }
        if self.report_every.is_some_and(|every| !positive(every)) {
            return Err(outside("shift", "report_every"));
        }
        for (id, node) in network.node_ids().zip(network.nodes()) {
            let is_tank = matches!(node.kind, NodeKind::Tank { .. });
            let count = self.tanks.iter().filter(|tank| tank.node == id).count();
            if count != usize::from(is_tank) {
                return Err(PlanError::NoTank(node.name.clone()));
            }
        }
        for tank in &self.tanks {
            let name = &network.node(tank.node).name;
            if tank.shape.check().is_err()
                || !(positive(tank.brim) && tank.brim <= tank.shape.top())
            {
                return Err(outside(name, "shape"));
            }
            if !(0.0..=tank.brim).contains(&tank.level) {
                return Err(outside(name, "level"));
            }
            if let super::tank::Gas::Cushion {
                vessel, exponent, ..
            } = tank.gas
                && !(vessel > tank.capacity() && positive(exponent))
            {
                return Err(outside(name, "gas cushion"));
            }
            for flow in tank.inflows.iter().chain(&tank.draws) {
                self.check_varying(name, flow)?;
                if flow.rate < 0.0 {
                    return Err(outside(name, "inflow or draw"));
                }
            }
        }
        for draw in &self.draws {
            let name = &network.node(draw.node).name;
            if !network.is_point(draw.node) {
                return Err(outside(name, "draw"));
            }
            self.check_varying(name, &draw.draw)?;
        }
        for fault in &self.faults {
            let late = fault.lasts.is_some_and(|lasts| !positive(lasts));
            let fouled =
                matches!(fault.kind, FaultKind::Fouling(_, r) if !(r >= 0.0 && r.is_finite()));
            if !(fault.at.is_finite() && fault.at >= 0.0) || late || fouled {
                return Err(outside("faults", "a time or loss"));
            }
        }
        Ok(())
    }

    fn check_varying(&self, name: &str, flow: &Varying) -> Result<(), PlanError> {
        if !flow.rate.is_finite() {
            return Err(PlanError::OutOfRange(name.to_owned(), "rate"));
        }
        match flow.times {
            Some(i) if i >= self.schedules.len() => Err(PlanError::NoSchedule(name.to_owned())),
            _ => Ok(()),
        }
    }
}

impl Plan {
    /// Whether it can be run on that network.
    ///
    /// # Errors
    /// The first [`PlanError`] found.
    pub fn check(&self, network: &Network, shift: &Shift) -> Result<(), PlanError> {
        let mut owned = vec![false; network.pumps().len()];
        let tank = |node: NodeId| {
            let missing = || PlanError::NoTank(network.node(node).name.clone());
            shift.tank_at(node).map(|_| ()).ok_or_else(missing)
        };
        for group in &self.groups {
            let name = || group.name.clone();
            for &pump in &group.pumps {
                if std::mem::replace(&mut owned[pump.index()], true) {
                    return Err(PlanError::PumpTwice(network.pump(pump).name.clone()));
                }
            }
            if group.pumps.is_empty() {
                return Err(PlanError::TooFewPumps(name()));
            }
            for time in [group.min_run, group.min_rest, group.stagger] {
                if !(time >= 0.0 && time.is_finite()) {
                    return Err(PlanError::OutOfRange(name(), "a time"));
                }
            }
            match &group.call {
                Call::Bands(bands) => {
                    if let Follow::Level(node) = bands.follow {
                        tank(node)?;
                    }
                    if bands.steps.len() > group.pumps.len() || bands.steps.is_empty() {
                        return Err(PlanError::TooFewPumps(name()));
                    }
                    let windows = bands.windows.iter().map(|window| &window.steps);
                    for steps in windows.chain([&bands.steps]) {
                        if steps.len() != bands.steps.len() {
                            return Err(PlanError::WindowSteps(name()));
                        }
                        for (step, usual) in steps.iter().zip(&bands.steps) {
                            let sense = step.empties() == usual.empties();
                            let finite = step.start.is_finite() && step.stop.is_finite();
                            if !(finite && sense) {
                                return Err(PlanError::OutOfRange(name(), "a step"));
                            }
                            if step.start == step.stop {
                                return Err(PlanError::NoBand(name()));
                            }
                        }
                    }
                }
                Call::Clock(schedule) if *schedule >= shift.schedules.len() => {
                    return Err(PlanError::NoSchedule(name()));
                }
                Call::Clock(_) => {}
                Call::Hold(hold) => {
                    if let Follow::Level(node) = hold.figure {
                        tank(node)?;
                    }
                    let (low, high) = hold.speeds;
                    if !(low > 0.0 && high >= low && high.is_finite() && hold.at.is_finite()) {
                        return Err(PlanError::OutOfRange(name(), "speed or set point"));
                    }
                }
            }
        }
        for trip in &self.trips {
            tank(trip.tank)?;
            if trip.reset <= trip.level || !(trip.level.is_finite() && trip.reset.is_finite()) {
                return Err(PlanError::NoBand(format!(
                    "trip at {}",
                    network.node(trip.tank).name
                )));
            }
        }
        Ok(())
    }
}

//! What happened, to whom, and why: as data, and in plain words once someone says how to write a figure.

use super::plan::{FaultKind, Follow};
use crate::network::{LineId, Network, NodeId};
use crate::part::PumpId;
use crate::units::Kind;

/// Something that happened.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Event {
    /// When, s from the start of the shift.
    pub time: f64,
    /// What.
    pub what: What,
    /// To whom.
    pub who: Who,
    /// Why.
    pub why: Why,
    /// What it had to wait for.
    pub wait: Option<Wait>,
}

/// What happened, in the order in which it counts at equal times.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum What {
    /// Something failed.
    Fails,
    /// It works again.
    Recovers,
    /// A pump was stopped by a trip or a fault.
    Trip,
    /// A trip lets go.
    Reset,
    /// A tank ran empty.
    Empty,
    /// It is no longer empty.
    Refills,
    /// A tank spills.
    Spills,
    /// It no longer does.
    StopsSpilling,
    /// A level passed its alarm.
    Alarm,
    /// It is below it again.
    AlarmOver,
    /// A draw or inflow at a point is no longer met.
    Unmet,
    /// It is again.
    Met,
    /// A pump was stopped.
    Stop,
    /// A pump was started.
    Start,
    /// A check valve shut, or an outlet that the water no longer reaches.
    Shuts,
    /// It opened.
    Opens,
    /// A regulating part began to throttle.
    Regulates,
    /// It stands wide open again.
    WideOpen,
    /// A port came above the surface.
    PortUncovered,
    /// It went below it.
    PortCovered,
    /// The shift ended.
    End,
}

impl What {
    /// One word or two, as results name it.
    pub fn word(self) -> &'static str {
        match self {
            Self::Fails => "fails",
            Self::Recovers => "recovers",
            Self::Trip => "trip",
            Self::Reset => "trip reset",
            Self::Empty => "empty",
            Self::Refills => "refills",
            Self::Spills => "spills",
            Self::StopsSpilling => "stops spilling",
            Self::Alarm => "alarm",
            Self::AlarmOver => "alarm over",
            Self::Unmet => "unmet",
            Self::Met => "met",
            Self::Stop => "stop",
            Self::Start => "start",
            Self::Shuts => "held shut",
            Self::Opens => "opens",
            Self::Regulates => "regulates",
            Self::WideOpen => "wide open",
            Self::PortUncovered => "port uncovered",
            Self::PortCovered => "port covered",
            Self::End => "end",
        }
    }

    /// As a sentence has it: `duty.2 started`.
    fn told(self) -> &'static str {
        match self {
            Self::Fails => "failed",
            Self::Recovers => "is back",
            Self::Trip => "tripped",
            Self::Reset => "trip reset",
            Self::Empty => "gives no more",
            Self::Refills => "fills again",
            Self::Spills => "spills",
            Self::StopsSpilling => "no longer spills",
            Self::Alarm => "alarm",
            Self::AlarmOver => "alarm over",
            Self::Unmet => "is not met",
            Self::Met => "is met again",
            Self::Stop => "stopped",
            Self::Start => "started",
            Self::Shuts => "is held shut",
            Self::Opens => "opened",
            Self::Regulates => "regulates",
            Self::WideOpen => "stands wide open",
            Self::PortUncovered => "has a port above the surface",
            Self::PortCovered => "has its port covered again",
            Self::End => "ended",
        }
    }
}

/// To whom.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Who {
    /// A pump.
    Pump(PumpId),
    /// A node.
    Node(NodeId),
    /// A line.
    Line(LineId),
    /// The power supply.
    Power,
    /// The whole.
    Shift,
}

impl Who {
    /// The user's name for it.
    pub fn name(self, network: &Network) -> &str {
        match self {
            Self::Pump(id) => &network.pump(id).name,
            Self::Node(id) => &network.node(id).name,
            Self::Line(id) => &network.line(id).name,
            Self::Power => "power",
            Self::Shift => "shift",
        }
    }
}

/// Why.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Why {
    /// A followed figure reached a value.
    At(Follow, f64),
    /// The plan begins so.
    Begins,
    /// The clock.
    Clock,
    /// Speed reached this ratio.
    Speed(f64),
    /// One pump fewer holds the figure at this speed ratio.
    Spare(f64),
    /// A pump that was called dropped out.
    InPlaceOf(PumpId),
    /// It stood for long.
    Exercise,
    /// A fault.
    Fault(FaultKind),
    /// The fault is over.
    FaultOver(FaultKind),
    /// Inflow and outflow.
    Balance,
    /// The head along it.
    Head,
    /// Its time is up.
    Time,
}

/// What an action had to wait for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Wait {
    /// The shortest run.
    MinRun,
    /// The shortest rest.
    MinRest,
    /// The time between starts.
    Stagger,
    /// The lock on starts per hour.
    Lock,
    /// The delay of a step.
    Delay,
    /// The restart after a power failure.
    Restart,
}

impl Wait {
    fn words(self) -> &'static str {
        match self {
            Self::MinRun => "after its shortest run",
            Self::MinRest => "after its rest",
            Self::Stagger => "staggered",
            Self::Lock => "after its lock on starts",
            Self::Delay => "after the delay",
            Self::Restart => "after power came back",
        }
    }
}

impl Why {
    /// The cause in plain words, `wet_well at 1.80 m`; `write` writes a figure (SI) of a kind with its unit.
    pub fn words(&self, network: &Network, write: &dyn Fn(Kind, f64) -> String) -> String {
        match *self {
            Self::At(Follow::Level(node), level) => {
                format!(
                    "{} at {}",
                    network.node(node).name,
                    write(Kind::Length, level)
                )
            }
            Self::At(Follow::Pressure(node), pressure) => {
                format!(
                    "{} at {}",
                    network.node(node).name,
                    write(Kind::Pressure, pressure)
                )
            }
            Self::At(Follow::Flow(line), flow) => {
                format!("{} at {}", network.line(line).name, write(Kind::Flow, flow))
            }
            Self::Begins => "the plan begins so".to_owned(),
            Self::Clock => "by the clock".to_owned(),
            Self::Speed(speed) => format!("speed at {}", write(Kind::Percent, speed)),
            Self::Spare(speed) => {
                format!("one fewer holds it at {}", write(Kind::Percent, speed))
            }
            Self::InPlaceOf(pump) => format!("in place of {}", network.pump(pump).name),
            Self::Exercise => "exercise run".to_owned(),
            Self::Fault(kind) => match kind {
                FaultKind::PumpOut(_) => "fault".to_owned(),
                FaultKind::CheckStuck(line, _) => {
                    format!("check valve of {} stuck", network.line(line).name)
                }
                FaultKind::PowerOut => "power failed".to_owned(),
                FaultKind::Fouling(line, _) => {
                    format!("strainer of {} fouled", network.line(line).name)
                }
            },
            Self::FaultOver(kind) => match kind {
                FaultKind::PumpOut(_) => "fault over".to_owned(),
                FaultKind::CheckStuck(line, _) => {
                    format!("check valve of {} works again", network.line(line).name)
                }
                FaultKind::PowerOut => "power is back".to_owned(),
                FaultKind::Fouling(line, _) => {
                    format!("strainer of {} clean", network.line(line).name)
                }
            },
            Self::Balance => "by inflow and outflow".to_owned(),
            Self::Head => "by the head along it".to_owned(),
            Self::Time => "its time is up".to_owned(),
        }
    }
}

impl Event {
    /// The cause in plain words with what it waited for.
    pub fn cause(&self, network: &Network, write: &dyn Fn(Kind, f64) -> String) -> String {
        let why = self.why.words(network, write);
        match self.wait {
            Some(wait) => format!("{why}, {}", wait.words()),
            None => why,
        }
    }

    /// The whole in plain words but for the time: `duty.2 started: wet_well at 1.80 m`.
    pub fn words(&self, network: &Network, write: &dyn Fn(Kind, f64) -> String) -> String {
        let who = self.who.name(network);
        format!("{who} {}: {}", self.what.told(), self.cause(network, write))
    }
}

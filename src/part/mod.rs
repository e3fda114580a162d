//! What stands in a line, and the law of each: head lost against flow.
//!
//! A part knows no node, no other part, no name and no unit: only its own law. Every law obeys the contract of
//! [`HeadLaw`]; the laws of one line add up to a law of the same kind.

pub mod character;
pub mod curve;
pub mod fittings;
pub mod friction;
pub mod grades;
mod logarithm;
pub mod materials;
pub mod pump;
pub mod quadratic;
pub mod regulator;
pub mod surge;
pub mod valve;

/// Head lost at one flow, and how fast that loss grows with flow.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HeadLoss {
    /// Head lost in the direction of positive flow, m. A pump's is negative.
    pub head: f64,
    /// Derivative of `head` by flow, m per m3/s.
    pub slope: f64,
}

impl std::ops::AddAssign for HeadLoss {
    fn add_assign(&mut self, other: Self) {
        self.head += other.head;
        self.slope += other.slope;
    }
}

/// A loss of head that depends on flow alone.
///
/// Contract: at any finite flow both figures are finite; `head` is continuous and never falls as the flow rises,
/// unless the part is a pump whose drooping curve was declared when it was made; `slope` is the derivative of
/// `head` and comes from the same evaluation.
pub trait HeadLaw {
    /// The loss and its slope at flow `q` (m3/s, positive from the line's `from` to its `to`).
    fn loss(&self, q: f64) -> HeadLoss;
}

/// One part of a line, in the order in which the water meets them.
#[derive(Clone, Debug, PartialEq)]
pub enum Part {
    /// A straight pipe; its minor losses are a [`Part::Loss`] of the same bore.
    Pipe(friction::Pipe),
    /// Minor losses or equipment: a fixed quadratic loss.
    Loss(quadratic::QuadraticLoss),
    /// A valve whose opening is a setting.
    Valve(ValveId),
    /// A check valve: the loss of its open body; it lets nothing back through the line.
    CheckValve(quadratic::QuadraticLoss),
    /// A pump whose running and speed are settings.
    Pump(PumpId),
    /// A part that throttles itself to hold a pressure or a flow; its set value is a setting.
    Regulator(RegulatorId),
}

/// Which valve of a network; handed out by the network alone.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct ValveId(pub(crate) u32);

/// Which pump of a network; handed out by the network alone.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct PumpId(pub(crate) u32);

/// Which regulating part of a network; handed out by the network alone.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct RegulatorId(pub(crate) u32);

impl ValveId {
    /// Position among the network's valves.
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

impl RegulatorId {
    /// Position among the network's regulating parts.
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

impl PumpId {
    /// Position among the network's pumps.
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

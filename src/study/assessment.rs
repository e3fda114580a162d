//! One solved state, judged: what every pump, line and node does, whether the needs are met, what to be careful about.
//!
//! The one place where figures become a judgement; every command uses it.

use crate::network::{Need, Network, NodeId, NodeKind, Settings, Target};
use crate::part::pump::viscous::HIGHEST_B;
use crate::part::{Part, PumpId};
use crate::solve::operation::{self, LineOperation, NodeOperation, Place, PumpOperation};
use crate::solve::{Balance, Balances, LineState, Solution};

/// Lowest and highest share of best-efficiency flow that is preferred for lasting operation.
///
/// # Source
/// ANSI/HI 9.6.3, preferred operating region, 70 % to 120 % as quoted in the trade; varies with specific speed.
pub const PREFERRED_REGION: (f64, f64) = (0.7, 1.2);

/// NPSH available over required, and the margin in m: the larger of the two is asked.
///
/// # Source
/// ANSI/HI 9.6.1, 1.1 to 1.5 or 1.0 m to 1.5 m as quoted in the trade; the lower ends here. Varies by service.
pub const NPSH_MARGIN: (f64, f64) = (1.1, 1.0);

/// A solved state and what is to be said of it.
#[derive(Clone, Debug)]
pub struct Assessment {
    /// One per node.
    pub nodes: Vec<NodeOperation>,
    /// One per line.
    pub lines: Vec<LineOperation>,
    /// One per pump.
    pub pumps: Vec<PumpOperation>,
    /// One per need.
    pub needs: Vec<NeedValue>,
    /// What to be careful about.
    pub cautions: Vec<Caution>,
    /// How good the answer is.
    pub balance: Balance,
    /// Flow that the system delivers: that of the first need that asks for a flow, or else all that reaches fixed heads
    /// and draws, m3/s.
    pub delivered: f64,
    /// Share of the pumps' hydraulic power that friction takes, pumps' own lines included; none if no pump delivers.
    pub friction_share: Option<f64>,
}

/// What a need comes to.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NeedValue {
    /// The figure it looks at, SI; none where that does not exist.
    pub value: Option<f64>,
    /// Whether it is met.
    pub met: bool,
}

/// Something to be careful about, with its figures, SI.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Caution {
    /// A running pump whose check valve is held shut.
    HeldShut { pump: PumpId },
    /// A running pump that delivers nothing though no check valve is held shut.
    DeadHeaded { pump: PumpId },
    /// Water runs back through a pump.
    Backflow { pump: PumpId, flow: f64 },
    /// A pump past the last flow of its curve: its figures are a guess.
    PastCurve { pump: PumpId, flow: f64, end: f64 },
    /// A pump below the first flow of its curve.
    BeforeCurve { pump: PumpId, flow: f64, start: f64 },
    /// Shaft power above the motor's rating.
    Overloaded {
        pump: PumpId,
        power: f64,
        rated: f64,
    },
    /// NPSH available below required.
    NpshShort {
        pump: PumpId,
        available: f64,
        required: f64,
    },
    /// NPSH margin below what is asked.
    NpshThin {
        pump: PumpId,
        available: f64,
        required: f64,
    },
    /// Outside the preferred region.
    OutsidePreferred { pump: PumpId, share: f64 },
    /// Pressure below vapour pressure: the water column parts, and the answer does not hold.
    BelowVapour { node: NodeId, pressure: f64 },
    /// Another balance exists near this one.
    SecondBalance { delivered: f64 },
    /// No fixed head reaches a node.
    NoHead { node: NodeId },
    /// The liquid is too thick for a pump at this speed: B is past the end of the method.
    ViscousRange { pump: PumpId, b: f64 },
}

impl Caution {
    /// A stable word for the kind.
    pub fn code(&self) -> &'static str {
        match self {
            Self::HeldShut { .. } => "held-shut",
            Self::DeadHeaded { .. } => "dead-headed",
            Self::Backflow { .. } => "backflow",
            Self::PastCurve { .. } => "past-curve",
            Self::BeforeCurve { .. } => "before-curve",
            Self::Overloaded { .. } => "motor-overload",
            Self::NpshShort { .. } => "npsh-short",
            Self::NpshThin { .. } => "npsh-margin",
            Self::OutsidePreferred { .. } => "outside-preferred",
            Self::BelowVapour { .. } => "below-vapour",
            Self::SecondBalance { .. } => "second-balance",
            Self::NoHead { .. } => "no-head",
            Self::ViscousRange { .. } => "viscous-range",
        }
    }
}

/// Judges a solution.
pub fn assess(
    network: &Network,
    needs: &[Need],
    settings: &Settings,
    solution: &Solution,
) -> Assessment {
    let nodes: Vec<_> = network
        .node_ids()
        .map(|id| operation::node(network, settings, solution, id))
        .collect();
    let lines: Vec<_> = network
        .line_ids()
        .map(|id| operation::line(network, solution, id))
        .collect();
    let pumps: Vec<_> = network
        .pump_ids()
        .map(|id| operation::pump(network, settings, solution, id))
        .collect();
    let need_values: Vec<NeedValue> = needs
        .iter()
        .map(|need| {
            let value = need_value(network, settings, solution, need);
            NeedValue {
                value,
                met: need.is_met(value),
            }
        })
        .collect();
    let mut cautions = Vec::new();
    for (id, pump) in network.pump_ids().zip(&pumps) {
        pump_cautions(network, solution, id, pump, &mut cautions);
    }
    for (id, node) in network.node_ids().zip(&nodes) {
        node_cautions(network, id, node, &mut cautions);
    }
    Assessment {
        delivered: delivered(network, needs, settings, solution),
        friction_share: friction_share(network, settings, solution, &pumps),
        nodes,
        lines,
        pumps,
        needs: need_values,
        cautions,
        balance: *solution.balance(),
    }
}

/// Judges the first of several balances; the others become cautions.
pub fn assess_balances(
    network: &Network,
    needs: &[Need],
    settings: &Settings,
    balances: &Balances,
) -> Assessment {
    let mut first = assess(network, needs, settings, &balances.first);
    let others = balances.others.iter().map(|other| {
        let delivered = delivered(network, needs, settings, other);
        Caution::SecondBalance { delivered }
    });
    first.cautions.extend(others);
    first
}

/// Net flow that lines bring to a node, m3/s.
pub fn net_flow_into(network: &Network, solution: &Solution, node: NodeId) -> f64 {
    network
        .line_ids()
        .map(|id| {
            let line = network.line(id);
            match (line.from == node, line.to == node) {
                (true, _) => -solution.flow(id),
                (_, true) => solution.flow(id),
                _ => 0.0,
            }
        })
        .sum()
}

fn need_value(
    network: &Network,
    settings: &Settings,
    solution: &Solution,
    need: &Need,
) -> Option<f64> {
    match &need.target {
        Target::FlowInto(node) => Some(net_flow_into(network, solution, *node)),
        Target::FlowIn(lines) => Some(lines.iter().map(|line| solution.flow(*line)).sum()),
        Target::PressureAt(node) => operation::node(network, settings, solution, *node).pressure,
    }
}

/// See [`Assessment::delivered`].
fn delivered(network: &Network, needs: &[Need], settings: &Settings, solution: &Solution) -> f64 {
    let flow_need = needs
        .iter()
        .find(|need| !matches!(need.target, Target::PressureAt(_)));
    if let Some(value) = flow_need.and_then(|need| need_value(network, settings, solution, need)) {
        return value;
    }
    let mut into = vec![0.0; network.nodes().len()];
    for id in network.line_ids() {
        let line = network.line(id);
        into[line.from.index()] -= solution.flow(id);
        into[line.to.index()] += solution.flow(id);
    }
    into.iter().filter(|flow| **flow > 0.0).sum()
}

/// Dissipated over hydraulic power: sum of q x (loss without pumps) over lines, by sum of q x head over pumps.
fn friction_share(
    network: &Network,
    settings: &Settings,
    solution: &Solution,
    pumps: &[PumpOperation],
) -> Option<f64> {
    let hydraulic: f64 = pumps
        .iter()
        .filter(|pump| pump.running)
        .map(|pump| pump.flow * pump.head.unwrap_or(0.0))
        .sum();
    let mut dissipated = 0.0;
    for id in network.line_ids() {
        let q = solution.flow(id);
        for part in &network.line(id).parts {
            let is_running = |pump: PumpId| settings.pump(pump).running;
            if !matches!(part, Part::Pump(pump) if is_running(*pump)) {
                dissipated += q * operation::part_loss(network, settings, part, q);
            }
        }
    }
    (hydraulic > 0.0).then(|| dissipated / hydraulic)
}

fn pump_cautions(
    network: &Network,
    solution: &Solution,
    id: PumpId,
    pump: &PumpOperation,
    cautions: &mut Vec<Caution>,
) {
    let still = 1e-9;
    if pump.flow < -still {
        cautions.push(Caution::Backflow {
            pump: id,
            flow: pump.flow,
        });
    }
    if !pump.running {
        return;
    }
    if let Some(correction) = pump.viscous.filter(|found| found.b > HIGHEST_B) {
        cautions.push(Caution::ViscousRange {
            pump: id,
            b: correction.b,
        });
    }
    if pump.flow.abs() <= still {
        cautions.push(match solution.state(network.line_of(id)) {
            LineState::Checked => Caution::HeldShut { pump: id },
            _ => Caution::DeadHeaded { pump: id },
        });
        return;
    }
    let model = network.model(id);
    match pump.place {
        Place::PastEnd => {
            let end = pump.end_of_curve;
            cautions.push(Caution::PastCurve {
                pump: id,
                flow: pump.flow,
                end,
            });
        }
        Place::BeforeStart => {
            let start = pump.start_of_curve;
            cautions.push(Caution::BeforeCurve {
                pump: id,
                flow: pump.flow,
                start,
            });
        }
        Place::OnCurve => {}
    }
    if let (Some(power), Some(motor)) = (pump.shaft_power, model.motor.as_ref())
        && power > motor.rated
    {
        cautions.push(Caution::Overloaded {
            pump: id,
            power,
            rated: motor.rated,
        });
    }
    if let (Some(available), Some(required)) = (pump.npsh_available, pump.npsh_required) {
        if available < required {
            cautions.push(Caution::NpshShort {
                pump: id,
                available,
                required,
            });
        } else if available < npsh_asked(required) {
            cautions.push(Caution::NpshThin {
                pump: id,
                available,
                required,
            });
        }
    }
    if let Some(share) = pump.share_of_bep {
        let (low, high) = PREFERRED_REGION;
        if !(low..=high).contains(&share) {
            cautions.push(Caution::OutsidePreferred { pump: id, share });
        }
    }
}

/// NPSH available that is asked for what is required: the larger of the ratio and the margin.
pub fn npsh_asked(required: f64) -> f64 {
    let (ratio, margin) = NPSH_MARGIN;
    (ratio * required).max(required + margin)
}

fn node_cautions(network: &Network, id: NodeId, node: &NodeOperation, cautions: &mut Vec<Caution>) {
    if !matches!(network.node(id).kind, NodeKind::Point { .. }) {
        return;
    }
    match (node.pressure, network.fluid().vapour_pressure) {
        (None, _) => cautions.push(Caution::NoHead { node: id }),
        (Some(pressure), Some(vapour)) if pressure + network.barometer() < vapour => {
            cautions.push(Caution::BelowVapour { node: id, pressure });
        }
        _ => {}
    }
}

/// What limits a pump in a state, tightest first when compared.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Limit {
    /// Which pump.
    pub pump: PumpId,
    /// Which limit.
    pub kind: LimitKind,
    /// Room left as a share of the limit; negative beyond it.
    pub room: f64,
}

/// Kinds of limit, each with the figure that meets it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum LimitKind {
    /// It delivers nothing.
    DeliversNothing,
    /// Motor load, shaft power over rating.
    Motor(f64),
    /// NPSH available over required.
    Npsh(f64),
    /// Share of best-efficiency flow against the preferred region.
    Region(f64),
    /// Flow over the last flow of the curve.
    EndOfCurve(f64),
}

/// The limit that binds first in a state; none if no running pump has any known.
pub fn binding_limit(network: &Network, assessment: &Assessment) -> Option<Limit> {
    let mut limits = Vec::new();
    for (id, pump) in network
        .pump_ids()
        .zip(&assessment.pumps)
        .filter(|(_, pump)| pump.running)
    {
        let mut add = |kind, room| {
            limits.push(Limit {
                pump: id,
                kind,
                room,
            })
        };
        if pump.flow.abs() <= 1e-9 {
            add(LimitKind::DeliversNothing, f64::NEG_INFINITY);
            continue;
        }
        if let Some(load) = pump.motor_load {
            add(LimitKind::Motor(load), 1.0 - load);
        }
        if let (Some(available), Some(required)) = (pump.npsh_available, pump.npsh_required)
            && required > 0.0
        {
            add(
                LimitKind::Npsh(available / required),
                available / npsh_asked(required) - 1.0,
            );
        }
        if let Some(share) = pump.share_of_bep {
            let (low, high) = PREFERRED_REGION;
            add(
                LimitKind::Region(share),
                (1.0 - share / high).min(share / low - 1.0),
            );
        }
        let end = pump.flow / pump.end_of_curve;
        // Past the end nothing else said of the pump is certain: that comes first.
        let beyond = if end > 1.0 + 1e-9 { -10.0 } else { 0.0 };
        add(LimitKind::EndOfCurve(end), 1.0 - end + beyond);
    }
    limits.into_iter().min_by(|a, b| a.room.total_cmp(&b.room))
}

/// Electrical power of all running pumps, W: over the motor's efficiency where that is known; false beside it if it was
/// not for some.
pub fn electrical_power(assessment: &Assessment) -> Option<(f64, bool)> {
    let mut whole = true;
    let mut sum = 0.0;
    for pump in assessment.pumps.iter().filter(|pump| pump.running) {
        whole &= pump.electrical_power.is_some();
        sum += pump.electrical_power.or(pump.shaft_power)?;
    }
    Some((sum, whole))
}

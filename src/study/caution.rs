//! What a solved state asks to be careful about: few, true, each with its figures and a stable code.

use super::limit::{Limit, LimitKind, STILL};
use crate::network::{LimitName, Network, NodeId, NodeKind};
use crate::part::PumpId;
use crate::part::pump::viscous::HIGHEST_B;
use crate::solve::operation::{NodeOperation, Place, PumpOperation};
use crate::solve::{LineState, Solution};

/// Something to be careful about, with its figures, SI.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Caution {
    /// A running pump whose check valve is held shut; its shaft power heats the water in it.
    HeldShut { pump: PumpId, heat: Heat },
    /// A running pump that delivers nothing though no check valve is held shut.
    DeadHeaded { pump: PumpId, heat: Heat },
    /// Water runs back through a pump.
    Backflow { pump: PumpId, flow: f64 },
    /// A pump below the first flow of its curve.
    BeforeCurve { pump: PumpId, flow: f64, start: f64 },
    /// A limit is broken.
    Beyond(Limit),
    /// Pumps side by side whose curve rises too little to shut-off to share flow well.
    FlatCurve { pump: PumpId, rise: f64, asked: f64 },
    /// A pump beside others in the range where its drooping curve gives the same head at two flows.
    Hunting { pump: PumpId, flow: f64, below: f64 },
    /// The liquid is too thick for a pump at this speed: B is past the end of the correction for viscous liquids.
    ViscousRange { pump: PumpId, b: f64 },
    /// Pressure below vapour pressure: the water column parts, and the answer does not hold.
    BelowVapour { node: NodeId, pressure: f64 },
    /// Another balance exists near this one.
    SecondBalance { delivered: f64 },
    /// No fixed head reaches a node.
    NoHead { node: NodeId },
}

/// What heats a pump that runs shut.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Heat {
    /// Shaft power, W.
    pub power: Option<f64>,
    /// How fast the liquid in the casing warms, K/s, where the casing's volume is known.
    ///
    /// dT/dt = P / (rho V c), all shaft power staying in the liquid, c that of water.
    pub rate: Option<f64>,
}

/// Specific heat of water, J/(kg K).
///
/// # Source
/// 4186 at 15 C, the old definition of the calorie; from memory.
const SPECIFIC_HEAT: f64 = 4186.0;

impl Caution {
    /// A stable word for the kind.
    pub fn code(&self) -> &'static str {
        match self {
            Self::HeldShut { .. } => "held-shut",
            Self::DeadHeaded { .. } => "dead-headed",
            Self::Backflow { .. } => "backflow",
            Self::BeforeCurve { .. } => "before-curve",
            Self::Beyond(limit) => limit.kind.code(),
            Self::FlatCurve { .. } => "flat-curve",
            Self::Hunting { .. } => "hunting",
            Self::ViscousRange { .. } => "viscous-range",
            Self::BelowVapour { .. } => "below-vapour",
            Self::SecondBalance { .. } => "second-balance",
            Self::NoHead { .. } => "no-head",
        }
    }
}

/// The cautions of one state: pump by pump, then lines, then nodes.
pub(super) fn cautions(
    network: &Network,
    solution: &Solution,
    nodes: &[NodeOperation],
    pumps: &[PumpOperation],
    limits: &[Limit],
) -> Vec<Caution> {
    let mut found = Vec::new();
    for (id, pump) in network.pump_ids().zip(pumps) {
        of_pump(network, solution, id, pump, &mut found);
    }
    found.extend(broken(limits));
    side_by_side(network, pumps, &mut found);
    for (id, node) in network.node_ids().zip(nodes) {
        found.extend(of_node(network, id, node));
    }
    found
}

fn of_pump(
    network: &Network,
    solution: &Solution,
    id: PumpId,
    pump: &PumpOperation,
    found: &mut Vec<Caution>,
) {
    let flow = pump.flow;
    if let Some(correction) = pump.viscous.filter(|correction| correction.b > HIGHEST_B) {
        found.push(Caution::ViscousRange {
            pump: id,
            b: correction.b,
        });
    }
    if flow < -STILL {
        found.push(Caution::Backflow { pump: id, flow });
    } else if pump.running && flow <= STILL {
        let heat = heat(network, id, pump);
        found.push(match solution.state(network.line_of(id)) {
            LineState::Checked => Caution::HeldShut { pump: id, heat },
            _ => Caution::DeadHeaded { pump: id, heat },
        });
    } else if pump.running && pump.place == Place::BeforeStart {
        let start = pump.start_of_curve;
        found.push(Caution::BeforeCurve {
            pump: id,
            flow,
            start,
        });
    }
}

fn heat(network: &Network, id: PumpId, pump: &PumpOperation) -> Heat {
    let power = pump.shaft_power;
    let volume = network.model(id).maker.casing_volume;
    let capacity = volume.map(|volume| network.fluid().density * volume * SPECIFIC_HEAT);
    Heat {
        power,
        rate: power
            .zip(capacity)
            .map(|(power, capacity)| power / capacity),
    }
}

/// Broken limits, without those that a worse one of the same pump implies.
fn broken(limits: &[Limit]) -> impl Iterator<Item = Caution> {
    let is_broken = |about, kinds: &[LimitKind]| {
        limits
            .iter()
            .any(|limit| limit.about == about && kinds.contains(&limit.kind) && limit.is_broken())
    };
    limits
        .iter()
        .filter(move |limit| {
            let implied = match limit.kind {
                // said by the caution of a pump that delivers nothing
                LimitKind::DeliversNothing => true,
                LimitKind::PreferredLow => is_broken(
                    limit.about,
                    &[LimitKind::AllowableLow, LimitKind::MinimumFlow],
                ),
                LimitKind::PreferredHigh => is_broken(
                    limit.about,
                    &[LimitKind::AllowableHigh, LimitKind::EndOfCurve],
                ),
                LimitKind::AllowableLow => is_broken(limit.about, &[LimitKind::MinimumFlow]),
                LimitKind::AllowableHigh => is_broken(limit.about, &[LimitKind::EndOfCurve]),
                LimitKind::NpshMargin { .. } => is_broken(limit.about, &[LimitKind::NpshRequired]),
                _ => false,
            };
            limit.is_broken() && !implied
        })
        .map(|limit| Caution::Beyond(*limit))
}

/// Pumps that run between the same two nodes: flat curves, once for each model, and drooping ones.
fn side_by_side(network: &Network, pumps: &[PumpOperation], found: &mut Vec<Caution>) {
    let asked = network.limits().value(LimitName::RiseToShutoff);
    let ends = |id| {
        let line = network.line(network.line_of(id));
        (line.from, line.to)
    };
    let running: Vec<PumpId> = network
        .pump_ids()
        .filter(|id| pumps[id.index()].running)
        .collect();
    let mut said: Vec<usize> = Vec::new();
    for &id in &running {
        let beside = |other: &PumpId| *other != id && ends(*other) == ends(id);
        if !running.iter().any(beside) {
            continue;
        }
        let (model, position) = (network.model(id), network.pump(id).model);
        if let (Some(rise), Some(asked)) = (model.rise_to_shutoff(), asked)
            && rise < asked
            && !said.contains(&position)
        {
            said.push(position);
            found.push(Caution::FlatCurve {
                pump: id,
                rise,
                asked,
            });
        }
        let pump = &pumps[id.index()];
        if let Some(below) = model.hunts_below().map(|flow| pump.speed_ratio * flow)
            && (STILL..below).contains(&pump.flow)
        {
            found.push(Caution::Hunting {
                pump: id,
                flow: pump.flow,
                below,
            });
        }
    }
}

fn of_node(network: &Network, id: NodeId, node: &NodeOperation) -> Option<Caution> {
    if !matches!(network.node(id).kind, NodeKind::Point { .. }) {
        return None;
    }
    match (node.pressure, network.fluid().vapour_pressure) {
        (None, _) => Some(Caution::NoHead { node: id }),
        (Some(pressure), Some(vapour)) if pressure + network.barometer() < vapour => {
            Some(Caution::BelowVapour { node: id, pressure })
        }
        _ => None,
    }
}

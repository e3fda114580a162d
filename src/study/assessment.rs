//! One solved state, judged: what every pump, line and node does, whether the needs are met, what to be careful about.
//!
//! The one place where figures become a judgement; every command uses it.

use super::caution::{self, Caution};
use super::limit::{self, Limit};
use crate::network::{Need, Network, NodeId, Settings, Target};
use crate::part::{Part, PumpId};
use crate::solve::operation::{
    self, LineOperation, NodeOperation, PumpOperation, RegulatorOperation,
};
use crate::solve::{Balance, Balances, Solution};

/// A solved state and what is to be said of it.
#[derive(Clone, Debug)]
pub struct Assessment {
    /// One per node.
    pub nodes: Vec<NodeOperation>,
    /// One per line.
    pub lines: Vec<LineOperation>,
    /// One per pump.
    pub pumps: Vec<PumpOperation>,
    /// One per regulating part.
    pub regulators: Vec<RegulatorOperation>,
    /// One per need.
    pub needs: Vec<NeedValue>,
    /// Every limit that can be judged, pump by pump and then line by line.
    pub limits: Vec<Limit>,
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
    let regulators = network
        .regulator_ids()
        .map(|id| operation::regulator(network, settings, solution, id))
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
    let limits = limit::limits(network, settings, &nodes, &lines, &pumps);
    let cautions = caution::cautions(network, solution, &nodes, &pumps, &limits);
    Assessment {
        delivered: delivered(network, needs, settings, solution),
        friction_share: friction_share(network, settings, solution, &pumps),
        nodes,
        lines,
        pumps,
        regulators,
        needs: need_values,
        limits,
        cautions,
        balance: *solution.balance(),
    }
}

impl Assessment {
    /// The limit that binds first; none if no running pump and no main has any known.
    pub fn binding_limit(&self) -> Option<Limit> {
        let limits = self.limits.iter().copied();
        limits.min_by(|a, b| a.room.total_cmp(&b.room))
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
                dissipated += q * operation::loss_in(network, settings, solution, part, q);
            }
        }
    }
    (hydraulic > 0.0).then(|| dissipated / hydraulic)
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

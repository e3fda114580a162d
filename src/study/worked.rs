//! One operating point laid open: along one way through a running pump every head, so that a reviewer can redo it by hand.

use crate::network::{LineId, Network, NodeId, Settings};
use crate::part::friction::Friction;
use crate::part::{Part, PumpId};
use crate::solve::Solution;
use crate::solve::operation;

/// A way through a running pump, part by part: from a held head to another, or to a point where all that comes is drawn.
#[derive(Clone, Debug)]
pub struct Worked {
    /// The pump it was chosen for.
    pub pump: PumpId,
    /// Where it starts, and the head there, m.
    pub start: (NodeId, f64),
    /// Its steps, in the order of flow.
    pub steps: Vec<Step>,
    /// Where it ends, and the head there, m.
    pub end: (NodeId, f64),
}

impl Worked {
    /// Head at the start plus all changes, less the head at the end, m: what the sum by hand should leave, zero.
    pub fn remainder(&self) -> f64 {
        let lost: f64 = self.steps.iter().map(|step| step.loss).sum();
        self.start.1 - lost - self.end.1
    }
}

/// One part on the way.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Step {
    /// Its line.
    pub line: LineId,
    /// What it is.
    pub what: What,
    /// Flow in the direction of the way, m3/s.
    pub flow: f64,
    /// Head lost, m; negative at a pump.
    pub loss: f64,
}

/// What a part on the way is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum What {
    /// A pipe by Darcy–Weisbach.
    Pipe {
        /// Length, m.
        length: f64,
        /// Bore, m.
        bore: f64,
        /// Velocity, m/s.
        velocity: f64,
        /// Reynolds number.
        reynolds: f64,
        /// Roughness over bore.
        relative_roughness: f64,
        /// Friction factor f: h = f (L/D) v2/(2 g).
        factor: f64,
    },
    /// A pipe by Hazen–Williams or with a friction factor that was given.
    OtherPipe {
        /// Length, m.
        length: f64,
        /// Bore, m.
        bore: f64,
        /// Velocity, m/s.
        velocity: f64,
    },
    /// A loss r q2, s2/m5.
    Loss(f64),
    /// A valve, r in s2/m5.
    Valve(f64),
    /// A check valve, r in s2/m5.
    CheckValve(f64),
    /// A regulating part as it stands, r in s2/m5.
    Regulator(f64),
    /// A pump.
    Pump(PumpId),
}

/// Lays a way open for the pump with the most flow: upstream and downstream along the line with the most flow until a head is held
/// or nothing flows on.
/// None where nothing flows through any pump, or the way comes back to itself.
pub fn worked(network: &Network, settings: &Settings, solution: &Solution) -> Option<Worked> {
    let flow_of = |pump: &PumpId| solution.flow(network.line_of(*pump));
    let pump = network
        .pump_ids()
        .filter(|pump| settings.pump(*pump).running && flow_of(pump) > 0.0)
        .reduce(|most, pump| {
            if flow_of(&pump) > flow_of(&most) {
                pump
            } else {
                most
            }
        })?;
    let mut way = vec![network.line_of(pump)];
    let (mut first, mut last) = (network.line(way[0]).from, network.line(way[0]).to);
    while network.fixed_head(first, settings).is_none()
        && let Some((line, node)) = busiest(network, solution, first, -1.0)
    {
        if way.contains(&line) {
            return None;
        }
        way.insert(0, line);
        first = node;
    }
    while network.fixed_head(last, settings).is_none()
        && let Some((line, node)) = busiest(network, solution, last, 1.0)
    {
        if way.contains(&line) {
            return None;
        }
        way.push(line);
        last = node;
    }
    let steps = way
        .into_iter()
        .flat_map(|line| steps(network, settings, solution, line));
    Some(Worked {
        pump,
        start: (first, solution.head(first)?),
        steps: steps.collect(),
        end: (last, solution.head(last)?),
    })
}

/// The line with the most flow out of a node (`sense` 1) or into it (-1), and the node at its other end.
fn busiest(
    network: &Network,
    solution: &Solution,
    node: NodeId,
    sense: f64,
) -> Option<(LineId, NodeId)> {
    let leaving = |id: LineId| {
        let line = network.line(id);
        if line.from == node {
            Some((sense * solution.flow(id), id, line.to))
        } else if line.to == node {
            Some((-sense * solution.flow(id), id, line.from))
        } else {
            None
        }
    };
    let most = network
        .line_ids()
        .filter_map(leaving)
        .max_by(|a, b| a.0.total_cmp(&b.0))?;
    (most.0 > 0.0).then_some((most.1, most.2))
}

/// The parts of a line in the order of its flow.
fn steps(network: &Network, settings: &Settings, solution: &Solution, id: LineId) -> Vec<Step> {
    let flow = solution.flow(id);
    let sense = if flow < 0.0 { -1.0 } else { 1.0 };
    let mut steps: Vec<Step> = network
        .line(id)
        .parts
        .iter()
        .map(|part| {
            let loss = operation::loss_in(network, settings, solution, part, flow);
            Step {
                line: id,
                what: what(network, part, flow, loss),
                flow: flow.abs(),
                loss: sense * loss,
            }
        })
        .collect();
    let fouling = settings.fouling(id);
    if fouling > 0.0 {
        let step = Step {
            line: id,
            what: What::Loss(fouling),
            flow: flow.abs(),
            loss: fouling * flow * flow,
        };
        steps.insert(0, step);
    }
    if flow < 0.0 {
        steps.reverse();
    }
    steps
}

fn what(network: &Network, part: &Part, flow: f64, loss: f64) -> What {
    // h = r q2
    let r = loss.abs() / (flow * flow);
    match part {
        Part::Pipe(pipe) => {
            let velocity = flow.abs() / pipe.area();
            let (length, bore) = (pipe.length, pipe.bore);
            match pipe.friction {
                Friction::DarcyWeisbach(law) => What::Pipe {
                    length,
                    bore,
                    velocity,
                    reynolds: law.reynolds(flow),
                    relative_roughness: law.relative_roughness(),
                    // f = h D 2 g / (L v2)
                    factor: loss.abs() * bore * 2.0 * network.gravity()
                        / (length * velocity * velocity),
                },
                Friction::HazenWilliams { .. } | Friction::FixedFactor { .. } => What::OtherPipe {
                    length,
                    bore,
                    velocity,
                },
            }
        }
        Part::Loss(_) => What::Loss(r),
        Part::Valve(_) => What::Valve(r),
        Part::CheckValve(_) => What::CheckValve(r),
        Part::Regulator(_) => What::Regulator(r),
        Part::Pump(pump) => What::Pump(*pump),
    }
}

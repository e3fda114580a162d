//! What is looked at in each case, and what of the state each of these figures depends on.

use crate::network::{LineId, Need, Network, NodeId, NodeKind, Settings, Target};
use crate::part::PumpId;
use crate::solve::Solution;
use crate::solve::operation::{self, PumpOperation};
use crate::solve::sensitivity::Weights;
use crate::study::assessment::{Assessment, electrical_power};

/// A figure of a case, SI.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Measure {
    /// Flow that the system delivers.
    Delivered,
    /// Value of a need, by its place.
    Need(usize),
    /// Electrical energy per volume delivered, J/m3; shaft energy where a motor's efficiency is not known.
    SpecificEnergy,
    /// Flow of a pump.
    Flow(PumpId),
    /// Head of a pump.
    Head(PumpId),
    /// Shaft power of a pump.
    ShaftPower(PumpId),
    /// Shaft power over the motor's rating.
    MotorLoad(PumpId),
    /// NPSH available less required.
    NpshMargin(PumpId),
    /// Flow over that of best efficiency.
    ShareOfBep(PumpId),
}

/// Flow below which nothing is delivered that energy could be stated for, m3/s.
const STILL: f64 = 1e-9;

/// The figures that exist in a state: of the system, and of its running pumps.
pub fn measures(network: &Network, needs: &[Need], assessment: &Assessment) -> Vec<Measure> {
    let mut all = vec![Measure::Delivered];
    // The first flow asked for is what is delivered.
    let first_flow = first_flow(needs);
    all.extend(
        (0..needs.len())
            .filter(|i| Some(*i) != first_flow)
            .map(Measure::Need),
    );
    all.push(Measure::SpecificEnergy);
    for id in network.pump_ids() {
        if assessment.pumps[id.index()].running {
            all.extend([
                Measure::Flow(id),
                Measure::Head(id),
                Measure::ShaftPower(id),
                Measure::MotorLoad(id),
                Measure::NpshMargin(id),
                Measure::ShareOfBep(id),
            ]);
        }
    }
    all.retain(|measure| measure.of(assessment).is_some());
    all
}

fn first_flow(needs: &[Need]) -> Option<usize> {
    needs
        .iter()
        .position(|need| !matches!(need.target, Target::PressureAt(_)))
}

impl Measure {
    /// Its value in an assessed state; none where it does not exist.
    pub fn of(self, assessment: &Assessment) -> Option<f64> {
        match self {
            Self::Delivered => Some(assessment.delivered),
            Self::Need(i) => assessment.needs.get(i)?.value,
            Self::SpecificEnergy => electrical_power(assessment)
                .filter(|_| assessment.delivered > STILL)
                .map(|(power, _)| power / assessment.delivered),
            Self::Flow(id)
            | Self::Head(id)
            | Self::ShaftPower(id)
            | Self::MotorLoad(id)
            | Self::NpshMargin(id)
            | Self::ShareOfBep(id) => self.of_pump(assessment.pumps.get(id.index())?),
        }
    }

    fn of_pump(self, pump: &PumpOperation) -> Option<f64> {
        match self {
            Self::Flow(_) => Some(pump.flow),
            Self::Head(_) => pump.head,
            Self::ShaftPower(_) => pump.shaft_power,
            Self::MotorLoad(_) => pump.motor_load,
            Self::NpshMargin(_) => pump.npsh_margin(),
            Self::ShareOfBep(_) => pump.share_of_bep,
            Self::Delivered | Self::Need(_) | Self::SpecificEnergy => None,
        }
    }
}

/// A state taken apart: what a figure says of it does not ask for it to balance, so that derivatives can be taken with flows
/// and heads held.
pub struct Point<'a> {
    /// The network.
    pub network: &'a Network,
    /// Its settings.
    pub settings: &'a Settings,
    /// The answer that flows and heads come from.
    pub solution: &'a Solution,
}

/// Step over size of a flow in a derivative; central differences then err by about 1e-12 of the figure over 1e-6.
const STEP: f64 = 1e-6;
/// Least size of a flow in a step, m3/s.
const LEAST_FLOW: f64 = 1e-3;

impl Point<'_> {
    fn pump(&self, id: PumpId, more: f64) -> PumpOperation {
        let line = self.network.line_of(id);
        let head = self.solution.head(self.network.line(line).from);
        let flow = self.solution.flow(line) + more;
        operation::pump_at(self.network, self.settings, id, flow, head)
    }

    /// Lines that bring what is delivered, each with its sign.
    fn delivering(&self, needs: &[Need]) -> Vec<(LineId, f64)> {
        if let Some(i) = first_flow(needs) {
            return self.looked_at(&needs[i].target);
        }
        let net = |node| -> f64 {
            let lines = self.lines_into(node);
            lines
                .iter()
                .map(|(line, sign)| sign * self.solution.flow(*line))
                .sum()
        };
        let receives = |node: &NodeId| net(*node) > 0.0;
        let nodes = self.network.node_ids().filter(receives);
        nodes.flat_map(|node| self.lines_into(node)).collect()
    }

    fn looked_at(&self, target: &Target) -> Vec<(LineId, f64)> {
        match target {
            Target::FlowInto(node) => self.lines_into(*node),
            Target::FlowIn(lines) => lines.iter().map(|line| (*line, 1.0)).collect(),
            Target::PressureAt(_) => Vec::new(),
        }
    }

    fn lines_into(&self, node: NodeId) -> Vec<(LineId, f64)> {
        let lines = self.network.line_ids().filter_map(|id| {
            let line = self.network.line(id);
            match (line.from == node, line.to == node) {
                (true, _) => Some((id, -1.0)),
                (_, true) => Some((id, 1.0)),
                _ => None,
            }
        });
        lines.collect()
    }

    /// Electrical power of a running pump, W; shaft power where the motor's efficiency is not known.
    fn power(&self, id: PumpId, more: f64) -> f64 {
        let pump = self.pump(id, more);
        pump.electrical_power.or(pump.shaft_power).unwrap_or(0.0)
    }

    fn running(&self) -> impl Iterator<Item = PumpId> + '_ {
        let runs = |id: &PumpId| self.settings.pump(*id).running;
        self.network.pump_ids().filter(runs)
    }

    /// The figure, as [`Measure::of`] has it, with the flows and heads of the answer.
    pub fn value(&self, needs: &[Need], measure: Measure) -> Option<f64> {
        let flow = |lines: &[(LineId, f64)]| -> f64 {
            lines
                .iter()
                .map(|(line, sign)| sign * self.solution.flow(*line))
                .sum()
        };
        match measure {
            Measure::Delivered => Some(flow(&self.delivering(needs))),
            Measure::Need(i) => match &needs.get(i)?.target {
                Target::PressureAt(node) => {
                    let head = self.solution.head(*node)?;
                    Some(self.network.pressure(*node, head, self.settings))
                }
                target => Some(flow(&self.looked_at(target))),
            },
            Measure::SpecificEnergy => {
                let power: f64 = self.running().map(|id| self.power(id, 0.0)).sum();
                Some(power / flow(&self.delivering(needs)))
            }
            Measure::Flow(id)
            | Measure::Head(id)
            | Measure::ShaftPower(id)
            | Measure::MotorLoad(id)
            | Measure::NpshMargin(id)
            | Measure::ShareOfBep(id) => measure.of_pump(&self.pump(id, 0.0)),
        }
    }

    /// Derivatives of the figure by flows and heads.
    pub fn weights(&self, needs: &[Need], measure: Measure) -> Weights {
        let mut weights = Weights::none(self.network);
        match measure {
            Measure::Delivered => add(&mut weights, &self.delivering(needs), 1.0),
            Measure::Need(i) => match needs.get(i).map(|need| &need.target) {
                Some(Target::PressureAt(node)) => {
                    // p = rho g (h - z) where the head is not held by what the node is
                    let weight = self.network.fluid().density * self.network.gravity();
                    let follows = matches!(
                        self.network.node(*node).kind,
                        NodeKind::Point { .. } | NodeKind::Tank { .. }
                    );
                    weights.heads[node.index()] = if follows { weight } else { 0.0 };
                }
                Some(target) => add(&mut weights, &self.looked_at(target), 1.0),
                None => {}
            },
            Measure::SpecificEnergy => {
                // d(P/Q) = dP/Q - P/Q2 dQ
                let lines = self.delivering(needs);
                let delivered: f64 = lines
                    .iter()
                    .map(|(line, sign)| sign * self.solution.flow(*line))
                    .sum();
                let mut power = 0.0;
                for id in self.running() {
                    power += self.power(id, 0.0);
                    let slope = self.slope(id, |more| self.power(id, more));
                    weights.flows[self.network.line_of(id).index()] += slope / delivered;
                }
                add(&mut weights, &lines, -power / (delivered * delivered));
            }
            Measure::Flow(id)
            | Measure::Head(id)
            | Measure::ShaftPower(id)
            | Measure::MotorLoad(id)
            | Measure::NpshMargin(id)
            | Measure::ShareOfBep(id) => {
                let line = self.network.line_of(id);
                let value = |more| measure.of_pump(&self.pump(id, more)).unwrap_or(0.0);
                weights.flows[line.index()] = self.slope(id, value);
                if let Measure::NpshMargin(_) = measure {
                    // NPSH available = head at the first node - losses + ..
                    weights.heads[self.network.line(line).from.index()] = 1.0;
                }
            }
        }
        weights
    }

    /// Derivative of a pump's figure by its flow.
    fn slope(&self, id: PumpId, value: impl Fn(f64) -> f64) -> f64 {
        let flow = self.solution.flow(self.network.line_of(id));
        let step = STEP * flow.abs().max(LEAST_FLOW);
        (value(step) - value(-step)) / (2.0 * step)
    }
}

fn add(weights: &mut Weights, lines: &[(LineId, f64)], factor: f64) {
    for (line, sign) in lines {
        weights.flows[line.index()] += factor * sign;
    }
}

//! A network taken apart: what its builder was told, so that a test can rename, reorder, reverse and split and build
//! anew.

use std::collections::HashMap;

use dutybank::fluid::Fluid;
use dutybank::network::{
    LineId, Network, NetworkBuilder, NodeId, NodeKind, PumpSetting, RegulatorSetting, Settings,
    ValveSetting,
};
use dutybank::part::friction::Pipe;
use dutybank::part::pump::{Pump, PumpLaw, PumpModel};
use dutybank::part::quadratic::QuadraticLoss;
use dutybank::part::regulator::{Regulates, Regulator};
use dutybank::part::valve::Valve;
use dutybank::part::{HeadLaw, Part, RegulatorId};

#[derive(Clone)]
pub struct Node {
    pub name: String,
    pub kind: NodeKind,
    pub draw: f64,
    pub level: f64,
}

#[derive(Clone)]
pub struct Line {
    pub name: String,
    pub from: usize,
    pub to: usize,
    pub parts: Vec<Piece>,
}

// A test holds few of them.
#[allow(clippy::large_enum_variant)]
#[derive(Clone)]
pub enum Piece {
    Pipe(Pipe),
    Loss(QuadraticLoss),
    Check(QuadraticLoss),
    Valve(Valve, ValveSetting),
    Pump(PumpModel, Pump, PumpSetting),
    /// With the name of the pump that it protects.
    Regulator(Regulator, RegulatorSetting, Option<String>),
}

impl Piece {
    /// Whether it does the same to water from either side.
    pub fn is_symmetric(&self) -> bool {
        match self {
            Self::Pipe(_) | Self::Loss(_) | Self::Valve(..) => true,
            Self::Pump(_, _, setting) => !setting.running,
            Self::Check(_) | Self::Regulator(..) => false,
        }
    }
}

#[derive(Clone)]
pub struct Description {
    pub fluid: Fluid,
    pub gravity: f64,
    pub nodes: Vec<Node>,
    pub lines: Vec<Line>,
}

impl Description {
    pub fn of(network: &Network) -> Self {
        let settings = network.settings();
        let piece = |part: &Part| match part {
            Part::Pipe(pipe) => Piece::Pipe(pipe.clone()),
            Part::Loss(loss) => Piece::Loss(*loss),
            Part::CheckValve(loss) => Piece::Check(*loss),
            Part::Valve(id) => Piece::Valve(*network.valve(*id), *settings.valve(*id)),
            Part::Regulator(id) => {
                let regulator = *network.regulator(*id);
                let pump = match regulator.regulates {
                    Regulates::MinimumFlow { pump } => Some(network.pump(pump).name.clone()),
                    _ => None,
                };
                Piece::Regulator(regulator, *settings.regulator(*id), pump)
            }
            Part::Pump(id) => Piece::Pump(
                network.model(*id).clone(),
                network.pump(*id).clone(),
                *settings.pump(*id),
            ),
        };
        let nodes = network.node_ids().map(|id| Node {
            name: network.node(id).name.clone(),
            kind: network.node(id).kind,
            draw: settings.draw(id),
            level: settings.level(id),
        });
        let lines = network.lines().iter().map(|line| Line {
            name: line.name.clone(),
            from: line.from.index(),
            to: line.to.index(),
            parts: line.parts.iter().map(piece).collect(),
        });
        Self {
            fluid: *network.fluid(),
            gravity: network.gravity(),
            nodes: nodes.collect(),
            lines: lines.collect(),
        }
    }

    pub fn build(&self) -> Network {
        let mut net = NetworkBuilder::new(self.fluid, self.gravity, 101_325.0);
        let nodes: Vec<NodeId> = self
            .nodes
            .iter()
            .map(|node| net.node(&node.name, node.kind, node.draw, node.level))
            .collect();
        let mut models: HashMap<String, usize> = HashMap::new();
        let mut protected: Vec<(RegulatorId, &String)> = Vec::new();
        for line in &self.lines {
            let mut parts = Vec::new();
            for piece in &line.parts {
                parts.push(match piece {
                    Piece::Pipe(pipe) => Part::Pipe(pipe.clone()),
                    Piece::Loss(loss) => Part::Loss(*loss),
                    Piece::Check(loss) => Part::CheckValve(*loss),
                    Piece::Valve(valve, setting) => Part::Valve(net.valve(*valve, *setting)),
                    Piece::Regulator(regulator, setting, pump) => {
                        let id = net.regulator(*regulator, *setting);
                        protected.extend(pump.iter().map(|pump| (id, pump)));
                        Part::Regulator(id)
                    }
                    Piece::Pump(model, pump, setting) => {
                        let model = *models
                            .entry(model.name.clone())
                            .or_insert_with(|| net.model(model.clone()));
                        let pump = Pump {
                            model,
                            ..pump.clone()
                        };
                        Part::Pump(net.pump(pump, *setting))
                    }
                });
            }
            net.line(&line.name, nodes[line.from], nodes[line.to], parts);
        }
        for (id, pump) in protected {
            let pump = net.find_pump(pump).unwrap();
            net.protect(id, pump);
        }
        net.build().unwrap()
    }
}

/// Loss and slope of a whole line by the public laws of its parts.
pub fn line_loss(network: &Network, settings: &Settings, line: LineId, q: f64) -> (f64, f64) {
    let (mut head, mut slope) = (0.0, 0.0);
    for part in &network.line(line).parts {
        let loss = match part {
            Part::Pipe(pipe) => pipe.friction.loss(q),
            Part::Loss(loss) | Part::CheckValve(loss) => loss.loss(q),
            Part::Valve(id) => network
                .valve(*id)
                .loss_at(settings.valve(*id).opening)
                .unwrap_or(QuadraticLoss::NONE)
                .loss(q),
            Part::Regulator(id) => network.regulator(*id).wide_open.loss(q),
            Part::Pump(id) => {
                let setting = settings.pump(*id);
                let law = PumpLaw {
                    head: &network.model(*id).head,
                    ratio: setting.speed * setting.trim,
                    wear: setting.wear,
                };
                match network.pump(*id).when_stopped {
                    _ if setting.running => law.loss(q),
                    Some(standing) => standing.loss(q),
                    None => QuadraticLoss::NONE.loss(q),
                }
            }
        };
        head += loss.head;
        slope += loss.slope;
    }
    (head, slope)
}

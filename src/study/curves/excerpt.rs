//! A part of a network as a network of its own: the lines one wants to look at, with the nodes they join.

use crate::network::{
    BuildError, End, LineId, Network, NetworkBuilder, NodeId, NodeKind, Settings,
};
use crate::part::{Part, PumpId};

/// A copy of some lines of a network, and what its ids are there.
pub(super) struct Excerpt {
    pub network: Network,
    ids: Ids,
}

/// Ids in the copy by those in the whole.
struct Ids {
    nodes: Vec<Option<NodeId>>,
    lines: Vec<Option<LineId>>,
    pumps: Vec<Option<PumpId>>,
}

/// What a node becomes in the copy.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Stand {
    pub kind: NodeKind,
    pub level: f64,
    pub draw: f64,
}

impl Stand {
    /// As the node is.
    pub fn of(network: &Network, settings: &Settings, id: NodeId) -> Self {
        Self {
            kind: network.node(id).kind,
            level: settings.level(id),
            draw: settings.draw(id),
        }
    }
}

impl Excerpt {
    /// Copies the lines for which `keep` holds and every node that they or `ends` touch, settings included; `stand` says what
    /// each node becomes.
    ///
    /// # Errors
    /// [`BuildError`] where what is left is no network: no head is held in it, say.
    pub fn new(
        network: &Network,
        settings: &Settings,
        keep: impl Fn(LineId) -> bool,
        ends: &[NodeId],
        stand: impl Fn(NodeId) -> Stand,
    ) -> Result<Self, BuildError> {
        let kept: Vec<LineId> = network.line_ids().filter(|id| keep(*id)).collect();
        let mut touched = vec![false; network.nodes().len()];
        let ends_of = |id: &LineId| [network.line(*id).from, network.line(*id).to];
        for node in kept.iter().flat_map(ends_of).chain(ends.iter().copied()) {
            touched[node.index()] = true;
        }
        let mut builder =
            NetworkBuilder::new(*network.fluid(), network.gravity(), network.barometer());
        for model in network.models() {
            builder.model(model.clone());
        }
        let mut ids = Ids {
            nodes: vec![None; network.nodes().len()],
            lines: vec![None; network.lines().len()],
            pumps: vec![None; network.pumps().len()],
        };
        for id in network.node_ids().filter(|id| touched[id.index()]) {
            let Stand { kind, level, draw } = stand(id);
            let new = builder.node(&network.node(id).name, kind, draw, level);
            ids.nodes[id.index()] = Some(new);
            if kind == network.node(id).kind {
                let (gas, mode) = (settings.gas_pressure(id), settings.tank_mode(id));
                builder.settings_mut().set_gas_pressure(new, gas);
                builder.settings_mut().set_tank_mode(new, mode);
            }
        }
        for id in kept {
            ids.copy_line(network, settings, &mut builder, id);
        }
        Ok(Self {
            network: builder.build()?,
            ids,
        })
    }

    /// The node in the copy.
    pub fn node(&self, id: NodeId) -> Option<NodeId> {
        self.ids.nodes[id.index()]
    }

    /// The pump in the copy.
    pub fn pump(&self, id: PumpId) -> Option<PumpId> {
        self.ids.pumps[id.index()]
    }

    /// The line in the copy.
    pub fn line(&self, id: LineId) -> Option<LineId> {
        self.ids.lines[id.index()]
    }
}

impl Ids {
    fn copy_line(
        &mut self,
        network: &Network,
        settings: &Settings,
        builder: &mut NetworkBuilder,
        id: LineId,
    ) {
        let line = network.line(id);
        let ends = [line.from, line.to].map(|end| self.nodes[end.index()]);
        let [Some(from), Some(to)] = ends else {
            return;
        };
        let parts = line.parts.iter().map(|part| match part {
            Part::Pump(pump) => {
                let new = builder.pump(network.pump(*pump).clone(), *settings.pump(*pump));
                self.pumps[pump.index()] = Some(new);
                Part::Pump(new)
            }
            Part::Valve(valve) => {
                Part::Valve(builder.valve(*network.valve(*valve), *settings.valve(*valve)))
            }
            other => other.clone(),
        });
        let parts: Vec<Part> = parts.collect();
        let new = builder.line(&line.name, from, to, parts);
        self.lines[id.index()] = Some(new);
        let copied = builder.settings_mut();
        copied.set_check(new, settings.check(id));
        copied.set_fouling(new, settings.fouling(id));
        for (end, port) in [End::From, End::To].into_iter().zip(line.ports) {
            if let Some(height) = port {
                builder.port(new, end, height);
            }
        }
    }
}

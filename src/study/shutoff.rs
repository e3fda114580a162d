//! The highest heads that the system can stand at: every way out shut, the pumps at no flow.

use crate::network::{LimitName, LineId, Network, NodeId, NodeKind, Passage, Settings};
use crate::part::PumpId;

/// The highest head (m) at each node, and how it came there.
///
/// That of a free surface, carried along every line that water can pass, and raised by the shut-off head of each pump on the way,
/// none counted twice. All pumps count, also those that do not run, at their set speed, trim and wear, their heads higher by the
/// limit `shutoff_tolerance`.
pub struct ShutoffHeads<'a> {
    network: &'a Network,
    settings: &'a Settings,
    /// 1 + tolerance.
    raised: f64,
    /// One per node.
    highest: Vec<Option<Reached>>,
}

/// A head and the pumps that raised it.
#[derive(Clone)]
struct Reached {
    head: f64,
    through: Vec<PumpId>,
}

impl<'a> ShutoffHeads<'a> {
    /// Carries heads through the network until none rises any more.
    pub fn new(network: &'a Network, settings: &'a Settings) -> Self {
        let tolerance = network.limits().value(LimitName::ShutoffTolerance);
        let standing = |id| {
            Some(Reached {
                head: surface(network, settings, id)?,
                through: Vec::new(),
            })
        };
        let mut heads = Self {
            network,
            settings,
            raised: 1.0 + tolerance.unwrap_or(0.0),
            highest: network.node_ids().map(standing).collect(),
        };
        let mut changed = true;
        while changed {
            changed = false;
            for line in network.line_ids() {
                changed |= heads.carry(line);
            }
        }
        heads
    }

    /// The highest head at a node; none where no surface leads.
    pub fn at(&self, node: NodeId) -> Option<f64> {
        Some(self.highest[node.index()].as_ref()?.head)
    }

    /// The highest head at the outlet of a pump.
    pub fn at_outlet(&self, pump: PumpId) -> Option<f64> {
        let line = self.network.line(self.network.line_of(pump));
        let before = line.pumps().take_while(|other| *other != pump);
        let inlet = self.highest[line.from.index()].as_ref()?;
        let pumps: Vec<PumpId> = before.chain([pump]).collect();
        Some(inlet.head + self.lift(inlet, &pumps))
    }

    /// What pumps add that have not added to it yet.
    fn lift(&self, inlet: &Reached, pumps: &[PumpId]) -> f64 {
        let new = pumps.iter().filter(|pump| !inlet.through.contains(pump));
        new.map(|pump| self.raised * shutoff_head(self.network, self.settings, *pump))
            .sum()
    }

    /// Carries heads along a line; whether any node stands higher now.
    fn carry(&mut self, id: LineId) -> bool {
        let line = self.network.line(id);
        if self.network.passage(id, self.settings) == Passage::Closed {
            return false;
        }
        let direction = self.network.direction(id, self.settings);
        let pumps: Vec<PumpId> = line.pumps().collect();
        let mut higher = false;
        if direction.forward()
            && let Some(from) = self.highest[line.from.index()].clone()
        {
            let mut reached = from;
            reached.head += self.lift(&reached, &pumps);
            reached.through.extend(&pumps);
            higher |= self.raise(line.to, reached);
        }
        if pumps.is_empty()
            && direction.backward()
            && let Some(to) = self.highest[line.to.index()].clone()
        {
            higher |= self.raise(line.from, to);
        }
        higher
    }

    fn raise(&mut self, node: NodeId, reached: Reached) -> bool {
        let place = &mut self.highest[node.index()];
        let higher = place
            .as_ref()
            .is_none_or(|standing| reached.head > standing.head + 1e-9);
        if higher {
            *place = Some(reached);
        }
        higher
    }
}

/// Head of a pump at no flow at its set speed, trim and wear, m.
pub fn shutoff_head(network: &Network, settings: &Settings, pump: PumpId) -> f64 {
    let setting = settings.pump(pump);
    (1.0 - setting.wear) * setting.ratio().powi(2) * network.model(pump).shutoff_head()
}

/// The highest free surface that lines join to a node, whichever way their check valves face, m: what stands behind a check valve
/// that leaks. None where no surface is joined. Slice length: one per node.
pub fn standing_heads(network: &Network, settings: &Settings) -> Vec<Option<f64>> {
    let mut highest: Vec<f64> = network
        .node_ids()
        .map(|id| surface(network, settings, id).unwrap_or(f64::NEG_INFINITY))
        .collect();
    let mut changed = true;
    while changed {
        changed = false;
        for line in network.lines() {
            let ends = [line.from.index(), line.to.index()];
            let high = highest[ends[0]].max(highest[ends[1]]);
            for end in ends {
                changed |= highest[end] < high;
                highest[end] = high;
            }
        }
    }
    let known = |head: f64| head.is_finite().then_some(head);
    highest.into_iter().map(known).collect()
}

/// Head of a free surface; none at points and at outlets, where nothing comes back in.
fn surface(network: &Network, settings: &Settings, id: NodeId) -> Option<f64> {
    match network.node(id).kind {
        NodeKind::Outlet { .. } | NodeKind::Point { .. } => None,
        NodeKind::Reservoir | NodeKind::Tank { .. } => network.fixed_head(id, settings),
    }
}

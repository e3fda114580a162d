//! Pressures against the ratings of casings and lines: as the system runs, with every way out shut, and behind leaking check valves.

use super::limit::{About, Judge, Limit, LimitKind, Says};
use super::shutoff::{ShutoffHeads, standing_heads};
use crate::network::{LineId, Network, NodeId, Settings};
use crate::part::PumpId;
use crate::solve::operation::{NodeOperation, PumpOperation};

/// Judges every casing and line whose rating is known; without any it does nothing.
pub(super) fn limits(
    network: &Network,
    settings: &Settings,
    nodes: &[NodeOperation],
    pumps: &[PumpOperation],
    found: &mut Vec<Limit>,
) {
    let casings: Vec<(PumpId, f64)> = network
        .pump_ids()
        .filter_map(|id| Some((id, network.model(id).maker.casing_pressure?)))
        .collect();
    let ratings: Vec<(LineId, f64)> = network
        .line_ids()
        .filter_map(|id| Some((id, network.line(id).facts.rating?)))
        .collect();
    if casings.is_empty() && ratings.is_empty() {
        return;
    }
    let pressures = Pressures {
        network,
        settings,
        nodes,
        pumps,
        shutoff: ShutoffHeads::new(network, settings),
        standing: standing_heads(network, settings),
    };
    for (id, rated) in casings {
        let mut judge = Judge {
            about: About::Pump(id),
            found,
        };
        for (kind, pressure) in [
            (LimitKind::Casing, pressures.outlet(id)),
            (LimitKind::CasingAtShutoff, pressures.outlet_at_shutoff(id)),
        ] {
            if let Some(pressure) = pressure {
                judge.add(kind, pressure, rated, Says::Maker);
            }
        }
    }
    for (id, rated) in ratings {
        let mut judge = Judge {
            about: About::Line(id),
            found,
        };
        let running = pressures.running(id);
        let at_shutoff = pressures.at_shutoff(id);
        // A leak matters only where it makes things worse than they are anyhow.
        let leaking = pressures
            .if_leaking(id)
            .filter(|leaking| Some(*leaking) > at_shutoff && Some(*leaking) > running);
        for (kind, pressure) in [
            (LimitKind::Rating, running),
            (LimitKind::RatingAtShutoff, at_shutoff),
            (LimitKind::RatingIfLeaking, leaking),
        ] {
            if let Some(pressure) = pressure {
                judge.add(kind, pressure, rated, Says::Rating);
            }
        }
    }
}

/// Gauge pressures, Pa; none where there is no head.
struct Pressures<'a> {
    network: &'a Network,
    settings: &'a Settings,
    nodes: &'a [NodeOperation],
    pumps: &'a [PumpOperation],
    shutoff: ShutoffHeads<'a>,
    standing: Vec<Option<f64>>,
}

impl Pressures<'_> {
    fn weight(&self) -> f64 {
        self.network.fluid().density * self.network.gravity()
    }

    fn outlet(&self, id: PumpId) -> Option<f64> {
        let pump = &self.pumps[id.index()];
        Some(pump.suction_pressure? + self.weight() * pump.head?)
    }

    fn outlet_at_shutoff(&self, id: PumpId) -> Option<f64> {
        let elevation = self.network.pump(id).elevation;
        Some(self.weight() * (self.shutoff.at_outlet(id)? - elevation))
    }

    /// The highest in a line as it runs: at its ends and behind its pumps.
    fn running(&self, id: LineId) -> Option<f64> {
        let pumps = self.network.line(id).pumps();
        let at_pumps = pumps.filter_map(|pump| self.outlet(pump));
        let at_ends = self.at_ends(id, |node| self.nodes[node.index()].head);
        at_ends.chain(at_pumps).max_by(f64::total_cmp)
    }

    fn at_shutoff(&self, id: LineId) -> Option<f64> {
        let pumps = self.network.line(id).pumps();
        let at_pumps = pumps.filter_map(|pump| self.outlet_at_shutoff(pump));
        let at_ends = self.at_ends(id, |node| self.shutoff.at(node));
        at_ends.chain(at_pumps).max_by(f64::total_cmp)
    }

    fn if_leaking(&self, id: LineId) -> Option<f64> {
        self.at_ends(id, |node| self.standing[node.index()])
            .max_by(f64::total_cmp)
    }

    /// Pressures that heads at the ends of a line give there.
    fn at_ends(
        &self,
        id: LineId,
        head: impl Fn(NodeId) -> Option<f64>,
    ) -> impl Iterator<Item = f64> {
        let line = self.network.line(id);
        [line.from, line.to].into_iter().filter_map(move |node| {
            let elevation = self.network.elevation(node, self.settings);
            Some(self.weight() * (head(node)? - elevation))
        })
    }
}

//! Which pumps the curves are drawn for: those between the same two nodes, and what stands in series with them.

use crate::network::{LineId, Network, NodeId, Passage, Settings};
use crate::part::PumpId;
use crate::solve::Solver;

use super::system::SystemSide;

/// Lines with pumps side by side: from one node to another.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Stage {
    /// Where their suctions meet.
    pub from: NodeId,
    /// Where their branches meet.
    pub to: NodeId,
    /// The lines.
    pub lines: Vec<LineId>,
}

impl Stage {
    /// Its pumps, in order.
    pub fn pumps(&self, network: &Network) -> Vec<PumpId> {
        self.lines
            .iter()
            .flat_map(|line| network.line(*line).pumps())
            .collect()
    }

    /// The name of its bank or line; several are joined.
    pub fn name(&self, network: &Network) -> String {
        let mut names: Vec<&str> = Vec::new();
        for line in &self.lines {
            let bank = network
                .banks()
                .iter()
                .find(|bank| bank.lines.contains(line));
            let name = bank.map_or(&network.line(*line).name, |bank| &bank.name);
            if !names.contains(&name.as_str()) {
                names.push(name);
            }
        }
        names.join(" + ")
    }

    fn is_called(&self, network: &Network, name: &str) -> bool {
        let of_bank = |line: &LineId| {
            let mut banks = network.banks().iter();
            banks.any(|bank| bank.name == name && bank.lines.contains(line))
        };
        let of_line = |line: &LineId| network.line(*line).name == name;
        self.lines.iter().any(|line| of_bank(line) || of_line(line))
            || self
                .pumps(network)
                .iter()
                .any(|pump| network.pump(*pump).name == name)
    }
}

/// All groups of lines with pumps that share both ends, in the order of the network.
pub fn stages(network: &Network) -> Vec<Stage> {
    let mut stages: Vec<Stage> = Vec::new();
    for id in network.line_ids() {
        let line = network.line(id);
        if line.pumps().next().is_none() {
            continue;
        }
        match stages
            .iter_mut()
            .find(|stage| (stage.from, stage.to) == (line.from, line.to))
        {
            Some(stage) => stage.lines.push(id),
            None => stages.push(Stage {
                from: line.from,
                to: line.to,
                lines: vec![id],
            }),
        }
    }
    stages
}

/// The stages to draw: the one that holds `bank`, or else the one with the most pumps and every other that carries the same
/// flow whatever it is.
pub(super) fn choose(network: &Network, bank: Option<&str>) -> Option<Vec<Stage>> {
    let all = stages(network);
    if let Some(name) = bank {
        return all
            .into_iter()
            .find(|stage| stage.is_called(network, name))
            .map(|stage| vec![stage]);
    }
    let most = all.iter().map(|stage| stage.pumps(network).len()).max()?;
    let first = all
        .iter()
        .find(|stage| stage.pumps(network).len() == most)?
        .clone();
    let in_series = |stage: &Stage| *stage == first || carries_the_same(network, &first, stage);
    Some(
        all.iter()
            .filter(|stage| in_series(stage))
            .cloned()
            .collect(),
    )
}

/// Whether all that flows through one stage flows through another: seen by trying two flows with every pump running.
fn carries_the_same(network: &Network, one: &Stage, other: &Stage) -> bool {
    let mut settings = network.settings().clone();
    for pump in network.pump_ids() {
        settings.pump_mut(pump).running = true;
    }
    let Ok(side) = SystemSide::new(network, &settings, one) else {
        return false;
    };
    let mut solver = Solver::new(side.network());
    let ends = one.pumps(network).into_iter();
    let scale: f64 = ends.map(|pump| network.model(pump).end_of_curve()).sum();
    [0.4, 0.7].into_iter().all(|share| {
        let flow = share * scale;
        side.flow_through(&mut solver, flow, &other.lines)
            .is_some_and(|carried| (carried - flow).abs() < 1e-6 * scale)
    })
}

/// Why the head that a station has to give does not depend on its flow alone.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Branching {
    /// Other pumps run there.
    OtherPumps(Vec<PumpId>),
    /// Water is drawn or flows in on the way.
    Draws(Vec<NodeId>),
    /// One side leads to more than one fixed head.
    SeveralEnds(Vec<NodeId>),
    /// Water can pass from one header to the other without the station's pumps.
    WayRound,
}

/// What makes the system of these stages branch; empty where one curve tells all.
pub(super) fn branchings(
    network: &Network,
    settings: &Settings,
    stages: &[Stage],
) -> Vec<Branching> {
    let mut pumps = Vec::new();
    let mut draws = Vec::new();
    let mut several = Vec::new();
    let mut way_round = false;
    for (k, stage) in stages.iter().enumerate() {
        let outer = [k == 0, k + 1 == stages.len()];
        for (header, opposite) in [(stage.from, stage.to), (stage.to, stage.from)] {
            let seen = reached(network, settings, stages, header);
            let joined = seen.points.contains(&opposite);
            way_round |= joined;
            pumps.extend(seen.pumps);
            let drawn = |node: &&NodeId| settings.draw(**node) != 0.0;
            draws.extend(seen.points.iter().filter(drawn));
            // An outer side has one end of its own, and sides that are joined see each other's.
            let own = outer[usize::from(header == stage.to)];
            let other = joined && outer[usize::from(opposite == stage.to)];
            if seen.ends.len() > usize::from(own) + usize::from(other) {
                several.extend(seen.ends);
            }
        }
    }
    let mut found = Vec::new();
    for list in [&mut draws, &mut several] {
        list.sort();
        list.dedup();
    }
    pumps.sort();
    pumps.dedup();
    if !pumps.is_empty() {
        found.push(Branching::OtherPumps(pumps));
    }
    if !draws.is_empty() {
        found.push(Branching::Draws(draws));
    }
    if !several.is_empty() {
        found.push(Branching::SeveralEnds(several));
    }
    if way_round {
        found.push(Branching::WayRound);
    }
    found
}

/// What stands on one side of a station.
struct Seen {
    points: Vec<NodeId>,
    ends: Vec<NodeId>,
    pumps: Vec<PumpId>,
}

/// Follows the lines outside the stages from a header as far as the fixed heads.
fn reached(network: &Network, settings: &Settings, stages: &[Stage], header: NodeId) -> Seen {
    let mut seen = Seen {
        points: Vec::new(),
        ends: Vec::new(),
        pumps: Vec::new(),
    };
    let mut known = vec![false; network.nodes().len()];
    let mut waiting = vec![header];
    known[header.index()] = true;
    let outside = |id: &LineId| !stages.iter().any(|stage| stage.lines.contains(id));
    let rest: Vec<LineId> = network
        .line_ids()
        .filter(|id| outside(id) && passes(network, settings, *id))
        .collect();
    while let Some(node) = waiting.pop() {
        if network.fixed_head(node, settings).is_some() {
            seen.ends.push(node);
            continue;
        }
        seen.points.push(node);
        for id in &rest {
            let line = network.line(*id);
            let next = match (line.from == node, line.to == node) {
                (true, _) => line.to,
                (_, true) => line.from,
                _ => continue,
            };
            let running = line.pumps().filter(|pump| settings.pump(*pump).running);
            seen.pumps.extend(running);
            if !std::mem::replace(&mut known[next.index()], true) {
                waiting.push(next);
            }
        }
    }
    seen
}

/// Whether no shut valve and no stopped pump stands in a line.
fn passes(network: &Network, settings: &Settings, id: LineId) -> bool {
    network.passage(id, settings) == Passage::Open
}

//! What water can reach: the part of the work that needs only the topology, done before any equation is solved.
//!
//! One-way lines are followed in their direction only. What is found decides which heads mean something, which draws
//! can be met at all, and which lines cannot carry a flow whatever their laws.

use petgraph::graph::{NodeIndex, UnGraph};
use petgraph::visit::EdgeRef;

use super::{CheckCondition, Direction, LineId, Network, NodeId, Settings};
use crate::part::Part;
use crate::part::regulator::Regulates;

/// Whether water can pass a line at all, as the settings have it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Passage {
    /// It can.
    #[default]
    Open,
    /// A valve is shut, or a check valve stuck shut.
    Closed,
    /// A pump is stopped and lets nothing pass.
    Stopped,
}

/// How a node stands to the fixed heads.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Standing {
    /// A fixed head itself, or joined to one by ways that water can take.
    #[default]
    Joined,
    /// Water can come in but has nowhere to go on to: its head is the highest that any way in can hold.
    Blind,
    /// No water can come in: its head means nothing.
    Unserved,
}

/// A draw or an inflow that no flow can satisfy.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Unreachable {
    /// Where.
    pub node: NodeId,
    /// Flow leaving the system there, m3/s; negative for an inflow.
    pub draw: f64,
}

/// What a node is to the search.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Seed {
    Fixed,
    Inflow,
    Draw,
    None,
}

/// The topology of a network and what water can reach in it.
pub struct Reach {
    graph: UnGraph<(), ()>,
    passages: Vec<Passage>,
    directions: Vec<Direction>,
    seeds: Vec<Seed>,
    /// Whether what follows fits the passages, directions and seeds.
    valid: bool,
    standings: Vec<Standing>,
    /// Per node, a number shared by all nodes that are joined by ways in use.
    components: Vec<u32>,
    /// Per component: the first node seen, and whether a fixed head is in it.
    held: Vec<(NodeId, bool)>,
    forward_reached: Vec<bool>,
    backward_reached: Vec<bool>,
    stack: Vec<NodeIndex>,
}

impl Reach {
    /// Lays the network out as a graph; [`Self::update`] must follow before anything is asked.
    pub fn new(network: &Network) -> Self {
        let (nodes, lines) = (network.nodes().len(), network.lines().len());
        let mut graph = UnGraph::with_capacity(nodes, lines);
        for _ in 0..nodes {
            graph.add_node(());
        }
        for line in network.lines() {
            graph.add_edge(
                NodeIndex::new(line.from.index()),
                NodeIndex::new(line.to.index()),
                (),
            );
        }
        Self {
            graph,
            passages: vec![Passage::Open; lines],
            directions: vec![Direction::Both; lines],
            seeds: vec![Seed::None; nodes],
            valid: false,
            standings: vec![Standing::Joined; nodes],
            components: vec![0; nodes],
            held: Vec::with_capacity(nodes),
            forward_reached: vec![false; nodes],
            backward_reached: vec![false; nodes],
            stack: Vec::with_capacity(nodes),
        }
    }

    /// Finds passages, standings and components for these settings. Allocates nothing. True if any of them may have
    /// changed since the last time: levels, speeds and sizes of draws alone change none.
    ///
    /// # Errors
    /// The first draw that no water reaches, or inflow that has nowhere to go.
    pub fn update(&mut self, network: &Network, settings: &Settings) -> Result<bool, Unreachable> {
        let changed = self.look(network, settings) | !std::mem::take(&mut self.valid);
        if changed {
            self.follow(network, settings)?;
        }
        self.check_floating(network, settings)?;
        self.valid = true;
        Ok(changed)
    }

    /// Takes in what topology depends on; true if it is not what it was.
    fn look(&mut self, network: &Network, settings: &Settings) -> bool {
        fn put<T: PartialEq>(place: &mut T, value: T) -> bool {
            let changed = *place != value;
            *place = value;
            changed
        }
        let mut changed = false;
        let lines = self.passages.iter_mut().zip(&mut self.directions);
        for ((passage, direction), line) in lines.zip(network.line_ids()) {
            changed |= put(passage, network.passage(line, settings));
            changed |= put(direction, network.direction(line, settings));
        }
        for (seed, node) in self.seeds.iter_mut().zip(network.node_ids()) {
            let draw = settings.draw(node);
            let now = match network.fixed_head(node, settings) {
                Some(_) => Seed::Fixed,
                None if draw < 0.0 => Seed::Inflow,
                None if draw > 0.0 => Seed::Draw,
                None => Seed::None,
            };
            changed |= put(seed, now);
        }
        changed
    }

    /// Follows the water from where it comes and to where it can go.
    fn follow(&mut self, network: &Network, settings: &Settings) -> Result<(), Unreachable> {
        // Where water comes from: fixed heads and inflows, followed downstream.
        self.spread(network, true, Seed::Inflow);
        // Where water can go: fixed heads and draws, followed upstream.
        self.spread(network, false, Seed::Draw);
        for node in network.node_ids() {
            let i = node.index();
            let (in_, out) = (self.forward_reached[i], self.backward_reached[i]);
            let unmet = match self.seeds[i] {
                Seed::Draw => !in_,
                Seed::Inflow => !out,
                Seed::Fixed | Seed::None => false,
            };
            if unmet {
                let draw = settings.draw(node);
                return Err(Unreachable { node, draw });
            }
            self.standings[i] = match (in_, out) {
                (true, true) => Standing::Joined,
                (true, false) => Standing::Blind,
                (false, _) => Standing::Unserved,
            };
        }
        self.find_components(network);
        Ok(())
    }

    /// Marks every node that can be reached from the seeds, downstream or upstream.
    fn spread(&mut self, network: &Network, downstream: bool, seed: Seed) {
        let Self {
            graph,
            passages,
            stack,
            forward_reached,
            backward_reached,
            directions,
            seeds,
            ..
        } = self;
        let reached = if downstream {
            forward_reached
        } else {
            backward_reached
        };
        stack.clear();
        for node in network.node_ids() {
            let here = seeds[node.index()];
            reached[node.index()] = here == Seed::Fixed || here == seed;
            if reached[node.index()] {
                stack.push(NodeIndex::new(node.index()));
            }
        }
        while let Some(here) = stack.pop() {
            for edge in graph.edges(here) {
                let next = edge.target();
                if reached[next.index()] || passages[edge.id().index()] != Passage::Open {
                    continue;
                }
                let line = LineId(edge.id().index() as u32);
                let along = network.line(line).from.index() == here.index();
                let direction = directions[line.index()];
                if if along == downstream {
                    direction.forward()
                } else {
                    direction.backward()
                } {
                    reached[next.index()] = true;
                    stack.push(next);
                }
            }
        }
    }

    /// Numbers the sets of nodes that are joined by lines in use.
    fn find_components(&mut self, network: &Network) {
        const NONE: u32 = u32::MAX;
        self.components.fill(NONE);
        self.held.clear();
        for start in network.node_ids() {
            if self.components[start.index()] != NONE {
                continue;
            }
            let component = self.held.len() as u32;
            let mut holds_head = false;
            self.components[start.index()] = component;
            self.stack.push(NodeIndex::new(start.index()));
            while let Some(here) = self.stack.pop() {
                holds_head |= self.seeds[here.index()] == Seed::Fixed;
                for edge in self.graph.edges(here) {
                    let next = edge.target().index();
                    if self.components[next] == NONE
                        && self.in_use(network, LineId(edge.id().index() as u32))
                    {
                        self.components[next] = component;
                        self.stack.push(edge.target());
                    }
                }
            }
            self.held.push((start, holds_head));
        }
    }

    /// A component without a fixed head must draw exactly what flows into it.
    fn check_floating(&self, network: &Network, settings: &Settings) -> Result<(), Unreachable> {
        let draw = |node: NodeId| settings.draw(node);
        if self.held.iter().all(|&(_, held)| held) {
            return Ok(());
        }
        for (component, &(first, held)) in self.held.iter().enumerate() {
            if held || (self.standing(first) != Standing::Joined) {
                continue;
            }
            let members = || {
                network
                    .node_ids()
                    .filter(|n| self.components[n.index()] as usize == component)
            };
            let (sum, size) = members().fold((0.0, 0.0), |(s, m): (f64, f64), n| {
                (s + draw(n), m + draw(n).abs())
            });
            if sum.abs() > 1e-12 * size {
                let node = members()
                    .max_by(|&a, &b| (sum * draw(a)).total_cmp(&(sum * draw(b))))
                    .unwrap_or(first);
                return Err(Unreachable {
                    node,
                    draw: draw(node),
                });
            }
        }
        Ok(())
    }

    /// Whether water can pass a line, as the settings have it.
    pub fn passage(&self, line: LineId) -> Passage {
        self.passages[line.index()]
    }

    /// Which way water can go through a line.
    pub fn direction(&self, line: LineId) -> Direction {
        self.directions[line.index()]
    }

    /// How a node stands to the fixed heads.
    pub fn standing(&self, node: NodeId) -> Standing {
        self.standings[node.index()]
    }

    /// Whether a line can carry a flow at all: it can be passed, and it does not lead out of where no water comes in
    /// nor into where none goes on.
    pub fn in_use(&self, network: &Network, line: LineId) -> bool {
        let ends = network.line(line);
        self.passage(line) == Passage::Open
            && self.direction(line) != Direction::Neither
            && self.standing(ends.from) == self.standing(ends.to)
    }

    /// The components that hold no fixed head, each by its first node.
    pub fn floating(&self) -> impl Iterator<Item = NodeId> + '_ {
        self.held
            .iter()
            .filter(|&&(_, held)| !held)
            .map(|&(node, _)| node)
    }

    /// Whether a node is in a component that holds no fixed head.
    pub fn floats(&self, node: NodeId) -> bool {
        !self.held[self.components[node.index()] as usize].1
    }

    /// The component that a node is in.
    pub fn component(&self, node: NodeId) -> u32 {
        self.components[node.index()]
    }

    /// The lines at a node, each with the node at its other end.
    pub fn lines_at(&self, node: NodeId) -> impl Iterator<Item = (LineId, NodeId)> + '_ {
        self.graph.edges(NodeIndex::new(node.index())).map(|edge| {
            (
                LineId(edge.id().index() as u32),
                NodeId(edge.target().index() as u32),
            )
        })
    }
}

impl Network {
    /// Whether water can pass a line: a shut valve comes before a stopped pump.
    pub fn passage(&self, line: LineId, settings: &Settings) -> Passage {
        if settings.check(line) == CheckCondition::StuckShut && self.line(line).has_check_valve() {
            return Passage::Closed;
        }
        let mut passage = Passage::Open;
        for part in &self.line(line).parts {
            match part {
                Part::Valve(id) => {
                    let setting = settings.valve(*id);
                    if !setting.open || self.valve(*id).loss_at(setting.opening).is_none() {
                        return Passage::Closed;
                    }
                }
                Part::Regulator(id) => {
                    // The recirculation line of a pump that stands stays shut.
                    let stands = match self.regulator(*id).regulates {
                        Regulates::MinimumFlow { pump } => !settings.pump(pump).running,
                        _ => false,
                    };
                    if !settings.regulator(*id).open || stands {
                        return Passage::Closed;
                    }
                }
                Part::Pump(id)
                    if !settings.pump(*id).running && self.pump(*id).when_stopped.is_none() =>
                {
                    passage = Passage::Stopped;
                }
                _ => {}
            }
        }
        passage
    }
}

//! The equations of one network under one set of settings, laid out for the iterations: who is unknown, which lines
//! carry an unknown flow, and what is known without iterating.
//!
//! Leaves are settled by continuity alone: a node with one line in use has exactly its draw for flow, so neither its
//! head nor its line's flow is an unknown. Stripping leaves again and again leaves the loops and the ways between held
//! heads; only these are iterated.

use super::laws::{Laws, ordinary_flow};
use super::linear::{Factor, Slot};
pub(super) use super::state::State;
use super::throttles::Throttles;
use super::tolerance::{HEAD, flow_tolerance};
use crate::network::{
    Direction, End, LineId, Network, NodeId, NodeKind, Reach, Settings, Unreachable,
};
use crate::part::{HeadLaw, HeadLoss};

/// What a line is to the iterations.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Role {
    /// Its flow is an unknown.
    Live,
    /// Its flow follows from continuity.
    Leaf,
    /// It carries nothing.
    Idle,
}

/// A node settled by continuity: one line, whose other end is nearer to the unknowns.
#[derive(Clone, Copy, Debug)]
pub(super) struct Leaf {
    pub node: u32,
    pub line: u32,
    pub parent: u32,
}

/// A live line, with all that an iteration asks of it side by side.
#[derive(Clone, Copy, Debug)]
pub(super) struct Live {
    pub line: u32,
    pub from: u32,
    pub to: u32,
    /// Unknowns of its ends. Held heads share one more, [`System::unknowns`], whose change is zero.
    pub from_unknown: u32,
    pub to_unknown: u32,
    /// Where its ends meet in the matrix.
    pub slot: Slot,
    /// 0 both ways, 1 forward only, -1 backward only.
    pub sense: f64,
    pub lift: f64,
    /// Nothing in it says which way it flows: both ways are open and no pump is in it.
    pub passive: bool,
}

impl Live {
    /// Its position among all lines.
    #[inline]
    pub fn index(&self) -> usize {
        self.line as usize
    }

    /// Head difference along it, from its `from` end to its `to` end, m.
    #[inline]
    pub fn drop(&self, heads: &[f64]) -> f64 {
        heads[self.from as usize] - heads[self.to as usize] + self.lift
    }
}

pub(super) struct System<'n> {
    pub network: &'n Network,
    pub laws: Laws<'n>,
    pub reach: Reach,
    pub factor: Factor,
    /// Per line, its ends.
    pub ends: Vec<(u32, u32)>,
    /// Per line: 0 both ways, 1 forward only, -1 backward only.
    pub sense: Vec<f64>,
    /// Per line: head at its `from` end less that at its `to` end, beyond the heads of the nodes there (ports above a
    /// tank's surface, and what a regulating part adds), m.
    pub lift: Vec<f64>,
    pub roles: Vec<Role>,
    /// The live lines, ascending.
    pub live: Vec<Live>,
    /// Per node: its head does not change while iterating.
    pub held: Vec<bool>,
    /// Per node: its head is held by what it is.
    pub fixed: Vec<bool>,
    /// Per node: its own draw, m3/s.
    pub own_draws: Vec<f64>,
    /// Per node: the draw that live lines must meet, leaves beyond it included, m3/s.
    pub draws: Vec<f64>,
    /// Per node, its place in the matrix; none where the head is fixed by kind.
    places: Vec<Option<u32>>,
    /// Per node, the same while its head is an unknown: not held, not a leaf.
    pub free: Vec<Option<u32>>,
    /// Per line: a flow in its ordinary range, in a direction that it allows.
    pub start_flow: Vec<f64>,
    /// Per line, its off-diagonal entry.
    pub slots: Vec<Option<Slot>>,
    pub leaves: Vec<Leaf>,
    degree: Vec<u32>,
    queue: Vec<u32>,
    was_live: Vec<bool>,
    pub throttles: Throttles,
    /// Counts the changes of roles and lifts.
    pub layout: u64,
}

impl<'n> System<'n> {
    pub fn new(network: &'n Network) -> Self {
        let (n, m) = (network.nodes().len(), network.lines().len());
        let mut count = 0;
        let places: Vec<Option<u32>> = network
            .nodes()
            .iter()
            .map(|node| {
                matches!(node.kind, NodeKind::Point { .. } | NodeKind::Tank { .. }).then(|| {
                    count += 1;
                    count - 1
                })
            })
            .collect();
        let ends: Vec<(u32, u32)> = network
            .lines()
            .iter()
            .map(|line| (line.from.index() as u32, line.to.index() as u32))
            .collect();
        let pair = |&(a, b): &(u32, u32)| places[a as usize].zip(places[b as usize]);
        let couplings: Vec<(u32, u32)> = ends.iter().filter_map(pair).collect();
        let (factor, mut handed_out) = Factor::new(count as usize, &couplings);
        let mut handed_out = handed_out.drain(..);
        let slots = ends
            .iter()
            .map(|ends| pair(ends).and_then(|_| handed_out.next()))
            .collect();
        Self {
            network,
            laws: Laws::new(network),
            reach: Reach::new(network),
            factor,
            ends,
            sense: vec![0.0; m],
            lift: vec![0.0; m],
            roles: vec![Role::Idle; m],
            live: Vec::with_capacity(m),
            held: vec![false; n],
            fixed: vec![false; n],
            own_draws: vec![0.0; n],
            draws: vec![0.0; n],
            free: places.clone(),
            places,
            start_flow: vec![0.0; m],
            slots,
            leaves: Vec::with_capacity(n),
            degree: vec![0; n],
            queue: Vec::with_capacity(n),
            was_live: vec![false; m],
            throttles: Throttles::new(network),
            layout: 0,
        }
    }

    /// A state to hold this system's answers.
    pub fn state(&self) -> State {
        let (n, m) = (self.held.len(), self.roles.len());
        State {
            heads: vec![0.0; n],
            flows: vec![0.0; m],
            shut: vec![false; m],
            cold: false,
        }
    }

    /// Lays the equations out for these settings and puts what is known into `state`. Allocates nothing. `network` is
    /// the system's own, or one of the same nodes, lines and parts with other figures.
    ///
    /// # Errors
    /// A draw or inflow that no flow can satisfy.
    pub fn prepare(
        &mut self,
        network: &Network,
        settings: &Settings,
        state: &mut State,
    ) -> Result<(), Unreachable> {
        let changed = self.reach.update(network, settings)?;
        self.laws.set(self.network, network, settings, None);
        let mut lifted = false;
        for line in self.network.line_ids() {
            let above = |end| network.above_surface(line, end, settings).unwrap_or(0.0);
            let base = above(End::From) - above(End::To);
            let lift = self.throttles.lift(line, base);
            lifted |= lift != std::mem::replace(&mut self.lift[line.index()], lift);
            self.sense[line.index()] = match self.reach.direction(line) {
                Direction::Both | Direction::Neither => 0.0,
                Direction::Forward => 1.0,
                Direction::Backward => -1.0,
            };
        }
        for node in self.network.node_ids() {
            let head = network.fixed_head(node, settings);
            self.held[node.index()] = head.is_some();
            self.fixed[node.index()] = head.is_some();
            let draw = if head.is_some() {
                0.0
            } else {
                settings.draw(node)
            };
            self.own_draws[node.index()] = draw;
            self.draws[node.index()] = draw;
            if let Some(head) = head {
                state.heads[node.index()] = head;
            }
        }
        // A set of nodes without a held head is solved relative to its first node.
        for ground in self.reach.floating() {
            self.held[ground.index()] = true;
            state.heads[ground.index()] = 0.0;
        }
        for (line, was_live) in self.was_live.iter_mut().enumerate() {
            *was_live = self.roles[line] == Role::Live;
        }
        if changed {
            self.strip_leaves(state);
        }
        if changed || lifted {
            self.layout += 1;
            self.gather_live();
        }
        self.fold_leaves(state);
        if !self.throttles.is_empty() {
            self.set_throttles(settings);
        }
        for (line, start) in self.start_flow.iter_mut().enumerate() {
            let flow = ordinary_flow(self.network, settings, line);
            *start = if self.sense[line] < 0.0 { -flow } else { flow };
        }
        Ok(())
    }

    /// Finds the leaves and who is left.
    fn strip_leaves(&mut self, state: &mut State) {
        self.degree.fill(0);
        for (i, &(from, to)) in self.ends.iter().enumerate() {
            let used = self.reach.in_use(self.network, LineId(i as u32));
            self.roles[i] = if used { Role::Live } else { Role::Idle };
            if used {
                self.degree[from as usize] += 1;
                self.degree[to as usize] += 1;
            } else {
                state.flows[i] = 0.0;
                state.shut[i] = false;
            }
        }
        self.leaves.clear();
        self.queue.clear();
        let is_leaf = |degree: &[u32], held: &[bool], node: usize| degree[node] == 1 && !held[node];
        self.queue.extend(
            (0..self.held.len() as u32).filter(|&i| is_leaf(&self.degree, &self.held, i as usize)),
        );
        while let Some(node) = self.queue.pop() {
            if self.degree[node as usize] != 1 {
                continue;
            }
            let only = self
                .reach
                .lines_at(NodeId(node))
                .find(|(line, _)| self.roles[line.index()] == Role::Live);
            let Some((line, parent)) = only else { continue };
            let (line, parent) = (line.index(), parent.index());
            self.roles[line] = Role::Leaf;
            state.shut[line] = false;
            self.degree[node as usize] = 0;
            self.degree[parent] -= 1;
            self.leaves.push(Leaf {
                node,
                line: line as u32,
                parent: parent as u32,
            });
            if is_leaf(&self.degree, &self.held, parent) {
                self.queue.push(parent as u32);
            }
        }
        for (node, free) in self.free.iter_mut().enumerate() {
            *free = self.places[node].filter(|_| !self.held[node] && self.degree[node] > 0);
        }
    }

    /// Continuity: the line of a leaf brings exactly what the leaf draws, and what lies beyond it.
    fn fold_leaves(&mut self, state: &mut State) {
        for leaf in &self.leaves {
            let line = leaf.line as usize;
            let brings = self.draws[leaf.node as usize];
            let towards = self.ends[line].1 == leaf.node;
            state.flows[line] = if towards { brings } else { -brings };
            self.draws[leaf.parent as usize] += brings;
        }
    }

    fn gather_live(&mut self) {
        self.live.clear();
        let shared = self.unknowns() as u32;
        for (line, role) in self.roles.iter().enumerate() {
            if *role != Role::Live {
                continue;
            }
            let (from, to) = self.ends[line];
            let (a, b) = (self.free[from as usize], self.free[to as usize]);
            let slot = match (a, b, self.slots[line]) {
                (Some(_), Some(_), Some(slot)) => slot,
                _ => Slot::UNUSED,
            };
            self.live.push(Live {
                line: line as u32,
                from,
                to,
                from_unknown: a.unwrap_or(shared),
                to_unknown: b.unwrap_or(shared),
                slot,
                sense: self.sense[line],
                lift: self.lift[line],
                passive: self.sense[line] == 0.0
                    && self.network.lines()[line].pumps().next().is_none(),
            });
        }
    }

    /// Puts the further loss of a unit of regulating parts into its line.
    pub fn throttle(&mut self, unit: usize, extra: f64) {
        let line = self.throttles.lines[unit];
        self.throttles.extra[unit] = extra;
        // Never by differences: a loss that went astray would leave its rounding behind.
        self.lift[line] = self.throttles.base[unit] - extra;
        if let Ok(at) = self
            .live
            .binary_search_by_key(&(line as u32), |live| live.line)
        {
            self.live[at].lift = self.lift[line];
        }
    }

    /// Number of unknowns of the matrix; those of held heads and leaves have no entries.
    pub fn unknowns(&self) -> usize {
        self.factor.unknowns()
    }

    /// A start when nothing is known: ordinary flows, all lines open, heads amid the held ones.
    pub fn cold_start(&self, state: &mut State) {
        /// In a station lines are drawn the way they flow, and ordinary flows are a better start than a standstill (6 iterations
        /// against 7); in streets and grids they are not (13 against 10, and 14 against 9).
        const LINES_OF_A_STATION: usize = 100;
        state.cold = self.live.len() > LINES_OF_A_STATION;
        let (mut sum, mut count) = (0.0, 0.0);
        for (head, _) in state
            .heads
            .iter()
            .zip(&self.held)
            .filter(|(_, held)| **held)
        {
            sum += head;
            count += 1.0;
        }
        let middle = if count > 0.0 { sum / count } else { 0.0 };
        for (head, _) in state
            .heads
            .iter_mut()
            .zip(&self.held)
            .filter(|(_, held)| !**held)
        {
            *head = middle;
        }
        for live in &self.live {
            self.open_line(state, live.index());
        }
    }

    /// A start from the last answer; lines that were not live then get their ordinary flow.
    pub fn warm_start(&self, state: &mut State) {
        state.cold = false;
        for live in &self.live {
            let line = live.index();
            // What was shut as a one-way line is not once water can pass both ways: nothing would open it again.
            let both_ways = self.sense[line] == 0.0 && state.shut[line];
            if !self.was_live[line] || both_ways {
                self.open_line(state, line);
            }
        }
    }

    /// Opens a line at its ordinary flow.
    pub fn open_line(&self, state: &mut State, line: usize) {
        state.shut[line] = false;
        state.flows[line] = self.start_flow[line];
    }

    #[inline]
    pub fn loss(&self, line: usize, q: f64) -> HeadLoss {
        self.laws.line(line).loss(q)
    }

    /// Head difference along a line, from its `from` end to its `to` end, m.
    #[inline]
    pub fn drop(&self, state: &State, line: usize) -> f64 {
        let (from, to) = self.ends[line];
        state.heads[from as usize] - state.heads[to as usize] + self.lift[line]
    }

    /// How far the head along a shut one-way line stands above the loss at which it would open; negative holds it shut.
    pub fn push(&self, state: &State, line: usize) -> f64 {
        self.sense[line] * (self.drop(state, line) - self.loss(line, 0.0).head)
    }

    /// As [`Self::push`], for a way into a set that nothing else joins to a held head: no regulating part lets more in than
    /// it would at flow.
    pub fn push_in(&self, state: &State, line: usize) -> f64 {
        match self.throttles.unit_of(line) {
            None => self.push(state, line),
            Some(unit) => self.throttles.push_in(self, state, unit),
        }
    }

    /// The first one-way line that flows against its sense, or is shut though the head along it would open it. Flows
    /// that stand still but for rounding are set to zero on the way.
    pub fn first_not_complementary(&self, state: &mut State) -> Option<usize> {
        let rounding = flow_tolerance(0.0);
        for live in &self.live {
            let line = live.index();
            if state.shut[line] {
                if self.push(state, line) > HEAD.absolute {
                    return Some(line);
                }
            } else if live.sense * state.flows[line] < -rounding {
                return Some(line);
            } else if live.sense * state.flows[line] < 0.0 {
                state.flows[line] = 0.0;
            }
        }
        None
    }

    /// Shuts an open one-way line, or opens a shut one.
    pub fn turn(&self, state: &mut State, line: usize) {
        if state.shut[line] {
            self.open_line(state, line);
        } else {
            state.shut[line] = true;
            state.flows[line] = 0.0;
        }
    }

    /// Whether a node belongs to a set that no fixed head is joined to.
    pub fn floats(&self, node: NodeId) -> bool {
        self.reach.floats(node)
    }
}

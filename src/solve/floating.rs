//! Heads of nodes that shut one-way lines leave without a joint to any held head.
//!
//! Between two check valves held shut any head within a range balances. Pumps and heads upstream fill such a set up to the
//! highest head that a way in can hold at no flow, and no further: that head is taken, so that an answer does not depend
//! on where its iterations came from.

use super::system::{Role, State, System};
use crate::network::NodeId;

/// Set number of nodes that are joined to a held head.
const JOINED: u32 = 0;
const NONE: u32 = u32::MAX;

/// Scratch: which set each node is in.
pub(super) struct Floating {
    set: Vec<u32>,
    stack: Vec<u32>,
    /// Per set: whether its heads are settled.
    settled: Vec<bool>,
}

impl Floating {
    pub fn new(system: &System) -> Self {
        let n = system.held.len();
        Self {
            set: vec![NONE; n],
            stack: Vec::with_capacity(n),
            settled: Vec::with_capacity(n + 1),
        }
    }

    /// Shifts each such set to its head. Allocates nothing.
    pub fn settle(&mut self, system: &System, state: &mut State) {
        if !system.live.iter().any(|live| state.shut[live.index()]) {
            return;
        }
        self.find_sets(system, state);
        let mut progress = true;
        while std::mem::take(&mut progress) {
            for set in 1..self.settled.len() as u32 {
                if !self.settled[set as usize]
                    && let Some(shift) = self.shift(system, state, set)
                {
                    self.settled[set as usize] = true;
                    progress = true;
                    for (head, _) in state
                        .heads
                        .iter_mut()
                        .zip(&self.set)
                        .filter(|(_, s)| **s == set)
                    {
                        *head += shift;
                    }
                }
            }
        }
    }

    /// Floods from each node along live lines that are not shut.
    fn find_sets(&mut self, system: &System, state: &State) {
        self.set.fill(NONE);
        self.settled.clear();
        self.settled.push(true);
        for (node, held) in system.held.iter().enumerate() {
            if *held {
                self.set[node] = JOINED;
                self.stack.push(node as u32);
            }
        }
        self.flood(system, state, JOINED);
        for node in 0..self.set.len() {
            if self.set[node] == NONE && system.free[node].is_some() {
                let set = self.settled.len() as u32;
                self.settled.push(false);
                self.set[node] = set;
                self.stack.push(node as u32);
                self.flood(system, state, set);
            }
        }
    }

    fn flood(&mut self, system: &System, state: &State, set: u32) {
        while let Some(here) = self.stack.pop() {
            for (line, next) in system.reach.lines_at(NodeId(here)) {
                let open = system.roles[line.index()] == Role::Live && !state.shut[line.index()];
                if open && self.set[next.index()] == NONE {
                    self.set[next.index()] = set;
                    self.stack.push(next.index() as u32);
                }
            }
        }
    }

    /// How far up the ways into a set can push it; none while one of them comes from a set that is not settled, or there
    /// is none.
    fn shift(&self, system: &System, state: &State, set: u32) -> Option<f64> {
        let mut shift: Option<f64> = None;
        for live in system.live.iter().filter(|live| state.shut[live.index()]) {
            let (upstream, downstream) = if live.sense > 0.0 {
                (live.from, live.to)
            } else {
                (live.to, live.from)
            };
            if self.set[downstream as usize] != set || self.set[upstream as usize] == set {
                continue;
            }
            if !self.settled[self.set[upstream as usize] as usize] {
                return None;
            }
            let push = system.push_in(state, live.index());
            if !push.is_finite() {
                continue;
            }
            shift = Some(shift.map_or(push, |most| most.max(push)));
        }
        shift
    }
}

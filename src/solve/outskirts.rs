//! Heads of what is not iterated: leaves, from the unknowns outwards, and sets that water can enter but not leave.

use super::system::{State, System};
use crate::network::{LineId, NodeId, Passage, Standing};

impl System<'_> {
    /// Heads of the leaves, from the unknowns outwards, and of blind sets, from what holds them.
    pub fn settle(&self, state: &mut State) {
        self.settle_leaves(state);
        // A blind set was solved relative to its first node. Its head is the highest that a way in can hold; a set fed
        // by another follows it, so go round until nothing moves.
        let blind = |node: NodeId| self.reach.standing(node) == Standing::Blind;
        for _ in 0..self.reach.floating().filter(|n| blind(*n)).count() {
            let mut moved = false;
            for first in self.reach.floating().filter(|n| blind(*n)) {
                moved |= self.lift_blind(state, first);
            }
            if !moved {
                break;
            }
        }
    }

    fn settle_leaves(&self, state: &mut State) {
        for leaf in self.leaves.iter().rev() {
            let line = leaf.line as usize;
            let loss = self.loss(line, state.flows[line]).head;
            let towards = self.ends[line].1 == leaf.node;
            // h(from) - h(to) = g(q), less the lift of the ends
            let loss = loss - self.lift[line];
            let fall = if towards { -loss } else { loss };
            state.heads[leaf.node as usize] = state.heads[leaf.parent as usize] + fall;
        }
    }

    /// Whether an idle line is the one whose head at no flow holds a blind set up: open, though nothing moves.
    pub fn holds_blind(&self, state: &State, line: usize) -> bool {
        let (from, to) = self.ends[line];
        let downstream = NodeId(if self.sense[line] > 0.0 { to } else { from });
        let blind = self.reach.standing(downstream) == Standing::Blind && self.sense[line] != 0.0;
        blind && self.push_in(state, line).abs() <= 1e-9
    }

    /// Shifts a blind set to the highest head that a line into it can hold at no flow; true if that moved it.
    fn lift_blind(&self, state: &mut State, first: NodeId) -> bool {
        let component = self.reach.component(first);
        let inside = |node: u32| self.reach.component(NodeId(node)) == component;
        let mut shift = f64::NEG_INFINITY;
        for (line, &(from, to)) in self.ends.iter().enumerate() {
            let open = self.reach.passage(LineId(line as u32)) == Passage::Open;
            if !open || self.sense[line] == 0.0 || inside(from) == inside(to) {
                continue;
            }
            let (upstream, downstream) = if self.sense[line] > 0.0 {
                (from, to)
            } else {
                (to, from)
            };
            if inside(downstream) && self.reach.standing(NodeId(upstream)) != Standing::Unserved {
                shift = shift.max(self.push_in(state, line));
            }
        }
        if !shift.is_finite() || shift.abs() <= 1e-13 * (1.0 + state.heads[first.index()].abs()) {
            return false;
        }
        for node in 0..self.held.len() as u32 {
            if inside(node) {
                state.heads[node as usize] += shift;
            }
        }
        true
    }

    /// Changes of head spread from the unknowns to the leaves beyond them, with `extra` the change of the further loss in a
    /// line.
    pub fn spread_to_leaves(&self, changes: &mut [f64], extra: impl Fn(usize) -> f64) {
        for leaf in self.leaves.iter().rev() {
            let line = leaf.line as usize;
            let towards = self.ends[line].1 == leaf.node;
            let fall = if towards { -extra(line) } else { extra(line) };
            changes[leaf.node as usize] = changes[leaf.parent as usize] + fall;
        }
    }
}

//! Islands: sets of nodes that shut one-way lines cut off from every held head while water still has to go in or out.
//!
//! Newton has no step for them: no head inside makes their balance. The step that a vanishing leak would give is
//! known all the same. With more flowing in than drawn the heads of an island rise together, without end, until the first
//! line out of it opens; with less they fall until the first line into it does. So that line is opened. Heads alone cannot
//! find it where the flow is so small that the head for it is lost in rounding.

use super::system::{State, System};

/// Scratch.
pub(super) struct Islands {
    /// Per node and one for all held heads: another node of its set, nearer to the one that stands for it.
    parent: Vec<u32>,
    /// Per set, at the node that stands for it: what its nodes draw, m3/s.
    draw: Vec<f64>,
    /// The shut line that opens first, and how far the head along it is above that at which it opens, m.
    first: Vec<Option<(u32, f64)>>,
}

impl Islands {
    pub fn new(system: &System) -> Self {
        let count = system.held.len() + 1;
        Self {
            parent: vec![0; count],
            draw: vec![0.0; count],
            first: vec![None; count],
        }
    }

    /// Opens the line that opens first at every island whose draws leave more than `tolerance` (m3/s) unmet; true if
    /// there was one.
    pub fn open(&mut self, system: &System, state: &mut State, tolerance: f64) -> bool {
        self.join(system, state);
        for live in system.live.iter().filter(|live| state.shut[live.index()]) {
            let (from, to) = (self.find(live.from), self.find(live.to));
            let (upstream, downstream) = if live.sense > 0.0 {
                (from, to)
            } else {
                (to, from)
            };
            if upstream == downstream {
                continue;
            }
            let push = system.push(state, live.index());
            if self.draw[upstream as usize] < -tolerance {
                self.offer(upstream, live.line, push);
            }
            if self.draw[downstream as usize] > tolerance {
                self.offer(downstream, live.line, push);
            }
        }
        let mut any = false;
        for (first, draw) in self.first.iter().zip(&self.draw) {
            if let Some((line, _)) = *first {
                let line = line as usize;
                state.shut[line] = false;
                state.flows[line] = system.sense[line] * draw.abs();
                any = true;
            }
        }
        any
    }

    /// Puts nodes that an open line joins into one set, and adds up what each set draws.
    fn join(&mut self, system: &System, state: &State) {
        let held = self.parent.len() - 1;
        for (node, parent) in self.parent.iter_mut().enumerate() {
            *parent = node as u32;
        }
        for (node, _) in system.held.iter().enumerate().filter(|(_, held)| **held) {
            self.parent[node] = held as u32;
        }
        for live in system.live.iter().filter(|live| !state.shut[live.index()]) {
            let (a, b) = (self.find(live.from), self.find(live.to));
            self.parent[a.min(b) as usize] = a.max(b);
        }
        self.draw.fill(0.0);
        self.first.fill(None);
        for (node, free) in system.free.iter().enumerate() {
            if free.is_some() {
                let set = self.find(node as u32);
                self.draw[set as usize] += system.draws[node];
            }
        }
        // held heads give and take what is asked
        self.draw[held] = 0.0;
    }

    fn find(&mut self, node: u32) -> u32 {
        let mut node = node as usize;
        while self.parent[node] as usize != node {
            // halve the way for the next time
            let next = self.parent[node] as usize;
            self.parent[node] = self.parent[next];
            node = self.parent[node] as usize;
        }
        node as u32
    }

    fn offer(&mut self, set: u32, line: u32, push: f64) {
        let first = &mut self.first[set as usize];
        if first.is_none_or(|(_, best)| push > best) {
            *first = Some((line, push));
        }
    }
}

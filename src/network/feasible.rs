//! Whether any flows at all can meet the draws and inflows, one-way lines respected and every law left aside.
//!
//! Laws do not limit how much a line can carry, but for parts that limit a flow, so this is a question of topology: two largest flows with unlimited
//! lines. One sends the inflows to the draws and fixed heads, one brings the draws from the inflows and fixed heads. If each can
//! be carried in full, so can both together (N. S. Mendelsohn, A. L. Dulmage, "Some generalizations of the problem of
//! distinct representatives", Canadian J. Math. 10, 1958).

use petgraph::algo::ford_fulkerson;
use petgraph::graph::{DiGraph, NodeIndex};

use super::{LineId, Network, NodeId, Passage, Reach, Settings, Unreachable};
use crate::part::regulator::Regulates;

const UNLIMITED: f64 = 1e30;

/// The largest flow that a line can carry forward whatever the heads, m3/s.
fn most_forward(network: &Network, line: LineId, settings: &Settings) -> f64 {
    let limits = network.line(line).regulators().filter_map(|id| {
        let limits = network.regulator(id).regulates == Regulates::Flow;
        limits.then(|| settings.regulator(id).set)
    });
    limits.fold(UNLIMITED, f64::min)
}

impl Reach {
    /// A draw or inflow that no flows can satisfy, if there is one: the node of the largest remainder.
    pub fn unsatisfiable(&self, network: &Network, settings: &Settings) -> Option<Unreachable> {
        let draw = |node: NodeId| {
            if network.fixed_head(node, settings).is_none() {
                settings.draw(node)
            } else {
                0.0
            }
        };
        let inflows = self.remainder(network, settings, true, |node| -draw(node));
        let draws = self.remainder(network, settings, false, draw);
        inflows.or(draws).map(|node| Unreachable {
            node,
            draw: draw(node),
        })
    }

    /// Where the most is left over when all `amount`s above zero are sent downstream (or fetched from upstream).
    fn remainder(
        &self,
        network: &Network,
        settings: &Settings,
        downstream: bool,
        amount: impl Fn(NodeId) -> f64,
    ) -> Option<NodeId> {
        let lines = network.lines().len();
        let mut graph: DiGraph<(), f64> =
            DiGraph::with_capacity(network.nodes().len() + 2, 2 * lines);
        for _ in network.nodes() {
            graph.add_node(());
        }
        let (start, end) = (graph.add_node(()), graph.add_node(()));
        for line in network
            .line_ids()
            .filter(|line| self.passage(*line) == Passage::Open)
        {
            let ends = network.line(line);
            let (from, to) = (
                NodeIndex::new(ends.from.index()),
                NodeIndex::new(ends.to.index()),
            );
            let direction = self.direction(line);
            let (there, back) = if downstream { (from, to) } else { (to, from) };
            if direction.forward() {
                graph.add_edge(there, back, most_forward(network, line, settings));
            }
            if direction.backward() {
                graph.add_edge(back, there, UNLIMITED);
            }
        }
        let mut wanted = Vec::new();
        for node in network.node_ids() {
            let here = NodeIndex::new(node.index());
            let amount = amount(node);
            if amount > 0.0 {
                wanted.push((node, amount, graph.add_edge(start, here, amount)));
            } else if amount < 0.0 {
                graph.add_edge(here, end, -amount);
            } else if network.fixed_head(node, settings).is_some() {
                graph.add_edge(here, end, UNLIMITED);
            }
        }
        let (_, flows) = ford_fulkerson(&graph, start, end);
        let left = |&(_, amount, edge): &(NodeId, f64, petgraph::graph::EdgeIndex)| {
            amount - flows[edge.index()]
        };
        let most = wanted.iter().max_by(|a, b| left(a).total_cmp(&left(b)))?;
        (left(most) > 1e-9 * most.1).then_some(most.0)
    }
}

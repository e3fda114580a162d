//! Large networks: streets (a random tree over a square grid and further grid lines, mean degree 2.4) and the whole grid,
//! generated alike by the SciPy peer.
//!
//! Invented data. Random numbers: `state = state * 6364136223846793005 + 1442695040888963407` modulo 2^64, of which the upper 32
//! bits over 2^32 are the number. The grid's lines are shuffled (Fisher–Yates from the last down, j = floor(u (i + 1))), then
//! taken in that order: first those that join two parts not yet joined, then others, until there are 1.2 lines a node, and sorted. Lengths
//! 50 to 500 m, bores 0.1 to 0.6 m, roughness 0.1 mm; node 0 is a reservoir at 100 m, every other node draws up to 1 m3/s / nodes.

use dutybank::fluid::Fluid;
use dutybank::network::{Network, NetworkBuilder, NodeId, NodeKind};
use dutybank::part::Part;
use dutybank::part::friction::{Friction, Pipe};

const G: f64 = 9.80665;
const NU: f64 = 1.0034e-6;

struct Random(u64);

impl Random {
    fn unit(&mut self) -> f64 {
        self.0 = self
            .0
            .wrapping_mul(6364136223846793005)
            .wrapping_add(1442695040888963407);
        (self.0 >> 32) as f64 / 4294967296.0
    }
}

struct Maker {
    random: Random,
    net: NetworkBuilder,
    nodes: Vec<NodeId>,
    lines: usize,
}

impl Maker {
    fn new(count: usize) -> Self {
        let fluid = Fluid {
            density: 998.2,
            kinematic_viscosity: NU,
            vapour_pressure: None,
        };
        let mut net = NetworkBuilder::new(fluid, G, 101_325.0);
        let mut random = Random(1);
        let mut nodes = vec![net.node("n0", NodeKind::Reservoir, 0.0, 100.0)];
        for i in 1..count {
            let draw = random.unit() / count as f64;
            nodes.push(net.node(
                format!("n{i}"),
                NodeKind::Point { elevation: 0.0 },
                draw,
                0.0,
            ));
        }
        Self {
            random,
            net,
            nodes,
            lines: 0,
        }
    }

    fn line(&mut self, a: usize, b: usize) {
        let length = 50.0 + 450.0 * self.random.unit();
        let bore = 0.1 + 0.5 * self.random.unit();
        let friction = Friction::roughness(length, bore, 1e-4, NU, G);
        let pipe = Part::Pipe(Pipe {
            length,
            bore,
            friction,
        });
        self.net.line(
            format!("l{}", self.lines),
            self.nodes[a],
            self.nodes[b],
            vec![pipe],
        );
        self.lines += 1;
    }
}

/// The lines of a square grid of `side` x `side` nodes.
fn grid_lines(side: usize) -> Vec<(usize, usize)> {
    let mut lines = Vec::new();
    for i in 0..side {
        for j in 0..side {
            let here = i * side + j;
            if j + 1 < side {
                lines.push((here, here + 1));
            }
            if i + 1 < side {
                lines.push((here, here + side));
            }
        }
    }
    lines
}

fn side(count: usize) -> usize {
    (count as f64).sqrt() as usize
}

/// Streets: 1.2 lines a node.
pub fn streets(count: usize) -> Network {
    let side = side(count);
    let mut maker = Maker::new(side * side);
    let mut lines = grid_lines(side);
    for i in (1..lines.len()).rev() {
        let j = (maker.random.unit() * (i + 1) as f64) as usize;
        lines.swap(i, j);
    }
    let mut joined = petgraph::unionfind::UnionFind::<usize>::new(side * side);
    let (tree, others): (Vec<_>, Vec<_>) =
        lines.into_iter().partition(|&(a, b)| joined.union(a, b));
    let further = side * side * 6 / 5 - tree.len();
    let mut chosen: Vec<_> = tree
        .into_iter()
        .chain(others.into_iter().take(further))
        .collect();
    // in the order of their nodes, as a survey lists them
    chosen.sort_unstable();
    for (a, b) in chosen {
        maker.line(a, b);
    }
    maker.net.build().unwrap()
}

/// A square grid of about `count` nodes.
pub fn grid(count: usize) -> Network {
    let side = side(count);
    let mut maker = Maker::new(side * side);
    for (a, b) in grid_lines(side) {
        maker.line(a, b);
    }
    maker.net.build().unwrap()
}

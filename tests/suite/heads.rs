//! Heads are the same wherever the iterations came from, those between shut check valves included.

use dutybank::solve::Solver;

use crate::random::{self, Range};

#[test]
fn a_warm_start_gives_the_heads_of_a_cold_one() {
    let mut compared = 0;
    for seed in 0..random::many(1_000) {
        let network = random::network(seed, 2 + (seed % 59) as usize, Range::Ordinary);
        let mut solver = Solver::new(&network);
        let Ok(cold) = solver.solve(network.settings()).cloned() else {
            continue;
        };
        // somewhere else in between
        let mut other = network.settings().clone();
        for pump in network.pump_ids() {
            other.pump_mut(pump).speed *= 0.97;
        }
        let _ = solver.resolve(&other);
        let warm = solver.resolve(network.settings()).unwrap();
        for id in network.node_ids() {
            if let (Some(a), Some(b)) = (cold.head(id), warm.head(id)) {
                assert!((a - b).abs() < 1e-6, "seed {seed} {id:?}: {a} {b}");
                compared += 1;
            }
        }
    }
    assert!(compared > 1_000);
}

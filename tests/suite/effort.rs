//! What a solve costs, pinned: iterations and factorisations of the demo systems and of some generated networks. A
//! change of the method that costs more shows here; one that costs less is written in here.

use std::path::Path;

use dutybank::read::Document;
use dutybank::solve::{Balance, Solver};

use crate::random::{self, Range};

fn demo(name: &str) -> dutybank::network::Network {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
    let bytes = std::fs::read(folder.join(format!("{name}.yaml"))).unwrap();
    let document = Document::parse(&bytes).unwrap();
    let load = |file: &str| std::fs::read(folder.join(file));
    document.system(&[], &load).unwrap().network
}

fn effort(balance: &Balance) -> (u32, u32, bool) {
    (
        balance.iterations,
        balance.factorisations,
        balance.certain_path,
    )
}

/// Iterations and factorisations.
type Steps = (u32, u32);

/// Steps from a cold start, and warm after nothing has changed.
const DEMOS: [(&str, Steps, Steps); 7] = [
    ("meadow_lift_station", (6, 5), (1, 0)),
    ("mill_pond_transfer", (6, 5), (1, 0)),
    ("orchard_sprinkler_loop", (7, 6), (1, 0)),
    ("plant_cooling_loop", (8, 7), (1, 0)),
    ("pressure_drum_feed", (6, 5), (1, 0)),
    ("starter", (6, 5), (1, 0)),
    ("two_lift_high_reservoir", (5, 4), (1, 0)),
];

#[test]
fn demo_systems_take_as_many_steps_as_ever() {
    let mut wrong = Vec::new();
    for (name, cold, warm) in DEMOS {
        let network = demo(name);
        let mut solver = Solver::new(&network);
        let settings = network.settings();
        let found_cold = effort(solver.solve(settings).unwrap().balance());
        let found_warm = effort(solver.resolve(settings).unwrap().balance());
        let expected = ((cold.0, cold.1, false), (warm.0, warm.1, false));
        if (found_cold, found_warm) != expected {
            wrong.push(format!("{name}: {found_cold:?} {found_warm:?}"));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// Over the first thousand networks of a range: solved, iterations in all, most in one, and how many needed the certain path.
const GENERATED: [(Range, u32, u32, u32, u32); 2] = [
    (Range::Ordinary, 668, 6885, 57, 5),
    (Range::Wild, 642, 10870, 104, 32),
];

#[test]
fn generated_networks_take_as_many_steps_as_ever() {
    let mut wrong = Vec::new();
    for (range, solved, iterations, most, certain) in GENERATED {
        let mut found = (0, 0, 0, 0);
        for seed in 0..1000 {
            let network = random::network(seed, 2 + (seed % 59) as usize, range);
            let mut solver = Solver::new(&network);
            if let Ok(solution) = solver.solve(network.settings()) {
                let balance = solution.balance();
                found.0 += 1;
                found.1 += balance.iterations;
                found.2 = found.2.max(balance.iterations);
                found.3 += u32::from(balance.certain_path);
                assert!(balance.factorisations <= balance.iterations);
            }
        }
        if found != (solved, iterations, most, certain) {
            wrong.push(format!("{range:?}: {found:?}"));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

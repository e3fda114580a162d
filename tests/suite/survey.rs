//! How many random networks are solved, and with what effort.

use crate::random::{self, Range};
use dutybank::solve::{SolveError, Solver};

#[test]
fn survey() {
    let n: u64 = std::env::var("N")
        .ok()
        .and_then(|s| s.parse().ok())
        .unwrap_or(2000);
    for range in [Range::Ordinary, Range::Wild] {
        let (mut solved, mut unreachable, mut certain) = (0, 0, 0);
        let mut iterations = Vec::new();
        let mut failed = Vec::new();
        for seed in std::env::var("SEED").ok().map_or(0..n, |s| {
            let s: u64 = s.parse().unwrap();
            s..s + 1
        }) {
            let lines = 2 + (seed % 59) as usize;
            let network = random::network(seed, lines, range);
            let mut solver = Solver::new(&network);
            match solver.solve(network.settings()) {
                Ok(solution) => {
                    solved += 1;
                    certain += usize::from(solution.balance().certain_path);
                    iterations.push(solution.balance().iterations);
                }
                Err(SolveError::Unreachable(_) | SolveError::Immense { .. }) => unreachable += 1,
                Err(error) => failed.push((seed, lines, error)),
            }
        }
        let mut fast: Vec<u32> = iterations.iter().copied().filter(|i| *i < 40).collect();
        fast.sort();
        println!(
            "fast histogram {:?}",
            (0..40)
                .map(|k| fast.iter().filter(|i| **i == k).count())
                .collect::<Vec<_>>()
        );
        iterations.sort();
        println!(
            "{range:?}: solved {solved} unreachable {unreachable} certain {certain} failed {} median {} p99 {} worst {}",
            failed.len(),
            iterations[iterations.len() / 2],
            iterations[iterations.len() * 99 / 100],
            iterations.last().unwrap()
        );
        for f in failed.iter().take(8) {
            println!("  {f:?}");
        }
    }
}

//! Figures for the side-by-side with NumPy and SciPy: one line of JSON per measure. Run by `scipy_peer/peer.py`.

use std::time::Instant;

use dutybank::network::Network;
use dutybank::solve::Solver;

mod large;
mod station;

/// Median of the times of `rounds` runs, s.
fn median(rounds: usize, mut run: impl FnMut()) -> f64 {
    let mut times: Vec<f64> = (0..rounds)
        .map(|_| {
            let start = Instant::now();
            run();
            start.elapsed().as_secs_f64()
        })
        .collect();
    times.sort_by(f64::total_cmp);
    times[rounds / 2]
}

fn report(what: &str, seconds: f64, network: &Network, solver: &mut Solver) {
    let solution = solver.solve(network.settings()).unwrap();
    let flows: f64 = solution.flows().iter().map(|q| q.abs()).sum();
    println!(
        "{{\"what\": \"{what}\", \"seconds\": {seconds:e}, \"iterations\": {}, \"flows\": {flows:.12e}}}",
        solution.balance().iterations
    );
}

fn main() {
    let nodes: usize = std::env::var("PEER_NODES")
        .ok()
        .and_then(|n| n.parse().ok())
        .unwrap_or(2_500);
    let network = station::station();
    let mut solver = Solver::new(&network);
    // a thousand solves a round: one is too short for the clock
    let cold = median(21, || {
        for _ in 0..1000 {
            solver.solve(network.settings()).unwrap();
        }
    }) / 1000.0;
    report("station", cold, &network, &mut solver);
    for (name, network) in [
        ("streets", large::streets(nodes)),
        ("grid", large::grid(nodes)),
    ] {
        let start = Instant::now();
        let mut solver = Solver::new(&network);
        let laid_out = start.elapsed().as_secs_f64();
        let seconds = laid_out
            + median(3, || {
                solver.solve(network.settings()).unwrap();
            });
        report(name, seconds, &network, &mut solver);
    }
}

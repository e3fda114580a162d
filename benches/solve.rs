//! Solves: a station cold and warm, and large networks. `--large N` sizes of the side-by-side are in `peer.rs`.

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use dutybank::solve::Solver;

mod large;
mod station;

fn station_of_four(c: &mut Criterion) {
    let network = station::station();
    let mut solver = Solver::new(&network);
    let settings = network.settings().clone();
    c.bench_function("station cold", |b| {
        b.iter(|| solver.solve(black_box(&settings)).unwrap().flows()[0])
    });
    let mut other = settings.clone();
    other.set_level(network.find_node("source").unwrap(), 2.9);
    let mut turn = false;
    c.bench_function("station warm", |b| {
        b.iter(|| {
            turn = !turn;
            let settings = if turn { &settings } else { &other };
            solver.resolve(black_box(settings)).unwrap().flows()[0]
        })
    });
}

fn large_networks(c: &mut Criterion) {
    for (name, network) in [
        ("streets", large::streets(10_000)),
        ("grid", large::grid(10_000)),
    ] {
        let mut solver = Solver::new(&network);
        c.bench_function(&format!("{name} of 10,000 nodes"), |b| {
            b.iter(|| solver.solve(network.settings()).unwrap().flows()[0])
        });
    }
}

criterion_group!(small, station_of_four);
criterion_group! {
    name = large_ones;
    config = Criterion::default().sample_size(10);
    targets = large_networks
}
criterion_main!(small, large_ones);

//! Cold and warm solves of a station.

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use dutybank::solve::Solver;

mod station;

fn solve(c: &mut Criterion) {
    let network = station::station();
    let mut solver = Solver::new(&network);
    let settings = network.settings().clone();
    c.bench_function("station cold", |b| {
        b.iter(|| solver.solve(black_box(&settings)).unwrap().flows()[0])
    });
    let other = {
        let mut changed = settings.clone();
        changed.set_level(network.find_node("source").unwrap(), 2.9);
        changed
    };
    let mut turn = false;
    c.bench_function("station warm", |b| {
        b.iter(|| {
            turn = !turn;
            let settings = if turn { &settings } else { &other };
            solver.resolve(black_box(settings)).unwrap().flows()[0]
        })
    });
    println!("{:?}", solver.solve(&settings).unwrap().balance());
}

criterion_group!(benches, solve);
criterion_main!(benches);

//! A day of the meadow station over time: the dry day and the storm.

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use dutybank::read::Document;
use dutybank::shift::run;

fn no_file(_: &str) -> std::io::Result<Vec<u8>> {
    Err(std::io::ErrorKind::NotFound.into())
}

fn day(c: &mut Criterion) {
    let text = include_str!("../networks/meadow_lift_station.yaml");
    let document = Document::parse(text.as_bytes()).unwrap();
    let storm = document
        .cases()
        .unwrap()
        .into_iter()
        .find(|case| case.name == "storm")
        .unwrap();
    for (name, changes) in [("dry day", Vec::new()), ("storm", storm.changes)] {
        let system = document.system(&changes, &no_file).unwrap();
        let read = document.over_time(&system, &changes, &no_file).unwrap();
        let plan = &read.plans[0];
        c.bench_function(&format!("meadow station, {name}"), |b| {
            b.iter(|| {
                run(&system.network, black_box(&read.shift), plan, &mut ())
                    .unwrap()
                    .score
                    .starts
            })
        });
    }
}

criterion_group! {
    name = benches;
    config = Criterion::default().sample_size(20);
    targets = day
}
criterion_main!(benches);

//! Reading a file of 10,000 lines, and `duty` on a shipped network from bytes to assessed combinations.

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use dutybank::read::Document;
use dutybank::study::duty::combinations;

/// A file of 10,000 lines of text: a third of them nodes, the others pipes between them. Invented.
fn text() -> String {
    let nodes = 3333;
    let mut text = String::from("nodes:\n  n0: {reservoir: 100 m}\n");
    for i in 1..nodes {
        text.push_str(&format!(
            "  n{i}: {{point: {{elevation: 2.5 m, draw: 0.2 m3/h}}}}\n"
        ));
    }
    text.push_str("lines:\n");
    for i in 0..10_000 - nodes - 2 {
        let to = 1 + i % (nodes - 1);
        let from = if i < nodes { to / 2 } else { (to * 7) % nodes };
        let from = if from == to { 0 } else { from };
        text.push_str(&format!(
            "  p{i}: {{from: n{from}, to: n{to}, pipe: {{length: 120 m, bore: 150 mm, roughness: 0.1 mm, k: 2}}}}\n"
        ));
    }
    text
}

fn no_file(_: &str) -> std::io::Result<Vec<u8>> {
    Err(std::io::ErrorKind::NotFound.into())
}

fn read(c: &mut Criterion) {
    let text = text();
    assert_eq!(text.lines().count(), 10_000);
    c.bench_function("read 10,000 lines", |b| {
        b.iter(|| {
            let document = Document::parse(black_box(text.as_bytes())).unwrap();
            document.system(&[], &no_file).unwrap()
        })
    });
    let shipped = include_str!("../networks/mill_pond_transfer.yaml");
    c.bench_function("duty on a shipped network, all cases", |b| {
        b.iter(|| {
            let document = Document::parse(black_box(shipped.as_bytes())).unwrap();
            let mut solved = 0;
            for case in document.cases().unwrap() {
                let system = document.system(&case.changes, &no_file).unwrap();
                let network = &system.network;
                let pumps: Vec<_> = network.pump_ids().collect();
                solved += combinations(network, &system.needs, network.settings(), &pumps)
                    .unwrap()
                    .len();
            }
            solved
        })
    });
}

criterion_group! {
    name = benches;
    config = Criterion::default().sample_size(10);
    targets = read
}
criterion_main!(benches);

//! What must hold for any network, on seeded random ones: 1,000 of each range, 12,000 with `DUTYBANK_LONG=1`.

use dutybank::network::{Network, NodeKind, Settings};
use dutybank::part::{HeadLaw, Part};
use dutybank::solve::{LineState, Solution, SolveError, Solver, operation};

use crate::random::{self, Range};

fn seeds() -> std::ops::Range<u64> {
    let long = std::env::var_os("DUTYBANK_LONG").is_some();
    0..if long { 12_000 } else { 1_000 }
}

fn lines(seed: u64) -> usize {
    2 + (seed % 59) as usize
}

/// Networks that have an answer, each with it; those whose draws no water can reach or carry are left out.
fn solved(range: Range, mut check: impl FnMut(u64, &Network, &Solution)) {
    let mut count = 0;
    for seed in seeds() {
        let network = random::network(seed, lines(seed), range);
        let mut solver = Solver::new(&network);
        match solver.solve(network.settings()) {
            Ok(solution) => {
                count += 1;
                check(seed, &network, solution);
            }
            Err(SolveError::Unreachable(_) | SolveError::Immense { .. }) => {}
            Err(error) => panic!("seed {seed} of {range:?}: {error}"),
        }
    }
    assert!(
        count > seeds().end / 2,
        "only {count} networks had an answer"
    );
}

/// Head lost along a line by the public laws of its parts.
fn loss(network: &Network, settings: &Settings, line: usize, q: f64) -> f64 {
    let parts = &network.lines()[line].parts;
    parts
        .iter()
        .map(|part| operation::part_loss(network, settings, part, q))
        .sum()
}

fn balances_close(seed: u64, network: &Network, solution: &Solution) {
    let settings = network.settings();
    let mut net: Vec<f64> = vec![0.0; network.nodes().len()];
    let largest = solution
        .flows()
        .iter()
        .fold(0.0, |m: f64, q| m.max(q.abs()));
    for id in network.line_ids() {
        let line = network.line(id);
        let q = solution.flow(id);
        net[line.from.index()] -= q;
        net[line.to.index()] += q;
        let heads = solution.head(line.from).zip(solution.head(line.to));
        let Some((from, to)) = heads else { continue };
        let size = from.abs().max(to.abs());
        let off = loss(network, settings, id.index(), q) - (from - to);
        match solution.state(id) {
            LineState::Open => {
                assert!(
                    off.abs() < 1e-8 + 1e-12 * size,
                    "seed {seed} line {}: {off}",
                    line.name
                );
            }
            LineState::Checked => {
                assert_eq!(q, 0.0);
                let direction = network.direction(id, settings);
                if direction.forward() && !direction.backward() {
                    // the head is against it: no more is gained than the loss at no flow asks
                    assert!(
                        off > -1e-8 - 1e-12 * size,
                        "seed {seed} line {}: {off}",
                        line.name
                    );
                }
            }
            LineState::Closed | LineState::Stopped => assert_eq!(q, 0.0),
        }
    }
    for id in network.node_ids().filter(|id| network.is_point(*id)) {
        let off = net[id.index()] - settings.draw(id);
        assert!(
            off.abs() <= f64::max(1e-12, 1e-10 * largest),
            "seed {seed} node {id:?}: {off}"
        );
    }
}

#[test]
fn balances_close_in_ordinary_networks() {
    solved(Range::Ordinary, balances_close);
}

#[test]
fn balances_close_in_wild_networks() {
    solved(Range::Wild, balances_close);
}

#[test]
fn nothing_flows_back_through_a_check_valve_or_out_of_an_outlet() {
    solved(Range::Ordinary, |seed, network, solution| {
        for id in network.line_ids() {
            let line = network.line(id);
            let outlet = |node| matches!(network.node(node).kind, NodeKind::Outlet { .. });
            if line.has_check_valve() || outlet(line.to) {
                assert!(
                    solution.flow(id) >= 0.0,
                    "seed {seed}: {} flows back",
                    line.name
                );
            }
            if outlet(line.from) {
                assert!(
                    solution.flow(id) <= 0.0,
                    "seed {seed}: {} leaves an outlet",
                    line.name
                );
            }
        }
    });
}

#[test]
fn a_cold_solve_gives_the_same_bits_and_a_warm_one_the_same_answer() {
    for seed in seeds() {
        let network = random::network(seed, lines(seed), Range::Ordinary);
        let mut solver = Solver::new(&network);
        let Ok(first) = solver.solve(network.settings()).cloned() else {
            continue;
        };
        // somewhere else in between
        let mut other = network.settings().clone();
        for pump in network.pump_ids() {
            other.pump_mut(pump).speed *= 0.97;
        }
        let _ = solver.resolve(&other);
        let warm = solver.resolve(network.settings()).unwrap().clone();
        let again = solver.solve(network.settings()).unwrap();
        assert_eq!(first.flows(), again.flows(), "seed {seed}");
        // Heads are determined wherever a flow is; a line that loses next to nothing determines its flow only so far.
        for id in network.line_ids() {
            let (a, b) = (first.flow(id), warm.flow(id));
            let lost = (loss(&network, network.settings(), id.index(), a)
                - loss(&network, network.settings(), id.index(), b))
            .abs();
            assert!(
                (a - b).abs() < 1e-7 || lost < 1e-8,
                "seed {seed} {id:?}: {a} {b}"
            );
        }
        for id in network.node_ids() {
            if let (Some(a), Some(b)) = (first.head(id), warm.head(id)) {
                assert!((a - b).abs() < 1e-6, "seed {seed} {id:?}: {a} {b}");
            }
        }
    }
}

#[test]
fn more_draw_never_raises_the_head_where_it_is_drawn() {
    for seed in seeds().step_by(4) {
        let network = random::network(seed, lines(seed), Range::Ordinary);
        let mut solver = Solver::new(&network);
        let mut settings = network.settings().clone();
        let Some(node) = network.node_ids().find(|id| network.is_point(*id)) else {
            continue;
        };
        let Ok(Some(before)) = solver.solve(&settings).map(|solution| solution.head(node)) else {
            continue;
        };
        settings.set_draw(node, settings.draw(node) + 1e-3);
        let Ok(Some(after)) = solver.solve(&settings).map(|solution| solution.head(node)) else {
            continue;
        };
        assert!(
            after <= before + 1e-8,
            "seed {seed}: {before} rose to {after}"
        );
    }
}

/// The laws of a line do not depend on the order of its parts, nor do the flows.
#[test]
fn laws_of_lines_rise() {
    solved(Range::Ordinary, |seed, network, _| {
        for (i, line) in network.lines().iter().enumerate() {
            let scale = line.narrowest_bore().unwrap_or(0.1).powi(2);
            let mut last = f64::NEG_INFINITY;
            for step in -20..=20 {
                let head = loss(
                    network,
                    network.settings(),
                    i,
                    scale * f64::from(step) * 0.3,
                );
                assert!(
                    head >= last - 1e-9 * head.abs(),
                    "seed {seed} {}: falls",
                    line.name
                );
                last = head;
            }
        }
    });
}

/// Networks that some stage of the solver once failed on; kept.
#[test]
fn once_hard_networks_are_solved() {
    let ordinary = [10_096, 11_678, 34_406];
    let wild = [
        48, 73, 322, 393, 680, 1170, 1279, 1412, 1426, 1515, 1643, 2379, 9548, 13_965, 18_459,
    ];
    let list = ordinary.iter().map(|seed| (*seed, Range::Ordinary));
    for (seed, range) in list.chain(wild.iter().map(|seed| (*seed, Range::Wild))) {
        let network = random::network(seed, lines(seed), range);
        match Solver::new(&network).solve(network.settings()) {
            Ok(_) | Err(SolveError::Unreachable(_) | SolveError::Immense { .. }) => {}
            Err(error) => panic!("seed {seed} of {range:?}: {error}"),
        }
    }
}

/// Part laws: slope is the numeric derivative and the loss never falls.
#[test]
fn part_laws_rise_and_their_slopes_are_derivatives() {
    solved(Range::Ordinary, |seed, network, _| {
        for part in network.lines().iter().flat_map(|line| &line.parts) {
            let law: &dyn HeadLaw = match part {
                Part::Pipe(pipe) => &pipe.friction,
                Part::Loss(loss) | Part::CheckValve(loss) => loss,
                Part::Valve(_) | Part::Pump(_) => continue,
            };
            for q in [-0.2, -1e-3, 1e-6, 3e-4, 2e-2, 0.4] {
                let d = 1e-6 * f64::abs(q);
                let numeric = (law.loss(q + d).head - law.loss(q - d).head) / (2.0 * d);
                let slope = law.loss(q).slope;
                assert!(
                    slope >= 0.0 && (numeric - slope).abs() <= 1e-5 * slope.max(1e-9),
                    "seed {seed} {part:?} at {q}"
                );
            }
        }
    });
}

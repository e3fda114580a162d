//! What holds for every network: random ones, solved, changed in a way whose effect is known, and solved again.
//!
//! Two answers of one network are compared line by line in the measure in which an answer is determined at all. Of
//! two states that both balance but for small errors, the sum over the lines of (difference of flow) x (difference of loss)
//! is as small as those errors: both factors have the same sign, as every law rises. So in each line the flows agree or the
//! losses do; a law nearly flat determines the head and not the flow, a steep one the flow and not the head.
//!
//! `DUTYBANK_LONG=1` looks at ten times as many networks.

use dutybank::network::{LineId, Network, NodeId, NodeKind, Settings};
use dutybank::part::friction::{Friction, Pipe};
use dutybank::solve::{LineState, Solution, SolveError, Solver};

use crate::description::{Description, Line, Node, Piece, line_loss};
use crate::random::{self, GRAVITY, Random, Range};

const RANGES: [Range; 2] = [Range::Ordinary, Range::Wild];

fn seeds(usual: u64) -> std::ops::Range<u64> {
    0..random::many(usual)
}

fn random_network(seed: u64, range: Range) -> Network {
    random::network(seed, 2 + (seed % 59) as usize, range)
}

/// The answer; none where there is none for a reason that the solver names.
fn answer(network: &Network, what: &str) -> Option<Solution> {
    match Solver::new(network).solve(network.settings()) {
        Ok(solution) => Some(solution.clone()),
        Err(SolveError::Unreachable(_) | SolveError::Immense { .. }) => None,
        Err(error) => panic!("{what}: {error}"),
    }
}

fn largest_flow(solution: &Solution) -> f64 {
    solution.flows().iter().fold(0.0, |m, q| m.max(q.abs()))
}

/// 1 if water may only go forward, -1 if only backward, 0 if both ways.
fn sense(network: &Network, line: LineId) -> f64 {
    let ends = network.line(line);
    let outlet = |node: NodeId| matches!(network.node(node).kind, NodeKind::Outlet { .. });
    match (ends.has_check_valve() || outlet(ends.to), outlet(ends.from)) {
        (true, false) => 1.0,
        (false, true) => -1.0,
        _ => 0.0,
    }
}

/// Balances recomputed here, from heads and flows alone, against what the certificate promises.
fn assert_balanced(network: &Network, settings: &Settings, solution: &Solution, what: &str) {
    let mut imbalance = vec![0.0; network.nodes().len()];
    for id in network.line_ids() {
        let (line, q) = (network.line(id), solution.flow(id));
        imbalance[line.from.index()] -= q;
        imbalance[line.to.index()] += q;
        let heads = solution.head(line.from).zip(solution.head(line.to));
        match solution.state(id) {
            LineState::Closed | LineState::Stopped => assert_eq!(q, 0.0, "{what}: {}", line.name),
            LineState::Checked => {
                assert_eq!(q, 0.0, "{what}: {}", line.name);
                let ends = network.direction(id, settings);
                if let (Some((above, below)), true) = (heads, sense(network, id) != 0.0) {
                    let size = above.abs().max(below.abs());
                    let push = sense(network, id)
                        * (above - below - line_loss(network, settings, id, 0.0).0);
                    assert!(
                        push <= 1e-8 + 1e-12 * size,
                        "{what}: {} {ends:?} pushed open by {push:e} m",
                        line.name
                    );
                }
            }
            LineState::Open => {
                assert!(
                    sense(network, id) * q >= 0.0,
                    "{what}: {} flows backwards",
                    line.name
                );
                let Some((above, below)) = heads else {
                    continue;
                };
                let (loss, slope) = line_loss(network, settings, id, q);
                let size = loss.abs().max(above.abs()).max(below.abs());
                let off = (loss - (above - below)).abs();
                let rounding = 4.0 * f64::EPSILON * (slope * q).abs();
                assert!(
                    off <= 1e-8 + 1e-12 * size + rounding,
                    "{what}: {} is off by {off:e} m",
                    line.name
                );
            }
        }
    }
    let limit = f64::max(1e-12, 1e-10 * largest_flow(solution));
    for id in network.node_ids().filter(|id| network.is_point(*id)) {
        let off = (imbalance[id.index()] - settings.draw(id)).abs();
        assert!(
            off <= limit,
            "{what}: {} is off by {off:e} m3/s",
            network.node(id).name
        );
    }
}

/// The flows of `a` beside those that `b` gives for the same lines.
fn assert_same(
    network: &Network,
    settings: &Settings,
    a: &Solution,
    b: impl Fn(LineId) -> f64,
    tolerance: f64,
    what: &str,
) {
    let scale = largest_flow(a).max(1e-6);
    for id in network.line_ids() {
        let (p, q) = (a.flow(id), b(id));
        let apart = (p - q).abs();
        if apart <= tolerance * scale {
            continue;
        }
        let loss = |q| line_loss(network, settings, id, q).0;
        let heads = (loss(p) - loss(q)).abs();
        let size = 1.0 + loss(p).abs();
        assert!(
            heads <= tolerance * size,
            "{what}: line {} has flows {p:e} and {q:e}, losses {heads:e} m apart",
            network.line(id).name
        );
    }
}

/// Nodes whose head is determined: joined to a held head by lines that carry water, or could carry it either way.
fn determined(network: &Network, solution: &Solution) -> Vec<bool> {
    let mut reached: Vec<bool> = network.node_ids().map(|id| !network.is_point(id)).collect();
    loop {
        let mut moved = false;
        for id in network.line_ids() {
            let line = network.line(id);
            let joins = solution.state(id) == LineState::Open
                && (solution.flow(id) != 0.0 || sense(network, id) == 0.0);
            let (a, b) = (line.from.index(), line.to.index());
            if joins && reached[a] != reached[b] {
                (reached[a], reached[b]) = (true, true);
                moved = true;
            }
        }
        if !moved {
            return reached;
        }
    }
}

#[test]
fn every_network_is_solved_or_the_reason_is_named() {
    for range in RANGES {
        let (mut solved, mut all) = (0, 0);
        for seed in seeds(1000) {
            let what = format!("{range:?} {seed}");
            let network = random_network(seed, range);
            all += 1;
            if let Some(solution) = answer(&network, &what) {
                solved += 1;
                assert_balanced(&network, network.settings(), &solution, &what);
            }
        }
        assert!(2 * solved > all, "{range:?}: only {solved} of {all} solved");
    }
}

/// Once each of these failed its certificate. Most hold an island behind shut one-way lines whose flow is so small that the
/// head for it is lost in rounding, or a set of nodes that hangs on the rest by a very small conductance; in one the set
/// of open lines went round in a circle.
#[test]
fn seeds_that_were_hard_once() {
    const WILD: [u64; 20] = [
        6474, 21330, 25633, 26657, 32114, 33510, 43069, 48902, 50551, 51208, 55964, 62573, 67848,
        74158, 76095, 87567, 88006, 88498, 91553, 95929,
    ];
    const ORDINARY: [u64; 2] = [10096, 34406];
    let wild = WILD.map(|seed| (seed, Range::Wild));
    let ordinary = ORDINARY.map(|seed| (seed, Range::Ordinary));
    for (seed, range) in wild.into_iter().chain(ordinary) {
        let what = format!("{range:?} {seed}");
        let network = random_network(seed, range);
        let solution = answer(&network, &what).unwrap_or_else(|| panic!("{what}: no answer"));
        assert_balanced(&network, network.settings(), &solution, &what);
    }
}

#[test]
fn the_same_bits_every_time() {
    for seed in seeds(100) {
        let network = random_network(seed, Range::Wild);
        let what = format!("{seed}");
        let (Some(first), Some(second)) = (answer(&network, &what), answer(&network, &what)) else {
            continue;
        };
        let bits = |s: &Solution| s.flows().iter().map(|q| q.to_bits()).collect::<Vec<_>>();
        let heads = |s: &Solution| {
            let heads = network.node_ids().map(|id| s.head(id).map(f64::to_bits));
            heads.collect::<Vec<_>>()
        };
        assert_eq!(bits(&first), bits(&second), "{what}");
        assert_eq!(heads(&first), heads(&second), "{what}");
        // whatever one solver solved before
        let mut solver = Solver::new(&network);
        let mut changed = network.settings().clone();
        for id in network.node_ids() {
            changed.set_draw(id, 0.5 * network.settings().draw(id));
            changed.set_level(id, 1.1 * network.settings().level(id));
        }
        let _ = solver.solve(&changed);
        let third = solver.solve(network.settings()).unwrap();
        assert_eq!(bits(&first), bits(third), "{what}");
    }
}

#[test]
fn a_warm_start_leads_to_the_same_answer() {
    for range in RANGES {
        for seed in seeds(300) {
            let what = format!("{range:?} {seed}");
            let network = random_network(seed, range);
            let mut solver = Solver::new(&network);
            let mut random = Random(seed);
            let mut settings = network.settings().clone();
            for step in 0..4 {
                change(&network, &mut settings, &mut random);
                let warm = solver.resolve(&settings).cloned();
                let cold = Solver::new(&network).solve(&settings).cloned();
                match (warm, cold) {
                    (Ok(warm), Ok(cold)) => {
                        assert_balanced(&network, &settings, &warm, &what);
                        let step = format!("{what}, change {step}");
                        let like = |id| warm.flow(id);
                        assert_same(&network, &settings, &cold, like, 1e-7, &step);
                    }
                    (
                        Err(SolveError::Unreachable(_) | SolveError::Immense { .. }),
                        Err(SolveError::Unreachable(_) | SolveError::Immense { .. }),
                    ) => {}
                    (warm, cold) => panic!(
                        "{what}, change {step}: warm {:?}, cold {:?}",
                        warm.err(),
                        cold.err()
                    ),
                }
            }
        }
    }
}

/// What an operator or a tank may change between two looks.
fn change(network: &Network, settings: &mut Settings, random: &mut Random) {
    for id in network.pump_ids() {
        if random.chance(0.3) {
            settings.pump_mut(id).running = random.chance(0.7);
        }
        if random.chance(0.3) {
            settings.pump_mut(id).speed = random.between(0.5, 1.1);
        }
    }
    for id in network.valve_ids() {
        if random.chance(0.3) {
            settings.valve_mut(id).opening = random.between(0.05, 1.0);
        }
    }
    for id in network.node_ids() {
        if random.chance(0.3) {
            settings.set_draw(id, random.between(0.3, 1.5) * network.settings().draw(id));
            settings.set_level(id, random.between(0.8, 1.2) * network.settings().level(id));
        }
    }
}

#[test]
fn names_and_numbers_change_nothing() {
    for range in RANGES {
        for seed in seeds(300) {
            let what = format!("{range:?} {seed}");
            let network = random_network(seed, range);
            let Some(before) = answer(&network, &what) else {
                continue;
            };
            let mut random = Random(seed ^ 0x5eed);
            let description = Description::of(&network);
            let nodes = shuffled(description.nodes.len(), &mut random);
            let lines = shuffled(description.lines.len(), &mut random);
            let mut other = description.clone();
            for (old, &new) in nodes.iter().enumerate() {
                other.nodes[new] = description.nodes[old].clone();
                other.nodes[new].name = format!("place {new}");
            }
            for (old, &new) in lines.iter().enumerate() {
                let line = &description.lines[old];
                other.lines[new] = Line {
                    name: format!("way {new}"),
                    from: nodes[line.from],
                    to: nodes[line.to],
                    parts: line.parts.clone(),
                };
            }
            let other = other.build();
            let after = answer(&other, &what).unwrap();
            let like = |id: LineId| after.flows()[lines[id.index()]];
            assert_same(&network, network.settings(), &before, like, 1e-9, &what);
        }
    }
}

/// Where each of `n` goes.
fn shuffled(n: usize, random: &mut Random) -> Vec<usize> {
    let mut order: Vec<usize> = (0..n).collect();
    for i in (1..n).rev() {
        order.swap(i, random.below(i + 1));
    }
    order
}

#[test]
fn a_line_turned_round_flows_the_other_way() {
    for range in RANGES {
        for seed in seeds(300) {
            let what = format!("{range:?} {seed}");
            let network = random_network(seed, range);
            let Some(before) = answer(&network, &what) else {
                continue;
            };
            let mut description = Description::of(&network);
            let turned: Vec<bool> = description
                .lines
                .iter_mut()
                .map(|line| {
                    let turns = line.parts.iter().all(Piece::is_symmetric);
                    if turns {
                        std::mem::swap(&mut line.from, &mut line.to);
                        line.parts.reverse();
                    }
                    turns
                })
                .collect();
            let after = answer(&description.build(), &what).unwrap();
            let like = |id: LineId| {
                let q = after.flow(id);
                if turned[id.index()] { -q } else { q }
            };
            assert_same(&network, network.settings(), &before, like, 1e-9, &what);
        }
    }
}

#[test]
fn the_order_of_parts_does_not_change_the_flow() {
    for range in RANGES {
        for seed in seeds(300) {
            let what = format!("{range:?} {seed}");
            let network = random_network(seed, range);
            let Some(before) = answer(&network, &what) else {
                continue;
            };
            let mut description = Description::of(&network);
            for line in &mut description.lines {
                line.parts.reverse();
            }
            let after = answer(&description.build(), &what).unwrap();
            assert_same(
                &network,
                network.settings(),
                &before,
                |id| after.flow(id),
                1e-9,
                &what,
            );
        }
    }
}

#[test]
fn a_pipe_cut_in_two_carries_the_same() {
    for range in RANGES {
        for seed in seeds(300) {
            let what = format!("{range:?} {seed}");
            let mut random = Random(seed ^ 0xc07);
            let mut whole = Description::of(&random_network(seed, range));
            let cut = random.below(whole.lines.len());
            let (length, bore) = (random.decades(1.0, 3000.0), random.between(0.05, 0.5));
            let roughness = bore * random.decades(1e-6, 0.03);
            let viscosity = whole.fluid.kinematic_viscosity;
            let pipe = |length| {
                Piece::Pipe(Pipe {
                    length,
                    bore,
                    friction: Friction::roughness(length, bore, roughness, viscosity, GRAVITY),
                })
            };
            let mut halves = whole.clone();
            whole.lines[cut].parts.insert(0, pipe(length));
            halves.nodes.push(Node {
                name: "cut".into(),
                kind: NodeKind::Point { elevation: 0.0 },
                draw: 0.0,
                level: 0.0,
            });
            let middle = halves.nodes.len() - 1;
            let share = random.between(0.1, 0.9);
            let first = Line {
                name: "first part".into(),
                from: halves.lines[cut].from,
                to: middle,
                parts: vec![pipe(share * length)],
            };
            halves.lines[cut].from = middle;
            halves.lines[cut]
                .parts
                .insert(0, pipe((1.0 - share) * length));
            halves.lines.push(first);
            let network = whole.build();
            let Some(before) = answer(&network, &what) else {
                continue;
            };
            let after = answer(&halves.build(), &what).unwrap();
            assert_same(
                &network,
                network.settings(),
                &before,
                |id| after.flow(id),
                1e-9,
                &what,
            );
        }
    }
}

#[test]
fn more_draw_never_raises_the_head_there() {
    for range in RANGES {
        for seed in seeds(300) {
            let what = format!("{range:?} {seed}");
            let network = random_network(seed, range);
            let Some(before) = answer(&network, &what) else {
                continue;
            };
            let sure = determined(&network, &before);
            let points: Vec<NodeId> = network
                .node_ids()
                .filter(|id| network.is_point(*id) && sure[id.index()])
                .collect();
            if points.is_empty() {
                continue;
            }
            let mut random = Random(seed ^ 0xd4a);
            let node = points[random.below(points.len())];
            let mut settings = network.settings().clone();
            settings.set_draw(node, settings.draw(node) + random.decades(1e-6, 1e-2));
            let mut solver = Solver::new(&network);
            let after = match solver.solve(&settings) {
                Ok(after) => after,
                Err(SolveError::Unreachable(_) | SolveError::Immense { .. }) => continue,
                Err(error) => panic!("{what}: {error}"),
            };
            if let (Some(old), Some(new)) = (before.head(node), after.head(node)) {
                assert!(
                    new <= old + 1e-8 + 1e-12 * old.abs(),
                    "{what}: {} rose from {old} to {new}",
                    network.node(node).name
                );
            }
        }
    }
}

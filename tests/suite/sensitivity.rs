//! Gradients by the adjoint against central differences, on the demo networks and on random ones.

use dutybank::network::{Figure, Network, Settings, Varied};
use dutybank::solve::Solver;
use dutybank::solve::sensitivity::{Difference, NotSmooth, Weights};

use crate::random::{Random, Range, many, network};

/// Figures whose change is compared, and half the step over their size.
const STEP: f64 = 1e-5;

struct Tried {
    compared: usize,
    not_smooth: usize,
}

fn stepped(network: &Network, figure: Figure, value: f64, step: f64) -> (Varied, Settings) {
    let (mut varied, mut settings) = (network.varied(), network.settings().clone());
    varied.set(&mut settings, figure, value + step);
    (varied, settings)
}

/// Compares the gradient of random sums of flows and heads, by every figure that can change, with solutions on both sides.
fn compare(network: &Network, seed: u64, tried: &mut Tried) {
    let settings = network.settings();
    let mut solver = Solver::new(network);
    let Ok(solution) = solver.start_at(&network.varied(), settings).cloned() else {
        return;
    };
    let mut random = Random(seed);
    let mut weights = Weights::none(network);
    for weight in &mut weights.flows {
        *weight = random.between(-1.0, 1.0);
    }
    for node in network.node_ids() {
        if solution.head(node).is_some() {
            weights.heads[node.index()] = 0.01 * random.between(-1.0, 1.0);
        }
    }
    let mut solved = solver.sensitivities();
    let gradient = match &mut solved {
        Ok(sensitivities) => sensitivities.of(&weights),
        Err(why) => Err(*why),
    };
    let gradient = match gradient {
        Ok(gradient) => gradient,
        Err(NotSmooth::Unsolved | NotSmooth::Singular) => panic!("a solved network has gradients"),
        Err(_) => {
            tried.not_smooth += 1;
            return;
        }
    };
    let states = |solution: &dutybank::solve::Solution| -> Vec<_> {
        network
            .line_ids()
            .map(|line| solution.state(line))
            .collect()
    };
    let here = states(&solution);
    for (figure, value) in network.figures(settings) {
        let step = STEP * value.abs().max(1e-3);
        let below = stepped(network, figure, value, -step);
        let above = stepped(network, figure, value, step);
        let difference = Difference::between(&solution, (&below.0, &below.1), (&above.0, &above.1));
        let by_adjoint = gradient.along(&difference);
        let mut sum = |(network, settings): &(Varied, Settings)| -> Option<(f64, f64)> {
            let solution = solver.solve_near(network, settings).ok()?;
            if states(solution) != here {
                return None;
            }
            let flows = network
                .line_ids()
                .map(|l| weights.flows[l.index()] * solution.flow(l));
            let heads = network
                .node_ids()
                .filter_map(|n| Some(weights.heads[n.index()] * solution.head(n)?));
            let terms: Vec<f64> = flows.chain(heads).collect();
            Some((terms.iter().sum(), terms.iter().map(|t| t.abs()).sum()))
        };
        let (Some((below, size)), Some((above, _))) = (sum(&below), sum(&above)) else {
            continue;
        };
        let by_solving = above - below;
        // Heads balance to 1e-10 m or better, and the third derivative counts for the square of the step.
        let allowed = 2e-4 * by_solving.abs().max(by_adjoint.abs()) + 3e-10 * (1.0 + size);
        assert!(
            (by_adjoint - by_solving).abs() <= allowed,
            "seed {seed}, {figure:?}: {by_adjoint} by the adjoint, {by_solving} by solving"
        );
        tried.compared += usize::from(by_solving.abs() > 100.0 * allowed);
    }
}

#[test]
fn equals_central_differences_on_the_demo_networks() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
    let mut tried = Tried {
        compared: 0,
        not_smooth: 0,
    };
    let mut files = 0;
    for entry in std::fs::read_dir(folder).unwrap() {
        let text = std::fs::read_to_string(entry.unwrap().path()).unwrap();
        if let Ok(system) = dutybank::read::system(&text) {
            files += 1;
            for seed in 0..3 {
                compare(&system.network, seed, &mut tried);
            }
        }
    }
    assert!(
        files >= 6 && tried.compared > 200,
        "{files} files, {} compared",
        tried.compared
    );
}

#[test]
fn equals_central_differences_on_random_networks() {
    let mut tried = Tried {
        compared: 0,
        not_smooth: 0,
    };
    let wanted = many(60);
    for seed in 0..wanted {
        compare(&network(seed, 12, Range::Ordinary), seed, &mut tried);
    }
    assert!(
        tried.compared > 5 * wanted as usize,
        "{} compared, {} not smooth",
        tried.compared,
        tried.not_smooth
    );
}

/// A pond no higher than the sill it spills over: its line is open by a hair, or shut by one.
#[test]
fn a_line_about_to_open_has_no_gradient() {
    let text = "
nodes: {pond: {reservoir: 5 m}, sill: {outlet: 5 m}}
lines: {spill: {from: pond, to: sill, pipe: {length: 10 m, bore: 200 mm, roughness: 0.1 mm}}}
";
    let system = dutybank::read::system(text).unwrap();
    let mut solver = Solver::new(&system.network);
    assert_eq!(solver.sensitivities().err(), Some(NotSmooth::Unsolved));
    solver.solve(system.network.settings()).unwrap();
    let spill = system.network.find_line("spill").unwrap();
    assert_eq!(solver.sensitivities().err(), Some(NotSmooth::Verge(spill)));
}

/// A plain solve after varied ones knows nothing of their figures.
#[test]
fn a_plain_solve_forgets_varied_figures() {
    let text = include_str!("../../networks/starter.yaml");
    let system = dutybank::read::system(text).unwrap();
    let network = &system.network;
    let before = Solver::new(network)
        .solve(network.settings())
        .unwrap()
        .clone();
    let mut solver = Solver::new(network);
    let (mut varied, mut settings) = (network.varied(), network.settings().clone());
    for (figure, value) in network.figures(&settings) {
        varied.set(&mut settings, figure, 0.97 * value);
    }
    let other = solver.start_at(&varied, &settings).unwrap().clone();
    assert_ne!(other.flows(), before.flows());
    assert_eq!(
        solver.solve(network.settings()).unwrap().flows(),
        before.flows()
    );
    // and the start is still where it was
    assert_eq!(
        solver.solve_near(&varied, &settings).unwrap().flows().len(),
        other.flows().len()
    );
}

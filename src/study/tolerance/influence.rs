//! Which input matters most for a figure: by its gradient in the middle, and by the cases drawn.

use super::draw::Draw;
use super::measure::{Measure, Point};
use super::response::Responses;
use crate::network::{Need, Settings, Varied};
use crate::solve::sensitivity::{Difference, Gradient, NotSmooth};
use crate::solve::{Solution, SolveError, Solver};

/// What the inputs make of one figure.
#[derive(Clone, Debug)]
pub struct Influence {
    /// The figure.
    pub measure: Measure,
    /// Per input.
    pub shares: Vec<Share>,
    /// How the linear shares were found.
    pub way: Way,
}

/// What one input makes of a figure.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Share {
    /// Change of the figure with one standard deviation of the input, SI: sensitivity times spread.
    pub change: f64,
    /// Its square over the sum of all: the share of the variance if all were straight.
    pub linear: f64,
    /// Share of the variance over the cases drawn that goes with this input alone.
    pub sampled: f64,
}

/// How the change with an input was found.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Way {
    /// From the gradient, by the adjoint.
    Gradient,
    /// There is no gradient, for this reason: from the states one standard deviation either side.
    BothSides(NotSmooth),
}

/// Shares further apart than this are said to disagree. Invented.
const APART: f64 = 0.1;

impl Influence {
    /// Whether the linear shares and those of the cases tell different stories.
    pub fn disagrees(&self) -> bool {
        self.shares
            .iter()
            .any(|share| (share.linear - share.sampled).abs() > APART)
    }

    /// Inputs by their share over the cases, the largest first.
    pub fn ranked(&self) -> Vec<usize> {
        let mut order: Vec<usize> = (0..self.shares.len()).collect();
        order.sort_by(|a, b| self.shares[*b].sampled.total_cmp(&self.shares[*a].sampled));
        order
    }
}

/// Half the step of a place in a derivative.
const STEP: f64 = 1e-4;

/// Changes of each figure with one standard deviation of each input, about the middle.
pub(super) fn changes(
    responses: &Responses,
    needs: &[Need],
    measures: &[Measure],
    deviations: &[f64],
) -> Result<Vec<(Vec<f64>, Way)>, SolveError> {
    let middle = &responses.middle;
    let mut solver = Solver::new(middle);
    let (mut network, mut settings) = (middle.varied(), middle.settings().clone());
    let solution = solver.start_at(&network, &settings)?.clone();
    let gradients = gradients(&mut solver, &solution, needs, measures);
    let mut both_sides: Option<Vec<Vec<f64>>> = None;
    let mut found = Vec::new();
    let steps: Vec<[(Varied, Settings); 2]> = (0..deviations.len())
        .map(|input| {
            [-STEP, STEP].map(|step| {
                place(responses, input, step, &mut network, &mut settings);
                (network.clone(), settings.clone())
            })
        })
        .collect();
    for (measure, gradient) in measures.iter().zip(gradients) {
        match gradient {
            Ok(gradient) => {
                let change = |(step, deviation): (&[(Varied, Settings); 2], &f64)| {
                    let [below, above] = step;
                    let difference =
                        Difference::between(&solution, (&below.0, &below.1), (&above.0, &above.1));
                    let value = |(network, settings): &(Varied, Settings)| {
                        let point = Point {
                            network,
                            settings,
                            solution: &solution,
                        };
                        point.value(needs, *measure).unwrap_or(0.0)
                    };
                    let itself = value(above) - value(below);
                    (itself + gradient.along(&difference)) / (2.0 * STEP) * deviation
                };
                let changes = steps.iter().zip(deviations).map(change).collect();
                found.push((changes, Way::Gradient));
            }
            Err(reason) => {
                if both_sides.is_none() {
                    both_sides = Some(secants(&mut solver, responses, needs, measures, deviations));
                }
                let m = found.len();
                let changes = both_sides.iter().flatten().map(|of| of[m]).collect();
                found.push((changes, Way::BothSides(reason)));
            }
        }
    }
    Ok(found)
}

/// The gradient of each figure at the solver's last answer.
fn gradients(
    solver: &mut Solver,
    solution: &Solution,
    needs: &[Need],
    measures: &[Measure],
) -> Vec<Result<Gradient, NotSmooth>> {
    let network = solver.network();
    let point = Point {
        network,
        settings: network.settings(),
        solution,
    };
    match solver.sensitivities() {
        Ok(mut sensitivities) => measures
            .iter()
            .map(|measure| sensitivities.of(&point.weights(needs, *measure)))
            .collect(),
        Err(reason) => measures.iter().map(|_| Err(reason)).collect(),
    }
}

/// Puts one input off the middle, all others in it.
fn place(
    responses: &Responses,
    input: usize,
    off: f64,
    network: &mut Varied,
    settings: &mut Settings,
) {
    let inputs = responses.inputs().iter().enumerate();
    let draws: Vec<Draw> = inputs
        .map(|(i, at)| Draw::at(&at.spread, if i == input { 0.5 + off } else { 0.5 }))
        .collect();
    responses.write(&draws, network, settings);
}

/// Per input and figure, half the difference of the states one standard deviation either side; zero where one of them has no
/// balance.
fn secants(
    solver: &mut Solver,
    responses: &Responses,
    needs: &[Need],
    measures: &[Measure],
    deviations: &[f64],
) -> Vec<Vec<f64>> {
    let (mut network, mut settings) = (
        responses.middle.varied(),
        responses.middle.settings().clone(),
    );
    let mut all = Vec::new();
    for (input, deviation) in deviations.iter().enumerate() {
        let mut values = |off: f64| -> Option<Vec<f64>> {
            place(responses, input, off, &mut network, &mut settings);
            let solution = solver.solve_near(&network, &settings).ok()?;
            let point = Point {
                network: &network,
                settings: &settings,
                solution,
            };
            measures.iter().map(|m| point.value(needs, *m)).collect()
        };
        let halves = values(-deviation)
            .zip(values(*deviation))
            .map(|(below, above)| {
                let pairs = below.iter().zip(&above);
                pairs.map(|(below, above)| 0.5 * (above - below)).collect()
            });
        all.push(halves.unwrap_or_else(|| vec![0.0; measures.len()]));
    }
    all
}

//! Least squares within bounds, by Levenberg and Marquardt's damping with steps cut off at the bounds.
//!
//! Minimises sum of r_i(x)^2 over low <= x <= high. Each step solves
//!
//! ```text
//! (J'J + lambda diag(J'J)) s = -J'r        over the free variables
//! ```
//!
//! where a variable is free unless it stands at a bound and the gradient J'r pushes it out. A step that lowers the sum is taken and lambda
//! falls; else lambda grows. Variables are scaled by the width of their bounds.
//!
//! # Source
//! K. Levenberg, Quarterly of Applied Mathematics 2, 1944; D. W. Marquardt, SIAM J. Applied Mathematics 11, 1963; damping by the diagonal:
//! J. J. Moré, "The Levenberg-Marquardt algorithm", Lecture Notes in Mathematics 630, 1978. Free variables: D. P. Bertsekas,
//! "Projected Newton methods", SIAM J. Control and Optimization 20, 1982.

use nalgebra::{DMatrix, DVector};

/// Residuals and their derivatives.
pub struct Evaluation {
    /// r.
    pub residuals: DVector<f64>,
    /// dr/dx, a row for each residual.
    pub jacobian: DMatrix<f64>,
}

/// Where the search ended.
pub struct Found {
    /// x.
    pub x: Vec<f64>,
    /// The evaluation there.
    pub at: Evaluation,
    /// Evaluations that it took.
    pub evaluations: usize,
    /// Whether it settled: no step lowers the sum by more than rounding.
    pub settled: bool,
}

/// Most evaluations; a fit of a few unknowns takes some ten.
const MOST_EVALUATIONS: usize = 200;
/// A relative fall of the sum of squares that counts as none.
const SETTLED: f64 = 1e-14;

/// Searches from `start`; `evaluate` gives none where the model has no answer, which counts as worse than anything.
///
/// # Errors
/// None: the model has no answer at the start.
pub fn minimise(
    start: &[f64],
    bounds: &[(f64, f64)],
    mut evaluate: impl FnMut(&[f64]) -> Option<Evaluation>,
) -> Option<Found> {
    let clamp = |x: f64, i: usize| x.clamp(bounds[i].0, bounds[i].1);
    let mut x: Vec<f64> = (0..start.len()).map(|i| clamp(start[i], i)).collect();
    let mut at = evaluate(&x)?;
    let (mut lambda, mut evaluations) = (1e-3, 1);
    let mut settled = false;
    while evaluations < MOST_EVALUATIONS && !settled {
        let sum = at.residuals.norm_squared();
        let step = step(&x, bounds, &at, lambda);
        let next: Vec<f64> = (0..x.len()).map(|i| clamp(x[i] + step[i], i)).collect();
        if next == x || sum == 0.0 {
            settled = true;
            break;
        }
        let tried = evaluate(&next);
        evaluations += 1;
        match tried {
            Some(tried) if tried.residuals.norm_squared() < sum => {
                let fall = sum - tried.residuals.norm_squared();
                settled = fall < SETTLED * sum;
                (x, at) = (next, tried);
                lambda = (0.1 * lambda).max(1e-12);
            }
            _ => {
                lambda *= 10.0;
                // Steps this short change nothing but rounding.
                settled = lambda > 1e12;
            }
        }
    }
    Some(Found {
        x,
        at,
        evaluations,
        settled,
    })
}

fn step(x: &[f64], bounds: &[(f64, f64)], at: &Evaluation, lambda: f64) -> DVector<f64> {
    let width = |i: usize| (bounds[i].1 - bounds[i].0).max(f64::MIN_POSITIVE);
    let gradient = at.jacobian.transpose() * &at.residuals;
    let free: Vec<usize> = (0..x.len())
        .filter(|&i| {
            let held_low = x[i] <= bounds[i].0 && gradient[i] > 0.0;
            let held_high = x[i] >= bounds[i].1 && gradient[i] < 0.0;
            !(held_low || held_high)
        })
        .collect();
    let mut scaled = at.jacobian.select_columns(&free);
    for (column, &i) in free.iter().enumerate() {
        scaled.column_mut(column).scale_mut(width(i));
    }
    let mut normal = scaled.transpose() * &scaled;
    let largest = normal.diagonal().max().max(f64::MIN_POSITIVE);
    for i in 0..free.len() {
        // A variable that changes nothing must not make the system singular.
        normal[(i, i)] += lambda * normal[(i, i)].max(1e-12 * largest) + 1e-15 * largest;
    }
    let right = -(scaled.transpose() * &at.residuals);
    let mut step = DVector::zeros(x.len());
    if let Some(factored) = normal.cholesky() {
        let solved = factored.solve(&right);
        for (value, &i) in solved.iter().zip(&free) {
            step[i] = value * width(i);
        }
    }
    step
}

#[cfg(test)]
mod tests {
    use super::*;

    fn wide(n: usize) -> Vec<(f64, f64)> {
        vec![(-100.0, 100.0); n]
    }

    /// H. H. Rosenbrock, "An automatic method for finding the greatest or least value of a function", Computer Journal 3, 1960.
    fn valley(x: &[f64]) -> Option<Evaluation> {
        Some(Evaluation {
            residuals: DVector::from_vec(vec![10.0 * (x[1] - x[0] * x[0]), 1.0 - x[0]]),
            jacobian: DMatrix::from_row_slice(2, 2, &[-20.0 * x[0], 10.0, -1.0, 0.0]),
        })
    }

    #[test]
    fn the_curved_valley_is_followed_to_its_end() {
        let found = minimise(&[-1.2, 1.0], &wide(2), valley).unwrap();
        assert!(found.settled);
        assert!((found.x[0] - 1.0).abs() < 1e-9 && (found.x[1] - 1.0).abs() < 1e-9);
    }

    #[test]
    fn a_bound_in_the_way_is_kept() {
        // On x0 <= 0.5 the least of the valley is at x1 = x0^2 on the bound.
        let bounds = [(-2.0, 0.5), (-2.0, 2.0)];
        let found = minimise(&[-1.2, 1.0], &bounds, valley).unwrap();
        assert!((found.x[0] - 0.5).abs() < 1e-9 && (found.x[1] - 0.25).abs() < 1e-6);
    }

    #[test]
    fn a_variable_that_changes_nothing_stays() {
        let line = |x: &[f64]| {
            Some(Evaluation {
                residuals: DVector::from_vec(vec![x[0] - 3.0, 2.0 * (x[0] - 3.0)]),
                jacobian: DMatrix::from_row_slice(2, 2, &[1.0, 0.0, 2.0, 0.0]),
            })
        };
        let found = minimise(&[0.0, 7.0], &wide(2), line).unwrap();
        assert!((found.x[0] - 3.0).abs() < 1e-9 && found.x[1] == 7.0);
    }
}

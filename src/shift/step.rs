//! One step of the run, by either of two Runge–Kutta methods, with its dense output.
//!
//! Not all rates belong to the state: the first `states` of them are integrated with error control and enter `f`, the rest
//! are sums along the way (energies, volumes) that use the same weights, so that what flows in less what flows out is what
//! is stored, to rounding. No event, tank or network is known here.

use std::ops::ControlFlow;

use nalgebra::{DMatrix, DVector};

use super::dormand_prince::{self, A, C, E, P};
use super::radau::{self, Newton};

/// Which method made the step.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Method {
    /// Dormand and Prince's pair.
    Explicit,
    /// Radau IIA.
    Implicit,
}

/// The stages of the present step. All memory of the explicit pair is fixed when it is made.
pub(super) struct Step {
    states: usize,
    /// `rates[i]` is k of stage i; the implicit method's stages stand at [`IMPLICIT`].
    rates: [Vec<f64>; 7],
    at_stage: Vec<f64>,
    /// Where the sixth stage was evaluated, which is at the end of the step as the seventh is.
    at_sixth: Vec<f64>,
    method: Method,
    /// Error of each state in an implicit step.
    errors: DVector<f64>,
    /// Length of the step, s.
    pub h: f64,
}

/// Where the stages of the implicit method stand among the rates: the last one at the end of the step.
const IMPLICIT: [usize; 3] = [1, 2, 6];

/// h times the size of the fastest rate beyond which the explicit pair is not stable.
///
/// # Source
/// E. Hairer, G. Wanner, Solving Ordinary Differential Equations II (1996), section IV.2, with their code for this pair.
const STABLE: f64 = 3.25;

/// How much worse than a change that counts as none the equations of the stages may hold.
const ROUGHLY: f64 = 1000.0;

/// Most Newton iterations in a step; with a matrix made anew at these.
const MOST_ITERATIONS: usize = 12;
const ANEW_EVERY: usize = 4;

impl Step {
    /// For `rates` rates, of which the first `states` are the state's.
    pub fn new(states: usize, rates: usize) -> Self {
        Self {
            states,
            rates: std::array::from_fn(|_| vec![0.0; rates]),
            at_stage: vec![0.0; states],
            at_sixth: vec![0.0; states],
            method: Method::Explicit,
            errors: DVector::zeros(states),
            h: 0.0,
        }
    }

    /// Where the rates at the start of the step belong.
    pub fn first_mut(&mut self) -> &mut [f64] {
        &mut self.rates[0]
    }

    /// Rates at the start of the step.
    pub fn first(&self) -> &[f64] {
        &self.rates[0]
    }

    /// Rates at its end.
    pub fn last(&self) -> &[f64] {
        &self.rates[6]
    }

    /// Makes the end of this step the start of the next.
    pub fn shift(&mut self) {
        self.rates.swap(0, 6);
    }

    /// Computes the stages of an explicit step of length `h` from `y` at `t`; the first must be there. Stops early if `f` says so.
    ///
    /// # Errors
    /// What `f` returns.
    pub fn take<E>(
        &mut self,
        t: f64,
        h: f64,
        y: &[f64],
        mut f: impl FnMut(f64, &[f64], &mut [f64]) -> Result<ControlFlow<()>, E>,
    ) -> Result<ControlFlow<()>, E> {
        (self.h, self.method) = (h, Method::Explicit);
        for i in 1..7 {
            let (done, rest) = self.rates.split_at_mut(i);
            for (n, value) in self.at_stage.iter_mut().enumerate() {
                let mut sum = 0.0;
                for (a, k) in A[i].iter().zip(done.iter()) {
                    sum += a * k[n];
                }
                *value = y[n] + h * sum;
            }
            let flow = f(t + C[i] * h, &self.at_stage, &mut rest[0])?;
            if flow.is_break() {
                return Ok(flow);
            }
            if i == 5 {
                self.at_sixth.copy_from_slice(&self.at_stage);
            }
        }
        Ok(ControlFlow::Continue(()))
    }

    /// Whether the explicit step just taken was held back by stability rather than by accuracy: the rates of its last two stages, both at
    /// its end, differ by more than the stages themselves allow.
    pub fn is_stiff(&self) -> bool {
        let apart = |a: &[f64], b: &[f64]| -> f64 {
            let squares = (0..self.states).map(|n| (a[n] - b[n]).powi(2));
            squares.sum::<f64>().sqrt()
        };
        let rates = apart(&self.rates[6], &self.rates[5]);
        let places = apart(&self.at_stage, &self.at_sixth);
        places > 0.0 && self.h * rates > STABLE * places
    }

    /// Computes the stages of an implicit step of length `h` from `y` at `t`; the first rates must be there. `small` is a change of
    /// each state that counts as none. Tells h times the size of the fastest rate; none if the stages did not settle.
    ///
    /// # Errors
    /// What `f` returns.
    pub fn take_implicit<E>(
        &mut self,
        t: f64,
        h: f64,
        y: &[f64],
        small: impl Fn(usize) -> f64,
        mut f: impl FnMut(f64, &[f64], &mut [f64]) -> Result<(), E>,
    ) -> Result<Option<f64>, E> {
        (self.h, self.method) = (h, Method::Implicit);
        let n = self.states;
        // Start from the rates at the start, going on unchanged.
        let mut z = DVector::from_fn(3 * n, |row, _| {
            h * radau::C[row / n] * self.rates[0][row % n]
        });
        let mut at = y[..n].to_vec();
        let mut jacobian = self.jacobian(t, &at, 0, &small, &mut f)?;
        let mut newton = Newton::new(&jacobian, h);
        let mut last = f64::INFINITY;
        for iteration in 1..=MOST_ITERATIONS {
            for (stage, place) in IMPLICIT.into_iter().enumerate() {
                for state in 0..n {
                    at[state] = y[state] + z[stage * n + state];
                }
                f(t + radau::C[stage] * h, &at, &mut self.rates[place])?;
            }
            let [a, b, c] = IMPLICIT.map(|place| self.rates[place].as_slice());
            let residual = newton.residual(&z, [a, b, c]);
            let Some(change) = newton.change(&residual) else {
                return Ok(None);
            };
            let worst = |vector: &DVector<f64>| {
                let over = (0..3 * n).map(|row| vector[row].abs() / small(row % n));
                over.fold(0.0, f64::max)
            };
            // Where rates are steeper at the start of the step than at its stages a small change says nothing: the equations of the
            // stages must hold too, as well as rates of such steepness can be told.
            let size = worst(&change).max(worst(&residual) / ROUGHLY);
            if size.is_nan() {
                return Ok(None);
            }
            if size <= 1.0 {
                // The rates belong to the stages as they stand: books and levels are made of the very same figures.
                let Some(errors) = newton.error(&self.rates[0], &z) else {
                    return Ok(None);
                };
                self.errors = errors;
                return Ok(Some(h * jacobian.amax()));
            }
            z += change;
            if iteration % ANEW_EVERY == 0 {
                if size > 0.5 * last {
                    return Ok(None);
                }
                last = size;
                for state in 0..n {
                    at[state] = y[state] + z[2 * n + state];
                }
                f(t + h, &at, &mut self.rates[6])?;
                jacobian = self.jacobian(t + h, &at, 6, &small, &mut f)?;
                newton = Newton::new(&jacobian, h);
            }
        }
        Ok(None)
    }

    /// df/dy at `y`, whose rates stand at `place`, by differences a hundred times what counts as none: finer ones would see the rounding of the
    /// steady solutions.
    fn jacobian<E>(
        &mut self,
        t: f64,
        y: &[f64],
        place: usize,
        small: &impl Fn(usize) -> f64,
        f: &mut impl FnMut(f64, &[f64], &mut [f64]) -> Result<(), E>,
    ) -> Result<DMatrix<f64>, E> {
        let n = self.states;
        let mut jacobian = DMatrix::zeros(n, n);
        let mut moved = y.to_vec();
        for column in 0..n {
            let by = 100.0 * small(column);
            moved[column] = y[column] + by;
            f(t, &moved, &mut self.rates[3])?;
            moved[column] = y[column];
            for row in 0..n {
                jacobian[(row, column)] = (self.rates[3][row] - self.rates[place][row]) / by;
            }
        }
        Ok(jacobian)
    }

    /// Error of the step over its tolerance, the largest of all states; `tolerance(i, size)` for state i of that size.
    pub fn error(&self, y: &[f64], tolerance: impl Fn(usize, f64) -> f64) -> f64 {
        let mut worst: f64 = 0.0;
        for i in 0..self.states {
            let end = self.at(i, y[i], 1.0);
            let error = match self.method {
                Method::Explicit => {
                    let each = E.iter().zip(&self.rates);
                    self.h * each.map(|(w, k)| w * k[i]).sum::<f64>()
                }
                Method::Implicit => self.errors[i],
            };
            worst = worst.max(error.abs() / tolerance(i, y[i].abs().max(end.abs())));
        }
        worst
    }

    /// b_i(theta) for all rates.
    fn weights(&self, theta: f64) -> [f64; 7] {
        match self.method {
            Method::Explicit => dormand_prince::weights(theta),
            Method::Implicit => {
                let mut weights = [0.0; 7];
                for (place, weight) in IMPLICIT.into_iter().zip(radau::weights(theta)) {
                    weights[place] = weight;
                }
                weights
            }
        }
    }

    /// Sum number `i` at `theta` (0 to 1) of the step, having been `y` at its start.
    pub fn at(&self, i: usize, y: f64, theta: f64) -> f64 {
        let mut sum = 0.0;
        for (b, k) in self.weights(theta).iter().zip(&self.rates) {
            sum += b * k[i];
        }
        y + self.h * sum
    }

    /// Adds to every sum what it gains from the start to `theta`.
    pub fn advance(&self, y: &mut [f64], theta: f64) {
        let weights = self.weights(theta);
        for (i, y) in y.iter_mut().enumerate() {
            let mut sum = 0.0;
            for (b, k) in weights.iter().zip(&self.rates) {
                sum += b * k[i];
            }
            *y += self.h * sum;
        }
    }

    /// Coefficients of theta, theta^2, theta^3, theta^4 in the change of sum number `i`.
    pub fn polynomial(&self, i: usize) -> [f64; 4] {
        match self.method {
            Method::Explicit => std::array::from_fn(|j| {
                let sum: f64 = P.iter().zip(&self.rates).map(|(p, k)| p[j] * k[i]).sum();
                self.h * sum
            }),
            Method::Implicit => {
                let polynomials = radau::polynomials();
                let coefficient = |j: usize| {
                    let each = polynomials.iter().zip(IMPLICIT);
                    self.h
                        * each
                            .map(|(p, place)| p[j] * self.rates[place][i])
                            .sum::<f64>()
                };
                [coefficient(0), coefficient(1), coefficient(2), 0.0]
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn converges_with_the_fifth_order() {
        let error = |steps: usize| {
            let (mut t, h) = (0.0, 1.0 / steps as f64);
            let mut y = [1.0];
            let mut step = Step::new(1, 1);
            for _ in 0..steps {
                step.first_mut()[0] = y[0] * f64::cos(t);
                let done: Result<_, ()> = step.take(t, h, &y, |t, y, k| {
                    k[0] = y[0] * t.cos();
                    Ok(ControlFlow::Continue(()))
                });
                assert!(done.is_ok());
                step.advance(&mut y, 1.0);
                t += h;
            }
            (y[0] - f64::exp(f64::sin(1.0))).abs()
        };
        let order = (error(8) / error(16)).log2();
        assert!((order - 5.0).abs() < 0.6, "{order}");
    }

    /// y' = -1000 (y - cos t), from A. Prothero, A. Robinson, Mathematics of Computation 28, 1974: no explicit step of 0.1 stands it.
    #[test]
    fn a_stiff_course_is_followed_in_long_steps() {
        let mut step = Step::new(1, 1);
        let (mut t, mut y) = (0.0, [1.0]);
        let rate = |t: f64, y: f64| -1000.0 * (y - t.cos());
        for _ in 0..10 {
            step.first_mut()[0] = rate(t, y[0]);
            let taken: Result<_, ()> = step.take_implicit(
                t,
                0.1,
                &y,
                |_| 1e-10,
                |t, y, k| {
                    k[0] = rate(t, y[0]);
                    Ok(())
                },
            );
            assert!(taken.unwrap().unwrap() > 50.0);
            step.advance(&mut y, 1.0);
            t += 0.1;
        }
        // y = cos t + sin t / 1000 and less
        assert!((y[0] - f64::cos(1.0)).abs() < 2e-3);
        step.first_mut()[0] = rate(t, y[0]);
        let _: Result<_, ()> = step.take(t, 0.1, &y, |t, y, k| {
            k[0] = rate(t, y[0]);
            Ok(ControlFlow::Continue(()))
        });
        assert!(step.is_stiff());
    }
}

//! One step of the embedded Runge–Kutta pair of Dormand and Prince, with its dense output.
//!
//! ```text
//! k_1 = f(t, y),   k_i = f(t + c_i h, y + h sum_j a_ij k_j),   y(t + theta h) = y + h sum_i b_i(theta) k_i
//! ```
//!
//! Not all rates belong to the state: the first `states` of them are integrated with error control and enter `f`, the rest
//! are sums along the way (energies, volumes) that use the same weights, so that what flows in less what flows out is what
//! is stored, to rounding. No event, tank or network is known here.
//!
//! # Source
//! J. R. Dormand, P. J. Prince, "A family of embedded Runge-Kutta formulae", J. Comput. Appl. Math. 6, 1980; dense output L. F.
//! Shampine, "Some practical Runge-Kutta formulas", Math. Comp. 46, 1986.

const C: [f64; 7] = [0.0, 0.2, 0.3, 0.8, 8.0 / 9.0, 1.0, 1.0];

const A: [[f64; 6]; 7] = [
    [0.0; 6],
    [0.2, 0.0, 0.0, 0.0, 0.0, 0.0],
    [3.0 / 40.0, 9.0 / 40.0, 0.0, 0.0, 0.0, 0.0],
    [44.0 / 45.0, -56.0 / 15.0, 32.0 / 9.0, 0.0, 0.0, 0.0],
    [
        19372.0 / 6561.0,
        -25360.0 / 2187.0,
        64448.0 / 6561.0,
        -212.0 / 729.0,
        0.0,
        0.0,
    ],
    [
        9017.0 / 3168.0,
        -355.0 / 33.0,
        46732.0 / 5247.0,
        49.0 / 176.0,
        -5103.0 / 18656.0,
        0.0,
    ],
    [
        35.0 / 384.0,
        0.0,
        500.0 / 1113.0,
        125.0 / 192.0,
        -2187.0 / 6784.0,
        11.0 / 84.0,
    ],
];

/// Fifth-order less fourth-order weights.
const E: [f64; 7] = [
    71.0 / 57600.0,
    0.0,
    -71.0 / 16695.0,
    71.0 / 1920.0,
    -17253.0 / 339200.0,
    22.0 / 525.0,
    -1.0 / 40.0,
];

/// b_i(theta) = sum_j P[i][j] theta^(j+1).
const P: [[f64; 4]; 7] = [
    [
        1.0,
        -8048581381.0 / 2820520608.0,
        8663915743.0 / 2820520608.0,
        -12715105075.0 / 11282082432.0,
    ],
    [0.0; 4],
    [
        0.0,
        131558114200.0 / 32700410799.0,
        -68118460800.0 / 10900136933.0,
        87487479700.0 / 32700410799.0,
    ],
    [
        0.0,
        -1754552775.0 / 470086768.0,
        14199869525.0 / 1410260304.0,
        -10690763975.0 / 1880347072.0,
    ],
    [
        0.0,
        127303824393.0 / 49829197408.0,
        -318862633887.0 / 49829197408.0,
        701980252875.0 / 199316789632.0,
    ],
    [
        0.0,
        -282668133.0 / 205662961.0,
        2019193451.0 / 616988883.0,
        -1453857185.0 / 822651844.0,
    ],
    [
        0.0,
        40617522.0 / 29380423.0,
        -110615467.0 / 29380423.0,
        69997945.0 / 29380423.0,
    ],
];

/// b_i(theta).
fn weights(theta: f64) -> [f64; 7] {
    P.map(|p| theta * (p[0] + theta * (p[1] + theta * (p[2] + theta * p[3]))))
}

/// The stages of the present step. All memory is fixed when it is made.
pub(super) struct Step {
    states: usize,
    /// `rates[i]` is k of stage i.
    rates: [Vec<f64>; 7],
    at_stage: Vec<f64>,
    /// Length of the step, s.
    pub h: f64,
}

impl Step {
    /// For `rates` rates, of which the first `states` are the state's.
    pub fn new(states: usize, rates: usize) -> Self {
        Self {
            states,
            rates: std::array::from_fn(|_| vec![0.0; rates]),
            at_stage: vec![0.0; states],
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

    /// Computes the stages of a step of length `h` from `y` at `t`; the first must be there. Stops early if `f` says so.
    ///
    /// # Errors
    /// What `f` returns.
    pub fn take<E>(
        &mut self,
        t: f64,
        h: f64,
        y: &[f64],
        mut f: impl FnMut(f64, &[f64], &mut [f64]) -> Result<std::ops::ControlFlow<()>, E>,
    ) -> Result<std::ops::ControlFlow<()>, E> {
        self.h = h;
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
        }
        Ok(std::ops::ControlFlow::Continue(()))
    }

    /// Error of the step over its tolerance, the largest of all states; `tolerance(i, size)` for state i of that size.
    pub fn error(&self, y: &[f64], tolerance: impl Fn(usize, f64) -> f64) -> f64 {
        let mut worst: f64 = 0.0;
        for i in 0..self.states {
            let sum = |w: &[f64; 7]| {
                w.iter()
                    .zip(&self.rates)
                    .map(|(w, k)| w * k[i])
                    .sum::<f64>()
            };
            let end = y[i] + self.h * sum(&weights(1.0));
            let error = self.h * sum(&E);
            worst = worst.max(error.abs() / tolerance(i, y[i].abs().max(end.abs())));
        }
        worst
    }

    /// Sum number `i` at `theta` (0 to 1) of the step, having been `y` at its start.
    pub fn at(&self, i: usize, y: f64, theta: f64) -> f64 {
        let mut sum = 0.0;
        for (b, k) in weights(theta).iter().zip(&self.rates) {
            sum += b * k[i];
        }
        y + self.h * sum
    }

    /// Adds to every sum what it gains from the start to `theta`.
    pub fn advance(&self, y: &mut [f64], theta: f64) {
        let weights = weights(theta);
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
        std::array::from_fn(|j| {
            let sum: f64 = P.iter().zip(&self.rates).map(|(p, k)| p[j] * k[i]).sum();
            self.h * sum
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::ops::ControlFlow;

    #[test]
    fn dense_weights_end_in_the_step_weights_with_the_last_slope() {
        for i in 0..7 {
            let end: f64 = P[i].iter().sum();
            let b = if i < 6 { A[6][i] } else { 0.0 };
            assert!((end - b).abs() < 1e-14, "{i}");
            // d/dtheta b_i(1) is 1 for the last stage, 0 for the others: the slope is continuous across steps
            let slope: f64 = P[i]
                .iter()
                .enumerate()
                .map(|(j, p)| (j + 1) as f64 * p)
                .sum();
            assert!((slope - f64::from(i == 6)).abs() < 1e-12, "{i}");
        }
    }

    #[test]
    fn dense_weights_fulfil_the_order_conditions_to_the_fourth_power() {
        // sum b_i(theta) c_i^(n-1) = theta^n / n
        for n in 1..=4 {
            for theta in [0.1, 0.35, 0.8, 1.0] {
                let sum: f64 = weights(theta)
                    .iter()
                    .zip(C)
                    .map(|(b, c)| b * c.powi(n - 1))
                    .sum();
                assert!((sum - f64::powi(theta, n) / n as f64).abs() < 1e-14);
            }
        }
        assert!(E.iter().sum::<f64>().abs() < 1e-16);
    }

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
}

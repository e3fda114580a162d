//! The embedded Runge–Kutta pair of Dormand and Prince, with its dense output: the method for courses that are not stiff.
//!
//! ```text
//! k_1 = f(t, y),   k_i = f(t + c_i h, y + h sum_j a_ij k_j),   y(t + theta h) = y + h sum_i b_i(theta) k_i
//! ```
//!
//! # Source
//! J. R. Dormand, P. J. Prince, "A family of embedded Runge-Kutta formulae", J. Comput. Appl. Math. 6, 1980; dense output L. F.
//! Shampine, "Some practical Runge-Kutta formulas", Math. Comp. 46, 1986.

pub(super) const C: [f64; 7] = [0.0, 0.2, 0.3, 0.8, 8.0 / 9.0, 1.0, 1.0];

pub(super) const A: [[f64; 6]; 7] = [
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
pub(super) const E: [f64; 7] = [
    71.0 / 57600.0,
    0.0,
    -71.0 / 16695.0,
    71.0 / 1920.0,
    -17253.0 / 339200.0,
    22.0 / 525.0,
    -1.0 / 40.0,
];

/// b_i(theta) = sum_j P[i][j] theta^(j+1).
pub(super) const P: [[f64; 4]; 7] = [
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
pub(super) fn weights(theta: f64) -> [f64; 7] {
    P.map(|p| theta * (p[0] + theta * (p[1] + theta * (p[2] + theta * p[3]))))
}

#[cfg(test)]
mod tests {
    use super::*;

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
}

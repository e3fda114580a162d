//! The three-stage Radau IIA method, of fifth order and L-stable: the method for stiff courses, such as two tanks that have come level through
//! a wide pipe and pull at each other harder the closer they are.
//!
//! ```text
//! k_i = f(t + c_i h, y + h sum_j a_ij k_j),   y(t + theta h) = y + h sum_i b_i(theta) k_i,   a_ij = b_j(c_i)
//! ```
//!
//! b_i(theta) is the integral of the Lagrange polynomial that is 1 at c_i and 0 at the other two: the method collocates there. All
//! sums along the way use the same rates and weights, so books close as they do with the explicit pair.
//!
//! # Source
//! E. Hairer, G. Wanner, Solving Ordinary Differential Equations II (1996), section IV.5 (method) and IV.8 (Newton iterations, error estimate).

use nalgebra::{DMatrix, DVector};

/// sqrt 6.
const ROOT: f64 = 2.449_489_742_783_178;
/// Places of the stages.
pub(super) const C: [f64; 3] = [(4.0 - ROOT) / 10.0, (4.0 + ROOT) / 10.0, 1.0];
/// Real eigenvalue of the inverse of (a_ij), with which the error is estimated.
///
/// gamma = (6 + 81^(1/3) - 9^(1/3)) / 30 is its reciprocal.
const GAMMA: f64 = (6.0 + 4.326_748_710_922_225 - 2.080_083_823_051_904) / 30.0;
/// Weights of the stages' changes in the error estimate, over gamma.
const ERROR: [f64; 3] = [
    (-13.0 - 7.0 * ROOT) / 3.0,
    (-13.0 + 7.0 * ROOT) / 3.0,
    -1.0 / 3.0,
];

/// Coefficients of theta, theta2, theta3 in b_i(theta).
pub(super) fn polynomials() -> [[f64; 3]; 3] {
    std::array::from_fn(|i| {
        let others: [f64; 2] = match i {
            0 => [C[1], C[2]],
            1 => [C[0], C[2]],
            _ => [C[0], C[1]],
        };
        let scale = (C[i] - others[0]) * (C[i] - others[1]);
        // (s - p)(s - q) = p q - (p + q) s + s2
        let (product, sum) = (others[0] * others[1], others[0] + others[1]);
        [product / scale, -0.5 * sum / scale, 1.0 / (3.0 * scale)]
    })
}

/// b_i(theta).
pub(super) fn weights(theta: f64) -> [f64; 3] {
    polynomials().map(|p| theta * (p[0] + theta * (p[1] + theta * p[2])))
}

/// Solves the equations of the stages by Newton's method with one matrix: (I - h A x J) dZ = h (A x I) F - Z.
pub(super) struct Newton {
    states: usize,
    factored: nalgebra::LU<f64, nalgebra::Dyn, nalgebra::Dyn>,
    /// I - h gamma J, for the error.
    filter: nalgebra::LU<f64, nalgebra::Dyn, nalgebra::Dyn>,
    a: [[f64; 3]; 3],
    h: f64,
}

impl Newton {
    /// With `jacobian` = df/dy and a step of `h` s.
    pub fn new(jacobian: &DMatrix<f64>, h: f64) -> Self {
        let n = jacobian.nrows();
        let a = C.map(weights);
        let mut matrix = DMatrix::identity(3 * n, 3 * n);
        for (i, row) in a.iter().enumerate() {
            for (j, a) in row.iter().enumerate() {
                let mut block = matrix.view_mut((i * n, j * n), (n, n));
                block -= jacobian * (h * a);
            }
        }
        let filter = DMatrix::identity(n, n) - jacobian * (h * GAMMA);
        Self {
            states: n,
            factored: matrix.lu(),
            filter: filter.lu(),
            a,
            h,
        }
    }

    /// What the equations of the stages leave over: h (A x I) F - Z, with the rates `rates[i]` at stage i.
    pub fn residual(&self, z: &DVector<f64>, rates: [&[f64]; 3]) -> DVector<f64> {
        let n = self.states;
        DVector::from_fn(3 * n, |row, _| {
            let (i, state) = (row / n, row % n);
            let sum: f64 = (0..3).map(|j| self.a[i][j] * rates[j][state]).sum();
            self.h * sum - z[row]
        })
    }

    /// The change of Z that a residual calls for; none if the matrix is singular.
    pub fn change(&self, residual: &DVector<f64>) -> Option<DVector<f64>> {
        self.factored.solve(residual)
    }

    /// Estimate of the error of each state, of third order: (I - h gamma J)^-1 (gamma h f(t, y) + gamma sum e_i Z_i).
    pub fn error(&self, first: &[f64], z: &DVector<f64>) -> Option<DVector<f64>> {
        let n = self.states;
        let right = DVector::from_fn(n, |state, _| {
            let changes: f64 = (0..3).map(|i| ERROR[i] * z[i * n + state]).sum();
            GAMMA * (self.h * first[state] + changes)
        });
        self.filter.solve(&right)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn coefficients_are_those_of_the_book() {
        // Hairer and Wanner, table IV.5.6: a_11 = (88 - 7 sqrt 6)/360, a_12 = (296 - 169 sqrt 6)/1800, a_33 = 1/9
        let a = C.map(weights);
        assert!((a[0][0] - (88.0 - 7.0 * ROOT) / 360.0).abs() < 1e-15);
        assert!((a[0][1] - (296.0 - 169.0 * ROOT) / 1800.0).abs() < 1e-15);
        assert!((a[2][2] - 1.0 / 9.0).abs() < 1e-15);
        // quadrature of fifth order: sum b_i c_i^(n-1) = 1/n
        for n in 1..=5 {
            let sum: f64 = (0..3).map(|i| a[2][i] * C[i].powi(n - 1)).sum();
            assert!((sum - 1.0 / f64::from(n)).abs() < 1e-15, "{n}");
        }
        // 1/gamma is an eigenvalue of the inverse of A, gamma of A itself
        let matrix = DMatrix::from_fn(3, 3, |i, j| a[i][j]);
        assert!(
            (matrix - DMatrix::identity(3, 3) * GAMMA)
                .determinant()
                .abs()
                < 1e-14
        );
    }
}

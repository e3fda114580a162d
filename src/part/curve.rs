//! A curve given by points or by a polynomial: value and slope at any flow, straight outside its ends.

/// Value and slope of a curve at one abscissa.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CurvePoint {
    /// Ordinate.
    pub value: f64,
    /// Derivative by the abscissa.
    pub slope: f64,
}

/// Why a curve could not be made.
#[derive(Clone, Debug, PartialEq)]
pub enum CurveError {
    /// Fewer than two points.
    TooFewPoints,
    /// The columns have different lengths.
    Lengths { x: usize, y: usize },
    /// Abscissa number `at` (from 0) does not lie above the one before it.
    NotRising { at: usize },
    /// A figure is not finite.
    NotFinite { at: usize },
}

impl std::fmt::Display for CurveError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::TooFewPoints => write!(f, "a curve needs at least two points"),
            Self::Lengths { x, y } => write!(f, "{x} points along it but {y} values"),
            Self::NotRising { at } => write!(
                f,
                "point number {} does not lie beyond the one before it",
                at + 1
            ),
            Self::NotFinite { at } => write!(f, "figure number {} is not a finite number", at + 1),
        }
    }
}

impl std::error::Error for CurveError {}

/// A curve over flow: known on a domain, straight outside it.
#[derive(Clone, Debug, PartialEq)]
pub enum Curve {
    /// Through given points.
    Points(Pchip),
    /// A polynomial on `0..=limit`.
    Polynomial(Polynomial),
}

impl Curve {
    /// Through points, by the monotone piecewise cubic.
    ///
    /// # Errors
    /// See [`CurveError`].
    pub fn through(x: &[f64], y: &[f64]) -> Result<Self, CurveError> {
        Pchip::new(x, y).map(Self::Points)
    }

    /// Value and slope at `x`.
    #[inline]
    pub fn at(&self, x: f64) -> CurvePoint {
        match self {
            Self::Points(curve) => curve.at(x),
            Self::Polynomial(curve) => curve.at(x),
        }
    }

    /// First and last abscissa of the domain.
    pub fn domain(&self) -> (f64, f64) {
        match self {
            Self::Points(curve) => (curve.x[0], curve.x[curve.x.len() - 1]),
            Self::Polynomial(curve) => (0.0, curve.limit),
        }
    }

    /// Abscissas that show the curve: those of its points, or nine even ones of a polynomial.
    pub fn abscissas(&self) -> Vec<f64> {
        match self {
            Self::Points(curve) => curve.x.clone(),
            Self::Polynomial(curve) => (0..9).map(|i| curve.limit * f64::from(i) / 8.0).collect(),
        }
    }

    /// Abscissas at which the curve can turn from rising to falling or back, the ends included.
    fn turning_points(&self) -> Vec<f64> {
        match self {
            Self::Points(curve) => curve.x.clone(),
            Self::Polynomial(curve) => curve.turning_points(),
        }
    }

    /// The stretches of the domain on which the curve rises; empty where it never does.
    pub fn rising_stretches(&self) -> Vec<(f64, f64)> {
        let turns = self.turning_points();
        let mut stretches: Vec<(f64, f64)> = Vec::new();
        for pair in turns.windows(2) {
            if self.at(pair[1]).value > self.at(pair[0]).value {
                match stretches.last_mut() {
                    Some(last) if last.1 == pair[0] => last.1 = pair[1],
                    _ => stretches.push((pair[0], pair[1])),
                }
            }
        }
        stretches
    }

    /// The lowest falling curve that lies nowhere below this one from its own abscissa on (`Cover::Upper`: each point
    /// lifted to the highest to its right), or the highest falling curve nowhere above it (`Cover::Lower`: each
    /// point lowered to the lowest to its left). Through points close enough together to start a solution from.
    pub fn falling_cover(&self, cover: Cover) -> Self {
        const STEPS: usize = 16;
        let turns = self.turning_points();
        let mut x: Vec<f64> = Vec::with_capacity(turns.len() * STEPS);
        for pair in turns.windows(2) {
            x.extend((0..STEPS).map(|i| pair[0] + (pair[1] - pair[0]) * i as f64 / STEPS as f64));
        }
        x.push(turns[turns.len() - 1]);
        let mut y: Vec<f64> = x.iter().map(|&x| self.at(x).value).collect();
        match cover {
            Cover::Upper => (0..y.len() - 1)
                .rev()
                .for_each(|i| y[i] = y[i].max(y[i + 1])),
            Cover::Lower => (1..y.len()).for_each(|i| y[i] = y[i].min(y[i - 1])),
        }
        Self::Points(Pchip::from_points(x, &y))
    }
}

/// Which falling curve stands in for a drooping one.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Cover {
    /// Leads to the balance with the larger flow.
    Upper,
    /// Leads to the balance with the smaller flow.
    Lower,
}

/// Monotone piecewise cubic through points: rises where the points rise, falls where they fall, slope continuous.
///
/// # Source
/// F. N. Fritsch, R. E. Carlson, "Monotone piecewise cubic interpolation", SIAM J. Numer. Anal. 17, 1980; slopes
/// F. N. Fritsch, J. Butland, "A method for constructing local monotone piecewise cubic interpolants", SIAM J. Sci. Stat.
/// Comput. 5, 1984; three-point end slopes as in C. Moler, Numerical Computing with MATLAB, 2004, section 3.6.
#[derive(Clone, Debug, PartialEq)]
pub struct Pchip {
    x: Vec<f64>,
    /// Per interval the coefficients of 1, t, t2, t3 with t = x - x[i]; then the straight line past the last point.
    cubics: Vec<[f64; 4]>,
}

impl Pchip {
    fn new(x: &[f64], y: &[f64]) -> Result<Self, CurveError> {
        if x.len() != y.len() {
            return Err(CurveError::Lengths {
                x: x.len(),
                y: y.len(),
            });
        }
        if x.len() < 2 {
            return Err(CurveError::TooFewPoints);
        }
        if let Some(at) = (0..x.len()).find(|&i| !(x[i].is_finite() && y[i].is_finite())) {
            return Err(CurveError::NotFinite { at });
        }
        if let Some(at) = (1..x.len()).find(|&i| x[i] <= x[i - 1]) {
            return Err(CurveError::NotRising { at });
        }
        Ok(Self::from_points(x.to_vec(), y))
    }

    /// From abscissas that rise, at least two.
    fn from_points(x: Vec<f64>, y: &[f64]) -> Self {
        let n = x.len();
        let width: Vec<f64> = x.windows(2).map(|p| p[1] - p[0]).collect();
        let secant: Vec<f64> = (0..n - 1).map(|i| (y[i + 1] - y[i]) / width[i]).collect();
        let mut slope = vec![0.0; n];
        for i in 1..n - 1 {
            let (a, b) = (secant[i - 1], secant[i]);
            if a * b > 0.0 {
                // weighted harmonic mean (Fritsch & Butland)
                let (w1, w2) = (2.0 * width[i] + width[i - 1], width[i] + 2.0 * width[i - 1]);
                slope[i] = (w1 + w2) / (w1 / a + w2 / b);
            }
        }
        if n == 2 {
            slope.fill(secant[0]);
        } else {
            slope[0] = end_slope(width[0], width[1], secant[0], secant[1]);
            slope[n - 1] = end_slope(width[n - 2], width[n - 3], secant[n - 2], secant[n - 3]);
        }
        let mut cubics: Vec<[f64; 4]> = (0..n - 1)
            .map(|i| {
                let (h, s, d0, d1) = (width[i], secant[i], slope[i], slope[i + 1]);
                [
                    y[i],
                    d0,
                    (3.0 * s - 2.0 * d0 - d1) / h,
                    (d0 + d1 - 2.0 * s) / (h * h),
                ]
            })
            .collect();
        cubics.push([y[n - 1], slope[n - 1], 0.0, 0.0]);
        Self { x, cubics }
    }

    #[inline]
    fn at(&self, x: f64) -> CurvePoint {
        // straight below the first point
        if x < self.x[0] {
            let [y, slope, ..] = self.cubics[0];
            return CurvePoint {
                value: y + slope * (x - self.x[0]),
                slope,
            };
        }
        let mut i = 0;
        while i + 1 < self.x.len() && x >= self.x[i + 1] {
            i += 1;
        }
        let t = x - self.x[i];
        let [a, b, c, d] = self.cubics[i];
        CurvePoint {
            value: a + t * (b + t * (c + t * d)),
            slope: b + t * (2.0 * c + 3.0 * d * t),
        }
    }
}

/// Three-point slope at an end, kept from turning the curve round.
fn end_slope(h0: f64, h1: f64, s0: f64, s1: f64) -> f64 {
    let d = ((2.0 * h0 + h1) * s0 - h0 * s1) / (h0 + h1);
    if d * s0 <= 0.0 {
        0.0
    } else if s0 * s1 <= 0.0 && d.abs() > 3.0 * s0.abs() {
        3.0 * s0
    } else {
        d
    }
}

/// A polynomial `a + b x + c x2 ..` on `0..=limit`, straight outside.
#[derive(Clone, Debug, PartialEq)]
pub struct Polynomial {
    coefficients: Vec<f64>,
    limit: f64,
}

impl Polynomial {
    /// From coefficients, constant first, and the end of the domain (> 0).
    ///
    /// # Errors
    /// [`CurveError::TooFewPoints`] without coefficients, [`CurveError::NotFinite`] for a figure that is not finite,
    /// [`CurveError::NotRising`] for a limit not above zero.
    pub fn new(coefficients: &[f64], limit: f64) -> Result<Self, CurveError> {
        if coefficients.is_empty() {
            return Err(CurveError::TooFewPoints);
        }
        if let Some(at) = coefficients.iter().position(|c| !c.is_finite()) {
            return Err(CurveError::NotFinite { at });
        }
        if !(limit.is_finite() && limit > 0.0) {
            return Err(CurveError::NotRising { at: 1 });
        }
        Ok(Self {
            coefficients: coefficients.to_vec(),
            limit,
        })
    }

    #[inline]
    fn at(&self, x: f64) -> CurvePoint {
        let inside = x.clamp(0.0, self.limit);
        // Horner, value and derivative together
        let (mut value, mut slope) = (0.0, 0.0);
        for &c in self.coefficients.iter().rev() {
            slope = slope * inside + value;
            value = value * inside + c;
        }
        CurvePoint {
            value: value + slope * (x - inside),
            slope,
        }
    }

    /// Roots of the derivative inside the domain, from the eigenvalues of its companion matrix, and both ends.
    fn turning_points(&self) -> Vec<f64> {
        let mut derivative: Vec<f64> = self
            .coefficients
            .iter()
            .enumerate()
            .skip(1)
            .map(|(i, c)| i as f64 * c * self.limit.powi(i as i32))
            .collect();
        let largest = derivative.iter().fold(0.0, |m: f64, c| m.max(c.abs()));
        while derivative
            .last()
            .is_some_and(|c| c.abs() <= 1e-14 * largest)
        {
            derivative.pop();
        }
        let mut turns = vec![0.0, self.limit];
        if derivative.len() > 1 {
            let n = derivative.len() - 1;
            let companion = nalgebra::DMatrix::from_fn(n, n, |i, j| {
                if j == n - 1 {
                    -derivative[i] / derivative[n]
                } else if i == j + 1 {
                    1.0
                } else {
                    0.0
                }
            });
            let roots = companion.complex_eigenvalues();
            turns.extend(
                roots
                    .iter()
                    .filter(|root| root.im.abs() < 1e-6 && root.re > 0.0 && root.re < 1.0)
                    .map(|root| root.re * self.limit),
            );
        }
        turns.sort_by(f64::total_cmp);
        turns.dedup();
        turns
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// `scipy.interpolate.PchipInterpolator([0, 60, 120, 180, 240], [42, 41, 38, 32, 22])`, SciPy 1.x, value and derivative.
    #[test]
    fn equals_the_reference_interpolator() {
        let curve = Curve::through(
            &[0.0, 60.0, 120.0, 180.0, 240.0],
            &[42.0, 41.0, 38.0, 32.0, 22.0],
        )
        .unwrap();
        // slope at 60 from the harmonic mean of -1/60 and -3/60: -(2 1 3/(1+3))/60 = -1.5/60
        assert!((curve.at(60.0).slope + 1.5 / 60.0).abs() < 1e-15);
        // end slope at 0: (3 s0 - s1)/2 = 0, kept level
        assert_eq!(curve.at(0.0).slope, 0.0);
        // end slope at 240: (3 s_last - s_before)/2 = (3 (-10) + 6)/2/60 = -12/60
        assert!((curve.at(240.0).slope + 12.0 / 60.0).abs() < 1e-15);
        // middle of the third interval by Hermite: (38 + 32)/2 + 60/8 (d2 - d3), d2 = -4/60, d3 = -7.5/60
        assert!((curve.at(150.0).value - (35.0 + 3.5 / 8.0)).abs() < 1e-13);
        // straight outside
        assert!((curve.at(250.0).value - 20.0).abs() < 1e-13);
        assert_eq!(curve.at(-10.0).value, 42.0);
    }

    #[test]
    fn drooping_is_found_in_points_and_polynomials() {
        let points = Curve::through(&[0.0, 1.0, 2.0, 3.0], &[40.0, 42.0, 41.0, 30.0]).unwrap();
        assert_eq!(points.rising_stretches(), [(0.0, 1.0)]);
        let cover = points.falling_cover(Cover::Upper);
        assert!(cover.rising_stretches().is_empty() && (cover.at(0.0).value - 42.0).abs() < 1e-12);
        let cover = points.falling_cover(Cover::Lower);
        assert!(cover.rising_stretches().is_empty() && (cover.at(1.0).value - 40.0).abs() < 1e-12);
        // 40 + 4 q - q2: rises to q = 2
        let polynomial = Curve::Polynomial(Polynomial::new(&[40.0, 4.0, -1.0], 5.0).unwrap());
        let stretches = polynomial.rising_stretches();
        assert!(stretches.len() == 1 && (stretches[0].1 - 2.0).abs() < 1e-9);
        let falling = Curve::Polynomial(Polynomial::new(&[40.0, 0.0, -1.0], 5.0).unwrap());
        assert!(falling.rising_stretches().is_empty());
        assert!((falling.at(6.0).value - (15.0 - 10.0)).abs() < 1e-12);
    }

    #[test]
    fn bad_points_are_errors() {
        assert_eq!(
            Curve::through(&[0.0, 1.0, 1.0], &[3.0, 2.0, 1.0]),
            Err(CurveError::NotRising { at: 2 })
        );
        assert_eq!(
            Curve::through(&[0.0], &[3.0]),
            Err(CurveError::TooFewPoints)
        );
        assert_eq!(
            Curve::through(&[0.0, f64::NAN], &[3.0, 1.0]),
            Err(CurveError::NotFinite { at: 1 })
        );
    }
}

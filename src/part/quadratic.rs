//! Losses that grow with the square of the flow: fittings, strainers, heat exchangers, open valve bodies.

use super::{HeadLaw, HeadLoss};

/// A loss `h = r q |q|`.
///
/// `r` (s2/m5) is finite and not negative.
///
/// ```
/// use dutybank::part::{HeadLaw, quadratic::QuadraticLoss};
/// let strainer = QuadraticLoss::at(2.0, 0.1); // 2 m at 100 L/s
/// assert!((strainer.loss(0.05).head - 0.5).abs() < 1e-15);
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct QuadraticLoss {
    r: f64,
}

impl QuadraticLoss {
    /// No loss at all.
    pub const NONE: Self = Self { r: 0.0 };

    /// From `r` itself, s2/m5.
    pub fn new(r: f64) -> Self {
        debug_assert!(r.is_finite() && r >= 0.0);
        Self { r }
    }

    /// A loss coefficient `k` at velocity head in `bore` (m): h = K v2 / (2 g), v = q / area.
    ///
    /// # Source
    /// Weisbach's form; B. R. Munson, D. F. Young, T. H. Okiishi, Fundamentals of Fluid Mechanics, section 8.4.2.
    pub fn minor(k: f64, bore: f64, gravity: f64) -> Self {
        let area = std::f64::consts::FRAC_PI_4 * bore * bore;
        Self::new(k / (2.0 * gravity * area * area))
    }

    /// As [`Self::minor`]; none if the coefficient would not be finite.
    pub fn minor_checked(k: f64, bore: f64, gravity: f64) -> Option<Self> {
        let area = std::f64::consts::FRAC_PI_4 * bore * bore;
        let r = k / (2.0 * gravity * area * area);
        (r.is_finite() && r >= 0.0).then_some(Self { r })
    }

    /// A loss of `head` (m) at flow `at` (m3/s), as equipment is specified: h = head (q/at)2.
    pub fn at(head: f64, at: f64) -> Self {
        Self::new(head / (at * at))
    }

    /// As [`Self::at`]; none if the coefficient would not be finite.
    pub fn checked_at(head: f64, at: f64) -> Option<Self> {
        let r = head / (at * at);
        (r.is_finite() && r >= 0.0).then_some(Self { r })
    }

    /// The coefficient r, s2/m5.
    pub fn r(self) -> f64 {
        self.r
    }
}

impl HeadLaw for QuadraticLoss {
    fn loss(&self, q: f64) -> HeadLoss {
        // h = r q |q|,  dh/dq = 2 r |q|
        let slope = self.r * q.abs();
        HeadLoss {
            head: slope * q,
            slope: 2.0 * slope,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn minor_loss_is_k_velocity_heads() {
        let bore = 0.2027;
        let area = std::f64::consts::FRAC_PI_4 * bore * bore;
        let law = QuadraticLoss::minor(4.0, bore, 9.80665);
        let velocity: f64 = 1.7;
        let expected = 4.0 * velocity.powi(2) / (2.0 * 9.80665);
        assert!((law.loss(velocity * area).head - expected).abs() < 1e-14);
        assert!((law.loss(-velocity * area).head + expected).abs() < 1e-14);
    }
}

//! Friction in a full pipe: Darcy–Weisbach with Colebrook–White, Hazen–Williams, or a given friction factor.

use super::{HeadLaw, HeadLoss};

/// A straight pipe with its friction law worked out for one fluid and gravity.
#[derive(Clone, Debug, PartialEq)]
pub struct Pipe {
    /// Length, m.
    pub length: f64,
    /// Inside diameter, m.
    pub bore: f64,
    /// The law.
    pub friction: Friction,
}

impl Pipe {
    /// Area of flow, m2.
    pub fn area(&self) -> f64 {
        area(self.bore)
    }
}

fn area(bore: f64) -> f64 {
    std::f64::consts::FRAC_PI_4 * bore * bore
}

/// The friction law of a pipe, ready to evaluate.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Friction {
    /// Darcy–Weisbach, Colebrook–White.
    DarcyWeisbach(DarcyWeisbach),
    /// Hazen–Williams: h = r q |q|^0.852.
    HazenWilliams {
        /// Loss at 1 m3/s, m.
        r: f64,
    },
    /// Darcy–Weisbach with a friction factor that does not change: h = r q |q|.
    FixedFactor {
        /// Loss at 1 m3/s, m.
        r: f64,
    },
}

impl Friction {
    /// Colebrook–White for `roughness` (m) and `viscosity` (kinematic, m2/s).
    pub fn roughness(length: f64, bore: f64, roughness: f64, viscosity: f64, gravity: f64) -> Self {
        Self::DarcyWeisbach(DarcyWeisbach::new(
            length, bore, roughness, viscosity, gravity,
        ))
    }

    /// Hazen–Williams coefficient C: h = 10.667 L q^1.852 / (C^1.852 D^4.871), in m, m3/s and m.
    ///
    /// # Source
    /// G. S. Williams, A. Hazen, Hydraulic Tables (1905); constants in this rounding reproduce the published heads of
    /// the 34-pipe network of O. Fujiwara, D. B. Khang, Water Resources Research 26(4), 1990.
    pub fn hazen_williams(length: f64, bore: f64, c: f64) -> Self {
        let r = 10.667 * length / (c.powf(1.852) * bore.powf(4.871));
        Self::HazenWilliams { r }
    }

    /// A fixed Darcy friction factor `f`: h = f L/D v2/(2 g).
    pub fn fixed_factor(length: f64, bore: f64, f: f64, gravity: f64) -> Self {
        let a = area(bore);
        Self::FixedFactor {
            r: f * length / bore / (2.0 * gravity * a * a),
        }
    }
}

impl HeadLaw for Friction {
    #[inline]
    fn loss(&self, q: f64) -> HeadLoss {
        match *self {
            Self::DarcyWeisbach(ref law) => law.loss(q),
            Self::HazenWilliams { r } => {
                // h = r q |q|^0.852,  dh/dq = 1.852 r |q|^0.852
                let s = r * q.abs().powf(0.852);
                HeadLoss {
                    head: s * q,
                    slope: 1.852 * s,
                }
            }
            Self::FixedFactor { r } => {
                // h = r q |q|,  dh/dq = 2 r |q|
                let s = r * q.abs();
                HeadLoss {
                    head: s * q,
                    slope: 2.0 * s,
                }
            }
        }
    }
}

/// Darcy–Weisbach friction: laminar below Re 2000, Colebrook–White above Re 4000, and between them the cubic in flow
/// that meets both in value and slope, so that the loss rises and its slope is continuous.
///
/// ```text
/// h = f (L/D) v2/(2 g)              Darcy–Weisbach
/// f = 64/Re                         Re <= 2000
/// 1/sqrt f = -2 log10( e/(3.7 D) + 2.51/(Re sqrt f) )      Re >= 4000
/// ```
///
/// The implicit equation is met to 1e-8 relative (in fact to rounding; see the tests).
///
/// # Source
/// C. F. Colebrook, "Turbulent flow in pipes", J. Inst. Civil Engineers 11(4), 1939, 133-156. Hagen–Poiseuille for
/// laminar flow. First guess: P. Praks, D. Brkić, "Review of new flow friction equations: Constructing Colebrook's
/// explicit correlations accurately", Rev. int. métodos numér. cálc. diseño ing. 36(3), 2020. Correction: F. N. Fritsch, R. E. Shafer,
/// W. P. Crowley, "Algorithm 443: Solution of the transcendental equation w e^w = x", Comm. ACM 16, 1973.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DarcyWeisbach {
    /// Re / q, s/m3.
    reynolds_per_flow: f64,
    /// A / q, see [`Self::turbulent`].
    rough_per_flow: f64,
    /// L/D / (2 g area2): h = c f q2.
    c: f64,
    /// h / q in laminar flow.
    laminar: f64,
    /// Cubic in t = Re/2000 - 1 between the two regimes, from t^0.
    blend: [f64; 4],
}

const LAMINAR_END: f64 = 2000.0;
const TURBULENT_START: f64 = 4000.0;
/// 2 / ln 10.
const TWO_OVER_LN10: f64 = 2.0 * std::f64::consts::LOG10_E;

impl DarcyWeisbach {
    fn new(length: f64, bore: f64, roughness: f64, viscosity: f64, gravity: f64) -> Self {
        let a = area(bore);
        let reynolds_per_flow = bore / (a * viscosity);
        let c = length / bore / (2.0 * gravity * a * a);
        let mut law = Self {
            reynolds_per_flow,
            rough_per_flow: reynolds_per_flow * (roughness / bore) / (3.7 * 2.51 * TWO_OVER_LN10),
            c,
            laminar: 64.0 * c / reynolds_per_flow,
            blend: [0.0; 4],
        };
        // Hermite cubic over t in 0..1, flow span dq = 2000 / (Re/q)
        let dq = (TURBULENT_START - LAMINAR_END) / reynolds_per_flow;
        let (h0, s0) = (law.laminar * dq, law.laminar * dq);
        let end = law.turbulent(TURBULENT_START / reynolds_per_flow);
        let (h1, s1) = (end.head, end.slope * dq);
        law.blend = [
            h0,
            s0,
            3.0 * (h1 - h0) - 2.0 * s0 - s1,
            2.0 * (h0 - h1) + s0 + s1,
        ];
        law
    }

    /// Colebrook–White at flow `q` > 0.
    ///
    /// With u = 1/(a sqrt f), a = 2/ln 10, A = Re (e/D)/(3.7 2.51 a), B = ln(Re/(2.51 a)) the implicit equation reads
    /// `w + ln w = z`, w = A + u, z = A + B: Wright's omega function. Its derivative is dw/dz = w/(1+w), which gives the
    /// slope of the loss without another logarithm: dh/dq = (2 h/q) w/(1+w).
    #[inline]
    fn turbulent(&self, q: f64) -> HeadLoss {
        let b = (self.reynolds_per_flow * q * (1.0 / (2.51 * TWO_OVER_LN10))).ln();
        let a = self.rough_per_flow * q;
        let z = a + b;
        // First guess (Praks & Brkić), good to 1e-4
        let ln_z = z.ln();
        let w = a + b - ln_z + ln_z / (z - 0.5588 * ln_z + 1.2079);
        // One step of Fritsch, Shafer & Crowley, fourth order: w <- w (1 + d)
        let ln_w = w.ln();
        let r = z - w - ln_w;
        let w1 = 1.0 + w;
        let t = 2.0 * w1 * (w1 + (2.0 / 3.0) * r);
        let d = (r / w1) * (t - r) / (t - 2.0 * r);
        // u = B - ln w, free of the cancellation in w - A; ln(1+d) by its series, d < 1e-3
        let u = b - ln_w - d * (1.0 - d * (0.5 - d * (1.0 / 3.0 - 0.25 * d)));
        let w = w * (1.0 + d);
        // h = c f q2 with f = 1/(a u)2
        let root = q / (TWO_OVER_LN10 * u);
        let head = self.c * root * root;
        HeadLoss {
            head,
            slope: 2.0 * head / q * w / (1.0 + w),
        }
    }
}

impl HeadLaw for DarcyWeisbach {
    #[inline]
    fn loss(&self, q: f64) -> HeadLoss {
        let flow = q.abs();
        let reynolds = self.reynolds_per_flow * flow;
        if reynolds <= LAMINAR_END {
            return HeadLoss {
                head: self.laminar * q,
                slope: self.laminar,
            };
        }
        let loss = if reynolds < TURBULENT_START {
            let t = reynolds / LAMINAR_END - 1.0;
            let [a, b, c, d] = self.blend;
            let head = a + t * (b + t * (c + t * d));
            let slope = b + t * (2.0 * c + 3.0 * t * d);
            HeadLoss {
                head,
                slope: slope * self.reynolds_per_flow / LAMINAR_END,
            }
        } else {
            self.turbulent(flow)
        };
        HeadLoss {
            head: loss.head.copysign(q),
            slope: loss.slope,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const G: f64 = 9.80665;
    const NU: f64 = 1.0034e-6;

    /// f from the law, for a pipe of 1 m bore at Reynolds number `re`.
    fn factor(relative_roughness: f64, re: f64) -> f64 {
        let Friction::DarcyWeisbach(law) = Friction::roughness(1.0, 1.0, relative_roughness, NU, G)
        else {
            unreachable!()
        };
        let q = re / law.reynolds_per_flow;
        law.loss(q).head / (law.c * q * q)
    }

    #[test]
    fn implicit_equation_is_met_to_rounding() {
        let mut worst: f64 = 0.0;
        for i in 0..=600 {
            let re = 4000.0 * 10f64.powf(i as f64 / 100.0);
            for e in [0.0, 1e-7, 1e-6, 1e-5, 1e-4, 1e-3, 5e-3, 2e-2, 5e-2, 0.1] {
                let f = factor(e, re);
                let rhs = -2.0 * (e / 3.7 + 2.51 / (re * f.sqrt())).log10();
                worst = worst.max((1.0 / (rhs * rhs) / f - 1.0).abs());
            }
        }
        assert!(worst < 1e-12, "worst relative error {worst:e}");
    }

    #[test]
    fn laminar_is_64_over_re() {
        assert!((factor(0.01, 1000.0) - 0.064).abs() < 1e-15);
    }

    #[test]
    fn blend_rises_and_meets_both_regimes_in_value_and_slope() {
        for e in [0.0, 1e-4, 0.01, 0.05, 0.1] {
            let law = Friction::roughness(10.0, 0.1, 0.1 * e, NU, G);
            let q_of = |re: f64| re * NU * area(0.1) / 0.1;
            for edge in [LAMINAR_END, TURBULENT_START] {
                let below = law.loss(q_of(edge) * (1.0 - 1e-12));
                let above = law.loss(q_of(edge) * (1.0 + 1e-12));
                assert!((below.head / above.head - 1.0).abs() < 1e-10);
                assert!((below.slope / above.slope - 1.0).abs() < 1e-9);
            }
            let mut last = 0.0;
            for i in 0..=1000 {
                let loss = law.loss(q_of(1900.0 + 2.2 * i as f64));
                assert!(loss.head > last && loss.slope > 0.0);
                last = loss.head;
            }
        }
    }

    #[test]
    fn slope_is_the_derivative_of_every_law() {
        let laws = [
            Friction::roughness(850.0, 0.25, 1e-4, NU, G),
            Friction::roughness(850.0, 0.25, 0.0, NU, G),
            Friction::hazen_williams(850.0, 0.25, 130.0),
            Friction::fixed_factor(850.0, 0.25, 0.02, G),
        ];
        for law in laws {
            for q in [-0.3, -1e-3, 1e-5, 4.5e-4, 6e-4, 1e-3, 0.02, 0.3, 5.0] {
                let d = 1e-6 * f64::abs(q);
                let numeric = (law.loss(q + d).head - law.loss(q - d).head) / (2.0 * d);
                let slope = law.loss(q).slope;
                assert!(
                    (numeric / slope - 1.0).abs() < 1e-6,
                    "{law:?} at {q}: {numeric} {slope}"
                );
            }
        }
    }
}

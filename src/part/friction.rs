//! Friction in a full pipe: Darcy–Weisbach with Colebrook–White, Hazen–Williams, or a given friction factor.

use super::{HeadLaw, HeadLoss, logarithm};

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

    /// Whether the law gives finite losses: sizes far out of any range do not.
    pub fn is_finite(&self) -> bool {
        [1e-6, 1.0].iter().all(|&q| {
            let loss = self.loss(q);
            loss.head.is_finite() && loss.slope.is_finite()
        })
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
            Self::HazenWilliams { r } => hazen_williams_loss(r, q),
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

/// Kept out of line: inlined, its power is computed for pipes of the other laws too (10 % of a station's solve).
#[inline(never)]
fn hazen_williams_loss(r: f64, q: f64) -> HeadLoss {
    // h = r q |q|^0.852,  dh/dq = 1.852 r |q|^0.852
    let s = r * q.abs().powf(0.852);
    HeadLoss {
        head: s * q,
        slope: 1.852 * s,
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

/// The three figures that make a Darcy–Weisbach law. Each is a product of powers of length, bore, roughness, viscosity and
/// gravity, so that changes of several of these multiply.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct DarcyCoefficients {
    /// L/D / (2 g area2), m per (m3/s)2 at a friction factor of 1.
    pub resistance: f64,
    /// Re / q, s/m3.
    pub reynolds_per_flow: f64,
    /// Re / q x e/D / (3.7 2.51 k), s/m3; see [`colebrook`].
    pub rough_per_flow: f64,
}

const LAMINAR_END: f64 = 2000.0;
const TURBULENT_START: f64 = 4000.0;
/// 2 / ln 10.
const TWO_OVER_LN10: f64 = 2.0 * std::f64::consts::LOG10_E;

impl DarcyWeisbach {
    fn new(length: f64, bore: f64, roughness: f64, viscosity: f64, gravity: f64) -> Self {
        let a = area(bore);
        let reynolds_per_flow = bore / (a * viscosity);
        Self::of(DarcyCoefficients {
            resistance: length / bore / (2.0 * gravity * a * a),
            reynolds_per_flow,
            rough_per_flow: reynolds_per_flow * (roughness / bore) / (3.7 * 2.51 * TWO_OVER_LN10),
        })
    }

    /// From the three figures that make the law.
    pub(crate) fn of(coefficients: DarcyCoefficients) -> Self {
        let DarcyCoefficients {
            resistance: c,
            reynolds_per_flow,
            rough_per_flow,
        } = coefficients;
        let mut law = Self {
            reynolds_per_flow,
            rough_per_flow,
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

    /// Reynolds number at flow `q`.
    pub fn reynolds(&self, q: f64) -> f64 {
        self.reynolds_per_flow * q.abs()
    }

    /// Roughness over bore.
    pub fn relative_roughness(&self) -> f64 {
        self.rough_per_flow / self.reynolds_per_flow * (3.7 * 2.51 * TWO_OVER_LN10)
    }

    /// The three figures that make the law.
    pub(crate) fn coefficients(&self) -> DarcyCoefficients {
        DarcyCoefficients {
            resistance: self.c,
            reynolds_per_flow: self.reynolds_per_flow,
            rough_per_flow: self.rough_per_flow,
        }
    }

    /// Colebrook–White at flow `q` > 0.
    fn turbulent(&self, q: f64) -> HeadLoss {
        let ([root_f], [share]) =
            colebrook([self.reynolds_per_flow * q], [self.rough_per_flow * q]);
        self.darcy(q, root_f, share)
    }

    /// Darcy–Weisbach from sqrt f and the share of [`colebrook`]: h = c f q2, dh/dq = 2 c f q share.
    #[inline]
    fn darcy(&self, q: f64, root_f: f64, share: f64) -> HeadLoss {
        let s = self.c * root_f * root_f * q;
        HeadLoss {
            head: s * q,
            slope: 2.0 * s * share,
        }
    }

    /// Laminar flow and the blend, at flow `q` >= 0.
    #[inline]
    fn below_turbulent(&self, q: f64, reynolds: f64) -> HeadLoss {
        if reynolds <= LAMINAR_END {
            return HeadLoss {
                head: self.laminar * q,
                slope: self.laminar,
            };
        }
        let t = reynolds / LAMINAR_END - 1.0;
        let [a, b, c, d] = self.blend;
        HeadLoss {
            head: a + t * (b + t * (c + t * d)),
            slope: (b + t * (2.0 * c + 3.0 * t * d)) * self.reynolds_per_flow / LAMINAR_END,
        }
    }

    /// The loss at `q`, with [`Self::turbulent`] or what stands in for it.
    #[inline]
    fn loss_with(&self, q: f64, turbulent: impl Fn(f64) -> HeadLoss) -> HeadLoss {
        let flow = q.abs();
        let reynolds = self.reynolds_per_flow * flow;
        let loss = if reynolds < TURBULENT_START {
            self.below_turbulent(flow, reynolds)
        } else {
            turbulent(flow)
        };
        HeadLoss {
            head: loss.head.copysign(q),
            slope: loss.slope,
        }
    }
}

impl HeadLaw for DarcyWeisbach {
    #[inline]
    fn loss(&self, q: f64) -> HeadLoss {
        self.loss_with(q, |flow| self.turbulent(flow))
    }
}

/// Colebrook–White: `sqrt f` at Reynolds number `re` >= 4000, and the share `w/(1+w)` that makes the slope of the loss,
/// dh/dq = (2 h/q) w/(1+w). `a` is A below.
///
/// With u = 1/(k sqrt f), k = 2/ln 10, A = Re (e/D)/(3.7 2.51 k), B = ln(Re/(2.51 k)) the implicit equation reads
/// `w + ln w = z`, w = A + u, z = A + B: Wright's omega function, whose derivative is w/(1+w). From a first guess w, only
/// the logarithm of Re/(2.51 k w) has to be exact: it gives the residual of the guess and, corrected, u itself.
///
/// For N pipes side by side: each step is taken for all of them before the next, which the compiler turns into vector
/// instructions, and the long chain of one pipe does not wait for itself.
#[inline(always)]
fn colebrook<const N: usize>(re: [f64; N], a: [f64; N]) -> ([f64; N], [f64; N]) {
    use std::array::from_fn;
    let re: [f64; N] = from_fn(|n| re[n] * (1.0 / (2.51 * TWO_OVER_LN10)));
    // First guess (Praks & Brkić), good to 1e-4; rough logarithms will do
    let z: [f64; N] = from_fn(|n| a[n] + logarithm::rough(re[n]));
    let ln_z: [f64; N] = from_fn(|n| logarithm::rough(z[n]));
    let w: [f64; N] = from_fn(|n| z[n] - ln_z[n] + ln_z[n] / (z[n] - 0.5588 * ln_z[n] + 1.2079));
    // l = B - ln w, and the residual r = z - w - ln w of the guess
    let l: [f64; N] = logarithm::exact(from_fn(|n| re[n] / w[n]));
    // Fritsch, Shafer & Crowley's fourth-order step w <- w (1 + d), expanded for small r:
    // d = e (1 + x + 2 x2), e = r/(1+w), x = e / (2 (1+w) (1 + 2 e/3))
    let i: [f64; N] = from_fn(|n| 1.0 / (1.0 + w[n]));
    let e: [f64; N] = from_fn(|n| (a[n] + l[n] - w[n]) * i[n]);
    let x: [f64; N] = from_fn(|n| 0.5 * e[n] * i[n] * (1.0 - (2.0 / 3.0) * e[n]));
    let d: [f64; N] = from_fn(|n| e[n] * (1.0 + x[n] + 2.0 * x[n] * x[n]));
    // u = l - ln(1+d), free of the cancellation in w - A
    let u: [f64; N] =
        from_fn(|n| l[n] - d[n] * (1.0 - d[n] * (0.5 - d[n] * (1.0 / 3.0 - 0.25 * d[n]))));
    // 1/(1+w) at the corrected w is i (1 - c + c2 ..), c = i w d
    let c: [f64; N] = from_fn(|n| i[n] * w[n] * d[n]);
    (
        from_fn(|n| 1.0 / (TWO_OVER_LN10 * u[n])),
        from_fn(|n| 1.0 - i[n] * (1.0 - c[n] * (1.0 - c[n]))),
    )
}

/// Pipes evaluated side by side: two vector registers of every x86-64 processor.
const LANES: usize = 4;

/// `f64::max` without its rules for NaN, which cost instructions.
#[inline(always)]
fn at_least(x: f64, limit: f64) -> f64 {
    if x > limit { x } else { limit }
}

/// Many pipes' Darcy–Weisbach laws, evaluated together: the same figures as one by one, in a fraction of the time, because
/// the long chain of each evaluation then runs beside others.
#[derive(Clone, Debug, Default)]
pub struct DarcyWeisbachBatch {
    laws: Vec<DarcyWeisbach>,
    reynolds_per_flow: Vec<f64>,
    rough_per_flow: Vec<f64>,
    root_f: Vec<f64>,
    share: Vec<f64>,
}

impl DarcyWeisbachBatch {
    /// Adds a pipe; the laws keep the order in which they were added.
    pub fn push(&mut self, law: DarcyWeisbach) {
        self.laws.push(law);
        self.reynolds_per_flow.push(law.reynolds_per_flow);
        self.rough_per_flow.push(law.rough_per_flow);
        self.root_f.push(0.0);
        self.share.push(0.0);
    }

    /// Gives pipe `i` another law.
    pub fn replace(&mut self, i: usize, law: DarcyWeisbach) {
        self.laws[i] = law;
        self.reynolds_per_flow[i] = law.reynolds_per_flow;
        self.rough_per_flow[i] = law.rough_per_flow;
    }

    /// Number of pipes.
    pub fn len(&self) -> usize {
        self.laws.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.laws.is_empty()
    }

    /// One pipe's law.
    pub fn law(&self, i: usize) -> &DarcyWeisbach {
        &self.laws[i]
    }

    /// Works the friction factors of all pipes out for `flows`, one per pipe, m3/s; read them with [`Self::loss`].
    pub fn evaluate(&mut self, flows: &[f64]) {
        let n = self.laws.len();
        let whole = n - n % LANES;
        for start in (0..whole).step_by(LANES) {
            let at = |lane: usize| start + lane;
            let (root_f, share) = self.lanes(flows, at);
            self.root_f[start..start + LANES].copy_from_slice(&root_f);
            self.share[start..start + LANES].copy_from_slice(&share);
        }
        if whole < n {
            // The last pipe stands in for those that would fill the lanes up.
            let (root_f, share) = self.lanes(flows, |lane| (whole + lane).min(n - 1));
            self.root_f[whole..].copy_from_slice(&root_f[..n - whole]);
            self.share[whole..].copy_from_slice(&share[..n - whole]);
        }
    }

    #[inline(always)]
    fn lanes(&self, flows: &[f64], at: impl Fn(usize) -> usize) -> ([f64; LANES], [f64; LANES]) {
        // Slower flows are laminar or blended and do not use the result.
        let re = std::array::from_fn(|lane| {
            let i = at(lane);
            at_least(self.reynolds_per_flow[i] * flows[i].abs(), TURBULENT_START)
        });
        let a = std::array::from_fn(|lane| self.rough_per_flow[at(lane)] * flows[at(lane)].abs());
        colebrook(re, a)
    }

    /// The loss of pipe `i` at the flow `q` last given to [`Self::evaluate`].
    #[inline]
    pub fn loss(&self, i: usize, q: f64) -> HeadLoss {
        let law = &self.laws[i];
        law.loss_with(q, |flow| law.darcy(flow, self.root_f[i], self.share[i]))
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
    fn a_batch_gives_the_figures_of_each_alone() {
        let mut batch = DarcyWeisbachBatch::default();
        let mut flows = Vec::new();
        for i in 0..37 {
            let bore = 0.02 * (1.0 + i as f64);
            let Friction::DarcyWeisbach(law) = Friction::roughness(10.0, bore, 1e-4, NU, G) else {
                unreachable!()
            };
            batch.push(law);
            flows.push(10f64.powf(-9.0 + 0.23 * i as f64) * if i % 2 == 0 { 1.0 } else { -1.0 });
        }
        batch.evaluate(&flows);
        for (i, &q) in flows.iter().enumerate() {
            assert_eq!(batch.loss(i, q), batch.law(i).loss(q));
        }
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

//! A model's curves as one pump has them: at its speed, trim and wear, in its liquid.

use super::viscous::{Correction, ViscousBasis};
use super::{PowerCurve, PumpLaw, PumpModel};
use crate::part::curve::{Curve, CurvePoint};
use crate::part::{HeadLaw, HeadLoss};

/// How a model's curves carry over to another speed, impeller and liquid, beyond the plain affinity laws.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Scaling {
    /// Correction of the water curves for a viscous liquid; none: the curves hold for the liquid as it is.
    pub viscous: Option<ViscousBasis>,
    /// Best efficiency, a ratio, where efficiency changes with speed; none: it does not.
    pub best_efficiency: Option<f64>,
    /// Power of the impeller's diameter with which flow changes on trimming; head goes with its square always.
    pub trim_exponent: f64,
}

impl Default for Scaling {
    /// The plain affinity laws.
    fn default() -> Self {
        Self {
            viscous: None,
            best_efficiency: None,
            trim_exponent: 1.0,
        }
    }
}

/// How a pump as built differs from the sheet of its model: factors on its head, flow and efficiency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AsBuilt {
    /// Head over that of the sheet, above zero.
    pub head: f64,
    /// Flow over that of the sheet, above zero.
    pub flow: f64,
    /// Efficiency over that of the sheet, above zero.
    pub efficiency: f64,
}

impl AsBuilt {
    /// As its sheet says.
    pub const AS_SHEET: Self = Self {
        head: 1.0,
        flow: 1.0,
        efficiency: 1.0,
    };

    /// Shaft power over that of the sheet.
    pub fn power(&self) -> f64 {
        self.head * self.flow / self.efficiency
    }
}

/// How one pump is run and in what state it is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Condition {
    /// Speed over its model's speed, above zero.
    pub speed: f64,
    /// Impeller over the model's full impeller, above zero.
    pub trim: f64,
    /// Share of the head lost to wear, 0 to below 1.
    pub wear: f64,
    /// Flow that runs back inside at best efficiency, over best-efficiency flow, 0 to below 1.
    pub leakage: f64,
    /// How it was built.
    pub built: AsBuilt,
}

/// A running pump: what it does as a function of the flow it delivers.
///
/// With speed ratio n, trim ratio t, s = n t, the model's curves H, E, P, N over its flow x, F = n t^m (m = 1 unless the model
/// says otherwise) and the factors C of a viscous liquid:
///
/// flow inside F C_Q x;  head h = (1 - wear) s2 C_H H(x);  shaft power F s2 P(x) C_Q C_H / (C_eta k);
/// NPSH required s2 C_NPSH N(x);  flow delivered q = F C_Q x - leak, leak = l Q_bep sqrt(h / H_bep).
///
/// A pump as built has f h for h, k F for F and e E for E, and so f k / e times the power.
///
/// k = (1 - (1 - E_bep) n^-0.1) / E_bep where the model's efficiency changes with speed, else 1. So efficiency at best efficiency
/// goes as 1 - (1 - E_bep) (1/n)^0.1, and at other flows by the same factor, which keeps it zero at no flow.
///
/// Guarantee: as a [`HeadLaw`] finite, value and slope from one evaluation, slope continuous, never falling where H never rises.
/// Past the end of the model's curve and below no flow h goes straight on. Nothing is allocated; the factors are found
/// once, when it is made.
///
/// # Source
/// Affinity laws: any text on turbomachinery, e.g. Y. A. Çengel, J. M. Cimbala, Fluid Mechanics, section 14-3. Viscous liquids:
/// [`super::viscous`]. Efficiency and speed: I. Sarbu, I. Borza, "Energetic optimization of water pumping in distribution
/// systems", Periodica Polytechnica Mechanical Engineering 42, 1998 (from memory). Leakage past worn rings as through an
/// orifice under the pump's head: common practice, no source.
#[derive(Clone, Copy, Debug)]
pub struct Performance<'a> {
    model: &'a PumpModel,
    plain: PumpLaw<'a>,
    /// s.
    ratio: f64,
    /// (1 - wear) e.
    kept: f64,
    /// f k / e.
    built_power: f64,
    /// None: the plain law is all.
    altered: Option<Altered>,
}

/// What goes beyond the plain law.
#[derive(Clone, Copy, Debug)]
struct Altered {
    /// F C_Q.
    flow: f64,
    /// F s2.
    power: f64,
    correction: Correction,
    /// The model's flow at best efficiency, m3/s.
    best_flow: f64,
    /// k.
    efficiency: f64,
    /// The model's flow past which head goes straight on, m3/s.
    straight_from: f64,
    /// l Q_bep / sqrt(H_bep), m3/s per root of m; 0 without leakage.
    leak: f64,
    /// Head below which the root in the leakage is rounded off, m.
    rounded_below: f64,
}

impl<'a> Performance<'a> {
    /// Of a model under a condition, in a liquid of that kinematic viscosity (m2/s).
    pub fn new(model: &'a PumpModel, condition: Condition, viscosity: f64) -> Self {
        let Condition {
            speed,
            trim,
            wear,
            leakage,
            built,
        } = condition;
        let ratio = speed * trim;
        // f (1-w) s2 H(q/(k s)) is the plain law at ratio k s with 1 - w' = (1-w) f/k2
        let plain = PumpLaw {
            head: &model.head,
            ratio: ratio * built.flow,
            wear: match built == AsBuilt::AS_SHEET {
                true => wear,
                false => 1.0 - (1.0 - wear) * built.head / (built.flow * built.flow),
            },
        };
        let scaling = &model.scaling;
        let by_trim = trim != 1.0 && scaling.trim_exponent != 1.0;
        // F = n t^m
        let flow = match by_trim {
            true => speed * trim.powf(scaling.trim_exponent),
            false => ratio,
        };
        let correction = scaling.viscous.map_or(Correction::NONE, |basis| {
            basis.correction(viscosity, speed, flow, ratio * ratio)
        });
        let leakage = model.best_efficiency_flow.map_or(0.0, |_| leakage);
        let thick = correction.b > 1.0;
        let by_speed = scaling.best_efficiency.filter(|_| speed != 1.0);
        let altered = thick || leakage > 0.0 || by_speed.is_some() || by_trim;
        let altered = altered.then(|| {
            let best_flow = model.best_efficiency_flow.unwrap_or(model.end_of_curve());
            let best_head = model.head.at(best_flow).value.max(f64::MIN_POSITIVE);
            // k = (1 - (1 - E) n^-0.1) / E
            let efficiency = by_speed.map_or(1.0, |best| {
                ((1.0 - (1.0 - best) * speed.powf(-0.1)) / best).max(0.0)
            });
            Altered {
                flow: flow * built.flow * correction.flow,
                power: flow * ratio * ratio * built.power(),
                correction,
                best_flow,
                efficiency,
                straight_from: straight_from(model, &correction, best_flow),
                leak: leakage * best_flow / best_head.sqrt(),
                rounded_below: 0.01 * ratio * ratio * best_head,
            }
        });
        Self {
            model,
            plain,
            ratio,
            kept: (1.0 - wear) * built.efficiency,
            built_power: built.power(),
            altered,
        }
    }

    /// The same with another head curve in place of the model's: a falling stand-in for a drooping one.
    pub fn with_head(mut self, head: &'a Curve) -> Self {
        self.plain.head = head;
        self
    }

    /// The factors of the liquid, where it changes anything.
    pub fn correction(&self) -> Option<&Correction> {
        let altered = self.altered.as_ref()?;
        (altered.correction.b > 1.0).then_some(&altered.correction)
    }

    /// Head it adds at flow `q` (m3/s), m.
    pub fn head(&self, q: f64) -> f64 {
        -self.loss(q).head
    }

    /// The flow x (m3/s) of the model's curves at which it runs when it delivers `q`.
    pub fn on_curve(&self, q: f64) -> f64 {
        match &self.altered {
            None => q / self.plain.ratio,
            Some(altered) => self.inside(altered, q).0,
        }
    }

    /// The flow (m3/s) it delivers where it runs at flow `x` of the model's curves.
    pub fn delivered(&self, x: f64) -> f64 {
        match &self.altered {
            None => self.plain.ratio * x,
            Some(altered) => altered.flow * x - altered.leak_at(self.head_over(altered, x)).value,
        }
    }

    /// Shaft power (W) at flow `q` with liquid of `density` (kg/m3); none as in [`PumpModel::shaft_power`], or where
    /// no efficiency is left.
    pub fn shaft_power(&self, q: f64, density: f64, gravity: f64) -> Option<f64> {
        let x = self.on_curve(q);
        let power = self.model.shaft_power(x, density, gravity)?;
        let Some(altered) = &self.altered else {
            return Some(self.ratio.powi(3) * self.built_power * power);
        };
        let correction = &altered.correction;
        let head = correction.head_at(altered.share(x)).value;
        let kept = correction.efficiency * altered.efficiency;
        // F s2 P C_Q C_H / (C_eta k)
        (kept > 0.0).then(|| altered.power * power * correction.flow * head / kept)
    }

    /// Efficiency at flow `q`: from its own column, or as hydraulic over shaft power.
    pub fn efficiency(&self, q: f64, density: f64, gravity: f64) -> Option<f64> {
        let efficiency = match (&self.model.power, &self.altered) {
            (PowerCurve::Unknown, _) => return None,
            (PowerCurve::Efficiency(curve), None) => {
                self.kept * curve.at(q / self.plain.ratio).value
            }
            _ => {
                let power = self.shaft_power(q, density, gravity);
                density * gravity * q * self.head(q) / power.filter(|power| *power > 0.0)?
            }
        };
        let by_power = matches!(self.model.power, PowerCurve::Shaft(_));
        (by_power || efficiency >= 0.0).then_some(efficiency)
    }

    /// NPSH required at flow `q`, m.
    pub fn npsh_required(&self, q: f64) -> Option<f64> {
        let curve = self.model.npsh_required.as_ref()?;
        let s = self.ratio;
        let required = s * s * curve.at(self.on_curve(q)).value;
        Some(
            self.altered
                .map_or(required, |altered| altered.correction.npsh * required),
        )
    }

    /// The model's flow x and head h at delivered flow `q`.
    fn inside(&self, altered: &Altered, q: f64) -> (f64, CurvePoint) {
        let first = q / altered.flow;
        let head = self.head_over(altered, first);
        if altered.leak == 0.0 {
            return (first, head);
        }
        // The root of g(x) = F C_Q x - leak(h(x)) - q lies between the flow without leakage and the one with the leakage
        // of the head there, since h falls; Newton, halving where a step leaves the bracket.
        let second = (q + altered.leak_at(head).value) / altered.flow;
        let (mut low, mut high) = (first.min(second), first.max(second));
        let mut x = second;
        let mut head = self.head_over(altered, x);
        for _ in 0..60 {
            let leak = altered.leak_at(head);
            let g = altered.flow * x - leak.value - q;
            if g > 0.0 {
                high = high.min(x);
            } else {
                low = low.max(x);
            }
            // dg/dx = F C_Q - leak'(h) h'(x)
            let newton = x - g / (altered.flow - leak.slope * head.slope);
            let next = match newton >= low && newton <= high {
                true => newton,
                false => 0.5 * (low + high),
            };
            let step = (next - x).abs();
            x = next;
            head = self.head_over(altered, x);
            if step <= 4.0 * f64::EPSILON * (x.abs() + 1e-3 * altered.best_flow) {
                break;
            }
        }
        (x, head)
    }

    /// h = (1 - wear) s2 C_H(x/Q_bep) H(x) over the model's flow x, straight below no flow and past its end.
    fn head_over(&self, altered: &Altered, x: f64) -> CurvePoint {
        let within = x.min(altered.straight_from);
        let within = if altered.correction.b > 1.0 {
            within.max(0.0)
        } else {
            x
        };
        let curve = self.plain.head.at(within);
        let factor = altered.correction.head_at(altered.share(within));
        let kept = (1.0 - self.plain.wear) * self.plain.ratio * self.plain.ratio;
        // h' = (1 - wear) s2 (C_H H' + C_H' H / Q_bep)
        let slope =
            kept * (factor.value * curve.slope + factor.slope / altered.best_flow * curve.value);
        CurvePoint {
            value: kept * factor.value * curve.value + slope * (x - within),
            slope,
        }
    }
}

impl HeadLaw for Performance<'_> {
    #[inline]
    fn loss(&self, q: f64) -> HeadLoss {
        let Some(altered) = &self.altered else {
            return self.plain.loss(q);
        };
        let (_, head) = self.inside(altered, q);
        // q = F C_Q x - leak(h(x)),  dh/dq = h'(x) / (F C_Q - leak'(h) h'(x))
        let flow_slope = altered.flow - altered.leak_at(head).slope * head.slope;
        HeadLoss {
            head: -head.value,
            slope: -head.slope / flow_slope,
        }
    }
}

impl Altered {
    /// Share of best-efficiency flow within the reach of the head factor.
    fn share(&self, x: f64) -> f64 {
        x.clamp(0.0, self.straight_from) / self.best_flow
    }

    /// Leakage (m3/s) at head h, and its slope by h: l Q_bep sqrt(h / H_bep), the other way below zero.
    ///
    /// Near no head the root is rounded off, r (1.25 t - 0.25 t3) with t = h/h0, r = sqrt(h0): its infinite slope would
    /// make the law level there.
    fn leak_at(&self, head: CurvePoint) -> CurvePoint {
        let (h, h0) = (head.value, self.rounded_below);
        if h.abs() < h0 {
            let (t, root) = (h / h0, h0.sqrt());
            CurvePoint {
                value: self.leak * root * t * (1.25 - 0.25 * t * t),
                slope: self.leak * root * (1.25 - 0.75 * t * t) / h0,
            }
        } else {
            let root = h.abs().sqrt();
            CurvePoint {
                value: self.leak * root.copysign(h),
                slope: 0.5 * self.leak / root,
            }
        }
    }
}

/// The model's flow past which a viscous pump's head goes straight on: the end of the curve, or before it the flow at which
/// either the model's head or the factor on it is gone. Their product would rise where both are below zero.
fn straight_from(model: &PumpModel, correction: &Correction, best_flow: f64) -> f64 {
    if correction.b <= 1.0 {
        return f64::INFINITY;
    }
    let mut end = model
        .end_of_curve()
        .min(best_flow * correction.no_head_from());
    if model.head.at(end).value < 0.0 {
        let mut low = 0.0;
        for _ in 0..60 {
            let middle = 0.5 * (low + end);
            match model.head.at(middle).value < 0.0 {
                true => end = middle,
                false => low = middle,
            }
        }
    }
    end
}

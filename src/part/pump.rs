//! Centrifugal pumps: a model's curves, and what they become at another speed, trim and wear.

pub mod performance;
pub mod viscous;

use super::curve::{Cover, Curve, CurvePoint};
use super::quadratic::QuadraticLoss;
use super::{HeadLaw, HeadLoss};

/// A pump model: the curves of its data sheet at its own speed and full impeller.
#[derive(Clone, Debug, PartialEq)]
pub struct PumpModel {
    /// The user's name for it.
    pub name: String,
    /// Speed of the curves, revolutions per second.
    pub speed: Option<f64>,
    /// Full impeller diameter, m.
    pub impeller: Option<f64>,
    /// Head over flow, m.
    pub head: Curve,
    /// How shaft power follows from flow.
    pub power: PowerCurve,
    /// NPSH required over flow, m.
    pub npsh_required: Option<Curve>,
    /// Flow at best efficiency, m3/s.
    pub best_efficiency_flow: Option<f64>,
    /// The motor.
    pub motor: Option<Motor>,
    /// Efficiency of a variable-speed drive over the speed ratio; none: no drive.
    pub drive: Option<Efficiency>,
    /// How the curves carry over to other speeds, impellers and liquids.
    pub scaling: performance::Scaling,
    /// Limits that the maker states.
    pub maker: MakerLimits,
}

/// What a pump's maker states of its limits; none: not stated.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct MakerLimits {
    /// Minimum continuous flow at the model's speed, m3/s.
    pub minimum_flow: Option<f64>,
    /// Preferred region, as shares of best-efficiency flow.
    pub preferred: Option<(f64, f64)>,
    /// Allowable region, as shares of best-efficiency flow.
    pub allowable: Option<(f64, f64)>,
    /// Largest gauge pressure that the casing bears, Pa.
    pub casing_pressure: Option<f64>,
    /// Volume of liquid in the casing, m3.
    pub casing_volume: Option<f64>,
}

/// What the data sheet gives for power.
#[derive(Clone, Debug, PartialEq)]
pub enum PowerCurve {
    /// Neither power nor efficiency.
    Unknown,
    /// Efficiency over flow, as a ratio.
    Efficiency(Curve),
    /// Shaft power over flow for 1000 kg/m3, W.
    Shaft(Curve),
}

/// A motor.
#[derive(Clone, Debug, PartialEq)]
pub struct Motor {
    /// Rated shaft power, W.
    pub rated: f64,
    /// Efficiency over load (shaft power over rated); one that is not given is not assumed to be 1.
    pub efficiency: Option<Efficiency>,
}

/// An efficiency that may depend on a ratio: a motor's on its load, a drive's on the speed.
#[derive(Clone, Debug, PartialEq)]
pub enum Efficiency {
    /// Always the same, above 0, at most 1.
    Fixed(f64),
    /// Over the ratio, above 0 and at most 1; held at its ends.
    Over(Curve),
}

impl Efficiency {
    /// The efficiency at a ratio.
    pub fn at(&self, ratio: f64) -> f64 {
        match self {
            Self::Fixed(value) => *value,
            Self::Over(curve) => {
                let (low, high) = curve.domain();
                curve.at(ratio.clamp(low, high)).value
            }
        }
    }
}

/// Density for which data sheets state shaft power, kg/m3.
pub(super) const DATA_SHEET_DENSITY: f64 = 1000.0;

impl PumpModel {
    /// Head at no flow, m.
    pub fn shutoff_head(&self) -> f64 {
        self.head.at(0.0).value
    }

    /// Last flow of the head curve, m3/s.
    pub fn end_of_curve(&self) -> f64 {
        self.head.domain().1
    }

    /// First flow of the head curve, m3/s.
    pub fn start_of_curve(&self) -> f64 {
        self.head.domain().0
    }

    /// Electrical power (W) behind a shaft power (W) at a speed ratio: shaft over motor and drive efficiency. None where the
    /// motor's is not known.
    pub fn electrical_power(&self, shaft: f64, speed: f64) -> Option<f64> {
        let motor = self.motor.as_ref()?;
        let of_motor = motor.efficiency.as_ref()?.at(shaft / motor.rated);
        let of_drive = self.drive.as_ref().map_or(1.0, |drive| drive.at(speed));
        (of_motor > 0.0 && of_drive > 0.0).then(|| shaft / (of_motor * of_drive))
    }

    /// Shaft power (W) at the model's speed, unworn, with liquid of `density` (kg/m3).
    ///
    /// P = rho g q H / E; at no flow its limit rho g H(0) / E'(0). None where the sheet gives no power or the
    /// efficiency is not above zero at a flow where it has to be.
    pub fn shaft_power(&self, q: f64, density: f64, gravity: f64) -> Option<f64> {
        match &self.power {
            PowerCurve::Unknown => None,
            PowerCurve::Shaft(curve) => Some(curve.at(q).value * density / DATA_SHEET_DENSITY),
            PowerCurve::Efficiency(curve) => {
                let efficiency = curve.at(q);
                // As q -> 0 with E(0) = 0, q/E -> 1/E'(0).
                let flow_over_efficiency =
                    if q.abs() < 1e-9 * self.end_of_curve() && efficiency.value.abs() < 1e-9 {
                        (efficiency.slope > 0.0).then(|| 1.0 / efficiency.slope)
                    } else {
                        (efficiency.value > 0.0).then(|| q / efficiency.value)
                    };
                Some(density * gravity * self.head.at(q).value * flow_over_efficiency?)
            }
        }
    }
}

/// The head a pump adds at its speed, trim and wear, as a loss: `h(q) = -(1 - wear) s2 H(q/s)`.
///
/// s is the speed ratio times the trim ratio, above zero.
///
/// # Source
/// Affinity laws: any text on turbomachinery, e.g. Y. A. Çengel, J. M. Cimbala, Fluid Mechanics, section 14-3. Wear as
/// head lost at unchanged shaft power: common practice, no source.
#[derive(Clone, Copy, Debug)]
pub struct PumpLaw<'a> {
    /// The model's head curve.
    pub head: &'a Curve,
    /// Speed ratio times trim ratio.
    pub ratio: f64,
    /// Share of the head lost to wear, below 1; negative for a head above the curve.
    pub wear: f64,
}

impl HeadLaw for PumpLaw<'_> {
    #[inline]
    fn loss(&self, q: f64) -> HeadLoss {
        let s = self.ratio;
        let CurvePoint { value, slope } = self.head.at(q / s);
        // h = -(1-w) s2 H(q/s),  dh/dq = -(1-w) s H'(q/s)
        let kept = (1.0 - self.wear) * s;
        HeadLoss {
            head: -kept * s * value,
            slope: -kept * slope,
        }
    }
}

/// A pump in its line: what does not change while the network stands.
#[derive(Clone, Debug, PartialEq)]
pub struct Pump {
    /// The user's name for it.
    pub name: String,
    /// Position of its model among the network's models.
    pub model: usize,
    /// Elevation of its inlet, m.
    pub elevation: f64,
    /// Whether the file gave that elevation, or it was taken from the line's first node.
    pub elevation_given: bool,
    /// Loss of the standing pump, where water can pass it when stopped.
    pub when_stopped: Option<QuadraticLoss>,
}

/// The falling stand-ins of a drooping head curve; see [`Curve::falling_cover`].
#[derive(Clone, Debug, PartialEq)]
pub struct Covers {
    upper: Curve,
    lower: Curve,
}

impl Covers {
    /// For a drooping curve; none where the curve falls throughout.
    pub fn of(curve: &Curve) -> Option<Self> {
        (!curve.rising_stretches().is_empty()).then(|| Self {
            upper: curve.falling_cover(Cover::Upper),
            lower: curve.falling_cover(Cover::Lower),
        })
    }

    /// One of the two.
    pub fn get(&self, cover: Cover) -> &Curve {
        match cover {
            Cover::Upper => &self.upper,
            Cover::Lower => &self.lower,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// 10 kW at the shaft, motor 20 kW: half load, 90 %; drive 96 % at 80 % speed. Invented.
    #[test]
    fn losses_of_motor_and_drive_multiply() {
        let over = |x: &[f64], y: &[f64]| Some(Efficiency::Over(Curve::through(x, y).unwrap()));
        let model = PumpModel {
            name: String::new(),
            speed: None,
            impeller: None,
            head: Curve::through(&[0.0, 1.0], &[10.0, 5.0]).unwrap(),
            power: PowerCurve::Unknown,
            npsh_required: None,
            best_efficiency_flow: None,
            motor: Some(Motor {
                rated: 20e3,
                efficiency: over(&[0.25, 0.5, 1.0], &[0.8, 0.9, 0.92]),
            }),
            drive: over(&[0.6, 0.8, 1.0], &[0.93, 0.96, 0.97]),
            maker: MakerLimits::default(),
            scaling: performance::Scaling::default(),
        };
        let power = model.electrical_power(10e3, 0.8).unwrap();
        assert!((power - 10e3 / (0.9 * 0.96)).abs() < 1e-9);
        // held at its ends
        let power = model.electrical_power(1e3, 1.2).unwrap();
        assert!((power - 1e3 / (0.8 * 0.97)).abs() < 1e-9);
    }
}

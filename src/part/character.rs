//! What the curves of a pump model say of its character: specific speed, rise to shut-off, and where it hunts.

use super::pump::{DATA_SHEET_DENSITY, PowerCurve, PumpModel};
use crate::fluid::STANDARD_GRAVITY;

/// Specific speed in US units (rpm, gpm, ft) for 1 in metric ones (rpm, m3/s, m).
///
/// # Source
/// Follows from the units: sqrt(15 850.32 gpm per m3/s) / (3.280 84 ft per m)^0.75.
pub const US_SPECIFIC_SPEED: f64 = 51.645_237_87;

impl PumpModel {
    /// Efficiency at the model's speed, unworn: its own column, or as hydraulic over shaft power, both for the density of data
    /// sheets. None where it cannot be told.
    pub fn efficiency(&self, q: f64) -> Option<f64> {
        match &self.power {
            PowerCurve::Unknown => None,
            PowerCurve::Efficiency(curve) => Some(curve.at(q).value),
            PowerCurve::Shaft(curve) => {
                let hydraulic = DATA_SHEET_DENSITY * STANDARD_GRAVITY * q * self.head.at(q).value;
                Some(curve.at(q).value)
                    .filter(|shaft| *shaft > 0.0)
                    .map(|shaft| hydraulic / shaft)
            }
        }
    }

    /// Specific speed at best efficiency, in rpm, m3/s and m; for one stage and one eye.
    ///
    /// n_q = n sqrt(Q) / H^0.75
    ///
    /// None where the model has no speed or no best efficiency.
    pub fn specific_speed(&self) -> Option<f64> {
        let q = self.best_efficiency_flow?;
        specific(self.speed? * 60.0, q, self.head.at(q).value)
    }

    /// Suction specific speed at best efficiency: [`Self::specific_speed`] with NPSH required in place of the head.
    pub fn suction_specific_speed(&self) -> Option<f64> {
        let q = self.best_efficiency_flow?;
        let required = self.npsh_required.as_ref()?.at(q).value;
        specific(self.speed? * 60.0, q, required)
    }

    /// How far the head rises from best efficiency to shut-off, as a share of that at best efficiency.
    pub fn rise_to_shutoff(&self) -> Option<f64> {
        let at_best = self.head.at(self.best_efficiency_flow?).value;
        (at_best > 0.0).then(|| self.shutoff_head() / at_best - 1.0)
    }

    /// Flow below which a drooping head curve gives the same head at two flows, m3/s: where the head has fallen back to that at
    /// shut-off. Pumps side by side hunt in that range. None for a curve that does not droop.
    pub fn hunts_below(&self) -> Option<f64> {
        let shutoff = self.shutoff_head();
        let (_, peak) = *self.head.rising_stretches().last()?;
        let (mut low, mut high) = (peak, self.end_of_curve());
        if self.head.at(low).value <= shutoff {
            return None;
        }
        if self.head.at(high).value >= shutoff {
            return Some(high);
        }
        // The head falls from the peak on: sixty halvings leave nothing but rounding.
        for _ in 0..60 {
            let middle = 0.5 * (low + high);
            if self.head.at(middle).value > shutoff {
                low = middle;
            } else {
                high = middle;
            }
        }
        Some(high)
    }
}

fn specific(rpm: f64, q: f64, head: f64) -> Option<f64> {
    (head > 0.0).then(|| rpm * q.sqrt() / head.powf(0.75))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn specific_speed_of_published_examples() {
        // centrifugalpump.org, specific-speed page: 1780 rpm, 95 000 gpm, 1500 ft give 2276 (US).
        let (gpm, ft) = (0.003_785_411_784 / 60.0, 0.3048);
        let us = |rpm, q, h| US_SPECIFIC_SPEED * specific(rpm, q * gpm, h * ft).unwrap();
        assert!((us(1780.0, 95_000.0, 1500.0) - 2276.0).abs() < 0.6);
        // curioustab.com, exercises 70459 and 70523: 1450 rpm, 44 m3/s, 36 m give 654; 1440 rpm, 0.464 m3/s, 75 m give 38.
        assert!((specific(1450.0, 44.0, 36.0).unwrap() - 654.0).abs() < 0.6);
        assert!((specific(1440.0, 0.464, 75.0).unwrap() - 38.0).abs() < 0.6);
        // suction: 1180 rpm, 4500 gpm, NPSH required 15 ft (hydrauliclearning.com exercise data; answer computed)
        assert!((us(1180.0, 4500.0, 15.0) - 10_385.3).abs() < 0.1);
    }
}

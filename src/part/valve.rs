//! Valves: a fully open loss, and how it grows as the valve closes.

use super::quadratic::QuadraticLoss;

/// How a valve's flow coefficient falls from fully open to shut.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Characteristic {
    /// Kv(o) = Kv o.
    #[default]
    Linear,
    /// Kv(o) = Kv 50^(o - 1): equal steps of opening change the flow by equal percentages; inherent rangeability 50.
    EqualPercentage,
}

/// A valve: its loss when fully open and its inherent characteristic.
///
/// # Source
/// IEC 60534-1 and IEC 60534-2-4, inherent flow characteristics (linear and equal percentage).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Valve {
    /// Loss when fully open.
    pub fully_open: QuadraticLoss,
    /// Inherent characteristic.
    pub characteristic: Characteristic,
}

/// Inherent rangeability of the equal-percentage form.
const RANGEABILITY: f64 = 50.0;

impl Valve {
    /// Flow coefficient Kv: flow `kv` (m3/s) at 1 bar with water of 1000 kg/m3; h = 1 bar/(1000 g) (q/Kv)2.
    ///
    /// # Source
    /// IEC 60534-2-1, definition of the flow coefficient Kv.
    pub fn kv(kv: f64, gravity: f64) -> QuadraticLoss {
        QuadraticLoss::at(1e5 / (1000.0 * gravity), kv)
    }

    /// Flow coefficient Cv: flow `cv` (m3/s) at 1 psi with water of 1000 kg/m3; h = 1 psi/(1000 g) (q/Cv)2.
    ///
    /// # Source
    /// IEC 60534-2-1, definition of the flow coefficient Cv.
    pub fn cv(cv: f64, gravity: f64) -> QuadraticLoss {
        const PSI: f64 = 0.45359237 * 9.80665 / (0.0254 * 0.0254);
        QuadraticLoss::at(PSI / (1000.0 * gravity), cv)
    }

    /// The loss at `opening` (0 to 1), or none when that is shut: a valve at 0 is shut, whatever its characteristic.
    pub fn loss_at(&self, opening: f64) -> Option<QuadraticLoss> {
        if opening <= 0.0 {
            return None;
        }
        // h = r (q / share)2 with share = Kv(o)/Kv
        let share = match self.characteristic {
            Characteristic::Linear => opening,
            Characteristic::EqualPercentage => RANGEABILITY.powf(opening - 1.0),
        };
        // Openings so small that the loss would not be finite are shut.
        let r = self.fully_open.r() / (share * share);
        r.is_finite().then(|| QuadraticLoss::new(r))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::part::HeadLaw;

    #[test]
    fn one_bar_at_kv_and_one_psi_at_cv() {
        let g = 9.80665;
        let kv = 40.0 / 3600.0;
        assert!((Valve::kv(kv, g).loss(kv).head - 10.197162129779).abs() < 1e-9);
        let cv = 46.0 * 231.0 * 0.0254_f64.powi(3) / 60.0;
        assert!((Valve::cv(cv, g).loss(cv).head - 0.70306957964).abs() < 1e-9);
    }

    #[test]
    fn half_open_valves_lose_four_and_fifty_times() {
        let fully_open = QuadraticLoss::new(100.0);
        let r = |characteristic, opening| {
            Valve {
                fully_open,
                characteristic,
            }
            .loss_at(opening)
            .map(QuadraticLoss::r)
        };
        assert_eq!(r(Characteristic::Linear, 0.5), Some(400.0));
        let half = r(Characteristic::EqualPercentage, 0.5).unwrap();
        assert!((half - 5000.0).abs() < 1e-9);
        assert_eq!(r(Characteristic::Linear, 0.0), None);
        assert_eq!(r(Characteristic::EqualPercentage, 0.0), None);
        assert_eq!(r(Characteristic::EqualPercentage, 1.0), Some(100.0));
    }
}

//! The limits of one pump or motor: the maker's where they are stated, else those of the system.

use super::{LimitName, Network};
use crate::part::PumpId;

impl Network {
    /// Minimum continuous flow of a pump at its model's speed, m3/s; none where it cannot be told.
    pub fn minimum_flow(&self, pump: PumpId) -> Option<f64> {
        let model = self.model(pump);
        model.maker.minimum_flow.or_else(|| {
            Some(model.best_efficiency_flow? * self.limits().value(LimitName::MinimumFlow)?)
        })
    }

    /// Least and largest preferred flow of a pump at its model's speed, m3/s.
    pub fn preferred_region(&self, pump: PumpId) -> Option<(f64, f64)> {
        let model = self.model(pump);
        let bep = model.best_efficiency_flow?;
        let (low, high) = match model.maker.preferred {
            Some(region) => region,
            None => (
                self.limits().value(LimitName::PreferredLow)?,
                self.limits().value(LimitName::PreferredHigh)?,
            ),
        };
        Some((low * bep, high * bep))
    }
}

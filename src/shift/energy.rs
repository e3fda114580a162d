//! Electricity: from shaft power to what the meter counts, and what that costs.

use super::schedule::Daily;
use crate::network::{Network, Settings};
use crate::part::PumpId;

/// Shaft power of a running pump at flow `q` (m3/s) in its line, W; 0 when it stands.
pub(super) fn shaft_power(
    network: &Network,
    settings: &Settings,
    id: PumpId,
    q: f64,
) -> Option<f64> {
    if !settings.pump(id).running {
        return Some(0.0);
    }
    let performance = network.performance(id, settings);
    performance.shaft_power(q, network.fluid().density, network.gravity())
}

/// What electricity costs.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Tariff {
    /// Per J outside all windows.
    pub rate: f64,
    /// Other rates in parts of the day; the first that fits counts.
    pub windows: Vec<TariffWindow>,
    /// Per W of the highest mean power over 15 minutes.
    pub demand_charge: f64,
}

/// A rate in a part of the day.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TariffWindow {
    /// Which part.
    pub daily: Daily,
    /// Per J.
    pub rate: f64,
}

impl Tariff {
    /// Rate just after a time of day (s since midnight), per J.
    pub fn rate_at(&self, clock: f64) -> f64 {
        self.windows
            .iter()
            .find(|window| window.daily.contains(clock))
            .map_or(self.rate, |window| window.rate)
    }

    /// The next time of day after `clock` at which the rate may change.
    pub fn next_edge(&self, clock: f64) -> f64 {
        self.windows
            .iter()
            .map(|window| window.daily.next_edge(clock))
            .fold(f64::INFINITY, f64::min)
    }
}

/// Quarter hours by the clock, s: over which demand is metered.
const QUARTER: f64 = 900.0;

/// Energy, cost and demand along the run.
#[derive(Clone, Debug)]
pub(super) struct Meter {
    /// Energy at the last quarter, J.
    energy_at_quarter: f64,
    /// Time of day of the next quarter's end.
    next_quarter: f64,
    quarter_start: f64,
    /// Highest mean power over a quarter, W.
    pub peak: f64,
    /// For energy alone.
    pub cost: f64,
    /// Per J at present.
    rate: f64,
    energy: f64,
}

impl Meter {
    /// Starting at a time of day.
    pub fn new(clock: f64) -> Self {
        Self {
            energy_at_quarter: 0.0,
            next_quarter: next_quarter(clock),
            quarter_start: clock,
            peak: 0.0,
            cost: 0.0,
            rate: 0.0,
            energy: 0.0,
        }
    }

    /// The rate from here on, per J.
    pub fn set_rate(&mut self, rate: f64) {
        self.rate = rate;
    }

    /// Counts on to a time of day; `energy_at` gives the energy since the start at any time since the last call.
    pub fn count(&mut self, clock: f64, energy: f64, energy_at: impl Fn(f64) -> f64) {
        while self.next_quarter <= clock {
            let at = energy_at(self.next_quarter);
            self.close_quarter(self.next_quarter, at);
        }
        self.cost += self.rate * (energy - self.energy);
        self.energy = energy;
    }

    /// Counts the last, unfinished quarter. Its mean is over a full quarter, as a meter takes it, unless the run is shorter.
    pub fn finish(&mut self) {
        let energy = self.energy;
        let mean = (energy - self.energy_at_quarter) / QUARTER;
        self.peak = self.peak.max(mean);
    }

    fn close_quarter(&mut self, clock: f64, energy: f64) {
        let mean = (energy - self.energy_at_quarter) / (clock - self.quarter_start).max(1.0);
        self.peak = self.peak.max(mean);
        self.energy_at_quarter = energy;
        self.quarter_start = clock;
        self.next_quarter = next_quarter(clock);
    }
}

fn next_quarter(clock: f64) -> f64 {
    QUARTER * ((clock + 1e-6) / QUARTER).floor() + QUARTER
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_peak_is_the_mean_of_a_quarter_hour() {
        let mut meter = Meter::new(0.0);
        meter.set_rate(2.0);
        // 1000 W for 450 s, then nothing to 1800 s, then 500 W for 900 s
        let energy = |t: f64| 1000.0 * t.min(450.0) + 500.0 * (t - 1800.0).clamp(0.0, 900.0);
        for t in [450.0, 1800.0, 2700.0] {
            meter.count(t, energy(t), energy);
        }
        meter.finish();
        assert!((meter.peak - 500.0).abs() < 1e-12);
        assert!((meter.cost - 2.0 * energy(2700.0)).abs() < 1e-9);
    }

    #[test]
    fn the_first_window_that_fits_counts() {
        let day = |from: f64, to: f64| Daily {
            from: 3600.0 * from,
            to: 3600.0 * to,
        };
        let tariff = Tariff {
            rate: 0.18,
            windows: vec![
                TariffWindow {
                    daily: day(23.0, 7.0),
                    rate: 0.10,
                },
                TariffWindow {
                    daily: day(17.0, 21.0),
                    rate: 0.28,
                },
            ],
            demand_charge: 0.0,
        };
        assert_eq!(tariff.rate_at(3600.0 * 3.0), 0.10);
        assert_eq!(tariff.rate_at(3600.0 * 7.0), 0.18);
        assert_eq!(tariff.rate_at(3600.0 * 44.0), 0.28);
        assert_eq!(tariff.next_edge(3600.0 * 18.0), 3600.0 * 21.0);
    }
}

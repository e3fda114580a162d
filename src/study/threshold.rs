//! The speed below which a pump delivers nothing against its neighbours and the static head.

use crate::network::Settings;
use crate::part::PumpId;
use crate::solve::Solver;

/// The threshold speeds of all pumps that run, one per pump; none for the others.
pub fn threshold_speeds(solver: &mut Solver, settings: &Settings) -> Vec<Option<f64>> {
    let pumps = solver.network().pump_ids();
    pumps
        .map(|pump| {
            let running = settings.pump(pump).running;
            running.then(|| threshold_speed(solver, settings, pump))?
        })
        .collect()
}

/// Speed ratio below which a pump delivers nothing, all else as it stands; none if it delivers at any speed or at none.
///
/// Found by halving between a hundredth of the model's speed and the set one (the model's if that is higher), to 1e-6. More speed
/// never gives less flow where head curves fall, so there is one such speed.
pub fn threshold_speed(solver: &mut Solver, settings: &Settings, pump: PumpId) -> Option<f64> {
    let line = solver.network().line_of(pump);
    let mut changed = settings.clone();
    let mut delivers = |speed: f64| {
        let setting = changed.pump_mut(pump);
        (setting.running, setting.speed) = (true, speed);
        let solution = solver.solve(&changed).ok()?;
        Some(solution.flow(line) > super::limit::STILL)
    };
    let (mut low, mut high) = (0.01, settings.pump(pump).speed.max(1.0));
    if delivers(low)? || !delivers(high)? {
        return None;
    }
    while high - low > 1e-6 {
        let middle = 0.5 * (low + high);
        if delivers(middle)? {
            high = middle;
        } else {
            low = middle;
        }
    }
    Some(high)
}

//! Starts in an hour against what a motor of its size bears.

use crate::network::Network;
use crate::part::PumpId;
use crate::shift::Score;

/// Starts that a pump's motor bears in an hour; none where its rating is not known and the file sets no limit.
pub fn allowed(network: &Network, pump: PumpId) -> Option<f64> {
    let rated = network.model(pump).motor.as_ref().map(|motor| motor.rated);
    network.limits().starts_per_hour(rated)
}

/// Pumps that were started more often in their worst hour than their motors bear: how often, and how often they may.
pub fn too_many(network: &Network, score: &Score) -> Vec<(PumpId, u32, f64)> {
    let over = |pump: PumpId, starts: u32| {
        allowed(network, pump)
            .filter(|allowed| f64::from(starts) > *allowed)
            .map(|allowed| (pump, starts, allowed))
    };
    let pumps = score.pumps.iter();
    pumps
        .filter_map(|pump| over(pump.pump, pump.worst_hour_starts))
        .collect()
}

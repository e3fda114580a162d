//! What a run is judged by: violations first, then starts, energy, cost and levels.

use crate::network::NodeId;
use crate::part::PumpId;

/// What became of a tank. Levels in m, volumes in m3, times in s.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TankScore {
    /// Its node.
    pub node: NodeId,
    /// Level at the start.
    pub start_level: f64,
    /// Level at the end.
    pub end_level: f64,
    /// Lowest level.
    pub lowest: f64,
    /// Highest level.
    pub highest: f64,
    /// Volume at the start.
    pub start_volume: f64,
    /// Volume at the end.
    pub end_volume: f64,
    /// What flowed in.
    pub volume_in: f64,
    /// What flowed out, spilled volume apart.
    pub volume_out: f64,
    /// What spilled.
    pub spilled: f64,
    /// What was drawn from it in vain.
    pub unmet: f64,
    /// Time above its alarm.
    pub above_alarm: f64,
    /// Time below a trip level.
    pub below_trip: f64,
    /// Time empty.
    pub empty: f64,
}

/// What became of a pump. Times in s, energies in J.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PumpScore {
    /// Which.
    pub pump: PumpId,
    /// Starts.
    pub starts: u32,
    /// Most starts within any one hour.
    pub worst_hour_starts: u32,
    /// Time it ran.
    pub run_time: f64,
    /// Volume through it.
    pub volume: f64,
    /// Shaft energy; none where its power is not known.
    pub shaft_energy: Option<f64>,
    /// Electrical energy; none where power or motor efficiency is not known.
    pub energy: Option<f64>,
    /// Time running while held shut by its check valve.
    pub held_shut: f64,
    /// Time past the end of its curve.
    pub past_end: f64,
    /// Time below its least flow.
    pub below_least_flow: f64,
    /// Time outside the preferred region.
    pub outside_preferred: f64,
    /// Least NPSH available less required, m; none where not known or it never ran.
    pub least_npsh_margin: Option<f64>,
}

/// What a run is judged by. Times in s, volumes in m3, energies in J, powers in W; sums over all tanks or pumps.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Score {
    /// Per tank.
    pub tanks: Vec<TankScore>,
    /// Per pump.
    pub pumps: Vec<PumpScore>,
    /// Spilled, at points too.
    pub spilled: f64,
    /// Drawn in vain, at points too.
    pub unmet: f64,
    /// Time above alarms.
    pub above_alarm: f64,
    /// Time below trip levels.
    pub below_trip: f64,
    /// Pump time held shut.
    pub held_shut: f64,
    /// Pump time past the end of the curve.
    pub past_end: f64,
    /// Pump time below least flow.
    pub below_least_flow: f64,
    /// Pump time outside the preferred region.
    pub outside_preferred: f64,
    /// Least NPSH margin of any pump, m.
    pub least_npsh_margin: Option<f64>,
    /// Starts of all pumps.
    pub starts: u32,
    /// Most starts of any one pump within any one hour.
    pub worst_hour_starts: u32,
    /// Starts of all pumps by hour of the day.
    pub starts_by_hour: [u32; 24],
    /// Volume that pumps moved, those in one line counted once.
    pub pumped: f64,
    /// Shaft energy.
    pub shaft_energy: Option<f64>,
    /// Electrical energy.
    pub energy: Option<f64>,
    /// Electrical energy per pumped volume, J/m3.
    pub specific_energy: Option<f64>,
    /// Highest mean electrical power over a quarter hour by the clock.
    pub peak_power: Option<f64>,
    /// Cost, demand charge included; none without a tariff.
    pub cost: Option<f64>,
    /// CO2, kg.
    pub carbon: Option<f64>,
    /// Volume that the plan still has to move to end as it began: above zero, what it owes; below, what it moved ahead.
    pub owed: f64,
    /// Largest of |in - out - spilled - stored| of a tank over the larger of what went in and out of it.
    pub volume_error: f64,
}

impl Score {
    /// Cost with what is owed charged at the run's own cost per pumped volume, so that runs that end unequal can be compared.
    pub fn corrected_cost(&self) -> Option<f64> {
        (self.pumped > 0.0).then(|| self.cost.map(|cost| cost * (1.0 + self.owed / self.pumped)))?
    }

    /// Energy likewise, J.
    pub fn corrected_energy(&self) -> Option<f64> {
        (self.pumped > 0.0).then(|| {
            self.energy
                .map(|energy| energy * (1.0 + self.owed / self.pumped))
        })?
    }
}

/// Share of the way from `a` to `b`, straight, that lies above `limit`.
pub(super) fn share_above(a: f64, b: f64, limit: f64) -> f64 {
    let (low, high) = (a.min(b), a.max(b));
    if low > limit {
        1.0
    } else if high <= limit {
        0.0
    } else {
        (high - limit) / (high - low)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn shares_of_a_straight_way() {
        assert_eq!(share_above(1.0, 3.0, 2.5), 0.25);
        assert_eq!(share_above(3.0, 1.0, 2.5), 0.25);
        assert_eq!(share_above(1.0, 1.0, 1.0), 0.0);
        assert_eq!(share_above(2.0, 2.0, 1.0), 1.0);
    }

    #[test]
    fn what_is_owed_is_charged() {
        let score = Score {
            pumped: 100.0,
            cost: Some(20.0),
            owed: 10.0,
            ..Score::default()
        };
        assert!((score.corrected_cost().unwrap() - 22.0).abs() < 1e-12);
        assert_eq!(Score::default().corrected_cost(), None);
    }
}

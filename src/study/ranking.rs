//! Plans run over the same time, put in order: violations before cost. And where two runs first part.

use crate::shift::{Event, Score};

/// One plan's run.
#[derive(Clone, Debug)]
pub struct Run {
    /// The plan's name.
    pub plan: String,
    /// When it ended, s from the start.
    pub ends_at: f64,
    /// What it is judged by.
    pub score: Score,
    /// What happened.
    pub events: Vec<Event>,
}

/// What a run is compared by, each with its weight.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Measure {
    /// Volume spilled, m3.
    Spilled,
    /// Volume drawn in vain, m3.
    Unmet,
    /// Minutes above alarms.
    Alarm,
    /// Minutes below trip levels.
    Trip,
    /// Pump minutes held shut.
    HeldShut,
    /// Pump minutes past the end of the curve.
    PastEnd,
    /// Pump minutes below least flow.
    LeastFlow,
    /// Pump minutes outside the preferred region.
    OutsidePreferred,
    /// Starts.
    Starts,
    /// Corrected electrical energy, kWh.
    Energy,
    /// Corrected cost.
    Cost,
    /// Peak power, kW.
    Peak,
}

impl Measure {
    /// All, violations first.
    pub const ALL: [Self; 12] = [
        Self::Spilled,
        Self::Unmet,
        Self::Alarm,
        Self::Trip,
        Self::HeldShut,
        Self::PastEnd,
        Self::LeastFlow,
        Self::OutsidePreferred,
        Self::Starts,
        Self::Energy,
        Self::Cost,
        Self::Peak,
    ];

    /// The word for it.
    pub fn word(self) -> &'static str {
        match self {
            Self::Spilled => "spilled",
            Self::Unmet => "unmet",
            Self::Alarm => "alarm",
            Self::Trip => "trip",
            Self::HeldShut => "held_shut",
            Self::PastEnd => "past_end",
            Self::LeastFlow => "least_flow",
            Self::OutsidePreferred => "outside_preferred",
            Self::Starts => "starts",
            Self::Energy => "energy",
            Self::Cost => "cost",
            Self::Peak => "peak",
        }
    }

    /// Its value for a run; zero where it is not known.
    pub fn of(self, score: &Score) -> f64 {
        const MINUTE: f64 = 60.0;
        const KILOWATT_HOUR: f64 = 3.6e6;
        match self {
            Self::Spilled => score.spilled,
            Self::Unmet => score.unmet,
            Self::Alarm => score.above_alarm / MINUTE,
            Self::Trip => score.below_trip / MINUTE,
            Self::HeldShut => score.held_shut / MINUTE,
            Self::PastEnd => score.past_end / MINUTE,
            Self::LeastFlow => score.below_least_flow / MINUTE,
            Self::OutsidePreferred => score.outside_preferred / MINUTE,
            Self::Starts => f64::from(score.starts),
            Self::Energy => score.corrected_energy().unwrap_or(0.0) / KILOWATT_HOUR,
            Self::Cost => score.corrected_cost().unwrap_or(0.0),
            Self::Peak => score.peak_power.unwrap_or(0.0) / 1000.0,
        }
    }
}

/// How runs are put in order.
#[derive(Clone, Debug, PartialEq)]
pub enum Order {
    /// By one measure after the other, each only where those before are equal: volume spilled, unmet, time above alarm, below
    /// trip, held shut, past the curve, below least flow; then cost (energy without a tariff), then starts.
    ViolationsFirst,
    /// By the weighted sum.
    Weighted(Vec<(Measure, f64)>),
}

/// Positions of the runs, best first; equal runs keep their order.
pub fn rank(runs: &[Run], order: &Order) -> Vec<usize> {
    let mut positions: Vec<usize> = (0..runs.len()).collect();
    let has_cost = runs.iter().all(|run| run.score.cost.is_some());
    let key = |run: &Run| -> Vec<f64> {
        match order {
            Order::Weighted(weights) => {
                vec![
                    weights
                        .iter()
                        .map(|(measure, w)| w * measure.of(&run.score))
                        .sum(),
                ]
            }
            Order::ViolationsFirst => {
                let then = if has_cost {
                    Measure::Cost
                } else {
                    Measure::Energy
                };
                let violations = &Measure::ALL[..7];
                let measures = violations.iter().copied().chain([then, Measure::Starts]);
                // Differences below what anyone could read off do not count.
                measures
                    .map(|measure| (1e6 * measure.of(&run.score)).round())
                    .collect()
            }
        }
    };
    positions.sort_by(|a, b| {
        let (a, b) = (key(&runs[*a]), key(&runs[*b]));
        a.iter()
            .zip(&b)
            .map(|(x, y)| x.total_cmp(y))
            .find(|o| o.is_ne())
            .unwrap_or(std::cmp::Ordering::Equal)
    });
    positions
}

/// Where two runs first part: the first event of either that the other does not share.
pub fn first_difference<'r>(
    a: &'r Run,
    b: &'r Run,
) -> Option<(Option<&'r Event>, Option<&'r Event>)> {
    let same =
        |x: &Event, y: &Event| (x.time - y.time).abs() < 1e-6 && x.what == y.what && x.who == y.who;
    let mut i = 0;
    loop {
        match (a.events.get(i), b.events.get(i)) {
            (None, None) => return None,
            (Some(x), Some(y)) if same(x, y) => i += 1,
            (x, y) => return Some((x, y)),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn run(plan: &str, spilled: f64, starts: u32, cost: f64) -> Run {
        let score = Score {
            spilled,
            starts,
            cost: Some(cost),
            pumped: 1.0,
            ..Score::default()
        };
        Run {
            plan: plan.to_owned(),
            ends_at: 0.0,
            score,
            events: Vec::new(),
        }
    }

    #[test]
    fn the_cheap_run_that_spills_comes_last() {
        let runs = [
            run("spills", 3.0, 1, 1.0),
            run("dear", 0.0, 9, 5.0),
            run("fair", 0.0, 5, 4.0),
        ];
        assert_eq!(rank(&runs, &Order::ViolationsFirst), [2, 1, 0]);
        let weights = Order::Weighted(vec![(Measure::Cost, 1.0), (Measure::Starts, 0.1)]);
        assert_eq!(rank(&runs, &weights), [0, 2, 1]);
    }
}

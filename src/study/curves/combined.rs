//! What a set of pumps gives at each flow, through all stages.

use super::bench::{Bench, Given};
use super::station::Stage;
use super::{CurvesError, FlowHead, NEXT_TO_NONE, flows};
use crate::network::{Network, Settings};
use crate::part::PumpId;
use crate::solve::Solver;
use crate::solve::operation::PumpOperation;
use crate::study::assessment::PREFERRED_REGION;

/// Steps along a curve.
const STEPS: usize = 60;

/// The stages on their benches with one set running.
pub(super) struct Benches {
    benches: Vec<Bench>,
    /// Flow that the set could carry if each pump stood at its end: the scale of its curve.
    pub scale: f64,
}

/// The same with their solvers.
pub(super) struct Rig<'b> {
    benches: Vec<(&'b Bench, Solver<'b>)>,
    scale: f64,
}

/// A curve and its marks.
pub(super) struct Sampled {
    pub points: Vec<FlowHead>,
    pub beyond: Vec<FlowHead>,
    pub preferred: Option<(f64, f64)>,
}

/// Settings in which of some pumps just `running` run.
pub(super) fn with_running(settings: &Settings, of: &[PumpId], running: &[PumpId]) -> Settings {
    let mut settings = settings.clone();
    for pump in of {
        settings.pump_mut(*pump).running = running.contains(pump);
    }
    settings
}

/// Flow at the end of a pump's curve at its speed, m3/s.
pub(super) fn end_of(network: &Network, settings: &Settings, pump: PumpId) -> f64 {
    settings.pump(pump).ratio() * network.model(pump).end_of_curve()
}

impl Benches {
    /// Sets the stages up; `settings` says which pumps run.
    pub fn new(
        network: &Network,
        settings: &Settings,
        stages: &[Stage],
    ) -> Result<Self, CurvesError> {
        let benches = stages
            .iter()
            .map(|stage| Bench::new(network, settings, stage))
            .collect::<Result<_, _>>()?;
        // A line carries no more than the weakest of its pumps, and a chain no more than its weakest stage.
        let of_line = |line: &crate::network::LineId| {
            let running = network
                .line(*line)
                .pumps()
                .filter(|pump| settings.pump(*pump).running);
            let ends = running.map(|pump| end_of(network, settings, pump));
            ends.min_by(f64::total_cmp).unwrap_or(0.0)
        };
        let of_stage = |stage: &Stage| stage.lines.iter().map(of_line).sum::<f64>();
        let scale = stages.iter().map(of_stage).min_by(f64::total_cmp);
        Ok(Self {
            benches,
            scale: scale.unwrap_or(0.0),
        })
    }

    pub fn rig(&self) -> Rig<'_> {
        Rig {
            benches: self
                .benches
                .iter()
                .map(|bench| (bench, Solver::new(bench.network())))
                .collect(),
            scale: self.scale,
        }
    }
}

impl Rig<'_> {
    /// Heads of all stages added up, and what every running pump does.
    pub fn at(&mut self, flow: f64) -> Option<Given> {
        let mut sum = Given {
            head: 0.0,
            pumps: Vec::new(),
        };
        for (bench, solver) in &mut self.benches {
            let given = bench.at(solver, flow, 0.0)?;
            sum.head += given.head;
            sum.pumps.extend(given.pumps);
        }
        Some(sum)
    }

    fn point(&mut self, flow: f64) -> Option<FlowHead> {
        let head = self.at(flow)?.head;
        Some(FlowHead { flow, head })
    }

    /// The curve, as far as the first end of a pump's curve, and on past the last of `marks` where that lies beyond; with
    /// points at all `marks`.
    pub fn sample(&mut self, network: &Network, settings: &Settings, marks: &[f64]) -> Sampled {
        const ROOM: f64 = 1.04;
        let last_mark = marks.iter().copied().fold(0.0, f64::max);
        let start = NEXT_TO_NONE * self.scale;
        let past_end = |id: PumpId, pump: &PumpOperation| pump.flow / end_of(network, settings, id);
        let end = self
            .crossing(start, self.scale, |pumps| greatest(pumps, past_end), 1.0)
            .unwrap_or(self.scale);
        let preferred = self.preferred(start, end);
        let mut marks = marks.to_vec();
        marks.extend(
            preferred
                .map(|(low, high)| [low, high])
                .into_iter()
                .flatten(),
        );
        let along = |rig: &mut Self, start, end, steps| {
            let flows = flows(start, end, steps, &marks).into_iter();
            flows.filter_map(|flow| rig.point(flow)).collect()
        };
        Sampled {
            points: along(self, start, end, STEPS),
            beyond: if last_mark > end * (1.0 + 1e-9) {
                along(self, end, ROOM * last_mark, STEPS / 4)
            } else {
                Vec::new()
            },
            preferred,
        }
    }

    /// Between the flow at which the least loaded pump enters the preferred region and that at which the most loaded one
    /// leaves it; none where a pump's best efficiency is unknown or the second comes first.
    fn preferred(&mut self, start: f64, end: f64) -> Option<(f64, f64)> {
        let (low, high) = PREFERRED_REGION;
        let known = self.at(end)?;
        known
            .pumps
            .iter()
            .all(|(_, pump)| pump.share_of_bep.is_some())
            .then_some(())?;
        let share = |_: PumpId, pump: &PumpOperation| pump.share_of_bep.unwrap_or(0.0);
        let enters = self.crossing(
            start,
            end,
            |pumps| -greatest(pumps, |id, p| -share(id, p)),
            low,
        )?;
        let leaves = self
            .crossing(start, end, |pumps| greatest(pumps, share), high)
            .unwrap_or(end);
        (enters < leaves).then_some((enters, leaves))
    }

    /// The flow at which a figure that rises with flow passes `value`, by bisection; none where it does not.
    fn crossing(
        &mut self,
        mut low: f64,
        mut high: f64,
        figure: impl Fn(&[(PumpId, PumpOperation)]) -> f64,
        value: f64,
    ) -> Option<f64> {
        const HALVINGS: usize = 60;
        let reaches = |rig: &mut Self, flow| Some(figure(&rig.at(flow)?.pumps) >= value);
        if reaches(self, low)? || !reaches(self, high)? {
            return None;
        }
        for _ in 0..HALVINGS {
            let middle = 0.5 * (low + high);
            if reaches(self, middle)? {
                high = middle;
            } else {
                low = middle;
            }
        }
        Some(high)
    }
}

/// The greatest of a figure over pumps.
fn greatest(
    pumps: &[(PumpId, PumpOperation)],
    figure: impl Fn(PumpId, &PumpOperation) -> f64,
) -> f64 {
    let figures = pumps.iter().map(|(id, pump)| figure(*id, pump));
    figures.fold(f64::NEG_INFINITY, f64::max)
}

//! Counts what the score is made of while the run goes on; its memory does not grow with the run.

use super::energy::Meter;
use super::plan::{Call, Follow, Plan, Shift};
use super::plant::{Mode, Plant, Side};
use super::score::{PumpScore, Score, TankScore, share_above};
use super::staging::Control;
use super::step::Step;
use crate::network::Network;
use crate::solve::operation;

/// Times and extremes so far.
pub(super) struct Tally {
    lowest: Vec<f64>,
    highest: Vec<f64>,
    above_alarm: Vec<f64>,
    below_trip: Vec<f64>,
    empty: Vec<f64>,
    pumps: Vec<PumpTally>,
}

#[derive(Clone, Copy, Debug, Default)]
struct PumpTally {
    held_shut: f64,
    past_end: f64,
    below_least_flow: f64,
    outside_preferred: f64,
    least_npsh_margin: Option<f64>,
}

impl Tally {
    pub fn new(network: &Network, shift: &Shift, volumes: &[f64]) -> Self {
        let tanks = shift.tanks.len();
        Self {
            lowest: volumes[..tanks].to_vec(),
            highest: volumes[..tanks].to_vec(),
            above_alarm: vec![0.0; tanks],
            below_trip: vec![0.0; tanks],
            empty: vec![0.0; tanks],
            pumps: vec![PumpTally::default(); network.pumps().len()],
        }
    }

    pub fn see_volume(&mut self, i: usize, volume: f64) {
        self.lowest[i] = self.lowest[i].min(volume);
        self.highest[i] = self.highest[i].max(volume);
    }

    /// NPSH margins in the last answer of a side, whose settings must still stand.
    pub fn look_at_npsh(&mut self, plant: &Plant, side: Side) {
        for pump in plant.network.pump_ids() {
            if !plant.settings.pump(pump).running
                || plant.network.model(pump).npsh_required.is_none()
            {
                continue;
            }
            let operation =
                operation::pump(plant.network, &plant.settings, plant.answer(side), pump);
            if let Some(margin) = operation.npsh_margin() {
                let least = &mut self.pumps[pump.index()].least_npsh_margin;
                *least = Some(least.map_or(margin, |least| least.min(margin)));
            }
        }
    }

    /// A stretch of `length` s, the first `theta` of a step, in which nobody started or stopped. Flows are taken as straight
    /// between its ends.
    pub fn span(
        &mut self,
        length: f64,
        theta: f64,
        step: &Step,
        plant: &Plant,
        alarms: &[bool],
        below_trip: &[(usize, bool)],
    ) {
        for (i, tank) in plant.tanks.iter().enumerate() {
            if alarms[i] {
                self.above_alarm[i] += length;
            }
            if tank.mode == Mode::Floor {
                self.empty[i] += length;
            }
            if below_trip.iter().any(|&(at, below)| at == i && below) {
                self.below_trip[i] += length;
            }
        }
        for pump in plant.network.pump_ids() {
            if !plant.settings.pump(pump).running {
                continue;
            }
            let tally = &mut self.pumps[pump.index()];
            let line = plant.network.line_of(pump);
            if plant.reference[line.index()] & Plant::SHUT != 0 {
                tally.held_shut += length;
            }
            let model = plant.network.model(pump);
            let place = plant.books.pumped(pump.index());
            let (a, b) = (step.first()[place], step.last()[place]);
            let performance = plant.network.performance(pump, &plant.settings);
            let (a, b) = (
                performance.on_curve(a),
                performance.on_curve(a + theta * (b - a)),
            );
            // At the end but for rounding is on the curve.
            let end = model.end_of_curve() * (1.0 + 1e-9);
            tally.past_end += length * share_above(a, b, end);
            let below = |flow: f64| 1.0 - share_above(a, b, flow);
            if let Some(least) = plant.network.minimum_flow(pump) {
                tally.below_least_flow += length * below(least);
            }
            if let Some((low, high)) = plant.network.preferred_region(pump) {
                tally.outside_preferred += length * (below(low) + share_above(a, b, high));
            }
        }
    }

    pub fn finish(
        &self,
        t: f64,
        sums: &[f64],
        plant: &Plant,
        control: &Control,
        meter: &Meter,
        plan: &Plan,
    ) -> Score {
        let known = |x: f64| (!x.is_nan()).then_some(x);
        let books = plant.books;
        let tanks: Vec<TankScore> = (0..plant.tanks.len())
            .map(|i| TankScore {
                node: plant.tanks[i].node,
                start_level: plant.shift.tanks[i].level,
                end_level: plant.level(i, sums[i]),
                lowest: plant.level(i, self.lowest[i]),
                highest: plant.level(i, self.highest[i]),
                start_volume: plant.tanks[i].start_volume,
                end_volume: sums[books.volume(i)],
                volume_in: sums[books.inflow(i)],
                volume_out: sums[books.outflow(i)],
                spilled: sums[books.spilled(i)],
                unmet: sums[books.unmet(i)],
                above_alarm: self.above_alarm[i],
                below_trip: self.below_trip[i],
                empty: self.empty[i],
            })
            .collect();
        let pumps: Vec<PumpScore> = plant
            .network
            .pump_ids()
            .map(|pump| {
                let i = pump.index();
                let (tally, state) = (&self.pumps[i], &control.pumps[i]);
                PumpScore {
                    pump,
                    starts: state.starts,
                    worst_hour_starts: state.worst_hour,
                    run_time: state.run_time(t),
                    volume: sums[books.pumped(i)],
                    shaft_energy: known(sums[books.shaft_energy(i)]),
                    energy: known(sums[books.energy(i)]),
                    held_shut: tally.held_shut,
                    past_end: tally.past_end,
                    below_least_flow: tally.below_least_flow,
                    outside_preferred: tally.outside_preferred,
                    least_npsh_margin: tally.least_npsh_margin,
                }
            })
            .collect();
        let pumped = plant
            .network
            .lines()
            .iter()
            .filter_map(|line| line.pumps().next())
            .map(|pump| sums[books.pumped(pump.index())])
            .sum();
        let energy = known(sums[books.total_energy()]);
        let demand = plant
            .shift
            .tariff
            .as_ref()
            .map_or(0.0, |tariff| tariff.demand_charge);
        let cost = plant
            .shift
            .tariff
            .as_ref()
            .and(known(meter.cost))
            .map(|cost| cost + demand * meter.peak);
        let over_tanks = |f: fn(&TankScore) -> f64| tanks.iter().map(f).sum::<f64>();
        let over_pumps = |f: fn(&PumpScore) -> f64| pumps.iter().map(f).sum::<f64>();
        Score {
            spilled: over_tanks(|tank| tank.spilled) + sums[books.point_spilled()],
            unmet: over_tanks(|tank| tank.unmet) + sums[books.point_unmet()],
            above_alarm: over_tanks(|tank| tank.above_alarm),
            below_trip: over_tanks(|tank| tank.below_trip),
            held_shut: over_pumps(|pump| pump.held_shut),
            past_end: over_pumps(|pump| pump.past_end),
            below_least_flow: over_pumps(|pump| pump.below_least_flow),
            outside_preferred: over_pumps(|pump| pump.outside_preferred),
            least_npsh_margin: pumps
                .iter()
                .filter_map(|pump| pump.least_npsh_margin)
                .min_by(f64::total_cmp),
            starts: pumps.iter().map(|pump| pump.starts).sum(),
            worst_hour_starts: pumps
                .iter()
                .map(|pump| pump.worst_hour_starts)
                .max()
                .unwrap_or(0),
            starts_by_hour: control.starts_by_hour,
            pumped,
            shaft_energy: pumps.iter().map(|pump| pump.shaft_energy).sum(),
            energy,
            specific_energy: energy
                .filter(|_| pumped > 0.0)
                .map(|energy| energy / pumped),
            peak_power: energy.map(|_| meter.peak),
            cost,
            carbon: plant
                .shift
                .carbon
                .zip(energy)
                .map(|(carbon, energy)| carbon * energy),
            owed: owed(plan, &tanks, plant),
            volume_error: tanks.iter().map(volume_error).fold(0.0, f64::max),
            tanks,
            pumps,
        }
    }
}

/// What the groups still have to move: a tank that a group empties owes what it holds more than at the start, one that it
/// fills what it holds less. Each tank counts once.
fn owed(plan: &Plan, tanks: &[TankScore], plant: &Plant) -> f64 {
    let mut counted = vec![false; tanks.len()];
    let mut owed = 0.0;
    for group in &plan.groups {
        let followed = match &group.call {
            Call::Bands(bands) => match (bands.follow, bands.steps.first()) {
                (Follow::Level(node), Some(step)) => Some((node, step.empties())),
                _ => None,
            },
            Call::Hold(hold) => match hold.figure {
                Follow::Level(node) => Some((node, hold.empties)),
                _ => None,
            },
            Call::Clock(_) => None,
        };
        let Some((node, empties)) = followed else {
            continue;
        };
        let Some(i) = plant.shift.tank_at(node) else {
            continue;
        };
        if !std::mem::replace(&mut counted[i], true) {
            let more = tanks[i].end_volume - tanks[i].start_volume;
            owed += if empties { more } else { -more };
        }
    }
    owed
}

/// |in - out - spilled - stored| over the larger of what went in and out.
fn volume_error(tank: &TankScore) -> f64 {
    let stored = tank.end_volume - tank.start_volume;
    let off = tank.volume_in - tank.volume_out - tank.spilled - stored;
    let through = tank.volume_in.max(tank.volume_out);
    if through > 0.0 {
        off.abs() / through
    } else {
        off.abs()
    }
}

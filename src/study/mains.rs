//! Rising mains: velocity, the time that water stays in them, and a first screen for surge.

use super::duty::Combination;
use crate::network::{LineId, Network};
use crate::part::surge;
use crate::solve::operation::{LineOperation, PumpOperation};

/// A main has pipes longer than so many of its bores.
const LONG: f64 = 100.0;

/// What a main does in one state.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Main {
    /// Which line.
    pub line: LineId,
    /// Velocity in its longest pipe, m/s.
    pub velocity: f64,
    /// Time that the water stays in it, s.
    pub retention: f64,
    /// Wave speed, m/s.
    pub wave_speed: f64,
    /// Whether the wave speed follows from the file; else it is that of a rigid wall, the upper end.
    pub wave_speed_known: bool,
    /// Rise of head if the whole flow stops at once, m: the bound of Joukowsky.
    pub surge_head: f64,
    /// 2 L / a, s: a stop within this time counts as at once.
    pub return_time: f64,
}

/// The mains of a network whose pumps deliver: long lines without a pump that carry at least half of what any of them carries.
pub(super) fn mains(
    network: &Network,
    lines: &[LineOperation],
    pumps: &[PumpOperation],
) -> Vec<LineId> {
    let delivers = pumps.iter().any(|pump| pump.running && pump.flow > 0.0);
    let is_long = |id: &LineId| {
        let line = network.line(*id);
        line.pumps().next().is_none()
            && line
                .main_bore()
                .is_some_and(|bore| line.pipe_length() > LONG * bore)
    };
    let long: Vec<LineId> = network.line_ids().filter(is_long).collect();
    let flow = |id: &LineId| lines[id.index()].flow.abs();
    let largest = long.iter().map(flow).fold(0.0, f64::max);
    long.into_iter()
        .filter(|id| delivers && flow(id) > 0.0 && flow(id) >= 0.5 * largest)
        .collect()
}

/// Velocity in the longest pipe of a line, m/s.
pub(super) fn velocity(network: &Network, id: LineId, does: &LineOperation) -> Option<f64> {
    let bore = network.line(id).main_bore()?;
    Some(does.flow.abs() / (std::f64::consts::FRAC_PI_4 * bore * bore))
}

/// The slowest and the fastest state of a main among several, and which they are.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Range {
    /// Which line.
    pub line: LineId,
    /// Position of the slowest state, and its velocity, m/s.
    pub slowest: (usize, f64),
    /// Position of the fastest state, and its velocity, m/s.
    pub fastest: (usize, f64),
}

/// The range of velocity of every main over several sets of running pumps; sets without a balance or without flow are passed over.
pub fn ranges(network: &Network, combinations: &[Combination]) -> Vec<Range> {
    let mut ranges: Vec<Range> = Vec::new();
    for (set, combination) in combinations.iter().enumerate() {
        let Ok(outcome) = &combination.outcome else {
            continue;
        };
        for main in states(
            network,
            &outcome.assessment.lines,
            &outcome.assessment.pumps,
        ) {
            let here = (set, main.velocity);
            match ranges.iter_mut().find(|range| range.line == main.line) {
                None => ranges.push(Range {
                    line: main.line,
                    slowest: here,
                    fastest: here,
                }),
                Some(range) => {
                    if here.1 < range.slowest.1 {
                        range.slowest = here;
                    }
                    if here.1 > range.fastest.1 {
                        range.fastest = here;
                    }
                }
            }
        }
    }
    ranges
}

/// What the mains do in one state.
pub fn states(network: &Network, lines: &[LineOperation], pumps: &[PumpOperation]) -> Vec<Main> {
    let state = |id: LineId| {
        let (line, does) = (network.line(id), &lines[id.index()]);
        let velocity = velocity(network, id, does)?;
        let rigid = surge::rigid_wave_speed(network.fluid().density);
        let wave_speed = line.facts.wave_speed.unwrap_or(rigid);
        Some(Main {
            line: id,
            velocity,
            retention: line.pipe_volume() / does.flow.abs(),
            wave_speed,
            wave_speed_known: line.facts.wave_speed.is_some(),
            surge_head: surge::joukowsky(wave_speed, velocity, network.gravity()),
            return_time: 2.0 * line.pipe_length() / wave_speed,
        })
    };
    mains(network, lines, pumps)
        .into_iter()
        .filter_map(state)
        .collect()
}

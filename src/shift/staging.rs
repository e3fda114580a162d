//! Who runs: faults, trips, steps with hysteresis, order of call, and all timers.
//!
//! Everything here is decided from the time and the figures at one instant. What a rule waits for is told as watches (a figure
//! that has to reach a value) and as [`Control::wake`] (the next time at which a timer runs out).

mod calls;
mod faults;
mod rules;
mod watches;

use super::crossing::Way;
use super::event::{Event, Wait, What, Who, Why};
use super::hold::{Holding, Place};
use super::plan::{Bands, Call, Fault, Follow, Group, Plan, Shift, Step};
use super::plant::Plant;
use crate::network::Network;
use crate::part::PumpId;
use std::collections::VecDeque;

/// Slack (s) with which a timer counts as run out.
pub(super) const SLACK: f64 = 1e-9;

const HOUR: f64 = 3600.0;

/// A tank's volume that something waits for.
#[derive(Clone, Copy, Debug)]
pub(super) struct Watch {
    /// Which tank.
    pub tank: usize,
    /// Volume, m3.
    pub threshold: f64,
    pub way: Way,
}

/// Another figure that something waits for.
#[derive(Clone, Copy, Debug)]
pub(super) struct FigureWatch {
    pub figure: Figure,
    pub threshold: f64,
    pub way: Way,
}

/// A figure that takes a solution to know.
#[derive(Clone, Copy, Debug)]
pub(super) enum Figure {
    /// How much a tank wants to leave its floor or brim.
    Leaving(usize),
    /// What a group follows.
    Followed(usize),
    /// Speed of a holding group.
    Speed(usize),
    /// Speed that a holding group would need with one fewer.
    Spare(usize),
}

/// Remembers when something last switched, to notice when it does nothing else.
#[derive(Clone, Copy, Debug)]
struct Switching {
    last: f64,
    quick: u32,
}

impl Switching {
    const NEVER: Self = Self {
        last: f64::NEG_INFINITY,
        quick: 0,
    };

    /// Notes a switch; false if it chatters: twice with no time between, or again and again within a second.
    fn note(&mut self, t: f64) -> bool {
        let passed = t - self.last;
        self.last = t;
        self.quick = if passed < 1.0 { self.quick + 1 } else { 0 };
        passed > 1e-6 && self.quick < 20
    }
}

/// A pump as the rules see it.
#[derive(Clone, Debug)]
pub(super) struct PumpState {
    pub running: bool,
    started_at: f64,
    stopped_at: f64,
    ran: f64,
    pub starts: u32,
    pub worst_hour: u32,
    recent: VecDeque<f64>,
    /// Faults that keep it out.
    out: u32,
    /// Trips that keep it out.
    tripped: u32,
    /// Which group owns it; none: run by hand.
    group: Option<usize>,
    /// Run by hand.
    by_hand: bool,
}

impl PumpState {
    /// Time it ran up to `t`, s.
    pub fn run_time(&self, t: f64) -> f64 {
        self.ran
            + if self.running {
                t - self.started_at
            } else {
                0.0
            }
    }
}

/// One step's latch.
#[derive(Clone, Copy, Debug)]
struct Latch {
    on: bool,
    /// Since when the figure asks for a switch.
    pending: Option<f64>,
    switching: Switching,
}

struct GroupState {
    latches: Vec<Latch>,
    /// Pumps wanted.
    demand: usize,
    /// In the order of call.
    called: Vec<PumpId>,
    next_in_ring: usize,
    last_start: f64,
    /// Why the demand is what it is, and since when.
    cause: Why,
    cause_time: f64,
    /// What the last action that could not be done waits for.
    blocked: Option<Wait>,
    replacing: Option<PumpId>,
    exercising: Option<(PumpId, f64)>,
    /// For a holding group: since when its speed is at its end, and since when one fewer would do.
    up_since: Option<f64>,
    down_since: Option<f64>,
    switching: Switching,
}

/// All rules of a run with their state.
pub(super) struct Control<'a> {
    network: &'a Network,
    shift: &'a Shift,
    plan: &'a Plan,
    groups: Vec<GroupState>,
    pub pumps: Vec<PumpState>,
    tripped: Vec<(bool, Switching)>,
    /// Beginnings (true) and ends of faults in order of time.
    edges: Vec<(f64, Fault, bool)>,
    next_edge: usize,
    power_out: u32,
    restart_at: f64,
    /// The next time at which a timer runs out.
    pub wake: f64,
    /// Starts of all pumps by hour of the day.
    pub starts_by_hour: [u32; 24],
}

/// The figure of a band in the units of what is watched: a tank's volume for its level.
fn watched(plant: &Plant, follow: Follow, value: f64) -> f64 {
    match follow {
        Follow::Level(node) => plant
            .shift
            .tanks
            .iter()
            .find(|tank| tank.node == node)
            .map_or(f64::NAN, |tank| tank.shape.volume(value)),
        Follow::Pressure(_) | Follow::Flow(_) => value,
    }
}

/// The steps that count at a time of day.
fn steps_at(bands: &Bands, clock: f64) -> &[Step] {
    bands
        .windows
        .iter()
        .find(|window| window.daily.contains(clock))
        .map_or(&bands.steps, |window| &window.steps)
}

impl<'a> Control<'a> {
    pub fn new(network: &'a Network, shift: &'a Shift, plan: &'a Plan) -> Self {
        let mut pumps: Vec<PumpState> = network
            .pump_ids()
            .map(|id| {
                let running = network.settings().pump(id).running;
                PumpState {
                    running,
                    started_at: 0.0,
                    stopped_at: f64::NEG_INFINITY,
                    ran: 0.0,
                    starts: 0,
                    worst_hour: 0,
                    recent: VecDeque::new(),
                    out: 0,
                    tripped: 0,
                    group: None,
                    by_hand: running,
                }
            })
            .collect();
        for (g, group) in plan.groups.iter().enumerate() {
            for pump in &group.pumps {
                let state = &mut pumps[pump.index()];
                state.group = Some(g);
                state.running = false;
                state.by_hand = false;
            }
        }
        let groups = plan.groups.iter().map(|group| GroupState {
            latches: match &group.call {
                Call::Bands(bands) => {
                    let off = Latch {
                        on: false,
                        pending: None,
                        switching: Switching::NEVER,
                    };
                    vec![off; bands.steps.len()]
                }
                Call::Clock(_) | Call::Hold(_) => Vec::new(),
            },
            demand: 0,
            called: Vec::with_capacity(group.pumps.len()),
            next_in_ring: 0,
            last_start: f64::NEG_INFINITY,
            cause: Why::Begins,
            cause_time: 0.0,
            blocked: None,
            replacing: None,
            exercising: None,
            up_since: None,
            down_since: None,
            switching: Switching::NEVER,
        });
        let mut edges: Vec<(f64, Fault, bool)> = Vec::new();
        for fault in &shift.faults {
            edges.push((fault.at, *fault, true));
            if let Some(lasts) = fault.lasts {
                edges.push((fault.at + lasts, *fault, false));
            }
        }
        edges.sort_by(|a, b| a.0.total_cmp(&b.0));
        Self {
            groups: groups.collect(),
            network,
            shift,
            plan,
            pumps,
            tripped: vec![(false, Switching::NEVER); plan.trips.len()],
            edges,
            next_edge: 0,
            power_out: 0,
            restart_at: f64::NEG_INFINITY,
            wake: f64::INFINITY,
            starts_by_hour: [0; 24],
        }
    }

    /// Puts owned pumps to rest, makes the holding groups, and sets what the plan begins with.
    pub fn begin(&mut self, plant: &mut Plant, y: &[f64]) {
        for (pump, state) in self.network.pump_ids().zip(&self.pumps) {
            plant.settings.pump_mut(pump).running = state.running;
        }
        for (g, group) in self.plan.groups.iter().enumerate() {
            let state = &mut self.groups[g];
            match &group.call {
                Call::Bands(bands) => {
                    let steps = steps_at(bands, self.shift.starts);
                    for (k, latch) in state.latches.iter_mut().enumerate() {
                        let begins = group.begins_with.is_some_and(|count| k < count);
                        let value = match bands.follow {
                            Follow::Level(node) => {
                                self.shift.tank_at(node).map_or(f64::NAN, |tank| y[tank])
                            }
                            // not known before the first solution
                            Follow::Pressure(_) | Follow::Flow(_) => f64::NAN,
                        };
                        let stop = watched(plant, bands.follow, steps[k].stop);
                        let beyond = stop_way(steps[k]).reached(value, stop);
                        latch.on = begins && !beyond;
                    }
                    state.demand = wanted(&state.latches);
                }
                Call::Clock(_) => {}
                Call::Hold(rule) => {
                    state.demand = group.begins_with.unwrap_or(1).clamp(1, group.pumps.len());
                    let tank = match rule.figure {
                        Follow::Level(node) => self.shift.tank_at(node),
                        Follow::Pressure(_) | Follow::Flow(_) => None,
                    };
                    plant.holds.push(Holding {
                        rule: *rule,
                        group: g,
                        tank,
                        place: Place::There,
                        pumps: Vec::with_capacity(group.pumps.len()),
                        speeds: [rule.speeds.1; 3],
                    });
                }
            }
        }
    }

    /// What each group follows, if that takes a solution.
    pub fn follows(plan: &Plan) -> Vec<Option<Follow>> {
        let follow = |group: &Group| match &group.call {
            Call::Bands(bands) => match bands.follow {
                Follow::Level(_) => None,
                follow => Some(follow),
            },
            Call::Clock(_) | Call::Hold(_) => None,
        };
        plan.groups.iter().map(follow).collect()
    }

    /// Whether the level of tank `i` is below a trip level that stopped pumps.
    pub fn trip_levels(&self) -> impl Iterator<Item = (usize, f64)> + '_ {
        self.plan.trips.iter().filter_map(|trip| {
            let tank = self.shift.tank_at(trip.tank)?;
            Some((tank, self.shift.tanks[tank].shape.volume(trip.level)))
        })
    }

    fn wake_at(&mut self, time: f64) {
        self.wake = self.wake.min(time);
    }
}

fn event(time: f64, what: What, who: Who, why: Why) -> Event {
    Event {
        time,
        what,
        who,
        why,
        wait: None,
    }
}

/// Which way a step's start is reached.
fn start_way(step: Step) -> Way {
    if step.empties() { Way::Up } else { Way::Down }
}

/// Which way its stop is.
fn stop_way(step: Step) -> Way {
    if step.empties() { Way::Down } else { Way::Up }
}

/// Step k runs k pumps: the highest that is on counts.
fn wanted(latches: &[Latch]) -> usize {
    latches
        .iter()
        .rposition(|latch| latch.on)
        .map_or(0, |k| k + 1)
}

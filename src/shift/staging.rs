//! Who runs: faults, trips, steps with hysteresis, order of call, and all timers.
//!
//! Everything here is decided from the time and the figures at one instant. What a rule waits for is told as watches (a figure
//! that has to reach a value) and as [`Control::wake`] (the next time at which a timer runs out).

use super::crossing::Way;
use super::error::ShiftError;
use super::event::{Event, Wait, What, Who, Why};
use super::hold::{Holding, Place};
use super::plan::{Bands, Call, Fault, FaultKind, Follow, Group, Hold, Plan, Rotate, Shift, Step};
use super::plant::{Plant, Side};
use crate::network::{CheckCondition, Network};
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

    /// Faults and trips that are due; true if anything changed.
    ///
    /// # Errors
    /// A trip that chatters.
    pub fn act_first(
        &mut self,
        t: f64,
        y: &[f64],
        plant: &mut Plant,
        events: &mut Vec<Event>,
    ) -> Result<bool, ShiftError> {
        let mut changed = false;
        while let Some(&(time, fault, begins)) = self.edges.get(self.next_edge) {
            if time > t + SLACK {
                self.wake_at(time);
                break;
            }
            self.next_edge += 1;
            changed = true;
            self.fault(t, fault, begins, plant, events);
        }
        for (i, trip) in self.plan.trips.iter().enumerate() {
            let Some(tank) = self.shift.tank_at(trip.tank) else {
                continue;
            };
            let shape = &self.shift.tanks[tank].shape;
            let (low, reset) = (shape.volume(trip.level), shape.volume(trip.reset));
            let (tripped, mut switching) = self.tripped[i];
            let switches = if tripped {
                y[tank] >= reset
            } else {
                y[tank] <= low
            };
            if !switches {
                continue;
            }
            changed = true;
            let value = if tripped { trip.reset } else { trip.level };
            let why = Why::At(Follow::Level(trip.tank), value);
            if !switching.note(t) {
                return Err(ShiftError::Chatter {
                    time: t,
                    rule: format!("{} trip", self.plan.name),
                    step: i + 1,
                    why,
                });
            }
            self.tripped[i] = (!tripped, switching);
            for &pump in &trip.pumps {
                if tripped {
                    self.pumps[pump.index()].tripped -= 1;
                } else {
                    self.pumps[pump.index()].tripped += 1;
                    self.force_off(t, pump, why, plant, events);
                }
            }
            if tripped {
                events.push(event(t, What::Reset, Who::Node(trip.tank), why));
                self.resume_by_hand(t, why, plant, events);
            }
        }
        Ok(changed)
    }

    fn fault(
        &mut self,
        t: f64,
        fault: Fault,
        begins: bool,
        plant: &mut Plant,
        events: &mut Vec<Event>,
    ) {
        let why = if begins {
            Why::Fault(fault.kind)
        } else {
            Why::FaultOver(fault.kind)
        };
        let what = if begins { What::Fails } else { What::Recovers };
        match fault.kind {
            FaultKind::PumpOut(pump) => {
                let state = &mut self.pumps[pump.index()];
                state.out = if begins { state.out + 1 } else { state.out - 1 };
                events.push(event(t, what, Who::Pump(pump), why));
                if begins {
                    self.force_off(t, pump, why, plant, events);
                }
            }
            FaultKind::CheckStuck(line, condition) => {
                let condition = if begins {
                    condition
                } else {
                    CheckCondition::Working
                };
                plant.settings.set_check(line, condition);
                events.push(event(t, what, Who::Line(line), why));
            }
            FaultKind::Fouling(line, r) => {
                plant
                    .settings
                    .set_fouling(line, if begins { r } else { 0.0 });
                events.push(event(t, what, Who::Line(line), why));
            }
            FaultKind::PowerOut => {
                events.push(event(t, what, Who::Power, why));
                if begins {
                    self.power_out += 1;
                    for pump in self.network.pump_ids() {
                        self.force_off(t, pump, why, plant, events);
                    }
                } else {
                    self.power_out -= 1;
                    self.restart_at = t + self.plan.restart_after;
                }
            }
        }
        if !begins {
            self.resume_by_hand(t, why, plant, events);
        }
    }

    /// Starts again what is run by hand and was only kept from it.
    fn resume_by_hand(&mut self, t: f64, why: Why, plant: &mut Plant, events: &mut Vec<Event>) {
        for pump in self.network.pump_ids() {
            let state = &self.pumps[pump.index()];
            if state.by_hand && !state.running && self.free(pump, t).is_ok() {
                self.start(t, pump, why, None, plant, events);
            }
        }
    }

    fn force_off(
        &mut self,
        t: f64,
        pump: PumpId,
        why: Why,
        plant: &mut Plant,
        events: &mut Vec<Event>,
    ) {
        if !self.pumps[pump.index()].running {
            return;
        }
        self.halt(t, pump, plant);
        events.push(event(t, What::Trip, Who::Pump(pump), why));
        if let Some(g) = self.pumps[pump.index()].group {
            self.groups[g].replacing = Some(pump);
        }
    }

    /// Stops a pump, whatever the reason.
    fn halt(&mut self, t: f64, pump: PumpId, plant: &mut Plant) {
        let state = &mut self.pumps[pump.index()];
        state.ran += t - state.started_at;
        state.running = false;
        state.stopped_at = t;
        let group = state.group;
        plant.settings.pump_mut(pump).running = false;
        if let Some(g) = group {
            self.groups[g].called.retain(|other| *other != pump);
            if self.groups[g]
                .exercising
                .is_some_and(|(other, _)| other == pump)
            {
                self.groups[g].exercising = None;
            }
            self.show_called(g, plant);
        }
    }

    fn start(
        &mut self,
        t: f64,
        pump: PumpId,
        why: Why,
        wait: Option<Wait>,
        plant: &mut Plant,
        events: &mut Vec<Event>,
    ) {
        let state = &mut self.pumps[pump.index()];
        state.running = true;
        state.started_at = t;
        state.starts += 1;
        while state.recent.front().is_some_and(|first| t - first >= HOUR) {
            state.recent.pop_front();
        }
        state.recent.push_back(t);
        state.worst_hour = state.worst_hour.max(state.recent.len() as u32);
        let hour = ((self.shift.starts + t) / HOUR).rem_euclid(24.0) as usize;
        self.starts_by_hour[hour.min(23)] += 1;
        plant.settings.pump_mut(pump).running = true;
        events.push(Event {
            time: t,
            what: What::Start,
            who: Who::Pump(pump),
            why,
            wait,
        });
    }

    /// Tells a holding group who runs.
    fn show_called(&self, g: usize, plant: &mut Plant) {
        if let Some(hold) = plant.holds.iter_mut().find(|hold| hold.group == g) {
            hold.pumps.clear();
            hold.pumps.extend_from_slice(&self.groups[g].called);
        }
    }

    /// Whether nothing but its own timers keeps a pump from running; else what it waits for and until when.
    fn free(&mut self, pump: PumpId, t: f64) -> Result<(), (Option<Wait>, f64)> {
        let state = &self.pumps[pump.index()];
        if state.out > 0 || state.tripped > 0 || self.power_out > 0 {
            return Err((None, f64::INFINITY));
        }
        if t < self.restart_at - SLACK {
            let until = self.restart_at;
            self.wake_at(until);
            return Err((Some(Wait::Restart), until));
        }
        Ok(())
    }

    /// Whether a group's pump may start now.
    fn able(
        &mut self,
        group: &Group,
        pump: PumpId,
        t: f64,
        unlocked: bool,
    ) -> Result<(), (Option<Wait>, f64)> {
        self.free(pump, t)?;
        let state = &self.pumps[pump.index()];
        let rested = state.stopped_at + group.min_rest;
        if t < rested - SLACK {
            return Err((Some(Wait::MinRest), rested));
        }
        if let Some(most) = group.max_starts_per_hour
            && !unlocked
        {
            let within = state
                .recent
                .iter()
                .filter(|start| t - **start < HOUR - SLACK)
                .count();
            if within >= most
                && let Some(oldest) = state.recent.iter().rev().nth(most.saturating_sub(1))
            {
                return Err((Some(Wait::Lock), oldest + HOUR));
            }
        }
        Ok(())
    }

    /// Staging and timers; true if a pump was started or stopped.
    ///
    /// # Errors
    /// A rule that chatters.
    pub fn act_staging(
        &mut self,
        t: f64,
        y: &[f64],
        plant: &mut Plant,
        events: &mut Vec<Event>,
    ) -> Result<bool, ShiftError> {
        let mut changed = false;
        for g in 0..self.groups.len() {
            let group = &self.plan.groups[g];
            match &group.call {
                Call::Bands(bands) => self.act_bands(t, y, g, bands, plant)?,
                Call::Clock(schedule) => {
                    let clock = self.shift.starts + t;
                    let schedule = &self.shift.schedules[*schedule];
                    let wanted = schedule.at(clock).0.round().max(0.0) as usize;
                    let next = schedule.next_corner(clock) - self.shift.starts;
                    self.wake_at(next);
                    self.want(t, g, wanted.min(group.pumps.len()), Why::Clock);
                }
                Call::Hold(rule) => self.act_hold(t, g, rule, plant)?,
            }
            changed |= self.adjust(t, y, g, group, plant, events);
        }
        Ok(changed)
    }

    fn want(&mut self, t: f64, g: usize, demand: usize, why: Why) {
        let state = &mut self.groups[g];
        if state.demand != demand {
            state.demand = demand;
            state.cause = why;
            state.cause_time = t;
            state.blocked = None;
            state.replacing = None;
        }
    }

    fn act_bands(
        &mut self,
        t: f64,
        y: &[f64],
        g: usize,
        bands: &Bands,
        plant: &Plant,
    ) -> Result<(), ShiftError> {
        let clock = self.shift.starts + t;
        for window in &bands.windows {
            let edge = window.daily.next_edge(clock) - self.shift.starts;
            self.wake_at(edge);
        }
        let value = self.followed(y, g, bands, plant);
        let mut wake = f64::INFINITY;
        let mut cause = None;
        for (k, step) in steps_at(bands, clock).iter().enumerate() {
            let latch = &mut self.groups[g].latches[k];
            let (way, at, delay) = if latch.on {
                (stop_way(*step), step.stop, bands.down_delay)
            } else {
                (start_way(*step), step.start, bands.up_delay)
            };
            if !way.reached(value, watched(plant, bands.follow, at)) {
                latch.pending = None;
                continue;
            }
            let since = *latch.pending.get_or_insert(t);
            if t < since + delay - SLACK {
                wake = wake.min(since + delay);
                continue;
            }
            latch.pending = None;
            latch.on = !latch.on;
            let why = Why::At(bands.follow, at);
            cause = Some((why, delay));
            // Being on at the start is no switch.
            if !latch.switching.note(t) {
                return Err(ShiftError::Chatter {
                    time: t,
                    rule: format!("{}, {}", self.plan.name, self.plan.groups[g].name),
                    step: k + 1,
                    why,
                });
            }
        }
        self.wake_at(wake);
        if let Some((why, delay)) = cause {
            let demand = wanted(&self.groups[g].latches);
            self.want(t, g, demand, why);
            if delay > 0.0 {
                self.groups[g].blocked = Some(Wait::Delay);
            }
        }
        Ok(())
    }

    /// What a group follows, in the units of what is watched.
    fn followed(&self, y: &[f64], g: usize, bands: &Bands, plant: &Plant) -> f64 {
        match bands.follow {
            Follow::Level(node) => self.shift.tank_at(node).map_or(f64::NAN, |tank| y[tank]),
            Follow::Pressure(_) | Follow::Flow(_) => plant.figures[g],
        }
    }

    fn act_hold(
        &mut self,
        t: f64,
        g: usize,
        rule: &Hold,
        plant: &mut Plant,
    ) -> Result<(), ShiftError> {
        let Some(h) = plant.holds.iter().position(|hold| hold.group == g) else {
            return Ok(());
        };
        let running = self.groups[g].called.len();
        if running == 0 || running != self.groups[g].demand {
            return Ok(());
        }
        let speed = plant.holds[h].speeds[Side::Run as usize];
        let state = &mut self.groups[g];
        let more = state.demand < self.plan.groups[g].pumps.len() && speed >= rule.up_at;
        state.up_since = more.then(|| state.up_since.unwrap_or(t));
        let spare = plant
            .spare_speed(t, h)
            .map_err(|error| ShiftError::Solve { time: t, error })?;
        // At the lower limit the group overshoots: one fewer is right at whatever speed it takes.
        let over = speed <= rule.speeds.0;
        let fewer = spare.filter(|spare| state.demand > 1 && (over || *spare <= rule.down_at));
        state.down_since = fewer.map(|_| state.down_since.unwrap_or(t));
        let mut next = None;
        if let Some(since) = state.up_since {
            let due = since + rule.up_delay;
            if t >= due - SLACK {
                next = Some((state.demand + 1, Why::Speed(speed)));
            } else {
                self.wake = self.wake.min(due);
            }
        } else if let (Some(since), Some(spare)) = (state.down_since, fewer) {
            let due = since + rule.down_delay;
            if t >= due - SLACK {
                next = Some((state.demand - 1, Why::Spare(spare)));
            } else {
                self.wake = self.wake.min(due);
            }
        }
        if let Some((demand, why)) = next {
            state.up_since = None;
            state.down_since = None;
            if !state.switching.note(t) {
                return Err(ShiftError::Chatter {
                    time: t,
                    rule: format!("{}, {}", self.plan.name, self.plan.groups[g].name),
                    step: demand,
                    why,
                });
            }
            self.want(t, g, demand, why);
        }
        Ok(())
    }

    /// Starts and stops until as many run as are wanted, or something has to be waited for.
    fn adjust(
        &mut self,
        t: f64,
        y: &[f64],
        g: usize,
        group: &Group,
        plant: &mut Plant,
        events: &mut Vec<Event>,
    ) -> bool {
        let mut changed = false;
        while self.groups[g].called.len() > self.groups[g].demand {
            let Some(&last) = self.groups[g].called.last() else {
                break;
            };
            let due = self.pumps[last.index()].started_at + group.min_run;
            if t < due - SLACK {
                self.groups[g].blocked = Some(Wait::MinRun);
                self.wake_at(due);
                break;
            }
            self.halt(t, last, plant);
            let state = &self.groups[g];
            events.push(Event {
                time: t,
                what: What::Stop,
                who: Who::Pump(last),
                why: state.cause,
                wait: state.blocked,
            });
            changed = true;
        }
        let unlocked = self.above_alarm(y, group);
        while self.groups[g].called.len() < self.groups[g].demand {
            let next_start = self.groups[g].last_start + group.stagger;
            if t < next_start - SLACK {
                self.groups[g].blocked = Some(Wait::Stagger);
                self.wake_at(next_start);
                break;
            }
            let Some(pump) = self.choose(t, g, group, unlocked) else {
                break;
            };
            let state = &mut self.groups[g];
            state.called.push(pump);
            state.last_start = t;
            let wait = state.blocked;
            let why = match state.replacing.take() {
                Some(other) if other != pump && state.cause_time < t => Why::InPlaceOf(other),
                _ => state.cause,
            };
            // The order turns by one place at each start, whoever was able.
            state.next_in_ring = (state.next_in_ring + 1) % group.pumps.len();
            self.show_called(g, plant);
            self.start(t, pump, why, wait, plant, events);
            changed = true;
        }
        if self.groups[g].called.len() == self.groups[g].demand {
            self.groups[g].blocked = None;
            self.groups[g].replacing = None;
        }
        changed | self.exercise(t, g, group, plant, events)
    }

    /// The pump that is called next, if any is able.
    fn choose(&mut self, t: f64, g: usize, group: &Group, unlocked: bool) -> Option<PumpId> {
        let count = group.pumps.len();
        let first = match group.rotate {
            Rotate::EachStart => self.groups[g].next_in_ring,
            Rotate::Never | Rotate::LeastHours => 0,
        };
        let mut best: Option<PumpId> = None;
        for i in 0..count {
            let pump = group.pumps[(first + i) % count];
            if self.pumps[pump.index()].running {
                continue;
            }
            match self.able(group, pump, t, unlocked) {
                Ok(()) => {
                    let hours = |pump: PumpId| self.pumps[pump.index()].run_time(t);
                    if best.is_none_or(|best| hours(pump) < hours(best)) {
                        best = Some(pump);
                    }
                    if group.rotate != Rotate::LeastHours {
                        break;
                    }
                }
                Err((wait, until)) => {
                    self.groups[g].blocked = wait.or(self.groups[g].blocked);
                    self.wake_at(until);
                }
            }
        }
        best
    }

    /// Whether the tank that a group follows is above its alarm: then a lock on starts must not flood it.
    fn above_alarm(&self, y: &[f64], group: &Group) -> bool {
        let follow = match &group.call {
            Call::Bands(bands) => bands.follow,
            Call::Hold(hold) => hold.figure,
            Call::Clock(_) => return false,
        };
        let Follow::Level(node) = follow else {
            return false;
        };
        self.shift.tank_at(node).is_some_and(|i| {
            let tank = &self.shift.tanks[i];
            tank.alarm
                .is_some_and(|alarm| y[i] >= tank.shape.volume(alarm))
        })
    }

    fn exercise(
        &mut self,
        t: f64,
        g: usize,
        group: &Group,
        plant: &mut Plant,
        events: &mut Vec<Event>,
    ) -> bool {
        let Some(rule) = group.exercise else {
            return false;
        };
        if let Some((pump, until)) = self.groups[g].exercising {
            if t < until - SLACK {
                self.wake_at(until);
                return false;
            }
            self.halt(t, pump, plant);
            events.push(event(t, What::Stop, Who::Pump(pump), Why::Exercise));
            return true;
        }
        for &pump in &group.pumps {
            let state = &self.pumps[pump.index()];
            if state.running {
                continue;
            }
            let due = state.stopped_at.max(0.0) + rule.every;
            if t < due - SLACK {
                self.wake_at(due);
            } else if self.able(group, pump, t, false).is_ok() {
                self.groups[g].exercising = Some((pump, t + rule.lasts));
                self.wake_at(t + rule.lasts);
                self.start(t, pump, Why::Exercise, None, plant, events);
                return true;
            }
        }
        false
    }

    /// Everything that a rule waits for at present.
    pub fn watches(
        &self,
        t: f64,
        plant: &Plant,
        volumes: &mut Vec<Watch>,
        figures: &mut Vec<FigureWatch>,
    ) {
        for (trip, (tripped, _)) in self.plan.trips.iter().zip(&self.tripped) {
            if let Some(tank) = self.shift.tank_at(trip.tank) {
                let (level, way) = if *tripped {
                    (trip.reset, Way::Up)
                } else {
                    (trip.level, Way::Down)
                };
                let threshold = self.shift.tanks[tank].shape.volume(level);
                volumes.push(Watch {
                    tank,
                    threshold,
                    way,
                });
            }
        }
        for (g, group) in self.plan.groups.iter().enumerate() {
            match &group.call {
                Call::Bands(bands) => self.watch_bands(t, g, bands, plant, volumes, figures),
                Call::Clock(_) => {}
                Call::Hold(rule) => self.watch_hold(g, rule, plant, figures),
            }
        }
    }

    fn watch_bands(
        &self,
        t: f64,
        g: usize,
        bands: &Bands,
        plant: &Plant,
        volumes: &mut Vec<Watch>,
        figures: &mut Vec<FigureWatch>,
    ) {
        let steps = steps_at(bands, self.shift.starts + t);
        for (step, latch) in steps.iter().zip(&self.groups[g].latches) {
            let (mut way, at) = if latch.on {
                (stop_way(*step), step.stop)
            } else {
                (start_way(*step), step.start)
            };
            let mut threshold = watched(plant, bands.follow, at);
            if latch.pending.is_some() {
                // It is reached; what matters now is whether it stays so. Just beyond, so that being there does not count.
                let nudge = 1e-9 * threshold.abs().max(1e-9);
                (way, threshold) = match way {
                    Way::Up => (Way::Down, threshold - nudge),
                    Way::Down => (Way::Up, threshold + nudge),
                };
            }
            match bands.follow {
                Follow::Level(node) => {
                    if let Some(tank) = self.shift.tank_at(node) {
                        volumes.push(Watch {
                            tank,
                            threshold,
                            way,
                        });
                    }
                }
                Follow::Pressure(_) | Follow::Flow(_) => figures.push(FigureWatch {
                    figure: Figure::Followed(g),
                    threshold,
                    way,
                }),
            }
        }
    }

    fn watch_hold(&self, g: usize, rule: &Hold, plant: &Plant, figures: &mut Vec<FigureWatch>) {
        let Some(h) = plant.holds.iter().position(|hold| hold.group == g) else {
            return;
        };
        let state = &self.groups[g];
        if state.called.is_empty() || state.called.len() != state.demand {
            return;
        }
        const NUDGE: f64 = 1e-9;
        if state.demand < self.plan.groups[g].pumps.len() {
            let (threshold, way) = match state.up_since {
                None => (rule.up_at, Way::Up),
                Some(_) => (rule.up_at - NUDGE, Way::Down),
            };
            figures.push(FigureWatch {
                figure: Figure::Speed(h),
                threshold,
                way,
            });
        }
        if state.demand > 1 {
            let (threshold, way) = match state.down_since {
                None => (rule.down_at, Way::Down),
                Some(_) => (rule.down_at + NUDGE, Way::Up),
            };
            let over = plant.holds[h].speeds[Side::Run as usize] <= rule.speeds.0;
            figures.push(FigureWatch {
                figure: Figure::Speed(h),
                threshold: rule.speeds.0 + if over { NUDGE } else { 0.0 },
                way: if over { Way::Up } else { Way::Down },
            });
            figures.push(FigureWatch {
                figure: Figure::Spare(h),
                threshold,
                way,
            });
        }
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

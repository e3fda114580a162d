//! What the rules ask for: how many pumps of a group should run.

use super::{Control, SLACK, start_way, steps_at, stop_way, wanted, watched};
use crate::shift::error::ShiftError;
use crate::shift::event::{Event, Wait, Why};
use crate::shift::plan::{Bands, Call, Follow, Hold};
use crate::shift::plant::{Plant, Side};

impl Control<'_> {
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
}

//! Who is called and sent home, so that as many run as the rules ask for; and the timers that stand in the way.

use super::{Control, HOUR, SLACK, event};
use crate::part::PumpId;
use crate::shift::event::{Event, Wait, What, Who, Why};
use crate::shift::plan::{Call, Follow, Group, Rotate};
use crate::shift::plant::Plant;

impl Control<'_> {
    /// Starts and stops until as many run as are wanted, or something has to be waited for.
    pub(super) fn adjust(
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

    /// Whether nothing but its own timers keeps a pump from running; else what it waits for and until when.
    pub(super) fn free(&mut self, pump: PumpId, t: f64) -> Result<(), (Option<Wait>, f64)> {
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

    pub(super) fn start(
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

    /// Stops a pump, whatever the reason.
    pub(super) fn halt(&mut self, t: f64, pump: PumpId, plant: &mut Plant) {
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

    /// Tells a holding group who runs.
    fn show_called(&self, g: usize, plant: &mut Plant) {
        if let Some(hold) = plant.holds.iter_mut().find(|hold| hold.group == g) {
            hold.pumps.clear();
            hold.pumps.extend_from_slice(&self.groups[g].called);
        }
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
}

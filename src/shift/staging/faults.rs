//! Faults and trips: what acts before any rule.

use super::{Control, SLACK, event};
use crate::network::CheckCondition;
use crate::part::PumpId;
use crate::shift::error::ShiftError;
use crate::shift::event::{Event, What, Who, Why};
use crate::shift::plan::{Fault, FaultKind, Follow};
use crate::shift::plant::Plant;

impl Control<'_> {
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
}

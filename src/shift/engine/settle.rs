//! What happens at one instant: everything that is due acts, then the network is solved as it stands.

use super::Engine;
use crate::network::NodeId;
use crate::shift::error::ShiftError;
use crate::shift::event::{Event, What, Who, Why};
use crate::shift::plan::Follow;
use crate::shift::plant::{Mode, Plant, STILL, Side};
use crate::shift::staging::SLACK;

impl Engine<'_> {
    /// Lets everything act that is due now, until nothing more changes; then the network is solved as it stands.
    pub(super) fn settle(&mut self) -> Result<(), ShiftError> {
        const ROUNDS: u32 = 200;
        let t = self.t;
        let first = self.effort.events == 0 && t == 0.0;
        self.old_reference.copy_from_slice(&self.plant.reference);
        self.toggles.fill(0);
        self.wake_ignored();
        for round in 0..ROUNDS {
            self.control.wake = f64::INFINITY;
            let tripped =
                self.control
                    .act_first(t, &self.sums, &mut self.plant, &mut self.events)?;
            self.plant.refresh(t);
            self.plant.place_holds(&self.sums);
            if self.looks && round == 0 {
                self.evaluate()?;
            }
            let staged =
                self.control
                    .act_staging(t, &self.sums, &mut self.plant, &mut self.events)?;
            self.evaluate()?;
            let limited = self.limits();
            if !(limited || self.looks && (tripped || staged)) {
                break;
            }
        }
        self.plant.set_reference();
        self.mark_levels();
        self.tell_lines(first);
        self.tell_cuts();
        let clock = self.shift.starts + t;
        if let Some(tariff) = &self.shift.tariff {
            self.meter.set_rate(tariff.rate_at(clock));
        }
        self.tally.look_at_npsh(&self.plant, Side::Run);
        Ok(())
    }

    pub(super) fn evaluate(&mut self) -> Result<(), ShiftError> {
        let Self {
            plant,
            sums,
            step,
            t,
            ..
        } = self;
        plant
            .evaluate(Side::Run, *t, sums, step.first_mut())
            .map_err(|error| ShiftError::Solve { time: *t, error })
    }

    /// Tanks that come to their floor or brim, or leave it; true if any did.
    fn limits(&mut self) -> bool {
        let mut changed = false;
        for i in 0..self.plant.tanks.len() {
            let net = self.step.first()[i];
            let volume = self.sums[i];
            let tank = &mut self.plant.tanks[i];
            // Twice at one instant is enough: a third time would be rounding.
            if self.toggles[i] >= 2 {
                continue;
            }
            let dry = volume <= tank.floor && net < -STILL;
            // Where the outflow dies away as the last of it goes, the floor is touched, never passed.
            let above = volume - tank.floor;
            let dried_up = above.abs() <= 1e-9 * tank.capacity && net.abs() <= STILL;
            let what = match tank.mode {
                Mode::Free if dry || dried_up => {
                    tank.mode = Mode::Floor;
                    What::Empty
                }
                Mode::Free if volume >= tank.capacity && net > STILL => {
                    tank.mode = Mode::Brim;
                    What::Spills
                }
                Mode::Floor if tank.leaving > STILL => {
                    tank.mode = Mode::Free;
                    self.plant
                        .settings
                        .set_tank_mode(tank.node, crate::network::TankMode::Held);
                    What::Refills
                }
                Mode::Brim if tank.leaving > STILL => {
                    tank.mode = Mode::Free;
                    What::StopsSpilling
                }
                _ => continue,
            };
            match what {
                What::Empty => self.sums[i] = volume.max(tank.floor),
                What::Spills => self.sums[i] = tank.capacity,
                _ => {}
            }
            self.toggles[i] += 1;
            let who = Who::Node(tank.node);
            self.tell(what, who, Why::Balance);
            changed = true;
        }
        changed
    }

    pub(super) fn tell(&mut self, what: What, who: Who, why: Why) {
        self.events.push(Event {
            time: self.t,
            what,
            who,
            why,
            wait: None,
        });
    }

    /// Alarms and trip levels: which side of them the levels are on.
    fn mark_levels(&mut self) {
        for i in 0..self.plant.tanks.len() {
            let tank = &self.shift.tanks[i];
            if let Some(alarm) = tank.alarm {
                let (threshold, slack) = self.alarm_volume(i, alarm);
                let above = self.alarms[i];
                let now = if above {
                    self.sums[i] > threshold - slack
                } else {
                    self.sums[i] >= threshold
                };
                if now != above {
                    self.alarms[i] = now;
                    let what = if now { What::Alarm } else { What::AlarmOver };
                    self.tell(
                        what,
                        Who::Node(tank.node),
                        Why::At(Follow::Level(tank.node), alarm),
                    );
                }
            }
        }
        for ((_, below), (tank, threshold)) in
            self.below_trip.iter_mut().zip(self.control.trip_levels())
        {
            let slack = 1e-9 * self.plant.tanks[tank].capacity;
            *below = if *below {
                self.sums[tank] < threshold + slack
            } else {
                self.sums[tank] <= threshold
            };
        }
    }

    /// Volume of an alarm, and how far below it the alarm is over: a hair, so that resting there is no chatter.
    pub(super) fn alarm_volume(&self, i: usize, alarm: f64) -> (f64, f64) {
        let threshold = self.shift.tanks[i].shape.volume(alarm);
        (threshold, 1e-9 * self.plant.tanks[i].capacity)
    }

    /// Tells which lines opened or shut, and which ports came above or below the surface.
    fn tell_lines(&mut self, first: bool) {
        for line in self.network.line_ids() {
            let (old, new) = (
                self.old_reference[line.index()],
                self.plant.reference[line.index()],
            );
            if old == new {
                continue;
            }
            let has = |condition: u8, bit: u8| condition & bit != 0;
            let (shut, open) = (Plant::SHUT, Plant::OPEN);
            let runs = self
                .network
                .line(line)
                .pumps()
                .any(|pump| self.control.pumps[pump.index()].running);
            if has(new, shut) && !has(old, shut) && (!first || runs) {
                self.tell(What::Shuts, Who::Line(line), Why::Head);
            } else if has(old, shut) && has(new, open) {
                self.tell(What::Opens, Who::Line(line), Why::Head);
            }
            if first {
                continue;
            }
            if has(new, open) && has(old, open) && old / Plant::REGULATES != new / Plant::REGULATES
            {
                let what = match new / Plant::REGULATES {
                    0 => What::WideOpen,
                    _ => What::Regulates,
                };
                self.tell(what, Who::Line(line), Why::Balance);
            }
            for port in [Plant::FROM_ABOVE, Plant::TO_ABOVE] {
                if has(new, port) != has(old, port) {
                    let what = if has(new, port) {
                        What::PortUncovered
                    } else {
                        What::PortCovered
                    };
                    self.tell(what, Who::Line(line), Why::Balance);
                }
            }
        }
    }

    fn tell_cuts(&mut self) {
        if self.cut.is_empty() && self.plant.cut_points().next().is_none() {
            return;
        }
        let now: Vec<NodeId> = self.plant.cut_points().collect();
        let before = std::mem::take(&mut self.cut);
        for node in now.iter().filter(|node| !before.contains(node)) {
            self.tell(What::Unmet, Who::Node(*node), Why::Balance);
        }
        for node in before.iter().filter(|node| !now.contains(node)) {
            self.tell(What::Met, Who::Node(*node), Why::Balance);
        }
        self.cut = now;
    }

    /// Lines that were let be for a while are looked at again.
    fn wake_ignored(&mut self) {
        for (ignored, quiet) in self.plant.ignored.iter_mut().zip(&self.quiet) {
            *ignored = self.t < quiet.last + quiet.span - SLACK;
        }
    }
}

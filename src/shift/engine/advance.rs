//! From one instant to the next: steps under error control that end where a line opens or shuts.

use std::ops::ControlFlow;

use super::{Engine, LOCATED, Stiffness};
use crate::network::LineId;
use crate::shift::crossing::Way;
use crate::shift::error::ShiftError;
use crate::shift::hold::Place;
use crate::shift::plant::{Mode, STILL, Side};
use crate::shift::record::Sink;
use crate::shift::staging::{Figure, FigureWatch, SLACK, Watch};

impl Engine<'_> {
    /// Steps until something happens or is due.
    pub(super) fn advance(&mut self, sink: &mut impl Sink) -> Result<(), ShiftError> {
        const MOST_STEPS: u32 = 500_000;
        let stop = self.next_time();
        self.collect_watches();
        for taken in 0..MOST_STEPS {
            // Where even the implicit method cannot settle, between laminar and turbulent flow within nanometres of level, levels to a
            // millionth are good enough after a thousand steps without an event.
            self.slack = 10_f64.powi((taken / 1000).min(3) as i32);
            let remaining = stop - self.t;
            if remaining <= 0.0 {
                self.t = stop;
                return Ok(());
            }
            let flip = self.try_steps(remaining)?;
            let event = self.first_event()?;
            let theta = event.unwrap_or(1.0);
            let whole = self.step.h >= remaining;
            let end = match event {
                None if whole => stop,
                _ => self.t + theta * self.step.h,
            };
            self.pass(theta, end, sink)?;
            self.t = end;
            if event.is_some() {
                return Ok(());
            }
            self.step.shift();
            if let Some(line) = flip {
                let quiet = &mut self.quiet[line.index()];
                let soon = end - quiet.last < 2.0 * quiet.span;
                quiet.span = if soon {
                    (2.0 * quiet.span).min(3600.0)
                } else {
                    1.0
                };
                quiet.last = end;
                return Ok(());
            }
            if self.t >= stop {
                return Ok(());
            }
        }
        Err(ShiftError::Stuck { time: self.t })
    }

    /// The next time at which a step has to end.
    fn next_time(&self) -> f64 {
        let clock = self.shift.starts + self.t;
        let tariff = self.shift.tariff.as_ref();
        let rate = tariff.map_or(f64::INFINITY, |tariff| {
            tariff.next_edge(clock) - self.shift.starts
        });
        let looked_at_again = self
            .quiet
            .iter()
            .map(|quiet| quiet.last + quiet.span)
            .filter(|time| *time > self.t + SLACK)
            .fold(f64::INFINITY, f64::min);
        self.plant
            .next_corner(self.t)
            .min(self.control.wake)
            .min(rate)
            .min(looked_at_again)
            .min(self.shift.lasts)
    }

    fn collect_watches(&mut self) {
        self.watches.clear();
        self.figure_watches.clear();
        self.control.watches(
            self.t,
            &self.plant,
            &mut self.watches,
            &mut self.figure_watches,
        );
        for (i, tank) in self.plant.tanks.iter().enumerate() {
            let mut watch = |threshold, way| {
                self.watches.push(Watch {
                    tank: i,
                    threshold,
                    way,
                });
            };
            match tank.mode {
                Mode::Free => {
                    watch(tank.floor, Way::Down);
                    watch(tank.capacity, Way::Up);
                }
                Mode::Floor | Mode::Brim => self.figure_watches.push(FigureWatch {
                    figure: Figure::Leaving(i),
                    threshold: 2.0 * STILL,
                    way: Way::Up,
                }),
            }
        }
        for i in 0..self.plant.tanks.len() {
            if let Some(alarm) = self.shift.tanks[i].alarm {
                let (threshold, slack) = self.alarm_volume(i, alarm);
                self.watches.push(if self.alarms[i] {
                    Watch {
                        tank: i,
                        threshold: threshold - slack,
                        way: Way::Down,
                    }
                } else {
                    Watch {
                        tank: i,
                        threshold,
                        way: Way::Up,
                    }
                });
            }
        }
        for ((_, below), (tank, threshold)) in
            self.below_trip.iter().zip(self.control.trip_levels())
        {
            let slack = 1e-9 * self.plant.tanks[tank].capacity;
            let (threshold, way) = if *below {
                (threshold + slack, Way::Up)
            } else {
                (threshold, Way::Down)
            };
            self.watches.push(Watch {
                tank,
                threshold,
                way,
            });
        }
        for hold in &self.plant.holds {
            let Some(tank) = hold.tank else { continue };
            let (low, set, high) = self.plant.hold_band(hold, tank);
            let mut watch = |threshold, way| {
                self.watches.push(Watch {
                    tank,
                    threshold,
                    way,
                });
            };
            match hold.place {
                Place::Above => watch(set, Way::Down),
                Place::Below => watch(set, Way::Up),
                Place::There => {
                    watch(low, Way::Down);
                    watch(high, Way::Up);
                }
            }
        }
    }

    /// Takes a step that the error control accepts and inside which no line opens or shuts; it ends just before one does, or
    /// just after, and then tells which.
    fn try_steps(&mut self, remaining: f64) -> Result<Option<LineId>, ShiftError> {
        let mut h = if self.length >= remaining {
            remaining
        } else if 2.0 * self.length > remaining {
            0.5 * remaining
        } else {
            self.length
        };
        // Steps known to end before, and after, a flip.
        let (mut before, mut after) = (0.0, f64::INFINITY);
        loop {
            let passing = h <= 2.0 * LOCATED;
            let Stages::Settled(flip) = self.stages(h, !passing)? else {
                self.effort.rejected += 1;
                h *= 0.25;
                (before, after) = (0.0, f64::INFINITY);
                self.length = h;
                if h < SHORTEST_IMPLICIT {
                    self.stiffness = Stiffness {
                        left_for: LEFT_FOR,
                        ..Stiffness::default()
                    };
                }
                continue;
            };
            if let (Some(_), false) = (flip, passing) {
                self.effort.rejected += 1;
                after = h;
                if before >= after {
                    // Right at the flip the last digits decide: what stood once need not stand again.
                    before = 0.0;
                }
                h = if after - before <= LOCATED && before > 0.0 {
                    before
                } else {
                    0.5 * (before + after)
                };
                continue;
            }
            let error = self
                .step
                .error(&self.sums, |i, size| self.tolerated(i, size));
            let stands = error <= 1.0;
            if !stands && h > 1e-9 {
                self.effort.rejected += 1;
                let shrink = (0.9 * error.powf(-1.0 / self.order())).clamp(0.1, 0.9);
                h *= if shrink.is_nan() { 0.1 } else { shrink };
                // The error asks for less than the flip does: a later step will come to that.
                (before, after) = (0.0, f64::INFINITY);
                self.length = h;
                continue;
            }
            if after.is_finite() && after - h > LOCATED && flip.is_none() {
                before = h;
                h = 0.5 * (before + after);
                continue;
            }
            self.effort.steps += 1;
            // Growth by the last two errors (K. Gustafsson, ACM Trans. Math. Softw. 17, 1991).
            let error = error.max(1e-8);
            let order = self.order();
            let growth = 0.9 * error.powf(-0.7 / order) * self.last_error.powf(0.4 / order);
            let next = h * growth.clamp(0.2, 5.0);
            // A step cut short by an event says little about how long one may be.
            let cut_short = h >= remaining || after.is_finite();
            self.length = if cut_short {
                self.length.max(next)
            } else {
                next
            };
            self.last_error = error;
            self.judge_stiffness();
            return Ok(flip.filter(|_| passing));
        }
    }

    /// Error of a step that a volume of this size may have.
    fn tolerated(&self, tank: usize, size: f64) -> f64 {
        // A stiff course comes to rest by itself; what is asked of levels (1e-4 m) is still a hundred times coarser.
        let slack = if self.stiffness.on { 100.0 } else { 1.0 };
        let tolerance = self.slack.max(slack) * self.tolerance;
        1e-4 * tolerance * self.plant.tanks[tank].capacity + tolerance * size
    }

    /// With which power of its length the error of a step falls.
    fn order(&self) -> f64 {
        if self.stiffness.on { 4.0 } else { 5.0 }
    }

    /// Changes to the other method when that has been the better one for a while.
    fn judge_stiffness(&mut self) {
        /// Steps in a row: E. Hairer, G. Wanner, Solving Ordinary Differential Equations II (1996), section IV.2.
        const LONG_ENOUGH: u32 = 15;
        /// h times the fastest rate at which an explicit step of that length would stand too.
        const EASY: f64 = 1.0;
        let stiffness = &mut self.stiffness;
        if stiffness.left_for > 0 {
            stiffness.left_for -= 1;
            return;
        }
        let other_is_better = match stiffness.on {
            false => self.step.is_stiff(),
            true => stiffness.fastest < EASY,
        };
        stiffness.count = match other_is_better {
            true => stiffness.count + 1,
            false => stiffness.count.saturating_sub(3),
        };
        if stiffness.count >= LONG_ENOUGH {
            stiffness.on = !stiffness.on;
            stiffness.count = 0;
        }
    }

    /// The stages of a step; those of an explicit one stop at the first flip if asked to.
    fn stages(&mut self, h: f64, stop_at_flip: bool) -> Result<Stages, ShiftError> {
        if self.stiffness.on {
            return self.implicit_stages(h);
        }
        let Self {
            plant,
            step,
            sums,
            t,
            ..
        } = self;
        let time = *t;
        let mut flip = None;
        let _ = step.take(time, h, sums, |t, y, rates| {
            plant
                .evaluate(Side::Run, t, y, rates)
                .map_err(|error| ShiftError::Solve { time, error })?;
            flip = flip.or(plant.flip);
            Ok::<_, ShiftError>(if flip.is_some() && stop_at_flip {
                ControlFlow::Break(())
            } else {
                ControlFlow::Continue(())
            })
        })?;
        Ok(Stages::Settled(flip))
    }

    /// The stages of an implicit step. On the way to them lines may open and shut: only the last look at each stage counts.
    fn implicit_stages(&mut self, h: f64) -> Result<Stages, ShiftError> {
        let small: Vec<f64> = (0..self.plant.tanks.len())
            .map(|tank| 0.01 * self.tolerated(tank, self.sums[tank]))
            .collect();
        let Self {
            plant,
            step,
            sums,
            t,
            stiffness,
            ..
        } = self;
        let time = *t;
        let mut flips = [None; 3];
        let taken = step.take_implicit(
            time,
            h,
            sums,
            |tank| small[tank],
            |t, y, rates| {
                plant
                    .evaluate(Side::Run, t, y, rates)
                    .map_err(|error| ShiftError::Solve { time, error })?;
                flips.rotate_left(1);
                flips[2] = plant.flip;
                Ok::<_, ShiftError>(())
            },
        )?;
        Ok(match taken {
            None => Stages::Unsettled,
            Some(fastest) => {
                stiffness.fastest = fastest;
                Stages::Settled(flips.into_iter().flatten().next())
            }
        })
    }
}

/// An implicit step that does not settle at this length, s, is left to the explicit method.
const SHORTEST_IMPLICIT: f64 = 1e-6;
/// For so many steps, before the implicit one may try again.
const LEFT_FOR: u32 = 3000;

/// What came of the stages of a step.
enum Stages {
    /// They stand; a line that opens or shuts in the step, if any.
    Settled(Option<LineId>),
    /// No such step: it must be shorter.
    Unsettled,
}

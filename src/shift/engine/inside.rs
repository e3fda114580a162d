//! Inside a step: what that is waited for comes about first, and what is reported, metered and summed on the way there.

use super::{Engine, LOCATED, fill_row};
use crate::shift::crossing::{Stretches, Way, first_reach};
use crate::shift::error::ShiftError;
use crate::shift::plant::Side;
use crate::shift::record::{Row, Sink};
use crate::shift::root::far_side;
use crate::shift::staging::{Figure, FigureWatch, SLACK};

impl Engine<'_> {
    /// The first place in the step at which something that is waited for comes about.
    pub(super) fn first_event(&mut self) -> Result<Option<f64>, ShiftError> {
        let mut first: Option<f64> = None;
        let mut earlier = |theta: f64| {
            if first.is_none_or(|first| theta < first) {
                first = Some(theta);
            }
        };
        for watch in &self.watches {
            let start = self.sums[watch.tank];
            if let Some(theta) =
                first_reach(&self.step, watch.tank, start, watch.threshold, watch.way)
            {
                earlier(theta);
            }
        }
        if self.figure_watches.is_empty() {
            return Ok(first);
        }
        // What the last stage knew, before anything else is looked at.
        let watches = std::mem::take(&mut self.figure_watches);
        let mut values = std::mem::take(&mut self.figure_values);
        values.clear();
        for watch in &watches {
            let value = self.figure_value(Side::Run, self.t + self.step.h, watch)?;
            values.push(value);
        }
        for (watch, end) in watches.iter().zip(&values) {
            let limit = first.unwrap_or(1.0);
            let mut bracket = (limit == 1.0 && *end >= 0.0).then_some((1.0, *end));
            for place in [0.5 * limit, limit] {
                if bracket.is_some_and(|(theta, _)| theta <= place) {
                    continue;
                }
                let value = self.figure_inside(place, watch)?;
                if value >= 0.0 {
                    bracket = Some((place, value));
                    break;
                }
            }
            if let Some(far) = bracket {
                let tolerance = (LOCATED / self.step.h).max(1e-15);
                let start = self.figure_inside(0.0, watch)?;
                if start >= 0.0 {
                    // It was there already; what acts on it has acted.
                    continue;
                }
                let near = (0.0, start);
                let theta = far_side(near, far, tolerance, |theta| {
                    self.figure_inside(theta, watch)
                })?;
                first = Some(theta);
            }
        }
        self.figure_watches = watches;
        self.figure_values = values;
        Ok(first)
    }

    /// How far a figure is past what is waited for at a place inside the step.
    fn figure_inside(&mut self, theta: f64, watch: &FigureWatch) -> Result<f64, ShiftError> {
        self.look_inside(Side::Trial, theta)?;
        self.figure_value(Side::Trial, self.t + theta * self.step.h, watch)
    }

    fn figure_value(&mut self, side: Side, t: f64, watch: &FigureWatch) -> Result<f64, ShiftError> {
        let value = match watch.figure {
            Figure::Leaving(i) => self.plant.tanks[i].leaving,
            Figure::Followed(g) => self.plant.figures[g],
            Figure::Speed(h) => self.plant.holds[h].speeds[side as usize],
            Figure::Spare(h) => self
                .plant
                .spare_speed(t, h)
                .map_err(|error| self.solve_error(error))?
                .unwrap_or(f64::INFINITY),
        };
        let past = match watch.way {
            Way::Up => value - watch.threshold,
            Way::Down => watch.threshold - value,
        };
        Ok(if past.is_nan() { -1.0 } else { past })
    }

    /// Solves at a place inside the step, off the run.
    fn look_inside(&mut self, side: Side, theta: f64) -> Result<(), ShiftError> {
        let Self {
            plant,
            step,
            sums,
            inside,
            inside_rates,
            t,
            ..
        } = self;
        for (i, volume) in inside.iter_mut().enumerate() {
            *volume = step.at(i, sums[i], theta);
        }
        let time = *t + theta * step.h;
        plant
            .evaluate(side, time, inside, inside_rates)
            .map_err(|error| ShiftError::Solve { time, error })
    }

    /// Goes on to `theta` of the step: reports, meters and sums.
    pub(super) fn pass(
        &mut self,
        theta: f64,
        end: f64,
        sink: &mut impl Sink,
    ) -> Result<(), ShiftError> {
        self.look_inside(Side::Report, theta)?;
        self.tally.look_at_npsh(&self.plant, Side::Report);
        while let Some(time) = self.report_time() {
            if time >= end - SLACK {
                break;
            }
            self.next_report += 1;
            self.look_inside(Side::Report, (time - self.t) / self.step.h)?;
            fill_row(
                &mut self.row,
                &self.plant,
                Side::Report,
                &self.inside,
                &self.inside_rates,
            );
            let row = Row {
                time,
                values: &self.row,
                events: &[],
            };
            if sink.row(row).is_break() {
                return Err(ShiftError::Stopped { time });
            }
        }
        for i in 0..self.plant.tanks.len() {
            let polynomial = self.step.polynomial(i);
            for &place in Stretches::of(polynomial).places() {
                self.tally
                    .see_volume(i, self.step.at(i, self.sums[i], place.min(theta)));
            }
        }
        let length = theta * self.step.h;
        self.tally.span(
            length,
            theta,
            &self.step,
            &self.plant,
            &self.alarms,
            &self.below_trip,
        );
        let total = self.plant.books.total_energy();
        let starts = self.shift.starts;
        let (step, before, t) = (&self.step, self.sums[total], self.t);
        let at = |clock: f64| {
            step.at(
                total,
                before,
                ((clock - starts - t) / step.h).clamp(0.0, theta),
            )
        };
        self.meter
            .count(starts + end, step.at(total, before, theta), at);
        self.step.advance(&mut self.sums, theta);
        for i in 0..self.plant.tanks.len() {
            // The same expression that the watch looked at, to the last bit.
            self.tally.see_volume(i, self.sums[i]);
        }
        Ok(())
    }
}

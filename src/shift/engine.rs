//! The run itself: settle what happens at an instant, step to the next, hand out rows on the way.

use super::crossing::{Stretches, Way, first_reach};
use super::dormand_prince::Step;
use super::energy::Meter;
use super::error::ShiftError;
use super::event::{Event, What, Who, Why};
use super::hold::Place;
use super::plan::{Call, Follow, Plan, Shift};
use super::plant::{Mode, Plant, STILL, Side};
use super::record::{Row, Sink};
use super::root::far_side;
use super::score::Score;
use super::staging::{Control, Figure, FigureWatch, SLACK, Watch};
use super::tally::Tally;
use crate::network::{LineId, Network, NodeId};
use crate::solve::operation;
use std::ops::ControlFlow;

/// Relative tolerance of the volumes in a step, where the shift asks for none.
const TOLERANCE: f64 = 1e-9;

/// Events are located to this, s.
const LOCATED: f64 = 5e-7;

/// How a run ended.
#[derive(Clone, Debug, PartialEq)]
pub struct Outcome {
    /// s from the start.
    pub ends_at: f64,
    /// What it is judged by.
    pub score: Score,
    /// What it took.
    pub effort: Effort,
}

/// What a run took.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Effort {
    /// Steps that stood.
    pub steps: u64,
    /// Steps that were tried in vain.
    pub rejected: u64,
    /// Steady solutions for the run, those for reports apart.
    pub solves: u64,
    /// Events.
    pub events: u64,
}

/// Runs a plan over a shift; rows go to `sink` as they come. The same input gives the same bits, whatever is reported.
///
/// # Errors
/// See [`ShiftError`].
pub fn run(
    network: &Network,
    shift: &Shift,
    plan: &Plan,
    sink: &mut impl Sink,
) -> Result<Outcome, ShiftError> {
    shift.check(network)?;
    plan.check(network, shift)?;
    Engine::new(network, shift, plan).run(sink)
}

/// A line that opens and shuts again and again is looked at less and less often, so that a rest at the very point where it
/// opens does not fill the log.
#[derive(Clone, Copy, Debug)]
struct Quiet {
    last: f64,
    span: f64,
}

struct Engine<'a> {
    network: &'a Network,
    shift: &'a Shift,
    plan: &'a Plan,
    plant: Plant<'a>,
    control: Control<'a>,
    step: Step,
    /// All sums, the volumes first.
    sums: Vec<f64>,
    t: f64,
    /// The length that the error control would take next, s.
    length: f64,
    /// Error of the last step that stood, over its tolerance.
    last_error: f64,
    tolerance: f64,
    /// Factor on it.
    slack: f64,
    watches: Vec<Watch>,
    figure_watches: Vec<FigureWatch>,
    figure_values: Vec<f64>,
    /// Volumes at a place inside a step, and rates there.
    inside: Vec<f64>,
    inside_rates: Vec<f64>,
    row: Vec<f64>,
    events: Vec<Event>,
    alarms: Vec<bool>,
    /// Per trip level: its tank, and whether the level is below.
    below_trip: Vec<(usize, bool)>,
    toggles: Vec<u8>,
    cut: Vec<NodeId>,
    quiet: Vec<Quiet>,
    old_reference: Vec<u8>,
    next_report: u64,
    /// Whether a rule looks at figures that take a solution.
    looks: bool,
    meter: Meter,
    tally: Tally,
    effort: Effort,
}

impl<'a> Engine<'a> {
    fn new(network: &'a Network, shift: &'a Shift, plan: &'a Plan) -> Self {
        let plant = Plant::new(network, shift, Control::follows(plan));
        let books = plant.books;
        let mut sums = vec![0.0; books.len()];
        for (volume, tank) in sums.iter_mut().zip(&plant.tanks) {
            *volume = tank.start_volume;
        }
        let control = Control::new(network, shift, plan);
        let looks = plan.groups.iter().any(|group| match &group.call {
            Call::Bands(bands) => !matches!(bands.follow, Follow::Level(_)),
            Call::Hold(_) => true,
            Call::Clock(_) => false,
        });
        Self {
            network,
            shift,
            plan,
            step: Step::new(books.tanks, books.len()),
            inside: vec![0.0; books.tanks],
            inside_rates: vec![0.0; books.len()],
            t: 0.0,
            length: shift.lasts,
            last_error: 1e-2,
            tolerance: shift.tolerance.unwrap_or(TOLERANCE),
            slack: 1.0,
            watches: Vec::new(),
            figure_watches: Vec::new(),
            figure_values: Vec::new(),
            row: Vec::new(),
            events: Vec::new(),
            alarms: vec![false; books.tanks],
            below_trip: control
                .trip_levels()
                .map(|(tank, _)| (tank, false))
                .collect(),
            toggles: vec![0; books.tanks],
            cut: Vec::new(),
            quiet: vec![
                Quiet {
                    last: f64::NEG_INFINITY,
                    span: 0.5,
                };
                network.lines().len()
            ],
            old_reference: vec![0; network.lines().len()],
            next_report: 0,
            looks,
            meter: Meter::new(shift.starts),
            tally: Tally::new(network, shift, &sums),
            effort: Effort::default(),
            sums,
            plant,
            control,
        }
    }

    fn run(mut self, sink: &mut impl Sink) -> Result<Outcome, ShiftError> {
        self.control.begin(&mut self.plant, &self.sums);
        self.settle()?;
        self.emit(sink)?;
        while self.t < self.shift.lasts {
            self.advance(sink)?;
            if self.t >= self.shift.lasts {
                break;
            }
            self.settle()?;
            self.emit(sink)?;
        }
        self.finish(sink)
    }

    fn solve_error(&self, error: crate::solve::SolveError) -> ShiftError {
        ShiftError::Solve {
            time: self.t,
            error,
        }
    }

    /// Lets everything act that is due now, until nothing more changes; then the network is solved as it stands.
    fn settle(&mut self) -> Result<(), ShiftError> {
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

    fn evaluate(&mut self) -> Result<(), ShiftError> {
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

    fn tell(&mut self, what: What, who: Who, why: Why) {
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
    fn alarm_volume(&self, i: usize, alarm: f64) -> (f64, f64) {
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

    /// Steps until something happens or is due.
    fn advance(&mut self, sink: &mut impl Sink) -> Result<(), ShiftError> {
        const MOST_STEPS: u32 = 2_000_000;
        let stop = self.next_time();
        self.collect_watches();
        for taken in 0..MOST_STEPS {
            // Two tanks that have come level through a wide pipe pull at each other harder the closer they are: no explicit step
            // rests there. After a thousand steps without an event, levels to a millionth are good enough.
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
            let flip = self.stages(h, !passing)?;
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
            let tolerance = self.slack * self.tolerance;
            let tanks = &self.plant.tanks;
            let error = self.step.error(&self.sums, |i, size| {
                1e-4 * tolerance * tanks[i].capacity + tolerance * size
            });
            if !(error <= 1.0) && h > 1e-9 {
                self.effort.rejected += 1;
                let shrink = (0.9 * error.powf(-0.2)).clamp(0.1, 0.9);
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
            let growth = 0.9 * error.powf(-0.7 / 5.0) * self.last_error.powf(0.4 / 5.0);
            let next = h * growth.clamp(0.2, 5.0);
            // A step cut short by an event says little about how long one may be.
            let cut_short = h >= remaining || after.is_finite();
            self.length = if cut_short {
                self.length.max(next)
            } else {
                next
            };
            self.last_error = error;
            return Ok(flip.filter(|_| passing));
        }
    }

    /// The stages of a step; stops at the first flip if asked to.
    fn stages(&mut self, h: f64, stop_at_flip: bool) -> Result<Option<LineId>, ShiftError> {
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
        Ok(flip)
    }

    /// The first place in the step at which something that is waited for comes about.
    fn first_event(&mut self) -> Result<Option<f64>, ShiftError> {
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
    fn pass(&mut self, theta: f64, end: f64, sink: &mut impl Sink) -> Result<(), ShiftError> {
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

    fn report_time(&self) -> Option<f64> {
        self.shift
            .report_every
            .map(|every| every * self.next_report as f64)
    }

    /// Hands out a row if something happened now or one is due.
    fn emit(&mut self, sink: &mut impl Sink) -> Result<(), ShiftError> {
        let mut due = self.t == 0.0;
        while self
            .report_time()
            .is_some_and(|time| time <= self.t + SLACK)
        {
            self.next_report += 1;
            due = true;
        }
        if !(due || !self.events.is_empty()) {
            return Ok(());
        }
        self.events.sort_by_key(|event| event.what);
        self.effort.events += self.events.len() as u64;
        let volumes = &self.sums[..self.plant.books.tanks];
        fill_row(
            &mut self.row,
            &self.plant,
            Side::Run,
            volumes,
            self.step.first(),
        );
        let row = Row {
            time: self.t,
            values: &self.row,
            events: &self.events,
        };
        let flow = sink.row(row);
        self.events.clear();
        match flow {
            ControlFlow::Break(()) => Err(ShiftError::Stopped { time: self.t }),
            ControlFlow::Continue(()) => Ok(()),
        }
    }

    fn finish(mut self, sink: &mut impl Sink) -> Result<Outcome, ShiftError> {
        self.meter.finish();
        // Levels only: nothing starts or stops at the very end.
        self.evaluate()?;
        self.tell(What::End, Who::Shift, Why::Time);
        self.emit(sink)?;
        self.effort.solves = self.plant.solves;
        let ends_at = self.t;
        let score = self.tally.finish(
            self.t,
            &self.sums,
            &self.plant,
            &self.control,
            &self.meter,
            self.plan,
        );
        Ok(Outcome {
            ends_at,
            score,
            effort: self.effort,
        })
    }
}

/// Fills a row in the order of [`super::columns`].
fn fill_row(row: &mut Vec<f64>, plant: &Plant, side: Side, volumes: &[f64], rates: &[f64]) {
    let (network, books) = (plant.network, plant.books);
    row.clear();
    for (i, &volume) in volumes.iter().enumerate() {
        row.extend([
            plant.level(i, volume),
            volume,
            rates[books.inflow(i)],
            rates[books.outflow(i)],
            rates[books.spilled(i)],
        ]);
    }
    for node in network.node_ids().filter(|node| network.is_point(*node)) {
        row.push(plant.figure(side, Follow::Pressure(node)));
    }
    row.extend_from_slice(plant.answer(side).flows());
    for pump in network.pump_ids() {
        let setting = plant.settings.pump(pump);
        let i = pump.index();
        row.push(f64::from(setting.running));
        row.push(if setting.running { setting.speed } else { 0.0 });
        let line = network.line_of(pump);
        if network.pump(pump).name != network.line(line).name {
            row.push(plant.answer(side).flow(line));
        }
        let operation = operation::pump(network, &plant.settings, plant.answer(side), pump);
        row.push(operation.npsh_available.unwrap_or(f64::NAN));
        row.push(rates[books.shaft_energy(i)]);
        row.push(rates[books.energy(i)]);
    }
}

//! The run itself: settle what happens at an instant, step to the next, hand out rows on the way.

mod advance;
mod inside;
mod settle;

use super::energy::Meter;
use super::error::ShiftError;
use super::event::{Event, What, Who, Why};
use super::plan::{Call, Follow, Plan, Shift};
use super::plant::{Plant, Side};
use super::record::{Row, Sink};
use super::score::Score;
use super::staging::{Control, FigureWatch, SLACK, Watch};
use super::step::Step;
use super::tally::Tally;
use crate::network::{Network, NodeId};
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

/// Which method steps, and how long the other has been the better one.
#[derive(Clone, Copy, Debug, Default)]
struct Stiffness {
    /// The implicit method steps.
    on: bool,
    /// Steps in a row that asked for the other method, less those that did not.
    count: u32,
    /// h times the size of the fastest rate in the last implicit step.
    fastest: f64,
    /// Steps for which the implicit method is not tried.
    left_for: u32,
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
    stiffness: Stiffness,
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
            stiffness: Stiffness::default(),
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
        if !due && self.events.is_empty() {
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

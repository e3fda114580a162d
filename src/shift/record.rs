//! The run as rows: what the columns are, where rows go, and a record that keeps them.

use super::event::Event;
use super::plan::Shift;
use crate::network::{Network, NodeKind};
use crate::units::Kind;
use std::ops::ControlFlow;

/// A column of the time series.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Column {
    /// Whose figure.
    pub name: String,
    /// Which figure: `level`, `flow`, ..
    pub figure: &'static str,
    /// What it measures; none for a plain number.
    pub kind: Option<Kind>,
}

/// One row: at a report time, or at the exact time of events.
#[derive(Clone, Copy, Debug)]
pub struct Row<'r> {
    /// s from the start of the shift.
    pub time: f64,
    /// One value per column, SI; NaN where there is none. At an event: just after it.
    pub values: &'r [f64],
    /// What happened at that time, in order.
    pub events: &'r [Event],
}

/// Takes rows as they come, in order of time.
pub trait Sink {
    /// The next row; a break ends the run with [`super::ShiftError::Stopped`].
    fn row(&mut self, row: Row<'_>) -> ControlFlow<()>;
}

/// Takes nothing.
impl Sink for () {
    fn row(&mut self, _: Row<'_>) -> ControlFlow<()> {
        ControlFlow::Continue(())
    }
}

impl<F: FnMut(Row<'_>) -> ControlFlow<()>> Sink for F {
    fn row(&mut self, row: Row<'_>) -> ControlFlow<()> {
        self(row)
    }
}

/// The columns of a run: for each tank level, volume, inflow, outflow and spill; for each point its pressure; for each line its
/// flow; for each pump whether it runs, its speed, flow (where its name is not its line's), NPSH available, shaft and electrical power.
pub fn columns(network: &Network, shift: &Shift) -> Vec<Column> {
    let mut columns = Vec::new();
    let mut add = |name: &str, figures: &[(&'static str, Option<Kind>)]| {
        for &(figure, kind) in figures {
            columns.push(Column {
                name: name.to_owned(),
                figure,
                kind,
            });
        }
    };
    for tank in &shift.tanks {
        let figures = [
            ("level", Some(Kind::Length)),
            ("volume", Some(Kind::Volume)),
            ("inflow", Some(Kind::Flow)),
            ("outflow", Some(Kind::Flow)),
            ("spill", Some(Kind::Flow)),
        ];
        add(&network.node(tank.node).name, &figures);
    }
    for node in network.nodes() {
        if matches!(node.kind, NodeKind::Point { .. }) {
            add(&node.name, &[("pressure", Some(Kind::Pressure))]);
        }
    }
    for line in network.lines() {
        add(&line.name, &[("flow", Some(Kind::Flow))]);
    }
    for id in network.pump_ids() {
        let name = &network.pump(id).name;
        add(name, &[("running", None), ("speed", Some(Kind::Percent))]);
        if *name != network.line(network.line_of(id)).name {
            add(name, &[("flow", Some(Kind::Flow))]);
        }
        let power = Some(Kind::Power);
        add(name, &[("npsh_available", Some(Kind::Length))]);
        add(name, &[("shaft_power", power), ("power", power)]);
    }
    columns
}

/// A whole run in memory: equal-length columns, time strictly rising, events in order.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Record {
    times: Vec<f64>,
    values: Vec<Vec<f64>>,
    events: Vec<Event>,
}

impl Record {
    /// Empty.
    pub fn new() -> Self {
        Self::default()
    }

    /// Times of the rows, s from the start of the shift.
    pub fn times(&self) -> &[f64] {
        &self.times
    }

    /// Values of a column (by position in [`columns`]), one per row.
    pub fn column(&self, position: usize) -> &[f64] {
        &self.values[position]
    }

    /// What happened, in order.
    pub fn events(&self) -> &[Event] {
        &self.events
    }
}

impl Sink for Record {
    fn row(&mut self, row: Row<'_>) -> ControlFlow<()> {
        self.values.resize_with(row.values.len(), Vec::new);
        self.times.push(row.time);
        for (column, value) in self.values.iter_mut().zip(row.values) {
            column.push(*value);
        }
        self.events.extend_from_slice(row.events);
        ControlFlow::Continue(())
    }
}

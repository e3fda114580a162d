//! A network over time: tanks fill and drain, rules start and stop pumps, and the books stay closed.
//!
//! ```text
//! state:       volume V of each tank
//! dV/dt        = sum of line flows in - out + inflow - draw - spilled      at each instant a steady solution of the network
//! between events   Dormand–Prince 5(4) with error control; V, energies and all other sums by the same weights
//! event            where a level, a figure or a timer reaches what a rule waits for, or a one-way line opens or shuts:
//!                  located by bracketing to 1e-6 s, acted on, and the integration restarts
//! ```
//!
//! Nothing rounds to a time step; how often a row is reported changes no event time, because reports are solved beside
//! the run, not in it.
//!
//! A tank is free, at its floor (it passes on only what flows in) or at its brim (it spills what is left over). At equal
//! times faults and trips act first, then tank limits, schedules, staging and timers; then the network is solved once more.
//!
//! [`run`] takes a [`Shift`] (what happens to the network) and a [`Plan`] (who decides what runs) and hands rows to a
//! [`Sink`] as it goes, so memory does not grow with the length of the run. This module knows no units, files or clock of
//! the machine; a time of day is a number in the [`Shift`].

mod books;
mod crossing;
mod dormand_prince;
mod energy;
mod engine;
mod error;
mod event;
mod hold;
mod plan;
mod plant;
mod radau;
mod record;
mod root;
mod schedule;
mod score;
mod staging;
mod step;
mod tally;
mod tank;

pub use energy::{Tariff, TariffWindow};
pub use engine::{Effort, Outcome, run};
pub use error::ShiftError;
pub use event::{Event, Wait, What, Who, Why};
pub use plan::{
    Bands, Call, Exercise, Fault, FaultKind, Follow, Group, Hold, HoldStyle, Plan, PlanError,
    PointDraw, Rotate, Shift, Step, Trip, Varying, Window,
};
pub use record::{Column, Record, Row, Sink, columns};
pub use schedule::{Between, Daily, Schedule, ScheduleError};
pub use score::{PumpScore, Score, TankScore};
pub use tank::{Gas, Shape, ShapeError, Tank};

//! Figures that are not known exactly: how far that carries into what the system does, and which of them matters most.
//!
//! ```text
//! draw t of each input -> value of each figure it acts on -> solve near the middle -> measures, needs, cautions
//!    (a stream a case)        (no text is read)                (always from there)          (kept in order)
//! ```
//!
//! A case depends on the seed and its own number alone, and all sums run in the order of the cases: the same request gives the
//! same bits on any number of threads.

mod draw;
mod influence;
mod measure;
mod response;
mod run;
mod tally;

pub use draw::Draw;
pub use influence::{Influence, Share, Way};
pub use measure::{Measure, Point, measures};
pub use response::{Effect, Input, Reading, ResponseError, Responses};
pub use run::{Case, Request, Study, run};
pub use tally::{About, Band, Broken, Needs};

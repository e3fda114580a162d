//! Finished figures put into a form: tables, CSV, JSON, sentences. Computes nothing.

mod cautions;
pub mod chart;
pub mod curves;
pub mod describe;
pub mod duty;
pub mod grid;
pub mod json;
pub mod limits;
pub mod regulators;
pub mod report;
pub mod run_picture;
pub mod shift;
pub mod sketch;
pub mod solve;
pub mod tolerance;
pub mod words;

/// Stands at the foot of results.
pub const CAUTION: &str = "\
Steady state: surge, pump starts and valve slam are not modelled. Curves are for clean cold water unless corrected.
Limits are defaults of the trade, not the law: local codes, the authority and a licensed engineer decide.";

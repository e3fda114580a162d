//! All integration tests in one crate.

mod meadow;
mod random;
mod shift_closed_forms;
mod shift_meadow;
mod survey;

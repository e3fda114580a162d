//! All integration tests in one crate.

mod bad;
mod meadow;
mod properties_of_liquids;
mod published;
mod random;
mod shift_closed_forms;
mod shift_meadow;

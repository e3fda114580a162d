//! All integration tests in one crate.

mod bad;
mod banks;
mod command;
mod command_over_time;
mod curves;
mod description;
mod effort;
mod heads;
mod laws;
mod meadow;
mod properties;
mod properties_of_liquids;
mod published;
mod published_over_time;
mod random;
mod readme;
mod reference;
mod reference_over_time;
mod shift_closed_forms;
mod shift_meadow;
mod shift_read;
mod shift_staging;
mod shift_tanks;
mod tidy;

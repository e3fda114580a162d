//! All integration tests in one crate.

mod properties_of_liquids;
mod published;
mod random;

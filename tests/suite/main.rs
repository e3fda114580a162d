//! All integration tests in one crate.

mod random;
mod survey;

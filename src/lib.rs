//! Operating points of centrifugal pumps that share a system.

pub mod fluid;
pub mod part;
pub mod units;

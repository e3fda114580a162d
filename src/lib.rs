//! Operating points of centrifugal pumps that share a system.

pub mod fluid;
pub mod network;
pub mod part;
pub mod shift;
pub mod solve;
pub mod units;

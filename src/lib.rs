//! Operating points of centrifugal pumps that share a system.

pub mod diagnostic;
pub mod fluid;
pub mod network;
pub mod part;
pub mod read;
pub mod shift;
pub mod solve;
pub mod units;

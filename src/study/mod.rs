//! What people ask of a system. Each study goes through the public doors of `solve` and `shift` only, and returns data, no words.

pub mod assessment;
pub mod curves;
pub mod duty;
pub mod gain;
pub mod ranking;
pub mod sets;

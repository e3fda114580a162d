//! What people ask of a system. Each study goes through the public doors of `solve` and `shift` only, and returns data, no words.

pub mod assessment;
pub mod caution;
pub mod curves;
pub mod duty;
pub mod gain;
pub mod limit;
pub mod mains;
mod pressure;
pub mod ranking;
pub mod sets;
pub mod shutoff;
pub mod starts;
pub mod threshold;
pub mod tolerance;
pub mod worked;

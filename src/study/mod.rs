//! What people ask of a system. Each study goes through the public doors of `solve` only, and returns data, no words.

pub mod assessment;
pub mod duty;
pub mod gain;
pub mod sets;

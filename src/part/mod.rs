//! Parts.

pub mod fittings;
pub mod materials;

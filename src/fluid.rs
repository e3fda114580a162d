//! Fluid properties.

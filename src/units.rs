//! Quantities in and out: `"240 m3/h"` in a file becomes 0.0667 m3/s inside, and goes back out in the units asked for.
//!
//! Inside the library every number is SI; a unit lives only here and where files are read and results written.
//! The table is exact: each factor comes from the definition of its unit, not from a rounded conversion.
//! This is not unit algebra: a spelling is found in the table or it is not; nothing is composed from prefixes.
//!
//! - [`kind`]: what is measured, and the plain words for it
//! - [`table`]: every unit, its spellings and its factor
//! - [`quantity`]: a number with a unit, and its SI value once the kind is known
//! - [`parse`]: a quantity read from text
//! - [`set`]: the units in which a file speaks (`metric`, `us`, `si`, or one of these changed)
//!
//! ```
//! use dutybank::units::{Kind, UnitSet, parse_quantity};
//! let metric = UnitSet::metric();
//! let flow = parse_quantity("14 L/s").unwrap().to_si(Kind::Flow, &metric).unwrap();
//! assert!((flow - 0.014).abs() < 1e-17);
//! assert_eq!(metric.with_unit(Kind::Flow, flow), "50.4 m3/h");
//! ```

pub mod kind;
pub mod parse;
pub mod quantity;
pub mod set;
pub mod table;

pub use kind::Kind;
pub use parse::{QuantityError, parse_quantity};
pub use quantity::{LossValue, Quantity, SpeedValue, ViscosityValue, WrongKind};
pub use set::{UnitSet, UnitSetError};
pub use table::{UNITS, Unit, nearest, spellings};

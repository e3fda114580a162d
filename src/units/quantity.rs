//! A number with its unit, turned into SI once the place where it stands says what it must be.
//!
//! Reading the text is a step of its own (see [`super::parse`]): `"4 m"` is a fine quantity, and wrong only where a flow is wanted.

use super::{Kind, QuantityError, Unit, UnitSet, spellings};
use std::error::Error;
use std::fmt;

/// Numbers beyond this size are refused, so that no unit can turn a finite number into an infinite one.
const LARGEST: f64 = 1e300;

/// A finite number and the unit written after it; no unit where the number stood bare.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Quantity {
    number: f64,
    unit: Option<&'static Unit>,
}

/// Speed of a pump as it is written: in revolutions, or as a share of its model's speed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum SpeedValue {
    /// Revolutions per minute.
    Rpm(f64),
    /// Share of the model's speed: 85 % is 0.85.
    Ratio(f64),
}

/// Viscosity as it is written; a dynamic one needs the density to become kinematic.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum ViscosityValue {
    /// m2/s.
    Kinematic(f64),
    /// Pa s.
    Dynamic(f64),
}

/// Loss across equipment as it is written; a pressure needs density and gravity to become a head.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum LossValue {
    /// m of the pumped liquid.
    Head(f64),
    /// Pa.
    Pressure(f64),
}

impl Quantity {
    /// A bare number, to be read in the file's unit of its kind.
    ///
    /// # Errors
    /// [`QuantityError::NotFinite`] for a number that is infinite, not a number, or beyond 1e300 in size.
    pub fn bare(number: f64) -> Result<Quantity, QuantityError> {
        Quantity::checked(number, None)
    }

    pub(super) fn checked(
        number: f64,
        unit: Option<&'static Unit>,
    ) -> Result<Quantity, QuantityError> {
        // Written so that a NaN fails too.
        if number.abs() <= LARGEST {
            Ok(Quantity { number, unit })
        } else {
            Err(QuantityError::NotFinite)
        }
    }

    /// The number as written.
    pub fn number(&self) -> f64 {
        self.number
    }

    /// The unit as written, if there was one.
    pub fn unit(&self) -> Option<&'static Unit> {
        self.unit
    }

    /// SI value, the quantity being of kind `kind`; a bare number is in the unit that `set` has for it.
    ///
    /// # Errors
    /// [`WrongKind`] when the unit measures something else, or when a time span has no unit.
    pub fn to_si(&self, kind: Kind, set: &UnitSet) -> Result<f64, WrongKind> {
        match self.unit {
            Some(unit) if unit.kind == kind.dimension() => Ok(unit.to_si(self.number)),
            None if kind != Kind::Time => Ok(set.to_si(kind, self.number)),
            found => Err(WrongKind {
                found,
                expected: kind,
            }),
        }
    }

    /// A pump's speed: `rpm`, `%` of its model's speed, or a bare number, which is rpm.
    ///
    /// # Errors
    /// [`WrongKind`] when the unit is neither.
    pub fn to_speed(&self) -> Result<SpeedValue, WrongKind> {
        match self.unit {
            None => Ok(SpeedValue::Rpm(self.number)),
            Some(unit) if unit.kind == Kind::Speed => Ok(SpeedValue::Rpm(unit.to_si(self.number))),
            Some(unit) if unit.kind == Kind::Percent => {
                Ok(SpeedValue::Ratio(unit.to_si(self.number)))
            }
            found => Err(WrongKind {
                found,
                expected: Kind::Speed,
            }),
        }
    }

    /// A viscosity, kinematic unless its unit is dynamic (`mPa.s`, `cP`, `Pa.s`).
    ///
    /// # Errors
    /// [`WrongKind`] when the unit is neither.
    pub fn to_viscosity(&self, set: &UnitSet) -> Result<ViscosityValue, WrongKind> {
        match self.unit {
            Some(unit) if unit.kind == Kind::DynamicViscosity => {
                Ok(ViscosityValue::Dynamic(unit.to_si(self.number)))
            }
            _ => self
                .to_si(Kind::Viscosity, set)
                .map(ViscosityValue::Kinematic),
        }
    }

    /// A loss across equipment, a head unless its unit is of pressure.
    ///
    /// # Errors
    /// [`WrongKind`] when the unit is neither.
    pub fn to_loss(&self, set: &UnitSet) -> Result<LossValue, WrongKind> {
        match self.unit {
            Some(unit) if unit.kind == Kind::Pressure => {
                Ok(LossValue::Pressure(unit.to_si(self.number)))
            }
            _ => self.to_si(Kind::Length, set).map(LossValue::Head),
        }
    }
}

/// A unit that measures something else than the place asks for, or a missing one where one is needed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct WrongKind {
    /// The unit found; none where a bare number needs one.
    pub found: Option<&'static Unit>,
    /// What the place asks for.
    pub expected: Kind,
}

impl fmt::Display for WrongKind {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let expected = self.expected.with_article();
        match self.found {
            Some(unit) => {
                let found = unit.kind.with_article();
                write!(
                    f,
                    "{} measures {found}, and {expected} is wanted",
                    unit.symbol
                )?;
            }
            None => write!(f, "{expected} needs its unit")?,
        }
        let offer: Vec<_> = spellings(self.expected).collect();
        write!(f, " ({})", offer.join(", "))
    }
}

impl Error for WrongKind {}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::parse_quantity;

    fn read(text: &str) -> Quantity {
        parse_quantity(text).unwrap_or_else(|error| panic!("{text}: {error}"))
    }

    #[test]
    fn the_place_decides_what_fits() {
        let metric = UnitSet::metric();
        let wrong = read("4 kW").to_si(Kind::Flow, &metric).unwrap_err();
        assert_eq!(wrong.expected, Kind::Flow);
        assert_eq!(wrong.found.map(|unit| unit.kind), Some(Kind::Power));
        assert!(
            wrong
                .to_string()
                .starts_with("kW measures a power, and a flow is wanted (m3/h, ")
        );
        let bare = read("5").to_si(Kind::Time, &metric).unwrap_err();
        assert_eq!(
            bare.to_string(),
            "a time span needs its unit (s, min, h, d)"
        );
        assert_eq!(read("5 min").to_si(Kind::Time, &metric), Ok(300.0));
        assert_eq!(read("85 %").to_si(Kind::Percent, &metric), Ok(0.85));
        assert_eq!(read("85").to_si(Kind::Percent, &metric), Ok(0.85));
        assert_eq!(read("2 m").to_si(Kind::Bore, &metric), Ok(2.0));
        assert_eq!(read("200").to_si(Kind::Bore, &metric), Ok(0.2));
    }

    #[test]
    fn places_that_take_two_kinds_say_which_was_written() {
        let metric = UnitSet::metric();
        assert_eq!(read("1480").to_speed(), Ok(SpeedValue::Rpm(1480.0)));
        assert_eq!(read("1480 rpm").to_speed(), Ok(SpeedValue::Rpm(1480.0)));
        assert_eq!(read("50 %").to_speed(), Ok(SpeedValue::Ratio(0.5)));
        assert!(read("50 m").to_speed().is_err());
        assert_eq!(
            read("2 cP").to_viscosity(&metric),
            Ok(ViscosityValue::Dynamic(2e-3))
        );
        assert_eq!(
            read("2 cSt").to_viscosity(&metric),
            Ok(ViscosityValue::Kinematic(2e-6))
        );
        assert_eq!(
            read("2").to_viscosity(&metric),
            Ok(ViscosityValue::Kinematic(2e-6))
        );
        assert!(read("2 bar").to_viscosity(&metric).is_err());
        assert_eq!(read("2 bar").to_loss(&metric), Ok(LossValue::Pressure(2e5)));
        assert_eq!(read("2").to_loss(&metric), Ok(LossValue::Head(2.0)));
        assert!(read("2 C").to_loss(&metric).is_err());
    }
}

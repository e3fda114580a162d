//! The units in which a file speaks: those of its bare numbers and of its results.

use super::table::named;
use super::{Kind, Unit, nearest, spellings};
use std::error::Error;
use std::fmt;

/// One unit for every kind.
#[derive(Clone, Debug, PartialEq)]
pub struct UnitSet {
    /// By `kind as usize`.
    units: [&'static Unit; Kind::ALL.len()],
}

impl Default for UnitSet {
    fn default() -> Self {
        UnitSet::metric()
    }
}

impl UnitSet {
    /// Metric units of the trade: m, mm, m3/h, bar, kW. The default.
    pub fn metric() -> UnitSet {
        UnitSet::choose(|kind| match kind {
            Kind::Length => const { named("m") },
            Kind::Bore => const { named("mm") },
            Kind::Flow => const { named("m3/h") },
            Kind::Pressure => const { named("bar") },
            Kind::Power => const { named("kW") },
            Kind::Volume => const { named("m3") },
            Kind::Area => const { named("m2") },
            Kind::Density => const { named("kg/m3") },
            Kind::Viscosity => const { named("cSt") },
            Kind::DynamicViscosity => const { named("mPa.s") },
            Kind::Temperature => const { named("C") },
            Kind::Percent => const { named("%") },
            Kind::Speed => const { named("rpm") },
            Kind::Time => const { named("s") },
            Kind::Velocity => const { named("m/s") },
            Kind::Energy => const { named("kWh") },
            Kind::Acceleration => const { named("m/s2") },
        })
    }

    /// US units of the trade: ft, in, US gpm, psi, hp.
    pub fn us() -> UnitSet {
        let metric = UnitSet::metric();
        UnitSet::choose(|kind| match kind {
            Kind::Length => const { named("ft") },
            Kind::Bore => const { named("in") },
            Kind::Flow => const { named("gpm") },
            Kind::Pressure => const { named("psi") },
            Kind::Power => const { named("hp") },
            Kind::Volume => const { named("gal") },
            Kind::Area => const { named("ft2") },
            Kind::Density => const { named("lb/ft3") },
            Kind::DynamicViscosity => const { named("cP") },
            Kind::Temperature => const { named("F") },
            Kind::Velocity => const { named("ft/s") },
            Kind::Acceleration => const { named("ft/s2") },
            alike => metric.unit(alike),
        })
    }

    /// SI units without prefixes, but for C, % and kWh.
    pub fn si() -> UnitSet {
        let metric = UnitSet::metric();
        UnitSet::choose(|kind| match kind {
            Kind::Bore => const { named("m") },
            Kind::Flow => const { named("m3/s") },
            Kind::Pressure => const { named("Pa") },
            Kind::Power => const { named("W") },
            Kind::Viscosity => const { named("m2/s") },
            Kind::DynamicViscosity => const { named("Pa.s") },
            alike => metric.unit(alike),
        })
    }

    /// The set that a file calls `metric`, `us` or `si`.
    pub fn base(name: &str) -> Option<UnitSet> {
        match name {
            "metric" => Some(UnitSet::metric()),
            "us" => Some(UnitSet::us()),
            "si" => Some(UnitSet::si()),
            _ => None,
        }
    }

    fn choose(unit_for: impl Fn(Kind) -> &'static Unit) -> UnitSet {
        UnitSet {
            units: Kind::ALL.map(unit_for),
        }
    }

    /// Changes one unit, as `units: {base: metric, flow: L/s}` does: `key` is the word for the kind, `unit` its spelling.
    ///
    /// # Errors
    /// [`UnitSetError`] for a word that names no kind, a spelling that names no unit, or a unit of another kind.
    pub fn set(&mut self, key: &str, unit: &str) -> Result<(), UnitSetError> {
        let kind = Kind::from_key(key).ok_or_else(|| UnitSetError::UnknownKey {
            key: key.to_string(),
        })?;
        let found = Unit::parse(unit).ok_or_else(|| UnitSetError::UnknownUnit {
            unit: unit.to_string(),
            kind,
            nearest: nearest(unit, Some(kind)),
        })?;
        if found.kind != kind.dimension() {
            return Err(UnitSetError::WrongKind { found, kind });
        }
        self.units[kind as usize] = found;
        Ok(())
    }

    /// The unit of `kind`.
    pub fn unit(&self, kind: Kind) -> &'static Unit {
        self.units[kind as usize]
    }

    /// SI value of a number in the unit of `kind`.
    pub fn to_si(&self, kind: Kind, number: f64) -> f64 {
        self.unit(kind).to_si(number)
    }

    /// Number, at full precision, in the unit of `kind`.
    pub fn from_si(&self, kind: Kind, value: f64) -> f64 {
        self.unit(kind).from_si(value)
    }

    /// Digits after the point that suit a column of `kind`.
    pub fn decimals(&self, kind: Kind) -> usize {
        self.unit(kind).decimals
    }

    /// The number for a column of a table: fixed decimals, no unit, never `-0.0`.
    pub fn number(&self, kind: Kind, value: f64) -> String {
        fixed(self.from_si(kind, value), self.decimals(kind))
    }

    /// [`UnitSet::number`] with the unit's symbol; `%` stands after a space, as in a file.
    pub fn with_unit(&self, kind: Kind, value: f64) -> String {
        format!("{} {}", self.number(kind, value), self.unit(kind).symbol)
    }

    /// The quantity for a sentence: as [`UnitSet::with_unit`], but with the zeros at its end left off, and a small value keeps three
    /// significant digits, so that a roughness of 0.05 mm is not called 0.1 mm.
    pub fn format(&self, kind: Kind, value: f64) -> String {
        let number = self.from_si(kind, value);
        let size = number.abs();
        let decimals = self.decimals(kind);
        let text = if size == 0.0 || !size.is_finite() {
            fixed(number, 0)
        } else if !(1e-9..1e9).contains(&size) {
            format!("{number:.2e}")
        } else {
            // Digits after the point that give three significant ones.
            let three = 2.0 - size.log10().floor();
            fixed(number, decimals.max(three.max(0.0) as usize))
        };
        let text = match text.split_once('e') {
            None if text.contains('.') => text.trim_end_matches('0').trim_end_matches('.'),
            _ => text.as_str(),
        };
        format!("{text} {}", self.unit(kind).symbol)
    }
}

/// The number with `decimals` digits after its point; a zero that rounding made of a negative number loses its sign.
fn fixed(number: f64, decimals: usize) -> String {
    let text = format!("{number:.decimals$}");
    match text.strip_prefix('-') {
        Some(zero) if zero.bytes().all(|c| matches!(c, b'0' | b'.')) => zero.to_string(),
        _ => text,
    }
}

/// Why a file's `units` map is wrong.
#[derive(Clone, Debug, PartialEq)]
pub enum UnitSetError {
    /// The word names no kind whose unit can be chosen.
    UnknownKey {
        /// The word.
        key: String,
    },
    /// The spelling names no unit.
    UnknownUnit {
        /// The spelling.
        unit: String,
        /// The kind it was to serve.
        kind: Kind,
        /// The nearest spelling that fits, if one is near.
        nearest: Option<&'static str>,
    },
    /// The unit is of another kind.
    WrongKind {
        /// The unit found.
        found: &'static Unit,
        /// The kind it was to serve.
        kind: Kind,
    },
}

impl fmt::Display for UnitSetError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let offer = |kind: Kind| spellings(kind).collect::<Vec<_>>().join(", ");
        match self {
            UnitSetError::UnknownKey { key } => {
                let keys = Kind::KEYS.map(|(word, _)| word).join(", ");
                write!(
                    f,
                    "`{key}` is no kind whose unit can be chosen (base, {keys})"
                )
            }
            UnitSetError::UnknownUnit {
                unit,
                kind,
                nearest: Some(nearest),
            } => write!(
                f,
                "`{unit}` is no unit of {kind}; did you mean `{nearest}`?"
            ),
            UnitSetError::UnknownUnit {
                unit,
                kind,
                nearest: None,
            } => write!(f, "`{unit}` is no unit of {kind} ({})", offer(*kind)),
            UnitSetError::WrongKind { found, kind } => write!(
                f,
                "{} measures {}, and {} is wanted ({})",
                found.symbol,
                found.kind.with_article(),
                kind.with_article(),
                offer(*kind)
            ),
        }
    }
}

impl Error for UnitSetError {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_unit_of_a_set_fits_its_kind() {
        for set in [UnitSet::metric(), UnitSet::us(), UnitSet::si()] {
            for kind in Kind::ALL {
                assert_eq!(set.unit(kind).kind, kind.dimension(), "{kind}");
            }
        }
    }

    #[test]
    fn sets_are_those_of_the_file_format() {
        let symbols = |name: &str| {
            let set = UnitSet::base(name).unwrap();
            Kind::KEYS.map(|(_, kind)| set.unit(kind).symbol).join(" ")
        };
        assert_eq!(symbols("metric"), "m mm m3/h bar kW m3 m2 kg/m3 cSt C");
        assert_eq!(symbols("us"), "ft in gpm psi hp gal ft2 lb/ft3 cSt F");
        assert_eq!(symbols("si"), "m m m3/s Pa W m3 m2 kg/m3 m2/s C");
        assert_eq!(UnitSet::base("imperial"), None);
        assert_eq!(UnitSet::default(), UnitSet::metric());
    }

    #[test]
    fn one_unit_changes_and_the_others_stay() {
        let mut set = UnitSet::metric();
        set.set("flow", "l/s").unwrap();
        set.set("pressure", "kPa").unwrap();
        assert_eq!(set.unit(Kind::Flow).symbol, "L/s");
        assert_eq!(set.unit(Kind::Pressure).symbol, "kPa");
        assert_eq!(set.unit(Kind::Bore).symbol, "mm");
        assert_eq!(set.to_si(Kind::Flow, 14.0), 0.014);
    }

    #[test]
    fn wrong_choices_say_what_would_fit() {
        let mut set = UnitSet::metric();
        let said = |result: Result<(), UnitSetError>| result.unwrap_err().to_string();
        assert_eq!(
            said(set.set("flow", "kPa")),
            "kPa measures a pressure, and a flow is wanted (m3/h, m3/s, m3/min, m3/d, L/s, L/min, L/h, ML/d, gpm, igpm, mgd, \
             ft3/s, ft3/min)"
        );
        assert_eq!(
            said(set.set("pressure", "mPa")),
            "`mPa` is no unit of pressure; did you mean `MPa`?"
        );
        assert!(said(set.set("speed", "rpm")).starts_with("`speed` is no kind"));
        // A file's results give viscosity as kinematic; a dynamic one cannot be turned into it without a density.
        assert!(set.set("viscosity", "cP").is_err());
        assert_eq!(set, UnitSet::metric());
    }

    #[test]
    fn numbers_suit_their_unit() {
        let metric = UnitSet::metric();
        assert_eq!(metric.with_unit(Kind::Flow, 204.56 / 3600.0), "204.6 m3/h");
        assert_eq!(metric.number(Kind::Pressure, 25010.0), "0.25");
        assert_eq!(metric.number(Kind::Length, 28.4512), "28.45");
        assert_eq!(metric.with_unit(Kind::Percent, 0.776), "77.6 %");
        assert_eq!(metric.number(Kind::Flow, -1e-12), "0.0");
        assert_eq!(metric.number(Kind::Flow, -1.0), "-3600.0");
        let us = UnitSet::us();
        assert_eq!(us.with_unit(Kind::Temperature, 293.15), "68.0 F");
        assert_eq!(us.with_unit(Kind::Length, 30.48), "100.0 ft");
    }

    #[test]
    fn sentences_keep_small_values_and_drop_zeros() {
        let metric = UnitSet::metric();
        assert_eq!(metric.format(Kind::Bore, 5e-5), "0.05 mm");
        assert_eq!(metric.format(Kind::Bore, 0.2027), "202.7 mm");
        assert_eq!(metric.format(Kind::Length, 850.0), "850 m");
        assert_eq!(metric.format(Kind::Length, 0.012345), "0.0123 m");
        assert_eq!(metric.format(Kind::Length, 0.0), "0 m");
        assert_eq!(metric.format(Kind::Length, -2.5), "-2.5 m");
        assert_eq!(metric.format(Kind::Power, 18500.0), "18.5 kW");
        assert_eq!(metric.format(Kind::Length, 1e-12), "1.00e-12 m");
        assert_eq!(metric.format(Kind::Length, f64::NAN), "NaN m");
    }
}

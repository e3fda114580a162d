//! What a quantity measures. A kind is finer than a dimension: a bore and a length are both lengths, but a file
//! gives them in different units when it gives a bare number.

use std::fmt;

/// What is measured; decides which units fit and in which one a bare number is read.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Kind {
    /// Length, level, elevation, head, NPSH; inside: m.
    Length,
    /// Bore, roughness, impeller diameter; inside: m.
    Bore,
    /// Volume flow; inside: m3/s.
    Flow,
    /// Pressure, gauge or absolute as the place says; inside: Pa.
    Pressure,
    /// Power; inside: W.
    Power,
    /// Volume; inside: m3.
    Volume,
    /// Area; inside: m2.
    Area,
    /// Density; inside: kg/m3.
    Density,
    /// Kinematic viscosity; inside: m2/s.
    Viscosity,
    /// Dynamic viscosity; inside: Pa s.
    DynamicViscosity,
    /// Temperature; inside: K.
    Temperature,
    /// Efficiency, opening, speed ratio, wear: written as a percentage; inside: a ratio (85 % is 0.85).
    Percent,
    /// Speed of rotation; inside: revolutions per minute, because only ratios of speeds are ever used.
    Speed,
    /// Time span; inside: s. A bare number is refused.
    Time,
    /// Velocity; inside: m/s.
    Velocity,
    /// Energy; inside: J.
    Energy,
    /// Acceleration (gravity); inside: m/s2.
    Acceleration,
}

impl Kind {
    /// Every kind, in the order of the enum.
    pub const ALL: [Kind; 17] = [
        Kind::Length,
        Kind::Bore,
        Kind::Flow,
        Kind::Pressure,
        Kind::Power,
        Kind::Volume,
        Kind::Area,
        Kind::Density,
        Kind::Viscosity,
        Kind::DynamicViscosity,
        Kind::Temperature,
        Kind::Percent,
        Kind::Speed,
        Kind::Time,
        Kind::Velocity,
        Kind::Energy,
        Kind::Acceleration,
    ];

    /// The kinds whose unit a file may choose, by the word it uses for them.
    pub const KEYS: [(&'static str, Kind); 10] = [
        ("length", Kind::Length),
        ("bore", Kind::Bore),
        ("flow", Kind::Flow),
        ("pressure", Kind::Pressure),
        ("power", Kind::Power),
        ("volume", Kind::Volume),
        ("area", Kind::Area),
        ("density", Kind::Density),
        ("viscosity", Kind::Viscosity),
        ("temperature", Kind::Temperature),
    ];

    /// The kind as a message names it.
    pub fn name(self) -> &'static str {
        match self {
            Kind::Length => "length",
            Kind::Bore => "bore (a length)",
            Kind::Flow => "flow",
            Kind::Pressure => "pressure",
            Kind::Power => "power",
            Kind::Volume => "volume",
            Kind::Area => "area",
            Kind::Density => "density",
            Kind::Viscosity => "kinematic viscosity",
            Kind::DynamicViscosity => "dynamic viscosity",
            Kind::Temperature => "temperature",
            Kind::Percent => "percentage",
            Kind::Speed => "speed of rotation",
            Kind::Time => "time span",
            Kind::Velocity => "velocity",
            Kind::Energy => "energy",
            Kind::Acceleration => "acceleration",
        }
    }

    /// The name with its article: `an energy`.
    pub fn with_article(self) -> String {
        let article = if self.name().starts_with(['a', 'e']) {
            "an"
        } else {
            "a"
        };
        format!("{article} {}", self.name())
    }

    /// The kind under which the table lists the units that fit: a bore is measured in units of length.
    pub fn dimension(self) -> Kind {
        match self {
            Kind::Bore => Kind::Length,
            other => other,
        }
    }

    /// The kind that a file's `units` map means by `key`.
    pub fn from_key(key: &str) -> Option<Kind> {
        Kind::KEYS
            .iter()
            .find(|(word, _)| *word == key)
            .map(|(_, kind)| *kind)
    }
}

impl fmt::Display for Kind {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn all_stands_in_the_order_of_the_enum() {
        // UnitSet indexes by `kind as usize`, which relies on this.
        for (position, kind) in Kind::ALL.iter().enumerate() {
            assert_eq!(*kind as usize, position);
        }
    }

    #[test]
    fn articles_suit_the_name() {
        assert_eq!(Kind::Area.with_article(), "an area");
        assert_eq!(Kind::Flow.with_article(), "a flow");
    }

    #[test]
    fn keys_are_found_and_others_are_not() {
        assert_eq!(Kind::from_key("bore"), Some(Kind::Bore));
        assert_eq!(Kind::from_key("Bore"), None);
        assert_eq!(Kind::from_key("speed"), None);
    }
}

//! Roughness of pipe walls by material, for new pipe, with the spread in use.
//!
//! Age, scale, slime and joints can multiply these many times over; a pipe that has served is better described by a
//! `roughness` or `c_factor` of its own. Whether a lined pipe is meant is the user's to say: the bare name is unlined.
//!
//! # Sources
//! - *Moody*: L. F. Moody, "Friction factors for pipe flow", Trans. ASME 66 (1944) 671, chart of relative roughness, values in
//!   feet turned to metres; from memory.
//! - *common practice, no source*: values that handbooks and makers repeat without origin.

const FOOT: f64 = 0.3048;

/// A wall and its equivalent sand roughness, for the Colebrook-White equation.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Material {
    /// The name that a file uses.
    pub name: &'static str,
    /// Equivalent sand roughness of new pipe, m.
    pub roughness: f64,
    /// Low end of the spread, m.
    pub low: f64,
    /// High end of the spread, m.
    pub high: f64,
    /// Where `roughness` comes from and how it was reached.
    pub source: &'static str,
}

/// The material called `name`, spelt exactly so.
pub fn material(name: &str) -> Option<&'static Material> {
    TABLE.iter().find(|material| material.name == name)
}

/// The name in the table nearest to `name`, or nothing when none is near (Jaro-Winkler similarity of 0.8 or more).
pub fn nearest(name: &str) -> Option<&'static str> {
    let name = name.to_ascii_lowercase();
    TABLE
        .iter()
        .map(|material| (strsim::jaro_winkler(material.name, &name), material.name))
        .filter(|(likeness, _)| *likeness >= 0.8)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, name)| name)
}

const MOODY: &str = "Moody 1944; from memory";
const MOODY_RANGE: &str =
    "Moody 1944 gives low to high, the value is their geometric mean; from memory";
const PRACTICE: &str = "common practice, no source";

/// Rows after Moody's chart. His low and high are used where he draws a band; else the spread is common practice.
const fn feet(
    name: &'static str,
    (value, low, high): (f64, f64, f64),
    source: &'static str,
) -> Material {
    Material {
        name,
        roughness: value * FOOT,
        low: low * FOOT,
        high: high * FOOT,
        source,
    }
}

const fn millimetres(name: &'static str, (value, low, high): (f64, f64, f64)) -> Material {
    Material {
        name,
        roughness: value * 1e-3,
        low: low * 1e-3,
        high: high * 1e-3,
        source: PRACTICE,
    }
}

/// The table.
#[rustfmt::skip]
pub static TABLE: [Material; 20] = [
    feet("drawn_tubing", (0.000005, 0.000003, 0.000008), MOODY),
    feet("commercial_steel", (0.00015, 0.0001, 0.0003), MOODY),
    feet("wrought_iron", (0.00015, 0.0001, 0.0003), MOODY),
    feet("asphalted_cast_iron", (0.0004, 0.0003, 0.0006), MOODY),
    feet("galvanized_steel", (0.0005, 0.0002, 0.0008), MOODY),
    feet("cast_iron", (0.00085, 0.0004, 0.002), MOODY),
    feet("wood_stave", (0.00134, 0.0006, 0.003), MOODY_RANGE),
    feet("concrete", (0.00316, 0.001, 0.01), MOODY_RANGE),
    feet("riveted_steel", (0.00949, 0.003, 0.03), MOODY_RANGE),

    millimetres("ductile_iron", (0.26, 0.12, 0.6)),
    millimetres("ductile_iron_cement_lined", (0.1, 0.03, 0.3)),
    millimetres("steel_cement_lined", (0.1, 0.03, 0.3)),
    millimetres("steel_epoxy_lined", (0.01, 0.005, 0.05)),
    millimetres("stainless_steel", (0.045, 0.002, 0.05)),
    millimetres("copper", (0.0015, 0.001, 0.003)),
    millimetres("pvc", (0.0015, 0.0015, 0.01)),
    millimetres("pe", (0.0015, 0.0015, 0.02)),
    millimetres("hdpe", (0.0015, 0.0015, 0.02)),
    millimetres("grp", (0.01, 0.005, 0.05)),
    millimetres("fibre_cement", (0.05, 0.025, 0.1)),
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_name_is_its_own_and_its_value_lies_in_its_spread() {
        for (row, entry) in TABLE.iter().enumerate() {
            assert_eq!(
                material(entry.name),
                Some(&TABLE[row]),
                "{} twice",
                entry.name
            );
            assert!(
                0.0 < entry.low && entry.low <= entry.roughness,
                "{}",
                entry.name
            );
            assert!(entry.roughness <= entry.high, "{}", entry.name);
        }
    }

    #[test]
    fn moodys_feet_are_the_millimetres_that_textbooks_print() {
        // White, Fluid Mechanics, and Cengel & Cimbala print these beside the feet; from memory.
        for (name, millimetres, rounding) in [
            ("drawn_tubing", 0.0015, 5e-5),
            ("commercial_steel", 0.046, 5e-4),
            ("asphalted_cast_iron", 0.12, 5e-3),
            ("galvanized_steel", 0.15, 5e-3),
            ("cast_iron", 0.26, 5e-3),
        ] {
            let roughness = material(name).unwrap().roughness * 1e3;
            assert!(
                (roughness - millimetres).abs() <= rounding,
                "{name} {roughness}"
            );
        }
    }

    #[test]
    fn bands_are_read_at_their_geometric_mean() {
        for entry in TABLE.iter().filter(|entry| entry.source == MOODY_RANGE) {
            let mean = (entry.low * entry.high).sqrt();
            assert!(
                (entry.roughness / mean - 1.0).abs() < 2e-3,
                "{}",
                entry.name
            );
        }
    }

    #[test]
    fn a_slip_of_the_pen_is_answered() {
        assert_eq!(nearest("ductile iron"), Some("ductile_iron"));
        assert_eq!(nearest("galvanised_steel"), Some("galvanized_steel"));
        assert_eq!(nearest("zzz"), None);
    }
}

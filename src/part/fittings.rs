//! Loss coefficients of fittings by their trade names, with the spread that published tables show.
//!
//! Handbooks disagree here by far more than any solver errs: a factor of 2 for a threaded elbow, of 3 for a globe valve.
//! So each row keeps the lowest and highest value seen. Fittings whose loss needs two bores (sudden expansions and
//! contractions) and valves part closed are not in the table; a strainer's loss is its maker's.
//!
//! # Sources
//! Short names in the rows stand for these, all read unless a row says otherwise:
//! - *Munson*: B. R. Munson, D. F. Young, T. H. Okiishi, Fundamentals of Fluid Mechanics, Table 8.2 (and text, for
//!   entrances and exits).
//! - *B-6/B-7*: appendix of a pumping-station design handbook, Tables B-6 and B-7, flanged fittings and fully open valves at
//!   300 mm (title page not seen). It warns of a scatter of -20 % to +30 % and of 5 % more for each 25 mm below 300 mm.
//! - *6-4*: water supply handbook, Table 6-4, minor losses of head (title not seen).
//! - *9.2*: environmental engineering reference, Table 9.2, minor loss coefficients, citing Streeter & Wylie 1975, Miller
//!   1990, Rahmeyer 2002, Kalsi & Tullis 1993 (title not seen).
//! - *L/D form*: K = n fT with fT of fully rough flow in a commercial steel pipe of 50 mm to 300 mm; computed.
//! - *Rennels*: D. C. Rennels & H. M. Hudson, Pipe Flow (2012); computed.

/// A fitting and its loss K v2/2g, v being the mean velocity in the pipe it stands in.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fitting {
    /// The name that a file uses.
    pub name: &'static str,
    /// Loss coefficient.
    pub k: f64,
    /// Lowest value found in the sources.
    pub low: f64,
    /// Highest value found in the sources.
    pub high: f64,
    /// Where `k` comes from and how it was reached.
    pub source: &'static str,
    /// What it is, and how far the sources part.
    pub doc: &'static str,
}

/// The fitting called `name`, spelt exactly so.
pub fn fitting(name: &str) -> Option<&'static Fitting> {
    TABLE.iter().find(|fitting| fitting.name == name)
}

/// The name in the table nearest to `name`, or nothing when none is near (Jaro-Winkler similarity of 0.8 or more).
pub fn nearest(name: &str) -> Option<&'static str> {
    let name = name.to_ascii_lowercase();
    TABLE
        .iter()
        .map(|fitting| (strsim::jaro_winkler(fitting.name, &name), fitting.name))
        .filter(|(likeness, _)| *likeness >= 0.8)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, name)| name)
}

const fn row(
    name: &'static str,
    (k, low, high): (f64, f64, f64),
    source: &'static str,
    doc: &'static str,
) -> Fitting {
    Fitting {
        name,
        k,
        low,
        high,
        source,
        doc,
    }
}

/// The table. Where a source gives a range alone, `k` is its middle; where one value alone was found, low and high equal it,
/// or are the scatter that its source states.
#[rustfmt::skip]
pub static TABLE: [Fitting; 43] = [
    row("entrance_sharp", (0.5, 0.5, 0.57), "Munson, B-6/B-7, 6-4, 9.2; read", "Square-edged, flush with the wall. Four tables say 0.50; Rennels gives 0.57 (computed)."),
    row("entrance_projecting", (0.8, 0.5, 1.0), "B-6/B-7, 6-4, 9.2; read", "Pipe that projects into the tank. 0.8 for a thin wall; tables span 0.5 to 1.0; Rennels 0.92 for a wall of D/100 (computed)."),
    row("entrance_rounded", (0.23, 0.04, 0.5), "6-4; read", "Slightly rounded edge. B-6/B-7 says 0.25, 9.2 says 0.04 to 0.5 by radius; Rennels 0.20 at a radius of D/10 (computed)."),
    row("entrance_bellmouth", (0.05, 0.03, 0.1), "B-6/B-7; read", "Bell mouth. 6-4 says 0.04, 9.2 says 0.03 to 0.1."),
    row("exit", (1.0, 1.0, 1.06), "B-6/B-7, 6-4; read", "Submerged end: the velocity head is lost. 1.06 with the velocity profile of turbulent flow (Cengel & Cimbala, Example 8-8; read)."),

    row("elbow_90_flanged", (0.3, 0.21, 0.3), "Munson; read", "Regular radius. 6-4 says 0.21 to 0.30, B-6/B-7 0.25 at 300 mm."),
    row("elbow_90_long_radius_flanged", (0.2, 0.14, 0.23), "Munson; read", "6-4 says 0.14 to 0.23, B-6/B-7 0.18 at 300 mm."),
    row("elbow_90_threaded", (1.5, 0.75, 1.5), "Munson; read", "Regular radius. 6-4 says 0.9 for a short radius and 0.75 for a medium one: a factor of up to 2."),
    row("elbow_90_long_radius_threaded", (0.7, 0.6, 0.7), "Munson; read", "6-4 says 0.60."),
    row("elbow_45_flanged", (0.2, 0.18, 0.2), "Munson (long radius); read", "B-6/B-7 says 0.18 at 300 mm."),
    row("elbow_45_threaded", (0.4, 0.4, 0.4), "Munson; read", "Regular radius. One source; no spread seen."),
    row("bend_90_short_radius", (0.45, 0.3, 0.6), "9.2; read", "Smooth bend of centreline radius D."),
    row("bend_90_long_radius", (0.2, 0.07, 0.33), "9.2; read", "Smooth bend of centreline radius 1.5 D. The L/D form gives 0.18 to 0.27 by size (computed)."),
    row("return_bend_flanged", (0.2, 0.2, 0.4), "Munson; read", "180 degrees. B-6/B-7 says 0.40 for a radius of 1.4 D: a factor of 2."),
    row("return_bend_threaded", (1.5, 1.5, 1.5), "Munson; read", "180 degrees. One source; no spread seen."),
    row("mitre_15", (0.05, 0.04, 0.065), "B-6/B-7; read", "Single mitre of 15 degrees. Low and high are the scatter that the source states."),
    row("mitre_30", (0.15, 0.1, 0.19), "9.2 (0.11 to 0.19); read", "Single mitre of 30 degrees. B-6/B-7 says 0.10."),
    row("mitre_45", (0.395, 0.2, 0.44), "9.2 (0.35 to 0.44); read", "Single mitre of 45 degrees. B-6/B-7 says 0.20: a factor of 2."),
    row("mitre_60", (0.495, 0.35, 0.59), "9.2 (0.40 to 0.59); read", "Single mitre of 60 degrees. B-6/B-7 says 0.35."),
    row("mitre_90", (1.1, 0.8, 1.1), "9.2; read", "Single mitre of 90 degrees, without vanes. B-6/B-7 says 0.80."),

    row("tee_line_flanged", (0.2, 0.2, 0.3), "Munson; read", "Flow straight through. B-6/B-7 says 0.30: half as much again."),
    row("tee_branch_flanged", (1.0, 0.75, 1.0), "Munson; read", "Flow through the branch. B-6/B-7 says 0.75."),
    row("tee_line_threaded", (0.9, 0.9, 0.9), "Munson; read", "Flow straight through. One source; no spread seen."),
    row("tee_branch_threaded", (2.0, 2.0, 2.0), "Munson; read", "Flow through the branch. One source; no spread seen."),
    row("cross_line_flanged", (0.5, 0.4, 0.65), "B-6/B-7; read", "Flow straight through. Low and high are the scatter that the source states."),
    row("cross_branch_flanged", (0.75, 0.6, 0.975), "B-6/B-7; read", "Flow through the branch. Low and high are the scatter that the source states."),
    row("wye_45_flanged", (0.5, 0.4, 0.65), "B-6/B-7; read", "Wye of 45 degrees; the source does not say for which leg. Low and high are the scatter that it states."),
    row("union_threaded", (0.08, 0.08, 0.08), "Munson; read", "One source; no spread seen."),

    row("gate_valve", (0.15, 0.1, 0.3), "Munson, 9.2; read", "Fully open. B-6/B-7 says 0.1 to 0.2 (double disc); the L/D form gives 0.10 to 0.15 (computed)."),
    row("gate_valve_resilient_seat", (0.3, 0.24, 0.39), "B-6/B-7; read", "Fully open. Low and high are the scatter that the source states."),
    row("knife_gate_valve", (0.2, 0.16, 0.26), "B-6/B-7; read", "Metal seat, fully open. Low and high are the scatter that the source states."),
    row("globe_valve", (10.0, 3.0, 10.0), "Munson, 6-4; read", "Fully open. B-6/B-7 says 4 to 6, 9.2 says 4 (3 to 10), the L/D form gives 4.4 to 6.5 (computed): take the maker's value."),
    row("angle_valve", (2.0, 1.8, 5.0), "Munson; read", "Fully open. B-6/B-7 says 1.8 to 2.9, 6-4 says 2 to 5."),
    row("ball_valve", (0.05, 0.04, 0.05), "Munson; read", "Full bore, fully open. B-6/B-7 says 0.04."),
    row("butterfly_valve", (0.56, 0.16, 0.86), "9.2 (0.2 to 0.6); read", "Fully open. B-6/B-7 says 0.16 to 0.35 by pressure class, the L/D form gives 0.45 to 0.86 by size (computed)."),
    row("plug_valve_lubricated", (0.75, 0.5, 1.0), "B-6/B-7 (0.5 to 1.0); read", "Fully open."),
    row("plug_valve_eccentric", (0.5, 0.4, 0.65), "B-6/B-7; read", "Full bore, fully open. Low and high are the scatter that the source states."),

    row("swing_check_valve", (2.0, 0.29, 2.5), "Munson; read", "Forward flow, fully open. B-6/B-7 says 0.6 to 2.2, 9.2 says 1.0 (0.29 to 2.2), 6-4 says 0.6 to 2.5. As a fitting it does not stop reverse flow."),
    row("tilting_disc_check_valve", (1.2, 0.25, 2.62), "9.2 (0.27 to 2.62); read", "Forward flow, fully open. B-6/B-7 says 0.25 to 2 (slanting disc). As a fitting it does not stop reverse flow."),
    row("double_door_check_valve", (1.32, 1.0, 2.5), "9.2 (1.0 to 1.8); read", "Forward flow, fully open. B-6/B-7 says 2.5 up to 200 mm and 1.2 from 250 mm to 400 mm. As a fitting it does not stop reverse flow."),
    row("globe_check_valve", (2.6, 2.08, 3.38), "B-6/B-7; read", "Centre-guided, forward flow. Low and high are the scatter that the source states. As a fitting it does not stop reverse flow."),
    row("lift_check_valve", (4.6, 0.85, 12.0), "9.2 (0.85 to 9.1); read", "Forward flow, fully open. 6-4 says 8 to 12. As a fitting it does not stop reverse flow."),
    row("foot_valve", (11.4, 9.12, 14.82), "B-6/B-7; read", "Hinged disc. Low and high are the scatter that the source states. As a fitting it does not stop reverse flow."),
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_name_is_its_own_and_in_trade_form() {
        for (row, entry) in TABLE.iter().enumerate() {
            assert_eq!(
                fitting(entry.name),
                Some(&TABLE[row]),
                "{} twice",
                entry.name
            );
            assert!(
                entry
                    .name
                    .bytes()
                    .all(|c| c.is_ascii_lowercase() || c.is_ascii_digit() || c == b'_'),
                "{}",
                entry.name
            );
        }
    }

    #[test]
    fn every_value_lies_in_its_spread_and_says_how_it_was_reached() {
        for entry in &TABLE {
            assert!(
                0.0 < entry.low && entry.low <= entry.k && entry.k <= entry.high,
                "{}",
                entry.name
            );
            assert!(entry.source.ends_with("; read"), "{}", entry.name);
            assert!(!entry.doc.is_empty(), "{}", entry.name);
        }
    }

    #[test]
    fn stated_scatter_is_minus_20_to_plus_30_per_cent() {
        // B-6/B-7; read.
        for entry in TABLE
            .iter()
            .filter(|entry| entry.doc.contains("Low and high are the scatter"))
        {
            assert!((entry.low / entry.k - 0.8).abs() < 1e-9, "{}", entry.name);
            assert!((entry.high / entry.k - 1.3).abs() < 1e-9, "{}", entry.name);
        }
    }

    #[test]
    fn a_slip_of_the_pen_is_answered() {
        assert_eq!(nearest("elbow_90_flange"), Some("elbow_90_flanged"));
        assert_eq!(nearest("miter_45"), Some("mitre_45"));
        assert_eq!(nearest("Gate_Valve"), Some("gate_valve"));
        assert_eq!(nearest("zzz"), None);
    }
}

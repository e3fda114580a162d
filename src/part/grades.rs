//! Acceptance grades of pumps: how far a new pump may be from its sheet.
//!
//! A grade is a promise about one guarantee point on a test stand. Here its tolerances are taken as limits within which head and
//! flow of the whole curve scale, each on its own: that is the wider reading, since the standard accepts a pump whose curve passes
//! the point within the tolerance on flow or on head. Efficiency has a lower limit only; it is taken between that limit and the
//! sheet. Shaft power follows from the three and is not drawn.
//!
//! # Source
//! ISO 9906:2012, Rotodynamic pumps, hydraulic performance acceptance tests, grades 1, 2 and 3, table of tolerances; from
//! memory, the standard's own table was not seen. Check it before relying on it.

/// A grade, its tolerances as shares of the sheet's figures.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Grade {
    /// The name that a file uses.
    pub name: &'static str,
    /// Lowest and highest flow.
    pub flow: (f64, f64),
    /// Lowest and highest head.
    pub head: (f64, f64),
    /// Most shaft power above the sheet's.
    pub power: f64,
    /// Lowest efficiency, zero or below.
    pub efficiency: f64,
}

const fn both_ways(name: &'static str, percent: [f64; 4]) -> Grade {
    let [flow, head, power, efficiency] = percent;
    Grade {
        name,
        flow: (-flow / 100.0, flow / 100.0),
        head: (-head / 100.0, head / 100.0),
        power: power / 100.0,
        efficiency: -efficiency / 100.0,
    }
}

const fn upwards(name: &'static str, percent: [f64; 4]) -> Grade {
    let [flow, head, power, efficiency] = percent;
    Grade {
        name,
        flow: (0.0, flow / 100.0),
        head: (0.0, head / 100.0),
        power: power / 100.0,
        efficiency: -efficiency / 100.0,
    }
}

/// All grades: flow, head, power and efficiency in per cent.
pub const TABLE: [Grade; 6] = [
    both_ways("1B", [5.0, 3.0, 4.0, 3.0]),
    both_ways("1E", [5.0, 3.0, 4.0, 0.0]),
    upwards("1U", [10.0, 6.0, 10.0, 0.0]),
    both_ways("2B", [8.0, 5.0, 8.0, 5.0]),
    upwards("2U", [16.0, 10.0, 16.0, 5.0]),
    both_ways("3B", [9.0, 7.0, 9.0, 7.0]),
];

/// The grade called `name`, in either case of its letter.
pub fn grade(name: &str) -> Option<&'static Grade> {
    TABLE
        .iter()
        .find(|grade| grade.name.eq_ignore_ascii_case(name))
}

/// The name in the table that is most like `name`, if one is.
pub fn nearest(name: &str) -> Option<&'static str> {
    let name = name.to_ascii_uppercase();
    TABLE
        .iter()
        .map(|grade| (strsim::jaro_winkler(grade.name, &name), grade.name))
        .filter(|(likeness, _)| *likeness > 0.6)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, name)| name)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Flow and head of the B grades as the trade quotes them: 5 and 3, 8 and 5, 9 and 7 per cent (from memory).
    #[test]
    fn grades_are_found_by_name() {
        for (name, flow, head) in [("1B", 0.05, 0.03), ("2b", 0.08, 0.05), ("3B", 0.09, 0.07)] {
            let grade = grade(name).unwrap();
            assert_eq!((grade.flow, grade.head), ((-flow, flow), (-head, head)));
        }
        assert_eq!(grade("1U").unwrap().head.0, 0.0);
        assert_eq!(grade("4B"), None);
        assert!(nearest("2C").is_some() && nearest("fine").is_none());
    }
}

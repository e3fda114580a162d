//! Limits that people use to judge pumps and mains. Sources disagree, so each is a default that says where it comes from, and the
//! file may set its own.

use std::sync::Arc;

/// Which limit.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum LimitName {
    /// Least share of best-efficiency flow for lasting operation.
    PreferredLow,
    /// Largest share of best-efficiency flow for lasting operation.
    PreferredHigh,
    /// Least share of best-efficiency flow at which a pump may run at all.
    AllowableLow,
    /// Largest share of best-efficiency flow at which a pump may run at all.
    AllowableHigh,
    /// Minimum continuous flow as a share of best-efficiency flow, where the maker's is not given.
    MinimumFlow,
    /// NPSH available over required.
    NpshRatio,
    /// NPSH available less required, m.
    NpshMargin,
    /// Shaft power over the motor's rating.
    MotorLoad,
    /// Shut-off head over the head at best efficiency, less 1, for pumps that run side by side.
    RiseToShutoff,
    /// Least gauge pressure at a pump's inlet, Pa.
    SuctionPressure,
    /// By how much heads may lie above their curves when pressures at shut-off are judged.
    ShutoffTolerance,
    /// Least velocity in a main that has to keep itself clean, m/s.
    VelocityLow,
    /// Largest velocity in a main, m/s.
    VelocityHigh,
    /// Impeller diameter over the full one.
    Trim,
    /// Starts of a motor in an hour.
    StartsPerHour,
}

/// What a limit measures.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Measure {
    /// A share, written as a per cent.
    Share,
    /// A plain number.
    Number,
    /// A length, m.
    Length,
    /// A gauge pressure, Pa.
    Pressure,
    /// A velocity, m/s.
    Velocity,
}

/// A row of the table of limits. The preferred region varies with specific speed and the NPSH margin by service: the figures here
/// are the ends of the ranges quoted in the trade that let most pass.
struct Row {
    name: LimitName,
    key: &'static str,
    measure: Measure,
    /// None: not judged unless the file gives it.
    default: Option<f64>,
    source: &'static str,
}

const HI_REGION: &str = "ANSI/HI 9.6.3 as quoted in the trade";
const HI_NPSH: &str = "ANSI/HI 9.6.1 as quoted in the trade";
const PRACTICE: &str = "common practice, no source";
const NONE_KNOWN: &str = "no default: depends on the pump or the service";

const TABLE: [Row; 15] = [
    row(
        LimitName::PreferredLow,
        "preferred_low",
        Measure::Share,
        Some(0.7),
        HI_REGION,
    ),
    row(
        LimitName::PreferredHigh,
        "preferred_high",
        Measure::Share,
        Some(1.2),
        HI_REGION,
    ),
    row(
        LimitName::AllowableLow,
        "allowable_low",
        Measure::Share,
        None,
        NONE_KNOWN,
    ),
    row(
        LimitName::AllowableHigh,
        "allowable_high",
        Measure::Share,
        None,
        NONE_KNOWN,
    ),
    row(
        LimitName::MinimumFlow,
        "minimum_flow",
        Measure::Share,
        Some(0.3),
        "common practice (25 to 40 % of BEP), no source",
    ),
    row(
        LimitName::NpshRatio,
        "npsh_ratio",
        Measure::Number,
        Some(1.1),
        HI_NPSH,
    ),
    row(
        LimitName::NpshMargin,
        "npsh_margin",
        Measure::Length,
        Some(1.0),
        HI_NPSH,
    ),
    row(
        LimitName::MotorLoad,
        "motor_load",
        Measure::Share,
        Some(1.0),
        "the motor's rating",
    ),
    row(
        LimitName::RiseToShutoff,
        "rise_to_shutoff",
        Measure::Share,
        Some(0.1),
        PRACTICE,
    ),
    row(
        LimitName::SuctionPressure,
        "suction_pressure",
        Measure::Pressure,
        None,
        NONE_KNOWN,
    ),
    row(
        LimitName::ShutoffTolerance,
        "shutoff_tolerance",
        Measure::Share,
        Some(0.05),
        "head tolerance of ISO 9906:2012 grade 2B, from memory",
    ),
    row(
        LimitName::VelocityLow,
        "velocity_low",
        Measure::Velocity,
        None,
        NONE_KNOWN,
    ),
    row(
        LimitName::VelocityHigh,
        "velocity_high",
        Measure::Velocity,
        Some(2.5),
        "common practice (2 to 2.5 m/s), no source",
    ),
    row(
        LimitName::Trim,
        "trim",
        Measure::Share,
        Some(0.8),
        "range in which trimming follows the affinity laws well enough: common practice, no source",
    ),
    row(
        LimitName::StartsPerHour,
        "starts_per_hour",
        Measure::Number,
        None,
        "US Army Corps of Engineers EI 11C201 (1997), table 7-1, by the size of the motor",
    ),
];

const fn row(
    name: LimitName,
    key: &'static str,
    measure: Measure,
    default: Option<f64>,
    source: &'static str,
) -> Row {
    Row {
        name,
        key,
        measure,
        default,
        source,
    }
}

impl LimitName {
    /// All, in the order of the table.
    pub fn all() -> impl Iterator<Item = Self> {
        TABLE.iter().map(|row| row.name)
    }

    /// The key by which a file sets it.
    pub fn key(self) -> &'static str {
        TABLE[self as usize].key
    }

    /// What it measures.
    pub fn measure(self) -> Measure {
        TABLE[self as usize].measure
    }
}

/// A limit as a file sets it.
#[derive(Clone, Debug, PartialEq)]
struct Given {
    value: f64,
    source: Option<Arc<str>>,
}

/// The limits of a system: what its file sets, and the defaults for the rest.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Limits {
    given: [Option<Given>; TABLE.len()],
}

impl Limits {
    /// The value, SI; none: not judged.
    pub fn value(&self, name: LimitName) -> Option<f64> {
        self.given[name as usize]
            .as_ref()
            .map(|given| given.value)
            .or(TABLE[name as usize].default)
    }

    /// The preferred region as shares of best-efficiency flow, where the maker states none.
    pub fn preferred(&self) -> (f64, f64) {
        let value = |name, default| self.value(name).unwrap_or(default);
        (
            value(LimitName::PreferredLow, 0.0),
            value(LimitName::PreferredHigh, f64::INFINITY),
        )
    }

    /// Who says so.
    pub fn source(&self, name: LimitName) -> &str {
        match &self.given[name as usize] {
            Some(Given {
                source: Some(source),
                ..
            }) => source,
            Some(_) => "this file",
            None => TABLE[name as usize].source,
        }
    }

    /// Whether the file sets it.
    pub fn is_given(&self, name: LimitName) -> bool {
        self.given[name as usize].is_some()
    }

    /// Sets a limit, SI, and who says so.
    pub fn set(&mut self, name: LimitName, value: f64, source: Option<&str>) {
        self.given[name as usize] = Some(Given {
            value,
            source: source.map(Arc::from),
        });
    }

    /// Starts in an hour that a motor of this rating (W) bears, unless the file sets a limit.
    ///
    /// # Source
    /// US Army Corps of Engineers EI 11C201 (1997), table 7-1: below 15 kW one start in 10 to 15 min, to 75 kW in 15 to 20 min, to 185 kW
    /// in 20 to 30 min; the shorter times here. Larger motors: none, the maker says.
    pub fn starts_per_hour(&self, rated: Option<f64>) -> Option<f64> {
        const KW: f64 = 1e3;
        let by_size = [(15.0, 6.0), (75.0, 4.0), (185.0, 3.0)];
        self.value(LimitName::StartsPerHour).or_else(|| {
            let rated = rated?;
            by_size
                .iter()
                .find(|(largest, _)| rated <= largest * KW)
                .map(|(_, starts)| *starts)
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_table_stands_in_the_order_of_the_enum() {
        for (position, row) in TABLE.iter().enumerate() {
            assert_eq!(row.name as usize, position, "{}", row.key);
        }
    }

    #[test]
    fn the_file_comes_before_the_default_and_says_who_says_so() {
        let mut limits = Limits::default();
        assert_eq!(limits.value(LimitName::NpshRatio), Some(1.1));
        limits.set(LimitName::NpshRatio, 1.5, None);
        limits.set(LimitName::SuctionPressure, 7e4, Some("maker"));
        assert_eq!(limits.value(LimitName::NpshRatio), Some(1.5));
        assert_eq!(limits.source(LimitName::NpshRatio), "this file");
        assert_eq!(limits.source(LimitName::SuctionPressure), "maker");
        assert_eq!(limits.starts_per_hour(Some(22e3)), Some(4.0));
        assert_eq!(limits.starts_per_hour(Some(1e6)), None);
    }
}

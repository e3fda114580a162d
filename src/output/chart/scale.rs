//! From values to millimetres, and where an axis is marked.

use super::AxisKind;

const MINUTE: f64 = 60.0;
const HOUR: f64 = 3600.0;
const DAY: f64 = 86_400.0;

/// Steps between marked times that people count in, s.
const TIMES: [f64; 15] = [
    MINUTE,
    2.0 * MINUTE,
    5.0 * MINUTE,
    10.0 * MINUTE,
    15.0 * MINUTE,
    30.0 * MINUTE,
    HOUR,
    2.0 * HOUR,
    3.0 * HOUR,
    6.0 * HOUR,
    12.0 * HOUR,
    DAY,
    2.0 * DAY,
    7.0 * DAY,
    28.0 * DAY,
];

/// A linear scale: the value at one end of a stretch of paper and that at the other.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Scale {
    pub values: (f64, f64),
    pub paper: (f64, f64),
}

impl Scale {
    /// Place on paper, mm.
    pub fn at(&self, value: f64) -> f64 {
        let share = (value - self.values.0) / (self.values.1 - self.values.0);
        self.paper.0 + share * (self.paper.1 - self.paper.0)
    }
}

/// The marked values of an axis, about `count` of them: steps of 1, 2 or 5 times a power of ten, or times that people count in.
pub fn ticks(range: (f64, f64), kind: AxisKind, count: usize) -> Vec<f64> {
    let (low, high) = range;
    let span = high - low;
    let about = span / count.max(1) as f64;
    if !(span > 0.0 && span.is_finite() && about > 0.0) {
        return Vec::new();
    }
    let (step, origin) = match kind {
        AxisKind::Number => (nice(about), 0.0),
        AxisKind::Clock { starts } => {
            let fits = TIMES.into_iter().find(|time| *time >= about);
            let step = fits.unwrap_or_else(|| DAY * nice(about / DAY).max(1.0));
            // whole hours of the clock, not of the run
            (step, -(starts % step.min(DAY)))
        }
    };
    let first = ((low - origin) / step - 1e-9).ceil();
    let last = ((high - origin) / step + 1e-9).floor();
    let marked = (0..=(last - first).max(-1.0) as i64).map(|i| {
        let value = origin + (first + i as f64) * step;
        // no -0 and no 0.30000000000000004
        let decimals = (1.0 - step.log10().floor()).max(0.0) as i32;
        let unit = 10f64.powi(decimals);
        (value * unit).round() / unit + 0.0
    });
    if last < first {
        Vec::new()
    } else {
        marked.collect()
    }
}

/// The least of 1, 2, 5 times a power of ten that is not below `about`.
fn nice(about: f64) -> f64 {
    let power = 10f64.powf(about.log10().floor());
    let fits = [1.0, 2.0, 5.0]
        .into_iter()
        .find(|m| m * power >= about * (1.0 - 1e-9));
    fits.unwrap_or(10.0) * power
}

/// How the marks of an axis are written, alike for all of them.
pub(super) fn written(marks: &[f64], kind: AxisKind) -> Vec<String> {
    let step = marks
        .windows(2)
        .map(|pair| pair[1] - pair[0])
        .fold(f64::INFINITY, f64::min);
    match kind {
        AxisKind::Number => {
            let decimals = if step.is_finite() {
                (-(step.log10() + 1e-9).floor()).clamp(0.0, 9.0) as usize
            } else {
                1
            };
            let write = |mark: &f64| format!("{:.decimals$}", mark).replace('-', "\u{2212}");
            marks.iter().map(write).collect()
        }
        AxisKind::Clock { starts } => {
            let write = |mark: &f64| {
                if step < DAY {
                    clock(starts + mark)
                } else {
                    format!("day {}", ((starts + mark) / DAY + 1e-9).floor() as i64 + 1)
                }
            };
            marks.iter().map(write).collect()
        }
    }
}

/// Hours and minutes of a time of day given in s after midnight, which may be past it.
pub fn clock(time: f64) -> String {
    let minutes = (time / MINUTE).round().rem_euclid(DAY / MINUTE) as u32;
    format!("{:02}:{:02}", minutes / 60, minutes % 60)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_marked_in_round_steps() {
        assert_eq!(
            ticks((0.0, 47.0), AxisKind::Number, 6),
            [0.0, 10.0, 20.0, 30.0, 40.0]
        );
        assert_eq!(
            ticks((-0.3, 0.4), AxisKind::Number, 7),
            [-0.3, -0.2, -0.1, 0.0, 0.1, 0.2, 0.3, 0.4]
        );
        assert_eq!(
            written(&ticks((-0.3, 0.1), AxisKind::Number, 4), AxisKind::Number)[0],
            "\u{2212}0.3"
        );
        assert!(ticks((1.0, 1.0), AxisKind::Number, 5).is_empty());
        assert!(ticks((0.0, f64::NAN), AxisKind::Number, 5).is_empty());
    }

    #[test]
    fn times_are_marked_on_the_hours_of_the_clock() {
        let kind = AxisKind::Clock { starts: 6.5 * HOUR };
        let marks = ticks((0.0, 8.0 * HOUR), kind, 8);
        assert_eq!(marks[0], 0.5 * HOUR);
        assert_eq!(written(&marks, kind)[0], "07:00");
        let night = AxisKind::Clock {
            starts: 22.0 * HOUR,
        };
        let marks = ticks((0.0, 6.0 * HOUR), night, 3);
        assert_eq!(written(&marks, night), ["22:00", "00:00", "02:00", "04:00"]);
        let year = AxisKind::Clock { starts: 0.0 };
        assert!(ticks((0.0, 365.0 * DAY), year, 12).len() <= 14);
    }
}

//! What changes by the clock: a figure given at points in time, and stretches of the day.
//!
//! Times here are seconds since midnight of the first day.

/// Slack (s) within which a time counts as a corner: far below any schedule's resolution, far above rounding in a year.
const SLACK: f64 = 1e-6;

const DAY: f64 = 86_400.0;

/// A time (s) and the figure from there on.
type Point = (f64, f64);

/// What lies between two points.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Between {
    /// Each value holds until the next point.
    Steps,
    /// A straight line.
    Straight,
}

/// Why a schedule could not be made.
#[derive(Clone, Debug, PartialEq)]
pub enum ScheduleError {
    /// No point.
    Empty,
    /// Point number `at` (from 0) is not finite.
    NotFinite { at: usize },
    /// Point number `at` does not come after the one before it.
    NotRising { at: usize },
    /// The points span more than one repetition.
    LongerThanRepeat,
    /// A repetition that takes no time.
    NoRepeat,
}

impl std::fmt::Display for ScheduleError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Empty => write!(f, "a schedule needs at least one point"),
            Self::NotFinite { at } => write!(f, "point number {} is not finite", at + 1),
            Self::NotRising { at } => {
                write!(
                    f,
                    "point number {} does not come after the one before it",
                    at + 1
                )
            }
            Self::LongerThanRepeat => write!(f, "the points span more than one repetition"),
            Self::NoRepeat => write!(f, "a repetition has to take some time"),
        }
    }
}

impl std::error::Error for ScheduleError {}

/// A figure over time. Before the first point the last value holds; where it repeats, a straight one also runs from the
/// last point to the first of the next round.
///
/// ```
/// use dutybank::shift::{Between, Schedule};
/// let day = Schedule::new(vec![(0.0, 0.4), (21_600.0, 1.1)], Between::Steps, Some(86_400.0))?;
/// assert_eq!(day.at(3.0 * 86_400.0 + 30_000.0).0, 1.1);
/// # Ok::<(), dutybank::shift::ScheduleError>(())
/// ```
#[derive(Clone, Debug, PartialEq)]
pub struct Schedule {
    points: Vec<(f64, f64)>,
    between: Between,
    repeat: Option<f64>,
}

impl Schedule {
    /// From points (s, value) in order of time; `repeat` in s.
    ///
    /// # Errors
    /// See [`ScheduleError`].
    pub fn new(
        points: Vec<(f64, f64)>,
        between: Between,
        repeat: Option<f64>,
    ) -> Result<Self, ScheduleError> {
        let (Some(first), Some(last)) = (points.first(), points.last()) else {
            return Err(ScheduleError::Empty);
        };
        if let Some(at) = points
            .iter()
            .position(|p| !(p.0.is_finite() && p.1.is_finite()))
        {
            return Err(ScheduleError::NotFinite { at });
        }
        if let Some(at) = (1..points.len()).find(|&i| points[i].0 <= points[i - 1].0) {
            return Err(ScheduleError::NotRising { at });
        }
        match repeat {
            Some(period) if !(period > SLACK && period.is_finite()) => {
                return Err(ScheduleError::NoRepeat);
            }
            Some(period) if last.0 - first.0 >= period => {
                return Err(ScheduleError::LongerThanRepeat);
            }
            _ => {}
        }
        Ok(Self {
            points,
            between,
            repeat,
        })
    }

    /// One value, always.
    pub fn constant(value: f64) -> Self {
        Self {
            points: vec![(0.0, value)],
            between: Between::Steps,
            repeat: None,
        }
    }

    /// Value just after `t`, and how fast it changes there (per s).
    pub fn at(&self, t: f64) -> (f64, f64) {
        let (start, next) = self.place(t);
        let last = self.points.len() - 1;
        let (from, to) = match start {
            // before the first point of a schedule that does not repeat
            None => return (self.points[last].1, 0.0),
            Some(start) => (start, next),
        };
        let (t0, v0) = from;
        match (self.between, to) {
            (Between::Straight, Some((t1, v1))) => {
                let slope = (v1 - v0) / (t1 - t0);
                (v0 + slope * (t - t0), slope)
            }
            _ => (v0, 0.0),
        }
    }

    /// The next time after `t` at which the value jumps or its slope changes; infinite if there is none.
    pub fn next_corner(&self, t: f64) -> f64 {
        if self.points.len() == 1 && self.repeat.is_some() {
            return f64::INFINITY;
        }
        self.place(t).1.map_or(f64::INFINITY, |point| point.0)
    }

    /// The point at or before `t` and the one after it, at their times.
    fn place(&self, t: f64) -> (Option<Point>, Option<Point>) {
        let points = &self.points;
        let base = match self.repeat {
            Some(period) => period * ((t - points[0].0 + SLACK) / period).floor(),
            None => 0.0,
        };
        let after = points.partition_point(|point| point.0 + base <= t + SLACK);
        let at = |i: usize, shift: f64| (points[i].0 + shift, points[i].1);
        let start = after.checked_sub(1).map(|i| at(i, base));
        let next = match self.repeat {
            _ if after < points.len() => Some(at(after, base)),
            Some(period) => Some(at(0, base + period)),
            None => None,
        };
        (start, next)
    }
}

/// A stretch of every day, from one time of day to another (s since midnight); past midnight if the second is smaller.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Daily {
    /// First moment.
    pub from: f64,
    /// First moment after it.
    pub to: f64,
}

impl Daily {
    /// Whether `t` (just after it) lies in the stretch.
    pub fn contains(&self, t: f64) -> bool {
        let now = (t + SLACK).rem_euclid(DAY);
        if self.from <= self.to {
            self.from <= now && now < self.to
        } else {
            now >= self.from || now < self.to
        }
    }

    /// The next time after `t` at which the stretch begins or ends.
    pub fn next_edge(&self, t: f64) -> f64 {
        let next = |edge: f64| edge + DAY * ((t + SLACK - edge) / DAY).floor() + DAY;
        next(self.from).min(next(self.to))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn day(between: Between) -> Schedule {
        let points = vec![(21_600.0, 1.0), (43_200.0, 3.0), (64_800.0, 2.0)];
        Schedule::new(points, between, Some(DAY)).unwrap()
    }

    #[test]
    fn steps_hold_and_wrap() {
        let steps = day(Between::Steps);
        assert_eq!(steps.at(0.0), (2.0, 0.0));
        assert_eq!(steps.at(21_600.0), (1.0, 0.0));
        assert_eq!(steps.at(21_599.0), (2.0, 0.0));
        assert_eq!(steps.at(10.0 * DAY + 50_000.0), (3.0, 0.0));
        assert_eq!(steps.next_corner(0.0), 21_600.0);
        assert_eq!(steps.next_corner(21_600.0), 43_200.0);
        assert_eq!(steps.next_corner(64_800.0), DAY + 21_600.0);
    }

    #[test]
    fn straight_runs_over_midnight() {
        let straight = day(Between::Straight);
        // from 2 at 18:00 to 1 at 6:00: half-way at midnight
        assert!((straight.at(0.0).0 - 1.5).abs() < 1e-12);
        assert!((straight.at(DAY).0 - 1.5).abs() < 1e-12);
        assert!((straight.at(32_400.0).0 - 2.0).abs() < 1e-12);
        assert!((straight.at(32_400.0).1 - 2.0 / 21_600.0).abs() < 1e-18);
    }

    #[test]
    fn without_repetition_the_last_value_holds_on_both_sides() {
        let once = Schedule::new(vec![(10.0, 1.0), (20.0, 5.0)], Between::Straight, None).unwrap();
        assert_eq!(once.at(0.0), (5.0, 0.0));
        assert_eq!(once.at(100.0), (5.0, 0.0));
        assert_eq!(once.next_corner(0.0), 10.0);
        assert_eq!(once.next_corner(20.0), f64::INFINITY);
    }

    #[test]
    fn corners_are_reached_in_a_year_of_days() {
        let steps = day(Between::Steps);
        let mut t = 0.0;
        for _ in 0..3 * 365 {
            let next = steps.next_corner(t);
            assert!(next > t && next - t <= 43_200.0 + 1e-3);
            t = next;
        }
        assert!((t - (364.0 * DAY + 64_800.0)).abs() < 1e-6);
    }

    #[test]
    fn a_stretch_over_midnight() {
        let night = Daily {
            from: 82_800.0,
            to: 25_200.0,
        };
        assert!(night.contains(0.0) && night.contains(82_800.0) && !night.contains(25_200.0));
        assert_eq!(night.next_edge(0.0), 25_200.0);
        assert_eq!(night.next_edge(25_200.0), 82_800.0);
        assert_eq!(night.next_edge(82_800.0), DAY + 25_200.0);
    }

    #[test]
    fn points_out_of_order_are_refused() {
        let twice = Schedule::new(vec![(1.0, 0.0), (1.0, 2.0)], Between::Steps, None);
        assert_eq!(twice, Err(ScheduleError::NotRising { at: 1 }));
        let long = Schedule::new(vec![(0.0, 0.0), (90_000.0, 2.0)], Between::Steps, Some(DAY));
        assert_eq!(long, Err(ScheduleError::LongerThanRepeat));
    }
}

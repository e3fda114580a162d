//! Where a volume reaches a threshold within a step, its extrema inside the step looked at too.

use super::root::far_side;
use super::step::Step;
use std::convert::Infallible;

/// Which way a threshold is reached.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Way {
    /// At it or above.
    Up,
    /// At it or below.
    Down,
}

impl Way {
    pub fn reached(self, value: f64, threshold: f64) -> bool {
        match self {
            Self::Up => value >= threshold,
            Self::Down => value <= threshold,
        }
    }
}

/// The places 0, 1 and up to three extrema between them that split a quartic's course into monotone stretches.
#[derive(Clone, Copy, Debug)]
pub(super) struct Stretches {
    places: [f64; 5],
    count: usize,
}

impl Stretches {
    pub fn places(&self) -> &[f64] {
        &self.places[..self.count]
    }

    /// For the change c[0] theta + c[1] theta2 + c[2] theta3 + c[3] theta4.
    pub fn of(c: [f64; 4]) -> Self {
        let slope = |x: f64| c[0] + x * (2.0 * c[1] + x * (3.0 * c[2] + x * 4.0 * c[3]));
        let mut found = Self {
            places: [0.0; 5],
            count: 1,
        };
        // The slope is monotone between the roots of its own slope 2 c1 + 6 c2 x + 12 c3 x2.
        let bends = quadratic_roots(2.0 * c[1], 6.0 * c[2], 12.0 * c[3]);
        let mut left = 0.0;
        for right in bends
            .into_iter()
            .filter(|x| *x > 0.0 && *x < 1.0)
            .chain([1.0])
        {
            let (a, b) = (slope(left), slope(right));
            if (a < 0.0 && b > 0.0) || (a > 0.0 && b < 0.0) {
                let Ok(x) = far_side((left, a), (right, b), 1e-15, |x| {
                    Ok::<f64, Infallible>(slope(x))
                });
                found.push(x);
            }
            left = right;
        }
        found.push(1.0);
        found
    }

    fn push(&mut self, place: f64) {
        self.places[self.count] = place;
        self.count += 1;
    }
}

/// Real roots of a + b x + c x2, ascending; what does not exist is NaN.
fn quadratic_roots(a: f64, b: f64, c: f64) -> [f64; 2] {
    if c == 0.0 {
        return [-a / b, f64::NAN];
    }
    let root = (b * b - 4.0 * a * c).sqrt();
    // the stable form: no difference of like numbers
    let q = -0.5 * (b + root.copysign(b));
    let (x, y) = (q / c, a / q);
    if x <= y { [x, y] } else { [y, x] }
}

/// The first place (0 to 1) in the step at which state `i`, which starts at `y`, comes to `threshold`;
/// to 1e-9 s, and never before it is reached.
pub(super) fn first_reach(step: &Step, i: usize, y: f64, threshold: f64, way: Way) -> Option<f64> {
    let c = step.polynomial(i);
    let spread: f64 = c.iter().map(|c| c.abs()).sum();
    if (threshold - y).abs() > spread * (1.0 + 1e-12) {
        return None;
    }
    let value = |theta: f64| step.at(i, y, theta) - threshold;
    let stretches = Stretches::of(c);
    let mut left = (0.0, y - threshold);
    // Being there at the start does not count; leaving and coming back does.
    let mut waiting = !way.reached(left.1, 0.0);
    for &place in &stretches.places()[1..] {
        let right = (place, value(place));
        let reached = way.reached(right.1, 0.0);
        if reached && waiting {
            let tolerance = (1e-9 / step.h).max(1e-16);
            let Ok(theta) = far_side(left, right, tolerance, |x| Ok::<f64, Infallible>(value(x)));
            return Some(theta);
        }
        waiting |= !reached;
        left = right;
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::ops::ControlFlow;

    /// A step of 1 s along y' = slope(t).
    fn step(slope: impl Fn(f64) -> f64) -> Step {
        let mut step = Step::new(1, 1);
        step.first_mut()[0] = slope(0.0);
        let done: Result<_, ()> = step.take(0.0, 1.0, &[0.0], |t, _, k| {
            k[0] = slope(t);
            Ok(ControlFlow::Continue(()))
        });
        assert!(done.is_ok());
        step
    }

    #[test]
    fn two_crossings_in_one_step_are_seen() {
        // y = t - t2: rises to 0.25 at 0.5 and is back at 0 at 1
        let hump = step(|t| 1.0 - 2.0 * t);
        let up = first_reach(&hump, 0, 0.0, 0.2, Way::Up).unwrap();
        assert!((up - (0.5 - 0.05f64.sqrt())).abs() < 1e-8);
        assert!(hump.at(0, 0.0, up) >= 0.2);
        assert_eq!(first_reach(&hump, 0, 0.0, 0.2501, Way::Up), None);
        assert_eq!(first_reach(&hump, 0, 0.0, -0.1, Way::Down), None);
    }

    #[test]
    fn three_extrema_split_a_quartic() {
        // slope (x-0.2)(x-0.5)(x-0.9)
        let c = [-0.09, 0.5 * 0.73, -1.6 / 3.0, 0.25];
        let places = Stretches::of(c);
        let found = places.places();
        assert_eq!(found.len(), 5);
        for (x, expected) in found.iter().zip([0.0, 0.2, 0.5, 0.9, 1.0]) {
            assert!((x - expected).abs() < 1e-12);
        }
    }
}

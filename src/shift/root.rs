//! A bracketed root: where a continuous function changes sign.

/// Narrows a bracket `a..b` (the function has opposite signs there, `fa` and `fb`) to a width of `tolerance` and returns the end on
/// the side of `b`: a point at which the function already has the sign it had at `b`, or is zero.
///
/// Interpolates like the rule of false position with the weight of a stagnant end halved (Illinois), and bisects where that
/// does not halve the bracket in three steps.
///
/// # Errors
/// What the function returns.
///
/// # Source
/// M. Dowell, P. Jarratt, "A modified regula falsi method for computing the root of an equation", BIT 11, 1971.
pub(super) fn far_side<E>(
    (mut a, mut fa): (f64, f64),
    (mut b, mut fb): (f64, f64),
    tolerance: f64,
    mut f: impl FnMut(f64) -> Result<f64, E>,
) -> Result<f64, E> {
    const LIMIT: u32 = 400;
    let positive = fb > 0.0;
    let mut last_moved = 0;
    let mut width = (b - a).abs();
    for round in 0..LIMIT {
        if (b - a).abs() <= tolerance || fb == 0.0 {
            break;
        }
        let middle = 0.5 * (a + b);
        let falls = fb / (fb - fa);
        // Keep a little inside, so that the far end closes in too.
        let secant = b - (b - a) * falls.clamp(0.01, 0.99);
        let slow = round % 3 == 2 && (b - a).abs() > 0.5 * width;
        let x = if slow || !secant.is_finite() {
            middle
        } else {
            secant
        };
        let fx = f(x)?;
        if fx == 0.0 || (fx > 0.0) == positive {
            (b, fb) = (x, fx);
            if last_moved == 1 {
                fa *= 0.5;
            }
            last_moved = 1;
        } else {
            (a, fa) = (x, fx);
            if last_moved == -1 {
                fb *= 0.5;
            }
            last_moved = -1;
        }
        if round % 3 == 2 {
            width = (b - a).abs();
        }
    }
    Ok(b)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn root(a: f64, b: f64, f: impl Fn(f64) -> f64) -> f64 {
        let found: Result<f64, ()> = far_side((a, f(a)), (b, f(b)), 1e-13, |x| Ok(f(x)));
        found.unwrap()
    }

    #[test]
    fn finds_the_far_side_of_smooth_steep_and_jumping_roots() {
        let smooth = root(0.0, 2.0, |x| x * x - 2.0);
        assert!((smooth - 2f64.sqrt()).abs() < 1e-12 && smooth * smooth >= 2.0);
        let steep = root(0.0, 1.0, |x: f64| (x - 0.3).powi(9));
        assert!((steep - 0.3).abs() < 1e-12);
        let jump = root(0.0, 1.0, |x| if x < 0.7 { -1.0 } else { 1e-9 });
        assert!((jump - 0.7).abs() < 1e-12 && jump >= 0.7);
        let backwards = root(1.0, 0.0, |x| x - 0.25);
        assert!((backwards - 0.25).abs() < 1e-12 && backwards <= 0.25);
    }
}

//! One battery over every law: finite, never falling, continuous, slope equal to the numeric slope, smooth through
//! zero, and odd where a part does the same to water from either side.

use dutybank::part::HeadLaw;
use dutybank::part::curve::{Curve, Polynomial};
use dutybank::part::friction::{DarcyWeisbachBatch, Friction};
use dutybank::part::pump::PumpLaw;
use dutybank::part::quadratic::QuadraticLoss;
use dutybank::part::valve::{Characteristic, Valve};
use proptest::prelude::*;
use proptest::test_runner::TestCaseResult;

use crate::random;

const GRAVITY: f64 = 9.80665;

/// A law under test.
trait Tested: HeadLaw {
    /// How large the figures are that its loss is made of, m: its rounding is a few last digits of that.
    fn size(&self, q: f64) -> f64 {
        self.loss(q).head.abs()
    }
}

impl Tested for Friction {}
impl Tested for QuadraticLoss {}
impl Tested for PumpLaw<'_> {
    fn size(&self, q: f64) -> f64 {
        self.loss(0.0).head.abs() + self.loss(q).head.abs()
    }
}

/// The battery on flows about `scale` (m3/s). `corners` are flows at which the slope may turn sharply; the numeric slope
/// is not taken across them.
fn battery(law: &impl Tested, scale: f64, odd: bool, corners: &[f64]) -> TestCaseResult {
    let mut flows: Vec<f64> = Vec::new();
    for i in 0..60 {
        // eight decades to either side, and evenly across
        let far = scale * 10_f64.powf(-8.0 + 8.0 * f64::from(i) / 59.0);
        flows.extend([far, -far, scale * (f64::from(i) - 29.5) / 29.5]);
    }
    flows.extend([0.0, -0.0]);
    flows.extend(
        corners
            .iter()
            .flat_map(|q| [*q, q.next_up(), q.next_down()]),
    );
    flows.sort_by(f64::total_cmp);
    let mut before: Option<(f64, f64)> = None;
    for &q in &flows {
        let loss = law.loss(q);
        prop_assert!(loss.head.is_finite() && loss.slope.is_finite(), "at {q}");
        // a slope below zero is a law that falls
        let size = law.loss(scale).head.abs() + law.loss(0.0).head.abs();
        prop_assert!(
            loss.slope >= -1e-12 * size / scale,
            "slope {} at {q}",
            loss.slope
        );
        if let Some((at, head)) = before {
            let rounding = 4.0 * f64::EPSILON * law.size(at).max(law.size(q));
            prop_assert!(loss.head >= head - rounding, "falls from {at} to {q}");
        }
        before = Some((q, loss.head));
        if odd {
            let other = law.loss(-q);
            prop_assert_eq!(other.head, -loss.head, "not odd at {}", q);
            prop_assert_eq!(other.slope, loss.slope, "slope not even at {}", q);
        }
        continuous(law, q)?;
        numeric_slope(law, q, scale, corners)?;
    }
    smooth_through_zero(law, scale)
}

/// Next to `q` the loss differs by no more than the slope makes of it, and rounding.
fn continuous(law: &impl Tested, q: f64) -> TestCaseResult {
    let here = law.loss(q);
    for near in [q.next_up(), q.next_down()] {
        let there = law.loss(near);
        let step = (near - q).abs() * here.slope.max(there.slope);
        let rounding = 16.0 * f64::EPSILON * law.size(q);
        prop_assert!(
            (there.head - here.head).abs() <= 2.0 * step + rounding,
            "jumps from {} to {} at {q}",
            here.head,
            there.head
        );
    }
    Ok(())
}

/// The stated slope against a five-point difference of the losses.
fn numeric_slope(law: &impl Tested, q: f64, scale: f64, corners: &[f64]) -> TestCaseResult {
    let step = 1e-3 * q.abs().max(1e-9 * scale);
    let clear = |corner: &f64| (q - corner).abs() > 2.5 * step;
    if !corners.iter().all(clear) {
        return Ok(());
    }
    let head = |n: f64| law.loss(q + n * step).head;
    // f' = (f(-2) - 8 f(-1) + 8 f(1) - f(2)) / 12 s, error s4 f(5)/30
    let numeric = (head(-2.0) - 8.0 * head(-1.0) + 8.0 * head(1.0) - head(2.0)) / (12.0 * step);
    let stated = law.loss(q).slope;
    let ends = law.size(q + 2.0 * step).max(law.size(q - 2.0 * step));
    let rounding = 8.0 * f64::EPSILON * ends / step;
    prop_assert!(
        (numeric - stated).abs() <= 1e-6 * stated.abs() + rounding,
        "slope {stated}, numeric {numeric} at {q}"
    );
    Ok(())
}

/// Slopes just above and just below no flow meet: what is between them vanishes with the flow.
fn smooth_through_zero(law: &impl Tested, scale: f64) -> TestCaseResult {
    let apart = |q: f64| (law.loss(q).slope - law.loss(-q).slope).abs();
    let (near, nearer) = (apart(1e-12 * scale), apart(1e-15 * scale));
    let rounding = 8.0 * f64::EPSILON * law.loss(0.0).slope.abs();
    prop_assert!(
        nearer <= 0.01 * near + rounding,
        "slopes {near} apart, still {nearer} a thousand times nearer to no flow"
    );
    Ok(())
}

fn decades(low: f64, high: f64) -> impl Strategy<Value = f64> {
    (low.log10()..high.log10()).prop_map(|power| 10_f64.powf(power))
}

/// Flows that rise and heads that fall, as many of each.
fn falling_points() -> impl Strategy<Value = (Vec<f64>, Vec<f64>)> {
    let steps = prop::collection::vec((0.01..1.0_f64, 0.0..1.0_f64), 1..9);
    (steps, 0.01..0.5_f64, 5.0..80.0_f64).prop_map(|(steps, end, shutoff)| {
        let width: f64 = steps.iter().map(|step| step.0).sum();
        let fall: f64 = steps.iter().map(|step| step.1).sum::<f64>().max(1e-3);
        let (mut q, mut h) = (vec![0.0], vec![shutoff]);
        for (i, step) in steps.iter().enumerate() {
            q.push(q[i] + end * step.0 / width);
            h.push(h[i] - 0.8 * shutoff * step.1 / fall);
        }
        (q, h)
    })
}

proptest! {
    #![proptest_config(random::cases(300))]

    #[test]
    fn darcy_weisbach(
        bore in decades(0.005, 3.0),
        length in decades(0.01, 5e4),
        relative_roughness in prop_oneof![Just(0.0), decades(1e-7, 0.1)],
        viscosity in decades(1e-7, 1e-3),
    ) {
        let law = Friction::roughness(length, bore, bore * relative_roughness, viscosity, GRAVITY);
        // Re = q D / (A nu), up to 1e8
        let flow = |reynolds: f64| reynolds * std::f64::consts::FRAC_PI_4 * bore * viscosity;
        let corners = [2000.0, 4000.0].map(flow);
        let both = [corners[0], corners[1], -corners[0], -corners[1]];
        for reynolds in [1.0, 1e3, 1e4, 1e6, 1e8] {
            battery(&law, flow(reynolds), true, &both)?;
        }
        // the two seams have one slope from either side
        for q in corners {
            let (below, above) = (law.loss(q * (1.0 - 1e-9)).slope, law.loss(q * (1.0 + 1e-9)).slope);
            prop_assert!((above - below).abs() <= 1e-6 * above, "{below} {above}");
        }
    }

    /// Colebrook-White itself, with sqrt f taken back out of the loss.
    #[test]
    fn colebrook_white_is_met(
        bore in decades(0.005, 3.0),
        relative_roughness in prop_oneof![Just(0.0), decades(1e-7, 0.1)],
        reynolds in decades(4001.0, 1e8),
    ) {
        let viscosity = 1.004e-6;
        let law = Friction::roughness(bore, bore, bore * relative_roughness, viscosity, GRAVITY);
        let area = std::f64::consts::FRAC_PI_4 * bore * bore;
        let velocity = reynolds * viscosity / bore;
        // L = D, so h = f v2/(2 g)
        let f = law.loss(velocity * area).head * 2.0 * GRAVITY / (velocity * velocity);
        let left = 1.0 / f.sqrt();
        let right = -2.0 * (relative_roughness / 3.7 + 2.51 / (reynolds * f.sqrt())).log10();
        prop_assert!((left - right).abs() <= 1e-8 * left, "{left} {right}");
    }

    /// Pipes evaluated side by side give what each gives alone.
    #[test]
    fn pipes_side_by_side(
        pipes in prop::collection::vec((decades(0.01, 2.0), decades(1e-7, 0.1), decades(1.0, 1e8), any::<bool>()), 1..12),
    ) {
        let mut batch = DarcyWeisbachBatch::default();
        let mut alone = Vec::new();
        for &(bore, roughness, reynolds, back) in &pipes {
            let friction = Friction::roughness(100.0, bore, roughness * bore, 1e-6, GRAVITY);
            let Friction::DarcyWeisbach(law) = friction else { unreachable!() };
            batch.push(law);
            let q = reynolds * std::f64::consts::FRAC_PI_4 * bore * 1e-6;
            alone.push((friction, if back { -q } else { q }));
        }
        let flows: Vec<f64> = alone.iter().map(|(_, q)| *q).collect();
        batch.evaluate(&flows);
        for (i, (law, q)) in alone.iter().enumerate() {
            let (together, single) = (batch.loss(i, *q), law.loss(*q));
            prop_assert!((together.head - single.head).abs() <= 1e-14 * single.head.abs());
            prop_assert!((together.slope - single.slope).abs() <= 1e-14 * single.slope);
        }
    }

    #[test]
    fn hazen_williams(bore in decades(0.01, 3.0), length in decades(0.1, 5e4), c in 40.0..160.0) {
        battery(&Friction::hazen_williams(length, bore, c), bore * bore, true, &[0.0])?;
    }

    #[test]
    fn fixed_factor(bore in decades(0.005, 3.0), length in decades(0.01, 5e4), f in decades(1e-3, 0.2)) {
        battery(&Friction::fixed_factor(length, bore, f, GRAVITY), bore * bore, true, &[0.0])?;
    }

    #[test]
    fn quadratic_losses(k in decades(1e-3, 1e4), bore in decades(0.005, 3.0), head in decades(1e-3, 100.0)) {
        battery(&QuadraticLoss::minor(k, bore, GRAVITY), bore * bore, true, &[0.0])?;
        battery(&QuadraticLoss::at(head, bore * bore), bore * bore, true, &[0.0])?;
        battery(&QuadraticLoss::NONE, 1.0, true, &[0.0])?;
    }

    #[test]
    fn valves(
        kv in decades(1e-5, 1.0),
        opening in 0.0..=1.0_f64,
        less in 0.0..1.0_f64,
        equal_percentage in any::<bool>(),
    ) {
        let characteristic = if equal_percentage {
            Characteristic::EqualPercentage
        } else {
            Characteristic::Linear
        };
        for fully_open in [Valve::kv(kv, GRAVITY), Valve::cv(kv, GRAVITY)] {
            let valve = Valve { fully_open, characteristic };
            let Some(loss) = valve.loss_at(opening) else {
                prop_assert!(opening < 1e-100);
                continue;
            };
            battery(&loss, kv, true, &[0.0])?;
            // the further shut, the greater the loss
            if let Some(throttled) = valve.loss_at(less * opening) {
                prop_assert!(throttled.r() >= loss.r());
            }
            prop_assert_eq!(valve.loss_at(1.0), Some(fully_open));
        }
    }

    #[test]
    fn pumps_through_points(
        points in falling_points(),
        ratio in 0.3..1.3_f64,
        wear in 0.0..0.5_f64,
    ) {
        let (q, h) = points;
        let head = Curve::through(&q, &h).unwrap();
        prop_assert!(head.rising_stretches().is_empty());
        let law = PumpLaw { head: &head, ratio, wear };
        let corners: Vec<f64> = q.iter().map(|q| ratio * q).collect();
        battery(&law, 1.5 * ratio * q[q.len() - 1], false, &corners)?;
        for (q, h) in q.iter().zip(&h) {
            // h = -(1-w) s2 H(q/s)
            let expected = -(1.0 - wear) * ratio * ratio * h;
            let found = law.loss(ratio * q).head;
            prop_assert!((found - expected).abs() <= 1e-12 * (1.0 + expected.abs()), "{found} {expected}");
        }
    }

    #[test]
    fn pumps_by_polynomial(
        shutoff in 5.0..80.0_f64,
        linear in 0.0..0.3_f64,
        square in 0.1..0.5_f64,
        cube in 0.0..0.1_f64,
        limit in decades(0.005, 0.5),
        ratio in 0.3..1.3_f64,
        wear in 0.0..0.5_f64,
    ) {
        let coefficients = [
            shutoff,
            -linear * shutoff / limit,
            -square * shutoff / limit.powi(2),
            -cube * shutoff / limit.powi(3),
        ];
        let head = Curve::Polynomial(Polynomial::new(&coefficients, limit).unwrap());
        prop_assert!(head.rising_stretches().is_empty());
        let law = PumpLaw { head: &head, ratio, wear };
        battery(&law, 1.5 * ratio * limit, false, &[0.0, ratio * limit])?;
        // straight past both ends
        for end in [0.0, ratio * limit] {
            let out = if end == 0.0 { -limit } else { limit };
            let here = law.loss(end);
            let there = law.loss(end + out);
            prop_assert!((there.head - (here.head + out * here.slope)).abs() <= 1e-9 * (1.0 + there.head.abs()));
        }
    }

    /// A line's law is the sum of its parts': it keeps what they all keep.
    #[test]
    fn whole_lines(
        points in falling_points(),
        bore in decades(0.02, 1.0),
        length in decades(0.1, 5e3),
        k in decades(1e-2, 1e2),
    ) {
        struct Sum<'a> {
            pipe: Friction,
            loss: QuadraticLoss,
            pump: PumpLaw<'a>,
        }
        impl HeadLaw for Sum<'_> {
            fn loss(&self, q: f64) -> dutybank::part::HeadLoss {
                let mut sum = self.pipe.loss(q);
                sum += self.loss.loss(q);
                sum += self.pump.loss(q);
                sum
            }
        }
        impl Tested for Sum<'_> {
            fn size(&self, q: f64) -> f64 {
                self.pipe.size(q) + self.loss.size(q) + self.pump.size(q)
            }
        }
        let (q, h) = points;
        let head = Curve::through(&q, &h).unwrap();
        let law = Sum {
            pipe: Friction::roughness(length, bore, 1e-4, 1e-6, GRAVITY),
            loss: QuadraticLoss::minor(k, bore, GRAVITY),
            pump: PumpLaw { head: &head, ratio: 1.0, wear: 0.0 },
        };
        let flow = |reynolds: f64| reynolds * std::f64::consts::FRAC_PI_4 * bore * 1e-6;
        let mut corners = q.clone();
        corners.extend([2000.0, 4000.0, -2000.0, -4000.0].map(flow));
        battery(&law, 1.5 * q[q.len() - 1], false, &corners)?;
    }

    /// The interpolation itself: through its points, between its neighbours, falling where they fall.
    #[test]
    fn curves_stay_between_their_points(points in falling_points()) {
        let (x, y) = points;
        let curve = Curve::through(&x, &y).unwrap();
        for i in 0..x.len() - 1 {
            prop_assert!((curve.at(x[i]).value - y[i]).abs() <= 1e-12 * (1.0 + y[i].abs()));
            for j in 0..=20 {
                let at = curve.at(x[i] + (x[i + 1] - x[i]) * f64::from(j) / 20.0);
                let rounding = 1e-12 * (1.0 + y[i].abs());
                prop_assert!(at.value <= y[i] + rounding && at.value >= y[i + 1] - rounding);
            }
        }
    }
}

/// A drooping curve is found, and its falling stand-ins lie on either side of it.
#[test]
fn drooping_curves_are_named() {
    let curve = Curve::through(&[0.0, 0.1, 0.2, 0.3], &[30.0, 33.0, 31.0, 20.0]).unwrap();
    assert_eq!(curve.rising_stretches(), [(0.0, 0.1)]);
    let level = Curve::through(&[0.0, 0.1, 0.2], &[30.0, 30.0, 20.0]).unwrap();
    assert!(level.rising_stretches().is_empty());
}

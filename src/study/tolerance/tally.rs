//! What many cases come to: bands, shares of cases, and how much of a figure's variance goes with each input.

use crate::network::{LineId, NodeId};
use crate::part::PumpId;
use crate::study::caution::Caution;
use crate::study::limit;

/// Where a figure lies over the cases in which it exists, SI.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Band {
    /// Cases in which it exists.
    pub cases: usize,
    /// 5 % of them lie below.
    pub p5: f64,
    /// Half of them lie below.
    pub p50: f64,
    /// 95 % of them lie below.
    pub p95: f64,
    /// Their mean.
    pub mean: f64,
    /// Their standard deviation.
    pub deviation: f64,
}

/// What a caution is about.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum About {
    /// A pump.
    Pump(PumpId),
    /// A line.
    Line(LineId),
    /// A node.
    Node(NodeId),
    /// The whole system.
    System,
}

impl About {
    /// What this one is about.
    pub fn of(caution: &Caution) -> Self {
        match *caution {
            Caution::HeldShut { pump, .. }
            | Caution::DeadHeaded { pump, .. }
            | Caution::Backflow { pump, .. }
            | Caution::BeforeCurve { pump, .. }
            | Caution::FlatCurve { pump, .. }
            | Caution::Hunting { pump, .. }
            | Caution::ViscousRange { pump, .. } => Self::Pump(pump),
            Caution::Beyond(limit) => match limit.about {
                limit::About::Pump(pump) => Self::Pump(pump),
                limit::About::Line(line) => Self::Line(line),
            },
            Caution::BelowVapour { node, .. } | Caution::NoHead { node } => Self::Node(node),
            Caution::SecondBalance { .. } => Self::System,
        }
    }
}

/// A limit and in how many cases it is broken.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Broken {
    /// Code of the caution.
    pub code: &'static str,
    /// What it is about.
    pub about: About,
    /// In how many cases.
    pub cases: usize,
}

/// In how many cases needs are met.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Needs {
    /// Per need.
    pub met: Vec<usize>,
    /// All at once.
    pub all: usize,
}

/// The band of the figures that exist; none if none does. The sums run in the order given.
///
/// # Source
/// Percentiles by R. J. Hyndman, Y. Fan, "Sample quantiles in statistical packages", The American Statistician 50, 1996,
/// definition 7: straight between the ordered values.
pub(super) fn band(values: &[f64]) -> Option<Band> {
    let mut ordered: Vec<f64> = values.iter().copied().filter(|v| !v.is_nan()).collect();
    let (first, count) = (*ordered.first()?, ordered.len());
    let n = count as f64;
    // shifted by the first value: the variance then keeps its digits
    let (mut sum, mut squares) = (0.0, 0.0);
    for value in &ordered {
        let off = value - first;
        sum += off;
        squares += off * off;
    }
    let variance = (squares - sum * sum / n) / (n - 1.0).max(1.0);
    let mut percentile = |p: f64| {
        let place = p * (n - 1.0);
        let (below, share) = (place.floor() as usize, place.fract());
        let (_, at, above) = ordered.select_nth_unstable_by(below, f64::total_cmp);
        let at = *at;
        let next = above.iter().copied().min_by(f64::total_cmp).unwrap_or(at);
        at + share * (next - at)
    };
    Some(Band {
        cases: count,
        p5: percentile(0.05),
        p50: percentile(0.5),
        p95: percentile(0.95),
        mean: first + sum / n,
        deviation: variance.max(0.0).sqrt(),
    })
}

/// Most bins that an input's way is cut into.
pub(super) const MOST_BINS: usize = 40;
/// Cases wanted in a bin.
const IN_A_BIN: usize = 50;

/// Bins for this number of cases.
pub(super) fn bins_for(cases: usize) -> usize {
    (cases / IN_A_BIN).clamp(2, MOST_BINS)
}

/// Share of the variance of `values` that goes with the bin of an input: how much of it is left when only the means of the bins
/// are looked at, corrected for what chance alone would leave.
///
/// eta2 = sum n_k (mean_k - mean)2 / sum (y - mean)2, and 1 - (1 - eta2) (n - 1)/(n - bins)
///
/// # Source
/// Correlation ratio: K. Pearson, "On the general theory of skew correlation and non-linear regression", 1905; as an estimate of
/// the first-order variance share, E. Plischke, E. Borgonovo, C. L. Smith, "Global sensitivity measures from given data",
/// Eur. J. Oper. Res. 226, 2013; the correction T. L. Kelley, "An unbiased correlation ratio measure", 1935.
pub(super) fn variance_share(values: &[f64], bins: impl Iterator<Item = u8>) -> f64 {
    let mut sums = [(0.0, 0.0); MOST_BINS];
    let (mut count, mut first, mut sum, mut squares) = (0.0, None, 0.0, 0.0);
    for (value, bin) in values.iter().zip(bins) {
        if value.is_nan() {
            continue;
        }
        let off = value - *first.get_or_insert(*value);
        count += 1.0;
        sum += off;
        squares += off * off;
        let (n, s) = &mut sums[usize::from(bin).min(MOST_BINS - 1)];
        *n += 1.0;
        *s += off;
    }
    let total = squares - sum * sum / count;
    let filled: Vec<(f64, f64)> = sums.into_iter().filter(|(n, _)| *n > 0.0).collect();
    let left = count - filled.len() as f64;
    // A figure that only rounding moves has no variance to share.
    if total <= 1e-24 * squares.max(f64::MIN_POSITIVE) || left < 1.0 {
        return 0.0;
    }
    let between = filled.iter().map(|(n, s)| s * s / n).sum::<f64>() - sum * sum / count;
    let eta2 = between / total;
    (1.0 - (1.0 - eta2) * (count - 1.0) / left).max(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn percentiles_lie_straight_between_ordered_values() {
        let values = [5.0, 1.0, f64::NAN, 4.0, 2.0, 3.0];
        let band = band(&values).unwrap();
        assert_eq!((band.cases, band.p50, band.mean), (5, 3.0, 3.0));
        // definition 7: 1 + 0.05 (5 - 1) and 1 + 0.95 (5 - 1)
        assert!((band.p5 - 1.2).abs() < 1e-12 && (band.p95 - 4.8).abs() < 1e-12);
        assert!((band.deviation - 2.5f64.sqrt()).abs() < 1e-12);
        assert_eq!(super::band(&[f64::NAN]), None);
    }

    /// y = 3 a + 4 b over a grid of a and b: 9/25 and 16/25 of the variance.
    #[test]
    fn variance_is_shared_by_squares() {
        let n = 200;
        let mut values = Vec::new();
        let mut bins = [Vec::new(), Vec::new()];
        for i in 0..n {
            for k in 0..n {
                values.push(3.0 * f64::from(i) + 4.0 * f64::from(k));
                bins[0].push((i / 5) as u8);
                bins[1].push((k / 5) as u8);
            }
        }
        let share = |i: usize| variance_share(&values, bins[i].iter().copied());
        assert!((share(0) - 0.36).abs() < 1e-3 && (share(1) - 0.64).abs() < 1e-3);
    }
}

//! Natural logarithms in straight-line code, so that many pipes can be worked out side by side.
//!
//! A call of the standard library's `ln` in such a loop would keep the compiler from doing so. Both take normal
//! numbers above zero; for anything else the result is unspecified but harmless.

/// Splits `x` into an exponent and a mantissa in 1..2.
#[inline(always)]
fn split(x: f64) -> (f64, f64) {
    const MANTISSA: u64 = 0x000f_ffff_ffff_ffff;
    const ONE: u64 = 0x3ff0_0000_0000_0000;
    // The biased exponent put into the mantissa of 2^52 turns into a number by a subtraction: unlike a conversion of
    // integers, two lanes of that exist on every x86-64 processor.
    const TWO_52: u64 = 0x4330_0000_0000_0000;
    const BIAS: f64 = (1u64 << 52) as f64 + 1023.0;
    let bits = x.to_bits();
    let exponent = f64::from_bits((bits >> 52) | TWO_52) - BIAS;
    (exponent, f64::from_bits((bits & MANTISSA) | ONE))
}

/// ln x to 2e-5.
#[inline(always)]
pub(super) fn rough(x: f64) -> f64 {
    let (exponent, mantissa) = split(x);
    let m = mantissa - 1.0;
    // log2(1 + m) on 0..1, least squares
    let m2 = m * m;
    let log2 =
        m * ((1.441_880 - 0.708_865 * m) + m2 * ((0.415_246 - 0.193_517 * m) + 0.045_268_3 * m2));
    std::f64::consts::LN_2 * (exponent + log2)
}

/// ln x to 4e-16 of max(1, |ln x|), for N numbers side by side.
///
/// With x = 2^n m, m near 1, and t = (m-1)/(m+1): ln m = 2 (t + t3/3 + t5/5 + ..).
#[inline(always)]
pub(super) fn exact<const N: usize>(x: [f64; N]) -> [f64; N] {
    use std::array::from_fn;
    let parts: [(f64, f64); N] = from_fn(|n| split(x[n]));
    // 1..2 to 0.707..1.414, by arithmetic instead of a branch
    let upper: [f64; N] = from_fn(|n| {
        if parts[n].1 > std::f64::consts::SQRT_2 {
            1.0
        } else {
            0.0
        }
    });
    let m: [f64; N] = from_fn(|n| parts[n].1 * (1.0 - 0.5 * upper[n]));
    // |t| < 0.1716, t2 < 0.02945: the first term left out is below 1e-16
    let t: [f64; N] = from_fn(|n| (m[n] - 1.0) / (m[n] + 1.0));
    let s: [f64; N] = from_fn(|n| t[n] * t[n]);
    let s2: [f64; N] = from_fn(|n| s[n] * s[n]);
    let low: [f64; N] =
        from_fn(|n| (1.0 / 3.0 + s[n] * (1.0 / 5.0)) + s2[n] * (1.0 / 7.0 + s[n] * (1.0 / 9.0)));
    let high: [f64; N] = from_fn(|n| {
        (1.0 / 11.0 + s[n] * (1.0 / 13.0))
            + s2[n] * (1.0 / 15.0 + s[n] * (1.0 / 17.0))
            + s2[n] * s2[n] * (1.0 / 19.0)
    });
    let series: [f64; N] = from_fn(|n| s[n] * (low[n] + s2[n] * s2[n] * high[n]));
    from_fn(|n| (parts[n].0 + upper[n]) * std::f64::consts::LN_2 + 2.0 * (t[n] + t[n] * series[n]))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn both_equal_the_standard_library_within_their_promise() {
        for i in 0..40_000 {
            let x = 10f64.powf(-200.0 + i as f64 / 100.0);
            assert!((rough(x) - x.ln()).abs() < 2e-5);
            let [ln] = exact([x]);
            assert!((ln - x.ln()).abs() < 4e-16 * x.ln().abs().max(1.0), "{x}");
        }
    }
}

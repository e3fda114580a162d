//! How good is good enough: the tolerances of the iterations and of the certificate, in one place.

/// A tolerance on heads: `absolute + relative x (size of the heads at hand)`, m.
#[derive(Clone, Copy, Debug)]
pub(super) struct HeadTolerance {
    pub absolute: f64,
    pub relative: f64,
}

/// Iterations go on until line balances are this good.
pub(super) const HEAD: HeadTolerance = HeadTolerance {
    absolute: 1e-10,
    relative: 1e-14,
};

/// A line held shut opens when the head along it exceeds its loss at no flow by this, m. Finer than [`HEAD`]: the flow
/// grows with the square root of what is missing.
pub(super) const OPENING: f64 = 1e-12;

/// The certificate asks for this; heads are promised to 1e-8 m.
pub(super) const CERTIFIED_HEAD: HeadTolerance = HeadTolerance {
    absolute: 1e-8,
    relative: 1e-12,
};

/// What the last digits of a flow make of the head along a law of that slope, m: no flow balances it better. Counts only for
/// laws far steeper than any real one (a pump whose flow does not depend on head).
pub(super) fn rounding(q: f64, slope: f64) -> f64 {
    4.0 * f64::EPSILON * (q * slope).abs()
}

/// A tolerance on what a regulating part holds, in its unit: `absolute + relative x (set value)`.
#[derive(Clone, Copy, Debug)]
pub(super) struct HeldTolerance {
    pub absolute: f64,
    pub relative: f64,
}

/// Iterations go on until held heads (m) are this good.
pub(super) const HELD_HEAD: HeldTolerance = HeldTolerance {
    absolute: 1e-9,
    relative: 1e-13,
};

/// The same of held flows, m3/s.
pub(super) const HELD_FLOW: HeldTolerance = HeldTolerance {
    absolute: 1e-12,
    relative: 1e-9,
};

/// How many times as much as the iterations ask for is good enough for the certificate.
pub(super) const CERTIFIED_HELD: f64 = 10.0;

/// Smallest slope (m per m3/s) that the iterations reckon with. The laws themselves stay as they are.
pub(super) const SLOPE_FLOOR: f64 = 1e-7;

/// Iterations go on until node balances are this good, m3/s.
pub(super) fn flow_tolerance(largest_flow: f64) -> f64 {
    1e-13 + 1e-13 * largest_flow
}

/// The certificate asks for this, m3/s: 1e-12 or 1e-10 of the flow.
pub(super) fn certified_flow(largest_flow: f64) -> f64 {
    f64::max(1e-12, 1e-10 * largest_flow)
}

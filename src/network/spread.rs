//! How a figure that is not known exactly is spread between two limits.

/// How likely the values between two limits are.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Shape {
    /// All alike.
    Even,
    /// All decades alike: even in the logarithm. Both limits are above zero.
    LogEven,
    /// As the normal law has it, with the middle between the limits for its mean and the limits so many standard deviations
    /// off; nothing lies beyond them.
    Normal {
        /// Standard deviations from the middle to a limit, above zero.
        limits_at: f64,
    },
}

/// Two limits and what lies between them. A place between them is told by its share of the way: 0 at the low limit, 1 at the
/// high one.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Spread {
    /// Low limit.
    pub low: f64,
    /// High limit, above the low one.
    pub high: f64,
    /// What lies between.
    pub shape: Shape,
}

impl Spread {
    /// The value at a share `t` of the way, by which even draws of `t` give the shape; for a normal law the way is straight
    /// and `t` itself is drawn by the law.
    ///
    /// x = low + t (high - low); in the logarithm x = low (high/low)^t
    ///
    /// ```
    /// use dutybank::network::{Shape, Spread};
    /// let roughness = Spread { low: 0.1, high: 1.0, shape: Shape::LogEven };
    /// assert!((roughness.at(0.5) - 0.1f64.sqrt()).abs() < 1e-15);
    /// ```
    pub fn at(&self, t: f64) -> f64 {
        match self.shape {
            Shape::LogEven => self.low * (self.high / self.low).powf(t),
            Shape::Even | Shape::Normal { .. } => self.low + t * (self.high - self.low),
        }
    }

    /// Share of the straight way from low to high at which [`Self::at`] of `t` lies.
    pub fn straight(&self, t: f64) -> f64 {
        match self.shape {
            Shape::LogEven => (self.at(t) - self.low) / (self.high - self.low),
            Shape::Even | Shape::Normal { .. } => t,
        }
    }
}

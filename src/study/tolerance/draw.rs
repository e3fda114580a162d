//! Drawing the inputs of one case from a stream of its own.

use rand::distr::StandardUniform;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

use crate::network::{Shape, Spread};

/// Where an input stands between its limits, 0 at the low one and 1 at the high one.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Draw {
    /// Share of its own way, in the logarithm where the spread is even there.
    pub place: f64,
    /// Share of the straight way.
    pub straight: f64,
}

impl Draw {
    /// At a share of an input's own way.
    pub fn at(spread: &Spread, place: f64) -> Self {
        Self {
            place,
            straight: spread.straight(place),
        }
    }
}

/// The stream of one case: ChaCha with 8 rounds, its key from the seed, its stream the number of the case.
///
/// # Source
/// D. J. Bernstein, "ChaCha, a variant of Salsa20", 2008; streams by counter after J. K. Salmon, M. A. Moraes, R. O. Dror,
/// D. E. Shaw, "Parallel random numbers: as easy as 1, 2, 3", SC11, 2011.
pub(super) fn stream(seed: u64, case: u64) -> ChaCha8Rng {
    let mut stream = ChaCha8Rng::seed_from_u64(seed);
    stream.set_stream(case);
    stream
}

/// The next input of a case.
pub(super) fn draw(stream: &mut ChaCha8Rng, spread: &Spread) -> Draw {
    let place = match spread.shape {
        Shape::Even | Shape::LogEven => stream.sample(StandardUniform),
        Shape::Normal { limits_at } => loop {
            let z: f64 = stream.sample(StandardNormal);
            if z.abs() <= limits_at {
                break 0.5 + 0.5 * z / limits_at;
            }
        },
    };
    Draw::at(spread, place)
}

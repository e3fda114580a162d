//! The two paths in their order: the fast one, and where that stalls the certain one.

use super::certain::Certain;
use super::floating::Floating;
use super::newton::{Effort, Newton, OneWay, Outcome};
use super::system::{State, System};

/// One-way lines changed one by one before that is given up.
const CHANGES: u32 = 100;

/// Scratch of both.
pub(super) struct Paths {
    newton: Newton,
    certain: Certain,
    floating: Floating,
}

impl Paths {
    pub fn new(system: &System) -> Self {
        Self {
            newton: Newton::new(system),
            certain: Certain::new(system),
            floating: Floating::new(system),
        }
    }

    /// Fast path, and where that stalls the certain one; true if the certain one was needed.
    pub fn balance(&mut self, system: &mut System, state: &mut State, effort: &mut Effort) -> bool {
        let Self {
            newton,
            certain,
            floating,
        } = self;
        if newton.solve(system, state, OneWay::Free, effort) == Outcome::Converged {
            return false;
        }
        system.cold_start(state);
        certain.approach(system, state, effort);
        // The states are known now, but for lines whose flow is lost in the rounding of the heads. Change those one at a
        // time, the first in order at each balance: that cannot cycle where every law rises (K. G. Murty, "Note on a
        // Bard-type scheme for solving the complementarity problem", Opsearch 11, 1974).
        for _ in 0..CHANGES {
            if newton.solve(system, state, OneWay::Frozen, effort) == Outcome::Stalled {
                break;
            }
            floating.settle(system, state);
            match system.first_not_complementary(state) {
                None => return true,
                Some(line) => system.turn(state, line),
            }
        }
        newton.solve(system, state, OneWay::Free, effort);
        true
    }

    /// Heads of what was not iterated.
    pub fn settle(&mut self, system: &System, state: &mut State) {
        self.floating.settle(system, state);
        system.settle(state);
    }
}

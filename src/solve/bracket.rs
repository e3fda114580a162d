//! The certain path of regulating parts: each one bracketed, in turn.

use super::newton::Effort;
use super::paths::Paths;
use super::regulate::Regulating;
use super::system::{State, System};
use super::tolerance::HELD_HEAD;

/// Largest loss that is tried, m: far beyond any pump.
const LARGEST: f64 = 1e6;

/// Where one unit stands at a loss.
#[derive(Clone, Copy, Debug)]
struct At {
    extra: f64,
    /// Its room as a head, m; zero within its tolerance.
    room: f64,
    still: bool,
}

/// What a search needs beside itself.
struct Bench<'a, 'n> {
    paths: &'a mut Paths,
    system: &'a mut System<'n>,
    state: &'a mut State,
    effort: &'a mut Effort,
    /// Room that counts as none, m.
    enough: f64,
}

impl Regulating {
    /// Brackets every unit once; true if one of them moved. Early rounds need not be fine: the others move yet.
    pub(super) fn bracket_round(
        &mut self,
        round: u32,
        paths: &mut Paths,
        system: &mut System,
        state: &mut State,
        effort: &mut Effort,
    ) -> bool {
        let mut bench = Bench {
            paths,
            system,
            state,
            effort,
            enough: 10_f64.powi(-(round as i32)),
        };
        let mut moved = false;
        for unit in 0..bench.system.throttles.lines.len() {
            let throttles = &bench.system.throttles;
            if !throttles.acts[unit] || throttles.leader[unit] != unit {
                continue;
            }
            let before = throttles.extra[unit];
            self.bracket(&mut bench, unit);
            let after = bench.system.throttles.extra[unit];
            moved |= (after - before).abs() > 1e-9 * (1.0 + after);
        }
        moved || bench.enough > HELD_HEAD.absolute
    }

    /// Finds the loss at which one unit is content, the others left as they are.
    fn bracket(&mut self, bench: &mut Bench, unit: usize) {
        let start = bench.system.throttles.extra[unit];
        let here = self.at(bench, unit, start);
        let content = here.room == 0.0 || here.room > 0.0 && start == 0.0;
        if content || here.still && here.room < 0.0 {
            return;
        }
        let (mut low, mut high) = if here.room < 0.0 {
            let mut low = here;
            let mut high = here;
            while high.room < 0.0 {
                low = high;
                if low.still || low.extra > LARGEST {
                    return;
                }
                high = self.at(bench, unit, (2.0 * low.extra).max(1.0));
            }
            (low, high)
        } else {
            let open = self.at(bench, unit, 0.0);
            if open.room >= 0.0 {
                return;
            }
            (open, here)
        };
        // Illinois: regula falsi that halves the side that stays. Two in a row on one side turn it into halving the bracket.
        let (mut weight_low, mut weight_high) = (low.room, high.room);
        for _ in 0..200 {
            if high.extra - low.extra <= 1e-14 * high.extra || high.room == 0.0 {
                break;
            }
            let share = weight_low / (weight_low - weight_high);
            let share = if share.is_finite() {
                share.clamp(0.01, 0.99)
            } else {
                0.5
            };
            let next = self.at(bench, unit, low.extra + share * (high.extra - low.extra));
            if next.room < 0.0 {
                (low, weight_low) = (next, next.room);
                weight_high *= 0.5;
            } else {
                (high, weight_high) = (next, next.room);
                weight_low *= 0.5;
            }
        }
        self.at(bench, unit, high.extra);
    }

    fn at(&mut self, bench: &mut Bench, unit: usize, extra: f64) -> At {
        for led in unit..bench.system.throttles.lines.len() {
            if bench.system.throttles.leader[led] == unit {
                bench.system.throttle(led, extra);
            }
        }
        let Bench {
            paths,
            system,
            state,
            effort,
            ..
        } = bench;
        self.balance(paths, system, state, effort);
        let felt = system.throttles.ruling(system, state, unit);
        let room = felt.map_or(0.0, |felt| {
            let fine = felt.value.abs() <= 0.5 * felt.tolerance;
            if fine || felt.head.abs() <= bench.enough {
                0.0
            } else {
                felt.head
            }
        });
        At {
            extra,
            room,
            still: system.all_stand_still(state, unit),
        }
    }
}

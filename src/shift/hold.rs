//! Speed as an unknown: the speed at which a group holds a pressure, a level or a flow, inside its limits.

use super::plan::{Follow, Hold, HoldStyle};
use super::plant::{Plant, Side};
use super::root::far_side;
use crate::part::PumpId;
use crate::solve::SolveError;

/// Where a held level stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Place {
    /// At its set point: the speed is the one at which it stays.
    There,
    /// Above.
    Above,
    /// Below.
    Below,
}

/// A group that holds a figure.
pub(super) struct Holding {
    /// The rule.
    pub rule: Hold,
    /// The group.
    pub group: usize,
    /// The tank whose level is held.
    pub tank: Option<usize>,
    /// Where that level stands.
    pub place: Place,
    /// Who runs, in the order of call.
    pub pumps: Vec<PumpId>,
    /// Last speed found, per side.
    pub speeds: [f64; 3],
}

impl Holding {
    /// Whether there is a speed to find.
    pub fn works(&self) -> bool {
        !self.pumps.is_empty()
    }
}

/// How fine a speed is found.
const FINE: f64 = 1e-13;

impl Plant<'_> {
    /// Solves with each holding group at its speed. Groups that hold figures of the same water are gone through in turn until
    /// none changes its speed.
    pub(super) fn balance_held(&mut self, side: Side, t: f64) -> Result<(), SolveError> {
        const ROUNDS: u32 = 40;
        for h in 0..self.holds.len() {
            if self.holds[h].works() {
                let speed = self.holds[h].speeds[side as usize];
                self.set_speed(h, speed);
            }
        }
        let single = self.holds.iter().filter(|hold| hold.works()).count() < 2;
        for _ in 0..ROUNDS {
            let mut moved: f64 = 0.0;
            for h in 0..self.holds.len() {
                if self.holds[h].works() {
                    let before = self.holds[h].speeds[side as usize];
                    let speed = self.find_speed(side, t, h)?;
                    moved = moved.max((speed - before).abs());
                }
            }
            if single || moved < 1e-11 {
                break;
            }
        }
        Ok(())
    }

    /// Volumes between which a held level counts as there, its set point in the middle.
    pub(super) fn hold_band(&self, hold: &Holding, tank: usize) -> (f64, f64, f64) {
        let set = self.shift.tanks[tank].shape.volume(hold.rule.at);
        let slack = 1e-6 * self.tanks[tank].capacity;
        (set - slack, set, set + slack)
    }

    /// Finds where held levels stand, given the volumes.
    pub(super) fn place_holds(&mut self, y: &[f64]) {
        for h in 0..self.holds.len() {
            let hold = &self.holds[h];
            let Some(tank) = hold.tank else { continue };
            let (low, set, high) = self.hold_band(hold, tank);
            let volume = y[tank];
            // Coming from outside it is there when it meets the set point; once there, until it leaves the band.
            self.holds[h].place = match hold.place {
                Place::Above if volume <= set && volume > low => Place::There,
                Place::Below if volume >= set && volume < high => Place::There,
                Place::There if volume > low && volume < high => Place::There,
                _ if volume > set => Place::Above,
                _ => Place::Below,
            };
        }
    }

    fn set_speed(&mut self, h: usize, speed: f64) {
        let hold = &self.holds[h];
        for (i, &pump) in hold.pumps.iter().enumerate() {
            let trimmed = hold.rule.style == HoldStyle::Common || i + 1 == hold.pumps.len();
            self.settings.pump_mut(pump).speed = if trimmed { speed } else { hold.rule.speeds.1 };
        }
    }

    /// How far the held figure is above its set point with the group at a speed.
    fn off(&mut self, side: Side, t: f64, h: usize, speed: f64) -> Result<f64, SolveError> {
        self.set_speed(h, speed);
        self.balance(side, t)?;
        let hold = &self.holds[h];
        Ok(match hold.tank {
            Some(tank) => self.net_flow(side, t, tank),
            None => self.figure(side, hold.rule.figure) - hold.rule.at,
        })
    }

    /// Finds the speed of group `h`, leaves it set and the network solved with it.
    fn find_speed(&mut self, side: Side, t: f64, h: usize) -> Result<f64, SolveError> {
        let hold = &self.holds[h];
        let (low, high) = hold.rule.speeds;
        let guess = hold.speeds[side as usize].clamp(low, high);
        let speed = match (hold.tank, hold.place) {
            (Some(_), Place::Above) if hold.rule.empties => high,
            (Some(_), Place::Below) if !hold.rule.empties => high,
            (Some(_), Place::Above | Place::Below) => low,
            _ => self.search(side, t, h, guess)?,
        };
        self.holds[h].speeds[side as usize] = speed;
        self.off(side, t, h, speed)?;
        Ok(speed)
    }

    /// The speed at which the figure is met, else the limit that comes nearer to it.
    fn search(&mut self, side: Side, t: f64, h: usize, guess: f64) -> Result<f64, SolveError> {
        let (low, high) = self.holds[h].rule.speeds;
        if high - low <= FINE {
            return Ok(high);
        }
        // Near the last speed first: most of the time it moved little.
        let near = (0.01 * (high - low)).min(0.005);
        let (a, b) = ((guess - near).max(low), (guess + near).min(high));
        let (mut fa, mut fb) = (self.off(side, t, h, a)?, self.off(side, t, h, b)?);
        let (mut a, mut b) = (a, b);
        let met = fa * fb <= 0.0;
        if !met {
            (a, b) = (low, high);
            (fa, fb) = (self.off(side, t, h, low)?, self.off(side, t, h, high)?);
        }
        if fa * fb <= 0.0 {
            if fa == 0.0 {
                return Ok(a);
            }
            return far_side((a, fa), (b, fb), FINE, |speed| self.off(side, t, h, speed));
        }
        // No speed meets it. A figure that does not exist (NaN) asks for the lowest.
        Ok(if fb.abs() < fa.abs() { high } else { low })
    }

    /// The speed that group `h` would need with its last called pump standing; none if it could not hold the figure then.
    /// Leaves everything as it was but the trial's answer.
    pub(super) fn spare_speed(&mut self, t: f64, h: usize) -> Result<Option<f64>, SolveError> {
        if self.holds[h].pumps.len() < 2 {
            return Ok(None);
        }
        let Some(last) = self.holds[h].pumps.pop() else {
            return Ok(None);
        };
        let kept = *self.settings.pump(last);
        self.settings.pump_mut(last).running = false;
        let high = self.holds[h].rule.speeds.1;
        let place = std::mem::replace(&mut self.holds[h].place, Place::There);
        let found = self.spare_search(t, h, high);
        self.holds[h].place = place;
        self.holds[h].pumps.push(last);
        *self.settings.pump_mut(last) = kept;
        let speed = self.holds[h].speeds[Side::Run as usize];
        self.set_speed(h, speed);
        found
    }

    fn spare_search(&mut self, t: f64, h: usize, high: f64) -> Result<Option<f64>, SolveError> {
        let side = Side::Trial;
        let guess = self.holds[h].speeds[side as usize].clamp(self.holds[h].rule.speeds.0, high);
        let speed = self.search(side, t, h, guess)?;
        self.holds[h].speeds[side as usize] = speed;
        let off = self.off(side, t, h, speed)?;
        // Short of the set point at the highest speed: it cannot.
        let size = match self.holds[h].rule.figure {
            Follow::Level(_) => 1e-6,
            _ => 1e-6 * self.holds[h].rule.at.abs(),
        };
        let short = speed >= high && off.abs() > size.max(1e-9);
        Ok((!short).then_some(speed))
    }
}

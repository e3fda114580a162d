//! What the rules wait for.

use super::{Control, Figure, FigureWatch, Watch, start_way, steps_at, stop_way, watched};
use crate::shift::crossing::Way;
use crate::shift::plan::{Bands, Call, Follow, Hold};
use crate::shift::plant::{Plant, Side};

impl Control<'_> {
    /// Everything that a rule waits for at present.
    pub fn watches(
        &self,
        t: f64,
        plant: &Plant,
        volumes: &mut Vec<Watch>,
        figures: &mut Vec<FigureWatch>,
    ) {
        for (trip, (tripped, _)) in self.plan.trips.iter().zip(&self.tripped) {
            if let Some(tank) = self.shift.tank_at(trip.tank) {
                let (level, way) = if *tripped {
                    (trip.reset, Way::Up)
                } else {
                    (trip.level, Way::Down)
                };
                let threshold = self.shift.tanks[tank].shape.volume(level);
                volumes.push(Watch {
                    tank,
                    threshold,
                    way,
                });
            }
        }
        for (g, group) in self.plan.groups.iter().enumerate() {
            match &group.call {
                Call::Bands(bands) => self.watch_bands(t, g, bands, plant, volumes, figures),
                Call::Clock(_) => {}
                Call::Hold(rule) => self.watch_hold(g, rule, plant, figures),
            }
        }
    }

    fn watch_bands(
        &self,
        t: f64,
        g: usize,
        bands: &Bands,
        plant: &Plant,
        volumes: &mut Vec<Watch>,
        figures: &mut Vec<FigureWatch>,
    ) {
        let steps = steps_at(bands, self.shift.starts + t);
        for (step, latch) in steps.iter().zip(&self.groups[g].latches) {
            let (mut way, at) = if latch.on {
                (stop_way(*step), step.stop)
            } else {
                (start_way(*step), step.start)
            };
            let mut threshold = watched(plant, bands.follow, at);
            if latch.pending.is_some() {
                // It is reached; what matters now is whether it stays so. Just beyond, so that being there does not count.
                let nudge = 1e-9 * threshold.abs().max(1e-9);
                (way, threshold) = match way {
                    Way::Up => (Way::Down, threshold - nudge),
                    Way::Down => (Way::Up, threshold + nudge),
                };
            }
            match bands.follow {
                Follow::Level(node) => {
                    if let Some(tank) = self.shift.tank_at(node) {
                        volumes.push(Watch {
                            tank,
                            threshold,
                            way,
                        });
                    }
                }
                Follow::Pressure(_) | Follow::Flow(_) => figures.push(FigureWatch {
                    figure: Figure::Followed(g),
                    threshold,
                    way,
                }),
            }
        }
    }

    fn watch_hold(&self, g: usize, rule: &Hold, plant: &Plant, figures: &mut Vec<FigureWatch>) {
        let Some(h) = plant.holds.iter().position(|hold| hold.group == g) else {
            return;
        };
        let state = &self.groups[g];
        if state.called.is_empty() || state.called.len() != state.demand {
            return;
        }
        const NUDGE: f64 = 1e-9;
        if state.demand < self.plan.groups[g].pumps.len() {
            let (threshold, way) = match state.up_since {
                None => (rule.up_at, Way::Up),
                Some(_) => (rule.up_at - NUDGE, Way::Down),
            };
            figures.push(FigureWatch {
                figure: Figure::Speed(h),
                threshold,
                way,
            });
        }
        if state.demand > 1 {
            let (threshold, way) = match state.down_since {
                None => (rule.down_at, Way::Down),
                Some(_) => (rule.down_at + NUDGE, Way::Up),
            };
            let over = plant.holds[h].speeds[Side::Run as usize] <= rule.speeds.0;
            figures.push(FigureWatch {
                figure: Figure::Speed(h),
                threshold: rule.speeds.0 + if over { NUDGE } else { 0.0 },
                way: if over { Way::Up } else { Way::Down },
            });
            figures.push(FigureWatch {
                figure: Figure::Spare(h),
                threshold,
                way,
            });
        }
    }
}

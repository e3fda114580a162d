//! Solving the network at one instant: empty tanks that pass on what flows in, and draws that cannot be met.

use super::{Mode, Plant, PointState, Side, line_flows};
use crate::network::{TankMode, Unreachable};
use crate::solve::SolveError;

impl Plant<'_> {
    /// Solves; an empty tank that cannot give what the lines ask for passes on what flows in.
    pub(in crate::shift) fn balance(&mut self, side: Side, t: f64) -> Result<(), SolveError> {
        for tank in &mut self.tanks {
            if tank.mode == Mode::Floor {
                tank.passing = false;
                self.settings.set_tank_mode(tank.node, TankMode::Held);
            }
        }
        // Each round makes at least one more tank pass on.
        loop {
            self.resolve(side)?;
            let answer = self.solvers[side as usize].last();
            let mut changed = false;
            for tank in &mut self.tanks {
                if tank.mode == Mode::Free || tank.passing {
                    continue;
                }
                let (into, out) = line_flows(answer, &tank.joins);
                let inflow = tank.inflow.at(t);
                let net = into + inflow - out - tank.draw.at(t);
                match tank.mode {
                    Mode::Brim => tank.leaving = -net,
                    _ => {
                        tank.leaving = net;
                        if out > into + inflow {
                            tank.passing = true;
                            self.settings.set_tank_mode(tank.node, TankMode::Passing);
                            self.settings.set_draw(tank.node, -inflow);
                            changed = true;
                        }
                    }
                }
            }
            if !changed {
                return Ok(());
            }
        }
    }

    /// Solves; a draw or inflow at a point that no flow can meet is left out, and so booked as unmet or spilled.
    fn resolve(&mut self, side: Side) -> Result<(), SolveError> {
        // Where the last answer leads astray the way from nothing may do.
        let mut cold = false;
        loop {
            if side == Side::Run {
                self.solves += 1;
            }
            let solver = &mut self.solvers[side as usize];
            let answer = if cold {
                solver.solve(&self.settings)
            } else {
                solver.resolve(&self.settings)
            };
            match answer {
                Ok(_) => return Ok(()),
                Err(SolveError::Unreachable(Unreachable { node, draw })) => {
                    let uncut = |point: &&mut PointState| point.node == node && !point.cut;
                    let Some(point) = self.points.iter_mut().find(uncut) else {
                        return Err(SolveError::Unreachable(Unreachable { node, draw }));
                    };
                    point.cut = true;
                    self.settings.set_draw(node, 0.0);
                }
                Err(_) if !cold => cold = true,
                Err(error) => {
                    // No balance within reason: what is drawn most is not to be had.
                    let settings = &self.settings;
                    let size = |point: &PointState| settings.draw(point.node).abs();
                    let largest = self
                        .points
                        .iter_mut()
                        .filter(|point| !point.cut && size(point) > 0.0)
                        .max_by(|a, b| size(a).total_cmp(&size(b)));
                    let Some(point) = largest else {
                        return Err(error);
                    };
                    point.cut = true;
                    let node = point.node;
                    self.settings.set_draw(node, 0.0);
                }
            }
        }
    }
}

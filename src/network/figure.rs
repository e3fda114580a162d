//! Every single figure of a network and its settings by an id of its own, and networks in which such figures are changed.
//!
//! A [`Varied`] network has the nodes, lines and parts of the one it was made from, in number, kind and order; only figures
//! differ. So it can stand in for that one wherever equations are laid out already.

use super::{AsBuilt, End, LineId, Network, NodeId, NodeKind, Settings};
use crate::part::friction::{DarcyWeisbach, Friction};
use crate::part::pump::Efficiency;
use crate::part::quadratic::QuadraticLoss;
use crate::part::{Part, PumpId, ValveId};

/// Which figure of a network or its settings, SI.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Figure {
    /// Density of the liquid.
    Density,
    /// Its kinematic viscosity.
    Viscosity,
    /// Its vapour pressure.
    VapourPressure,
    /// Gravity.
    Gravity,
    /// Air pressure.
    Barometer,
    /// Elevation of a point or outlet, or of a tank's floor.
    Elevation(NodeId),
    /// Draw at a node.
    Draw(NodeId),
    /// Level of a tank, surface of a reservoir.
    Level(NodeId),
    /// Gas pressure at a node.
    GasPressure(NodeId),
    /// Height of a line's first end above a tank's floor.
    FromPort(LineId),
    /// Height of a line's last end above a tank's floor.
    ToPort(LineId),
    /// A figure of a part of a line, by its place there.
    Part(LineId, u32, PartFigure),
    /// Loss coefficient r of a valve, fully open.
    ValveLoss(ValveId),
    /// Opening of a valve.
    Opening(ValveId),
    /// Elevation of a pump.
    PumpElevation(PumpId),
    /// Loss coefficient r of a standing pump.
    StandingLoss(PumpId),
    /// Speed ratio of a pump.
    Speed(PumpId),
    /// Trim ratio of a pump.
    Trim(PumpId),
    /// Wear of a pump.
    Wear(PumpId),
    /// Head of a pump as built over that of its sheet.
    BuiltHead(PumpId),
    /// Flow of a pump as built over that of its sheet.
    BuiltFlow(PumpId),
    /// Efficiency of a pump as built over that of its sheet.
    BuiltEfficiency(PumpId),
    /// Speed of a pump model, by its place.
    ModelSpeed(u32),
    /// Full impeller of a pump model.
    ModelImpeller(u32),
    /// Rating of a model's motor.
    MotorRating(u32),
    /// Efficiency of a model's motor, where it is one figure.
    MotorEfficiency(u32),
    /// Efficiency of a model's drive, where it is one figure.
    DriveEfficiency(u32),
}

/// Which figure of a part.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum PartFigure {
    /// Length of a pipe. Its losses do not follow: they are figures of their own.
    Length,
    /// Bore of a pipe. Its losses do not follow.
    Bore,
    /// Loss coefficient r of minor losses, or of a pipe with a fixed friction factor or by Hazen–Williams.
    Loss,
    /// Darcy–Weisbach: L/D / (2 g area2).
    Resistance,
    /// Darcy–Weisbach: Reynolds number over flow.
    ReynoldsPerFlow,
    /// Darcy–Weisbach: Reynolds number over flow, times relative roughness and a constant.
    RoughPerFlow,
}

/// A network with other figures in the places of the one it was made from.
#[derive(Clone, Debug)]
pub struct Varied {
    network: Network,
}

impl std::ops::Deref for Varied {
    type Target = Network;

    fn deref(&self) -> &Network {
        &self.network
    }
}

impl Network {
    /// A copy whose figures may be changed; its settings are kept apart by the caller.
    pub fn varied(&self) -> Varied {
        Varied {
            network: self.clone(),
        }
    }

    /// All figures of the network and these settings, in a fixed order.
    pub fn figures(&self, settings: &Settings) -> Vec<(Figure, f64)> {
        let mut all = vec![
            (Figure::Density, self.fluid.density),
            (Figure::Viscosity, self.fluid.kinematic_viscosity),
            (Figure::Gravity, self.gravity),
            (Figure::Barometer, self.barometer),
        ];
        all.extend(
            self.fluid
                .vapour_pressure
                .map(|p| (Figure::VapourPressure, p)),
        );
        for id in self.node_ids() {
            all.extend(
                self.node(id)
                    .elevation()
                    .map(|z| (Figure::Elevation(id), z)),
            );
            all.extend([
                (Figure::Draw(id), settings.draw(id)),
                (Figure::Level(id), settings.level(id)),
                (Figure::GasPressure(id), settings.gas_pressure(id)),
            ]);
        }
        for id in self.line_ids() {
            let line = self.line(id);
            let [from, to] = line.ports;
            all.extend(from.map(|height| (Figure::FromPort(id), height)));
            all.extend(to.map(|height| (Figure::ToPort(id), height)));
            for (place, part) in line.parts.iter().enumerate() {
                part_figures(part, &mut |figure, value| {
                    all.push((Figure::Part(id, place as u32, figure), value));
                });
            }
        }
        for id in self.valve_ids() {
            all.push((Figure::ValveLoss(id), self.valve(id).fully_open.r()));
            all.push((Figure::Opening(id), settings.valve(id).opening));
        }
        for id in self.pump_ids() {
            let standing = self.pump(id).when_stopped;
            all.extend(standing.map(|loss| (Figure::StandingLoss(id), loss.r())));
            let setting = settings.pump(id);
            let AsBuilt {
                head,
                flow,
                efficiency,
            } = setting.built;
            all.extend([
                (Figure::PumpElevation(id), self.pump(id).elevation),
                (Figure::Speed(id), setting.speed),
                (Figure::Trim(id), setting.trim),
                (Figure::Wear(id), setting.wear),
                (Figure::BuiltHead(id), head),
                (Figure::BuiltFlow(id), flow),
                (Figure::BuiltEfficiency(id), efficiency),
            ]);
        }
        for (place, model) in self.models.iter().enumerate() {
            let i = place as u32;
            let one = |efficiency: &Option<Efficiency>| match efficiency {
                Some(Efficiency::Fixed(value)) => Some(*value),
                _ => None,
            };
            all.extend(model.speed.map(|speed| (Figure::ModelSpeed(i), speed)));
            all.extend(model.impeller.map(|size| (Figure::ModelImpeller(i), size)));
            all.extend(one(&model.drive).map(|value| (Figure::DriveEfficiency(i), value)));
            if let Some(motor) = &model.motor {
                all.push((Figure::MotorRating(i), motor.rated));
                all.extend(one(&motor.efficiency).map(|value| (Figure::MotorEfficiency(i), value)));
            }
        }
        all
    }
}

fn part_figures(part: &Part, take: &mut dyn FnMut(PartFigure, f64)) {
    match part {
        Part::Pipe(pipe) => {
            take(PartFigure::Length, pipe.length);
            take(PartFigure::Bore, pipe.bore);
            match &pipe.friction {
                Friction::DarcyWeisbach(law) => {
                    let c = law.coefficients();
                    take(PartFigure::Resistance, c.resistance);
                    take(PartFigure::ReynoldsPerFlow, c.reynolds_per_flow);
                    take(PartFigure::RoughPerFlow, c.rough_per_flow);
                }
                Friction::HazenWilliams { r } | Friction::FixedFactor { r } => {
                    take(PartFigure::Loss, *r);
                }
            }
        }
        Part::Loss(loss) | Part::CheckValve(loss) => take(PartFigure::Loss, loss.r()),
        // their figures are settings, or found by their own ids
        Part::Valve(_) | Part::Pump(_) | Part::Regulator(_) => {}
    }
}

impl Varied {
    /// Gives one figure another value, finite and in the range that the figure has in a checked network. A figure that this
    /// network does not have changes nothing.
    pub fn set(&mut self, settings: &mut Settings, figure: Figure, value: f64) {
        let network = &mut self.network;
        match figure {
            Figure::Density => network.fluid.density = value,
            Figure::Viscosity => network.fluid.kinematic_viscosity = value,
            Figure::VapourPressure => network.fluid.vapour_pressure = Some(value),
            Figure::Gravity => network.gravity = value,
            Figure::Barometer => network.barometer = value,
            Figure::Elevation(id) => match &mut network.nodes[id.index()].kind {
                NodeKind::Point { elevation } | NodeKind::Outlet { elevation } => {
                    *elevation = value;
                }
                NodeKind::Tank { floor } => *floor = value,
                NodeKind::Reservoir => {}
            },
            Figure::Draw(id) => settings.set_draw(id, value),
            Figure::Level(id) => settings.set_level(id, value),
            Figure::GasPressure(id) => settings.set_gas_pressure(id, value),
            Figure::FromPort(id) => network.set_port(id, End::From, value),
            Figure::ToPort(id) => network.set_port(id, End::To, value),
            Figure::Part(line, place, figure) => {
                let parts = &mut network.lines[line.index()].parts;
                if let Some(part) = parts.get_mut(place as usize) {
                    set_part(part, figure, value);
                }
            }
            Figure::ValveLoss(id) => {
                network.valves[id.index()].fully_open = QuadraticLoss::new(value);
            }
            Figure::Opening(id) => settings.valve_mut(id).opening = value,
            Figure::PumpElevation(id) => network.pumps[id.index()].elevation = value,
            Figure::StandingLoss(id) => {
                network.pumps[id.index()].when_stopped = Some(QuadraticLoss::new(value));
            }
            Figure::Speed(id) => settings.pump_mut(id).speed = value,
            Figure::Trim(id) => settings.pump_mut(id).trim = value,
            Figure::Wear(id) => settings.pump_mut(id).wear = value,
            Figure::BuiltHead(id) => settings.pump_mut(id).built.head = value,
            Figure::BuiltFlow(id) => settings.pump_mut(id).built.flow = value,
            Figure::BuiltEfficiency(id) => settings.pump_mut(id).built.efficiency = value,
            Figure::ModelSpeed(i)
            | Figure::ModelImpeller(i)
            | Figure::MotorRating(i)
            | Figure::MotorEfficiency(i)
            | Figure::DriveEfficiency(i) => network.set_model(i, figure, value),
        }
    }

    /// The network as it is now, with `settings` as its own.
    pub fn into_network(mut self, settings: Settings) -> Network {
        self.network.settings = settings;
        self.network
    }
}

impl Network {
    fn set_port(&mut self, id: LineId, end: End, height: f64) {
        self.lines[id.index()].ports[end as usize] = Some(height);
    }

    fn set_model(&mut self, place: u32, figure: Figure, value: f64) {
        let Some(model) = self.models.get_mut(place as usize) else {
            return;
        };
        match figure {
            Figure::ModelSpeed(_) => model.speed = Some(value),
            Figure::ModelImpeller(_) => model.impeller = Some(value),
            Figure::DriveEfficiency(_) => model.drive = Some(Efficiency::Fixed(value)),
            _ => {
                if let Some(motor) = &mut model.motor {
                    match figure {
                        Figure::MotorRating(_) => motor.rated = value,
                        _ => motor.efficiency = Some(Efficiency::Fixed(value)),
                    }
                }
            }
        }
    }
}

fn set_part(part: &mut Part, figure: PartFigure, value: f64) {
    match part {
        Part::Pipe(pipe) => match (figure, &mut pipe.friction) {
            (PartFigure::Length, _) => pipe.length = value,
            (PartFigure::Bore, _) => pipe.bore = value,
            (PartFigure::Loss, Friction::HazenWilliams { r } | Friction::FixedFactor { r }) => {
                *r = value
            }
            (_, Friction::DarcyWeisbach(law)) => {
                let mut c = law.coefficients();
                match figure {
                    PartFigure::Resistance => c.resistance = value,
                    PartFigure::ReynoldsPerFlow => c.reynolds_per_flow = value,
                    _ => c.rough_per_flow = value,
                }
                *law = DarcyWeisbach::of(c);
            }
            _ => {}
        },
        Part::Loss(loss) | Part::CheckValve(loss) => *loss = QuadraticLoss::new(value),
        Part::Valve(_) | Part::Pump(_) | Part::Regulator(_) => {}
    }
}

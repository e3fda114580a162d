//! From the answer back to what a person asks of a pump, a line or a node: pressures, power, NPSH, share of best efficiency.

pub use super::laws::part_loss;
use super::{LineState, Solution};
use crate::network::{LineId, Network, NodeId, Settings};
use crate::part::pump::PumpModel;
use crate::part::pump::viscous::Correction;
use crate::part::regulator::{Regulates, RegulatorState};
use crate::part::{Part, PumpId, RegulatorId};

/// What a node does.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NodeOperation {
    /// Total head, m above the datum.
    pub head: Option<f64>,
    /// Gauge pressure, Pa.
    pub pressure: Option<f64>,
}

/// What a line does.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LineOperation {
    /// Flow, m3/s.
    pub flow: f64,
    /// Its state.
    pub state: LineState,
    /// Velocity in its narrowest pipe, m/s; none without a pipe.
    pub velocity: Option<f64>,
    /// Head at its first node less that at its last, m.
    pub head_loss: Option<f64>,
}

/// What a regulating part does.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RegulatorOperation {
    /// Its state.
    pub state: RegulatorState,
    /// Its set value: pressure, Pa, or flow, m3/s.
    pub set: f64,
    /// What it feels, in the same unit: the pressure at the node it holds, the flow of its line, or that of its pump.
    pub felt: Option<f64>,
    /// Flow through it, m3/s.
    pub flow: f64,
    /// Head lost across it, m; none while it is shut.
    pub head_loss: Option<f64>,
}

/// What a pump does. A figure that does not exist (an efficiency without a column for it, say) is none.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PumpOperation {
    /// Whether it runs.
    pub running: bool,
    /// Speed ratio times trim ratio, by which its curves are scaled.
    pub speed_ratio: f64,
    /// Flow through it, m3/s.
    pub flow: f64,
    /// Head it adds, m.
    pub head: Option<f64>,
    /// Pump efficiency, a ratio.
    pub efficiency: Option<f64>,
    /// Shaft power, W; 0 when stopped.
    pub shaft_power: Option<f64>,
    /// Electrical power, shaft power over motor and drive efficiency, W; 0 when stopped.
    pub electrical_power: Option<f64>,
    /// Shaft power over the motor's rating.
    pub motor_load: Option<f64>,
    /// Gauge pressure at its inlet, Pa.
    pub suction_pressure: Option<f64>,
    /// NPSH available, m.
    pub npsh_available: Option<f64>,
    /// NPSH required, m.
    pub npsh_required: Option<f64>,
    /// Flow over that of best efficiency at its speed.
    pub share_of_bep: Option<f64>,
    /// Where on its curve it runs.
    pub place: Place,
    /// Flow delivered at the start of its curve, m3/s.
    pub start_of_curve: f64,
    /// Flow delivered at the end of its curve, m3/s.
    pub end_of_curve: f64,
    /// What the liquid does to its curves; none where it does nothing.
    pub viscous: Option<Correction>,
}

/// Where a pump stands relative to the flows its curve was given for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Place {
    /// Among them, or it does not run.
    OnCurve,
    /// Below the first.
    BeforeStart,
    /// Past the last.
    PastEnd,
}

impl PumpOperation {
    /// NPSH available less required, m.
    pub fn npsh_margin(&self) -> Option<f64> {
        Some(self.npsh_available? - self.npsh_required?)
    }
}

/// What a node does.
pub fn node(
    network: &Network,
    settings: &Settings,
    solution: &Solution,
    id: NodeId,
) -> NodeOperation {
    let head = solution.head(id);
    NodeOperation {
        head,
        pressure: head.map(|head| network.pressure(id, head, settings)),
    }
}

/// What a line does.
pub fn line(network: &Network, solution: &Solution, id: LineId) -> LineOperation {
    let line = network.line(id);
    let flow = solution.flow(id);
    let velocity = line
        .narrowest_bore()
        .map(|bore| flow / (std::f64::consts::FRAC_PI_4 * bore * bore));
    let head_loss = solution
        .head(line.from)
        .zip(solution.head(line.to))
        .map(|(from, to)| from - to);
    LineOperation {
        flow,
        state: solution.state(id),
        velocity,
        head_loss,
    }
}

/// What a regulating part does.
pub fn regulator(
    network: &Network,
    settings: &Settings,
    solution: &Solution,
    id: RegulatorId,
) -> RegulatorOperation {
    let regulation = solution.regulation(id);
    let line = network.line_of_regulator(id);
    let ends = network.line(line);
    let flow = solution.flow(line);
    let pressure = |at| node(network, settings, solution, at).pressure;
    let regulates = network.regulator(id).regulates;
    RegulatorOperation {
        state: regulation.state,
        set: settings.regulator(id).set,
        felt: match regulates {
            Regulates::Downstream => pressure(ends.to),
            Regulates::Upstream => pressure(ends.from),
            Regulates::Flow => Some(flow),
            Regulates::MinimumFlow { pump } => Some(solution.flow(network.line_of(pump))),
        },
        flow,
        head_loss: regulation
            .added
            .map(|_| loss_in(network, settings, solution, &Part::Regulator(id), flow)),
    }
}

/// Head lost in one part of a solved network at the flow `q` of its line, m; what a regulating part adds included.
pub fn loss_in(
    network: &Network,
    settings: &Settings,
    solution: &Solution,
    part: &Part,
    q: f64,
) -> f64 {
    part_loss(network, settings, part, q) + added(solution, part)
}

/// Head that a regulating part adds to the loss of its open body, m.
fn added(solution: &Solution, part: &Part) -> f64 {
    match part {
        Part::Regulator(id) => solution.regulation(*id).added.unwrap_or(0.0),
        _ => 0.0,
    }
}

/// The parts that water meets before a pump of its line.
fn before(network: &Network, id: PumpId) -> impl Iterator<Item = &Part> {
    let parts = network.line(network.line_of(id)).parts.iter();
    parts.take_while(move |part| !matches!(part, Part::Pump(pump) if *pump == id))
}

/// What a pump does.
///
/// Head, power, efficiency and NPSH required as in [`crate::part::pump::performance::Performance`]; NPSH available =
/// (barometer - vapour pressure)/(density g) + head
/// at its inlet - its elevation.
pub fn pump(
    network: &Network,
    settings: &Settings,
    solution: &Solution,
    id: PumpId,
) -> PumpOperation {
    let line = network.line_of(id);
    let added: f64 = before(network, id).map(|part| added(solution, part)).sum();
    let head = solution.head(network.line(line).from);
    let head = head.map(|head| head - added);
    pump_at(network, settings, id, solution.flow(line), head)
}

/// What a pump does at a flow (m3/s) when its line's first node has this head (m), less what regulating parts before it take;
/// [`pump`] for any state.
pub fn pump_at(
    network: &Network,
    settings: &Settings,
    id: PumpId,
    flow: f64,
    first_head: Option<f64>,
) -> PumpOperation {
    let setting = settings.pump(id);
    let model = network.model(id);
    let suction_head = first_head.map(|head| head - lost_before(network, settings, id, flow));
    let weight = network.fluid().density * network.gravity();
    let elevation = network.pump(id).elevation;
    let suction_pressure = suction_head.map(|head| weight * (head - elevation));
    let performance = network.performance(id, settings);
    let start_of_curve = performance.delivered(model.start_of_curve());
    let end_of_curve = performance.delivered(model.end_of_curve());
    if !setting.running {
        return PumpOperation {
            running: false,
            speed_ratio: setting.ratio(),
            flow,
            head: None,
            efficiency: None,
            shaft_power: Some(0.0),
            electrical_power: Some(0.0),
            motor_load: None,
            suction_pressure,
            npsh_available: None,
            npsh_required: None,
            share_of_bep: None,
            place: Place::OnCurve,
            start_of_curve,
            end_of_curve,
            viscous: None,
        };
    }
    let (density, gravity) = (network.fluid().density, network.gravity());
    let on_curve = performance.on_curve(flow);
    let shaft_power = performance.shaft_power(flow, density, gravity);
    let air_head = |vapour: f64| (network.barometer() - vapour) / weight;
    let npsh_available = suction_head
        .zip(network.fluid().vapour_pressure)
        .map(|(head, vapour)| air_head(vapour) + head - elevation);
    PumpOperation {
        running: true,
        speed_ratio: setting.ratio(),
        flow,
        head: Some(performance.head(flow)),
        efficiency: performance.efficiency(flow, density, gravity),
        shaft_power,
        electrical_power: shaft_power
            .and_then(|power| model.electrical_power(power, setting.speed)),
        motor_load: shaft_power
            .zip(model.motor.as_ref())
            .map(|(power, motor)| power / motor.rated),
        suction_pressure,
        npsh_available,
        npsh_required: performance.npsh_required(flow),
        share_of_bep: model.best_efficiency_flow.map(|bep| on_curve / bep),
        place: place(model, on_curve),
        start_of_curve,
        end_of_curve,
        viscous: performance.correction().copied(),
    }
}

fn place(model: &PumpModel, q: f64) -> Place {
    // A flow that is at an end but for rounding is on the curve.
    let rounding = 1e-9 * model.end_of_curve();
    if q > model.end_of_curve() + rounding {
        Place::PastEnd
    } else if q < model.start_of_curve() - rounding {
        Place::BeforeStart
    } else {
        Place::OnCurve
    }
}

/// Head lost between a line's first node and a pump's inlet at this flow, m.
fn lost_before(network: &Network, settings: &Settings, id: PumpId, flow: f64) -> f64 {
    let line_id = network.line_of(id);
    let lost: f64 = before(network, id)
        .map(|part| part_loss(network, settings, part, flow))
        .sum();
    // A fouled strainer stands before everything else.
    lost + settings.fouling(line_id) * flow * flow.abs()
}

/// Head lost along a whole line at this flow, its pumps' heads taken off, m.
pub fn line_loss(network: &Network, settings: &Settings, id: LineId, flow: f64) -> f64 {
    let parts = network.line(id).parts.iter();
    let lost: f64 = parts
        .map(|part| part_loss(network, settings, part, flow))
        .sum();
    lost + settings.fouling(id) * flow * flow.abs()
}

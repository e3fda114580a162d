//! Limits against figures: for every running pump and every main what binds, by how much, and who says so.

use super::{mains, pressure};
use crate::network::{LimitName, LineId, Network, NodeKind, Settings};
use crate::part::PumpId;
use crate::solve::operation::{LineOperation, NodeOperation, PumpOperation};

/// A limit and the figure that meets it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Limit {
    /// Of what.
    pub about: About,
    /// Which limit.
    pub kind: LimitKind,
    /// The figure, in the unit of the kind, SI.
    pub value: f64,
    /// The limit, in the unit of the kind, SI.
    pub bound: f64,
    /// Room left as a share of the limit; negative beyond it.
    pub room: f64,
    /// Who says so.
    pub says: Says,
}

impl Limit {
    /// Whether the figure is beyond the limit.
    pub fn is_broken(&self) -> bool {
        self.room < 0.0
    }
}

/// What a limit is about.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum About {
    /// A pump.
    Pump(PumpId),
    /// A line.
    Line(LineId),
}

/// Where a limit comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Says {
    /// The network's limits: a default with its source, or the file.
    Limits(LimitName),
    /// The maker, as the pump model states it.
    Maker,
    /// The curve of the pump model.
    Curve,
    /// The rating of the line, as the file states it.
    Rating,
    /// The submergence formula of ANSI/HI 9.8.
    Submergence,
}

/// Kinds of limit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum LimitKind {
    /// A running pump must deliver something: flow, m3/s.
    DeliversNothing,
    /// Flow against the last flow of the curve, m3/s.
    EndOfCurve,
    /// Flow against minimum continuous flow, m3/s.
    MinimumFlow,
    /// Share of best-efficiency flow against the least allowable one.
    AllowableLow,
    /// Share of best-efficiency flow against the largest allowable one.
    AllowableHigh,
    /// Share of best-efficiency flow against the least preferred one.
    PreferredLow,
    /// Share of best-efficiency flow against the largest preferred one.
    PreferredHigh,
    /// Shaft power over the motor's rating.
    Motor,
    /// NPSH available against required, m.
    NpshRequired,
    /// NPSH available against what is asked for this much required, m.
    NpshMargin {
        /// NPSH required, m.
        required: f64,
    },
    /// Gauge pressure at the inlet, Pa.
    Suction,
    /// Gauge pressure in the casing, Pa.
    Casing,
    /// Gauge pressure in the casing with every way out shut, Pa.
    CasingAtShutoff,
    /// Gauge pressure in a line, Pa.
    Rating,
    /// Gauge pressure in a line with every way out shut, Pa.
    RatingAtShutoff,
    /// Gauge pressure in a line behind check valves that leak, Pa.
    RatingIfLeaking,
    /// Submergence of a bell, m.
    Submergence,
    /// Velocity in a main, m/s, against the least.
    VelocityLow,
    /// Velocity in a main, m/s, against the largest.
    VelocityHigh,
}

impl LimitKind {
    /// Whether the figure must not lie below the limit; else not above.
    pub fn is_least(self) -> bool {
        matches!(
            self,
            Self::DeliversNothing
                | Self::MinimumFlow
                | Self::AllowableLow
                | Self::PreferredLow
                | Self::NpshRequired
                | Self::NpshMargin { .. }
                | Self::Suction
                | Self::Submergence
                | Self::VelocityLow
        )
    }

    /// A stable word for a limit of this kind that is broken.
    pub fn code(self) -> &'static str {
        match self {
            Self::DeliversNothing => "delivers-nothing",
            Self::EndOfCurve => "past-curve",
            Self::MinimumFlow => "below-minimum-flow",
            Self::AllowableLow | Self::AllowableHigh => "outside-allowable",
            Self::PreferredLow | Self::PreferredHigh => "outside-preferred",
            Self::Motor => "motor-overload",
            Self::NpshRequired => "npsh-short",
            Self::NpshMargin { .. } => "npsh-margin",
            Self::Suction => "low-suction",
            Self::Casing => "casing-pressure",
            Self::CasingAtShutoff => "casing-pressure-at-shutoff",
            Self::Rating => "line-pressure",
            Self::RatingAtShutoff => "line-pressure-at-shutoff",
            Self::RatingIfLeaking => "line-pressure-if-leaking",
            Self::Submergence => "submergence",
            Self::VelocityLow => "main-slow",
            Self::VelocityHigh => "main-fast",
        }
    }
}

/// Past the end of a curve nothing else said of the pump is certain: that comes before every other limit.
const PAST_CURVE_FIRST: f64 = 10.0;

/// All limits that can be judged in one state, pump by pump and then line by line.
pub(super) fn limits(
    network: &Network,
    settings: &Settings,
    nodes: &[NodeOperation],
    lines: &[LineOperation],
    pumps: &[PumpOperation],
) -> Vec<Limit> {
    let mut found = Vec::new();
    for (id, pump) in network
        .pump_ids()
        .zip(pumps)
        .filter(|(_, pump)| pump.running)
    {
        let mut judge = Judge {
            about: About::Pump(id),
            found: &mut found,
        };
        if pump.flow.abs() <= STILL {
            judge.add(LimitKind::DeliversNothing, 0.0, 0.0, Says::Curve);
        } else {
            running_pump(network, id, pump, &mut judge);
        }
    }
    pressure::limits(network, settings, nodes, pumps, &mut found);
    for (id, does) in network.line_ids().zip(lines) {
        let mut judge = Judge {
            about: About::Line(id),
            found: &mut found,
        };
        bell(network, settings, id, does, &mut judge);
    }
    for main in mains::mains(network, lines, pumps) {
        let Some(velocity) = mains::velocity(network, main, &lines[main.index()]) else {
            continue;
        };
        let mut judge = Judge {
            about: About::Line(main),
            found: &mut found,
        };
        judge.add_limit(
            LimitKind::VelocityLow,
            velocity,
            network,
            LimitName::VelocityLow,
        );
        judge.add_limit(
            LimitKind::VelocityHigh,
            velocity,
            network,
            LimitName::VelocityHigh,
        );
    }
    found
}

/// Flow below which a pump counts as delivering nothing, m3/s.
pub(super) const STILL: f64 = 1e-9;

/// Collects the limits of one thing.
pub(super) struct Judge<'a> {
    pub about: About,
    pub found: &'a mut Vec<Limit>,
}

impl Judge<'_> {
    pub fn add(&mut self, kind: LimitKind, value: f64, bound: f64, says: Says) {
        let room = match kind {
            LimitKind::DeliversNothing => f64::NEG_INFINITY,
            // A limit of zero has no shares: full room on its good side, none on the other.
            _ if bound == 0.0 => {
                let beyond = if kind.is_least() {
                    value < 0.0
                } else {
                    value > 0.0
                };
                if beyond { -1.0 } else { 1.0 }
            }
            _ if kind.is_least() => (value - bound) / bound.abs(),
            LimitKind::EndOfCurve if value > bound * (1.0 + 1e-9) => {
                1.0 - value / bound - PAST_CURVE_FIRST
            }
            LimitKind::EndOfCurve => (1.0 - value / bound).max(0.0),
            _ => (bound - value) / bound.abs(),
        };
        self.found.push(Limit {
            about: self.about,
            kind,
            value,
            bound,
            room,
            says,
        });
    }

    fn add_limit(&mut self, kind: LimitKind, value: f64, network: &Network, name: LimitName) {
        if let Some(bound) = network.limits().value(name) {
            self.add(kind, value, bound, Says::Limits(name));
        }
    }
}

fn running_pump(network: &Network, id: PumpId, pump: &PumpOperation, judge: &mut Judge) {
    let model = network.model(id);
    let (s, limits) = (pump.speed_ratio, network.limits());
    judge.add(
        LimitKind::EndOfCurve,
        pump.flow,
        pump.end_of_curve,
        Says::Curve,
    );
    if let Some(least) = network.minimum_flow(id) {
        let says = match model.maker.minimum_flow {
            Some(_) => Says::Maker,
            None => Says::Limits(LimitName::MinimumFlow),
        };
        judge.add(LimitKind::MinimumFlow, pump.flow, s * least, says);
    }
    if let Some(share) = pump.share_of_bep {
        for (maker, low, high) in [
            (
                model.maker.allowable,
                (LimitKind::AllowableLow, LimitName::AllowableLow),
                (LimitKind::AllowableHigh, LimitName::AllowableHigh),
            ),
            (
                model.maker.preferred,
                (LimitKind::PreferredLow, LimitName::PreferredLow),
                (LimitKind::PreferredHigh, LimitName::PreferredHigh),
            ),
        ] {
            if let Some((from, to)) = maker {
                judge.add(low.0, share, from, Says::Maker);
                judge.add(high.0, share, to, Says::Maker);
            } else {
                judge.add_limit(low.0, share, network, low.1);
                judge.add_limit(high.0, share, network, high.1);
            }
        }
    }
    if let Some(load) = pump.motor_load {
        judge.add_limit(LimitKind::Motor, load, network, LimitName::MotorLoad);
    }
    if let (Some(available), Some(required)) = (pump.npsh_available, pump.npsh_required)
        && required > 0.0
    {
        judge.add(LimitKind::NpshRequired, available, required, Says::Curve);
        let ratio = limits.value(LimitName::NpshRatio).unwrap_or(1.0) * required;
        let margin = required + limits.value(LimitName::NpshMargin).unwrap_or(0.0);
        let (asked, name) = if ratio > margin {
            (ratio, LimitName::NpshRatio)
        } else {
            (margin, LimitName::NpshMargin)
        };
        let kind = LimitKind::NpshMargin { required };
        judge.add(kind, available, asked, Says::Limits(name));
    }
    if let Some(pressure) = pump.suction_pressure {
        judge.add_limit(
            LimitKind::Suction,
            pressure,
            network,
            LimitName::SuctionPressure,
        );
    }
}

/// Submergence that a bell needs so that no vortex draws air, against what it has.
///
/// S = D (1 + 2.3 F), F = v / sqrt(g D), with D the bell's diameter and v the velocity in its mouth.
///
/// # Source
/// ANSI/HI 9.8 as quoted in the trade.
pub fn submergence(diameter: f64, flow: f64, gravity: f64) -> f64 {
    let v = flow / (std::f64::consts::FRAC_PI_4 * diameter * diameter);
    diameter * (1.0 + 2.3 * v / (gravity * diameter).sqrt())
}

fn bell(
    network: &Network,
    settings: &Settings,
    id: LineId,
    does: &LineOperation,
    judge: &mut Judge,
) {
    let line = network.line(id);
    let Some(bell) = line.facts.bell.filter(|_| does.flow > STILL) else {
        return;
    };
    let surface = match network.node(line.from).kind {
        NodeKind::Reservoir => settings.level(line.from),
        NodeKind::Tank { floor } => floor + settings.level(line.from),
        NodeKind::Point { .. } | NodeKind::Outlet { .. } => return,
    };
    let asked = submergence(bell.diameter, does.flow, network.gravity());
    judge.add(
        LimitKind::Submergence,
        surface - bell.elevation,
        asked,
        Says::Submergence,
    );
}

#[cfg(test)]
mod tests {
    use super::submergence;

    #[test]
    fn submergence_by_hand() {
        // S = D (1 + 2.3 F) worked out by hand from the formula of ANSI/HI 9.8 as quoted in the trade
        for (diameter, flow, asked) in [
            (0.3, 0.1, 0.869_109_368_4),
            (0.5, 0.3, 1.293_494_398),
            (0.2, 0.05, 0.722_760_335_1),
            (0.9, 1.0, 1.995_251_49),
        ] {
            assert!((submergence(diameter, flow, 9.80665) - asked).abs() < 1e-6);
        }
        // the demo systems (invented): 0.35 m and 60.6 L/s, 0.62 m; 0.30 m and 63 L/s, 0.66 m
        assert!((submergence(0.35, 0.0606, 9.80665) - 0.62).abs() < 0.005);
        assert!((submergence(0.30, 0.063, 9.80665) - 0.66).abs() < 0.005);
    }
}

//! Cautions in sentences.

use super::words::Words;
use crate::part::pump::viscous::HIGHEST_B;
use crate::study::caution::{Caution, Heat};
use crate::study::limit::{About, Limit, LimitKind};
use crate::units::Kind;

impl Words<'_> {
    /// Name of what a caution is about; empty for the whole system.
    pub fn about(&self, caution: &Caution) -> &str {
        match caution {
            Caution::HeldShut { pump, .. }
            | Caution::DeadHeaded { pump, .. }
            | Caution::Backflow { pump, .. }
            | Caution::BeforeCurve { pump, .. }
            | Caution::FlatCurve { pump, .. }
            | Caution::Hunting { pump, .. }
            | Caution::ViscousRange { pump, .. } => self.pump(*pump),
            Caution::Beyond(limit) => self.name_of(limit.about),
            Caution::BelowVapour { node, .. } | Caution::NoHead { node } => {
                &self.network.node(*node).name
            }
            Caution::SecondBalance { .. } => "",
        }
    }

    /// Name of what a limit is about.
    pub fn name_of(&self, about: About) -> &str {
        match about {
            About::Pump(pump) => self.pump(pump),
            About::Line(line) => &self.network.line(line).name,
        }
    }

    /// A caution in a sentence without a full stop.
    pub fn caution(&self, caution: &Caution) -> String {
        let flow = |q: f64| self.figure(Kind::Flow, q);
        match *caution {
            Caution::HeldShut { pump, heat } => format!(
                "{} runs but delivers nothing: its check valve is held shut. {}; stop it",
                self.pump(pump),
                self.heating(heat)
            ),
            Caution::DeadHeaded { pump, heat } => format!(
                "{} runs against a shut way and delivers nothing. {} and can burst it: stop it",
                self.pump(pump),
                self.heating(heat)
            ),
            Caution::Backflow { pump, flow: q } => {
                format!(
                    "{} of water runs back through {}",
                    flow(-q),
                    self.pump(pump)
                )
            }
            Caution::BeforeCurve {
                pump,
                flow: q,
                start,
            } => format!(
                "{} delivers {}, below the start of its curve at {}: no figure there is certain",
                self.pump(pump),
                flow(q),
                flow(start)
            ),
            Caution::Beyond(limit) => self.beyond(&limit),
            Caution::FlatCurve { pump, rise, asked } => format!(
                "the curve of {} is flat: its head rises by {} from best efficiency to shut-off, for pumps side by side at least {} is asked \
                 (common practice); small differences move much flow from one to the other",
                self.network.model(pump).name,
                Self::percent(rise),
                Self::percent(asked)
            ),
            Caution::Hunting {
                pump,
                flow: q,
                below,
            } => format!(
                "{} delivers {} beside others, below {} where its drooping curve gives the same head at two flows: it may hunt",
                self.pump(pump),
                flow(q),
                flow(below)
            ),
            Caution::ViscousRange { pump, b } => format!(
                "the liquid is too thick for {} at this speed: B = {b:.0}, and the correction for viscous liquids is known to {HIGHEST_B:.0} \
                 (ANSI/HI 9.6.7 as quoted in the trade). Its figures are a guess",
                self.pump(pump)
            ),
            Caution::BelowVapour { node, pressure } => format!(
                "pressure at {} is {}: below vapour pressure, where the water column parts and this answer does not hold",
                self.network.node(node).name,
                self.figure(Kind::Pressure, pressure)
            ),
            Caution::SecondBalance { delivered } => format!(
                "a drooping head curve allows a second balance near this one, delivering {}: which one it takes depends on how it is started",
                flow(delivered)
            ),
            Caution::NoHead { node } => format!(
                "{} is cut off from every fixed head: its head means nothing",
                self.network.node(node).name
            ),
        }
    }

    fn heating(&self, heat: Heat) -> String {
        let power = match heat.power {
            Some(power) => format!("{} at the shaft heat", self.figure(Kind::Power, power)),
            None => "It heats".to_owned(),
        };
        let rate = match heat.rate {
            Some(rate) => format!(" by {:.0} C a minute", 60.0 * rate),
            None => String::new(),
        };
        format!("{power} the water in its casing{rate}")
    }

    /// A broken limit.
    fn beyond(&self, limit: &Limit) -> String {
        let name = self.name_of(limit.about);
        let flow = |q: f64| self.figure(Kind::Flow, q);
        let head = |h: f64| self.figure(Kind::Length, h);
        let pressure = |p: f64| self.figure(Kind::Pressure, p);
        let velocity = |v: f64| self.figure(Kind::Velocity, v);
        let (value, bound) = (limit.value, limit.bound);
        let says = self.says(limit);
        match limit.kind {
            LimitKind::DeliversNothing => format!("{name} delivers nothing"),
            LimitKind::EndOfCurve => format!(
                "{name} would deliver {}, past the end of its curve at {}: no figure there is certain",
                flow(value),
                flow(bound)
            ),
            LimitKind::MinimumFlow => format!(
                "{name} delivers {}, below its minimum continuous flow of {} ({says})",
                flow(value),
                flow(bound)
            ),
            LimitKind::AllowableLow | LimitKind::AllowableHigh => format!(
                "{name} runs at {} of its best-efficiency flow, outside the allowable region that {} at {} ({says})",
                Self::percent(value),
                if limit.kind.is_least() {
                    "begins"
                } else {
                    "ends"
                },
                Self::percent(bound)
            ),
            LimitKind::PreferredLow | LimitKind::PreferredHigh => format!(
                "{name} runs at {} of its best-efficiency flow, outside the preferred region that {} at {} ({says})",
                Self::percent(value),
                if limit.kind.is_least() {
                    "begins"
                } else {
                    "ends"
                },
                Self::percent(bound)
            ),
            LimitKind::Motor => self.overload(limit),
            LimitKind::NpshRequired => format!(
                "{name} cavitates: NPSH available {}, required {}",
                head(value),
                head(bound)
            ),
            LimitKind::NpshMargin { required } => format!(
                "NPSH margin of {name} is thin: available {}, required {}, asked {} ({says})",
                head(value),
                head(required),
                head(bound)
            ),
            LimitKind::Suction => format!(
                "suction pressure of {name} is {}, below {} ({says})",
                pressure(value),
                pressure(bound)
            ),
            LimitKind::Casing => format!(
                "pressure in the casing of {name} is {}, above its {} ({says})",
                pressure(value),
                pressure(bound)
            ),
            LimitKind::CasingAtShutoff => format!(
                "with every way out shut the casing of {name} would stand at {}, above its {} ({says})",
                pressure(value),
                pressure(bound)
            ),
            LimitKind::Rating => format!(
                "pressure in {name} is {}, above its rating of {}",
                pressure(value),
                pressure(bound)
            ),
            LimitKind::RatingAtShutoff => format!(
                "with every way out shut {name} would stand at {}, above its rating of {}",
                pressure(value),
                pressure(bound)
            ),
            LimitKind::RatingIfLeaking => format!(
                "if check valves leak {name} stands at {}, above its rating of {}",
                pressure(value),
                pressure(bound)
            ),
            LimitKind::Submergence => format!(
                "the bell of {name} stands {} below the surface, {} are asked at this flow ({says})",
                head(value),
                head(bound)
            ),
            LimitKind::VelocityLow => format!(
                "water goes through {name} at {}, slower than {} ({says})",
                velocity(value),
                velocity(bound)
            ),
            LimitKind::VelocityHigh => format!(
                "water goes through {name} at {}, faster than {} ({says})",
                velocity(value),
                velocity(bound)
            ),
        }
    }

    fn overload(&self, limit: &Limit) -> String {
        let About::Pump(pump) = limit.about else {
            return String::new();
        };
        let rated = self
            .network
            .model(pump)
            .motor
            .as_ref()
            .map_or(0.0, |motor| motor.rated);
        format!(
            "{} needs {} at the shaft, its motor is rated {} ({})",
            self.pump(pump),
            self.figure(Kind::Power, limit.value * rated),
            self.figure(Kind::Power, rated),
            Self::percent(limit.value)
        )
    }
}

//! Sentences: cautions, limits and gains in the user's names and units.

use crate::network::Network;
use crate::part::PumpId;
use crate::part::pump::viscous::HIGHEST_B;
use crate::study::assessment::{Caution, Limit, LimitKind, NPSH_MARGIN, PREFERRED_REGION};
use crate::study::gain::Gain;
use crate::units::{Kind, UnitSet};

/// What a sentence needs at hand.
#[derive(Clone, Copy)]
pub struct Words<'a> {
    /// For names.
    pub network: &'a Network,
    /// For figures.
    pub units: &'a UnitSet,
}

impl Words<'_> {
    fn pump(&self, id: PumpId) -> &str {
        &self.network.pump(id).name
    }

    fn figure(&self, kind: Kind, value: f64) -> String {
        self.units.with_unit(kind, value)
    }

    /// A whole per cent.
    fn percent(share: f64) -> String {
        format!("{:.0} %", 100.0 * share)
    }

    /// Name of what a caution is about; empty for the whole system.
    pub fn about(&self, caution: &Caution) -> &str {
        match caution {
            Caution::HeldShut { pump }
            | Caution::DeadHeaded { pump }
            | Caution::Backflow { pump, .. }
            | Caution::PastCurve { pump, .. }
            | Caution::BeforeCurve { pump, .. }
            | Caution::Overloaded { pump, .. }
            | Caution::NpshShort { pump, .. }
            | Caution::NpshThin { pump, .. }
            | Caution::OutsidePreferred { pump, .. }
            | Caution::ViscousRange { pump, .. } => self.pump(*pump),
            Caution::BelowVapour { node, .. } | Caution::NoHead { node } => {
                &self.network.node(*node).name
            }
            Caution::SecondBalance { .. } => "",
        }
    }

    /// A caution in a sentence without a full stop.
    pub fn caution(&self, caution: &Caution) -> String {
        let flow = |q: f64| self.figure(Kind::Flow, q);
        let head = |h: f64| self.figure(Kind::Length, h);
        match *caution {
            Caution::HeldShut { pump } => format!(
                "{} runs but delivers nothing: its check valve is held shut. It heats the water in its casing; stop it",
                self.pump(pump)
            ),
            Caution::DeadHeaded { pump } => format!(
                "{} runs against a shut way and delivers nothing. It heats the water in its casing and can burst it: stop it",
                self.pump(pump)
            ),
            Caution::Backflow { pump, flow: q } => {
                format!(
                    "{} of water runs back through {}",
                    flow(-q),
                    self.pump(pump)
                )
            }
            Caution::PastCurve { pump, flow: q, end } => format!(
                "{} would deliver {}, past the end of its curve at {}: no figure there is certain",
                self.pump(pump),
                flow(q),
                flow(end)
            ),
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
            Caution::Overloaded { pump, power, rated } => format!(
                "{} needs {} at the shaft, its motor is rated {} ({})",
                self.pump(pump),
                self.figure(Kind::Power, power),
                self.figure(Kind::Power, rated),
                Self::percent(power / rated)
            ),
            Caution::NpshShort {
                pump,
                available,
                required,
            } => format!(
                "{} cavitates: NPSH available {}, required {}",
                self.pump(pump),
                head(available),
                head(required)
            ),
            Caution::NpshThin {
                pump,
                available,
                required,
            } => format!(
                "NPSH margin of {} is thin: available {}, required {}; asked are {} times or {} more, the larger \
                 (ANSI/HI 9.6.1 as quoted in the trade)",
                self.pump(pump),
                head(available),
                head(required),
                NPSH_MARGIN.0,
                head(NPSH_MARGIN.1)
            ),
            Caution::OutsidePreferred { pump, share } => format!(
                "{} runs at {} of its best-efficiency flow, outside {:.0} to {} (ANSI/HI 9.6.3 as quoted in the trade)",
                self.pump(pump),
                Self::percent(share),
                100.0 * PREFERRED_REGION.0,
                Self::percent(PREFERRED_REGION.1)
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
            Caution::NoHead { node } => {
                format!(
                    "{} is cut off from every fixed head: its head means nothing",
                    self.network.node(node).name
                )
            }
            Caution::ViscousRange { pump, b } => format!(
                "the liquid is too thick for {} at this speed: B = {b:.0}, and the correction for viscous liquids is known to {HIGHEST_B:.0} \
                 (ANSI/HI 9.6.7 as quoted in the trade). Its figures are a guess",
                self.pump(pump)
            ),
        }
    }

    /// A limit in a few words.
    pub fn limit(&self, limit: &Limit) -> String {
        let pump = self.pump(limit.pump);
        match limit.kind {
            LimitKind::DeliversNothing => format!("{pump} delivers nothing"),
            LimitKind::Motor(load) => format!("{pump} motor at {}", Self::percent(load)),
            LimitKind::Npsh(ratio) => format!("{pump} NPSH {ratio:.2} x required"),
            LimitKind::Region(share) => format!("{pump} at {} of BEP", Self::percent(share)),
            LimitKind::EndOfCurve(share) if share > 1.0 => format!("{pump} past its curve"),
            LimitKind::EndOfCurve(share) => {
                format!("{pump} at {} of its curve", Self::percent(share))
            }
        }
    }

    /// The gain card of a bank.
    pub fn gain(&self, gain: &Gain) -> String {
        let flow = |q: f64| self.figure(Kind::Flow, q);
        let beside: Vec<&str> = gain.beside.iter().map(|pump| self.pump(*pump)).collect();
        let beside = match beside.as_slice() {
            [] => String::new(),
            names => format!(" ({} running too)", names.join(", ")),
        };
        let mut lines = vec![format!("What each pump of {} adds{beside}", gain.bank)];
        for (i, step) in gain.steps.iter().enumerate() {
            let count = i + 1;
            let Some(before) = i.checked_sub(1).map(|i| gain.steps[i].delivered) else {
                lines.push(format!(
                    "  {} alone: {}",
                    self.pump(step.added),
                    flow(step.delivered)
                ));
                continue;
            };
            let added = step.delivered - before;
            let share = if before > 0.0 { added / before } else { 0.0 };
            let mut line = format!(
                "  with {} ({count} running): {}, {}{} more or {:+.0} %",
                self.pump(step.added),
                flow(step.delivered),
                if added < 0.0 { "-" } else { "" },
                flow(added.abs()),
                100.0 * share
            );
            if i == 1 {
                line.push_str(", not +100 %");
            }
            if let Some(friction) = step
                .friction_share
                .filter(|share| (0.0..=1.0).contains(share))
            {
                line.push_str(&format!(
                    ": {} of the head is friction, {} static",
                    Self::percent(friction),
                    Self::percent(1.0 - friction)
                ));
            }
            lines.push(line);
            if !step.held_shut.is_empty() {
                let names: Vec<&str> = step.held_shut.iter().map(|pump| self.pump(*pump)).collect();
                lines.push(format!(
                    "    held shut, delivering nothing: {}",
                    names.join(", ")
                ));
            }
        }
        if let Some(end) = gain.end {
            lines.push(format!(
                "  However many such pumps: {} is the end",
                flow(end)
            ));
        }
        lines.join("\n") + "\n"
    }
}

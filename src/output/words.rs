//! Sentences in the user's names and units.

use crate::network::{LimitName, Need, Network, Target};
use crate::part::PumpId;
use crate::study::assessment::NeedValue;
use crate::study::duty::Combination;
use crate::study::gain::Gain;
use crate::study::mains;
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
    pub(super) fn pump(&self, id: PumpId) -> &str {
        &self.network.pump(id).name
    }

    pub(super) fn figure(&self, kind: Kind, value: f64) -> String {
        self.units.with_unit(kind, value)
    }

    /// A whole per cent.
    pub(super) fn percent(share: f64) -> String {
        format!("{:.0} %", 100.0 * share)
    }

    /// How fast water goes through each main, at least and at most over the sets of running pumps.
    pub fn velocities(&self, ranges: &[mains::Range], combinations: &[Combination]) -> String {
        let with = |(set, velocity): (usize, f64)| {
            let running = combinations[set].running.iter();
            let names: Vec<&str> = running.map(|pump| self.pump(*pump)).collect();
            let velocity = self.figure(Kind::Velocity, velocity);
            format!("{velocity} with {}", names.join(" + "))
        };
        let each = ranges.iter().map(|range| {
            let name = &self.network.line(range.line).name;
            let slowest = with(range.slowest);
            match range.slowest.0 == range.fastest.0 {
                true => format!("  {name}: {slowest}\n"),
                false => format!("  {name}: {slowest}, {}\n", with(range.fastest)),
            }
        });
        std::iter::once("Velocity in the mains\n".to_owned())
            .chain(each)
            .collect()
    }

    /// A need and what it comes to.
    pub fn need(&self, need: &Need, value: &NeedValue) -> String {
        let (kind, of) = match &need.target {
            Target::FlowInto(node) => (Kind::Flow, &self.network.node(*node).name),
            Target::FlowIn(lines) => (Kind::Flow, &self.network.line(lines[0]).name),
            Target::PressureAt(node) => (Kind::Pressure, &self.network.node(*node).name),
        };
        let found = value
            .value
            .map_or("no figure".to_owned(), |value| self.figure(kind, value));
        let side = |word: &str, limit: Option<f64>| {
            limit.map(|limit| format!("{word} {} wanted", self.figure(kind, limit)))
        };
        let wanted = [
            side("at least", need.at_least),
            side("at most", need.at_most),
        ];
        let wanted: Vec<String> = wanted.into_iter().flatten().collect();
        let met = if value.met { "met" } else { "NOT met" };
        format!(
            "{}: {met}. {found} at {of}, {}",
            need.name,
            wanted.join(", ")
        )
    }

    /// Starts that are more than a motor bears.
    pub fn starts(&self, pump: PumpId, starts: u32, allowed: f64) -> String {
        format!(
            "{} is started {starts} times in its worst hour, its motor bears {allowed:.0} ({})",
            self.pump(pump),
            self.network.limits().source(LimitName::StartsPerHour)
        )
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

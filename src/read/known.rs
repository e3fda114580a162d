//! Names that rules over time refer to: pumps, lines and nodes of a network that is built, and schedules.

use super::context::Context;
use super::references::{MOST_COMPARED, listed};
use super::schedules::NamedSchedule;
use super::yaml::{Marked, shortened};
use crate::diagnostic::{Diagnostic, nearest};
use crate::network::{LineId, Network, NodeId};
use crate::part::PumpId;

/// Names that rules refer to.
pub(super) struct Known<'n> {
    pub network: &'n Network,
    pub schedules: &'n [NamedSchedule],
    /// Schedules that are in the file and could not be read: nobody who names them is to blame.
    pub unread: &'n [String],
}

impl Known<'_> {
    /// The position of the schedule that a value names.
    pub(super) fn schedule(&self, cx: &mut Context, node: &Marked, what: &str) -> Option<usize> {
        let name = cx.text(node, what)?;
        let found = self
            .schedules
            .iter()
            .position(|schedule| schedule.name == name);
        if found.is_none() {
            let names = self
                .schedules
                .iter()
                .map(|schedule: &NamedSchedule| schedule.name.as_str());
            if !self.unread.contains(&name) {
                unknown(cx, "schedule", node, &name, names);
            }
        }
        found
    }

    /// The pump, or the pumps of the bank or line, that a value names.
    pub(super) fn pumps(&self, cx: &mut Context, node: &Marked, what: &str) -> Option<Vec<PumpId>> {
        let name = cx.text(node, what)?;
        let network = self.network;
        if let Some(pump) = network.find_pump(&name) {
            return Some(vec![pump]);
        }
        let lines = self.find_lines(&name);
        let pumps: Vec<PumpId> = lines
            .iter()
            .flat_map(|line| network.line(*line).pumps())
            .collect();
        if pumps.is_empty() {
            let names = network.pumps().iter().map(|pump| pump.name.as_str());
            unknown(cx, "pump", node, &name, names);
            return None;
        }
        Some(pumps)
    }

    fn find_lines(&self, name: &str) -> Vec<LineId> {
        match self.network.banks().iter().find(|bank| bank.name == name) {
            Some(bank) => bank.lines.clone(),
            None => self.network.find_line(name).into_iter().collect(),
        }
    }

    /// The line, or the lines of the bank, that a value names.
    pub(super) fn lines(&self, cx: &mut Context, node: &Marked, what: &str) -> Option<Vec<LineId>> {
        let name = cx.text(node, what)?;
        let lines = self.find_lines(&name);
        if lines.is_empty() {
            let names = self.network.lines().iter().map(|line| line.name.as_str());
            unknown(cx, "line", node, &name, names);
            return None;
        }
        Some(lines)
    }

    /// The node that a value names.
    pub(super) fn node(&self, cx: &mut Context, node: &Marked, what: &str) -> Option<NodeId> {
        let name = cx.text(node, what)?;
        let found = self.network.find_node(&name);
        if found.is_none() {
            let names = self.network.nodes().iter().map(|node| node.name.as_str());
            unknown(cx, "node", node, &name, names);
        }
        found
    }
}

/// Reports a name that points nowhere.
fn unknown<'a>(
    cx: &mut Context,
    what: &str,
    node: &Marked,
    name: &str,
    names: impl Iterator<Item = &'a str>,
) {
    let message = format!("no {what} is called `{}`", shortened(name));
    let mut diagnostic = Diagnostic::error("unknown-name", node.place, message);
    if !cx.diagnostics.is_full() {
        let mut names: Vec<&str> = names.take(MOST_COMPARED).collect();
        names.sort_unstable();
        diagnostic = diagnostic.help(match nearest(name, names.iter().copied()) {
            Some(near) => format!("did you mean `{near}`?"),
            None => listed(what, &names),
        });
    }
    cx.push(diagnostic);
}

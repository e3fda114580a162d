//! Parts that throttle themselves: what they hold must be free to be held, and their set values must not contradict each
//! other.

use super::{Lowering, numbered};
use crate::diagnostic::{Diagnostic, Place, nearest};
use crate::network::{NodeId, NodeKind, RegulatorSetting};
use crate::part::regulator::{Regulates, Regulator};
use crate::part::{Part, PumpId, RegulatorId};
use crate::read::spec::{LineSpec, PartSpec, RegulatesSpec, RegulatorSpec};
use crate::read::yaml::shortened;
use crate::units::Kind;

/// A regulating part that has been put into its line.
#[derive(Clone, Debug)]
pub(super) struct Placed {
    id: RegulatorId,
    /// Its line's name.
    line: String,
    member: Option<u32>,
    regulates: Regulates,
    /// The pump that it protects, by name and place.
    pump: Option<(String, Place)>,
    from: NodeId,
    to: NodeId,
    set: f64,
    place: Place,
    open: bool,
}

impl Placed {
    fn name(&self) -> String {
        format!("`{}.{}`", self.line, self.regulates.word())
    }

    /// The node whose pressure it holds.
    fn held(&self) -> Option<NodeId> {
        match self.regulates {
            Regulates::Downstream => Some(self.to),
            Regulates::Upstream => Some(self.from),
            Regulates::Flow | Regulates::MinimumFlow { .. } => None,
        }
    }

    /// Whether both are made by the same words of the file.
    fn is_written_with(&self, other: &Self) -> bool {
        self.place == other.place && self.place != Place::default()
    }
}

impl Lowering<'_> {
    pub(super) fn regulator(
        &mut self,
        line: &LineSpec,
        member: Option<u32>,
        spec: &RegulatorSpec,
        parts: &[PartSpec],
        at: usize,
    ) -> Option<Part> {
        let wide_open = self.loss(&spec.loss, parts, at)?;
        // Whoever it protects is known when all lines are.
        let unknown = PumpId(u32::MAX);
        let (regulates, pump) = match &spec.regulates {
            RegulatesSpec::Downstream => (Regulates::Downstream, None),
            RegulatesSpec::Upstream => (Regulates::Upstream, None),
            RegulatesSpec::Flow => (Regulates::Flow, None),
            RegulatesSpec::MinimumFlow(pump) => (
                Regulates::MinimumFlow { pump: unknown },
                Some((pump.value.clone(), pump.place)),
            ),
        };
        let setting = RegulatorSetting {
            open: spec.open,
            set: spec.set.value,
        };
        let regulator = Regulator {
            regulates,
            wide_open,
        };
        let from = *self.nodes.get(&line.from.value)?;
        let to = *self.nodes.get(&line.to.value)?;
        let placed = Placed {
            id: self.net.regulator(regulator, setting),
            line: numbered(&line.name, member),
            member,
            regulates,
            pump,
            from,
            to,
            set: spec.set.value,
            place: spec.set.place,
            open: spec.open,
        };
        let twice = self.regulators.iter().any(|other| {
            other.line == placed.line && other.regulates.word() == placed.regulates.word()
        });
        let part = Part::Regulator(placed.id);
        if twice && member.is_none_or(|member| member == 1) {
            let message = format!("line `{}` has a second {}", line.name, part_word(&placed));
            let help = "one is enough: the lower of two set values would always rule";
            let problem = Diagnostic::error("regulating", parts[at].place, message);
            self.cx.push(problem.help(help));
        }
        let first = member.is_none_or(|member| member == 1) && !twice;
        if let (Some(node), true) = (placed.held(), first) {
            self.must_be_point(&placed, node);
        }
        self.regulators.push(placed);
        Some(part)
    }

    fn must_be_point(&mut self, placed: &Placed, node: NodeId) {
        let (name, kind) = self.net.named(node);
        let (name, kind) = (name.to_owned(), *kind);
        let what = match kind {
            NodeKind::Point { .. } => return,
            NodeKind::Reservoir => "a reservoir",
            NodeKind::Tank { .. } => "a tank",
            NodeKind::Outlet { .. } => "an outlet",
        };
        let message = format!(
            "{} is to hold the pressure at `{name}`, which is {what}: its head is fixed",
            placed.name()
        );
        let help = match placed.regulates {
            Regulates::Upstream => format!(
                "let its line begin at a point, and another line lead there from `{name}`; \
                 what a part holds is the pressure at the first node of its line"
            ),
            _ => format!(
                "let its line end at a point, and another line lead on to `{name}`; \
                 what a part holds is the pressure at the last node of its line"
            ),
        };
        self.cx
            .push(Diagnostic::error("regulating", placed.place, message).help(help));
    }

    /// What can be told only when all lines are known.
    pub(super) fn check_regulators(&mut self, lines: &[LineSpec]) {
        if self.cx.diagnostics.has_errors() {
            return;
        }
        let mut placed = std::mem::take(&mut self.regulators);
        for placed in &mut placed {
            if let Some((name, place)) = placed.pump.clone() {
                self.protect(placed, &name, place);
            }
        }
        for (i, second) in placed.iter().enumerate() {
            for first in &placed[..i] {
                if first.open && second.open && !second.is_written_with(first) {
                    self.must_agree(first, second);
                }
            }
            if second.regulates == Regulates::Flow && second.open {
                self.must_pass_draw(second, lines);
            }
        }
    }

    fn protect(&mut self, placed: &mut Placed, name: &str, place: Place) {
        let line = format!("line `{}`", placed.line);
        let found = self
            .net
            .find_pump(name)
            .or_else(|| self.net.find_pump(&numbered(name, placed.member)));
        let Some(pump) = found else {
            let message = format!("no pump is called `{}`", shortened(name));
            let first = format!("{name}.1");
            let help = if self.net.find_pump(&first).is_some() {
                format!(
                    "`{name}` is a bank: name one of its pumps, for example `{first}`, or make {line} a bank of as many lines"
                )
            } else {
                let near = nearest(name, self.net.pump_names());
                near.map_or_else(
                    || "name the pump whose flow it keeps up".to_owned(),
                    |near| format!("did you mean `{near}`?"),
                )
            };
            self.cx
                .push(Diagnostic::error("unknown-name", place, message).help(help));
            return;
        };
        if self.net.stands_in(pump, &placed.line) {
            let message = format!("{} protects a pump in its own line", placed.name());
            let help = "it stands in a line of its own, which leads from the pump's outlet back to its suction";
            self.cx
                .push(Diagnostic::error("regulating", place, message).help(help));
        }
        placed.regulates = Regulates::MinimumFlow { pump };
        self.net.protect(placed.id, pump);
    }

    /// Set values that contradict each other.
    fn must_agree(&mut self, first: &Placed, second: &Placed) {
        if let (Regulates::MinimumFlow { pump: a }, Regulates::MinimumFlow { pump: b }) =
            (first.regulates, second.regulates)
            && a == b
        {
            let message = format!(
                "{} and {} protect the same pump",
                first.name(),
                second.name()
            );
            let help = "nothing would say how they share the flow; one line is enough";
            self.cx
                .push(Diagnostic::error("regulating", second.place, message).help(help));
            return;
        }
        let Some(node) = first.held().filter(|node| second.held() == Some(*node)) else {
            return;
        };
        let name = self.net.named(node).0.to_owned();
        let pressure = |placed: &Placed| self.cx.units.format(Kind::Pressure, placed.set);
        let (one, other) = (pressure(first), pressure(second));
        let (message, help) = match (first.regulates, second.regulates) {
            (Regulates::Downstream, Regulates::Downstream) if first.set != second.set => (
                format!(
                    "{} holds `{name}` at {one} and {} at {other}: one node has one pressure",
                    first.name(),
                    second.name()
                ),
                "give both the same pressure, or end one of the lines at a node of its own"
                    .to_owned(),
            ),
            (Regulates::Downstream, Regulates::Upstream) if second.set <= first.set => {
                fed_and_relieved(first, second, &name, (&one, &other))
            }
            (Regulates::Upstream, Regulates::Downstream) if first.set <= second.set => {
                fed_and_relieved(second, first, &name, (&other, &one))
            }
            _ => return,
        };
        self.cx
            .push(Diagnostic::error("regulating", second.place, message).help(help));
    }

    /// A draw that has no other way in than through a part that limits the flow below it.
    fn must_pass_draw(&mut self, placed: &Placed, lines: &[LineSpec]) {
        let draw = self.net.settings_mut().draw(placed.to);
        let name = self.net.named(placed.to).0.to_owned();
        let touching = lines
            .iter()
            .filter(|line| [&line.from.value, &line.to.value].contains(&&name))
            .map(|line| line.count.unwrap_or(1))
            .sum::<u32>();
        if touching == 1 && draw > placed.set {
            let flow = |value| self.cx.units.format(Kind::Flow, value);
            let message = format!(
                "{} lets {} pass, but `{name}`, which has no other line, draws {}",
                placed.name(),
                flow(placed.set),
                flow(draw)
            );
            let help = "raise the limit, lower the draw, or bring the rest by another line";
            self.cx
                .push(Diagnostic::error("regulating", placed.place, message).help(help));
        }
    }
}

/// One part feeds a node up to a pressure at which another lets out already.
fn fed_and_relieved(
    feeds: &Placed,
    relieves: &Placed,
    node: &str,
    (fed, relieved): (&str, &str),
) -> (String, String) {
    let message = format!(
        "{} feeds `{node}` up to {fed}, and {} lets out there from {relieved}: they work against each other",
        feeds.name(),
        relieves.name()
    );
    let help = format!("set {} above {fed}", relieves.name());
    (message, help)
}

fn part_word(placed: &Placed) -> String {
    format!("`{}`", placed.regulates.word())
}

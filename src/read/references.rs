//! Names given and names referred to: each given once, and none that leads nowhere.
//!
//! What could not be read for another reason still has its name: those who use it are not to blame.

use std::collections::{HashMap, HashSet};

use super::context::{Context, Referent};
use super::spec::{LineSpec, Names, Placed};
use super::yaml::shortened;
use crate::diagnostic::{Diagnostic, Place, nearest};
use crate::network::LineId;

/// Most names that a wrong one is compared with.
pub(super) const MOST_COMPARED: usize = 20_000;

/// Every name that a path can begin with.
pub(super) struct TakenNames {
    /// What bears it and where that stands.
    taken: HashMap<String, (&'static str, Place)>,
    /// Names of several things.
    doubled: HashSet<String>,
    /// Sections that could not be read, so that nothing is known of their names.
    unread: Vec<Referent>,
}

impl Referent {
    fn what(self) -> &'static str {
        match self {
            Self::Node => "node",
            Self::Line => "line",
            Self::PumpModel => "pump model",
        }
    }
}

impl TakenNames {
    /// Takes the names of nodes, lines and pump models, in the order of the text; reports those given twice.
    pub fn of(cx: &mut Context, names: &Names) -> Self {
        let mut taken = Self {
            taken: HashMap::new(),
            doubled: HashSet::new(),
            unread: Vec::new(),
        };
        let mut all = Vec::new();
        for (referent, list) in [
            (Referent::Node, &names.nodes),
            (Referent::Line, &names.lines),
            (Referent::PumpModel, &names.models),
        ] {
            match list {
                Some(list) => all.extend(list.iter().map(|name| (referent, name))),
                None => taken.unread.push(referent),
            }
        }
        all.sort_by_key(|(_, name)| (name.place.line, name.place.column));
        for (referent, name) in all {
            taken.take(cx, &name.value, name.place, referent.what());
        }
        taken
    }

    /// Takes a name; reports one that is taken.
    pub fn take(&mut self, cx: &mut Context, name: &str, place: Place, what: &'static str) {
        let Some((other, first)) = self.taken.get(name) else {
            self.taken.insert(name.to_owned(), (what, place));
            return;
        };
        let message = format!("the name `{name}` of this {what} is taken");
        let help = format!(
            "a {other} in line {} of the file has it; nodes, lines, pumps and pump models share their names",
            first.line
        );
        cx.push(Diagnostic::error("name-twice", place, message).help(help));
        self.doubled.insert(name.to_owned());
    }

    /// Reports names of the wanted kinds that lead nowhere. `lines` are the lines that could be built, members and banks.
    pub fn check(
        &self,
        cx: &mut Context,
        wanted: &[Referent],
        lines: &HashMap<String, Vec<LineId>>,
    ) {
        let references = std::mem::take(&mut cx.references);
        for (referent, name) in &references {
            if !wanted.contains(referent) || self.unread.contains(referent) {
                continue;
            }
            let is_given = |name: &str| {
                let taken = self.taken.get(name);
                taken.is_some_and(|(what, _)| *what == referent.what())
                    || self.doubled.contains(name)
            };
            let member_of_unbuilt = || {
                let bank = name.value.rsplit_once('.').map(|(bank, _)| bank);
                bank.is_some_and(|bank| is_given(bank) && !lines.contains_key(bank))
            };
            let is_line = *referent == Referent::Line
                && (lines.contains_key(&name.value) || member_of_unbuilt());
            if !is_line && !is_given(&name.value) {
                self.unknown(cx, *referent, name, lines);
            }
        }
        cx.references = references;
    }

    fn unknown(
        &self,
        cx: &mut Context,
        referent: Referent,
        name: &Placed<String>,
        lines: &HashMap<String, Vec<LineId>>,
    ) {
        let what = referent.what();
        let message = format!("no {what} is called `{}`", shortened(&name.value));
        let mut diagnostic = Diagnostic::error("unknown-name", name.place, message);
        if !cx.diagnostics.is_full() {
            diagnostic = diagnostic.help(self.way_out(referent, name, lines));
        }
        cx.push(diagnostic);
    }

    /// The nearest name, or the names there are.
    fn way_out(
        &self,
        referent: Referent,
        name: &Placed<String>,
        lines: &HashMap<String, Vec<LineId>>,
    ) -> String {
        let what = referent.what();
        let given = self.taken.iter();
        let given = given.filter(|(_, (kind, _))| *kind == what);
        let mut known: Vec<&str> = given.map(|(name, _)| name.as_str()).collect();
        if referent == Referent::Line {
            known.extend(lines.keys().map(String::as_str));
        }
        if known.len() > MOST_COMPARED {
            return format!("the file has {} {what}s", known.len());
        }
        known.sort_unstable();
        known.dedup();
        let near = nearest(&name.value, known.iter().copied());
        match (self.taken.get(&name.value), near) {
            (Some((other, _)), _) => format!("that is a {other}; {}", listed(what, &known)),
            (None, Some(near)) => format!("did you mean `{near}`?"),
            (None, None) => listed(what, &known),
        }
    }

    /// Nodes that no line touches.
    pub fn find_unused_nodes(&self, cx: &mut Context, lines: &[LineSpec]) {
        // Lines that could not be read may touch any of them.
        if cx.diagnostics.has_errors() {
            return;
        }
        let ends = lines.iter().flat_map(|line| [&line.from, &line.to]);
        let used: HashSet<&str> = ends.map(|end| end.value.as_str()).collect();
        let mut unused: Vec<(&String, Place)> = self
            .taken
            .iter()
            .filter(|(name, (what, _))| *what == "node" && !used.contains(name.as_str()))
            .map(|(name, (_, place))| (name, *place))
            .collect();
        unused.sort_by_key(|(_, place)| (place.line, place.column));
        for (name, place) in unused {
            let message = format!("no line touches node `{name}`");
            let help = "join it to others by a line, or remove it";
            cx.push(Diagnostic::caution("unused-node", place, message).help(help));
        }
    }
}

/// What there is, for a message: all names, or the first few.
pub(super) fn listed(what: &str, names: &[&str]) -> String {
    const SHOWN: usize = 8;
    let shown: Vec<String> = names
        .iter()
        .take(SHOWN)
        .map(|name| format!("`{}`", shortened(name)))
        .collect();
    match (names.len(), names.len().saturating_sub(SHOWN)) {
        (0, _) => format!(
            "the file has no {what}; give one under `{}s`",
            what.replace(' ', "_")
        ),
        (1, _) => format!("the only {what} is {}", shown.join("")),
        (_, 0) => format!("{what}s are {}", shown.join(", ")),
        (_, more) => format!("{what}s are {} and {more} more", shown.join(", ")),
    }
}

//! From a system file to a network. All problems of a file are found in one pass, each with its place.
//!
//! ```text
//! bytes -yaml-> tree with places -changes-> tree -sections-> Spec (typed, SI) -lower-> Network, needs
//! ```
//!
//! # Parts that regulate themselves
//!
//! Beside the parts with a law of their own, a line may hold parts that throttle themselves ([`crate::part::regulator`] has
//! their law and their states, *regulating*, *wide open* and *shut*):
//!
//! ```yaml
//! - hold_downstream: {pressure: 4 bar, k: 3, bore: 150 mm}      # pressure at the last node of its line: no more than this
//! - hold_upstream: {pressure: 6 bar, k: 4, bore: 80 mm}         # pressure at the first node: opens above this, relieves it
//! - limit_flow: {flow: 30 m3/h, k: 5, bore: 100 mm}             # no more than this passes forward
//! - minimum_flow: {pump: duty.1, flow: 40 m3/h, k: 10, bore: 80 mm}   # in a line back to suction: opens below this pump flow
//! ```
//!
//! | key | meaning |
//! | --- | --- |
//! | `pressure` | gauge pressure at the elevation of the node it holds, which must be a point; elsewhere heads are fixed |
//! | `flow` | the flow of its line that is not passed, or the flow of the pump that is kept up |
//! | `pump` | the pump that a `minimum_flow` protects; in a bank of lines, member k protects member k of a bank of pumps |
//! | `k`, `kv` or `cv`, `bore` | the loss when wide open, as of a `valve` |
//! | `open: false` | it is shut, whatever it feels |
//!
//! All but `limit_flow` let nothing back through their line. The line of a `minimum_flow` whose pump stands is shut. Several in
//! one line act on one flow: the one that asks for less rules. Two lines that hold one node downstream must be set alike and
//! then add the same loss; a node may have several `hold_upstream`, the lowest set opens first, but all above what feeds it.
//! Results call such a part `LINE.PART`, as changes do: `--set reducer.hold_downstream.pressure="3 bar"`.
//!
//! ```
//! let text = "
//! nodes: {tower: {reservoir: 60 m}, zone: {point: {elevation: 2 m, draw: 20 m3/h}}}
//! lines: {reducer: {from: tower, to: zone, hold_downstream: {pressure: 3 bar, k: 3, bore: 80 mm}}}
//! ";
//! let network = dutybank::read::system(text)?.network;
//! let solution = dutybank::solve::Solver::new(&network).solve(network.settings())?.clone();
//! let zone = network.find_node("zone").and_then(|zone| solution.head(zone)).unwrap_or(f64::NAN);
//! let weight = network.fluid().density * network.gravity();
//! assert!((zone - (2.0 + 3e5 / weight)).abs() < 1e-8);
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```
//!
//! Touches no file: what a system file names is fetched by a function that the caller gives.

mod changes;
mod condition;
mod context;
mod edit;
mod known;
mod limits;
mod lines;
mod lower;
mod models;
mod names;
mod needs;
mod nodes;
mod over_time;
mod parts;
mod references;
mod regulators;
mod scaling;
mod schedules;
mod site;
mod spec;
mod staging;
mod table;
mod tanks;
mod tolerances;
mod yaml;

pub use changes::Change;
pub use needs::Case;
pub use over_time::OverTime;
pub use table::Load;
pub use tolerances::{ActsOn, Tolerance, Tolerances};
pub use yaml::LARGEST;

use crate::diagnostic::{Diagnostic, Diagnostics, Severity};
use crate::network::{Limits, Need, Network};
use crate::units::UnitSet;
use changes::MemberChanges;
use context::{Context, Fields};
use spec::{Names, Placed, Spec};
use yaml::{Form, Marked};

/// Sections of a system file.
const SECTIONS: [&str; 16] = [
    "title",
    "units",
    "fluid",
    "site",
    "nodes",
    "lines",
    "pump_models",
    "needs",
    "limits",
    "cases",
    "schedules",
    "shift",
    "staging",
    "faults",
    "tariff",
    "tolerances",
];

/// A system: the network and what is asked of it, in the user's terms.
#[derive(Clone, Debug)]
pub struct System {
    /// The file's title.
    pub title: Option<String>,
    /// The units in which the file speaks.
    pub units: UnitSet,
    /// The network.
    pub network: Network,
    /// What it has to do.
    pub needs: Vec<Need>,
    /// What should be known about the file though it can be used.
    pub cautions: Vec<Diagnostic>,
}

/// A file that has been read as YAML; its content is read each time a system is asked for.
pub struct Document {
    text: String,
    root: Marked,
}

/// A text that cannot be used, and why.
#[derive(Clone, Debug)]
pub struct Rejected {
    /// The text, as far as it could be read.
    pub text: String,
    /// Its problems.
    pub diagnostics: Diagnostics,
}

impl std::fmt::Display for Rejected {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(&self.diagnostics.render(&self.text, "system file", false))
    }
}

impl std::error::Error for Rejected {}

/// A system that needs no other file.
///
/// # Errors
/// All problems of the text.
///
/// ```
/// let text = "
/// nodes: {pond: {reservoir: 3 m}, tower: {reservoir: 20 m}}
/// lines: {main: {from: tower, to: pond, pipe: {length: 100 m, bore: 80 mm, roughness: 0.1 mm}}}
/// ";
/// let system = dutybank::read::system(text)?;
/// assert_eq!(system.network.lines()[0].name, "main");
/// # Ok::<(), dutybank::read::Rejected>(())
/// ```
pub fn system(text: &str) -> Result<System, Rejected> {
    let none = |_: &str| Err(std::io::Error::other("no other files can be read here"));
    let document = Document::parse(text.as_bytes())?;
    document.system(&[], &none).map_err(|diagnostics| Rejected {
        text: text.to_owned(),
        diagnostics,
    })
}

impl Document {
    /// Reads the YAML.
    ///
    /// # Errors
    /// What makes it unreadable as YAML.
    pub fn parse(bytes: &[u8]) -> Result<Self, Rejected> {
        match yaml::parse(bytes) {
            Ok((text, root)) => Ok(Self { text, root }),
            Err(refused) => {
                let (text, diagnostic) = *refused;
                let mut diagnostics = Diagnostics::default();
                diagnostics.push(diagnostic);
                Err(Rejected { text, diagnostics })
            }
        }
    }

    /// The text.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// The system with these changes made, which are checked like the file.
    ///
    /// # Errors
    /// All problems of the file and the changes.
    pub fn system(&self, changes: &[Change], load: Load) -> Result<System, Diagnostics> {
        let mut cx = Context::new();
        let lowered = if changes.is_empty() {
            read(&mut cx, &self.root, &MemberChanges::default(), load)
        } else {
            let mut root = self.root.clone();
            let members = changes::apply(&mut cx, &mut root, changes);
            read(&mut cx, &root, &members, load)
        };
        let Context {
            units,
            mut diagnostics,
            ..
        } = cx;
        diagnostics.sort();
        match lowered {
            Some((title, network, needs)) if !diagnostics.has_errors() => {
                let list = diagnostics.list().iter();
                let cautions = list
                    .filter(|d| d.severity == Severity::Caution)
                    .cloned()
                    .collect();
                Ok(System {
                    title,
                    units,
                    network,
                    needs,
                    cautions,
                })
            }
            _ => Err(diagnostics),
        }
    }

    /// The cases of the file, in its order.
    ///
    /// # Errors
    /// Problems of the form of `cases`; the changes in them are checked when a system is asked for.
    pub fn cases(&self) -> Result<Vec<Case>, Diagnostics> {
        let mut cx = Context::new();
        let section = cx
            .any_map(&self.root, "a system file", "nodes")
            .and_then(|fields| fields.get("cases"));
        let cases = section.map_or_else(Vec::new, |node| needs::cases(&mut cx, node));
        if cx.diagnostics.has_errors() {
            Err(cx.diagnostics)
        } else {
            Ok(cases)
        }
    }

    /// All problems of the file: as it stands, and with the changes of each case; over time too if it has a `shift`.
    ///
    /// # Errors
    /// As said.
    pub fn check(&self, load: Load) -> Result<System, Diagnostics> {
        let (system, mut all) = match self.system_over_time(&[], load) {
            Ok(system) => (Some(system), Diagnostics::default()),
            Err(diagnostics) => (None, diagnostics),
        };
        // A file that is no map has no cases, and has been complained of.
        let cases = match self.root.value {
            Form::Map(_) => self.cases(),
            _ => Ok(Vec::new()),
        };
        let cases = cases.unwrap_or_else(|diagnostics| {
            all.add_errors(&diagnostics);
            Vec::new()
        });
        if let (Some(system), true) = (&system, self.has_tolerances())
            && let Err(diagnostics) = self.tolerances(system, &[], load)
        {
            all.add_errors(&diagnostics);
        }
        for case in cases {
            if all.is_full() {
                break;
            }
            if let Err(diagnostics) = self.system_over_time(&case.changes, load) {
                all.add_errors(&diagnostics);
            }
        }
        all.sort();
        match system {
            Some(system) if !all.has_errors() => Ok(system),
            _ => Err(all),
        }
    }

    /// Whether the file has a `shift`.
    pub fn has_shift(&self) -> bool {
        match &self.root.value {
            Form::Map(entries) => entries.iter().any(|(key, _)| key.name == "shift"),
            _ => false,
        }
    }

    fn system_over_time(&self, changes: &[Change], load: Load) -> Result<System, Diagnostics> {
        let system = self.system(changes, load)?;
        if self.has_shift() {
            self.over_time(&system, changes, load)?;
        }
        Ok(system)
    }
}

/// The sections in the order in which they need each other.
fn read(
    cx: &mut Context,
    root: &Marked,
    members: &MemberChanges,
    load: Load,
) -> Option<(Option<String>, Network, Vec<Need>)> {
    let fields = cx.map(root, "a system file", &SECTIONS)?;
    if let Some(node) = fields.get("units") {
        site::units(cx, node);
    }
    let spec = spec(cx, &fields, members, load);
    let title = spec.title.clone();
    let (network, needs) = lower::lower(cx, spec)?;
    Some((title, network, needs))
}

fn spec(cx: &mut Context, fields: &Fields, members: &MemberChanges, load: Load) -> Spec {
    let given = |section: &str, if_missing: Option<Vec<Placed<String>>>| match fields.get(section) {
        Some(node) => names_in(node),
        None if fields.is_misspelt(section) => None,
        None => if_missing,
    };
    let names = Names {
        nodes: given("nodes", None),
        lines: given("lines", None),
        models: given("pump_models", Some(Vec::new())),
        nodes_place: fields.key_place("nodes"),
    };
    let title = fields
        .get("title")
        .and_then(|node| cx.text(node, "`title`"));
    let site = site::site(cx, fields.get("fluid"), fields.get("site"));
    let nodes = cx.required(fields, "nodes", "a system file", "{pond: {reservoir: 3 m}}");
    let nodes = nodes.map_or_else(Vec::new, |node| nodes::nodes(cx, node));
    let lines = cx.required(
        fields,
        "lines",
        "a system file",
        "{main: {from: A, to: B, pipe: {..}}}",
    );
    let lines = lines.map_or_else(Vec::new, |node| lines::lines(cx, &site, node, members));
    let models = fields.get("pump_models");
    let models = models.map_or_else(Vec::new, |node| models::models(cx, &site, node, load));
    let needs = fields
        .get("needs")
        .map_or_else(Vec::new, |node| needs::needs(cx, node));
    let limits = fields.get("limits");
    let limits = limits.map_or_else(Limits::default, |node| limits::limits(cx, node));
    Spec {
        title,
        site,
        limits,
        names,
        nodes,
        lines,
        models,
        needs,
    }
}

/// The names that a section gives.
fn names_in(section: &Marked) -> Option<Vec<Placed<String>>> {
    let Form::Map(entries) = &section.value else {
        return None;
    };
    let names = entries.iter().map(|(key, _)| Placed {
        value: key.name.clone(),
        place: key.place,
    });
    Some(names.collect())
}

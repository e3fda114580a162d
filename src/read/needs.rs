//! `needs` and `cases`.

use super::changes::Change;
use super::context::{Bound, Context, Fields, Referent};
use super::spec::{NeedSpec, TargetSpec};
use super::yaml::{Key, Marked};
use crate::diagnostic::Diagnostic;
use crate::units::Kind;

const TARGETS: [&str; 3] = ["flow_into", "flow_in", "pressure_at"];

pub(super) fn needs(cx: &mut Context, node: &Marked) -> Vec<NeedSpec> {
    let example = "NAME: {flow_into: NODE, at_least: 240 m3/h}";
    let Some(fields) = cx.any_map(node, "`needs`", example) else {
        return Vec::new();
    };
    fields
        .entries()
        .iter()
        .filter_map(|(key, value)| need(cx, key, value))
        .collect()
}

fn need(cx: &mut Context, key: &Key, node: &Marked) -> Option<NeedSpec> {
    super::names::check(cx, key, "need");
    let what = format!("need `{}`", key.name);
    let keys: Vec<&str> = TARGETS
        .iter()
        .copied()
        .chain(["at_least", "at_most"])
        .collect();
    let fields = cx.map(node, &what, &keys)?;
    let given: Vec<&str> = TARGETS
        .into_iter()
        .filter(|target| fields.has(target))
        .collect();
    let &[target] = given.as_slice() else {
        if TARGETS.iter().any(|target| fields.is_misspelt(target)) {
            return None;
        }
        let found = match given.as_slice() {
            [] => "none".to_owned(),
            given => format!("`{}`", given.join("`, `")),
        };
        let message = format!("{what} must look at one thing, found {found}");
        let help = format!("give one of `{}`", TARGETS.join("`, `"));
        cx.push(Diagnostic::error("need", fields.place, message).help(help));
        return None;
    };
    let at = fields.get(target)?;
    let (kind, referent) = match target {
        "flow_into" => (Kind::Flow, Referent::Node),
        "flow_in" => (Kind::Flow, Referent::Line),
        _ => (Kind::Pressure, Referent::Node),
    };
    let name = cx.reference(at, format_args!("`{target}` of {what}"), referent);
    let at_least = limit(cx, &fields, "at_least", &what, kind);
    let at_most = limit(cx, &fields, "at_most", &what, kind);
    let (name, at_least, at_most) = (name?, at_least?, at_most?);
    let target = match target {
        "flow_into" => TargetSpec::FlowInto(name),
        "flow_in" => TargetSpec::FlowIn(name),
        _ => TargetSpec::PressureAt(name),
    };
    if at_least.is_none() && at_most.is_none() {
        if fields.is_misspelt("at_least") || fields.is_misspelt("at_most") {
            return None;
        }
        let message = format!("{what} has no limit");
        cx.push(
            Diagnostic::error("missing-key", fields.place, message)
                .help("add `at_least: ..` or `at_most: ..`"),
        );
        return None;
    }
    if let (Some(least), Some(most)) = (at_least, at_most)
        && least > most
    {
        let message = format!(
            "{what} asks for at least {} and at most {}",
            cx.units.format(kind, least),
            cx.units.format(kind, most)
        );
        let help = "`at_most` must not lie below `at_least`";
        let place = fields.key_place("at_most");
        cx.push(Diagnostic::error("out-of-range", place, message).help(help));
        return None;
    }
    Some(NeedSpec {
        name: key.name.clone(),
        target,
        at_least,
        at_most,
    })
}

fn limit(
    cx: &mut Context,
    fields: &Fields,
    key: &str,
    what: &str,
    kind: Kind,
) -> Option<Option<f64>> {
    match fields.get(key) {
        None => Some(None),
        Some(node) => cx
            .quantity(node, format_args!("`{key}` of {what}"), kind, Bound::Any)
            .map(Some),
    }
}

/// A named set of changed values.
#[derive(Clone, Debug)]
pub struct Case {
    /// The user's name for it.
    pub name: String,
    /// What it changes.
    pub changes: Vec<Change>,
}

/// `cases`: from the name of a case to its changes.
pub(super) fn cases(cx: &mut Context, node: &Marked) -> Vec<Case> {
    let example = "low level: {wet_well.level: 0.9 m}";
    let Some(fields) = cx.any_map(node, "`cases`", example) else {
        return Vec::new();
    };
    let mut cases = Vec::new();
    for (key, value) in fields.entries() {
        super::names::check_label(cx, key, "case");
        let what = format!("case `{}`", key.name);
        let Some(changes) = cx.any_map(value, &what, "wet_well.level: 0.9 m") else {
            continue;
        };
        let changes = changes
            .entries()
            .iter()
            .map(|(path, value)| Change::marked(path.clone(), value.clone()));
        cases.push(Case {
            name: key.name.clone(),
            changes: changes.collect(),
        });
    }
    cases
}

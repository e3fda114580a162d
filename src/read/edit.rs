//! Finding and changing values in the tree of a file: what a change by path needs to know of the file's form.

use super::lines::PARTS;
use super::yaml::{Form, Key, Marked};
use crate::diagnostic::Place;

/// Keys that a part may be given by a change, and those that it replaces.
pub(super) fn part_keys(kind: &str) -> &'static [&'static str] {
    match kind {
        "pipe" => &[
            "length",
            "bore",
            "roughness",
            "material",
            "c_factor",
            "friction_factor",
            "fittings",
            "k",
            "rating",
            "wall",
            "wave_speed",
        ],
        "loss" => &["k", "fittings", "bore"],
        "valve" => &["k", "kv", "cv", "bore", "open", "opening", "characteristic"],
        "check_valve" => &["k", "kv", "cv", "bore", "opening", "characteristic"],
        "equipment" => &["loss", "at"],
        "hold_downstream" | "hold_upstream" => &["pressure", "k", "kv", "cv", "bore", "open"],
        "limit_flow" => &["flow", "k", "kv", "cv", "bore", "open"],
        "minimum_flow" => &["pump", "flow", "k", "kv", "cv", "bore", "open"],
        _ => &[
            "model",
            "elevation",
            "speed",
            "impeller",
            "wear",
            "leakage",
            "running",
            "when_stopped",
        ],
    }
}

/// Keys of which only one can stand; a new one takes the place of the others.
const EXCLUSIVE: [&[&str]; 5] = [
    &["roughness", "material", "c_factor", "friction_factor"],
    &["k", "kv", "cv"],
    &["wall", "wave_speed"],
    &["elevation", "barometer"],
    &["area", "diameter", "lying", "volumes"],
];

pub(super) fn get<'a>(node: &'a Marked, key: &str) -> Option<&'a Marked> {
    match &node.value {
        Form::Map(entries) => entries
            .iter()
            .find(|(k, _)| k.name == key)
            .map(|(_, value)| value),
        _ => None,
    }
}

/// The entry of that name, made if it is not there; none if the node is no map.
pub(super) fn entry<'a>(node: &'a mut Marked, name: &str, place: Place) -> Option<&'a mut Marked> {
    let Form::Map(entries) = &mut node.value else {
        return None;
    };
    let at = entries
        .iter()
        .position(|(key, _)| key.name == name)
        .unwrap_or_else(|| {
            let key = Key {
                name: name.to_owned(),
                place,
            };
            entries.push((
                key,
                Marked {
                    place,
                    value: Form::Map(Vec::new()),
                },
            ));
            entries.len() - 1
        });
    entries.get_mut(at).map(|(_, value)| value)
}

pub(super) fn set(node: &mut Marked, key: &Key, value: &Marked, exclusive: bool) {
    let Form::Map(entries) = &mut node.value else {
        return;
    };
    if exclusive
        && let Some(others) = EXCLUSIVE
            .iter()
            .find(|group| group.contains(&key.name.as_str()))
    {
        entries.retain(|(k, _)| k.name == key.name || !others.contains(&k.name.as_str()));
    }
    match entries.iter_mut().find(|(k, _)| k.name == key.name) {
        Some((_, old)) => *old = value.clone(),
        None => entries.push((key.clone(), value.clone())),
    }
}

pub(super) fn section_mut<'a>(
    root: &'a mut Marked,
    section: &str,
) -> Vec<(&'a str, &'a mut Marked)> {
    let Form::Map(entries) = &mut root.value else {
        return Vec::new();
    };
    let found = entries.iter_mut().find(|(key, _)| key.name == section);
    match found.map(|(_, node)| &mut node.value) {
        Some(Form::Map(entries)) => entries
            .iter_mut()
            .map(|(key, node)| (key.name.as_str(), node))
            .collect(),
        _ => Vec::new(),
    }
}

pub(super) fn find<'a>(root: &'a mut Marked, section: &str, name: &str) -> Option<&'a mut Marked> {
    section_mut(root, section)
        .into_iter()
        .find(|(found, _)| *found == name)
        .map(|(_, node)| node)
}

/// The parts of a line with their kinds, listed or direct.
pub(super) fn parts_mut(line: &mut Marked) -> Vec<(&'static str, &mut Marked)> {
    let Form::Map(entries) = &mut line.value else {
        return Vec::new();
    };
    let mut parts = Vec::new();
    for (key, value) in entries {
        if let Some(kind) = PARTS.iter().find(|kind| **kind == key.name) {
            parts.push((*kind, value));
        } else if let ("parts", Form::List(items)) = (key.name.as_str(), &mut value.value) {
            for item in items {
                let Form::Map(inner) = &mut item.value else {
                    continue;
                };
                for (key, value) in inner {
                    if let Some(kind) = PARTS.iter().find(|kind| **kind == key.name) {
                        parts.push((*kind, value));
                    }
                }
            }
        }
    }
    parts
}

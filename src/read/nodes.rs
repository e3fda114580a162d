//! `nodes`: points, reservoirs, outlets and tanks.

use super::context::{Bound, Context, Fields, scalar_text};
use super::spec::{NodeKindSpec, NodeSpec};
use super::tanks::TANK_KEYS;
use super::yaml::{Form, Key, Marked};
use crate::diagnostic::Diagnostic;
use crate::units::Kind;

const KINDS: [&str; 4] = ["point", "reservoir", "outlet", "tank"];

pub(super) fn nodes(cx: &mut Context, node: &Marked) -> Vec<NodeSpec> {
    let Some(fields) = cx.any_map(node, "`nodes`", "NAME: {point: 0 m}") else {
        return Vec::new();
    };
    fields
        .entries()
        .iter()
        .filter_map(|(key, value)| one(cx, key, value))
        .collect()
}

fn one(cx: &mut Context, key: &Key, node: &Marked) -> Option<NodeSpec> {
    super::names::check(cx, key, "node");
    let what = format!("node `{}`", key.name);
    let fields = cx.map(node, &what, &KINDS)?;
    let given: Vec<&str> = KINDS.into_iter().filter(|kind| fields.has(kind)).collect();
    let kind = match given.as_slice() {
        [kind] => *kind,
        [] => {
            if fields.entries().is_empty() {
                let message = format!("{what} does not say what it is");
                let help = format!("give one of `{}`", KINDS.join("`, `"));
                cx.push(Diagnostic::error("missing-key", key.place, message).help(help));
            }
            return None;
        }
        [_, second, ..] => {
            let message = format!("{what} can be one thing only");
            let help = format!("keep one of `{}`", given.join("`, `"));
            cx.push(Diagnostic::error("both-keys", fields.key_place(second), message).help(help));
            return None;
        }
    };
    let inner = fields.get(kind)?;
    let kind = match kind {
        "point" => point(cx, &what, inner),
        "reservoir" => reservoir(cx, &what, inner),
        "outlet" => outlet(cx, &what, inner),
        _ => tank(cx, &what, inner),
    }?;
    Some(NodeSpec {
        name: key.name.clone(),
        kind,
    })
}

fn is_scalar(node: &Marked) -> bool {
    scalar_text(node).is_some()
}

fn point(cx: &mut Context, what: &str, node: &Marked) -> Option<NodeKindSpec> {
    if is_scalar(node) {
        let elevation = length(cx, node, what, "elevation")?;
        return Some(NodeKindSpec::Point {
            elevation,
            draw: 0.0,
        });
    }
    let fields = cx.map(node, what, &["elevation", "draw", "inflow"])?;
    let elevation = cx.required(&fields, "elevation", what, "1.2 m");
    let elevation = elevation.and_then(|node| length(cx, node, what, "elevation"));
    let draw = rate(cx, &fields, "draw", what);
    let inflow = rate(cx, &fields, "inflow", what);
    Some(NodeKindSpec::Point {
        elevation: elevation?,
        draw: draw? - inflow?,
    })
}

/// A flow: a rate, a rate with a schedule (of which the rate counts when nothing moves in time), or several of these.
fn rate(cx: &mut Context, fields: &Fields, key: &str, what: &str) -> Option<f64> {
    let Some(node) = fields.get(key) else {
        return Some(0.0);
    };
    let what = format!("`{key}` of {what}");
    match &node.value {
        Form::List(items) => items.iter().map(|item| one_rate(cx, item, &what)).sum(),
        _ => one_rate(cx, node, &what),
    }
}

fn one_rate(cx: &mut Context, node: &Marked, what: &str) -> Option<f64> {
    let Form::Map(_) = node.value else {
        return cx.quantity(node, what, Kind::Flow, Bound::Any);
    };
    let fields = cx.map(node, what, &["rate", "times"])?;
    match fields.get("rate") {
        Some(rate) => cx.quantity(rate, what, Kind::Flow, Bound::Any),
        None if fields.has("times") => Some(0.0),
        None => {
            cx.required(&fields, "rate", what, "60 m3/h");
            None
        }
    }
}

fn length(cx: &mut Context, node: &Marked, what: &str, key: &str) -> Option<f64> {
    cx.quantity(
        node,
        format_args!("`{key}` of {what}"),
        Kind::Length,
        Bound::Any,
    )
}

fn pressure(cx: &mut Context, fields: &Fields, what: &str) -> Option<f64> {
    match fields.get("pressure") {
        Some(node) => cx.quantity(
            node,
            format_args!("`pressure` of {what}"),
            Kind::Pressure,
            Bound::Any,
        ),
        None => Some(0.0),
    }
}

fn reservoir(cx: &mut Context, what: &str, node: &Marked) -> Option<NodeKindSpec> {
    if is_scalar(node) {
        let surface = length(cx, node, what, "surface")?;
        return Some(NodeKindSpec::Reservoir {
            surface,
            pressure: 0.0,
        });
    }
    let fields = cx.map(node, what, &["surface", "pressure"])?;
    let surface = cx.required(&fields, "surface", what, "3.2 m");
    let surface = surface.and_then(|node| length(cx, node, what, "surface"));
    let pressure = pressure(cx, &fields, what);
    Some(NodeKindSpec::Reservoir {
        surface: surface?,
        pressure: pressure?,
    })
}

fn outlet(cx: &mut Context, what: &str, node: &Marked) -> Option<NodeKindSpec> {
    if is_scalar(node) {
        return Some(NodeKindSpec::Outlet {
            elevation: length(cx, node, what, "elevation")?,
        });
    }
    let fields = cx.map(node, what, &["elevation"])?;
    let elevation = cx.required(&fields, "elevation", what, "12 m")?;
    Some(NodeKindSpec::Outlet {
        elevation: length(cx, elevation, what, "elevation")?,
    })
}

fn tank(cx: &mut Context, what: &str, node: &Marked) -> Option<NodeKindSpec> {
    let fields = cx.map(node, what, &TANK_KEYS)?;
    let spec = super::tanks::tank(cx, what, &fields);
    rate(cx, &fields, "inflow", what);
    rate(cx, &fields, "draw", what);
    let spec = spec?;
    Some(NodeKindSpec::Tank {
        floor: spec.floor,
        level: spec.level,
        pressure: spec.pressure,
    })
}

//! `nodes`: points, reservoirs, outlets and tanks.

use super::context::{Bound, Context, Fields, scalar_text};
use super::spec::{NodeKindSpec, NodeSpec};
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

/// A flow: a rate, or a rate with a schedule, of which the rate counts when nothing moves in time.
fn rate(cx: &mut Context, fields: &Fields, key: &str, what: &str) -> Option<f64> {
    let Some(node) = fields.get(key) else {
        return Some(0.0);
    };
    let what = format!("`{key}` of {what}");
    if let Form::Map(_) = node.value {
        let fields = cx.map(node, &what, &["rate", "times"])?;
        let rate = cx.required(&fields, "rate", &what, "60 m3/h")?;
        return cx.quantity(rate, &what, Kind::Flow, Bound::Any);
    }
    cx.quantity(node, &what, Kind::Flow, Bound::Any)
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

/// Keys that matter over time only are checked when the over-time sections are read.
pub(super) const TANK_KEYS: [&str; 7] = [
    "floor", "depth", "area", "diameter", "level", "inflow", "pressure",
];

fn tank(cx: &mut Context, what: &str, node: &Marked) -> Option<NodeKindSpec> {
    let fields = cx.map(node, what, &TANK_KEYS)?;
    let mut needed = |key: &str, example: &str, kind, bound| {
        let node = cx.required(&fields, key, what, example)?;
        cx.quantity(node, format_args!("`{key}` of {what}"), kind, bound)
    };
    let floor = needed("floor", "0 m", Kind::Length, Bound::Any);
    let depth = needed("depth", "4 m", Kind::Length, Bound::Positive);
    let level = needed("level", "2.5 m", Kind::Length, Bound::NotNegative);
    match (fields.get("area"), fields.get("diameter")) {
        (Some(node), None) => {
            cx.quantity(
                node,
                format_args!("`area` of {what}"),
                Kind::Area,
                Bound::Positive,
            );
        }
        (None, Some(node)) => {
            cx.quantity(
                node,
                format_args!("`diameter` of {what}"),
                Kind::Length,
                Bound::Positive,
            );
        }
        (Some(_), Some(node)) => {
            let message = format!("give `area` or `diameter` of {what}, not both");
            let help = "`diameter` is for a round tank; it makes the area";
            cx.push(Diagnostic::error("both-keys", node.place, message).help(help));
        }
        (None, None) if fields.is_misspelt("area") || fields.is_misspelt("diameter") => {}
        (None, None) => {
            let message = format!("{what} needs `area` or `diameter`");
            let help = "add for example `area: 40 m2`, or `diameter: 6 m` for a round one";
            cx.push(Diagnostic::error("missing-key", fields.place, message).help(help));
        }
    }
    rate(cx, &fields, "inflow", what);
    let pressure = pressure(cx, &fields, what);
    let (floor, depth, level) = (floor?, depth?, level?);
    if level > depth {
        let node = fields.get("level")?;
        let message = format!(
            "`level` of {what} is {}, above its depth of {}",
            cx.units.format(Kind::Length, level),
            cx.units.format(Kind::Length, depth)
        );
        cx.push(
            Diagnostic::error("out-of-range", node.place, message)
                .help("a level is measured above the floor"),
        );
    }
    Some(NodeKindSpec::Tank {
        floor,
        level,
        pressure: pressure?,
    })
}

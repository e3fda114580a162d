//! Tanks: their shape, their gas and the levels that matter over time.

use super::context::{Bound, Context, Fields};
use super::yaml::Marked;
use crate::diagnostic::Diagnostic;
use crate::shift::{Gas, Shape};
use crate::units::Kind;

/// Keys of a tank.
pub(super) const TANK_KEYS: [&str; 15] = [
    "floor", "depth", "area", "diameter", "lying", "volumes", "level", "inflow", "draw",
    "pressure", "cushion", "alarm", "overflow", "trip", "reset",
];

/// Keys of which one says what shape a tank has.
const SHAPES: [&str; 4] = ["area", "diameter", "lying", "volumes"];

/// What a tank is, in SI.
#[derive(Clone, Debug)]
pub(super) struct TankSpec {
    pub floor: f64,
    pub level: f64,
    /// Gauge, on the surface; with a cushion: at the start level.
    pub pressure: f64,
    pub shape: Shape,
    pub brim: f64,
    pub gas: Gas,
    pub alarm: Option<f64>,
    /// Where pumps that draw from it trip, and where the trip lets go.
    pub trip: Option<(f64, f64)>,
}

/// Reads a tank but for what flows in and out of it.
pub(super) fn tank(cx: &mut Context, what: &str, fields: &Fields) -> Option<TankSpec> {
    let mut quantity = |key: &str, kind, bound| {
        let node = fields.get(key)?;
        cx.quantity(node, &format!("`{key}` of {what}"), kind, bound)
    };
    let depth = quantity("depth", Kind::Length, Bound::Positive);
    let overflow = quantity("overflow", Kind::Length, Bound::Positive);
    let alarm = quantity("alarm", Kind::Length, Bound::NotNegative);
    let trip = quantity("trip", Kind::Length, Bound::NotNegative);
    let reset = quantity("reset", Kind::Length, Bound::NotNegative);
    let pressure = quantity("pressure", Kind::Pressure, Bound::Any);
    let mut needed = |key: &str, example: &str, bound| {
        let node = cx.required(fields, key, what, example)?;
        cx.quantity(node, &format!("`{key}` of {what}"), Kind::Length, bound)
    };
    let floor = needed("floor", "0 m", Bound::Any);
    let level = needed("level", "2.5 m", Bound::NotNegative);
    let shape = shape(cx, what, fields);
    if !fields.has("depth") && !fields.has("lying") && !fields.has("volumes") {
        cx.required(fields, "depth", what, "4 m");
    }
    let pressure = if fields.has("pressure") {
        pressure?
    } else {
        0.0
    };
    let (floor, level, shape) = (floor?, level?, shape?);
    let top = depth.unwrap_or(f64::INFINITY).min(shape.top());
    let brim = overflow.unwrap_or(top);
    if fields.has("depth") && depth? > shape.top() {
        above(
            cx,
            fields,
            what,
            "depth",
            depth?,
            "the shape's height",
            shape.top(),
        );
    }
    for (key, value) in [
        ("overflow", overflow),
        ("level", Some(level)),
        ("alarm", alarm),
        ("trip", trip),
        ("reset", reset),
    ] {
        let Some(value) = value else { continue };
        let limit = if key == "overflow" {
            top
        } else {
            brim.min(top)
        };
        if value > limit {
            above(cx, fields, what, key, value, "its depth", limit);
        }
    }
    let gas = gas(cx, what, fields, pressure, shape.volume(brim.min(top)))?;
    let trip = match (trip, reset) {
        (None, _) => None,
        (Some(trip), Some(reset)) if reset > trip => Some((trip, reset)),
        (Some(_), Some(_)) => {
            let message = format!("`reset` of {what} must lie above its `trip`");
            let help = "the trip lets go where the level has risen again: give a higher `reset`";
            let place = fields.key_place("reset");
            cx.push(Diagnostic::error("out-of-range", place, message).help(help));
            return None;
        }
        (Some(_), None) => {
            let message = format!("{what} has a `trip` but does not say where that lets go");
            let help = "add for example `reset: 1.0 m`, above the trip";
            cx.push(Diagnostic::error("missing-key", fields.key_place("trip"), message).help(help));
            return None;
        }
    };
    Some(TankSpec {
        floor,
        level,
        pressure,
        shape,
        brim,
        gas,
        alarm,
        trip,
    })
}

fn above(
    cx: &mut Context,
    fields: &Fields,
    what: &str,
    key: &str,
    value: f64,
    of: &str,
    limit: f64,
) {
    let place = fields.get(key).map_or(fields.place, |node| node.place);
    let message = format!(
        "`{key}` of {what} is {}, above {of} of {}",
        cx.units.format(Kind::Length, value),
        cx.units.format(Kind::Length, limit)
    );
    cx.push(
        Diagnostic::error("out-of-range", place, message)
            .help("levels are measured above the floor"),
    );
}

fn shape(cx: &mut Context, what: &str, fields: &Fields) -> Option<Shape> {
    let given: Vec<&str> = SHAPES.into_iter().filter(|key| fields.has(key)).collect();
    let &[key] = given.as_slice() else {
        if let Some(second) = given.get(1) {
            let message = format!("give `{}` of {what}, not both", given.join("` or `"));
            let help = "one of them says what shape it has";
            cx.push(Diagnostic::error("both-keys", fields.key_place(second), message).help(help));
        } else if !SHAPES.iter().any(|key| fields.is_misspelt(key)) {
            let message = format!("{what} needs `area` or `diameter`");
            let help = "add for example `area: 40 m2`, `diameter: 6 m` for a round one, `lying: {diameter: 2 m, length: 6 m}` for a \
                        cylinder on its side, or `volumes: {level: [..], volume: [..]}`";
            cx.push(Diagnostic::error("missing-key", fields.place, message).help(help));
        }
        return None;
    };
    let node = fields.get(key)?;
    let name = format!("`{key}` of {what}");
    match key {
        "area" => {
            let area = cx.quantity(node, &name, Kind::Area, Bound::Positive)?;
            Some(Shape::Upright { area })
        }
        "diameter" => {
            let diameter = cx.quantity(node, &name, Kind::Length, Bound::Positive)?;
            let area = std::f64::consts::FRAC_PI_4 * diameter * diameter;
            Some(Shape::Upright { area })
        }
        "lying" => {
            let fields = cx.map(node, &name, &["diameter", "length"])?;
            let mut size = |key: &str, example: &str| {
                let node = cx.required(&fields, key, &name, example)?;
                cx.quantity(
                    node,
                    &format!("`{key}` of {name}"),
                    Kind::Length,
                    Bound::Positive,
                )
            };
            let (diameter, length) = (size("diameter", "2 m"), size("length", "6 m"));
            Some(Shape::Cylinder {
                diameter: diameter?,
                length: length?,
            })
        }
        _ => table(cx, node, &name),
    }
}

fn table(cx: &mut Context, node: &Marked, name: &str) -> Option<Shape> {
    let fields = cx.map(node, name, &["level", "volume"])?;
    let mut column = |key: &str, kind| {
        let node = cx.required(&fields, key, name, "[0, 1, 2]")?;
        let what = format!("`{key}` of {name}");
        let items = cx.list(node, &what, "[0, 1, 2]")?;
        items
            .iter()
            .map(|item| cx.quantity(item, &what, kind, Bound::NotNegative))
            .collect::<Option<Vec<f64>>>()
    };
    let (levels, volumes) = (
        column("level", Kind::Length),
        column("volume", Kind::Volume),
    );
    let shape = Shape::Table {
        levels: levels?,
        volumes: volumes?,
    };
    match shape.check() {
        Ok(()) => Some(shape),
        Err(why) => {
            let message = format!("{name} cannot be used: {why}");
            let help = "give each level with the volume below it, both rising from point to point";
            cx.push(Diagnostic::error("table", node.place, message).help(help));
            None
        }
    }
}

fn gas(cx: &mut Context, what: &str, fields: &Fields, pressure: f64, brim: f64) -> Option<Gas> {
    let Some(node) = fields.get("cushion") else {
        return Some(Gas::Steady(pressure));
    };
    let name = format!("`cushion` of {what}");
    let inner = cx.map(node, &name, &["vessel", "exponent"])?;
    let vessel = cx.required(&inner, "vessel", &name, "8 m3")?;
    let exponent = match inner.get("exponent") {
        Some(node) => cx.number(node, &format!("`exponent` of {name}"), Bound::Positive)?,
        None => 1.2,
    };
    let volume = cx.quantity(
        vessel,
        &format!("`vessel` of {name}"),
        Kind::Volume,
        Bound::Positive,
    )?;
    if volume <= brim {
        let message = format!(
            "`vessel` of {name} is {}, no more than the liquid that the tank can hold, {}",
            cx.units.format(Kind::Volume, volume),
            cx.units.format(Kind::Volume, brim)
        );
        let help = "it is the volume of the whole vessel, liquid and gas";
        cx.push(Diagnostic::error("out-of-range", vessel.place, message).help(help));
        return None;
    }
    Some(Gas::Cushion {
        vessel: volume,
        pressure,
        exponent,
    })
}

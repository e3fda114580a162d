//! `limits`, and what is known of pumps, pipes and bells that limits are judged by.
//!
//! ```yaml
//! limits:
//!   preferred_high: 110 %
//!   suction_pressure: {value: 0.7 bar, source: maker of the upper pump}
//! ```

use super::context::{Bound, Context, Fields};
use super::spec::{LineSpec, PartKindSpec, PipeFacts, SiteSpec};
use super::yaml::{Form, Marked};
use crate::diagnostic::Diagnostic;
use crate::network::{Bell, LimitName, Limits, LineFacts, Measure};
use crate::part::pump::MakerLimits;
use crate::part::{materials, surge};
use crate::units::Kind;

/// Keys of a pump model that state its maker's limits.
pub(super) const MAKER_KEYS: [&str; 4] = ["minimum_flow", "preferred", "allowable", "casing"];

/// The section: from the name of a limit to its value, or to `{value, source}`.
pub(super) fn limits(cx: &mut Context, node: &Marked) -> Limits {
    let mut limits = Limits::default();
    let keys: Vec<&str> = LimitName::all().map(LimitName::key).collect();
    let Some(fields) = cx.map(node, "`limits`", &keys) else {
        return limits;
    };
    for name in LimitName::all() {
        if let Some(node) = fields.get(name.key()) {
            limit(cx, name, node, &mut limits);
        }
    }
    for (low, high) in [
        (LimitName::PreferredLow, LimitName::PreferredHigh),
        (LimitName::AllowableLow, LimitName::AllowableHigh),
        (LimitName::VelocityLow, LimitName::VelocityHigh),
    ] {
        if let (Some(least), Some(most)) = (limits.value(low), limits.value(high))
            && least >= most
        {
            let key = if fields.has(high.key()) { high } else { low };
            let message = format!("`{}` must lie below `{}`", low.key(), high.key());
            let help = "one that is not given keeps its default: give both";
            let place = fields.key_place(key.key());
            cx.push(Diagnostic::error("out-of-range", place, message).help(help));
        }
    }
    limits
}

fn limit(cx: &mut Context, name: LimitName, node: &Marked, limits: &mut Limits) -> Option<()> {
    let what = format!("limit `{}`", name.key());
    let (value, source) = match &node.value {
        Form::Map(_) => {
            let fields = cx.map(node, &what, &["value", "source"])?;
            let source = match fields.get("source") {
                Some(node) => Some(cx.text(node, &format!("`source` of {what}"))?),
                None => None,
            };
            (cx.required(&fields, "value", &what, example(name))?, source)
        }
        _ => (node, None),
    };
    let kind = match name.measure() {
        Measure::Share => Some(Kind::Percent),
        Measure::Length => Some(Kind::Length),
        Measure::Pressure => Some(Kind::Pressure),
        Measure::Velocity => Some(Kind::Velocity),
        Measure::Number => None,
    };
    let bound = match name {
        LimitName::SuctionPressure => Bound::Any,
        LimitName::ShutoffTolerance | LimitName::NpshMargin => Bound::NotNegative,
        _ => Bound::Positive,
    };
    let value = match kind {
        Some(kind) => cx.quantity(value, &what, kind, bound)?,
        None => cx.number(value, &what, bound)?,
    };
    limits.set(name, value, source.as_deref());
    Some(())
}

/// A value that would do for a limit.
fn example(name: LimitName) -> &'static str {
    match name.measure() {
        Measure::Share => "70 %",
        Measure::Number => "1.3",
        Measure::Length => "1 m",
        Measure::Pressure => "0.7 bar",
        Measure::Velocity => "0.6 m/s",
    }
}

/// What a pump model says of its maker's limits.
pub(super) fn maker(cx: &mut Context, fields: &Fields, what: &str) -> MakerLimits {
    let mut maker = MakerLimits {
        preferred: region(cx, fields, "preferred", what),
        allowable: region(cx, fields, "allowable", what),
        ..MakerLimits::default()
    };
    maker.minimum_flow = fields.get("minimum_flow").and_then(|node| {
        let label = format!("`minimum_flow` of {what}");
        cx.quantity(node, &label, Kind::Flow, Bound::NotNegative)
    });
    if let Some(node) = fields.get("casing") {
        let what = format!("the casing of {what}");
        if let Some(fields) = cx.map(node, &what, &["pressure", "volume"]) {
            let mut figure = |key: &str, kind| {
                let node = fields.get(key)?;
                cx.quantity(node, &format!("`{key}` of {what}"), kind, Bound::Positive)
            };
            maker.casing_pressure = figure("pressure", Kind::Pressure);
            maker.casing_volume = figure("volume", Kind::Volume);
        }
    }
    maker
}

/// `{from: 70 %, to: 120 %}` of the flow of best efficiency.
fn region(cx: &mut Context, fields: &Fields, key: &str, what: &str) -> Option<(f64, f64)> {
    let node = fields.get(key)?;
    let what = format!("`{key}` of {what}");
    let fields = cx.map(node, &what, &["from", "to"])?;
    let mut edge = |key: &str, example: &str| {
        let node = cx.required(&fields, key, &what, example)?;
        let label = format!("`{key}` of {what}");
        cx.quantity(node, &label, Kind::Percent, Bound::NotNegative)
    };
    let (from, to) = (edge("from", "70 %"), edge("to", "120 %"));
    let (from, to) = (from?, to?);
    if from >= to {
        let message = format!("{what} must end above its beginning");
        let help = "shares of the flow of best efficiency: `{from: 70 %, to: 120 %}`";
        cx.push(Diagnostic::error("out-of-range", node.place, message).help(help));
        return None;
    }
    Some((from, to))
}

/// What a pipe says of its wall and rating.
pub(super) fn pipe_facts(
    cx: &mut Context,
    site: &SiteSpec,
    fields: &Fields,
    what: &str,
    bore: Option<f64>,
) -> PipeFacts {
    let rating = fields.get("rating").and_then(|node| {
        let label = format!("`rating` of {what}");
        cx.quantity(node, &label, Kind::Pressure, Bound::Positive)
    });
    PipeFacts {
        rating,
        wave_speed: wave_speed(cx, site, fields, what, bore),
    }
}

fn wave_speed(
    cx: &mut Context,
    site: &SiteSpec,
    fields: &Fields,
    what: &str,
    bore: Option<f64>,
) -> Option<f64> {
    match (fields.get("wave_speed"), fields.get("wall")) {
        (Some(_), Some(wall)) => {
            let message = format!("{what} takes only one of `wave_speed`, `wall`");
            let help = "the wave speed follows from the wall";
            cx.push(Diagnostic::error("both-keys", wall.place, message).help(help));
            None
        }
        (Some(node), None) => {
            let label = format!("`wave_speed` of {what}");
            cx.quantity(node, &label, Kind::Velocity, Bound::Positive)
        }
        (None, Some(node)) => {
            let (thickness, stiffness) = wall(cx, fields, node, what)?;
            let density = site.fluid.density;
            Some(surge::wave_speed(density, bore?, thickness, stiffness))
        }
        (None, None) => None,
    }
}

/// Thickness (m) and stiffness (Pa) of a wall: `{thickness: 6.8 mm, material: ductile_iron}`, or a thickness beside the pipe's
/// `material`.
fn wall(cx: &mut Context, fields: &Fields, node: &Marked, what: &str) -> Option<(f64, f64)> {
    let label = format!("`wall` of {what}");
    let (thickness, material) = match &node.value {
        Form::Map(_) => {
            let wall = cx.map(node, &label, &["thickness", "material"])?;
            let thickness = cx.required(&wall, "thickness", &label, "6.8 mm")?;
            (thickness, wall.get("material").or(fields.get("material")))
        }
        _ => (node, fields.get("material")),
    };
    let thickness = cx.quantity(thickness, &label, Kind::Bore, Bound::Positive)?;
    let Some(material) = material else {
        let message = format!("{label} needs the material of the wall");
        let help = "write `wall: {thickness: 6.8 mm, material: ductile_iron}`, or give `wave_speed: 1100 m/s`";
        cx.push(Diagnostic::error("missing-key", node.place, message).help(help));
        return None;
    };
    let name = cx.text(material, &format!("`material` in the {label}"))?;
    let stiffness = surge::stiffness(&name);
    if stiffness.is_none() {
        let message = format!("no stiffness is known here for the wall material `{name}`");
        let help = match materials::nearest(&name).filter(|near| *near != name) {
            Some(near) => format!("did you mean `{near}`? Else give `wave_speed: 1100 m/s`"),
            None => "give `wave_speed: 1100 m/s` in place of `wall`".to_owned(),
        };
        cx.push(Diagnostic::error("unknown-name", material.place, message).help(help));
    }
    Some((thickness, stiffness?))
}

/// `bell: {diameter: 350 mm, elevation: 0.2 m}` of a line.
pub(super) fn bell(cx: &mut Context, fields: &Fields, what: &str) -> Option<Bell> {
    let node = fields.get("bell")?;
    let what = format!("the bell of {what}");
    let fields = cx.map(node, &what, &["diameter", "elevation"])?;
    let diameter = cx.required(&fields, "diameter", &what, "350 mm");
    let diameter = diameter.and_then(|node| {
        let label = format!("`diameter` of {what}");
        cx.quantity(node, &label, Kind::Bore, Bound::Positive)
    });
    let elevation = cx.required(&fields, "elevation", &what, "0.2 m");
    let elevation = elevation.and_then(|node| {
        let label = format!("`elevation` of {what}");
        cx.quantity(node, &label, Kind::Length, Bound::Any)
    });
    Some(Bell {
        diameter: diameter?,
        elevation: elevation?,
    })
}

/// What a line says that its flow does not depend on; a bell needs a free surface to draw from.
pub(super) fn line_facts(
    cx: &mut Context,
    line: &LineSpec,
    density: f64,
    draws_from_surface: bool,
) -> LineFacts {
    if let Some(bell) = line.bell.as_ref().filter(|_| !draws_from_surface) {
        let message = format!(
            "line `{}` has a bell but draws from `{}`, which has no free surface",
            line.name, line.from.value
        );
        let help = "a bell stands at a line's `from` end, in a `tank` or a `reservoir`";
        cx.push(Diagnostic::error("bell", bell.place, message).help(help));
    }
    let pipes = line.parts.iter().filter_map(|part| match &part.kind {
        PartKindSpec::Pipe { length, facts, .. } => Some((*length, facts)),
        _ => None,
    });
    let known = pipes.clone().any(|(_, facts)| facts.wave_speed.is_some());
    let rigid = surge::rigid_wave_speed(density);
    let travel = |(length, facts): (f64, &PipeFacts)| length / facts.wave_speed.unwrap_or(rigid);
    let length: f64 = pipes.clone().map(|(length, _)| length).sum();
    LineFacts {
        rating: pipes
            .clone()
            .filter_map(|(_, facts)| facts.rating)
            .min_by(f64::total_cmp),
        wave_speed: known.then(|| length / pipes.map(travel).sum::<f64>()),
        bell: line.bell.as_ref().map(|bell| bell.value),
    }
}

//! `units`, `fluid` and `site`.

use super::context::{Bound, Context, found};
use super::spec::SiteSpec;
use super::yaml::{Form, Marked};
use crate::diagnostic::Diagnostic;
use crate::fluid::{Fluid, STANDARD_ATMOSPHERE, STANDARD_GRAVITY, standard_barometer};
use crate::units::{Kind, UnitSet, ViscosityValue};

const SETS: [&str; 3] = ["metric", "us", "si"];

pub(super) fn units(cx: &mut Context, node: &Marked) {
    let chosen = match &node.value {
        Form::Map(_) => {
            let keys: Vec<&str> = std::iter::once("base")
                .chain(Kind::KEYS.iter().map(|(key, _)| *key))
                .collect();
            let Some(fields) = cx.map(node, "`units`", &keys) else {
                return;
            };
            let mut set = match fields.get("base") {
                Some(base) => unit_set(cx, base),
                None => Some(UnitSet::metric()),
            };
            for (key, value) in fields.entries() {
                if key.name == "base" || !keys.contains(&key.name.as_str()) {
                    continue;
                }
                let Some(unit) = cx.text(value, format_args!("the unit of `{}`", key.name)) else {
                    continue;
                };
                if let Some(Err(why)) = set.as_mut().map(|set| set.set(&key.name, &unit)) {
                    let message = format!("the unit of `{}` does not fit", key.name);
                    let problem = Diagnostic::error("wrong-unit", value.place, message);
                    cx.push(problem.help(why.to_string()));
                }
            }
            set
        }
        _ => unit_set(cx, node),
    };
    if let Some(set) = chosen {
        cx.units = set;
    }
}

fn unit_set(cx: &mut Context, node: &Marked) -> Option<UnitSet> {
    let set = super::context::scalar_text(node).and_then(UnitSet::base);
    if set.is_none() {
        let message = format!(
            "the set of units must be one of `{}`, found {}",
            SETS.join("`, `"),
            found(node)
        );
        let help = "it may also be a map such as `units: {base: metric, flow: L/s}`";
        cx.push(Diagnostic::error("units", node.place, message).help(help));
    }
    set
}

/// Liquid, gravity and air pressure.
pub(super) fn site(cx: &mut Context, fluid: Option<&Marked>, site: Option<&Marked>) -> SiteSpec {
    let mut spec = SiteSpec {
        fluid: Fluid::default(),
        gravity: STANDARD_GRAVITY,
        barometer: STANDARD_ATMOSPHERE,
    };
    if let Some(found) = fluid.and_then(|node| read_fluid(cx, node)) {
        spec.fluid = found;
    }
    if let Some(node) = site {
        place(cx, &mut spec, node);
    }
    if let Some(node) = fluid {
        judge_liquid(cx, &spec, node);
    }
    spec
}

/// `site`: gravity and air pressure.
fn place(cx: &mut Context, spec: &mut SiteSpec, node: &Marked) {
    let Some(fields) = cx.map(node, "`site`", &["elevation", "barometer", "gravity"]) else {
        return;
    };
    if let Some(node) = fields.get("gravity") {
        let gravity = cx.quantity(node, "`gravity`", Kind::Acceleration, Bound::Positive);
        spec.gravity = gravity.unwrap_or(spec.gravity);
    }
    match (fields.get("elevation"), fields.get("barometer")) {
        (Some(_), Some(barometer)) => {
            let message = "give `elevation` or `barometer` of the site, not both";
            let help = "the air pressure follows from the elevation unless it is given";
            cx.push(Diagnostic::error("both-keys", barometer.place, message).help(help));
        }
        (Some(node), None) => {
            if let Some(elevation) =
                cx.quantity(node, "the site's `elevation`", Kind::Length, Bound::Any)
            {
                match standard_barometer(elevation) {
                    Ok(pressure) => spec.barometer = pressure,
                    Err(why) => {
                        let help = "give `barometer` in place of `elevation`, or check the unit";
                        let problem =
                            Diagnostic::error("out-of-range", node.place, why.to_string());
                        cx.push(problem.help(help));
                    }
                }
            }
        }
        (None, Some(node)) => {
            let pressure = cx.quantity(
                node,
                "`barometer` (absolute)",
                Kind::Pressure,
                Bound::Positive,
            );
            spec.barometer = pressure.unwrap_or(spec.barometer);
        }
        (None, None) => {}
    }
}

/// Densities (kg/m3) between which every ordinary liquid lies, from liquefied petroleum gas to mercury: common practice, no source.
const DENSITIES: (f64, f64) = (400.0, 14_000.0);

/// A liquid that looks like a slip of the pen, and one that boils where it stands open to the air.
fn judge_liquid(cx: &mut Context, spec: &SiteSpec, node: &Marked) {
    let fluid = &spec.fluid;
    if !(DENSITIES.0..=DENSITIES.1).contains(&fluid.density) {
        let density = cx.units.format(Kind::Density, fluid.density);
        let message = format!("a liquid of {density} is unlike any in ordinary use");
        let help = "check the number and its unit, for example `density: 870 kg/m3`";
        cx.push(Diagnostic::caution("unlikely-density", node.place, message).help(help));
    }
    match fluid.vapour_pressure {
        None => {
            let message = "the liquid has no `vapour_pressure`: neither NPSH available nor boiling can be judged";
            let help = "add the absolute vapour pressure at its temperature, for example `vapour_pressure: 2 kPa`";
            cx.push(Diagnostic::caution("no-vapour-pressure", node.place, message).help(help));
        }
        Some(vapour) if vapour >= spec.barometer => {
            let pressure = |p| cx.units.format(Kind::Pressure, p);
            let message = format!(
                "the liquid boils where it is open to the air: vapour pressure {}, air pressure {}",
                pressure(vapour),
                pressure(spec.barometer)
            );
            let help = "reservoirs and tanks must then be closed and under pressure; both pressures are absolute";
            cx.push(Diagnostic::caution("boils", node.place, message).help(help));
        }
        Some(_) => {}
    }
}

fn read_fluid(cx: &mut Context, node: &Marked) -> Option<Fluid> {
    let keys = ["water", "density", "viscosity", "vapour_pressure"];
    let fields = cx.map(node, "`fluid`", &keys)?;
    if let Some(water) = fields.get("water") {
        if let Some(other) = keys[1..].iter().find(|key| fields.has(key)) {
            let message = format!("`water` gives all properties; `{other}` cannot stand beside it");
            let help = "keep `water`, or give density, viscosity and vapour pressure without it";
            let place = fields.key_place(other);
            cx.push(Diagnostic::error("both-keys", place, message).help(help));
        }
        let temperature = cx.quantity(
            water,
            "the water's temperature",
            Kind::Temperature,
            Bound::Any,
        )?;
        return match Fluid::water(temperature) {
            Ok(fluid) => Some(fluid),
            Err(why) => {
                let help = "for water under pressure give density, viscosity and vapour pressure";
                let problem = Diagnostic::error("out-of-range", water.place, why.to_string());
                cx.push(problem.help(help));
                None
            }
        };
    }
    let density = cx.required(&fields, "density", "`fluid`", "998.2 kg/m3");
    let density =
        density.and_then(|node| cx.quantity(node, "`density`", Kind::Density, Bound::Positive));
    let viscosity = cx.required(&fields, "viscosity", "`fluid`", "1.0 cSt");
    let viscosity = viscosity.and_then(|node| cx.viscosity(node, "`viscosity`"));
    let vapour_pressure = fields.get("vapour_pressure").map(|node| {
        cx.quantity(
            node,
            "`vapour_pressure` (absolute)",
            Kind::Pressure,
            Bound::NotNegative,
        )
    });
    let density = density?;
    Some(Fluid {
        density,
        kinematic_viscosity: match viscosity? {
            ViscosityValue::Kinematic(nu) => nu,
            ViscosityValue::Dynamic(mu) => mu / density,
        },
        vapour_pressure: vapour_pressure.flatten(),
    })
}

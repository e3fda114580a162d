//! The parts of a line: pipes, losses, valves, equipment and pumps.

use super::context::{Bound, Context, Fields, Referent, found, scalar_text, transposed};
use super::spec::{FrictionSpec, LossSpec, PartKindSpec, PartSpec, Placed, PumpSpec, SiteSpec};
use super::yaml::{Key, Marked, shortened};
use crate::diagnostic::{Diagnostic, Place};
use crate::part::quadratic::QuadraticLoss;
use crate::part::valve::{Characteristic, Valve};
use crate::part::{fittings, materials};
use crate::units::{Kind, LossValue};

const FRICTIONS: [&str; 4] = ["roughness", "material", "c_factor", "friction_factor"];

pub(super) fn part(
    cx: &mut Context,
    site: &SiteSpec,
    line: &str,
    kind: &str,
    node: &Marked,
) -> Option<PartSpec> {
    let what = format!("the {} of {line}", kind.replace('_', " "));
    let kind = match kind {
        "pipe" => pipe(cx, site, &what, node)?,
        "loss" => {
            let fields = cx.map(node, &what, &["k", "fittings", "bore"])?;
            if !fields.has("k") && !fields.has("fittings") {
                missing(cx, &fields, &what, &["k", "fittings"], "k: 2");
            }
            let k = loss_coefficient(cx, &fields, &what);
            let bore = bore(cx, &fields, &what);
            PartKindSpec::Loss(LossSpec::K { k: k?, bore: bore? })
        }
        "valve" => {
            let keys = ["k", "kv", "cv", "bore", "open", "opening", "characteristic"];
            let fields = cx.map(node, &what, &keys)?;
            let open = match fields.get("open") {
                Some(node) => cx.boolean(node, format_args!("`open` of {what}")),
                None => Some(true),
            };
            let loss = valve_loss(cx, site, &fields, &what);
            let (characteristic, opening) = opening(cx, &fields, &what)?;
            PartKindSpec::Valve {
                loss: loss?,
                characteristic,
                open: open?,
                opening,
            }
        }
        "check_valve" => {
            let fields = cx.map(
                node,
                &what,
                &["k", "kv", "cv", "bore", "opening", "characteristic"],
            )?;
            let loss = valve_loss(cx, site, &fields, &what);
            let (characteristic, opening) = opening(cx, &fields, &what)?;
            PartKindSpec::CheckValve {
                loss: loss?,
                characteristic,
                opening,
            }
        }
        "hold_downstream" | "hold_upstream" | "limit_flow" | "minimum_flow" => {
            let regulator = super::regulators::regulator(cx, site, line, kind, node)?;
            PartKindSpec::Regulator(Box::new(regulator))
        }
        "equipment" => PartKindSpec::Equipment(equipment(cx, site, &what, node)?),
        _ => PartKindSpec::Pump(Box::new(pump(cx, site, &what, node)?)),
    };
    Some(PartSpec {
        place: node.place,
        kind,
    })
}

fn missing(cx: &mut Context, fields: &Fields, what: &str, keys: &[&str], example: &str) {
    if keys.iter().any(|key| fields.is_misspelt(key)) {
        return;
    }
    let message = format!("{what} needs one of `{}`", keys.join("`, `"));
    let help = format!("add for example `{example}`");
    cx.push(Diagnostic::error("missing-key", fields.place, message).help(help));
}

/// Exactly one of several keys; reports none and more than one.
fn only_one<'k>(
    cx: &mut Context,
    fields: &Fields,
    what: &str,
    keys: &[&'k str],
    example: &str,
) -> Option<&'k str> {
    let given: Vec<&'k str> = keys.iter().copied().filter(|key| fields.has(key)).collect();
    match given.as_slice() {
        [one] => Some(one),
        [] => {
            missing(cx, fields, what, keys, example);
            None
        }
        [_, second, ..] => {
            let message = format!("{what} takes only one of `{}`", keys.join("`, `"));
            let help = format!("keep one of `{}`", given.join("`, `"));
            cx.push(Diagnostic::error("both-keys", fields.key_place(second), message).help(help));
            None
        }
    }
}

fn bore(cx: &mut Context, fields: &Fields, what: &str) -> Option<Option<f64>> {
    match fields.get("bore") {
        Some(node) => cx
            .quantity(
                node,
                format_args!("`bore` of {what}"),
                Kind::Bore,
                Bound::Positive,
            )
            .map(Some),
        None => Some(None),
    }
}

fn pipe(cx: &mut Context, site: &SiteSpec, what: &str, node: &Marked) -> Option<PartKindSpec> {
    let keys = [
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
    ];
    let fields = cx.map(node, what, &keys)?;
    let length = cx.required(&fields, "length", what, "12 m");
    let length = length.and_then(|node| {
        cx.quantity(
            node,
            format_args!("`length` of {what}"),
            Kind::Length,
            Bound::Positive,
        )
    });
    let given_bore = cx.required(&fields, "bore", what, "250 mm");
    let given_bore = given_bore.and_then(|node| {
        cx.quantity(
            node,
            format_args!("`bore` of {what}"),
            Kind::Bore,
            Bound::Positive,
        )
    });
    let friction = friction(cx, &fields, what, given_bore);
    let k = loss_coefficient(cx, &fields, what);
    let facts = super::limits::pipe_facts(cx, site, &fields, what, given_bore);
    Some(PartKindSpec::Pipe {
        length: length?,
        bore: given_bore?,
        friction: friction?,
        k: k?,
        facts,
    })
}

fn friction(
    cx: &mut Context,
    fields: &Fields,
    what: &str,
    bore: Option<f64>,
) -> Option<FrictionSpec> {
    let key = only_one(cx, fields, what, &FRICTIONS, "roughness: 0.05 mm")?;
    let node = fields.get(key)?;
    let label = format!("`{key}` of {what}");
    match key {
        "roughness" => {
            let roughness = cx.quantity(node, &label, Kind::Bore, Bound::NotNegative)?;
            if bore.is_some_and(|bore| roughness > 0.1 * bore) {
                let message = format!(
                    "{label} is more than a tenth of its bore, found {}",
                    found(node)
                );
                let help = "beyond a relative roughness of about 0.1 Colebrook–White means nothing; check the units";
                cx.push(Diagnostic::error("out-of-range", node.place, message).help(help));
                return None;
            }
            Some(FrictionSpec::Roughness(roughness))
        }
        "material" => {
            let name = cx.text(node, &label)?;
            if let Some(material) = materials::material(&name) {
                return Some(FrictionSpec::Roughness(material.roughness));
            }
            let near = materials::nearest(&name);
            let known = materials::TABLE.iter().map(|material| material.name);
            unknown_name(cx, node.place, "material", &name, near, known);
            None
        }
        "c_factor" => cx
            .number(node, &label, Bound::Positive)
            .map(FrictionSpec::HazenWilliams),
        _ => cx
            .number(node, &label, Bound::NotNegative)
            .map(FrictionSpec::FixedFactor),
    }
}

/// A name that a table does not have.
fn unknown_name(
    cx: &mut Context,
    place: Place,
    what: &str,
    name: &str,
    near: Option<&str>,
    known: impl Iterator<Item = &'static str>,
) {
    let message = format!("no {what} is called `{}`", shortened(name));
    let help = match near {
        Some(near) => format!("did you mean `{near}`?"),
        None => format!("{what}s are {}", known.collect::<Vec<_>>().join(", ")),
    };
    cx.push(Diagnostic::error("unknown-name", place, message).help(help));
}

/// `k` plus the sum over `fittings`.
fn loss_coefficient(cx: &mut Context, fields: &Fields, what: &str) -> Option<f64> {
    let mut sum = Some(0.0);
    let mut add = |k: Option<f64>| sum = sum.zip(k).map(|(sum, k)| sum + k);
    if let Some(node) = fields.get("k") {
        add(cx.number(node, format_args!("`k` of {what}"), Bound::NotNegative));
    }
    if let Some(node) = fields.get("fittings") {
        match cx.any_map(
            node,
            &format!("`fittings` of {what}"),
            "elbow_90_flanged: 2",
        ) {
            Some(list) => {
                for (key, value) in list.entries() {
                    let count = cx.number(
                        value,
                        format_args!("the number of `{}`", key.name),
                        Bound::NotNegative,
                    );
                    match fittings::fitting(&key.name) {
                        Some(fitting) => add(count.map(|count| count * fitting.k)),
                        None => {
                            let near = fittings::nearest(&key.name);
                            let known = fittings::TABLE.iter().map(|fitting| fitting.name);
                            unknown_name(cx, key.place, "fitting", &key.name, near, known);
                            add(None);
                        }
                    }
                }
            }
            None => add(None),
        }
    }
    sum
}

pub(super) fn valve_loss(
    cx: &mut Context,
    site: &SiteSpec,
    fields: &Fields,
    what: &str,
) -> Option<LossSpec> {
    let key = only_one(cx, fields, what, &["k", "kv", "cv"], "k: 0.2")?;
    let node = fields.get(key)?;
    let label = format!("`{key}` of {what}");
    let bore = bore(cx, fields, what);
    match key {
        "k" => {
            let k = cx.number(node, &label, Bound::NotNegative);
            Some(LossSpec::K { k: k?, bore: bore? })
        }
        // A flow coefficient is a number whose unit its definition fixes.
        "kv" => {
            let kv = cx.number(node, &label, Bound::Positive)? / 3600.0;
            Some(LossSpec::Known(Valve::kv(kv, site.gravity)))
        }
        _ => {
            const GPM: f64 = 231.0 * 0.0254 * 0.0254 * 0.0254 / 60.0;
            let cv = cx.number(node, &label, Bound::Positive)? * GPM;
            Some(LossSpec::Known(Valve::cv(cv, site.gravity)))
        }
    }
}

fn opening(cx: &mut Context, fields: &Fields, what: &str) -> Option<(Characteristic, f64)> {
    let characteristic = match fields.get("characteristic") {
        None => Some(Characteristic::Linear),
        Some(node) => match scalar_text(node) {
            Some("linear") => Some(Characteristic::Linear),
            Some("equal_percentage") => Some(Characteristic::EqualPercentage),
            _ => {
                let message = format!(
                    "`characteristic` of {what} must be `linear` or `equal_percentage`, found {}",
                    found(node)
                );
                cx.error("unknown-name", node.place, message);
                None
            }
        },
    };
    let opening = match fields.get("opening") {
        Some(node) => cx.quantity(
            node,
            format_args!("`opening` of {what}"),
            Kind::Percent,
            Bound::Share,
        )?,
        None => 1.0,
    };
    Some((characteristic?, opening))
}

fn equipment(
    cx: &mut Context,
    site: &SiteSpec,
    what: &str,
    node: &Marked,
) -> Option<QuadraticLoss> {
    let fields = cx.map(node, what, &["loss", "at"])?;
    let loss = cx.required(&fields, "loss", what, "1.5 m");
    let loss = loss.and_then(|node| {
        let label = format!("`loss` of {what}");
        let quantity = cx.any_quantity(node, &label, Some(Kind::Length))?;
        match quantity.to_loss(&cx.units) {
            Ok(value) => {
                let head = match value {
                    LossValue::Head(head) => head,
                    LossValue::Pressure(pressure) => pressure / (site.fluid.density * site.gravity),
                };
                cx.bounded(node, &label, head, Bound::NotNegative)
            }
            Err(why) => {
                let message = format!(
                    "{label} must be a head or a pressure, found {}",
                    found(node)
                );
                let help = format!("{why}; or a pressure, such as `0.2 bar`");
                cx.push(Diagnostic::error("wrong-unit", node.place, message).help(help));
                None
            }
        }
    });
    let at = cx.required(&fields, "at", what, "100 m3/h");
    let at = at.and_then(|node| {
        cx.quantity(
            node,
            format_args!("`at` of {what}"),
            Kind::Flow,
            Bound::Positive,
        )
    });
    let law = QuadraticLoss::checked_at(loss?, at?);
    if law.is_none() {
        let message = format!("the loss of {what} is beyond any range");
        let help = "check `loss` and `at` and their units";
        cx.push(Diagnostic::error("out-of-range", fields.place, message).help(help));
    }
    law
}

fn pump(cx: &mut Context, site: &SiteSpec, what: &str, node: &Marked) -> Option<PumpSpec> {
    let keys = [
        "model",
        "elevation",
        "speed",
        "impeller",
        "wear",
        "leakage",
        "running",
        "name",
        "when_stopped",
    ];
    let fields = cx.map(node, what, &keys)?;
    let model = cx.required(&fields, "model", what, "P200");
    let model = model.and_then(|node| {
        cx.reference(node, format_args!("`model` of {what}"), Referent::PumpModel)
    });
    let elevation = fields.get("elevation").map(|node| {
        cx.quantity(
            node,
            format_args!("`elevation` of {what}"),
            Kind::Length,
            Bound::Any,
        )
    });
    let speed = fields.get("speed").map(|node| {
        let value = cx.speed(node, format_args!("`speed` of {what}"))?;
        Some(Placed {
            value,
            place: node.place,
        })
    });
    let impeller = fields.get("impeller").map(|node| {
        let label = format!("`impeller` of {what}");
        Some(Placed {
            value: cx.quantity(node, &label, Kind::Bore, Bound::Positive)?,
            place: node.place,
        })
    });
    let wear = match fields.get("wear") {
        Some(node) => cx.quantity(
            node,
            format_args!("`wear` of {what}"),
            Kind::Percent,
            Bound::ShareBelowOne,
        ),
        None => Some(0.0),
    };
    let leakage = fields.get("leakage").map(|node| {
        let label = format!("`leakage` of {what}");
        Some(Placed {
            value: cx.quantity(node, &label, Kind::Percent, Bound::ShareBelowOne)?,
            place: node.place,
        })
    });
    let running = match fields.get("running") {
        Some(node) => cx.boolean(node, format_args!("`running` of {what}")),
        None => Some(true),
    };
    let name = fields.get("name").map(|node| {
        let value = cx.text(node, format_args!("`name` of {what}"))?;
        super::names::check(
            cx,
            &Key {
                name: value.clone(),
                place: node.place,
            },
            "pump",
        );
        Some(Placed {
            value,
            place: node.place,
        })
    });
    let when_stopped = match fields.get("when_stopped") {
        None => None,
        Some(node) => {
            let what = format!("`when_stopped` of {what}");
            let fields = cx.map(node, &what, &["k", "kv", "cv", "bore"]);
            Some(fields.and_then(|fields| valve_loss(cx, site, &fields, &what)))
        }
    };
    // A key that was given and could not be read spoils the pump: `?` on the inner option of each.
    Some(PumpSpec {
        name: transposed(name)?,
        model: model?,
        elevation: transposed(elevation)?,
        speed: transposed(speed)?,
        impeller: transposed(impeller)?,
        wear: wear?,
        leakage: transposed(leakage)?,
        running: running?,
        when_stopped: transposed(when_stopped)?,
    })
}

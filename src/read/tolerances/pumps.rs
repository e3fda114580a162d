//! `pumps` of `tolerances`: how far pumps as built may be from their sheets.

use super::{ActsOn, Tolerance, Tolerances, each, shape, spread};
use crate::diagnostic::Diagnostic;
use crate::network::{Figure, Network, Shape, Spread};
use crate::part::{PumpId, grades};
use crate::read::context::{Bound, Context, Fields, found};
use crate::read::known::Known;
use crate::read::yaml::{Form, Marked};
use crate::units::Kind;

type ToFigure = fn(PumpId) -> Figure;

/// What of a pump as built can vary: the key, and its figure.
const OF_PUMPS: [(&str, ToFigure); 3] = [
    ("head", Figure::BuiltHead),
    ("flow", Figure::BuiltFlow),
    ("efficiency", Figure::BuiltEfficiency),
];

/// `pumps: {grade, head, flow, efficiency, of, shape, limits_at, vary}`.
pub(super) fn pumps(cx: &mut Context, node: &Marked, network: &Network, all: &mut Tolerances) {
    let what = "`pumps` of `tolerances`";
    let keys = [
        "grade",
        "head",
        "flow",
        "efficiency",
        "of",
        "shape",
        "limits_at",
        "vary",
    ];
    let Some(fields) = cx.map(node, what, &keys) else {
        return;
    };
    all.graded |= fields.has("grade");
    let shape = shape(cx, &fields, what);
    let each = each(cx, &fields, what, true);
    let groups = match fields.get("of") {
        None => Some(vec![("pumps".to_owned(), network.pump_ids().collect())]),
        Some(node) => named(cx, node, network),
    };
    let Some(limits) = limits_of_pumps(cx, &fields, what) else {
        return;
    };
    let (Some(shape), Some(each), Some(groups)) = (shape, each, groups) else {
        return;
    };
    if shape == Shape::LogEven {
        let message = format!("{what} cannot be even in the logarithm");
        cx.push(
            Diagnostic::error("out-of-range", fields.key_place("shape"), message)
                .help("it can be `even`, `normal`"),
        );
        return;
    }
    let units: Vec<(String, Vec<PumpId>)> = if each {
        let pumps = groups.into_iter().flat_map(|(_, pumps)| pumps);
        pumps
            .map(|id| (network.pump(id).name.clone(), vec![id]))
            .collect()
    } else {
        groups
    };
    for (name, ids) in units {
        for ((key, figure), limits) in OF_PUMPS.iter().zip(limits) {
            let Some((low, high)) = limits else { continue };
            let spread = Spread {
                low: 100.0 * low,
                high: 100.0 * high,
                shape,
            };
            all.inputs.push(Tolerance {
                name: format!("{name} {key}"),
                unit: "%",
                spread,
                place: fields.place,
                acts_on: ActsOn::Built(ids.iter().map(|id| figure(*id)).collect()),
            });
        }
    }
}

/// The pumps, banks or lines named.
fn named(cx: &mut Context, node: &Marked, network: &Network) -> Option<Vec<(String, Vec<PumpId>)>> {
    let items = match &node.value {
        Form::List(items) => items.as_slice(),
        _ => std::slice::from_ref(node),
    };
    let names = Known {
        network,
        schedules: &[],
        unread: &[],
    };
    let what = "`of` of `pumps`";
    let each = items
        .iter()
        .map(|item| Some((cx.text(item, what)?, names.pumps(cx, item, what)?)));
    each.collect()
}

/// Lowest and highest share for head, flow and efficiency, each if it varies.
fn limits_of_pumps(
    cx: &mut Context,
    fields: &Fields,
    what: &str,
) -> Option<[Option<(f64, f64)>; 3]> {
    let mut limits = [None; 3];
    if let Some(node) = fields.get("grade") {
        let name = cx.text(node, format_args!("`grade` of {what}"))?;
        let Some(grade) = grades::grade(&name) else {
            let message = format!("no grade is called `{name}`");
            let known: Vec<&str> = grades::TABLE.iter().map(|grade| grade.name).collect();
            let help = match grades::nearest(&name) {
                Some(near) => format!("did you mean `{near}`? Grades are {}", known.join(", ")),
                None => format!("grades are {}", known.join(", ")),
            };
            cx.push(Diagnostic::error("unknown-name", node.place, message).help(help));
            return None;
        };
        let down = (grade.efficiency < 0.0).then_some((grade.efficiency, 0.0));
        limits = [Some(grade.head), Some(grade.flow), down];
    }
    for ((key, _), limit) in OF_PUMPS.iter().zip(&mut limits) {
        if let Some(node) = fields.get(key) {
            *limit = Some(share(cx, node, &format!("`{key}` of {what}"))?);
        }
    }
    if limits.iter().all(Option::is_none) {
        let message = format!("{what} says nothing that varies");
        let help = "add for example `grade: 2B`, or `head: 5 %`";
        cx.push(Diagnostic::error("missing-key", fields.place, message).help(help));
        return None;
    }
    Some(limits)
}

/// `5 %`, which is as much down as up, or `{from: -2 %, to: 5 %}`.
fn share(cx: &mut Context, node: &Marked, what: &str) -> Option<(f64, f64)> {
    let Form::Map(_) = node.value else {
        let size = percentage(cx, node, what)?;
        if size > 0.0 {
            return Some((-size, size));
        }
        let message = format!("{what} must be above zero, found {}", found(node));
        cx.error("out-of-range", node.place, message);
        return None;
    };
    let fields = cx.map(node, what, &["from", "to"])?;
    let from = cx.required(&fields, "from", what, "-2 %");
    let to = cx.required(&fields, "to", what, "5 %");
    let low = from.and_then(|node| percentage(cx, node, &format!("`from` of {what}")));
    let high = to.and_then(|node| percentage(cx, node, &format!("`to` of {what}")));
    let limits = (low?, high?);
    spread(cx, limits, Shape::Even, from?, to?, what).map(|_| limits)
}

fn percentage(cx: &mut Context, node: &Marked, what: &str) -> Option<f64> {
    let value = cx.quantity(node, what, Kind::Percent, Bound::Any)?;
    if value.abs() < 1.0 {
        return Some(value);
    }
    let message = format!("{what} must be below 100 %, found {}", found(node));
    let help = "a tolerance says how far a pump may be from its sheet";
    cx.push(Diagnostic::error("out-of-range", node.place, message).help(help));
    None
}

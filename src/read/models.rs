//! `pump_models`: curves from columns, from a CSV file or from a polynomial.

use super::context::{Bound, Context, Fields, found};
use super::limits::MAKER_KEYS;
use super::scaling;
use super::spec::{ModelSpec, SiteSpec};
use super::table::{self, Load};
use super::yaml::{Form, Key, Marked};
use crate::diagnostic::{Diagnostic, Place};
use crate::part::curve::{Curve, Polynomial};
use crate::part::pump::performance::Scaling;
use crate::part::pump::{Efficiency, Motor, PowerCurve};
use crate::units::{Kind, SpeedValue};

const MODEL_KEYS: [&str; 11] = [
    "speed",
    "impeller",
    "curve",
    "head_polynomial",
    "flow_limit",
    "motor",
    "drive",
    MAKER_KEYS[0],
    MAKER_KEYS[1],
    MAKER_KEYS[2],
    MAKER_KEYS[3],
];
/// Columns of a curve, what they are, and the range their figures must lie in.
pub(super) const COLUMNS: [(&str, Kind, Bound); 5] = [
    ("flow", Kind::Flow, Bound::NotNegative),
    ("head", Kind::Length, Bound::Any),
    ("efficiency", Kind::Percent, Bound::Share),
    ("power", Kind::Power, Bound::NotNegative),
    ("npsh_required", Kind::Length, Bound::NotNegative),
];

/// The columns of a curve in SI; `columns[i]` is that of `COLUMNS[i]`.
#[derive(Default)]
pub(super) struct Columns {
    pub columns: [Option<Vec<f64>>; 5],
    pub places: [Place; 5],
}

pub(super) fn models(
    cx: &mut Context,
    site: &SiteSpec,
    node: &Marked,
    load: Load,
) -> Vec<ModelSpec> {
    let Some(fields) = cx.any_map(node, "`pump_models`", "NAME: {curve: {..}}") else {
        return Vec::new();
    };
    fields
        .entries()
        .iter()
        .filter_map(|(key, value)| model(cx, site, key, value, load))
        .collect()
}

fn model(
    cx: &mut Context,
    site: &SiteSpec,
    key: &Key,
    node: &Marked,
    load: Load,
) -> Option<ModelSpec> {
    super::names::check(cx, key, "pump model");
    let what = format!("pump model `{}`", key.name);
    let keys: Vec<&str> = MODEL_KEYS.into_iter().chain(scaling::KEYS).collect();
    let fields = cx.map(node, &what, &keys)?;
    let speed = fields.get("speed").map(|node| speed(cx, node, &what));
    let impeller = fields.get("impeller").map(|node| {
        cx.quantity(
            node,
            format_args!("`impeller` of {what}"),
            Kind::Bore,
            Bound::Positive,
        )
    });
    let motor = fields.get("motor").map(|node| motor(cx, node, &what));
    let drive = fields.get("drive").map(|node| drive(cx, node, &what));
    let maker = super::limits::maker(cx, &fields, &what);
    let columns = match fields.get("curve") {
        Some(node) => read_columns(cx, node, &what, load),
        None => Some(Columns::default()),
    };
    let head = match (fields.get("head_polynomial"), columns.as_ref()) {
        (Some(node), Some(columns)) => polynomial(cx, &fields, node, &what, columns),
        (None, Some(columns)) => head_through_points(cx, &fields, columns, &what),
        (_, None) => None,
    };
    let columns = columns?;
    let power = power(cx, &columns, &what);
    let npsh_required = through(cx, &columns, 4, &what);
    let head = head?;
    judge_head(
        cx,
        &head,
        fields.get("curve").or(fields.get("head_polynomial"))?.place,
        &what,
    );
    let best_efficiency_flow = best_efficiency_flow(&columns, &head, site);
    let mut model = ModelSpec {
        name: key.name.clone(),
        speed: speed.flatten(),
        impeller: impeller.flatten(),
        head,
        power: power?,
        npsh_required: npsh_required?,
        best_efficiency_flow,
        motor: motor.flatten(),
        drive: drive.flatten(),
        maker,
        scaling: Scaling::default(),
    };
    model.scaling = scaling::scaling(cx, site, &fields, &model, key.place)?;
    Some(model)
}

fn speed(cx: &mut Context, node: &Marked, what: &str) -> Option<f64> {
    let label = format!("`speed` of {what}");
    match cx.speed(node, &label)? {
        SpeedValue::Rpm(rpm) => Some(rpm / 60.0),
        SpeedValue::Ratio(_) => {
            let message = format!("{label} must be in rpm, found {}", found(node));
            let help = "the speed at which the curve holds, for example `speed: 1480 rpm`";
            cx.push(Diagnostic::error("wrong-unit", node.place, message).help(help));
            None
        }
    }
}

/// A drive: `{efficiency: 97 %}`, or over the speed.
fn drive(cx: &mut Context, node: &Marked, what: &str) -> Option<Efficiency> {
    let what = format!("the drive of {what}");
    let fields = cx.map(node, &what, &["efficiency"])?;
    let node = cx.required(&fields, "efficiency", &what, "97 %")?;
    efficiency(cx, node, &what, "speed")
}

/// One per cent, or a map of two lists: over the `ratio` (load or speed, in per cent).
fn efficiency(cx: &mut Context, node: &Marked, what: &str, ratio: &str) -> Option<Efficiency> {
    let label = format!("`efficiency` of {what}");
    if !matches!(node.value, Form::Map(_)) {
        let value = cx.quantity(node, &label, Kind::Percent, Bound::Share)?;
        return usable(cx, node, &label, value).map(Efficiency::Fixed);
    }
    let fields = cx.map(node, &label, &[ratio, "efficiency"])?;
    let mut column = |key: &str, example: &str, bound| {
        let list = cx.required(&fields, key, &label, example)?;
        let label = format!("`{key}` in the efficiency of {what}");
        let items = cx.list(list, &label, example)?;
        let values: Vec<Option<f64>> = items
            .iter()
            .map(|item| cx.quantity(item, &label, Kind::Percent, bound))
            .collect();
        values.into_iter().collect::<Option<Vec<f64>>>()
    };
    let ratios = column(ratio, "[25, 50, 100]", Bound::NotNegative);
    let values = column("efficiency", "[88, 92, 93]", Bound::Share);
    let (ratios, values) = (ratios?, values?);
    let lowest = values.iter().copied().fold(1.0, f64::min);
    usable(cx, node, &label, lowest)?;
    match Curve::through(&ratios, &values) {
        Ok(curve) => Some(Efficiency::Over(curve)),
        Err(why) => {
            let message = format!("{label} makes no curve: {why}");
            let help =
                format!("`{ratio}` must rise from point to point, with one efficiency for each");
            cx.push(Diagnostic::error("curve", node.place, message).help(help));
            None
        }
    }
}

/// An efficiency above zero; one that looks like a fraction draws a caution.
fn usable(cx: &mut Context, node: &Marked, label: &str, value: f64) -> Option<f64> {
    if value == 0.0 {
        let message = format!("{label} must be above zero, found {}", found(node));
        cx.error("out-of-range", node.place, message);
        return None;
    }
    if value <= 0.01 {
        let message = format!("{label} is {}", cx.units.format(Kind::Percent, value));
        let help = "a bare number is in per cent: write 93 for 93 %";
        cx.push(Diagnostic::caution("efficiency-fraction", node.place, message).help(help));
    }
    Some(value)
}

fn motor(cx: &mut Context, node: &Marked, what: &str) -> Option<Motor> {
    let what = format!("the motor of {what}");
    let fields = cx.map(node, &what, &["rated", "efficiency"])?;
    let rated = cx.required(&fields, "rated", &what, "22 kW");
    let rated = rated.and_then(|node| {
        let label = format!("`rated` of {what}");
        cx.quantity(node, &label, Kind::Power, Bound::Positive)
    });
    let efficiency = match fields.get("efficiency") {
        None => None,
        Some(node) => Some(efficiency(cx, node, &what, "load")?),
    };
    Some(Motor {
        rated: rated?,
        efficiency,
    })
}

fn read_columns(cx: &mut Context, node: &Marked, what: &str, load: Load) -> Option<Columns> {
    let names: Vec<&str> = COLUMNS.iter().map(|(name, ..)| *name).collect();
    let keys: Vec<&str> = names.iter().copied().chain(["file"]).collect();
    let fields = cx.map(node, &format!("`curve` of {what}"), &keys)?;
    let columns = match fields.get("file") {
        Some(file) => {
            if let Some(other) = names.iter().find(|name| fields.has(name)) {
                let message = format!("`file` gives the columns; `{other}` cannot stand beside it");
                let help = "keep `file`, or give all columns here";
                let place = fields.key_place(other);
                cx.push(Diagnostic::error("both-keys", place, message).help(help));
            }
            table::read(cx, file, what, load)?
        }
        None => listed_columns(cx, &fields, what)?,
    };
    if columns.columns[0].is_none() {
        if !fields.is_misspelt("flow") {
            let message = format!("the curve of {what} needs a column `flow`");
            let help = match fields.has("file") {
                true => "its heading is for example `flow [m3/h]`",
                false => "add for example `flow: [0, 60, 120, 180]`",
            };
            cx.push(Diagnostic::error("missing-key", node.place, message).help(help));
        }
        return None;
    }
    let flows = columns.columns[0].as_deref().unwrap_or_default();
    if let Some(i) = (1..flows.len()).find(|&i| flows[i] <= flows[i - 1]) {
        let message = format!(
            "`flow` of {what} must rise from point to point: number {} is {} after {}",
            i + 1,
            cx.units.format(Kind::Flow, flows[i]),
            cx.units.format(Kind::Flow, flows[i - 1])
        );
        let help = "put the points in the order of their flows, each flow once";
        cx.push(Diagnostic::error("curve", columns.places[0], message).help(help));
        return None;
    }
    check_efficiency(cx, &columns, what);
    if keys.iter().any(|key| fields.is_misspelt(key)) {
        return None;
    }
    Some(columns)
}

fn listed_columns(cx: &mut Context, fields: &Fields, what: &str) -> Option<Columns> {
    let mut columns = Columns::default();
    let mut whole = true;
    for (i, (name, kind, bound)) in COLUMNS.into_iter().enumerate() {
        let Some(node) = fields.get(name) else {
            continue;
        };
        columns.places[i] = node.place;
        let label = format!("`{name}` of {what}");
        let Some(items) = cx.list(node, &label, &format!("{name}: [0, 60, 120]")) else {
            whole = false;
            continue;
        };
        let values: Option<Vec<f64>> = items
            .iter()
            .map(|item| cx.quantity(item, &label, kind, bound))
            .collect();
        whole &= values.is_some();
        columns.columns[i] = values;
    }
    whole.then_some(columns)
}

/// A fraction written for a per cent.
fn check_efficiency(cx: &mut Context, columns: &Columns, what: &str) {
    let Some(values) = &columns.columns[2] else {
        return;
    };
    let highest = values.iter().copied().fold(0.0, f64::max);
    if highest > 0.0 && highest <= 0.01 {
        let message = format!("the efficiency of {what} never passes 1 %");
        let help = "a bare number is in per cent: write 75 for 75 %";
        cx.push(Diagnostic::caution("efficiency-fraction", columns.places[2], message).help(help));
    }
}

/// One column over flow.
fn through(cx: &mut Context, columns: &Columns, i: usize, what: &str) -> Option<Option<Curve>> {
    let Some(values) = &columns.columns[i] else {
        return Some(None);
    };
    let flows = columns.columns[0].as_deref().unwrap_or_default();
    match Curve::through(flows, values) {
        Ok(curve) => Some(Some(curve)),
        Err(why) => {
            let place = match why {
                crate::part::curve::CurveError::NotRising { .. } => columns.places[0],
                _ => columns.places[i],
            };
            let message = format!("`{}` of {what} makes no curve: {why}", COLUMNS[i].0);
            let help = "a column has one figure for each flow, and a curve two points or more";
            cx.push(Diagnostic::error("curve", place, message).help(help));
            None
        }
    }
}

fn head_through_points(
    cx: &mut Context,
    fields: &Fields,
    columns: &Columns,
    what: &str,
) -> Option<Curve> {
    if let Some(limit) = fields.get("flow_limit") {
        let message = format!("`flow_limit` of {what} goes with `head_polynomial` only");
        let help = "a curve by points ends at its last flow";
        cx.push(Diagnostic::error("both-keys", limit.place, message).help(help));
    }
    if columns.columns[1].is_none() {
        if ["curve", "head_polynomial"]
            .iter()
            .any(|key| fields.is_misspelt(key))
        {
            return None;
        }
        let message = format!("{what} needs a head curve");
        let help = "add `curve: {flow: [..], head: [..]}`, or `head_polynomial` and `flow_limit`";
        cx.push(Diagnostic::error("missing-key", fields.place, message).help(help));
        return None;
    }
    through(cx, columns, 1, what).flatten()
}

fn polynomial(
    cx: &mut Context,
    fields: &Fields,
    node: &Marked,
    what: &str,
    columns: &Columns,
) -> Option<Curve> {
    if columns.columns[1].is_some() {
        let message =
            format!("give the head of {what} by points or by `head_polynomial`, not both");
        let help = "keep one of the two";
        cx.push(Diagnostic::error("both-keys", columns.places[1], message).help(help));
    }
    let limit = cx.required(fields, "flow_limit", what, "240 m3/h");
    let limit = limit.and_then(|node| {
        cx.quantity(
            node,
            format_args!("`flow_limit` of {what}"),
            Kind::Flow,
            Bound::Positive,
        )
    });
    let label = format!("`head_polynomial` of {what}");
    let items = cx.list(node, &label, "[42, 0, -0.00035]")?;
    if items.len() > 10 {
        let message = format!(
            "{label} must have at most 10 coefficients, found {}",
            items.len()
        );
        let help = "give the head by points: `curve: {flow: [..], head: [..]}`";
        cx.push(Diagnostic::error("out-of-range", node.place, message).help(help));
        return None;
    }
    // head = a + b q + c q2 in the file's units; to SI: a_i x (unit of head) / (unit of flow)^i
    let (head, flow) = (
        cx.units.unit(Kind::Length).factor,
        cx.units.unit(Kind::Flow).factor,
    );
    let coefficients: Option<Vec<f64>> = items
        .iter()
        .enumerate()
        .map(|(i, item)| Some(cx.number(item, &label, Bound::Any)? * head / flow.powi(i as i32)))
        .collect();
    match Polynomial::new(&coefficients?, limit?) {
        Ok(polynomial) => Some(Curve::Polynomial(polynomial)),
        Err(why) => {
            let message = format!("{label} makes no curve: {why}");
            let help = "coefficients are in the file's units of head and flow, the constant first";
            cx.push(Diagnostic::error("curve", node.place, message).help(help));
            None
        }
    }
}

fn power(cx: &mut Context, columns: &Columns, what: &str) -> Option<PowerCurve> {
    if columns.columns[2].is_some() && columns.columns[3].is_some() {
        let message = format!("the curve of {what} has both `efficiency` and `power`");
        let help =
            "one follows from the other and the head: keep the one that the data sheet states";
        cx.push(Diagnostic::error("both-keys", columns.places[3], message).help(help));
        return None;
    }
    let efficiency = through(cx, columns, 2, what)?;
    let power = through(cx, columns, 3, what)?;
    Some(match (efficiency, power) {
        (Some(curve), _) => PowerCurve::Efficiency(curve),
        (None, Some(curve)) => PowerCurve::Shaft(curve),
        (None, None) => PowerCurve::Unknown,
    })
}

/// A head curve that droops is named; one that ends rising cannot be used.
fn judge_head(cx: &mut Context, head: &Curve, place: Place, what: &str) {
    let (_, end) = head.domain();
    let stretches = head.rising_stretches();
    let flow = |q: f64| cx.units.format(Kind::Flow, q);
    if stretches.iter().any(|stretch| stretch.1 >= end) || head.at(end).slope > 0.0 {
        let message = format!(
            "the head of {what} still rises at its last flow, {}",
            flow(end)
        );
        let help = "head must fall towards the end of the curve; give it further, or check the order of the points";
        cx.push(Diagnostic::error("head-rises", place, message).help(help));
    } else if let (Some(first), Some(last)) = (stretches.first(), stretches.last()) {
        let message = format!(
            "the head curve of {what} droops: head rises with flow from {} to {}",
            flow(first.0),
            flow(last.1)
        );
        let help =
            "below its peak two flows give the same head, and parallel pumps may hunt between them";
        cx.push(Diagnostic::caution("drooping-curve", place, message).help(help));
    }
    if head.at(0.0).value <= 0.0 {
        let message = format!(
            "the head of {what} at no flow must be above zero, found {}",
            cx.units.format(Kind::Length, head.at(0.0).value)
        );
        cx.error("out-of-range", place, message);
    }
}

/// Flow of the highest efficiency among the points; from the power column where that stands in its place.
fn best_efficiency_flow(columns: &Columns, head: &Curve, site: &SiteSpec) -> Option<f64> {
    let flows = columns.columns[0].as_deref()?;
    let efficiency: Vec<f64> = match (&columns.columns[2], &columns.columns[3]) {
        (Some(values), _) => values.clone(),
        (None, Some(powers)) => {
            // E = 1000 g q H / P, as data sheets state power
            let each = flows.iter().zip(powers);
            each.map(|(q, p)| {
                if *p > 0.0 {
                    1000.0 * site.gravity * q * head.at(*q).value / p
                } else {
                    0.0
                }
            })
            .collect()
        }
        (None, None) => return None,
    };
    let best = (0..flows.len().min(efficiency.len()))
        .max_by(|a, b| efficiency[*a].total_cmp(&efficiency[*b]))?;
    (efficiency[best] > 0.0 && flows[best] > 0.0).then_some(flows[best])
}

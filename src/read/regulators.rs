//! Parts that throttle themselves: what they hold, and their loss when wide open.

use super::context::{Bound, Context};
use super::parts::valve_loss;
use super::spec::{Placed, RegulatesSpec, RegulatorSpec, SiteSpec};
use super::yaml::Marked;
use crate::units::Kind;

pub(super) fn regulator(
    cx: &mut Context,
    site: &SiteSpec,
    line: &str,
    word: &str,
    node: &Marked,
) -> Option<RegulatorSpec> {
    let what = format!("the `{word}` of {line}");
    let keys: &[&str] = match word {
        "hold_downstream" | "hold_upstream" => &["pressure", "k", "kv", "cv", "bore", "open"],
        "limit_flow" => &["flow", "k", "kv", "cv", "bore", "open"],
        _ => &["pump", "flow", "k", "kv", "cv", "bore", "open"],
    };
    let fields = cx.map(node, &what, keys)?;
    let (key, kind, bound, example) = match word {
        "hold_downstream" | "hold_upstream" => ("pressure", Kind::Pressure, Bound::Any, "4 bar"),
        _ => ("flow", Kind::Flow, Bound::Positive, "40 m3/h"),
    };
    let set = cx.required(&fields, key, &what, example).and_then(|node| {
        let value = cx.quantity(node, format_args!("`{key}` of {what}"), kind, bound)?;
        Some(Placed {
            value,
            place: node.place,
        })
    });
    let open = match fields.get("open") {
        Some(node) => cx.boolean(node, format_args!("`open` of {what}")),
        None => Some(true),
    };
    let loss = valve_loss(cx, site, &fields, &what);
    let regulates = match word {
        "hold_downstream" => RegulatesSpec::Downstream,
        "hold_upstream" => RegulatesSpec::Upstream,
        "limit_flow" => RegulatesSpec::Flow,
        _ => {
            let node = cx.required(&fields, "pump", &what, "duty.1")?;
            RegulatesSpec::MinimumFlow(Placed {
                value: cx.text(node, format_args!("`pump` of {what}"))?,
                place: node.place,
            })
        }
    };
    Some(RegulatorSpec {
        regulates,
        loss: loss?,
        set: set?,
        open: open?,
    })
}

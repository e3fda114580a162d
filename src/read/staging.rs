//! `staging`: plans, each a list of groups with their rules.

use super::context::{Bound, Context, Fields, found, scalar_text};
use super::known::Known;
use super::over_time::daily;
use super::yaml::Marked;
use crate::diagnostic::{Diagnostic, Place};
use crate::network::{LineId, Network, NodeKind};
use crate::part::PumpId;
use crate::shift::{
    Bands, Call, Exercise, Follow, Group, Hold, HoldStyle, Plan, Rotate, Step, Trip, Window,
};
use crate::units::Kind;

const GROUP_KEYS: [&str; 17] = [
    "name",
    "pumps",
    "follow",
    "steps",
    "windows",
    "clock",
    "hold",
    "begins_with",
    "rotate",
    "min_run",
    "min_rest",
    "stagger",
    "max_starts_per_hour",
    "up_delay",
    "down_delay",
    "exercise",
    "restart_after",
];

/// All plans with their places; `trips` stand in all of them.
pub(super) fn plans(
    cx: &mut Context,
    names: &Known,
    node: &Marked,
    trips: &[Trip],
) -> Vec<(Plan, Place)> {
    let example = "PLAN: [{pumps: [..], follow: {level: TANK}, steps: [..]}]";
    let Some(fields) = cx.any_map(node, "`staging`", example) else {
        return Vec::new();
    };
    let mut plans = Vec::new();
    for (key, value) in fields.entries() {
        super::names::check_label(cx, key, "plan");
        let what = format!("plan `{}`", key.name);
        let Some(items) = cx.list(value, &what, "[{pumps: [..], follow: .., steps: [..]}]") else {
            continue;
        };
        let mut plan = Plan {
            name: key.name.clone(),
            groups: Vec::new(),
            trips: trips.to_vec(),
            restart_after: 0.0,
        };
        for item in items {
            if let Some((group, restart_after)) = group(cx, names, item, &what) {
                plan.restart_after = plan.restart_after.max(restart_after);
                plan.groups.push(group);
            }
        }
        plans.push((plan, key.place));
    }
    plans
}

/// One group, and how long after a power failure it may start.
fn group(cx: &mut Context, names: &Known, node: &Marked, plan: &str) -> Option<(Group, f64)> {
    let what = format!("a group of {plan}");
    let fields = cx.map(node, &what, &GROUP_KEYS)?;
    let pumps_node = cx.required(&fields, "pumps", &what, "[duty.1, duty.2]")?;
    let pumps = pumps(cx, names, pumps_node, &format!("`pumps` of {what}"))?;
    let name = match fields.get("name") {
        Some(node) => cx.text(node, &format!("`name` of {what}"))?,
        None => group_name(names.network, &pumps),
    };
    let kinds = ["follow", "clock", "hold"];
    let given: Vec<&str> = kinds.into_iter().filter(|key| fields.has(key)).collect();
    let call = match given.as_slice() {
        ["follow"] => bands(cx, names, &fields, &what, &pumps, pumps_node)?,
        ["clock"] => {
            let node = fields.get("clock")?;
            Call::Clock(names.schedule(cx, node, &format!("`clock` of {what}"))?)
        }
        ["hold"] => hold(cx, names, fields.get("hold")?, &what, &pumps)?,
        _ => {
            let message = format!("{what} does not say what calls its pumps");
            let help = format!("give one of `{}`", kinds.join("`, `"));
            cx.push(Diagnostic::error("missing-key", fields.place, message).help(help));
            return None;
        }
    };
    if !fields.has("follow") {
        for key in ["steps", "windows"] {
            if fields.has(key) {
                let message = format!("`{key}` of {what} goes with `follow` only");
                let place = fields.key_place(key);
                let help = "remove it, or give `follow`";
                cx.push(Diagnostic::error("stray-key", place, message).help(help));
            }
        }
    }
    let mut group = Group::new(name, pumps, call);
    let mut span = |key: &str| match fields.get(key) {
        Some(node) => cx.quantity(
            node,
            &format!("`{key}` of {what}"),
            Kind::Time,
            Bound::NotNegative,
        ),
        None => Some(0.0),
    };
    let times = ["min_run", "min_rest", "stagger", "restart_after"].map(&mut span);
    [group.min_run, group.min_rest, group.stagger] = [times[0]?, times[1]?, times[2]?];
    group.begins_with = count(cx, &fields, "begins_with", &what)?;
    group.max_starts_per_hour = count(cx, &fields, "max_starts_per_hour", &what)?;
    group.rotate = rotate(cx, &fields, &what)?;
    if let Some(node) = fields.get("exercise") {
        let what = format!("`exercise` of {what}");
        let fields = cx.map(node, &what, &["every", "lasts"])?;
        let mut span = |key: &str, example: &str| {
            let node = cx.required(&fields, key, &what, example)?;
            cx.quantity(
                node,
                &format!("`{key}` of {what}"),
                Kind::Time,
                Bound::Positive,
            )
        };
        let (every, lasts) = (span("every", "7 d"), span("lasts", "10 min"));
        group.exercise = Some(Exercise {
            every: every?,
            lasts: lasts?,
        });
    }
    Some((group, times[3]?))
}

/// The bank that all pumps of a group stand in, or its first pump.
fn group_name(network: &Network, pumps: &[PumpId]) -> String {
    let lines: Vec<LineId> = pumps.iter().map(|pump| network.line_of(*pump)).collect();
    let bank = network
        .banks()
        .iter()
        .find(|bank| lines.iter().all(|line| bank.lines.contains(line)));
    match (bank, pumps.first()) {
        (Some(bank), _) => bank.name.clone(),
        (None, Some(first)) => network.pump(*first).name.clone(),
        (None, None) => String::new(),
    }
}

fn pumps(cx: &mut Context, names: &Known, node: &Marked, what: &str) -> Option<Vec<PumpId>> {
    let mut found: Vec<PumpId> = Vec::new();
    for item in cx.list(node, what, "[duty.1, duty.2]")? {
        for pump in names.pumps(cx, item, what)? {
            if found.contains(&pump) {
                let message = format!("{what} name `{}` twice", names.network.pump(pump).name);
                let help = "a bank's name stands for all its pumps; name each once";
                cx.push(Diagnostic::error("name-twice", item.place, message).help(help));
                return None;
            }
            found.push(pump);
        }
    }
    Some(found)
}

fn count(cx: &mut Context, fields: &Fields, key: &str, what: &str) -> Option<Option<usize>> {
    let Some(node) = fields.get(key) else {
        return Some(None);
    };
    let number = cx.number(node, &format!("`{key}` of {what}"), Bound::NotNegative)?;
    if number.fract() != 0.0 || number > 1e6 {
        cx.error(
            "wrong-form",
            node.place,
            format!("`{key}` of {what} must be a whole number"),
        );
        return None;
    }
    Some(Some(number as usize))
}

fn rotate(cx: &mut Context, fields: &Fields, what: &str) -> Option<Rotate> {
    let Some(node) = fields.get("rotate") else {
        return Some(Rotate::Never);
    };
    match scalar_text(node) {
        Some("never") => Some(Rotate::Never),
        Some("each_start") => Some(Rotate::EachStart),
        Some("least_hours") => Some(Rotate::LeastHours),
        _ => {
            let message = format!("`rotate` of {what} is {}", found(node));
            let help = "it is `never`, `each_start` or `least_hours`";
            cx.push(Diagnostic::error("wrong-word", node.place, message).help(help));
            None
        }
    }
}

/// `{level: TANK}`, `{pressure: NODE}` or `{flow: LINE}` among the keys of a map, and the kind of its figures.
fn follow(cx: &mut Context, names: &Known, fields: &Fields, what: &str) -> Option<(Follow, Kind)> {
    let keys = ["level", "pressure", "flow"];
    let given: Vec<&str> = keys.into_iter().filter(|key| fields.has(key)).collect();
    let &[key] = given.as_slice() else {
        let help = "write `{level: TANK}`, `{pressure: NODE}` or `{flow: LINE}`";
        let message = format!("{what} must look at one thing");
        cx.push(Diagnostic::error("missing-key", fields.place, message).help(help));
        return None;
    };
    let node = fields.get(key)?;
    let named = format!("`{key}` of {what}");
    match key {
        "level" => {
            let tank = names.node(cx, node, &named)?;
            if !matches!(names.network.node(tank).kind, NodeKind::Tank { .. }) {
                let message = format!(
                    "`{}` is no tank and has no level to follow",
                    names.network.node(tank).name
                );
                let help = "follow a tank, or a `pressure` or `flow` elsewhere";
                cx.push(Diagnostic::error("no-tank", node.place, message).help(help));
                return None;
            }
            Some((Follow::Level(tank), Kind::Length))
        }
        "pressure" => Some((
            Follow::Pressure(names.node(cx, node, &named)?),
            Kind::Pressure,
        )),
        _ => match names.lines(cx, node, &named)?.as_slice() {
            [line] => Some((Follow::Flow(*line), Kind::Flow)),
            _ => {
                let message = format!("{named} is a bank; one line can be followed");
                let help = "name one member, such as `duty.1`, or the line they feed";
                cx.push(Diagnostic::error("wrong-form", node.place, message).help(help));
                None
            }
        },
    }
}

fn bands(
    cx: &mut Context,
    names: &Known,
    fields: &Fields,
    what: &str,
    pumps: &[PumpId],
    pumps_node: &Marked,
) -> Option<Call> {
    let what_follow = format!("`follow` of {what}");
    let inner = cx.map(
        fields.get("follow")?,
        &what_follow,
        &["level", "pressure", "flow"],
    )?;
    let (follow, kind) = follow(cx, names, &inner, &what_follow)?;
    let node = cx.required(fields, "steps", what, "[{start: 2.6 m, stop: 1.0 m}]")?;
    let steps = steps(cx, node, &format!("`steps` of {what}"), kind)?;
    if steps.len() > pumps.len() {
        let message = format!("{what} has {} steps but {} pumps", steps.len(), pumps.len());
        let help = "step k runs k pumps";
        cx.push(Diagnostic::error("too-few-pumps", pumps_node.place, message).help(help));
        return None;
    }
    let mut windows = Vec::new();
    if let Some(node) = fields.get("windows") {
        let example = "[{from: \"17:00\", to: \"21:00\", steps: [..]}]";
        for item in cx.list(node, &format!("`windows` of {what}"), example)? {
            let what = format!("a window of {what}");
            let fields = cx.map(item, &what, &["from", "to", "steps"])?;
            let daily = daily(cx, &fields, &what)?;
            let node = cx.required(&fields, "steps", &what, "[{start: 2.9 m, stop: 1.0 m}]")?;
            let own = self::steps(cx, node, &format!("`steps` of {what}"), kind)?;
            if own.len() != steps.len() {
                let message = format!("{what} has {} steps, the group {}", own.len(), steps.len());
                let help = "a window changes the levels of every step, not their number";
                cx.push(Diagnostic::error("steps", node.place, message).help(help));
                return None;
            }
            windows.push(Window { daily, steps: own });
        }
    }
    let mut span = |key: &str| match fields.get(key) {
        Some(node) => cx.quantity(
            node,
            &format!("`{key}` of {what}"),
            Kind::Time,
            Bound::NotNegative,
        ),
        None => Some(0.0),
    };
    let (up_delay, down_delay) = (span("up_delay"), span("down_delay"));
    Some(Call::Bands(Bands {
        follow,
        steps,
        windows,
        up_delay: up_delay?,
        down_delay: down_delay?,
    }))
}

fn steps(cx: &mut Context, node: &Marked, what: &str, kind: Kind) -> Option<Vec<Step>> {
    let mut steps: Vec<Step> = Vec::new();
    let items = cx.list(node, what, "[{start: 2.6 m, stop: 1.0 m}]")?;
    if items.is_empty() {
        let help = "write at least one `{start: 2.6 m, stop: 1.0 m}`";
        cx.push(Diagnostic::error("wrong-form", node.place, format!("{what} are none")).help(help));
        return None;
    }
    for item in items {
        let what = format!("a step in {what}");
        let fields = cx.map(item, &what, &["start", "stop"])?;
        let mut figure = |key: &str, example: &str| {
            let node = cx.required(&fields, key, &what, example)?;
            cx.quantity(node, &format!("`{key}` of {what}"), kind, Bound::Any)
        };
        let (start, stop) = (figure("start", "2.6 m"), figure("stop", "1.0 m"));
        let step = Step {
            start: start?,
            stop: stop?,
        };
        if step.start == step.stop {
            let message = format!("{what} starts and stops at the same value");
            let help = "a start above the stop empties, one below it fills; the band between keeps the pump from chattering";
            cx.push(Diagnostic::error("no-band", fields.place, message).help(help));
            return None;
        }
        if steps
            .first()
            .is_some_and(|first| first.empties() != step.empties())
        {
            let message = format!("{what} works the other way than the first");
            let help =
                "steps of a group all empty (start above stop) or all fill (start below stop)";
            cx.push(Diagnostic::error("steps", fields.place, message).help(help));
            return None;
        }
        steps.push(step);
    }
    Some(steps)
}

const HOLD_KEYS: [&str; 10] = [
    "level",
    "pressure",
    "flow",
    "at",
    "speed",
    "style",
    "up_at",
    "up_delay",
    "down_at",
    "down_delay",
];

fn hold(
    cx: &mut Context,
    names: &Known,
    node: &Marked,
    what: &str,
    pumps: &[PumpId],
) -> Option<Call> {
    let what = format!("`hold` of {what}");
    let fields = cx.map(node, &what, &HOLD_KEYS)?;
    let (figure, kind) = follow(cx, names, &fields, &what)?;
    let at = cx.required(&fields, "at", &what, "1.2 m")?;
    let at = cx.quantity(at, &format!("`at` of {what}"), kind, Bound::Any)?;
    let mut ratio = |fields: &Fields, key: &str, usual: f64| match fields.get(key) {
        Some(node) => cx.quantity(
            node,
            &format!("`{key}` of {what}"),
            Kind::Percent,
            Bound::Positive,
        ),
        None => Some(usual),
    };
    // Up at 95 to 98 % of the highest speed for 10 to 60 s: common practice, no source.
    let (up_at, down_at) = (
        ratio(&fields, "up_at", 0.97),
        ratio(&fields, "down_at", 0.93),
    );
    let speeds = match fields.get("speed") {
        Some(node) => {
            let name = format!("`speed` of {what}");
            let inner = cx.map(node, &name, &["least", "most"])?;
            let mut limit = |key: &str, usual: f64| match inner.get(key) {
                Some(node) => cx.quantity(
                    node,
                    &format!("`{key}` of {name}"),
                    Kind::Percent,
                    Bound::Positive,
                ),
                None => Some(usual),
            };
            let (least, most) = (limit("least", 0.5), limit("most", 1.0));
            (least?, most?)
        }
        None => (0.5, 1.0),
    };
    if speeds.0 > speeds.1 {
        let message = format!("{what} has a least speed above its most");
        let help = "write it for example as `{least: 60 %, most: 100 %}`";
        let place = fields.key_place("speed");
        cx.push(Diagnostic::error("out-of-range", place, message).help(help));
        return None;
    }
    let style = match fields.get("style") {
        None => HoldStyle::Common,
        Some(node) => match scalar_text(node) {
            Some("common") => HoldStyle::Common,
            Some("trim") => HoldStyle::Trim,
            _ => {
                let message = format!("`style` of {what} is {}", found(node));
                let help =
                    "it is `common` (all at one speed) or `trim` (the last called changes speed)";
                cx.push(Diagnostic::error("wrong-word", node.place, message).help(help));
                return None;
            }
        },
    };
    let mut span = |key: &str, usual: f64| match fields.get(key) {
        Some(node) => cx.quantity(
            node,
            &format!("`{key}` of {what}"),
            Kind::Time,
            Bound::NotNegative,
        ),
        None => Some(usual),
    };
    let (up_delay, down_delay) = (span("up_delay", 30.0), span("down_delay", 60.0));
    let empties = match figure {
        Follow::Level(tank) => pumps
            .iter()
            .any(|pump| names.network.line(names.network.line_of(*pump)).from == tank),
        _ => false,
    };
    Some(Call::Hold(Hold {
        figure,
        at,
        empties,
        speeds,
        style,
        up_at: up_at?,
        up_delay: up_delay?,
        down_at: down_at?,
        down_delay: down_delay?,
    }))
}

//! `shift`, `faults`, `tariff` and what flows in and out of tanks and points: everything over time but the plans.

use super::context::{Bound, Context, Fields};
use super::known::Known;
use super::schedules::{schedules, time};
use super::staging::plans;
use super::tanks;
use super::yaml::{Form, Marked};
use super::{Change, Document, Load, System, changes};
use crate::diagnostic::{Diagnostic, Diagnostics};
use crate::network::{CheckCondition, Network, NodeId};
use crate::shift::{
    Daily, Fault, FaultKind, Plan, PointDraw, Shift, Tank, Tariff, TariffWindow, Trip, Varying,
};
use crate::units::Kind;

/// J in a kWh.
const KWH: f64 = 3.6e6;

const DAY: f64 = 86_400.0;

/// What happens over time: the shift, and the plans to choose from, in the order of the file.
#[derive(Clone, Debug)]
pub struct OverTime {
    /// What happens, whatever the plan.
    pub shift: Shift,
    /// The plans by name.
    pub plans: Vec<Plan>,
}

impl Document {
    /// What the file says about time, for the system that it gives with the same changes.
    ///
    /// # Errors
    /// All problems of the sections over time.
    pub fn over_time(
        &self,
        system: &System,
        changes: &[Change],
        load: Load,
    ) -> Result<OverTime, Diagnostics> {
        let mut cx = Context::new();
        cx.units = system.units.clone();
        let read = if changes.is_empty() {
            over_time(&mut cx, &self.root, &system.network, load)
        } else {
            let mut root = self.root.clone();
            changes::apply(&mut cx, &mut root, changes);
            over_time(&mut cx, &root, &system.network, load)
        };
        let mut diagnostics = cx.diagnostics;
        diagnostics.sort();
        match read {
            Some(read) if !diagnostics.has_errors() => Ok(read),
            _ => Err(diagnostics),
        }
    }
}

fn over_time(cx: &mut Context, root: &Marked, network: &Network, load: Load) -> Option<OverTime> {
    let fields = cx.any_map(root, "a system file", "shift")?;
    let named = fields
        .get("schedules")
        .map_or_else(Vec::new, |node| schedules(cx, node, load));
    let given = match fields.get("schedules").map(|node| &node.value) {
        Some(Form::Map(entries)) => entries.iter().map(|(key, _)| key.name.clone()).collect(),
        _ => Vec::new(),
    };
    let names = Known {
        network,
        schedules: &named,
        unread: &given,
    };
    let mut shift = Shift::default();
    match cx.required(
        &fields,
        "shift",
        "a run over time",
        "{starts: \"06:00\", lasts: 8 h, report_every: 5 min}",
    ) {
        Some(node) => hours(cx, node, &mut shift),
        None => return None,
    };
    let mut trips = Vec::new();
    if let Some(nodes) = fields
        .get("nodes")
        .and_then(|node| cx.any_map(node, "`nodes`", "pond"))
    {
        for (key, node) in nodes.entries() {
            flows_of_node(cx, &names, &key.name, node, &mut shift, &mut trips);
        }
    }
    if let Some(node) = fields.get("faults") {
        faults(cx, &names, node, &mut shift);
    }
    if let Some(node) = fields.get("tariff") {
        tariff(cx, node, &mut shift);
    }
    let plans = fields
        .get("staging")
        .map_or_else(Vec::new, |node| plans(cx, &names, node, &trips));
    shift.schedules = named.into_iter().map(|named| named.schedule).collect();
    if cx.diagnostics.has_errors() {
        return None;
    }
    // What is left was not seen where it stands.
    let mut all = shift.check(network);
    for (plan, place) in &plans {
        if let Err(why) = plan.check(network, &shift) {
            let message = format!("plan `{}`: {why}", plan.name);
            let help = "each pump belongs to one group, with as many pumps as steps";
            cx.push(Diagnostic::error("staging", *place, message).help(help));
        }
    }
    if let Err(why) = std::mem::replace(&mut all, Ok(())) {
        cx.push(Diagnostic::whole("shift", why.to_string()));
    }
    Some(OverTime {
        shift,
        plans: plans.into_iter().map(|(plan, _)| plan).collect(),
    })
}

fn hours(cx: &mut Context, node: &Marked, shift: &mut Shift) -> Option<()> {
    let what = "`shift`";
    let fields = cx.map(node, what, &["starts", "lasts", "report_every"])?;
    if let Some(node) = fields.get("starts") {
        shift.starts = time(cx, node, "`starts` of `shift`")?.0;
    }
    let lasts = cx.required(&fields, "lasts", what, "8 h")?;
    shift.lasts = cx.quantity(lasts, "`lasts` of `shift`", Kind::Time, Bound::Positive)?;
    if let Some(node) = fields.get("report_every") {
        let every = cx.quantity(
            node,
            "`report_every` of `shift`",
            Kind::Time,
            Bound::Positive,
        )?;
        shift.report_every = Some(every);
    }
    Some(())
}

/// A tank with its flows, or what is drawn at a point by a schedule.
fn flows_of_node(
    cx: &mut Context,
    names: &Known,
    name: &str,
    node: &Marked,
    shift: &mut Shift,
    trips: &mut Vec<Trip>,
) -> Option<()> {
    let id = names.network.find_node(name)?;
    let outer = cx.any_map(node, &format!("node `{name}`"), "tank")?;
    let what = format!("node `{name}`");
    if let Some(inner) = outer.get("tank") {
        let fields = cx.map(inner, &what, &tanks::TANK_KEYS)?;
        let spec = tanks::tank(cx, &what, &fields)?;
        if let Some((level, reset)) = spec.trip {
            trips.push(Trip {
                tank: id,
                level,
                reset,
                pumps: pumps_from(names.network, id),
            });
        }
        shift.tanks.push(Tank {
            node: id,
            shape: spec.shape,
            brim: spec.brim,
            level: spec.level,
            gas: spec.gas,
            alarm: spec.alarm,
            inflows: flows(cx, names, &fields, "inflow", &what)?,
            draws: flows(cx, names, &fields, "draw", &what)?,
        });
    } else if let Some(inner) = outer.get("point")
        && let Form::Map(_) = inner.value
    {
        let fields = cx.any_map(inner, &what, "elevation")?;
        let draws = flows(cx, names, &fields, "draw", &what)?;
        let inflows = flows(cx, names, &fields, "inflow", &what)?;
        if draws
            .iter()
            .chain(&inflows)
            .all(|flow| flow.times.is_none())
        {
            return Some(());
        }
        let inflows = inflows.into_iter().map(|flow| Varying {
            rate: -flow.rate,
            ..flow
        });
        shift.draws.extend(
            draws
                .into_iter()
                .chain(inflows)
                .map(|draw| PointDraw { node: id, draw }),
        );
    }
    Some(())
}

/// Pumps in lines that begin at a node.
fn pumps_from(network: &Network, node: NodeId) -> Vec<crate::part::PumpId> {
    let lines = network.lines().iter().filter(|line| line.from == node);
    lines.flat_map(|line| line.pumps()).collect()
}

/// A flow, `{rate, times}`, or a list of these.
fn flows(
    cx: &mut Context,
    names: &Known,
    fields: &Fields,
    key: &str,
    what: &str,
) -> Option<Vec<Varying>> {
    let Some(node) = fields.get(key) else {
        return Some(Vec::new());
    };
    let what = format!("`{key}` of {what}");
    match &node.value {
        Form::List(items) => items
            .iter()
            .map(|item| flow(cx, names, item, &what))
            .collect(),
        _ => Some(vec![flow(cx, names, node, &what)?]),
    }
}

fn flow(cx: &mut Context, names: &Known, node: &Marked, what: &str) -> Option<Varying> {
    let Form::Map(_) = node.value else {
        let rate = cx.quantity(node, what, Kind::Flow, Bound::Any)?;
        return Some(Varying::steady(rate));
    };
    let fields = cx.map(node, what, &["rate", "times"])?;
    let times = match fields.get("times") {
        Some(node) => Some(names.schedule(cx, node, &format!("`times` of {what}"))?),
        None => None,
    };
    let is_flow = times.is_some_and(|i| names.schedules[i].is_flow);
    let rate = match fields.get("rate") {
        Some(node) if is_flow => cx.number(
            node,
            &format!("`rate` of {what}, whose schedule has a unit,"),
            Bound::Any,
        )?,
        Some(node) => cx.quantity(node, &format!("`rate` of {what}"), Kind::Flow, Bound::Any)?,
        None if is_flow => 1.0,
        None => {
            cx.required(&fields, "rate", what, "60 m3/h")?;
            return None;
        }
    };
    Some(Varying { rate, times })
}

/// A stretch of the day.
pub(super) fn daily(cx: &mut Context, fields: &Fields, what: &str) -> Option<Daily> {
    let mut edge = |key: &str, example: &str| {
        let node = cx.required(fields, key, what, example)?;
        time(cx, node, &format!("`{key}` of {what}"))
    };
    let (from, to) = (edge("from", "\"17:00\""), edge("to", "\"21:00\""));
    let (from, to) = (from?.0, to?.0);
    if from > DAY || to > DAY || from == to {
        let message = format!("{what} is no part of a day");
        let help = "`from` and `to` are two different times from \"00:00\" to \"24:00\"";
        cx.push(Diagnostic::error("out-of-range", fields.place, message).help(help));
        return None;
    }
    Some(Daily { from, to })
}

fn tariff(cx: &mut Context, node: &Marked, shift: &mut Shift) -> Option<()> {
    let what = "`tariff`";
    let fields = cx.map(node, what, &["rate", "windows", "demand_charge", "carbon"])?;
    let rate = cx.required(&fields, "rate", what, "0.18")?;
    let rate = cx.number(rate, "`rate` of `tariff` (per kWh)", Bound::Any)? / KWH;
    let mut windows = Vec::new();
    if let Some(node) = fields.get("windows") {
        let example = "[{from: \"17:00\", to: \"21:00\", rate: 0.28}]";
        for item in cx.list(node, "`windows` of `tariff`", example)? {
            let what = "a window of `tariff`";
            let fields = cx.map(item, what, &["from", "to", "rate"])?;
            let daily = daily(cx, &fields, what)?;
            let rate = cx.required(&fields, "rate", what, "0.28")?;
            let rate = cx.number(rate, &format!("`rate` of {what}"), Bound::Any)? / KWH;
            windows.push(TariffWindow { daily, rate });
        }
    }
    let mut number = |key: &str| match fields.get(key) {
        Some(node) => cx.number(node, &format!("`{key}` of `tariff`"), Bound::NotNegative),
        None => Some(0.0),
    };
    let (charge, carbon) = (number("demand_charge"), number("carbon"));
    shift.tariff = Some(Tariff {
        rate,
        windows,
        demand_charge: charge? / 1e3,
    });
    shift.carbon = Some(carbon? / KWH).filter(|_| fields.has("carbon"));
    Some(())
}

const FAULT_KEYS: [&str; 7] = [
    "at",
    "lasts",
    "trip",
    "power_out",
    "stuck_open",
    "stuck_shut",
    "fouls",
];

fn faults(cx: &mut Context, names: &Known, node: &Marked, shift: &mut Shift) -> Option<()> {
    let example = "[{at: \"10:00\", trip: PUMP, lasts: 2 h}]";
    for item in cx.list(node, "`faults`", example)? {
        if let Some(fault) = fault(cx, names, item, shift.starts) {
            shift.faults.extend(fault);
        }
    }
    Some(())
}

/// One entry; a bank's name gives one fault for each member.
fn fault(cx: &mut Context, names: &Known, node: &Marked, starts: f64) -> Option<Vec<Fault>> {
    let what = "a fault";
    let fields = cx.map(node, what, &FAULT_KEYS)?;
    let at = cx.required(&fields, "at", what, "\"10:00\"")?;
    let (at, of_day) = time(cx, at, "`at` of a fault")?;
    // A time of day before the start is that of the next day; a time span counts from the start.
    let at = match of_day {
        true if at < starts => at + DAY * ((starts - at) / DAY).ceil() - starts,
        true => at - starts,
        false => at,
    };
    let lasts = match fields.get("lasts") {
        Some(node) => Some(cx.quantity(node, "`lasts` of a fault", Kind::Time, Bound::Positive)?),
        None => None,
    };
    let given: Vec<&str> = FAULT_KEYS[2..]
        .iter()
        .copied()
        .filter(|key| fields.has(key))
        .collect();
    let &[key] = given.as_slice() else {
        let help = format!("give one of `{}`", FAULT_KEYS[2..].join("`, `"));
        cx.push(Diagnostic::error("missing-key", fields.place, "a fault is one thing").help(help));
        return None;
    };
    let node = fields.get(key)?;
    let named = format!("`{key}` of a fault");
    let kinds: Vec<FaultKind> = match key {
        "trip" => names
            .pumps(cx, node, &named)?
            .into_iter()
            .map(FaultKind::PumpOut)
            .collect(),
        "power_out" => match cx.boolean(node, &named)? {
            true => vec![FaultKind::PowerOut],
            false => Vec::new(),
        },
        "fouls" => {
            let inner = cx.map(node, &named, &["line", "loss", "flow"])?;
            let mut figure = |key: &str, example: &str, kind| {
                let node = cx.required(&inner, key, &named, example)?;
                cx.quantity(node, &format!("`{key}` of {named}"), kind, Bound::Positive)
            };
            let (loss, flow) = (
                figure("loss", "2 m", Kind::Length),
                figure("flow", "200 m3/h", Kind::Flow),
            );
            let line = cx.required(&inner, "line", &named, "NAME")?;
            let lines = names.lines(cx, line, &format!("`line` of {named}"))?;
            let (loss, flow) = (loss?, flow?);
            // h = loss (q/flow)2
            let r = loss / (flow * flow);
            lines
                .into_iter()
                .map(|line| FaultKind::Fouling(line, r))
                .collect()
        }
        _ => {
            let condition = match key {
                "stuck_open" => CheckCondition::StuckOpen,
                _ => CheckCondition::StuckShut,
            };
            let lines = names.lines(cx, node, &named)?;
            if let Some(bare) = lines
                .iter()
                .find(|line| !names.network.line(**line).has_check_valve())
            {
                let message = format!(
                    "line `{}` has no check valve to stick",
                    names.network.line(*bare).name
                );
                let help = "name a line with a `check_valve` among its parts";
                cx.push(Diagnostic::error("no-check-valve", node.place, message).help(help));
                return None;
            }
            lines
                .into_iter()
                .map(|line| FaultKind::CheckStuck(line, condition))
                .collect()
        }
    };
    Some(
        kinds
            .into_iter()
            .map(|kind| Fault { at, lasts, kind })
            .collect(),
    )
}

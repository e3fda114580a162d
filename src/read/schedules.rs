//! `schedules`: figures by the clock, and times of day.

use super::context::{Bound, Context, found, scalar_text};
use super::table::Load;
use super::yaml::Marked;
use crate::diagnostic::Diagnostic;
use crate::shift::{Between, Schedule};
use crate::units::{Kind, parse_quantity};

/// A schedule with its name.
pub(super) struct NamedSchedule {
    pub name: String,
    pub schedule: Schedule,
    /// Its values are flows in SI, not multiples of a rate.
    pub is_flow: bool,
}

/// Longest schedule, points.
const MOST_POINTS: usize = 1_000_000;

pub(super) fn schedules(cx: &mut Context, node: &Marked, load: Load) -> Vec<NamedSchedule> {
    let example = "day: {repeat: 24 h, between: steps, points: {\"06:00\": 1.1}}";
    let Some(fields) = cx.any_map(node, "`schedules`", example) else {
        return Vec::new();
    };
    let mut schedules = Vec::new();
    for (key, value) in fields.entries() {
        super::names::check(cx, key, "schedule");
        if let Some((schedule, is_flow)) = one(cx, &key.name, value, load) {
            schedules.push(NamedSchedule {
                name: key.name.clone(),
                schedule,
                is_flow,
            });
        }
    }
    schedules
}

fn one(cx: &mut Context, name: &str, node: &Marked, load: Load) -> Option<(Schedule, bool)> {
    let what = format!("schedule `{name}`");
    let fields = cx.map(node, &what, &["repeat", "between", "points", "file"])?;
    let repeat = match fields.get("repeat") {
        Some(node) => Some(cx.quantity(
            node,
            &format!("`repeat` of {what}"),
            Kind::Time,
            Bound::Positive,
        )?),
        None => None,
    };
    let between = match fields.get("between") {
        None => Between::Steps,
        Some(node) => match scalar_text(node) {
            Some("steps") => Between::Steps,
            Some("straight") => Between::Straight,
            _ => {
                let message = format!("`between` of {what} is {}", found(node));
                cx.push(
                    Diagnostic::error("wrong-word", node.place, message)
                        .help("it is `steps` or `straight`"),
                );
                return None;
            }
        },
    };
    let (points, is_flow) = match (fields.get("points"), fields.get("file")) {
        (Some(node), None) => (points(cx, &what, node)?, false),
        (None, Some(node)) => from_file(cx, &what, node, load)?,
        (Some(_), Some(node)) => {
            let message = format!("give `points` or `file` of {what}, not both");
            let help = "keep one of the two";
            cx.push(Diagnostic::error("both-keys", node.place, message).help(help));
            return None;
        }
        (None, None) => {
            cx.required(&fields, "points", &what, "{\"06:00\": 1.1, \"22:00\": 0.4}");
            return None;
        }
    };
    match Schedule::new(points, between, repeat) {
        Ok(schedule) => Some((schedule, is_flow)),
        Err(why) => {
            let message = format!("{what} cannot be used: {why}");
            let help = "its points stand in the order of time, each time once, and inside `repeat`";
            cx.push(Diagnostic::error("schedule", node.place, message).help(help));
            None
        }
    }
}

fn points(cx: &mut Context, what: &str, node: &Marked) -> Option<Vec<(f64, f64)>> {
    let fields = cx.any_map(node, &format!("`points` of {what}"), "\"06:00\": 1.1")?;
    let mut points = Vec::new();
    for (key, value) in fields.entries() {
        let Some(time) = time_text(&key.name) else {
            let message = format!("`{}` in {what} is no time", key.name);
            cx.push(Diagnostic::error("not-a-time", key.place, message).help(TIME_HELP));
            return None;
        };
        points.push((
            time,
            cx.number(value, &format!("a point of {what}"), Bound::Any)?,
        ));
    }
    Some(points)
}

const TIME_HELP: &str =
    "write a time of day as \"06:00\" or \"06:00:30\", or a time span such as `1.5 h`";

/// Seconds of `06:00`, `06:00:30` or a time span; hours may pass 24.
fn time_text(text: &str) -> Option<f64> {
    if !text.contains(':') {
        let quantity = parse_quantity(text).ok()?;
        let metric = crate::units::UnitSet::metric();
        return quantity
            .to_si(Kind::Time, &metric)
            .ok()
            .filter(|time| *time >= 0.0);
    }
    let mut parts = text.split(':');
    let mut part = |most: u32| {
        let digits = parts.next()?;
        let all =
            !digits.is_empty() && digits.len() <= 5 && digits.bytes().all(|b| b.is_ascii_digit());
        let value: u32 = if all {
            digits.parse().ok()?
        } else {
            return None;
        };
        (value <= most).then_some(f64::from(value))
    };
    let (hours, minutes) = (part(99_999)?, part(59)?);
    let seconds = if text.matches(':').count() == 2 {
        part(59)?
    } else {
        0.0
    };
    parts
        .next()
        .is_none()
        .then_some(3600.0 * hours + 60.0 * minutes + seconds)
}

/// A time of day or a time span, s; true if it was written as a time of day.
pub(super) fn time(cx: &mut Context, node: &Marked, what: &str) -> Option<(f64, bool)> {
    let text = scalar_text(node);
    if let Some(time) = text.and_then(time_text) {
        return Some((time, text.is_some_and(|text| text.contains(':'))));
    }
    let message = format!("{what} must be a time, found {}", found(node));
    cx.push(Diagnostic::error("not-a-time", node.place, message).help(TIME_HELP));
    None
}

/// Columns `time` (a unit in brackets, or times of day) and one more: a flow with its unit in brackets, or plain numbers.
fn from_file(
    cx: &mut Context,
    what: &str,
    node: &Marked,
    load: Load,
) -> Option<(Vec<(f64, f64)>, bool)> {
    let name = cx.text(node, &format!("`file` of {what}"))?;
    let mut fail = |message: String, help: &str| {
        cx.diagnostics
            .push(Diagnostic::error("csv", node.place, message).help(help));
    };
    let form = "a schedule file has the columns `time [h]` and, for example, `flow [L/s]`";
    let bytes = match load(&name) {
        Ok(bytes) => bytes,
        Err(why) => {
            fail(
                format!("`{name}` cannot be read: {why}"),
                "the path is taken from the folder of the system file",
            );
            return None;
        }
    };
    let mut reader = csv::ReaderBuilder::new()
        .trim(csv::Trim::All)
        .comment(Some(b'#'))
        .from_reader(bytes.as_slice());
    let headings: Vec<String> = match reader.headers() {
        Ok(headings) => headings.iter().map(str::to_owned).collect(),
        Err(why) => {
            fail(format!("`{name}` cannot be read: {why}"), form);
            return None;
        }
    };
    let split = |heading: &str| match heading.split_once('[') {
        Some((name, unit)) => (
            name.trim().to_owned(),
            Some(unit.trim_end_matches(']').trim().to_owned()),
        ),
        None => (heading.to_owned(), None),
    };
    let [time, value] = headings.as_slice() else {
        fail(
            format!("`{name}` has {} columns, two are needed", headings.len()),
            form,
        );
        return None;
    };
    let ((time, time_unit), (_, value_unit)) = (split(time), split(value));
    if time != "time" {
        fail(format!("the first column of `{name}` is `{time}`"), form);
        return None;
    }
    let is_flow = value_unit.is_some();
    let mut points = Vec::new();
    for (row, record) in reader.records().enumerate() {
        let read = record.ok().and_then(|record| {
            let time = record.get(0)?;
            let time = match &time_unit {
                Some(unit) => time_text(&format!("{time} {unit}"))?,
                None => time_text(time)?,
            };
            let value = record.get(1)?;
            let value = match &value_unit {
                Some(unit) => {
                    let quantity = parse_quantity(&format!("{value} {unit}")).ok()?;
                    quantity.to_si(Kind::Flow, &cx.units).ok()?
                }
                None => value.parse().ok()?,
            };
            Some((time, value))
        });
        match read {
            Some(point) if row < MOST_POINTS => points.push(point),
            _ => {
                cx.push(
                    Diagnostic::error(
                        "csv",
                        node.place,
                        format!("`{name}`, record {}: no time and figure", row + 2),
                    )
                    .help(form),
                );
                return None;
            }
        }
    }
    Some((points, is_flow))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn times_are_read_and_refused() {
        for (text, seconds) in [
            ("06:00", 21_600.0),
            ("6:30:15", 23_415.0),
            ("30:00", 108_000.0),
            ("1.5 h", 5400.0),
        ] {
            assert_eq!(time_text(text), Some(seconds), "{text}");
        }
        for text in [
            "",
            ":",
            "6:60",
            "6:00:00:00",
            "6h",
            "-1 h",
            "12",
            "a:b",
            "06:0x",
            "6:+5",
        ] {
            assert!(time_text(text).is_none() || text == "6h", "{text}");
        }
    }
}

//! `lines`: ends, banks, and the order of the parts; what a part says is read in [`super::parts`].

use super::changes::MemberChanges;
use super::context::{Bound, Context, Fields, Referent, found, transposed};
use super::parts::part;
use super::spec::{LineSpec, PartSpec, Placed, SiteSpec};
use super::yaml::{Key, Marked};
use crate::diagnostic::{Diagnostic, Place};
use crate::units::Kind;

pub(super) const PARTS: [&str; 10] = [
    "pipe",
    "loss",
    "valve",
    "check_valve",
    "equipment",
    "pump",
    "hold_downstream",
    "hold_upstream",
    "limit_flow",
    "minimum_flow",
];
const LINE_KEYS: [&str; 7] = [
    "from",
    "to",
    "count",
    "parts",
    "from_port",
    "to_port",
    "bell",
];
/// Most lines of a network, banks written out.
const MOST_LINES: usize = 1_000_000;
/// Most lines in one bank.
pub(super) const LARGEST_BANK: f64 = 1000.0;

pub(super) fn lines(
    cx: &mut Context,
    site: &SiteSpec,
    node: &Marked,
    changes: &MemberChanges,
) -> Vec<LineSpec> {
    let Some(fields) = cx.any_map(node, "`lines`", "NAME: {from: A, to: B, pipe: {..}}") else {
        return Vec::new();
    };
    fields
        .entries()
        .iter()
        .filter_map(|(key, value)| line(cx, site, key, value, changes))
        .collect()
}

fn line(
    cx: &mut Context,
    site: &SiteSpec,
    key: &Key,
    node: &Marked,
    changes: &MemberChanges,
) -> Option<LineSpec> {
    super::names::check(cx, key, "line");
    let what = format!("line `{}`", key.name);
    let keys: Vec<&str> = LINE_KEYS.iter().chain(&PARTS).copied().collect();
    let fields = cx.map(node, &what, &keys)?;
    let from = end(cx, &fields, "from", &what);
    let to = end(cx, &fields, "to", &what);
    let count = fields.get("count").map(|node| count(cx, node, &what));
    let port = |cx: &mut Context, key: &str| {
        let node = fields.get(key)?;
        cx.quantity(
            node,
            format_args!("`{key}` of {what}"),
            Kind::Length,
            Bound::NotNegative,
        )
    };
    let ports = [port(cx, "from_port"), port(cx, "to_port")];
    let bell = super::limits::bell(cx, &fields, &what).map(|value| Placed {
        value,
        place: fields.key_place("bell"),
    });
    let parts = parts(cx, site, &what, &fields);
    let mut members = Vec::new();
    for member in changes.members_of(&key.name) {
        let changed = changes.applied(&key.name, member, node);
        let fields = cx.map(&changed, &what, &keys)?;
        members.push((member, self::parts(cx, site, &what, &fields)));
    }
    Some(LineSpec {
        name: key.name.clone(),
        place: key.place,
        from: from?,
        to: to?,
        ports,
        bell,
        count: transposed(count)?,
        parts: parts?,
        members: members
            .into_iter()
            .map(|(member, parts)| Some((member, parts?)))
            .collect::<Option<_>>()?,
    })
}

fn end(cx: &mut Context, fields: &Fields, key: &str, what: &str) -> Option<Placed<String>> {
    let node = cx.required(fields, key, what, "NODE")?;
    cx.reference(node, format_args!("`{key}` of {what}"), Referent::Node)
}

fn count(cx: &mut Context, node: &Marked, what: &str) -> Option<u32> {
    let value = cx.number(node, format_args!("`count` of {what}"), Bound::Any)?;
    if value.fract() == 0.0 && (1.0..=LARGEST_BANK).contains(&value) {
        return Some(value as u32);
    }
    let message = format!(
        "`count` of {what} must be a whole number from 1 to {LARGEST_BANK}, found {}",
        found(node)
    );
    let help = "large numbers of equal lines behave like one line with their flow together";
    let diagnostic = Diagnostic::error("out-of-range", node.place, message);
    cx.push(match value > LARGEST_BANK {
        true => diagnostic.help(help),
        false => diagnostic,
    });
    None
}

/// `parts: [..]`, or one part directly.
fn parts(cx: &mut Context, site: &SiteSpec, what: &str, fields: &Fields) -> Option<Vec<PartSpec>> {
    let direct: Vec<&str> = PARTS.into_iter().filter(|part| fields.has(part)).collect();
    let list = fields.get("parts");
    match (list, direct.as_slice()) {
        (None, [kind]) => {
            let node = fields.get(kind)?;
            Some(vec![part(cx, site, what, kind, node)?])
        }
        (Some(list), []) => {
            let items = cx.list(
                list,
                format_args!("`parts` of {what}"),
                "- pipe: {length: 3 m, bore: 200 mm}",
            )?;
            if items.is_empty() {
                no_part(cx, what, list.place);
                return None;
            }
            let read: Vec<Option<PartSpec>> = items
                .iter()
                .map(|item| listed(cx, site, what, item))
                .collect();
            read.into_iter().collect()
        }
        (None, []) => {
            if !PARTS
                .iter()
                .chain(&["parts"])
                .any(|key| fields.is_misspelt(key))
            {
                no_part(cx, what, fields.place);
            }
            None
        }
        (Some(_), [extra, ..]) | (None, [_, extra, ..]) => {
            let message = format!("{what} carries more than one part without a list");
            let help = "several parts go into `parts:`, in the order in which water meets them";
            cx.push(Diagnostic::error("both-keys", fields.key_place(extra), message).help(help));
            None
        }
    }
}

fn no_part(cx: &mut Context, what: &str, place: Place) {
    let message = format!("{what} has no part");
    let help = format!("give `parts:`, or one of `{}` directly", PARTS.join("`, `"));
    cx.push(Diagnostic::error("missing-key", place, message).help(help));
}

/// One item of `parts`: `- pipe: {..}`.
fn listed(cx: &mut Context, site: &SiteSpec, what: &str, item: &Marked) -> Option<PartSpec> {
    let what_part = format!("a part of {what}");
    let fields = cx.map(item, &what_part, &PARTS)?;
    match fields.entries() {
        [(key, value)] if PARTS.contains(&key.name.as_str()) => {
            part(cx, site, what, &key.name, value)
        }
        [_] => None,
        _ => {
            let message = format!("{what_part} must be one of `{}`", PARTS.join("`, `"));
            let help = "each part is a list item of its own, beginning with `- `";
            cx.push(Diagnostic::error("wrong-form", item.place, message).help(help));
            None
        }
    }
}

/// Whether the lines, banks written out, are few enough to be built at all.
pub(super) fn not_too_many(cx: &mut Context, lines: &[LineSpec]) -> bool {
    let mut count = 0;
    for line in lines {
        count += line.count.unwrap_or(1) as usize;
        if count > MOST_LINES {
            let message = format!(
                "with line `{}` there are more than {MOST_LINES} lines",
                line.name
            );
            let help = "every member of a bank is a line";
            cx.push(Diagnostic::error("out-of-range", line.place, message).help(help));
            return false;
        }
    }
    true
}

//! Reading single values: each reader says what it wanted, what it found and what would fit.

use serde_yaml::Value;

use super::yaml::{Form, Key, Marked};
use crate::diagnostic::{Diagnostic, Diagnostics, Place, nearest};
use crate::units::{self, Kind, Quantity, SpeedValue, UnitSet, ViscosityValue, parse_quantity};

/// What reading needs at hand: the file's units, and where problems go.
pub(super) struct Context {
    pub units: UnitSet,
    pub diagnostics: Diagnostics,
}

/// The range a figure must lie in.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Bound {
    Any,
    NotNegative,
    Positive,
    /// From 0 to 1, given as a per cent.
    Share,
    /// From 0 to below 1.
    ShareBelowOne,
}

/// The entries of a map whose keys have been checked.
#[derive(Clone, Copy)]
pub(super) struct Fields<'a> {
    pub place: Place,
    entries: &'a [(Key, Marked)],
}

impl<'a> Fields<'a> {
    pub fn get(&self, key: &str) -> Option<&'a Marked> {
        self.entries
            .iter()
            .find(|(k, _)| k.name == key)
            .map(|(_, value)| value)
    }

    pub fn has(&self, key: &str) -> bool {
        self.get(key).is_some()
    }

    pub fn key_place(&self, key: &str) -> Place {
        self.entries
            .iter()
            .find(|(k, _)| k.name == key)
            .map_or(self.place, |(k, _)| k.place)
    }

    pub fn entries(&self) -> &'a [(Key, Marked)] {
        self.entries
    }
}

impl Context {
    pub fn push(&mut self, diagnostic: Diagnostic) {
        self.diagnostics.push(diagnostic);
    }

    pub fn error(&mut self, code: &'static str, place: Place, message: impl Into<String>) {
        self.push(Diagnostic::error(code, place, message));
    }

    /// A map whose keys are all among `keys`; unknown ones are reported.
    pub fn map<'a>(&mut self, node: &'a Marked, what: &str, keys: &[&str]) -> Option<Fields<'a>> {
        let fields = self.any_map(node, what, &keys.join("`, `"))?;
        for (key, _) in fields.entries {
            if !keys.contains(&key.name.as_str()) {
                self.unknown_key(key, what, keys);
            }
        }
        Some(fields)
    }

    /// A map with keys of the user's choice.
    pub fn any_map<'a>(
        &mut self,
        node: &'a Marked,
        what: &str,
        would_fit: &str,
    ) -> Option<Fields<'a>> {
        match &node.value {
            Form::Map(entries) => Some(Fields {
                place: node.place,
                entries,
            }),
            other => {
                let message = format!("{what} must be a map, found {}", form_name(other));
                self.push(
                    Diagnostic::error("wrong-form", node.place, message).help(format!(
                        "write it as `key: value` with keys such as `{would_fit}`"
                    )),
                );
                None
            }
        }
    }

    pub fn unknown_key(&mut self, key: &Key, what: &str, keys: &[&str]) {
        let message = format!("{what} has no key `{}`", key.name);
        let help = match nearest(&key.name, keys.iter().copied()) {
            Some(near) => format!("did you mean `{near}`? It knows `{}`", keys.join("`, `")),
            None => format!("it knows `{}`", keys.join("`, `")),
        };
        self.push(
            Diagnostic::error("unknown-key", key.place, message)
                .label("unknown key")
                .help(help),
        );
    }

    /// The value of a key that must be there.
    pub fn required<'a>(
        &mut self,
        fields: &Fields<'a>,
        key: &str,
        what: &str,
        example: &str,
    ) -> Option<&'a Marked> {
        let found = fields.get(key);
        if found.is_none() {
            let message = format!("{what} needs `{key}`");
            self.push(
                Diagnostic::error("missing-key", fields.place, message)
                    .help(format!("add for example `{key}: {example}`")),
            );
        }
        found
    }

    /// A name or other text; numbers serve as names too.
    pub fn text(&mut self, node: &Marked, what: &str) -> Option<String> {
        match scalar_text(node) {
            Some(text) if !text.is_empty() => Some(text),
            _ => {
                let message = format!("{what} must be text, found {}", form_name(&node.value));
                self.error("wrong-form", node.place, message);
                None
            }
        }
    }

    pub fn boolean(&mut self, node: &Marked, what: &str) -> Option<bool> {
        if let Form::Scalar(Value::Bool(value)) = &node.value {
            return Some(*value);
        }
        let message = format!("{what} must be `true` or `false`, found {}", found(node));
        self.error("wrong-form", node.place, message);
        None
    }

    /// A list.
    pub fn list<'a>(
        &mut self,
        node: &'a Marked,
        what: &str,
        example: &str,
    ) -> Option<&'a [Marked]> {
        if let Form::List(items) = &node.value {
            return Some(items);
        }
        let message = format!("{what} must be a list, found {}", form_name(&node.value));
        let help = format!("write it for example as `{example}`");
        self.push(Diagnostic::error("wrong-form", node.place, message).help(help));
        None
    }

    /// A number or a number with a unit.
    pub fn any_quantity(&mut self, node: &Marked, what: &str) -> Option<Quantity> {
        let read = match &node.value {
            Form::Scalar(Value::Number(number)) => number
                .as_f64()
                .ok_or(None)
                .and_then(|number| Quantity::bare(number).map_err(Some)),
            Form::Scalar(Value::String(text)) => parse_quantity(text).map_err(Some),
            _ => Err(None),
        };
        match read {
            Ok(quantity) => Some(quantity),
            Err(why) => {
                let message = format!(
                    "{what} must be a number, with or without a unit; found {}",
                    found(node)
                );
                let mut diagnostic = Diagnostic::error("not-a-quantity", node.place, message);
                if let Some(why) = why {
                    diagnostic = diagnostic.help(why.to_string());
                }
                self.push(diagnostic);
                None
            }
        }
    }

    /// A quantity of one kind, in SI.
    pub fn quantity(&mut self, node: &Marked, what: &str, kind: Kind, bound: Bound) -> Option<f64> {
        let quantity = self.any_quantity(node, what)?;
        match quantity.to_si(kind, &self.units) {
            Ok(value) => self.bounded(node, what, value, bound),
            Err(wrong) => {
                self.wrong_kind(node, what, wrong.to_string(), kind);
                None
            }
        }
    }

    pub fn wrong_kind(&mut self, node: &Marked, what: &str, why: String, kind: Kind) {
        let message = format!(
            "{what} must be {}, found {}",
            kind.with_article(),
            found(node)
        );
        let fits: Vec<&str> = units::spellings(kind).take(8).collect();
        let help = format!("{why}; units that fit: {}", fits.join(", "));
        self.push(Diagnostic::error("wrong-unit", node.place, message).help(help));
    }

    /// A plain number, such as a loss coefficient.
    pub fn number(&mut self, node: &Marked, what: &str, bound: Bound) -> Option<f64> {
        let quantity = self.any_quantity(node, what)?;
        if let Some(unit) = quantity.unit() {
            let message = format!(
                "{what} is a plain number, found {} with the unit {unit}",
                found(node)
            );
            self.error("wrong-unit", node.place, message);
            return None;
        }
        self.bounded(node, what, quantity.number(), bound)
    }

    /// A pump's speed.
    pub fn speed(&mut self, node: &Marked, what: &str) -> Option<SpeedValue> {
        let quantity = self.any_quantity(node, what)?;
        match quantity.to_speed() {
            Ok(speed) => {
                let (SpeedValue::Rpm(value) | SpeedValue::Ratio(value)) = speed;
                self.bounded(node, what, value, Bound::Positive)
                    .map(|_| speed)
            }
            Err(wrong) => {
                self.wrong_kind(node, what, wrong.to_string(), Kind::Speed);
                None
            }
        }
    }

    pub fn viscosity(&mut self, node: &Marked, what: &str) -> Option<ViscosityValue> {
        let quantity = self.any_quantity(node, what)?;
        match quantity.to_viscosity(&self.units) {
            Ok(value) => {
                let (ViscosityValue::Kinematic(v) | ViscosityValue::Dynamic(v)) = value;
                self.bounded(node, what, v, Bound::Positive).map(|_| value)
            }
            Err(wrong) => {
                self.wrong_kind(node, what, wrong.to_string(), Kind::Viscosity);
                None
            }
        }
    }

    pub fn bounded(&mut self, node: &Marked, what: &str, value: f64, bound: Bound) -> Option<f64> {
        let (fits, wanted) = match bound {
            Bound::Any => (value.is_finite(), "finite"),
            Bound::NotNegative => (value >= 0.0, "zero or more"),
            Bound::Positive => (value > 0.0, "above zero"),
            Bound::Share => ((0.0..=1.0).contains(&value), "between 0 % and 100 %"),
            Bound::ShareBelowOne => ((0.0..1.0).contains(&value), "at least 0 % and below 100 %"),
        };
        if fits && value.is_finite() {
            return Some(value);
        }
        let message = format!("{what} must be {wanted}, found {}", found(node));
        self.error("out-of-range", node.place, message);
        None
    }
}

/// A scalar as the user could have written it.
pub(super) fn scalar_text(node: &Marked) -> Option<String> {
    match &node.value {
        Form::Scalar(Value::String(text)) => Some(text.clone()),
        Form::Scalar(Value::Number(number)) => Some(number.to_string()),
        Form::Scalar(Value::Bool(value)) => Some(value.to_string()),
        _ => None,
    }
}

/// What stands there, for a message.
pub(super) fn found(node: &Marked) -> String {
    const LONGEST: usize = 60;
    match scalar_text(node) {
        Some(text) if text.chars().count() > LONGEST => {
            format!("`{}..`", text.chars().take(LONGEST).collect::<String>())
        }
        Some(text) => format!("`{text}`"),
        None => form_name(&node.value).to_owned(),
    }
}

pub(super) fn form_name(form: &Form) -> &'static str {
    match form {
        Form::Scalar(Value::Null) => "nothing",
        Form::Scalar(Value::Bool(_)) => "true or false",
        Form::Scalar(Value::Number(_)) => "a number",
        Form::Scalar(_) => "text",
        Form::List(_) => "a list",
        Form::Map(_) => "a map",
    }
}

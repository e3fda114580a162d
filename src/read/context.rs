//! Reading single values: each reader says what it wanted, what it found and what would fit.

use std::fmt::Display;

use super::spec::Placed;
use super::yaml::{Form, Key, Marked, Plain, Scalar, shortened};
use crate::diagnostic::{Diagnostic, Diagnostics, Place, nearest};
use crate::units::{
    self, Kind, Quantity, QuantityError, SpeedValue, UnitSet, ViscosityValue, parse_quantity,
};

/// What reading needs at hand: the file's units, and where problems go.
pub(super) struct Context {
    pub units: UnitSet,
    pub diagnostics: Diagnostics,
    /// Every name that refers to something, also in lines and needs that cannot be read for another reason.
    pub references: Vec<(Referent, Placed<String>)>,
}

/// What a name refers to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Referent {
    Node,
    Line,
    PumpModel,
}

impl Context {
    /// Nothing read yet.
    pub fn new() -> Self {
        Self {
            units: UnitSet::metric(),
            diagnostics: Diagnostics::default(),
            references: Vec::new(),
        }
    }

    /// A name that refers to something.
    pub fn reference(
        &mut self,
        node: &Marked,
        what: impl Display + Copy,
        referent: Referent,
    ) -> Option<Placed<String>> {
        let name = Placed {
            value: self.text(node, what)?,
            place: node.place,
        };
        self.references.push((referent, name.clone()));
        Some(name)
    }
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
pub(super) struct Fields<'a> {
    pub place: Place,
    entries: &'a [(Key, Marked)],
    /// Keys that unknown ones seem to stand for: reported already, so not missing too.
    misspelt: Vec<&'a str>,
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

    /// Whether an unknown key seems to stand for this one.
    pub fn is_misspelt(&self, key: &str) -> bool {
        self.misspelt.contains(&key)
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
    pub fn map<'a>(
        &mut self,
        node: &'a Marked,
        what: &str,
        keys: &[&'a str],
    ) -> Option<Fields<'a>> {
        let mut fields = match &node.value {
            Form::Map(_) => self.any_map(node, what, "")?,
            _ => self.any_map(node, what, &keys.join("`, `"))?,
        };
        for (key, _) in fields.entries {
            if !keys.contains(&key.name.as_str()) {
                let near = self.unknown_key(key, what, keys);
                fields.misspelt.extend(near);
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
            Form::Map(entries) => {
                if let Some((key, _)) = entries.iter().find(|(key, _)| key.name == "<<") {
                    let message = format!("{what} merges another map, which is not read here");
                    let help =
                        "write the keys out; an alias can stand for a whole value: `pipe: *pipe`";
                    self.push(Diagnostic::error("merge", key.place, message).help(help));
                    return None;
                }
                Some(Fields {
                    place: node.place,
                    entries,
                    misspelt: Vec::new(),
                })
            }
            other => {
                let message = format!("{what} must be a map, found {}", form_name(other));
                let help = match would_fit.contains(": ") {
                    true => format!("write entries such as `{would_fit}`"),
                    false => format!("write it as `key: value`; it knows `{would_fit}`"),
                };
                self.push(Diagnostic::error("wrong-form", node.place, message).help(help));
                None
            }
        }
    }

    /// Reports it; hands back the key that is meant, as far as that can be told.
    fn unknown_key<'k>(&mut self, key: &Key, what: &str, keys: &[&'k str]) -> Option<&'k str> {
        if self.diagnostics.is_full() {
            self.error("unknown-key", key.place, "");
            return None;
        }
        let near = nearest(&key.name, keys.iter().copied());
        let message = format!("{what} has no key `{}`", shortened(&key.name));
        let help = match near {
            Some(near) => format!("did you mean `{near}`? It knows `{}`", keys.join("`, `")),
            None => format!("it knows `{}`", keys.join("`, `")),
        };
        self.push(
            Diagnostic::error("unknown-key", key.place, message)
                .label("unknown key")
                .help(help),
        );
        near
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
        if found.is_none() && !fields.is_misspelt(key) {
            let message = format!("{what} needs `{key}`");
            self.push(
                Diagnostic::error("missing-key", fields.place, message)
                    .help(format!("add for example `{key}: {example}`")),
            );
        }
        found
    }

    /// A name or other text; numbers serve as names too.
    pub fn text(&mut self, node: &Marked, what: impl Display + Copy) -> Option<String> {
        match scalar_text(node) {
            Some(text) if !text.is_empty() => Some(text.to_owned()),
            _ => {
                let message = format!("{what} must be text, found {}", found(node));
                self.error("wrong-form", node.place, message);
                None
            }
        }
    }

    pub fn boolean(&mut self, node: &Marked, what: impl Display + Copy) -> Option<bool> {
        if let Form::Scalar(scalar) = &node.value
            && let Plain::Truth(value) = scalar.value
        {
            return Some(value);
        }
        let message = format!("{what} must be `true` or `false`, found {}", found(node));
        self.error("wrong-form", node.place, message);
        None
    }

    /// A list.
    pub fn list<'a>(
        &mut self,
        node: &'a Marked,
        what: impl Display + Copy,
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

    /// A number or a number with a unit; `kind` is what it shall measure, none for a plain number.
    pub fn any_quantity(
        &mut self,
        node: &Marked,
        what: impl Display + Copy,
        kind: Option<Kind>,
    ) -> Option<Quantity> {
        let scalar = match &node.value {
            Form::Scalar(scalar) => Some(scalar),
            _ => None,
        };
        let read = match scalar.map(|scalar| (scalar.value, &scalar.written)) {
            Some((Plain::Number(number), _)) => Quantity::bare(number).map_err(Some),
            Some((Plain::Text, text)) => parse_quantity(text).map_err(Some),
            _ => Err(None),
        };
        match read {
            Ok(quantity) => Some(quantity),
            Err(why) => {
                let wanted = kind.map_or("a number".to_owned(), Kind::with_article);
                let message = format!("{what} must be {wanted}, found {}", found(node));
                let help = self.way_to_quantity(why, kind);
                self.push(Diagnostic::error("not-a-quantity", node.place, message).help(help));
                None
            }
        }
    }

    /// What to write in place of something that is no quantity.
    fn way_to_quantity(&self, why: Option<QuantityError>, kind: Option<Kind>) -> String {
        let fits = || match kind? {
            Kind::Speed => Some("rpm, %".to_owned()),
            kind => Some(units::spellings(kind).collect::<Vec<_>>().join(", ")),
        };
        match (why, kind) {
            (Some(QuantityError::UnknownUnit { unit, .. }), Some(kind)) => {
                let unit = shortened(&unit);
                match units::nearest(&unit, Some(kind)) {
                    Some(near) => format!("`{unit}` is no unit known here; did you mean `{near}`?"),
                    None => format!(
                        "`{unit}` is no unit known here; units that fit: {}",
                        fits().unwrap_or_default()
                    ),
                }
            }
            (Some(QuantityError::UnknownUnit { unit, .. }), None) => {
                format!("it has no unit, and `{}` is none", shortened(&unit))
            }
            (Some(QuantityError::NoNumber { .. }) | None, _) => match fits() {
                Some(units) => format!("write a number and its unit ({units})"),
                None => "write a number without a unit".to_owned(),
            },
            (Some(why), _) => why.to_string(),
        }
    }

    /// A quantity of one kind, in SI.
    pub fn quantity(
        &mut self,
        node: &Marked,
        what: impl Display + Copy,
        kind: Kind,
        bound: Bound,
    ) -> Option<f64> {
        let quantity = self.any_quantity(node, what, Some(kind))?;
        match quantity.to_si(kind, &self.units) {
            Ok(value) => self.bounded(node, what, value, bound),
            Err(wrong) => {
                self.wrong_kind(node, what, wrong.to_string(), kind);
                None
            }
        }
    }

    pub fn wrong_kind(
        &mut self,
        node: &Marked,
        what: impl Display + Copy,
        why: String,
        kind: Kind,
    ) {
        let message = format!(
            "{what} must be {}, found {}",
            kind.with_article(),
            found(node)
        );
        self.push(Diagnostic::error("wrong-unit", node.place, message).help(why));
    }

    /// A plain number, such as a loss coefficient.
    pub fn number(
        &mut self,
        node: &Marked,
        what: impl Display + Copy,
        bound: Bound,
    ) -> Option<f64> {
        let quantity = self.any_quantity(node, what, None)?;
        if let Some(unit) = quantity.unit() {
            let message = format!("{what} must be a plain number, found {}", found(node));
            let help = format!("it has no unit: write it without `{}`", unit.symbol);
            self.push(Diagnostic::error("wrong-unit", node.place, message).help(help));
            return None;
        }
        self.bounded(node, what, quantity.number(), bound)
    }

    /// A pump's speed.
    pub fn speed(&mut self, node: &Marked, what: impl Display + Copy) -> Option<SpeedValue> {
        let quantity = self.any_quantity(node, what, Some(Kind::Speed))?;
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

    pub fn viscosity(
        &mut self,
        node: &Marked,
        what: impl Display + Copy,
    ) -> Option<ViscosityValue> {
        let quantity = self.any_quantity(node, what, Some(Kind::Viscosity))?;
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

    pub fn bounded(
        &mut self,
        node: &Marked,
        what: impl Display + Copy,
        value: f64,
        bound: Bound,
    ) -> Option<f64> {
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

/// A scalar as the user wrote it; none where nothing stands.
pub(super) fn scalar_text(node: &Marked) -> Option<&str> {
    match &node.value {
        Form::Scalar(Scalar {
            value: Plain::Nothing,
            ..
        }) => None,
        Form::Scalar(scalar) => Some(&scalar.written),
        _ => None,
    }
}

/// What stands there, for a message.
pub(super) fn found(node: &Marked) -> String {
    match scalar_text(node) {
        Some("") => "an empty text".to_owned(),
        Some(text) => format!("`{}`", shortened(text)),
        None => form_name(&node.value).to_owned(),
    }
}

pub(super) fn form_name(form: &Form) -> &'static str {
    match form {
        Form::Scalar(scalar) => match scalar.value {
            Plain::Nothing => "nothing",
            Plain::Truth(_) => "true or false",
            Plain::Number(_) => "a number",
            Plain::Text => "text",
        },
        Form::List(_) => "a list",
        Form::Map(_) => "a map",
    }
}

/// Given and read, given and not readable, or not given.
pub(super) fn transposed<T>(value: Option<Option<T>>) -> Option<Option<T>> {
    match value {
        None => Some(None),
        Some(None) => None,
        Some(Some(value)) => Some(Some(value)),
    }
}

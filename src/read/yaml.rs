//! YAML text to a tree in which every value knows its place.
//!
//! Two well-kept parsers share the work: one pass over the events of the first guards against what the second lets pass
//! (keys given twice, depth, aliases that multiply) and notes the places; the second resolves the scalars. The two trees have
//! the same shape and are put together.

use std::collections::{HashMap, HashSet};
use std::fmt;

use saphyr_parser::{Event, Parser, Span};
use serde::de::{DeserializeSeed, Deserializer, Error, IgnoredAny, MapAccess, SeqAccess, Visitor};

use crate::diagnostic::{Diagnostic, Place};

/// A value and its place.
#[derive(Clone, Debug)]
pub struct Marked {
    /// Where it stands.
    pub place: Place,
    /// What it is.
    pub value: Form,
}

/// What a value is.
#[derive(Clone, Debug)]
pub enum Form {
    /// A scalar.
    Scalar(Scalar),
    /// A list.
    List(Vec<Marked>),
    /// A map; keys are unique, in the order of the text.
    Map(Vec<(Key, Marked)>),
}

/// A scalar as it is meant and as it is written.
#[derive(Clone, Debug)]
pub struct Scalar {
    /// What it is meant to be.
    pub value: Plain,
    /// As written, without quotes: `1e3` and `1000` are one number but two names.
    pub written: String,
}

/// What a scalar is meant to be.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Plain {
    /// Nothing.
    Nothing,
    /// `true` or `false`.
    Truth(bool),
    /// A number; it may be infinite or none.
    Number(f64),
    /// Text: what is written.
    Text,
}

impl Scalar {
    /// Text.
    pub fn text(text: &str) -> Self {
        Self {
            value: Plain::Text,
            written: text.to_owned(),
        }
    }

    /// As YAML takes it, if that is a truth or a number; else text.
    pub fn resolved(text: &str) -> Self {
        let value = match serde_yaml::from_str::<serde_yaml::Value>(text) {
            Ok(serde_yaml::Value::Bool(truth)) => Plain::Truth(truth),
            Ok(serde_yaml::Value::Number(number)) => {
                number.as_f64().map_or(Plain::Text, Plain::Number)
            }
            _ => Plain::Text,
        };
        Self {
            value,
            ..Self::text(text)
        }
    }
}

/// A key and its place.
#[derive(Clone, Debug)]
pub struct Key {
    /// The key as text.
    pub name: String,
    /// Where it stands.
    pub place: Place,
}

/// Longest text read, bytes.
pub const LARGEST: usize = 64 << 20;
/// Deepest nesting.
const DEEPEST: usize = 48;
/// What mostly is the matter where the parser stops.
const HINT: &str =
    "look at the indentation, brackets, quotes and colons here and in the lines above";
/// Most values, aliases written out.
const MOST_VALUES: usize = 4_000_000;

/// Reads a text.
///
/// # Errors
/// The first thing that makes it unreadable.
pub fn parse(bytes: &[u8]) -> Result<(String, Marked), Box<(String, Diagnostic)>> {
    let fail = |text: &str, diagnostic| Err(Box::new((text.to_owned(), diagnostic)));
    if bytes.len() > LARGEST {
        let message = format!(
            "the file has {} bytes; at most {LARGEST} are read",
            bytes.len()
        );
        return fail("", Diagnostic::whole("too-large", message));
    }
    let text = match std::str::from_utf8(bytes) {
        Ok(text) => text.strip_prefix('\u{feff}').unwrap_or(text),
        Err(error) => {
            let before = String::from_utf8_lossy(&bytes[..error.valid_up_to()]);
            let line = before.matches('\n').count() + 1;
            let column = before.lines().last().map_or(0, |last| last.chars().count()) + 1;
            let column = if before.ends_with('\n') { 1 } else { column };
            let message = "the file is not UTF-8 text: this byte cannot be read";
            let help = "save the file as UTF-8 (plain ASCII is UTF-8 too)";
            let diagnostic = Diagnostic::error("not-utf8", spot(line, column), message).help(help);
            return fail(&String::from_utf8_lossy(bytes), diagnostic);
        }
    };
    let marks = match Guard::read(text) {
        Ok(marks) => marks,
        Err(diagnostic) => return fail(text, diagnostic),
    };
    match marks.deserialize(serde_yaml::Deserializer::from_str(text)) {
        Ok(tree) => Ok((text.to_owned(), tree)),
        Err(error) => {
            let place = error
                .location()
                .map_or(Place::default(), |at| spot(at.line(), at.column()));
            let message = format!("not readable as YAML: {error}");
            fail(text, Diagnostic::error("yaml", place, message).help(HINT))
        }
    }
}
fn spot(line: usize, column: usize) -> Place {
    let (line, column) = (line as u32, column as u32);
    Place {
        line,
        column,
        end_line: line,
        end_column: column + 1,
    }
}

fn place(span: Span) -> Place {
    Place {
        line: span.start.line() as u32,
        column: span.start.col() as u32 + 1,
        end_line: span.end.line() as u32,
        end_column: span.end.col() as u32 + 1,
    }
}

/// The places of a value and of what is in it.
#[derive(Clone, Debug)]
struct Marks {
    place: Place,
    /// Values of a list; keys and values of a map in turn.
    children: Vec<Marks>,
    /// For a map, its keys.
    keys: Vec<String>,
    /// For a scalar, what is written.
    written: Option<String>,
    /// How many values this is, itself included.
    size: usize,
}

/// A container that is still open.
struct Open {
    marks: Marks,
    anchor: usize,
    is_map: bool,
    /// The keys so far, once they are many.
    seen: HashSet<String>,
}

impl Marks {
    fn of(place: Place, written: Option<String>) -> Self {
        Self {
            place,
            children: Vec::new(),
            keys: Vec::new(),
            written,
            size: 1,
        }
    }
}

impl Open {
    /// Where this key was given before. A small map is searched, a large one remembers its keys apart.
    fn first(&mut self, key: &str) -> Option<Place> {
        const SMALL: usize = 16;
        let keys = &self.marks.keys;
        if keys.len() < SMALL {
            let at = keys.iter().position(|known| known == key)?;
            return Some(self.marks.children[2 * at].place);
        }
        if self.seen.is_empty() {
            self.seen.extend(keys.iter().cloned());
        }
        if self.seen.insert(key.to_owned()) {
            return None;
        }
        let at = keys.iter().position(|known| known == key)?;
        Some(self.marks.children[2 * at].place)
    }
}

#[derive(Default)]
struct Guard {
    open: Vec<Open>,
    anchors: HashMap<usize, Marks>,
    root: Option<Marks>,
    values: usize,
}

impl Guard {
    fn read(text: &str) -> Result<Marks, Diagnostic> {
        let mut guard = Self::default();
        let mut documents = 0;
        for event in Parser::new_from_str(text) {
            let (event, span) = event.map_err(|error| {
                let at = spot(error.marker().line(), error.marker().col() + 1);
                let message = format!("not readable as YAML: {}", error.info());
                Diagnostic::error("yaml", at, message).help(hint(error.info()))
            })?;
            let place = place(span);
            match event {
                Event::DocumentStart(_) => {
                    documents += 1;
                    if documents > 1 {
                        let message = "a second YAML document starts here; one is read";
                        let help = "remove the line `---`, or give what follows a file of its own";
                        return Err(Diagnostic::error("two-documents", place, message).help(help));
                    }
                }
                Event::Scalar(text, _, anchor, tag) => {
                    refuse_tag(tag.is_some(), place)?;
                    guard.add(Marks::of(place, Some(text.into_owned())), anchor)?;
                }
                Event::SequenceStart(anchor, tag) => {
                    refuse_tag(tag.is_some(), place)?;
                    guard.enter(place, anchor, false)?;
                }
                Event::MappingStart(anchor, tag) => {
                    refuse_tag(tag.is_some(), place)?;
                    guard.enter(place, anchor, true)?;
                }
                Event::SequenceEnd | Event::MappingEnd => guard.leave(place)?,
                Event::Alias(anchor) => {
                    let Some(mut marks) = guard.anchors.get(&anchor).cloned() else {
                        let message = "this alias stands inside what it refers to";
                        let help =
                            "an alias repeats what its anchor marks, and cannot be part of it";
                        return Err(Diagnostic::error("alias", place, message).help(help));
                    };
                    marks.place = place;
                    guard.add(marks, 0)?;
                }
                Event::Nothing | Event::StreamStart | Event::StreamEnd | Event::DocumentEnd => {}
            }
        }
        guard.root.ok_or_else(|| {
            let help = "a system file has `nodes:` and `lines:`; `--help` shows how to start";
            Diagnostic::whole("empty", "the file is empty").help(help)
        })
    }

    fn enter(&mut self, place: Place, anchor: usize, is_map: bool) -> Result<(), Diagnostic> {
        if self.open.len() >= DEEPEST {
            let message = format!("nested deeper than {DEEPEST} levels");
            let help = "a system file needs about ten; look for brackets that are never closed";
            return Err(Diagnostic::error("too-deep", place, message).help(help));
        }
        self.open.push(Open {
            marks: Marks::of(place, None),
            anchor,
            is_map,
            seen: HashSet::new(),
        });
        Ok(())
    }

    fn leave(&mut self, end: Place) -> Result<(), Diagnostic> {
        let Some(mut open) = self.open.pop() else {
            return Ok(());
        };
        // Block style ends where the next thing starts: the last value's end is the better mark.
        let last = open.marks.children.last().map_or(end, |child| child.place);
        if open.marks.place.end_line < last.end_line
            || open.marks.place.end_column < last.end_column
        {
            (open.marks.place.end_line, open.marks.place.end_column) =
                (last.end_line, last.end_column);
        }
        self.add(open.marks, open.anchor)
    }

    /// A finished value.
    fn add(&mut self, mut marks: Marks, anchor: usize) -> Result<(), Diagnostic> {
        self.values += marks.size;
        if self.values > MOST_VALUES {
            let message = format!("more than {MOST_VALUES} values, aliases written out");
            let help = "aliases multiply: write out what is needed";
            return Err(Diagnostic::error("too-many-values", marks.place, message).help(help));
        }
        if anchor > 0 {
            self.anchors.insert(anchor, marks.clone());
        }
        let Some(parent) = self.open.last_mut() else {
            self.root = Some(marks);
            return Ok(());
        };
        if parent.is_map && parent.marks.children.len() % 2 == 0 {
            let Some(key) = marks.written.take() else {
                let help = "a list or a map cannot be a key";
                let problem = Diagnostic::error("key", marks.place, "a key must be plain text");
                return Err(problem.help(help));
            };
            if let Some(first) = parent.first(&key) {
                let message = format!("the key `{}` is given twice", shortened(&key));
                let help = match first.line == marks.place.line {
                    true => "remove one of the two".to_owned(),
                    false => format!(
                        "the first stands in line {} of the file; remove one",
                        first.line
                    ),
                };
                return Err(Diagnostic::error("key-twice", marks.place, message).help(help));
            }
            parent.marks.keys.push(key);
        }
        parent.marks.size += marks.size;
        parent.marks.children.push(marks);
        Ok(())
    }
}

/// A text short enough for a message.
pub(super) fn shortened(text: &str) -> String {
    const LONGEST: usize = 60;
    match text.char_indices().nth(LONGEST) {
        Some((end, _)) => format!("{}..", &text[..end]),
        None => text.to_owned(),
    }
}

/// What would mend a text that the parser refuses.
fn hint(why: &str) -> &'static str {
    if why.contains("tab") {
        "YAML is indented with spaces"
    } else if why.contains("anchor") {
        "an alias `*name` repeats what `&name` marks further up"
    } else {
        HINT
    }
}

fn refuse_tag(tagged: bool, place: Place) -> Result<(), Diagnostic> {
    if tagged {
        let message = "YAML tags (`!..`) are not used in a system file";
        let help = "remove the tag; what a value is follows from its key";
        return Err(Diagnostic::error("tag", place, message).help(help));
    }
    Ok(())
}

/// Puts places and values together: the shape is that of the marks, the second parser fills in what the scalars mean.
impl<'de> DeserializeSeed<'de> for Marks {
    type Value = Marked;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<Marked, D::Error> {
        deserializer.deserialize_any(self)
    }
}

impl Marks {
    fn scalar<E: Error>(self, value: Plain) -> Result<Marked, E> {
        let written = self.written.ok_or_else(|| E::custom(UNUSUAL))?;
        Ok(Marked {
            place: self.place,
            value: Form::Scalar(Scalar { value, written }),
        })
    }
}

/// The two parsers saw different shapes.
const UNUSUAL: &str = "the text is too unusual";

impl<'de> Visitor<'de> for Marks {
    type Value = Marked;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a map, a list or a value")
    }

    fn visit_unit<E: Error>(self) -> Result<Marked, E> {
        self.scalar(Plain::Nothing)
    }

    fn visit_bool<E: Error>(self, truth: bool) -> Result<Marked, E> {
        self.scalar(Plain::Truth(truth))
    }

    fn visit_f64<E: Error>(self, number: f64) -> Result<Marked, E> {
        self.scalar(Plain::Number(number))
    }

    fn visit_i64<E: Error>(self, number: i64) -> Result<Marked, E> {
        self.scalar(Plain::Number(number as f64))
    }

    fn visit_u64<E: Error>(self, number: u64) -> Result<Marked, E> {
        self.scalar(Plain::Number(number as f64))
    }

    fn visit_i128<E: Error>(self, number: i128) -> Result<Marked, E> {
        self.scalar(Plain::Number(number as f64))
    }

    fn visit_u128<E: Error>(self, number: u128) -> Result<Marked, E> {
        self.scalar(Plain::Number(number as f64))
    }

    fn visit_str<E: Error>(self, _: &str) -> Result<Marked, E> {
        self.scalar(Plain::Text)
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut list: A) -> Result<Marked, A::Error> {
        let mut items = Vec::with_capacity(self.children.len());
        for marks in self.children {
            let item = list.next_element_seed(marks)?;
            items.push(item.ok_or_else(|| A::Error::custom(UNUSUAL))?);
        }
        if list.next_element::<IgnoredAny>()?.is_some() {
            return Err(A::Error::custom(UNUSUAL));
        }
        Ok(Marked {
            place: self.place,
            value: Form::List(items),
        })
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<Marked, A::Error> {
        let mut entries = Vec::with_capacity(self.keys.len());
        let mut children = self.children.into_iter();
        for name in self.keys {
            let (Some(key), Some(value), Some(_)) = (
                children.next(),
                children.next(),
                map.next_key::<IgnoredAny>()?,
            ) else {
                return Err(A::Error::custom(UNUSUAL));
            };
            let place = key.place;
            entries.push((Key { name, place }, map.next_value_seed(value)?));
        }
        if map.next_key::<IgnoredAny>()?.is_some() {
            return Err(A::Error::custom(UNUSUAL));
        }
        Ok(Marked {
            place: self.place,
            value: Form::Map(entries),
        })
    }
}

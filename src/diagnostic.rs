//! A problem in a user's file: what, where, and what would mend it. Data here; the command decides where it goes.

use std::ops::Range;

use annotate_snippets::{AnnotationKind, Group, Level, Renderer, Snippet};

/// How bad.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Severity {
    /// The file can be used; the reader should know.
    Caution,
    /// The file cannot be used.
    Error,
}

/// A stretch of a text: lines and columns from 1, columns in characters, the end exclusive.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub struct Place {
    /// First line.
    pub line: u32,
    /// First column.
    pub column: u32,
    /// Line of the end.
    pub end_line: u32,
    /// Column of the end.
    pub end_column: u32,
}

/// One problem.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Diagnostic {
    /// A stable word for the kind of problem, e.g. `unknown-key`.
    pub code: &'static str,
    /// How bad it is.
    pub severity: Severity,
    /// What was found, in a sentence without a full stop.
    pub message: String,
    /// Where.
    pub place: Option<Place>,
    /// What to say under the marked place.
    pub label: Option<String>,
    /// What would mend it.
    pub help: Option<String>,
}

impl Diagnostic {
    /// An error at a place.
    pub fn error(code: &'static str, place: Place, message: impl Into<String>) -> Self {
        Self {
            severity: Severity::Error,
            ..Self::caution(code, place, message)
        }
    }

    /// A caution at a place.
    pub fn caution(code: &'static str, place: Place, message: impl Into<String>) -> Self {
        Self {
            code,
            severity: Severity::Caution,
            message: message.into(),
            place: Some(place),
            label: None,
            help: None,
        }
    }

    /// An error of the whole file.
    pub fn whole(code: &'static str, message: impl Into<String>) -> Self {
        Self {
            place: None,
            ..Self::error(code, Place::default(), message)
        }
    }

    /// Adds what to say under the marked place.
    pub fn label(mut self, label: impl Into<String>) -> Self {
        self.label = Some(label.into());
        self
    }

    /// Adds what would mend it.
    pub fn help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }
}

/// Errors, and cautions, kept before the rest is only counted.
const KEPT: usize = 100;

/// All problems of one text, in the order in which they were found until [`Self::sort`].
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Diagnostics {
    list: Vec<Diagnostic>,
    errors: usize,
    cautions: usize,
}

impl Diagnostics {
    /// Adds one.
    pub fn push(&mut self, mut diagnostic: Diagnostic) {
        // A change from the command line stands nowhere in the text.
        diagnostic.place = diagnostic.place.filter(|place| place.line > 0);
        let count = match diagnostic.severity {
            Severity::Error => &mut self.errors,
            Severity::Caution => &mut self.cautions,
        };
        // Members of a bank are read from the same text: what is wrong there is said once.
        if *count < KEPT && self.list.contains(&diagnostic) {
            return;
        }
        *count += 1;
        if *count <= KEPT {
            self.list.push(diagnostic);
        }
    }

    /// Adds the errors of others that are not here yet.
    pub fn add_errors(&mut self, others: &Self) {
        let errors = others.list.iter();
        errors
            .filter(|d| d.severity == Severity::Error)
            .for_each(|d| self.push(d.clone()));
    }

    /// Whether further errors are only counted: no need for a costly search for the nearest name.
    pub fn is_full(&self) -> bool {
        self.errors >= KEPT
    }

    /// Whether the text cannot be used.
    pub fn has_errors(&self) -> bool {
        self.errors > 0
    }

    /// The problems.
    pub fn list(&self) -> &[Diagnostic] {
        &self.list
    }

    /// Puts them in the order of their places.
    pub fn sort(&mut self) {
        self.list
            .sort_by_key(|d| d.place.map(|place| (place.line, place.column)));
    }

    /// All problems as text: file, line and column, the source line with the place marked, what would mend it.
    pub fn render(&self, text: &str, file: &str, colour: bool) -> String {
        let renderer = if colour {
            Renderer::styled()
        } else {
            Renderer::plain()
        };
        let lines = LineStarts::of(text);
        let mut out = String::new();
        for diagnostic in &self.list {
            let level = match diagnostic.severity {
                Severity::Error => Level::ERROR,
                Severity::Caution => Level::WARNING.with_name("caution"),
            };
            let title = level
                .primary_title(diagnostic.message.as_str())
                .id(diagnostic.code);
            let mut group = match diagnostic.place {
                Some(place) => title.element(snippet(text, file, &lines, place, diagnostic)),
                None => Group::with_title(title).element(annotate_snippets::Origin::path(file)),
            };
            if let Some(help) = &diagnostic.help {
                group = group.element(Level::HELP.message(help.as_str()));
            }
            out.push_str(&renderer.render(&[group]));
            out.push_str("\n\n");
        }
        for (count, what) in [(self.errors, "errors"), (self.cautions, "cautions")] {
            if count > KEPT {
                out.push_str(&format!("and {} more {what}\n", count - KEPT));
            }
        }
        out
    }
}

/// Longest part of a line that is shown.
const WIDTH: usize = 200;

/// The lines around a place with the place marked; of very long lines only the neighbourhood.
fn snippet<'a>(
    text: &'a str,
    file: &'a str,
    lines: &LineStarts,
    place: Place,
    diagnostic: &'a Diagnostic,
) -> Snippet<'a, annotate_snippets::Annotation<'a>> {
    let span = lines.bytes(text, place);
    let first = lines.starts[(place.line.max(1) as usize - 1).min(lines.starts.len() - 1)];
    let line_end = text[span.start..]
        .find('\n')
        .map_or(text.len(), |i| span.start + i);
    let floor = |mut i: usize| {
        while !text.is_char_boundary(i) {
            i -= 1;
        }
        i
    };
    let start = if span.start - first > WIDTH {
        floor(span.start - WIDTH / 2)
    } else {
        first
    };
    let end = floor(line_end.min(span.start + WIDTH).max(span.start));
    // What spans many lines is marked on its first.
    let marked = span.start - start..floor(span.end.min(end)).max(span.start) - start;
    let mut annotation = AnnotationKind::Primary.span(marked);
    if let Some(label) = &diagnostic.label {
        annotation = annotation.label(label.as_str());
    }
    Snippet::source(&text[start..end])
        .line_start(place.line.max(1) as usize)
        .path(file)
        .annotation(annotation)
}

/// Byte offsets at which the lines of a text start.
struct LineStarts {
    starts: Vec<usize>,
    /// One byte a character: no need to walk through a line for a column.
    is_ascii: bool,
}

impl LineStarts {
    fn of(text: &str) -> Self {
        let after = text
            .bytes()
            .enumerate()
            .filter(|(_, b)| *b == b'\n')
            .map(|(i, _)| i + 1);
        Self {
            starts: std::iter::once(0).chain(after).collect(),
            is_ascii: text.is_ascii(),
        }
    }

    fn byte(&self, text: &str, line: u32, column: u32) -> usize {
        let Some(&start) = self.starts.get(line.max(1) as usize - 1) else {
            return text.len();
        };
        let end = self
            .starts
            .get(line.max(1) as usize)
            .map_or(text.len(), |next| next - 1);
        if self.is_ascii {
            return (start + column.max(1) as usize - 1).min(end);
        }
        let mut offsets = text[start..end].char_indices().map(|(i, _)| start + i);
        offsets.nth(column.max(1) as usize - 1).unwrap_or(end)
    }

    fn bytes(&self, text: &str, place: Place) -> Range<usize> {
        let start = self.byte(text, place.line, place.column);
        start..self.byte(text, place.end_line, place.end_column).max(start)
    }
}

/// The candidate nearest to `name`, if one is near enough to be meant.
pub fn nearest<'a>(name: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    const LONGEST: usize = 64;
    if name.len() > LONGEST {
        return None;
    }
    candidates
        .into_iter()
        .filter(|candidate| candidate.len() <= LONGEST)
        .map(|candidate| (strsim::jaro_winkler(name, candidate), candidate))
        .filter(|(likeness, _)| *likeness > 0.78)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, candidate)| candidate)
}

//! SVG text: elements with their attributes, numbers in hundredths of a millimetre.

use super::ink::{Colour, Stroke};
use super::text::escaped;

/// What is written.
#[derive(Default)]
pub(super) struct Markup {
    out: String,
}

/// How a text is set.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Type {
    pub size: f64,
    pub anchor: Anchor,
    pub colour: Colour,
    pub bold: bool,
    /// Whether paper shows round the letters, over lines.
    pub halo: bool,
}

/// Which point of a text stands at its place.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Anchor {
    Start,
    Middle,
    End,
}

impl Type {
    pub fn of(size: f64) -> Self {
        Self {
            size,
            anchor: Anchor::Start,
            colour: Colour::Ink,
            bold: false,
            halo: false,
        }
    }

    pub fn anchored(self, anchor: Anchor) -> Self {
        Self { anchor, ..self }
    }

    pub fn coloured(self, colour: Colour) -> Self {
        Self { colour, ..self }
    }

    pub fn bold(self) -> Self {
        Self { bold: true, ..self }
    }

    pub fn halo(self) -> Self {
        Self { halo: true, ..self }
    }
}

/// A number in hundredths, without zeros at its end.
pub(super) fn number(value: f64) -> String {
    let rounded = (value * 100.0).round() / 100.0 + 0.0;
    format!("{rounded}")
}

/// A length on paper as an attribute or a coordinate.
fn attribute(name: &str, value: f64) -> String {
    format!(" {name}=\"{}\"", number(value))
}

/// Attributes of a stroke.
pub(super) fn stroked(stroke: Stroke) -> String {
    let dash = stroke
        .dash
        .pattern()
        .map_or_else(String::new, |dash| format!(" stroke-dasharray=\"{dash}\""));
    format!(
        " class=\"s{}\" stroke=\"{}\" fill=\"none\" stroke-width=\"{}\"{dash}",
        stroke.colour.number(),
        stroke.colour.on_light(),
        number(stroke.width)
    )
}

/// Attributes of a fill.
pub(super) fn filled(colour: Colour) -> String {
    format!(
        " class=\"f{}\" fill=\"{}\"",
        colour.number(),
        colour.on_light()
    )
}

impl Markup {
    /// As it is.
    pub fn raw(&mut self, text: &str) {
        self.out.push_str(text);
    }

    /// Opens a group with attributes, which begin with a space.
    pub fn open(&mut self, attributes: &str) {
        self.raw(&format!("<g{attributes}>"));
    }

    /// Closes it.
    pub fn close(&mut self) {
        self.raw("</g>\n");
    }

    /// What is shown when hovering over the group just opened.
    pub fn title(&mut self, text: &str) {
        if !text.is_empty() {
            self.raw(&format!("<title>{}</title>", escaped(text)));
        }
    }

    /// A straight line.
    pub fn line(&mut self, from: [f64; 2], to: [f64; 2], attributes: &str) {
        let place = attribute("x1", from[0])
            + &attribute("y1", from[1])
            + &attribute("x2", to[0])
            + &attribute("y2", to[1]);
        self.raw(&format!("<line{place}{attributes}/>"));
    }

    /// A line through points.
    pub fn path(&mut self, points: &[[f64; 2]], attributes: &str) {
        if points.len() < 2 {
            return;
        }
        let mut d = String::new();
        for (i, [x, y]) in points.iter().enumerate() {
            let letter = match i {
                0 => "M",
                1 => "L",
                _ => " ",
            };
            d.push_str(&format!("{letter}{} {}", number(*x), number(*y)));
        }
        self.raw(&format!("<path d=\"{d}\"{attributes}/>"));
    }

    /// A rectangle.
    pub fn rectangle(&mut self, corner: [f64; 2], size: [f64; 2], attributes: &str) {
        let place = attribute("x", corner[0])
            + &attribute("y", corner[1])
            + &attribute("width", size[0])
            + &attribute("height", size[1]);
        self.raw(&format!("<rect{place}{attributes}/>"));
    }

    /// A circle.
    pub fn circle(&mut self, centre: [f64; 2], radius: f64, attributes: &str) {
        let place =
            attribute("cx", centre[0]) + &attribute("cy", centre[1]) + &attribute("r", radius);
        self.raw(&format!("<circle{place}{attributes}/>"));
    }

    /// A text whose base line stands at `at`.
    pub fn text(&mut self, at: [f64; 2], text: &str, set: Type) {
        self.text_with(at, text, set, "");
    }

    /// A text that reads upwards.
    pub fn upright(&mut self, at: [f64; 2], text: &str, set: Type) {
        let turn = format!(
            " transform=\"rotate(-90 {} {})\"",
            number(at[0]),
            number(at[1])
        );
        self.text_with(at, text, set, &turn);
    }

    fn text_with(&mut self, at: [f64; 2], text: &str, set: Type, more: &str) {
        if text.is_empty() {
            return;
        }
        let anchor = match set.anchor {
            Anchor::Start => "",
            Anchor::Middle => " text-anchor=\"middle\"",
            Anchor::End => " text-anchor=\"end\"",
        };
        let weight = if set.bold { " font-weight=\"600\"" } else { "" };
        let place =
            attribute("x", at[0]) + &attribute("y", at[1]) + &attribute("font-size", set.size);
        let text = escaped(text);
        if set.halo {
            // Under the text and not in it: readers that do not know paint-order would draw the paper over the letters.
            self.raw(&format!(
                "<text{place}{anchor}{weight}{more} class=\"halo\" aria-hidden=\"true\" fill=\"none\" stroke=\"{}\" \
                 stroke-width=\"0.7\" stroke-linejoin=\"round\">{text}</text>",
                super::ink::PAPER
            ));
        }
        self.raw(&format!(
            "<text{place}{anchor}{weight}{more}{}>{text}</text>",
            filled(set.colour)
        ));
    }

    /// All that was written.
    pub fn finish(self) -> String {
        self.out
    }
}

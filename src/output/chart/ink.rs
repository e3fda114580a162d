//! Colours, dashes and the style sheet.
//!
//! Every element carries its colour for light paper as an attribute, which any reader of SVG knows; the style sheet, for those that
//! know variables, puts over it the colour that the page or the reader's system asks for.

use super::Surface;

/// A colour of the palette.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Colour {
    /// Ink, as the text.
    #[default]
    Ink,
    /// Blue.
    Blue,
    /// Vermillion.
    Vermillion,
    /// Bluish green.
    Green,
    /// Reddish purple.
    Purple,
    /// Orange.
    Orange,
    /// Sky blue.
    Sky,
    /// Grey, not of the palette: for what stands back.
    Grey,
}

impl Colour {
    /// All of them.
    const ALL: [Self; 8] = [
        Self::Ink,
        Self::Blue,
        Self::Vermillion,
        Self::Green,
        Self::Purple,
        Self::Orange,
        Self::Sky,
        Self::Grey,
    ];

    /// On light paper; and on dark, where blue and ink would drown.
    fn values(self) -> (&'static str, &'static str) {
        match self {
            Self::Ink => ("#1c1f23", "#e6e8ea"),
            Self::Blue => ("#0072b2", "#4aa8e0"),
            Self::Vermillion => ("#d55e00", "#f08a3c"),
            Self::Green => ("#009e73", "#2fc79a"),
            Self::Purple => ("#cc79a7", "#dd9cc0"),
            Self::Orange => ("#e69f00", "#f0b840"),
            Self::Sky => ("#56b4e9", "#7cc8f2"),
            Self::Grey => ("#686e75", "#9aa1a8"),
        }
    }

    /// For attributes.
    pub(super) fn on_light(self) -> &'static str {
        self.values().0
    }

    /// Number of its variable and its classes.
    pub(super) fn number(self) -> usize {
        self as usize
    }
}

/// Dash patterns that are told apart at a glance, lengths in mm.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Dash {
    /// Unbroken.
    #[default]
    Solid,
    /// Long strokes.
    Long,
    /// Short strokes.
    Short,
    /// A stroke and a dot.
    DashDot,
    /// A stroke and two dots.
    DashDotDot,
    /// Dots.
    Dots,
    /// Wide dots.
    WideDots,
}

impl Dash {
    /// The pattern as SVG has it; none for an unbroken line.
    pub(super) fn pattern(self) -> Option<&'static str> {
        match self {
            Self::Solid => None,
            Self::Long => Some("3.2 1"),
            Self::Short => Some("1.6 0.8"),
            Self::DashDot => Some("2.6 0.8 0.5 0.8"),
            Self::DashDotDot => Some("2.6 0.7 0.5 0.7 0.5 0.7"),
            Self::Dots => Some("0.5 0.7"),
            Self::WideDots => Some("0.5 1.3"),
        }
    }
}

/// How a line is drawn.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub struct Stroke {
    /// Its colour.
    pub colour: Colour,
    /// Its dashes.
    pub dash: Dash,
    /// Its width, mm.
    pub width: f64,
}

/// Typefaces: those that systems have, then any without serifs.
pub(super) const FACES: &str =
    "system-ui, 'Segoe UI', Roboto, 'Helvetica Neue', Arial, 'Liberation Sans', sans-serif";

/// Paper of a drawing on its own.
pub(super) const PAPER: &str = "#ffffff";
const DARK_PAPER: &str = "#15181b";

/// The style sheet of a drawing, for elements below the one with that id.
pub(super) fn style(id: &str, surface: Surface) -> String {
    let ink = match surface {
        Surface::StandAlone => Colour::Ink.on_light(),
        Surface::Embedded => "currentColor",
    };
    let paper = match surface {
        Surface::StandAlone => PAPER,
        Surface::Embedded => "Canvas",
    };
    let set = |paper: &str, values: &dyn Fn(Colour) -> String| {
        let mut out = format!("--paper:var(--chart-paper,{paper})");
        for colour in Colour::ALL {
            let n = colour.number();
            out.push_str(&format!(";--c{n}:var(--chart-c{n},{})", values(colour)));
        }
        out
    };
    let light = |colour: Colour| match colour {
        Colour::Ink => format!("var(--chart-ink,{ink})"),
        other => other.on_light().to_owned(),
    };
    let mut out = format!("#{id}{{{}}}", set(paper, &light));
    for colour in Colour::ALL {
        let n = colour.number();
        out.push_str(&format!(
            "#{id} .s{n}{{stroke:var(--c{n})}}#{id} .f{n}{{fill:var(--c{n})}}"
        ));
    }
    out.push_str(&format!(
        "#{id} .paper{{fill:var(--paper)}}#{id} .halo{{stroke:var(--paper)}}#{id} .curve:hover path{{stroke-width:.9}}"
    ));
    if surface == Surface::StandAlone {
        let dark = |colour: Colour| colour.values().1.to_owned();
        out.push_str(&format!(
            "@media (prefers-color-scheme:dark){{#{id}{{{}}}}}",
            set(DARK_PAPER, &dark)
        ));
    }
    out
}

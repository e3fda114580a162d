//! Rows of bars over the common axis: who runs when.

use super::ink::{Colour, Dash, Stroke};
use super::label::Area;
use super::markup::{Anchor, Markup, Type, filled, number, stroked};
use super::pane::{Frame, LABEL};
use super::scale::Scale;
use super::text::shortened;
use super::{Bars, Strip};

/// Height of a row, mm.
pub(super) const ROW: f64 = 4.4;
const BAR: f64 = 2.8;
/// Bars closer than this are drawn as one, mm: nobody sees the gap, and a year has many thousand.
const SEEN: f64 = 0.06;

/// Draws the rows; the frame's area is theirs.
pub(super) fn strip(out: &mut Markup, strip: &Strip, frame: Frame, x: Scale, marked: &[f64]) {
    let Area {
        left,
        right,
        top,
        bottom,
    } = frame.area;
    out.open(" class=\"pane\"");
    let faint = Stroke {
        colour: Colour::Grey,
        dash: Dash::Solid,
        width: 0.12,
    };
    for value in marked {
        let at = x.at(*value);
        let look = format!("{} stroke-opacity=\"{}\"", stroked(faint), number(0.45));
        out.line([at, top], [at, bottom], &look);
    }
    for (k, row) in strip.rows.iter().enumerate() {
        self::row(out, row, top + ROW * k as f64, frame, x);
    }
    let edge = Stroke {
        colour: Colour::Ink,
        dash: Dash::Solid,
        width: 0.22,
    };
    out.line([left, bottom], [right, bottom], &stroked(edge));
    out.close();
}

fn row(out: &mut Markup, row: &Bars, top: f64, frame: Frame, x: Scale) {
    let Area { left, right, .. } = frame.area;
    let base = top + 0.5 * ROW + 0.36 * LABEL;
    out.open(&format!(
        " class=\"bars\" data-name=\"{}\"",
        super::text::escaped(&row.name)
    ));
    out.title(&format!("{}: {}", row.name, row.note));
    let name = shortened(&row.name, LABEL, left - frame.edge - 1.5);
    out.text(
        [left - 1.2, base],
        &name,
        Type::of(LABEL).anchored(Anchor::End),
    );
    let middle = top + 0.5 * ROW;
    let rest = Stroke {
        colour: Colour::Grey,
        dash: Dash::Solid,
        width: 0.15,
    };
    out.line([left, middle], [right, middle], &stroked(rest));
    let mut joined: Vec<(f64, f64)> = Vec::new();
    for (from, to) in &row.bars {
        let from = x.at(*from).clamp(left, right);
        let to = x.at(*to).clamp(left, right).max(from + SEEN);
        match joined.last_mut() {
            Some(last) if from - last.1 < SEEN => last.1 = last.1.max(to),
            _ => joined.push((from, to)),
        }
    }
    for (from, to) in joined {
        out.rectangle(
            [from, middle - 0.5 * BAR],
            [to - from, BAR],
            &filled(row.colour),
        );
    }
    let note = shortened(&row.note, LABEL, frame.margin - 1.5);
    out.text([right + 1.5, base], &note, Type::of(LABEL));
    out.close();
}

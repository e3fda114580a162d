//! A plot: bands, curves, level lines and marks over the common axis, with their labels.

use super::ink::{Colour, Dash, Stroke};
use super::label::{Area, Places, UPPER_RIGHT, Wanted};
use super::markup::{Anchor, Markup, Type, filled, number, stroked};
use super::scale::{Scale, ticks, written};
use super::{Curve, Mark, Plot, Shape};

/// Size of labels and of the figures at the axes, mm.
pub(super) const LABEL: f64 = 2.55;
/// Size of an axis' name, mm.
pub(super) const NAME: f64 = 2.75;
const MARK: f64 = 1.15;
/// Room for labels above a plot.
const ABOVE: f64 = 3.4;

/// Where a pane stands, and the margin beside it that labels may use.
#[derive(Clone, Copy, Debug)]
pub(super) struct Frame {
    pub area: Area,
    pub margin: f64,
    /// Left edge of the paper.
    pub edge: f64,
}

/// Draws a plot over the common axis, whose marked values are `marked`.
pub(super) fn plot(out: &mut Markup, plot: &Plot, frame: Frame, x: Scale, marked: &[f64]) {
    let Area { top, bottom, .. } = frame.area;
    let y = Scale {
        values: plot.y.range,
        paper: (bottom, top),
    };
    let drawn = Drawn { plot, frame, x, y };
    out.open(" class=\"pane\"");
    drawn.bands(out);
    drawn.axes(out, marked);
    drawn.curves(out);
    drawn.labels_and_marks(out);
    out.close();
}

struct Drawn<'a> {
    plot: &'a Plot,
    frame: Frame,
    x: Scale,
    y: Scale,
}

/// Faint lines behind everything.
fn faint(width: f64, opacity: f64) -> String {
    let stroke = Stroke {
        colour: Colour::Grey,
        dash: Dash::Solid,
        width,
    };
    format!("{} stroke-opacity=\"{}\"", stroked(stroke), number(opacity))
}

impl Drawn<'_> {
    fn place(&self, [x, y]: [f64; 2]) -> [f64; 2] {
        [self.x.at(x), self.y.at(y)]
    }

    fn bands(&self, out: &mut Markup) {
        let Area {
            left,
            right,
            top,
            bottom,
        } = self.frame.area;
        for band in &self.plot.bands {
            let from = self.x.at(band.range.0).clamp(left, right);
            let to = self.x.at(band.range.1).clamp(left, right);
            out.open(" class=\"band\"");
            out.title(&band.say);
            let fill = format!("{} fill-opacity=\"0.13\"", filled(band.colour));
            out.rectangle([from, top], [to - from, bottom - top], &fill);
            out.close();
        }
    }

    fn axes(&self, out: &mut Markup, marked: &[f64]) {
        let Area {
            left,
            right,
            top,
            bottom,
        } = self.frame.area;
        let rows = ((bottom - top) / 6.0).round().clamp(2.0, 12.0) as usize;
        let levels = ticks(self.plot.y.range, self.plot.y.kind, rows);
        let words = written(&levels, self.plot.y.kind);
        out.open(" class=\"axis\"");
        for value in marked {
            let x = self.x.at(*value);
            out.line([x, top], [x, bottom], &faint(0.12, 0.45));
        }
        for (level, word) in levels.iter().zip(&words) {
            let y = self.y.at(*level);
            out.line([left, y], [right, y], &faint(0.12, 0.45));
            let set = Type::of(LABEL).anchored(Anchor::End);
            out.text([left - 1.2, y + 0.36 * LABEL], word, set);
        }
        let edge = Stroke {
            colour: Colour::Ink,
            dash: Dash::Solid,
            width: 0.22,
        };
        out.line([left, top], [left, bottom], &stroked(edge));
        out.line([left, bottom], [right, bottom], &stroked(edge));
        let set = Type::of(NAME).anchored(Anchor::Middle);
        out.upright(
            [self.frame.edge + NAME, 0.5 * (top + bottom)],
            &self.plot.y.label,
            set,
        );
        out.close();
    }

    /// The stretches of a curve inside the plot, on paper.
    fn visible(&self, points: &[[f64; 2]]) -> Vec<Vec<[f64; 2]>> {
        let mut pieces: Vec<Vec<[f64; 2]>> = Vec::new();
        for pair in points.windows(2) {
            let [a, b] = [self.place(pair[0]), self.place(pair[1])];
            if !(a[1].is_finite() && b[1].is_finite()) {
                continue;
            }
            let Some([a, b]) = inside(&self.frame.area, a, b) else {
                continue;
            };
            match pieces.last_mut() {
                Some(piece) if piece.last() == Some(&a) => piece.push(b),
                _ => pieces.push(vec![a, b]),
            }
        }
        pieces.iter().map(|piece| thinned(piece)).collect()
    }

    fn curves(&self, out: &mut Markup) {
        for curve in &self.plot.curves {
            let Some((low, high)) = curve.underlaid else {
                continue;
            };
            let part: Vec<[f64; 2]> = curve
                .points
                .iter()
                .copied()
                .filter(|point| (low..=high).contains(&point[0]))
                .collect();
            let under = Stroke {
                colour: curve.stroke.colour,
                dash: Dash::Solid,
                width: 2.4,
            };
            for piece in self.visible(&part) {
                let look = format!("{} stroke-opacity=\"0.2\"", stroked(under));
                out.path(&piece, &look);
            }
        }
        for rule in &self.plot.rules {
            let y = self.y.at(rule.at);
            let Area { left, right, .. } = self.frame.area;
            out.open(" class=\"rule\"");
            out.title(&rule.label);
            out.line([left, y], [right, y], &stroked(rule.stroke));
            out.close();
        }
        for curve in &self.plot.curves {
            self.curve(out, curve);
        }
    }

    fn curve(&self, out: &mut Markup, curve: &Curve) {
        let mut attributes = format!(
            " class=\"curve\" data-name=\"{}\"",
            super::text::escaped(&curve.name)
        );
        for (key, value) in &curve.data {
            attributes.push_str(&format!(" data-{key}=\"{}\"", super::text::escaped(value)));
        }
        out.open(&attributes);
        out.title(&curve.name);
        for piece in self.visible(&curve.points) {
            let look = format!("{} stroke-linejoin=\"round\"", stroked(curve.stroke));
            out.path(&piece, &look);
        }
        // Figures under the pointer: places along the curve that nobody sees.
        for (point, say) in curve.points.iter().zip(&curve.say) {
            let at = self.place(*point);
            if !say.is_empty() && self.frame.area.overlaps(&Area::around(at, 0.01)) {
                out.open("");
                out.title(say);
                out.circle(at, 1.3, " fill-opacity=\"0\"");
                out.close();
            }
        }
        out.close();
    }

    fn labels_and_marks(&self, out: &mut Markup) {
        let Area {
            left,
            right,
            top,
            bottom,
        } = self.frame.area;
        let mut places = Places::new(Area {
            left: left + 0.4,
            top: top - ABOVE,
            right: right + self.frame.margin,
            bottom: bottom - 0.3,
        });
        let in_sight = |mark: &&Mark| {
            self.frame
                .area
                .overlaps(&Area::around(self.place(mark.at), 0.01))
        };
        let marks: Vec<&Mark> = self.plot.marks.iter().filter(in_sight).collect();
        for mark in &marks {
            places.mark(Area::around(self.place(mark.at), half(mark.shape)));
        }
        for curve in &self.plot.curves {
            for piece in self.visible(&curve.points) {
                places.avoid(&piece);
            }
        }
        for rule in &self.plot.rules {
            places.avoid(&[[left, self.y.at(rule.at)], [right, self.y.at(rule.at)]]);
        }
        let mut wanted: Vec<(Wanted, Type)> = Vec::new();
        let plain = Type::of(LABEL).halo();
        for mark in &marks {
            let label = Wanted {
                texts: &mark.labels,
                size: LABEL,
                anchors: vec![self.place(mark.at)],
                gap: half(mark.shape) + 0.25,
                towards: UPPER_RIGHT,
                modest: mark.modest,
            };
            wanted.push((label, plain));
        }
        for curve in &self.plot.curves {
            let label = Wanted {
                texts: &curve.labels,
                size: LABEL,
                anchors: anchors(&self.visible(&curve.points)),
                gap: 0.7,
                towards: UPPER_RIGHT,
                modest: false,
            };
            wanted.push((label, plain));
        }
        let of_rules: Vec<[String; 1]> = self
            .plot
            .rules
            .iter()
            .map(|rule| [rule.label.clone()])
            .collect();
        for (rule, texts) in self.plot.rules.iter().zip(&of_rules) {
            let y = self.y.at(rule.at);
            let label = Wanted {
                texts,
                size: LABEL,
                anchors: vec![[right + 0.3, y], [left + 1.0, y], [0.5 * (left + right), y]],
                gap: 0.6,
                towards: 0.0,
                modest: false,
            };
            wanted.push((label, plain));
        }
        for band in &self.plot.bands {
            let middle = self
                .x
                .at(0.5 * (band.range.0 + band.range.1))
                .clamp(left, right);
            let label = Wanted {
                texts: &band.labels,
                size: LABEL,
                anchors: vec![[middle, top + 0.4], [middle, bottom - 0.8]],
                gap: 0.3,
                towards: UPPER_RIGHT,
                modest: true,
            };
            wanted.push((label, plain.coloured(Colour::Grey)));
        }
        let found: Vec<_> = wanted
            .iter()
            .filter(|(label, _)| !label.texts.is_empty() && !label.anchors.is_empty())
            .filter_map(|(label, set)| Some((places.place(label)?, *set)))
            .collect();
        let thin = Stroke {
            colour: Colour::Grey,
            dash: Dash::Solid,
            width: 0.18,
        };
        for (placed, _) in &found {
            if let Some([from, to]) = placed.leader {
                out.line(from, to, &stroked(thin));
            }
        }
        for mark in &marks {
            self.mark(out, mark);
        }
        for (placed, set) in &found {
            out.text(placed.base, &placed.text, *set);
        }
    }

    fn mark(&self, out: &mut Markup, mark: &Mark) {
        let mut attributes = " class=\"mark\"".to_owned();
        for (key, value) in &mark.data {
            attributes.push_str(&format!(" data-{key}=\"{}\"", super::text::escaped(value)));
        }
        out.open(&attributes);
        out.title(&mark.say);
        shape(out, self.place(mark.at), mark.shape, mark.colour);
        out.close();
    }
}

/// Half of what a mark takes, mm.
fn half(shape: Shape) -> f64 {
    match shape {
        Shape::Disc | Shape::Ring | Shape::CrossedRing => MARK,
        Shape::End => 0.9,
        Shape::Square => 0.6,
    }
}

/// A mark on paper.
pub(super) fn shape(out: &mut Markup, at: [f64; 2], shape: Shape, colour: Colour) {
    let edge = Stroke {
        colour,
        dash: Dash::Solid,
        width: 0.4,
    };
    let ring = |out: &mut Markup| {
        out.circle(
            at,
            MARK - 0.2,
            &format!(" class=\"paper\" fill=\"{}\"", super::ink::PAPER),
        );
        out.circle(at, MARK - 0.2, &stroked(edge));
    };
    match shape {
        Shape::Disc => out.circle(at, MARK - 0.1, &filled(colour)),
        Shape::Ring => ring(out),
        Shape::CrossedRing => {
            ring(out);
            let d = 0.707 * (MARK - 0.2);
            let thin = stroked(Stroke { width: 0.3, ..edge });
            out.line([at[0] - d, at[1] - d], [at[0] + d, at[1] + d], &thin);
            out.line([at[0] - d, at[1] + d], [at[0] + d, at[1] - d], &thin);
        }
        Shape::End => out.line([at[0], at[1] - 1.1], [at[0], at[1] + 1.1], &stroked(edge)),
        Shape::Square => out.rectangle([at[0] - 0.55, at[1] - 0.55], [1.1, 1.1], &filled(colour)),
    }
}

/// A long piece with no more than four points for each width that the eye can tell apart: first, lowest, highest and last.
fn thinned(piece: &[[f64; 2]]) -> Vec<[f64; 2]> {
    const LONG: usize = 2000;
    const SEEN: f64 = 0.06;
    if piece.len() <= LONG {
        return piece.to_vec();
    }
    let column = |point: &[f64; 2]| (point[0] / SEEN).floor() as i64;
    let mut kept = Vec::new();
    for run in piece.chunk_by(|a, b| column(a) == column(b)) {
        let height = |a: &usize, b: &usize| run[*a][1].total_cmp(&run[*b][1]);
        let least = (0..run.len()).min_by(height).unwrap_or(0);
        let most = (0..run.len()).max_by(height).unwrap_or(0);
        let mut wanted = [0, least, most, run.len() - 1];
        wanted.sort_unstable();
        for (i, at) in wanted.iter().enumerate() {
            if i == 0 || wanted[i - 1] != *at {
                kept.push(run[*at]);
            }
        }
    }
    kept
}

/// Where a curve may be labelled: at its end, then along it, then at its beginning.
fn anchors(pieces: &[Vec<[f64; 2]>]) -> Vec<[f64; 2]> {
    let Some(longest) = pieces.iter().max_by_key(|piece| piece.len()) else {
        return Vec::new();
    };
    let at = |share: f64| longest[((longest.len() - 1) as f64 * share).round() as usize];
    [1.0, 0.9, 0.8, 0.7, 0.58, 0.45, 0.3, 0.15, 0.0]
        .map(at)
        .to_vec()
}

/// The part of a straight line inside an area's height.
fn inside(area: &Area, a: [f64; 2], b: [f64; 2]) -> Option<[[f64; 2]; 2]> {
    let (mut from, mut to) = (0.0f64, 1.0f64);
    for (start, step, low, high) in [
        (a[0], b[0] - a[0], area.left, area.right),
        (a[1], b[1] - a[1], area.top, area.bottom),
    ] {
        if step == 0.0 {
            if start < low || start > high {
                return None;
            }
            continue;
        }
        let (first, last) = ((low - start) / step, (high - start) / step);
        from = from.max(first.min(last));
        to = to.min(first.max(last));
    }
    let at = |share: f64| [0, 1].map(|i| a[i] + share * (b[i] - a[i]));
    // Ends that are inside stay what they are, so that pieces join.
    let first = if from == 0.0 { a } else { at(from) };
    let last = if to == 1.0 { b } else { at(to) };
    (from < to).then_some([first, last])
}

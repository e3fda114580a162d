//! A drawing of the network with its flows and heads, left to right by flow.
//!
//! A free surface is a tub of water, an outlet an arrow that falls, a point a dot, a pump a disc: full when it delivers, hollow when it is
//! stopped, crossed when it runs and delivers nothing. Lines that carry nothing are dashed.

mod layout;

use maud::{Markup, html};

use super::words::Words;
use crate::network::{LineId, NodeId, NodeKind};
use crate::solve::LineState;
use crate::study::assessment::Assessment;
use crate::units::Kind;
use layout::{Edge, layout};

/// Networks of more lines are not drawn.
pub const MOST_LINES: usize = 60;

/// Distances in the drawing, in its own units (CSS pixels at full size).
const COLUMN: f64 = 118.0;
const ROW: f64 = 58.0;
const MARGIN: (f64, f64) = (90.0, 54.0);
const DISC: f64 = 11.0;

/// The drawing as SVG; none for a network too large to be read that way.
pub fn sketch(words: &Words, assessment: &Assessment) -> Option<Markup> {
    let network = words.network;
    if network.lines().len() > MOST_LINES {
        return None;
    }
    let backward = |id: LineId| assessment.lines[id.index()].flow < 0.0;
    let edges: Vec<Edge> = network
        .line_ids()
        .map(|id| {
            let line = network.line(id);
            let (from, to) = (line.from.index(), line.to.index());
            match backward(id) {
                false => Edge { from, to },
                true => Edge { from: to, to: from },
            }
        })
        .collect();
    let placed = layout(network.nodes().len(), &edges);
    let at = |(column, height): (usize, f64)| {
        (MARGIN.0 + COLUMN * column as f64, MARGIN.1 + ROW * height)
    };
    let width = 2.0 * MARGIN.0 + COLUMN * (placed.columns - 1) as f64;
    let height = 2.0 * MARGIN.1 + ROW * placed.height;
    let drawing = Drawing { words, assessment };
    Some(html! {
        svg class="sketch" viewBox=(format!("0 0 {width:.0} {height:.0}")) width=(format!("{width:.0}"))
            role="img" aria-label="The network with its flows and heads" xmlns="http://www.w3.org/2000/svg" {
            title { "The network with its flows and heads" }
            @for ((id, way), edge) in network.line_ids().zip(&placed.ways).zip(&edges) {
                (drawing.line(id, &[
                    vec![at(placed.nodes[edge.from])],
                    way.iter().map(|place| at(*place)).collect(),
                    vec![at(placed.nodes[edge.to])],
                ].concat()))
            }
            @for (id, place) in network.node_ids().zip(&placed.nodes) {
                (drawing.node(id, at(*place)))
            }
        }
    })
}

struct Drawing<'a> {
    words: &'a Words<'a>,
    assessment: &'a Assessment,
}

impl Drawing<'_> {
    /// A line through its places, with its pump and its label at the middle one.
    fn line(&self, id: LineId, places: &[(f64, f64)]) -> Markup {
        let network = self.words.network;
        let (line, does) = (network.line(id), &self.assessment.lines[id.index()]);
        let (x, y) = places[places.len() / 2];
        let carries = does.flow.abs() > 0.0;
        let flow = match does.state {
            LineState::Open => self.words.figure(Kind::Flow, does.flow.abs()),
            LineState::Checked => "held shut".to_owned(),
            LineState::Stopped => "stopped".to_owned(),
            LineState::Closed => "closed".to_owned(),
        };
        let pumps: Vec<_> = line.pumps().collect();
        html! {
            g class="line" {
                title { (line.name) ": " (flow) }
                path d=(smooth(places)) class=(if carries { "carries" } else { "still" }) {}
                @if carries { (arrow(places)) }
                @for (i, pump) in pumps.iter().enumerate() {
                    @let running = self.assessment.pumps[pump.index()].running;
                    @let cx = x - 13.0 * (pumps.len() - 1) as f64 + 26.0 * i as f64 - 4.0;
                    circle cx=(format!("{cx:.1}")) cy=(format!("{y:.1}")) r=(DISC)
                        class=(if running && carries { "runs" } else { "stands" }) {}
                    @if running && !carries {
                        path class="crossed" d=(format!("M{:.1} {:.1}l14 14m0 -14l-14 14", cx - 7.0, y - 7.0)) {}
                    }
                }
                @let lift = if pumps.is_empty() { 6.0 } else { DISC + 5.0 };
                text x=(format!("{x:.1}")) y=(format!("{:.1}", y - lift)) class="name" { (line.name) }
                text x=(format!("{x:.1}")) y=(format!("{:.1}", y + lift + 9.0)) class="figure" { (flow) }
            }
        }
    }

    fn node(&self, id: NodeId, (x, y): (f64, f64)) -> Markup {
        let network = self.words.network;
        let node = network.node(id);
        let head = self.assessment.nodes[id.index()].head;
        let head = head.map_or("no head".to_owned(), |head| {
            self.words.figure(Kind::Length, head)
        });
        let below = match node.kind {
            NodeKind::Point { .. } => 20.0,
            _ => 30.0,
        };
        html! {
            g class="node" {
                title { (node.name) ": head " (head) }
                @match node.kind {
                    NodeKind::Point { .. } => circle cx=(format!("{x:.1}")) cy=(format!("{y:.1}")) r="4.5" class="point" {},
                    NodeKind::Reservoir | NodeKind::Tank { .. } => {
                        rect x=(format!("{:.1}", x - 22.0)) y=(format!("{:.1}", y - 8.0)) width="44" height="24" class="water" {}
                        path class="tub" d=(format!("M{:.1} {:.1}v32h44v-32", x - 22.0, y - 16.0)) {}
                        path class="surface" d=(format!("M{:.1} {:.1}h44", x - 22.0, y - 8.0)) {}
                    },
                    NodeKind::Outlet { .. } => {
                        path class="falls" d=(format!("M{:.1} {:.1}h12q10 0 10 10v10m-5 -6l5 7l5 -7", x - 8.0, y)) {}
                    },
                }
                text x=(format!("{x:.1}")) y=(format!("{:.1}", y - 22.0)) class="name" { (node.name) }
                text x=(format!("{x:.1}")) y=(format!("{:.1}", y + below)) class="figure" { (head) }
            }
        }
    }
}

/// A curve that leaves and reaches every place level.
fn smooth(places: &[(f64, f64)]) -> String {
    let mut d = String::new();
    for (i, &(x, y)) in places.iter().enumerate() {
        if i == 0 {
            d.push_str(&format!("M{x:.1} {y:.1}"));
            continue;
        }
        let (before, above) = places[i - 1];
        let half = 0.5 * (before + x);
        d.push_str(&format!(
            "C{half:.1} {above:.1} {half:.1} {y:.1} {x:.1} {y:.1}"
        ));
    }
    d
}

/// A small arrow in the direction of flow, halfway from the middle of a line to its next place.
///
/// There a level curve from (x0, y0) to (x1, y1) has the slope 1.5 (y1 - y0)/(x1 - x0).
fn arrow(places: &[(f64, f64)]) -> Markup {
    let middle = places.len() / 2;
    let ((x0, y0), (x1, y1)) = (places[middle], places[middle + 1]);
    let (x, y) = (0.5 * (x0 + x1), 0.5 * (y0 + y1));
    let turn = (1.5 * (y1 - y0)).atan2(x1 - x0).to_degrees();
    html! { path class="arrow" d="M-5 -4l9 4l-9 4z" transform=(format!("translate({x:.1} {y:.1}) rotate({turn:.0})")) {} }
}

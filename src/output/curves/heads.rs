//! The upper plot: head against the station's flow.

use super::{Telling, combined_stroke, point_shape, system_stroke};
use crate::output::chart::{Axis, Colour, Curve, Dash, Mark, Plot, Shape, Stroke};
use crate::study::curves::{CombinedCurve, FlowHead, PumpCurve};
use crate::units::Kind;

/// Height of the plot, mm.
const HEIGHT: f64 = 96.0;
/// So many points have room for their flows.
const FEW: usize = 4;
/// Room above the highest shut-off head.
const ROOM: f64 = 1.07;
/// A pump's own curve is drawn where its branch takes at least this share of its head somewhere.
const VISIBLE: f64 = 0.01;

pub(super) fn plot(telling: &Telling) -> Plot {
    let mut plot = Plot {
        height: HEIGHT,
        y: Axis {
            label: format!("Head, {}", telling.symbol(Kind::Length)),
            range: range(telling),
            ..Axis::default()
        },
        ..Plot::default()
    };
    for pump in own(telling) {
        plot.curves.push(own_curve(telling, pump));
    }
    for system in 0..telling.curves.systems.len() {
        plot.curves.push(system_curve(telling, system));
    }
    for position in 0..telling.curves.combined.len() {
        combined(telling, position, &mut plot);
    }
    plot.marks.extend(points(telling));
    plot
}

/// From no head, or the lowest that a system asks for within reason, to a little above the highest shut-off head.
fn range(telling: &Telling) -> (f64, f64) {
    let curves = telling.curves;
    let given = curves.combined.iter().flat_map(|curve| &curve.points);
    let highest = given.map(|point| point.head).fold(0.0, f64::max);
    let asked = curves.systems.iter().flat_map(|system| &system.points);
    let lowest = asked.map(|point| point.head).fold(0.0, f64::min);
    let given = curves.combined.iter().flat_map(|curve| &curve.points);
    let least = given.map(|point| point.head).fold(f64::INFINITY, f64::min);
    let static_head = curves
        .systems
        .iter()
        .filter_map(|system| system.points.first());
    let least = static_head.map(|point| point.head).fold(least, f64::min);
    // Where nothing happens in the lower half it is left out.
    let low = if least > 0.5 * highest {
        least - 0.25 * (highest - least)
    } else {
        lowest.max(-0.25 * highest)
    };
    (telling.length(low), telling.length(ROOM * highest))
}

fn coordinates(telling: &Telling, points: &[FlowHead]) -> Vec<[f64; 2]> {
    points
        .iter()
        .map(|point| [telling.flow(point.flow), telling.length(point.head)])
        .collect()
}

fn said(telling: &Telling, name: &str, points: &[FlowHead], every: usize) -> Vec<String> {
    let say = |(i, point): (usize, &FlowHead)| match i % every {
        0 => format!(
            "{name}: {} at {}",
            head(telling, point.head),
            flow(telling, point.flow)
        ),
        _ => String::new(),
    };
    points.iter().enumerate().map(say).collect()
}

fn flow(telling: &Telling, value: f64) -> String {
    telling.units.with_unit(Kind::Flow, value)
}

fn head(telling: &Telling, value: f64) -> String {
    telling.units.with_unit(Kind::Length, value)
}

fn system_curve(telling: &Telling, position: usize) -> Curve {
    let system = &telling.curves.systems[position];
    let words = telling.system(position);
    let name = format!("system, {words}");
    let letter = telling.letter(position);
    let first = telling.case(system.cases[0]);
    let labels = match letter.as_str() {
        "" => vec!["system".to_owned()],
        letter => vec![format!("{letter}: {first}"), letter.to_owned()],
    };
    Curve {
        data: vec![
            ("kind", "system".to_owned()),
            ("case", words),
            ("tag", letter),
        ],
        labels,
        stroke: system_stroke(position),
        points: coordinates(telling, &system.points),
        say: said(telling, &name, &system.points, 4),
        name,
        underlaid: None,
    }
}

fn combined(telling: &Telling, position: usize, plot: &mut Plot) {
    let curve = &telling.curves.combined[position];
    let name = telling.combined(curve);
    let tag = telling.number(position);
    let stroke = combined_stroke(telling.curves, position);
    let labels = match tag.as_str() {
        "" => vec![name.clone()],
        tag => vec![format!("{tag}: {name}"), tag.to_owned()],
    };
    let data = |kind: &str| {
        vec![
            ("kind", kind.to_owned()),
            ("case", telling.case(curve.case).to_owned()),
            ("running", telling.names(curve.case, &curve.running)),
            ("tag", tag.clone()),
        ]
    };
    plot.curves.push(Curve {
        data: data("combined"),
        labels,
        stroke,
        points: coordinates(telling, &curve.points),
        say: said(telling, &name, &curve.points, 4),
        name: name.clone(),
        underlaid: curve
            .preferred
            .map(|(low, high)| (telling.flow(low), telling.flow(high))),
    });
    if !curve.beyond.is_empty() {
        let name = format!("{name}, past the end of a pump's curve");
        plot.curves.push(Curve {
            data: data("past the end"),
            stroke: Stroke {
                dash: Dash::WideDots,
                ..stroke
            },
            points: coordinates(telling, &curve.beyond),
            say: said(telling, &name, &curve.beyond, 4),
            name,
            ..Curve::default()
        });
    }
    plot.marks
        .extend(ends(telling, curve, &name, stroke.colour));
}

/// Shut-off and end of curve.
fn ends(telling: &Telling, curve: &CombinedCurve, name: &str, colour: Colour) -> Vec<Mark> {
    let mark = |point: &FlowHead, shape, say: String| Mark {
        at: [telling.flow(point.flow), telling.length(point.head)],
        shape,
        colour,
        say,
        ..Mark::default()
    };
    let first = curve.points.first().map(|point| {
        let say = format!("{name}: shut-off head {}", head(telling, point.head));
        mark(point, Shape::Square, say)
    });
    let last = curve.points.last().map(|point| {
        let say = format!(
            "{name}: end of curve at {}, {}",
            flow(telling, point.flow),
            head(telling, point.head)
        );
        mark(point, Shape::End, say)
    });
    first.into_iter().chain(last).collect()
}

fn points<'t>(telling: &'t Telling) -> impl Iterator<Item = Mark> + 't {
    let few = telling.curves.points.len() <= FEW;
    telling.curves.points.iter().map(move |point| {
        let tag = telling.tag(point);
        let curve = &telling.curves.combined[point.combined];
        let set = telling.set(point.case, &curve.running);
        let flows = point
            .pumps
            .iter()
            .map(|(_, pump)| telling.units.number(Kind::Flow, pump.flow));
        let each = crate::output::duty::listed(&flows.collect::<Vec<_>>());
        Mark {
            at: [telling.flow(point.at.flow), telling.length(point.at.head)],
            shape: point_shape(telling, point),
            colour: system_stroke(point.system).colour,
            labels: if few {
                vec![
                    format!("{tag}  {}", flow(telling, point.at.flow)),
                    tag.clone(),
                ]
            } else {
                vec![tag.clone()]
            },
            modest: false,
            say: format!(
                "{tag}  {}, {set}: {} at {} ({each} {} each)",
                telling.case(point.case),
                flow(telling, point.at.flow),
                head(telling, point.at.head),
                telling.symbol(Kind::Flow)
            ),
            data: vec![
                ("kind", "operating point".to_owned()),
                ("case", telling.case(point.case).to_owned()),
                ("running", telling.names(point.case, &curve.running)),
                ("tag", tag),
                ("flow", telling.flow(point.at.flow).to_string()),
                ("head", telling.length(point.at.head).to_string()),
            ],
        }
    })
}

/// The pumps of the first case whose own curve differs visibly from what they give behind their branch.
pub(super) fn own<'t>(telling: &'t Telling) -> Vec<&'t PumpCurve> {
    let curves = telling.curves;
    let differs = |pump: &&PumpCurve| {
        let alone = curves
            .combined
            .iter()
            .find(|curve| curve.case == 0 && curve.running == pump.pumps[..1]);
        let (Some(alone), Some(last)) = (alone, pump.points.last()) else {
            return false;
        };
        let (Some(end), Some(own)) = (alone.points.last(), last.head) else {
            return false;
        };
        let highest = alone.points.first().map_or(0.0, |point| point.head);
        (own - end.head).abs() > VISIBLE * highest
    };
    curves
        .pumps
        .iter()
        .filter(|pump| pump.case == 0)
        .filter(differs)
        .collect()
}

pub(super) const OWN: Stroke = Stroke {
    colour: Colour::Blue,
    dash: Dash::Dots,
    width: 0.3,
};

fn own_curve(telling: &Telling, pump: &PumpCurve) -> Curve {
    let name = format!("{}, its branch losses not taken off", telling.pump(pump));
    let points: Vec<FlowHead> = pump
        .points
        .iter()
        .filter_map(|point| {
            Some(FlowHead {
                flow: point.flow,
                head: point.head?,
            })
        })
        .collect();
    Curve {
        data: vec![
            ("kind", "pump".to_owned()),
            ("case", telling.case(pump.case).to_owned()),
        ],
        stroke: OWN,
        points: coordinates(telling, &points),
        say: said(telling, &name, &points, 6),
        name,
        ..Curve::default()
    }
}

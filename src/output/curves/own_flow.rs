//! The lower plots: efficiency, power and NPSH over the flow of one pump.

use super::{Telling, dash, point_shape, system_stroke};
use crate::output::chart::{Axis, Band, Colour, Curve, Dash, Mark, Plot, Rule, Shape, Stroke};
use crate::solve::operation::{Place, PumpOperation};
use crate::study::curves::{PumpCurve, SuctionCurve};
use crate::units::Kind;

/// Room above the highest figure.
const ROOM: f64 = 1.12;
/// NPSH available is shown up to so many times the most that is required.
const ENOUGH: f64 = 4.0;

/// The plots that have something to show.
pub(super) fn plots(telling: &Telling) -> Vec<Plot> {
    let efficiency = Figure {
        name: "Pump efficiency",
        kind: Kind::Percent,
        height: 30.0,
        of: |pump| pump.efficiency,
    };
    let power = Figure {
        name: "Shaft power",
        kind: Kind::Power,
        height: 27.0,
        of: |pump| pump.shaft_power,
    };
    let npsh = Figure {
        name: "NPSH",
        kind: Kind::Length,
        height: 34.0,
        of: |pump| pump.npsh_required,
    };
    let mut plots = vec![
        efficiency.plot(telling),
        power.plot(telling),
        npsh.plot(telling),
    ];
    ratings(telling, &mut plots[1]);
    suctions(telling, &mut plots[2]);
    plots.retain(|plot| !plot.curves.is_empty());
    if let Some(first) = plots.first_mut() {
        let (low, high) = telling.preferred();
        let region = format!(
            "{:.0} to {:.0} % of best efficiency",
            100.0 * low,
            100.0 * high
        );
        // Several would take each other's room; the key says what they are.
        if let [band] = first.bands.as_mut_slice() {
            band.labels = vec![format!("preferred: {region}"), "preferred".to_owned()];
        }
    }
    for plot in &mut plots {
        plot.y.range.1 = ROOM * highest(plot);
    }
    if let Some(npsh) = plots
        .iter_mut()
        .find(|plot| plot.y.label.starts_with("NPSH"))
    {
        // Far above what is required nothing is to be seen.
        let required = telling.curves.pumps.iter().flat_map(|pump| &pump.points);
        let most = required
            .filter_map(|point| point.npsh_required)
            .fold(0.0, f64::max);
        npsh.y.range.1 = npsh.y.range.1.min(telling.length(ENOUGH * most));
    }
    plots
}

/// One figure of pumps over their flow.
struct Figure {
    name: &'static str,
    kind: Kind,
    height: f64,
    of: fn(&PumpOperation) -> Option<f64>,
}

impl Figure {
    fn plot(&self, telling: &Telling) -> Plot {
        let mut curves: Vec<Curve> = Vec::new();
        for (position, pump) in telling.curves.pumps.iter().enumerate() {
            let curve = self.curve(telling, position, pump);
            // Wear changes neither power nor NPSH required: one curve serves.
            let drawn = |curve: &Curve| curves.iter().any(|other| coincide(other, curve));
            curves.extend(curve.filter(|curve| !drawn(curve)));
        }
        if let [only] = curves.as_mut_slice() {
            only.labels = match self.kind {
                Kind::Length => vec!["required".to_owned()],
                _ => Vec::new(),
            };
        }
        Plot {
            height: self.height,
            y: Axis {
                label: format!("{}, {}", self.name, telling.symbol(self.kind)),
                ..Axis::default()
            },
            marks: if curves.is_empty() {
                Vec::new()
            } else {
                self.marks(telling)
            },
            bands: banded(telling).map(|pump| band(telling, pump)).collect(),
            curves,
            rules: Vec::new(),
        }
    }

    fn curve(&self, telling: &Telling, position: usize, pump: &PumpCurve) -> Option<Curve> {
        let words = telling.pump(pump);
        let value = |point: &PumpOperation| Some((point.flow, (self.of)(point)?));
        let known: Vec<(f64, f64)> = pump.points.iter().filter_map(value).collect();
        if known.len() < 2 {
            return None;
        }
        let say = |(i, (flow, value)): (usize, &(f64, f64))| match i % 4 {
            0 => format!(
                "{words}: {} {} at {}",
                self.name.to_lowercase().replace("npsh", "NPSH required"),
                telling.units.with_unit(self.kind, *value),
                telling.units.with_unit(Kind::Flow, *flow)
            ),
            _ => String::new(),
        };
        let short = telling.pump_in_short(pump);
        let labels = match self.kind {
            Kind::Length => vec![format!("required, {words}"), format!("required, {short}")],
            _ => vec![words.clone(), short],
        };
        let place = |(flow, value): &(f64, f64)| {
            [
                telling.flow(*flow),
                telling.units.from_si(self.kind, *value),
            ]
        };
        Some(Curve {
            name: words.clone(),
            data: vec![("kind", self.name.to_lowercase()), ("pump", words.clone())],
            labels,
            stroke: pump_stroke(telling, position),
            say: known.iter().enumerate().map(say).collect(),
            points: known.iter().map(place).collect(),
            underlaid: None,
        })
    }

    /// The operating points, each pump at its own flow; equal pumps of a point once.
    fn marks(&self, telling: &Telling) -> Vec<Mark> {
        let mut marks: Vec<Mark> = Vec::new();
        for point in &telling.curves.points {
            let mut known: Vec<(f64, f64)> = Vec::new();
            for (id, pump) in &point.pumps {
                // off its curve no figure is certain
                let certain = pump.place == Place::OnCurve;
                let Some(value) = (self.of)(pump).filter(|_| certain) else {
                    continue;
                };
                let near = |other: &(f64, f64)| {
                    (other.0 - pump.flow).abs() < 1e-9
                        && (other.1 - value).abs() < 1e-9 * value.abs()
                };
                if known.iter().any(near) {
                    continue;
                }
                known.push((pump.flow, value));
                let tag = telling.tag(point);
                marks.push(Mark {
                    at: [
                        telling.flow(pump.flow),
                        telling.units.from_si(self.kind, value),
                    ],
                    shape: small(point_shape(telling, point)),
                    colour: system_stroke(point.system).colour,
                    modest: true,
                    say: format!(
                        "{tag}  {}: {} at {}",
                        telling.network(point.case).pump(*id).name,
                        telling.units.with_unit(self.kind, value),
                        telling.units.with_unit(Kind::Flow, pump.flow)
                    ),
                    labels: vec![tag],
                    data: Vec::new(),
                });
            }
        }
        marks
    }
}

/// Whether one curve lies on another, as far as both go.
fn coincide(a: &Curve, b: &Curve) -> bool {
    let near = |(a, b): (&[f64; 2], &[f64; 2])| {
        (0..2).all(|i| (a[i] - b[i]).abs() <= 1e-9 * (1.0 + a[i].abs()))
    };
    a.points.len() == b.points.len() && a.points.iter().zip(&b.points).all(near)
}

/// The lower plots are too low for anything but discs and rings.
fn small(shape: Shape) -> Shape {
    match shape {
        Shape::Disc => Shape::Disc,
        _ => Shape::Ring,
    }
}

/// Pumps of the first case whose best efficiency is known.
fn banded<'t>(telling: &'t Telling) -> impl Iterator<Item = &'t PumpCurve> {
    let pumps = telling.curves.pumps.iter();
    pumps.filter(|pump| pump.case == 0 && pump.best_efficiency_flow.is_some())
}

fn band(telling: &Telling, pump: &PumpCurve) -> Band {
    let (low, high) = telling.preferred();
    let best = pump.best_efficiency_flow.unwrap_or(0.0);
    Band {
        range: (telling.flow(low * best), telling.flow(high * best)),
        colour: Colour::Blue,
        labels: Vec::new(),
        say: format!(
            "{}: preferred from {} to {}",
            telling.pump(pump),
            telling.units.with_unit(Kind::Flow, low * best),
            telling.units.with_unit(Kind::Flow, high * best)
        ),
    }
}

/// Look of a pump's own curves.
pub(super) fn pump_stroke(telling: &Telling, position: usize) -> Stroke {
    let pumps = &telling.curves.pumps;
    let first = pumps[position].case == 0;
    let before = pumps[..position]
        .iter()
        .filter(|other| (other.case == 0) == first);
    Stroke {
        colour: if first { Colour::Blue } else { Colour::Purple },
        dash: dash(before.count() + usize::from(!first)),
        width: if first { 0.5 } else { 0.4 },
    }
}

fn ratings(telling: &Telling, plot: &mut Plot) {
    let mut rated: Vec<(f64, Vec<&PumpCurve>)> = Vec::new();
    for pump in telling.curves.pumps.iter().filter(|pump| pump.case == 0) {
        let Some(rating) = pump.rated else {
            continue;
        };
        match rated.iter_mut().find(|(known, _)| *known == rating) {
            Some((_, pumps)) => pumps.push(pump),
            None => rated.push((rating, vec![pump])),
        }
    }
    let several = rated.len() > 1;
    for (rating, pumps) in rated {
        let of = if several {
            format!("{} ", telling.pump(pumps[0]))
        } else {
            String::new()
        };
        plot.rules.push(Rule {
            at: telling.units.from_si(Kind::Power, rating),
            stroke: Stroke {
                colour: Colour::Grey,
                dash: Dash::Short,
                width: 0.3,
            },
            label: format!("{of}motor {}", telling.units.format(Kind::Power, rating)),
        });
    }
}

/// Look of a curve of NPSH available.
fn suction_stroke(position: usize) -> Stroke {
    Stroke {
        colour: Colour::Green,
        dash: dash(position),
        width: 0.42,
    }
}

fn suctions(telling: &Telling, plot: &mut Plot) {
    if plot.curves.is_empty() {
        return;
    }
    let suctions = &telling.curves.suctions;
    for (position, suction) in suctions.iter().enumerate() {
        let words = available(telling, suction, suctions.len() > 1);
        let place = |(flow, head): &(f64, f64)| [telling.flow(*flow), telling.length(*head)];
        let say = |(i, (flow, head)): (usize, &(f64, f64))| match i % 4 {
            0 => format!(
                "NPSH {words}: {} at {}",
                telling.units.with_unit(Kind::Length, *head),
                telling.units.with_unit(Kind::Flow, *flow)
            ),
            _ => String::new(),
        };
        plot.curves.push(Curve {
            name: format!("NPSH {words}"),
            data: vec![("kind", "npsh available".to_owned())],
            labels: vec![words.clone(), short(telling, suction)],
            stroke: suction_stroke(position),
            points: suction.points.iter().map(place).collect(),
            say: suction.points.iter().enumerate().map(say).collect(),
            underlaid: None,
        });
    }
}

/// The letter of the system, or the tag of the point that the case brings.
fn short(telling: &Telling, suction: &SuctionCurve) -> String {
    let case = suction.cases[0];
    let curves = telling.curves;
    let system = curves
        .systems
        .iter()
        .position(|system| system.cases[0] == case);
    let point = curves.points.iter().find(|point| point.case == case);
    let name = match (system, point) {
        (Some(system), _) if curves.systems.len() > 1 => telling.letter(system),
        (_, Some(point)) => telling.tag(point),
        _ => String::new(),
    };
    format!("available {name}").trim_end().to_owned()
}

fn available(telling: &Telling, suction: &SuctionCurve, several: bool) -> String {
    let mut words = "available".to_owned();
    if several {
        if telling.curves.stages.len() > 1 {
            let network = telling.network(suction.cases[0]);
            words.push_str(&format!(" to {}", network.pump(suction.pump).name));
        }
        words.push_str(&format!(", {}", telling.case(suction.cases[0])));
    }
    match suction.beside {
        Some(1) => words + ", alone",
        Some(pumps) => format!("{words}, {pumps} running"),
        None => words,
    }
}

fn highest(plot: &Plot) -> f64 {
    let of_curves = plot
        .curves
        .iter()
        .flat_map(|curve| &curve.points)
        .map(|point| point[1]);
    let of_rules = plot.rules.iter().map(|rule| rule.at);
    of_curves.chain(of_rules).fold(0.0, f64::max)
}

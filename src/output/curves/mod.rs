//! The curves as a picture, as rows for programs and in words: names, tags and colours that all three share.

mod figure;
mod heads;
mod own_flow;
mod rows;
mod sentences;

pub use figure::figure;
pub use rows::{points, rows};
pub use sentences::{notes, summary};

use super::chart::{Colour, Dash, Shape, Stroke};
use crate::network::Network;
use crate::part::PumpId;
use crate::solve::operation::{Place, PumpOperation};
use crate::study::curves::{CombinedCurve, Curves, OperatingPoint, PumpCurve};
use crate::units::{Kind, UnitSet};

/// What the curves are told with.
#[derive(Clone, Copy)]
pub struct Telling<'a> {
    /// The curves.
    pub curves: &'a Curves,
    /// Name and network of each case; the file as it stands has no name.
    pub cases: &'a [(String, &'a Network)],
    /// For figures.
    pub units: &'a UnitSet,
    /// The file's title.
    pub title: &'a str,
}

/// The file as it stands, in words and for programs.
const AS_IT_STANDS: &str = "as the file stands";
const AS_IS: &str = "as-is";

impl<'a> Telling<'a> {
    fn network(&self, case: usize) -> &'a Network {
        self.cases[case].1
    }

    /// The preferred region as shares of best-efficiency flow.
    fn preferred(&self) -> (f64, f64) {
        self.network(0).limits().preferred()
    }

    fn case(&self, case: usize) -> &'a str {
        match self.cases[case].0.as_str() {
            "" => AS_IT_STANDS,
            name => name,
        }
    }

    fn cases_for_programs(&self, cases: &[usize]) -> String {
        let name = |case: &usize| match self.cases[*case].0.as_str() {
            "" => AS_IS,
            name => name,
        };
        cases.iter().map(name).collect::<Vec<_>>().join("; ")
    }

    fn flow(&self, flow: f64) -> f64 {
        self.units.from_si(Kind::Flow, flow)
    }

    fn length(&self, length: f64) -> f64 {
        self.units.from_si(Kind::Length, length)
    }

    fn symbol(&self, kind: Kind) -> &'static str {
        self.units.unit(kind).symbol
    }

    /// Pumps in the fewest words: `2 × big + small`; one of a bank by its own name.
    fn set(&self, case: usize, pumps: &[PumpId]) -> String {
        let network = self.network(case);
        let mut groups: Vec<(&str, Vec<&str>)> = Vec::new();
        for pump in pumps {
            let line = network.line_of(*pump);
            let name = network.pump(*pump).name.as_str();
            let bank = network
                .banks()
                .iter()
                .find(|bank| bank.lines.contains(&line));
            let group = bank.map_or(name, |bank| bank.name.as_str());
            match groups.iter_mut().find(|(known, _)| *known == group) {
                Some((_, members)) => members.push(name),
                None => groups.push((group, vec![name])),
            }
        }
        let words = groups
            .iter()
            .map(|(group, members)| match members.as_slice() {
                [one] => (*one).to_owned(),
                several => format!("{} \u{d7} {group}", several.len()),
            });
        words.collect::<Vec<_>>().join(" + ")
    }

    fn names(&self, case: usize, pumps: &[PumpId]) -> String {
        let network = self.network(case);
        let name = |pump: &PumpId| network.pump(*pump).name.as_str();
        pumps.iter().map(name).collect::<Vec<_>>().join(" + ")
    }

    /// What a combined curve is of: its pumps in the first case; in another, which one.
    fn combined(&self, curve: &CombinedCurve) -> String {
        match (curve.stage, curve.case) {
            (Some(_), _) => format!("{} alone", self.set(curve.case, &curve.running)),
            (None, 0) => self.set(curve.case, &curve.running),
            (None, case) => self.case(case).to_owned(),
        }
    }

    /// Pumps alike, a whole bank by its name; and the case where it is not the first.
    fn pump(&self, curve: &PumpCurve) -> String {
        let network = self.network(curve.case);
        let whole = network.banks().iter().find(|bank| {
            let of_bank = bank
                .lines
                .iter()
                .flat_map(|line| network.line(*line).pumps());
            of_bank.eq(curve.pumps.iter().copied())
        });
        let set = whole.map_or_else(
            || self.set(curve.case, &curve.pumps),
            |bank| bank.name.clone(),
        );
        match curve.case {
            0 => set,
            case => format!("{set}, {}", self.case(case)),
        }
    }

    fn system(&self, position: usize) -> String {
        let cases = &self.curves.systems[position].cases;
        let first = self.case(cases[0]);
        match cases.len() - 1 {
            0 => first.to_owned(),
            others => format!("{first} (and {others} more)"),
        }
    }

    /// Letter of a system curve; none where there is only one.
    fn letter(&self, system: usize) -> String {
        if self.curves.systems.len() < 2 {
            return String::new();
        }
        let letter = char::from(b'A' + (system % 26) as u8);
        match system / 26 {
            0 => letter.to_string(),
            round => format!("{letter}{round}"),
        }
    }

    /// Number of a combined curve; none for those that no operating point can stand on.
    fn number(&self, combined: usize) -> String {
        match self.curves.combined[combined].stage {
            None => (combined + 1).to_string(),
            Some(_) => String::new(),
        }
    }

    /// The case of a pump's own curve by the number of the combined curve that it brings.
    fn pump_in_short(&self, curve: &PumpCurve) -> String {
        let set = self.set(curve.case, &curve.pumps);
        let combined = self
            .curves
            .combined
            .iter()
            .position(|other| other.case == curve.case);
        match combined.filter(|_| curve.case > 0) {
            Some(combined) => format!("{set} ({})", self.number(combined)),
            None => set,
        }
    }

    fn tag(&self, point: &OperatingPoint) -> String {
        self.letter(point.system) + &self.number(point.combined)
    }
}

/// Look of a system curve.
fn system_stroke(system: usize) -> Stroke {
    const LOOKS: [(Colour, Dash); 7] = [
        (Colour::Vermillion, Dash::Solid),
        (Colour::Green, Dash::Long),
        (Colour::Orange, Dash::DashDot),
        (Colour::Ink, Dash::Short),
        (Colour::Sky, Dash::DashDotDot),
        (Colour::Vermillion, Dash::Dots),
        (Colour::Grey, Dash::Long),
    ];
    let (colour, dash) = LOOKS[system % LOOKS.len()];
    Stroke {
        colour,
        dash,
        width: 0.42,
    }
}

/// Dashes of curves of one colour.
fn dash(position: usize) -> Dash {
    const DASHES: [Dash; 5] = [
        Dash::Solid,
        Dash::Long,
        Dash::Short,
        Dash::DashDot,
        Dash::DashDotDot,
    ];
    DASHES[position % DASHES.len()]
}

/// Look of a combined curve: those of the first case alike, since they lie apart; others by their place.
fn combined_stroke(curves: &Curves, position: usize) -> Stroke {
    let curve = &curves.combined[position];
    let before = curves.combined[..position].iter();
    let (colour, dash) = match (curve.stage, curve.case) {
        (Some(stage), _) => (Colour::Sky, dash(stage)),
        (None, 0) => (Colour::Blue, Dash::Solid),
        (None, _) => (
            Colour::Purple,
            dash(1 + before.filter(|other| other.case > 0).count() % 4),
        ),
    };
    Stroke {
        colour,
        dash,
        width: 0.6,
    }
}

/// What is to be said of a point, the gravest first.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Remark {
    PastCurve,
    Idle,
    NpshShort,
    OutsidePreferred,
    None,
}

impl Remark {
    fn of(telling: &Telling, point: &OperatingPoint) -> Self {
        let any = |holds: &dyn Fn(&PumpOperation) -> bool| {
            point.pumps.iter().any(|(_, pump)| holds(pump))
        };
        let (low, high) = telling.preferred();
        if any(&|pump| pump.place != Place::OnCurve) {
            Self::PastCurve
        } else if any(&|pump| pump.flow <= 0.0) {
            Self::Idle
        } else if any(&|pump| pump.npsh_margin().is_some_and(|margin| margin < 0.0)) {
            Self::NpshShort
        } else if point
            .shares()
            .is_some_and(|(least, most)| least < low || most > high)
        {
            Self::OutsidePreferred
        } else {
            Self::None
        }
    }

    fn words(self) -> &'static str {
        match self {
            Self::PastCurve => "off the curve",
            Self::Idle => "one idle",
            Self::NpshShort => "NPSH short",
            Self::OutsidePreferred => "outside region",
            Self::None => "",
        }
    }

    fn shape(self) -> Shape {
        match self {
            Self::PastCurve | Self::Idle | Self::NpshShort => Shape::CrossedRing,
            Self::OutsidePreferred => Shape::Ring,
            Self::None => Shape::Disc,
        }
    }
}

fn point_shape(telling: &Telling, point: &OperatingPoint) -> Shape {
    Remark::of(telling, point).shape()
}

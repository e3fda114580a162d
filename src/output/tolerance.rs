//! The study of tolerances in words, tables, JSON and rows of cases.

mod data;

use super::grid::{Cell, Column, Grid};
use crate::network::{Need, Network, Shape, Target};
use crate::read::Tolerance;
use crate::study::assessment::Assessment;
use crate::study::tolerance::{About, Influence, Measure, Study, Way};
use crate::units::{Kind, UnitSet};

/// Joules in a kilowatt-hour.
const KILOWATT_HOUR: f64 = 3.6e6;
/// Unit of energy per volume, and its decimals.
const SPECIFIC: (&str, usize) = ("kWh/m3", 4);
/// Inputs told of for a figure.
const MOST_TOLD: usize = 3;
/// Cases below which percentiles near the ends and shares are rough.
const FEW: usize = 1000;
/// Smallest share worth telling of.
const LEAST_TOLD: f64 = 0.01;

/// What telling of a study needs at hand.
#[derive(Clone, Copy)]
pub struct Telling<'a> {
    /// For names.
    pub network: &'a Network,
    /// For figures.
    pub units: &'a UnitSet,
    /// What the system has to do.
    pub needs: &'a [Need],
    /// What varies.
    pub inputs: &'a [Tolerance],
    /// The system as the file has it.
    pub as_is: &'a Assessment,
    /// What the draws started from.
    pub seed: u64,
    /// Whether pumps are said to be of a grade.
    pub graded: bool,
}

impl Telling<'_> {
    fn name(&self, measure: Measure) -> String {
        let pump = |id| self.network.pump(id).name.as_str();
        match measure {
            Measure::Delivered => {
                let first = self
                    .needs
                    .iter()
                    .find(|need| !matches!(need.target, Target::PressureAt(_)));
                first
                    .map_or("delivered", |need| need.name.as_str())
                    .to_owned()
            }
            Measure::Need(i) => self.needs[i].name.clone(),
            Measure::SpecificEnergy => "energy".to_owned(),
            Measure::Flow(id) => format!("{} flow", pump(id)),
            Measure::Head(id) => format!("{} head", pump(id)),
            Measure::ShaftPower(id) => format!("{} shaft", pump(id)),
            Measure::MotorLoad(id) => format!("{} motor", pump(id)),
            Measure::NpshMargin(id) => format!("{} NPSH spare", pump(id)),
            Measure::ShareOfBep(id) => format!("{} of BEP", pump(id)),
        }
    }

    /// Who it is of, and the word for it, for programs.
    fn key(&self, measure: Measure) -> (String, &'static str) {
        let pump = |id| self.network.pump(id).name.clone();
        match measure {
            Measure::Delivered => ("system".to_owned(), "delivered"),
            Measure::Need(i) => (self.needs[i].name.clone(), "value"),
            Measure::SpecificEnergy => ("system".to_owned(), "specific_energy"),
            Measure::Flow(id) => (pump(id), "flow"),
            Measure::Head(id) => (pump(id), "head"),
            Measure::ShaftPower(id) => (pump(id), "shaft_power"),
            Measure::MotorLoad(id) => (pump(id), "motor_load"),
            Measure::NpshMargin(id) => (pump(id), "npsh_margin"),
            Measure::ShareOfBep(id) => (pump(id), "share_of_bep"),
        }
    }

    /// The kind of a figure; none for energy per volume.
    fn kind(&self, measure: Measure) -> Option<Kind> {
        Some(match measure {
            Measure::Delivered | Measure::Flow(_) => Kind::Flow,
            Measure::Need(i) => match self.needs[i].target {
                Target::PressureAt(_) => Kind::Pressure,
                Target::FlowInto(_) | Target::FlowIn(_) => Kind::Flow,
            },
            Measure::SpecificEnergy => return None,
            Measure::Head(_) | Measure::NpshMargin(_) => Kind::Length,
            Measure::ShaftPower(_) => Kind::Power,
            Measure::MotorLoad(_) | Measure::ShareOfBep(_) => Kind::Percent,
        })
    }

    fn unit(&self, measure: Measure) -> &'static str {
        let kind = self.kind(measure);
        kind.map_or(SPECIFIC.0, |kind| self.units.unit(kind).symbol)
    }

    /// A figure in its unit. Differences of figures have no offset in any unit used here.
    fn in_unit(&self, measure: Measure, value: f64) -> f64 {
        match self.kind(measure) {
            Some(kind) => self.units.from_si(kind, value),
            None => value / KILOWATT_HOUR,
        }
    }

    fn cell(&self, measure: Measure, value: Option<f64>) -> Cell {
        let decimals = match self.kind(measure) {
            Some(kind) => self.units.decimals(kind),
            None => SPECIFIC.1,
        };
        Cell::Plain(value.map(|value| self.in_unit(measure, value)), decimals)
    }

    fn about(&self, about: About) -> String {
        match about {
            About::Pump(id) => self.network.pump(id).name.clone(),
            About::Line(id) => self.network.line(id).name.clone(),
            About::Node(id) => self.network.node(id).name.clone(),
            About::System => String::new(),
        }
    }

    /// The plain answer.
    pub fn answer(&self, study: &Study) -> String {
        let share = |cases: usize| percent(cases, study.samples);
        let mut out = format!(
            "{} cases drawn, seed {}\n",
            grouped(study.samples),
            self.seed
        );
        if let Some((cases, why)) = &study.unbalanced {
            out.push_str(&format!(
                "  {} of them ({}) have no balance; they count as needs not met. The first: {}\n",
                grouped(*cases),
                share(*cases),
                why.message(self.network)
            ));
        }
        match self.needs.len() {
            0 => {}
            1 => out.push_str(&format!(
                "  The need is met in {} of them\n",
                share(study.needs.all)
            )),
            _ => out.push_str(&format!(
                "  All needs are met in {} of them\n",
                share(study.needs.all)
            )),
        }
        out.push_str(&format!(
            "  No limit is broken in {} of them\n",
            share(study.sound)
        ));
        out
    }

    /// All tables.
    pub fn grids(&self, study: &Study) -> Vec<Grid> {
        let mut grids = vec![self.varied()];
        if !self.needs.is_empty() {
            grids.push(self.needs_met(study));
        }
        if !study.broken.is_empty() {
            grids.push(self.broken(study));
        }
        grids.push(self.figures(study));
        grids.push(self.matters(study));
        grids
    }

    fn varied(&self) -> Grid {
        let rows = self.inputs.iter().map(|input| {
            let limit = |value: f64| Cell::Text(format!("{} {}", plain(value), input.unit));
            vec![
                Cell::Text(input.name.clone()),
                limit(input.spread.low),
                limit(input.spread.high),
                Cell::Text(shape_words(input.spread.shape)),
            ]
        });
        Grid {
            title: "What varies".to_owned(),
            name: "inputs".to_owned(),
            columns: ["input", "from", "to", "in between"]
                .map(|word| Column::text(word, word))
                .to_vec(),
            rows: rows.collect(),
        }
    }

    fn needs_met(&self, study: &Study) -> Grid {
        let rows = self.needs.iter().zip(&study.needs.met).map(|(need, met)| {
            let kind = match need.target {
                Target::PressureAt(_) => Kind::Pressure,
                Target::FlowInto(_) | Target::FlowIn(_) => Kind::Flow,
            };
            let limit = |word: &str, limit: Option<f64>| {
                limit.map(|limit| format!("{word} {}", self.units.format(kind, limit)))
            };
            let limits: Vec<String> = [
                limit("at least", need.at_least),
                limit("at most", need.at_most),
            ]
            .into_iter()
            .flatten()
            .collect();
            vec![
                Cell::Text(need.name.clone()),
                Cell::Text(limits.join(", ")),
                Cell::Plain(Some(100.0 * *met as f64 / study.samples as f64), 1),
            ]
        });
        Grid {
            title: "Needs".to_owned(),
            name: "needs".to_owned(),
            columns: vec![
                Column::text("need", "need"),
                Column::text("asked", "asked"),
                Column::in_unit("met in", "met", "% of cases"),
            ],
            rows: rows.collect(),
        }
    }

    fn broken(&self, study: &Study) -> Grid {
        let rows = study.broken.iter().map(|broken| {
            vec![
                Cell::Text(broken.code.to_owned()),
                Cell::Text(self.about(broken.about)),
                Cell::Plain(Some(100.0 * broken.cases as f64 / study.samples as f64), 1),
            ]
        });
        Grid {
            title: "Limits broken".to_owned(),
            name: "limits".to_owned(),
            columns: vec![
                Column::text("limit", "limit"),
                Column::text("where", "where"),
                Column::in_unit("broken in", "broken", "% of cases"),
            ],
            rows: rows.collect(),
        }
    }

    fn figures(&self, study: &Study) -> Grid {
        let rows = study
            .measures
            .iter()
            .zip(&study.bands)
            .map(|(measure, band)| {
                let band = band.as_ref();
                vec![
                    Cell::Text(self.name(*measure)),
                    Cell::Text(self.unit(*measure).to_owned()),
                    self.cell(*measure, measure.of(self.as_is)),
                    self.cell(*measure, band.map(|band| band.p5)),
                    self.cell(*measure, band.map(|band| band.p50)),
                    self.cell(*measure, band.map(|band| band.p95)),
                ]
            });
        Grid {
            title: "Figures: 5 % of the cases lie below P5, half below P50, 95 % below P95"
                .to_owned(),
            name: "figures".to_owned(),
            columns: ["figure", "unit", "as the file has it", "P5", "P50", "P95"]
                .map(|word| Column::text(word, word))
                .to_vec(),
            rows: rows.collect(),
        }
    }

    fn matters(&self, study: &Study) -> Grid {
        let mut rows = Vec::new();
        for influence in study
            .influences
            .iter()
            .filter(|of| worth_ranking(of.measure))
        {
            let told = influence.ranked().into_iter().take(MOST_TOLD);
            let share = |i: &usize| influence.shares[*i];
            let told = told.filter(|i| share(i).sampled.max(share(i).linear) >= LEAST_TOLD);
            for (place, i) in told.enumerate() {
                let share = influence.shares[i];
                let measure = influence.measure;
                let first = |text: &str| match place {
                    0 => Cell::Text(text.to_owned()),
                    _ => Cell::Text(String::new()),
                };
                rows.push(vec![
                    first(&self.name(measure)),
                    Cell::Text(self.inputs[i].name.clone()),
                    self.cell(measure, Some(share.change)),
                    first(self.unit(measure)),
                    Cell::Plain(Some(100.0 * share.linear), 0),
                    Cell::Plain(Some(100.0 * share.sampled), 0),
                    first(remark(influence)),
                ]);
            }
        }
        Grid {
            title: "What matters most".to_owned(),
            name: "matters".to_owned(),
            columns: vec![
                Column::text("figure", "figure"),
                Column::text("input", "input"),
                Column::text("moves it by", "change"),
                Column::text("unit", "unit"),
                Column::in_unit("by slope", "linear_share", "%"),
                Column::in_unit("by cases", "sampled_share", "%"),
                Column::text("", "remark"),
            ],
            rows,
        }
    }

    /// What the tables mean.
    pub fn notes(&self, study: &Study) -> String {
        let mut out = String::from(
            "Moves it by: change with one standard deviation of the input. By slope: share of the variance if every figure followed\n\
             its inputs straight. By cases: share of the variance over the cases that goes with this input alone.\n",
        );
        if study.influences.iter().any(Influence::disagrees) {
            out.push_str("The two disagree where the figure bends, or inputs work together: believe the cases.\n");
        }
        if study.influences.iter().any(|of| of.way != Way::Gradient) {
            out.push_str(
                "No slope: a check valve or outlet is about to open or shut there; taken from both sides instead.\n",
            );
        }
        if study.samples < FEW {
            out.push_str("So few cases give rough bands and shares: draw more with --samples.\n");
        }
        if self.graded {
            out.push_str("Grades of pumps after ISO 9906:2012, from memory: check them against the standard.\n");
        }
        out
    }
}

/// Figures for which inputs are ranked in the table; JSON has them all.
fn worth_ranking(measure: Measure) -> bool {
    !matches!(
        measure,
        Measure::Head(_) | Measure::ShaftPower(_) | Measure::ShareOfBep(_)
    )
}

fn remark(influence: &Influence) -> &'static str {
    match (influence.way, influence.disagrees()) {
        (Way::BothSides(_), _) => "no slope",
        (Way::Gradient, true) => "they disagree",
        (Way::Gradient, false) => "",
    }
}

fn shape_words(shape: Shape) -> String {
    match shape {
        Shape::Even => "even".to_owned(),
        Shape::LogEven => "even in the logarithm".to_owned(),
        Shape::Normal { limits_at } => {
            format!(
                "normal, cut off at {} standard deviations",
                plain(limits_at)
            )
        }
    }
}

/// A number as one would write it: no digits that only rounding made.
fn plain(value: f64) -> String {
    let rounded = (value * 1e9).round() / 1e9;
    format!("{}", if rounded == 0.0 { 0.0 } else { rounded })
}

fn percent(cases: usize, all: usize) -> String {
    let share = 100.0 * cases as f64 / all as f64;
    match cases {
        0 => "none".to_owned(),
        cases if cases == all => "all".to_owned(),
        _ if share < 0.1 => "less than 0.1 %".to_owned(),
        _ if share > 99.9 => "more than 99.9 %".to_owned(),
        _ => format!("{share:.1} %"),
    }
}

/// Thousands set apart.
fn grouped(count: usize) -> String {
    let digits = count.to_string();
    let mut out = String::new();
    for (i, digit) in digits.chars().enumerate() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            out.push(',');
        }
        out.push(digit);
    }
    out
}

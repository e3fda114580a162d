//! A calculation note as one HTML page: opens from disk, asks for nothing outside, prints on A4 and Letter, reads on a phone.
//!
//! Places finished figures; every one of them stands in a table too, so nothing is lost without scripts or pictures.

mod tables;
mod worked;

use maud::{DOCTYPE, Markup, PreEscaped, html};

use super::grid::Grid;
use super::shift::Telling;
use super::words::Words;
use super::{CAUTION, describe, limits, shift, sketch, solve};
use crate::read::System;
use crate::study::assessment::Assessment;
use crate::study::ranking::Run;
use crate::study::worked::Worked;

/// Everything that the page shows.
pub struct Report<'a> {
    /// What the user calls the file.
    pub file: &'a str,
    /// The user's words on the job.
    pub job: Option<&'a str>,
    /// SHA-256 of the file, in hexadecimal.
    pub fingerprint: &'a str,
    /// Of the program.
    pub version: &'a str,
    /// The system as the file has it.
    pub system: &'a System,
    /// The state as the file stands.
    pub assessment: &'a Assessment,
    /// Threshold speeds, one per pump.
    pub thresholds: &'a [Option<f64>],
    /// Gain cards in words.
    pub gains: Vec<String>,
    /// Velocities of the mains in words.
    pub velocities: Option<String>,
    /// The combination table of each case.
    pub combinations: Vec<Grid>,
    /// Pictures of curves.
    pub curves: Vec<Picture>,
    /// The runs over time.
    pub runs: Vec<RunShown<'a>>,
    /// Their comparison.
    pub scores: Option<Grid>,
    /// One point, laid open.
    pub worked: Option<Worked>,
    /// Further sections that were asked for.
    pub more: Vec<Section>,
}

/// A picture with its words.
pub struct Picture {
    /// What it shows.
    pub caption: String,
    /// SVG that has been made here.
    pub svg: String,
}

/// A run and how it is told.
pub struct RunShown<'a> {
    /// How.
    pub telling: Telling<'a>,
    /// What came of it.
    pub run: Run,
    /// The plain answer.
    pub answer: String,
    /// Its time series as a picture.
    pub chart: Option<Picture>,
}

/// A section of words and tables.
pub struct Section {
    /// Its heading.
    pub heading: String,
    /// Paragraphs.
    pub words: Vec<String>,
    /// Tables.
    pub grids: Vec<Grid>,
}

/// The page.
pub fn page(report: &Report) -> String {
    let title = report.system.title.as_deref().unwrap_or("Pumping system");
    let words = Words {
        network: &report.system.network,
        units: &report.system.units,
    };
    let sections = sections(report, &words);
    let page = html! {
        (DOCTYPE)
        html lang="en" {
            head {
                meta charset="utf-8";
                meta name="viewport" content="width=device-width, initial-scale=1";
                meta name="generator" content=(format!("dutybank {}", report.version));
                title { (title) ": calculation note" }
                style { (PreEscaped(include_str!("page.css"))) }
            }
            body {
                header {
                    p class="kind" { "Calculation note" }
                    h1 { (title) }
                    @if let Some(job) = report.job { p class="job" { (job) } }
                }
                nav aria-label="Sections" {
                    ol { @for (heading, _) in &sections { li { a href=(anchor(heading)) { (heading) } } } }
                }
                main {
                    @for (heading, body) in &sections {
                        section id=(&anchor(heading)[1..]) { h2 { (heading) } (body) }
                    }
                }
                footer {
                    p { "dutybank " (report.version) ", input " code { (report.file) } ", SHA-256 " code { (report.fingerprint) } }
                    @for line in CAUTION.lines() { p { (line) } }
                }
            }
        }
    };
    page.into_string()
}

/// `#the-words-of-a-heading`.
fn anchor(heading: &str) -> String {
    let letters = heading.chars().map(|c| match c.is_alphanumeric() {
        true => c.to_ascii_lowercase(),
        false => '-',
    });
    std::iter::once('#').chain(letters).collect()
}

/// What there is to say, in the order in which a reviewer asks.
fn sections(report: &Report, words: &Words) -> Vec<(String, Markup)> {
    let mut all: Vec<(String, Markup)> = vec![
        ("Answer".to_owned(), answer(report, words)),
        ("Cautions".to_owned(), cautions(report, words)),
        ("Basis".to_owned(), basis(report)),
        ("Sketch".to_owned(), drawn(report, words)),
        ("Inputs".to_owned(), inputs(report)),
        ("State as the file stands".to_owned(), state(report, words)),
    ];
    let mut add = |heading: &str, body: Option<Markup>| {
        all.extend(body.map(|body| (heading.to_owned(), body)));
    };
    add("Curves", pictures(&report.curves));
    add("Every set of running pumps", combinations(report));
    add("Over time", over_time(report));
    for section in &report.more {
        add(&section.heading, Some(further(section, report)));
    }
    add("Limits", Some(judged(report, words)));
    let worked = report.worked.as_ref();
    add(
        "One operating point, step by step",
        worked.map(|worked| worked::table(words, report, worked)),
    );
    add("Balance certificate", Some(certificate(report)));
    all
}

fn paragraphs(text: &str) -> Markup {
    html! { @for line in text.lines().filter(|line| !line.trim().is_empty()) { p { (line.trim()) } } }
}

fn table(report: &Report, grid: &Grid) -> Markup {
    tables::table(grid, &report.system.units)
}

/// The first thing that anyone wants to know.
fn answer(report: &Report, words: &Words) -> Markup {
    let (needs, values) = (&report.system.needs, &report.assessment.needs);
    html! {
        @if !needs.is_empty() {
            ul class="needs" {
                @for (need, value) in needs.iter().zip(values) {
                    li class=(if value.met { "met" } else { "unmet" }) { (words.need(need, value)) }
                }
            }
        }
        @for gain in &report.gains {
            div class="card" { @for line in gain.lines() { p { (line.trim()) } } }
        }
        @if let Some(velocities) = &report.velocities { div class="card" { (paragraphs(velocities)) } }
        @for run in &report.runs { p { strong { (run.run.plan) ": " } (run.answer.lines().next().unwrap_or("")) } }
    }
}

fn cautions(report: &Report, words: &Words) -> Markup {
    let said = &report.assessment.cautions;
    let of_file = &report.system.cautions;
    html! {
        @if said.is_empty() && of_file.is_empty() {
            p { "None in the state as the file stands. Other sets of pumps and other cases may have theirs: see the tables." }
        } @else {
            ul class="cautions" {
                @for caution in said { li { (words.caution(caution)) " " code { (caution.code()) } } }
                @for caution in of_file { li { (caution.message) " " code { (caution.code) } } }
            }
        }
    }
}

fn basis(report: &Report) -> Markup {
    let system = report.system;
    html! {
        ul {
            @for fact in describe::basis(system) { li { (fact) } }
        }
    }
}

fn drawn(report: &Report, words: &Words) -> Markup {
    match sketch::sketch(words, report.assessment) {
        Some(drawing) => html! {
            figure class="wide" { (drawing) figcaption {
                "Left to right by flow. A full disc is a pump that delivers, a hollow one is stopped, a crossed one runs and delivers nothing; "
                "a dashed line carries nothing. Under nodes stands their total head."
            } }
        },
        None => {
            html! { p { "More than " (sketch::MOST_LINES) " lines: too many to draw so that they can be read. See the tables." } }
        }
    }
}

fn inputs(report: &Report) -> Markup {
    let sections = describe::sections(report.system, usize::MAX);
    html! {
        @for (heading, facts) in &sections {
            @if !heading.is_empty() { h3 { (heading) } }
            ul { @for fact in facts { li { (fact) } } }
        }
        @for grid in tables::models(&report.system.network) { (table(report, &grid)) }
    }
}

fn state(report: &Report, words: &Words) -> Markup {
    let grids = solve::grids(
        words,
        &report.system.needs,
        report.assessment,
        report.thresholds,
    );
    html! { @for grid in &grids { (table(report, grid)) } }
}

fn pictures(pictures: &[Picture]) -> Option<Markup> {
    (!pictures.is_empty()).then(|| {
        html! { @for picture in pictures {
            figure class="wide" { (PreEscaped(&picture.svg)) figcaption { (picture.caption) } }
        } }
    })
}

fn combinations(report: &Report) -> Option<Markup> {
    (!report.combinations.is_empty())
        .then(|| html! { @for grid in &report.combinations { (table(report, grid)) } })
}

fn over_time(report: &Report) -> Option<Markup> {
    (!report.runs.is_empty()).then(|| {
        html! {
            @if let Some(scores) = &report.scores { (tables::turned(scores, &report.system.units)) }
            @for shown in &report.runs {
                h3 { "Plan " (shown.run.plan) }
                (paragraphs(&shown.answer))
                @if let Some(chart) = &shown.chart {
                    figure class="wide" { (PreEscaped(&chart.svg)) figcaption { (chart.caption) } }
                }
                (tables::card(&shift::card_rows(&shown.telling, &shown.run)))
                (table(report, &shift::pumps(shown.telling.network, &shown.run)))
            }
        }
    })
}

fn further(section: &Section, report: &Report) -> Markup {
    html! {
        @for words in &section.words { (paragraphs(words)) }
        @for grid in &section.grids { (table(report, grid)) }
    }
}

fn judged(report: &Report, words: &Words) -> Markup {
    html! {
        p { "Every limit that can be judged in the state as the file stands, tightest first, and who says so. "
            "Defaults of the trade may be replaced in the file under " code { "limits" } "." }
        (table(report, &limits::grid(words, report.assessment, false)))
        (table(report, &limits::values(words)))
    }
}

fn certificate(report: &Report) -> Markup {
    let balance = &report.assessment.balance;
    html! {
        p { "Recomputed from the answer with the plain laws of all parts, not taken from the solver: flows balance at every node within "
            (format!("{:.1e}", balance.worst_node)) " m3/s, heads along every open line within "
            (format!("{:.1e}", balance.worst_line)) " m, and every line that is held shut has a reason to be. "
            "The solver took " (balance.iterations) " steps." }
    }
}

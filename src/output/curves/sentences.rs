//! What the picture says in words: its heading, what to know about it, and the same for the terminal.

use super::{Telling, rows};
use crate::network::NodeId;
use crate::study::assessment::PREFERRED_REGION;
use crate::study::curves::{Branching, MOST_CURVES};
use crate::units::Kind;

/// Names beyond this many are counted.
const NAMED: usize = 4;

/// `a, b and c`; of many the first and how many more.
fn listed(names: &[String]) -> String {
    match names {
        [] => String::new(),
        [one] => one.clone(),
        [rest @ .., last] if names.len() <= NAMED => format!("{} and {last}", rest.join(", ")),
        _ => format!(
            "{} and {} more",
            names[..NAMED].join(", "),
            names.len() - NAMED
        ),
    }
}

fn nodes(telling: &Telling, ids: &[NodeId]) -> String {
    let network = telling.network(0);
    let names: Vec<String> = ids
        .iter()
        .map(|id| network.node(*id).name.clone())
        .collect();
    listed(&names)
}

/// Which pumps, between which headers.
fn station(telling: &Telling) -> String {
    let network = telling.network(0);
    let stages = telling.curves.stages.iter();
    let words: Vec<String> = stages
        .map(|stage| {
            format!(
                "{}, from {} to {}",
                stage.name(network),
                network.node(stage.from).name,
                network.node(stage.to).name
            )
        })
        .collect();
    match words.as_slice() {
        [one] => one.clone(),
        several => format!("In series: {}", several.join("; then ")),
    }
}

/// Under the title.
pub(super) fn heading(telling: &Telling) -> Vec<String> {
    let mut lines = vec![station(telling)];
    lines.extend(branching(telling));
    lines
}

/// Why one system curve does not tell all, and what is drawn instead.
fn branching(telling: &Telling) -> Option<String> {
    let network = telling.network(0);
    let reasons: Vec<String> = telling
        .curves
        .branchings
        .iter()
        .map(|branching| match branching {
            Branching::OtherPumps(pumps) => {
                let names: Vec<String> = pumps
                    .iter()
                    .map(|pump| network.pump(*pump).name.clone())
                    .collect();
                format!("other pumps run ({})", listed(&names))
            }
            Branching::Draws(ids) => {
                format!("water is drawn or flows in at {}", nodes(telling, ids))
            }
            Branching::SeveralEnds(ids) => {
                format!("several heads are held ({})", nodes(telling, ids))
            }
            Branching::WayRound => "water can pass beside the pumps".to_owned(),
        })
        .collect();
    if reasons.is_empty() {
        return None;
    }
    let stages: Vec<String> = telling
        .curves
        .stages
        .iter()
        .map(|stage| stage.name(network))
        .collect();
    Some(format!(
        "This network has no one system curve: {}. Drawn is the head that it asks of {} at each flow, all else as in the case.",
        reasons.join("; "),
        listed(&stages)
    ))
}

/// For those who cannot see the picture.
pub(super) fn description(telling: &Telling) -> String {
    let curves = telling.curves;
    let point = |point: &crate::study::curves::OperatingPoint| {
        let curve = &curves.combined[point.combined];
        format!(
            "{}, {}: {} at {}",
            telling.case(point.case),
            telling.set(point.case, &curve.running),
            telling.units.with_unit(Kind::Flow, point.at.flow),
            telling.units.with_unit(Kind::Length, point.at.head)
        )
    };
    let points: Vec<String> = curves.points.iter().map(point).collect();
    format!(
        "Head against flow of {}: {} and {}. Operating points: {}.",
        station(telling),
        counted(
            curves.combined.len(),
            "curve of what pumps give",
            "curves of what pumps give"
        ),
        counted(curves.systems.len(), "system curve", "system curves"),
        points.join("; ")
    )
}

fn counted(count: usize, one: &str, several: &str) -> String {
    match count {
        1 => format!("1 {one}"),
        count => format!("{count} {several}"),
    }
}

/// What should be known about the curves.
pub fn notes(telling: &Telling) -> Vec<String> {
    let curves = telling.curves;
    let mut notes = Vec::new();
    for idle in &curves.idle {
        let what = match &idle.error {
            None => "moves no water".to_owned(),
            Some(error) => format!(
                "does not balance: {}",
                error.message(telling.network(idle.case))
            ),
        };
        notes.push(format!(
            "{} in the case \u{2018}{}\u{2019} {what}; no point is drawn.",
            telling.set(idle.case, &idle.running),
            telling.case(idle.case)
        ));
    }
    if curves.one_by_one {
        notes.push(format!(
            "More than {MOST_CURVES} sets of pumps: pumps are added one by one in the order of the file. Choose others with --pumps."
        ));
    }
    if curves.combined.iter().any(|curve| !curve.beyond.is_empty()) {
        notes.push(
            "Dotted past the end of a pump's curve: a straight guess; no figure there is certain."
                .to_owned(),
        );
    }
    let (low, high) = PREFERRED_REGION;
    notes.push(format!(
        "Preferred region {:.0} to {:.0} % of best-efficiency flow: ANSI/HI 9.6.3 as quoted in the trade; varies with specific speed.",
        100.0 * low,
        100.0 * high
    ));
    notes.extend(crate::output::CAUTION.lines().map(str::to_owned));
    notes
}

/// For the terminal: the heading, the points and the notes.
pub fn summary(telling: &Telling) -> String {
    let mut out = String::new();
    if !telling.title.is_empty() {
        out.push_str(&format!("{}\n\n", telling.title));
    }
    for line in heading(telling) {
        out.push_str(&format!("{line}\n"));
    }
    out.push('\n');
    out.push_str(&rows::points(telling).text(telling.units));
    out.push('\n');
    for note in notes(telling) {
        out.push_str(&format!("{note}\n"));
    }
    out
}

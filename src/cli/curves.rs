//! `dutybank curves`: what the pumps give, what the system asks for, and where they meet.

use std::io::IsTerminal;
use std::path::Path;

use super::Failure;
use super::args::CurvesOptions;
use super::duty::{AS_IS, only_switches, pumps_named};
use super::files::{Input, Pending, print};
use super::solve::read;
use crate::network::Network;
use crate::output::chart::{Surface, draw};
use crate::output::curves::{Telling, figure, rows, summary};
use crate::read::System;
use crate::study::curves::{Case, Curves, CurvesError, curves as curves_of, stages};

/// Most cases drawn unless they are named: more cannot be told apart.
const MOST_CASES: usize = 12;

pub(super) fn curves(options: &CurvesOptions) -> Result<(), Failure> {
    let input = Input::open(&options.input.file)?;
    let (systems, left_out) = systems(options, &input)?;
    let standard_output =
        |path: &Option<std::path::PathBuf>| path.as_deref() == Some(Path::new("-"));
    let open = |path: &Option<std::path::PathBuf>| {
        path.as_deref()
            .filter(|path| *path != Path::new("-"))
            .map(Pending::open)
            .transpose()
    };
    let (svg, csv) = (open(&options.svg)?, open(&options.csv)?);
    let drawn = drawn(options, &systems, &input.name)?;
    let Some((_, first)) = systems.first() else {
        return Err(Failure::Broken(format!(
            "{} has no case to draw",
            input.name
        )));
    };
    let named: Vec<(String, &Network)> = systems
        .iter()
        .map(|(name, system)| (name.clone(), &system.network))
        .collect();
    let telling = Telling {
        curves: &drawn,
        cases: &named,
        units: &first.units,
        title: first.title.as_deref().unwrap_or(""),
    };
    let picture = || draw(&figure(&telling, "curves"), Surface::StandAlone);
    let table = || {
        rows(&telling)
            .csv(telling.units)
            .map_err(|why| Failure::Broken(why.to_string()))
    };
    if let Some(csv) = csv {
        csv.write_whole(&table()?)?;
    }
    if let Some(svg) = svg {
        svg.write_whole(picture().as_bytes())?;
    }
    if standard_output(&options.csv) {
        return print(&String::from_utf8_lossy(&table()?));
    }
    let nothing_asked = options.svg.is_none() && options.csv.is_none();
    let piped = !std::io::stdout().is_terminal();
    if standard_output(&options.svg) || (nothing_asked && piped) {
        return print(&picture());
    }
    let mut out = summary(&telling);
    if left_out > 0 {
        out.push_str(&format!(
            "\nThe first {MOST_CASES} cases are drawn and {left_out} left out: choose with --cases.\n"
        ));
    }
    if nothing_asked {
        out.push_str(&format!(
            "\nFor the picture: dutybank curves {} --svg curves.svg\n",
            options.input.file.display()
        ));
    }
    print(&out)
}

/// The curves of the cases.
fn drawn(
    options: &CurvesOptions,
    systems: &[(String, System)],
    file: &str,
) -> Result<Curves, Failure> {
    let cases = systems
        .iter()
        .map(|(_, system)| {
            let network = &system.network;
            let switched = match &options.pumps {
                Some(names) => pumps_named(network, names)?,
                None => network.pump_ids().collect(),
            };
            Ok(Case { network, switched })
        })
        .collect::<Result<Vec<Case>, Failure>>()?;
    curves_of(&cases, options.bank.as_deref()).map_err(|why| refused(&why, systems, file))
}

/// The picture for a page, of the cases named or those that fit; none where there is nothing that curves can show.
pub(super) fn embedded(options: &CurvesOptions, input: &Input) -> Result<Option<String>, Failure> {
    let (systems, _) = systems(options, input)?;
    let Ok(drawn) = drawn(options, &systems, &input.name) else {
        return Ok(None);
    };
    let named: Vec<(String, &Network)> = systems
        .iter()
        .map(|(name, system)| (name.clone(), &system.network))
        .collect();
    Ok(systems.first().map(|(_, first)| {
        let telling = Telling {
            curves: &drawn,
            cases: &named,
            units: &first.units,
            title: "",
        };
        draw(&figure(&telling, "picture-of-curves"), Surface::Embedded)
    }))
}

/// The systems of the cases to draw with their names (that of the file as it stands is empty), and how many were left out.
fn systems(
    options: &CurvesOptions,
    input: &Input,
) -> Result<(Vec<(String, System)>, usize), Failure> {
    let all = input
        .document
        .cases()
        .map_err(|diagnostics| input.rejected(&diagnostics))?;
    let chosen = options.cases.is_some();
    let mut names: Vec<String> = match &options.cases {
        Some(words) => rejoined(words, &all),
        None => std::iter::once(AS_IS.to_owned())
            .chain(
                all.into_iter()
                    .filter(|case| !only_switches(case))
                    .map(|case| case.name),
            )
            .collect(),
    };
    let left_out = if chosen {
        0
    } else {
        names.len().saturating_sub(MOST_CASES)
    };
    names.truncate(names.len() - left_out);
    let system = |name: String| {
        if name == AS_IS {
            return Ok((String::new(), read(input, &[])?));
        }
        let changes = input.case(&name)?;
        let system = read(input, &changes)?;
        Ok((name, system))
    };
    let systems = names
        .into_iter()
        .map(system)
        .collect::<Result<_, Failure>>()?;
    Ok((systems, left_out))
}

/// Names that hold commas themselves are put together again: the longest that fits a case counts.
fn rejoined(words: &[String], cases: &[crate::read::Case]) -> Vec<String> {
    let mut names = Vec::new();
    let mut rest = words;
    while !rest.is_empty() {
        let joined = |n: &usize| rest[..*n].join(",").trim().to_owned();
        let is_case = |n: &usize| cases.iter().any(|case| case.name == joined(n));
        let taken = (1..=rest.len()).rev().find(is_case).unwrap_or(1);
        names.push(joined(&taken));
        rest = &rest[taken..];
    }
    names
}

/// The error in the user's names, with what would fit.
fn refused(why: &CurvesError, systems: &[(String, System)], file: &str) -> Failure {
    let message = match (why, systems) {
        (CurvesError::NoBank(name), [(_, system), ..]) => {
            let network = &system.network;
            let known: Vec<String> = stages(network)
                .iter()
                .map(|stage| stage.name(network))
                .collect();
            let near = crate::diagnostic::nearest(name, known.iter().map(String::as_str));
            let help = near.map_or_else(
                || format!("there are {}", known.join(", ")),
                |near| format!("did you mean `{near}`?"),
            );
            format!("no bank, line or pump is called `{name}`; {help}")
        }
        (CurvesError::OtherStation(case), _) => format!(
            "the case `{}` has other banks than the first: draw it on its own with `--cases`",
            systems.get(*case).map_or("", |(name, _)| name)
        ),
        (CurvesError::NoPumps, _) => format!("{file} has no pumps to draw"),
        (why, _) => format!("{file}: {why}"),
    };
    Failure::Broken(message)
}

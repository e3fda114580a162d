//! `dutybank duty`: every distinct set of running pumps in every case.

use super::Failure;
use super::args::DutyOptions;
use super::files::{Input, Pending, print};
use super::solve::read;
use crate::network::Network;
use crate::output::grid::Grid;
use crate::output::json::DutyCase;
use crate::output::words::Words;
use crate::output::{self, json};
use crate::part::PumpId;
use crate::read::{Case, System};
use crate::study::duty::{Combination, MOST_SETS, combinations};
use crate::study::gain::{Gain, gains};
use crate::study::mains;

/// What `--cases` calls the file as it stands.
pub(super) const AS_IS: &str = "as-is";

/// A case that has been solved.
pub(super) struct Solved {
    pub name: String,
    pub system: System,
    pub combinations: Vec<Combination>,
}

pub(super) fn duty(options: &DutyOptions) -> Result<(), Failure> {
    let input = Input::open(&options.input.file)?;
    let base = read(&input, &[])?;
    let pending = options.csv.as_deref().map(Pending::open).transpose()?;
    let solved = solve_cases(options, &input, &base)?;
    let gains = gains(&base.network, &base.needs, base.network.settings());
    if let Some(pending) = pending {
        let grid = whole_table(options, &solved, &base);
        pending.write_whole(
            &grid
                .csv(&base.units)
                .map_err(|why| Failure::Broken(why.to_string()))?,
        )?;
    }
    if options.json {
        let cases: Vec<DutyCase> = solved
            .iter()
            .map(|case| DutyCase {
                name: &case.name,
                network: &case.system.network,
                needs: &case.system.needs,
                combinations: &case.combinations,
            })
            .collect();
        print(&format!(
            "{:#}\n",
            json::duty(&base.units, &base.network, &gains, &cases)
        ))?;
    } else {
        print(&text(options, &solved, &base, &gains))?;
    }
    if options.fail_unmet && !solved.iter().all(can_meet) {
        Err(Failure::Unmet)
    } else {
        Ok(())
    }
}

impl Solved {
    fn label(&self) -> &str {
        match self.name.as_str() {
            "" => AS_IS,
            name => name,
        }
    }
}

/// Whether some set of a case meets all needs.
fn can_meet(case: &Solved) -> bool {
    let outcomes = case
        .combinations
        .iter()
        .filter_map(|combination| combination.outcome.as_ref().ok());
    case.system.needs.is_empty()
        || outcomes
            .into_iter()
            .any(|outcome| outcome.assessment.needs.iter().all(|need| need.met))
}

/// Whether a case changes nothing but which pumps run.
pub(super) fn only_switches(case: &Case) -> bool {
    let mut changes = case.changes.iter();
    changes.all(|change| change.path().ends_with(".running"))
}

pub(super) fn solve_cases(
    options: &DutyOptions,
    input: &Input,
    base: &System,
) -> Result<Vec<Solved>, Failure> {
    let all = input
        .document
        .cases()
        .map_err(|diagnostics| input.rejected(&diagnostics))?;
    let names: Vec<String> = match &options.cases {
        Some(names) => names.clone(),
        None => std::iter::once(AS_IS.to_owned())
            .chain(
                all.into_iter()
                    .filter(|case| !only_switches(case))
                    .map(|case| case.name),
            )
            .collect(),
    };
    let mut solved = Vec::new();
    for name in names {
        let (name, system) = if name == AS_IS {
            (String::new(), base.clone())
        } else {
            let changes = input.case(&name)?;
            (name, read(input, &changes)?)
        };
        let network = &system.network;
        if network.pumps().is_empty() {
            return Err(Failure::Broken(format!(
                "{} has no pumps to combine",
                input.name
            )));
        }
        let pumps = match &options.pumps {
            Some(names) => pumps_named(network, names)?,
            None => network.pump_ids().collect(),
        };
        let combinations = combinations(network, &system.needs, network.settings(), &pumps).map_err(|too_many| {
            Failure::Broken(format!(
                "{} pumps make {} distinct sets, more than {MOST_SETS}: name the pumps to switch with `--pumps A,B,..`, \
                 or put equal pumps into a bank (`count:`), where they count once",
                pumps.len(),
                too_many.sets
            ))
        })?;
        solved.push(Solved {
            name,
            combinations,
            system,
        });
    }
    Ok(solved)
}

/// Pumps by their own names or those of their banks or lines.
pub(super) fn pumps_named(network: &Network, names: &[String]) -> Result<Vec<PumpId>, Failure> {
    let mut pumps = Vec::new();
    for name in names.iter().map(|name| name.trim()) {
        let of_line = |id: &PumpId| network.line(network.line_of(*id)).name == name;
        let of_bank = |id: &PumpId| {
            let line = network.line_of(*id);
            network
                .banks()
                .iter()
                .any(|bank| bank.name == name && bank.lines.contains(&line))
        };
        let own = |id: &PumpId| network.pump(*id).name == name;
        let found: Vec<PumpId> = network
            .pump_ids()
            .filter(|id| own(id) || of_line(id) || of_bank(id))
            .collect();
        if found.is_empty() {
            let known: Vec<&str> = network
                .pumps()
                .iter()
                .map(|pump| pump.name.as_str())
                .collect();
            let near = crate::diagnostic::nearest(name, known.iter().copied());
            let help = near.map_or_else(
                || format!("there are {}", known.join(", ")),
                |near| format!("did you mean `{near}`?"),
            );
            return Err(Failure::Broken(format!(
                "no pump is called `{name}`; {help}"
            )));
        }
        pumps.extend(found);
    }
    pumps.sort();
    pumps.dedup();
    Ok(pumps)
}

/// The rows of one case; with `labelled`, its name in the first column.
fn rows(case: &Solved, labelled: bool) -> Vec<output::duty::Row> {
    let words = Words {
        network: &case.system.network,
        units: &case.system.units,
    };
    let label = if labelled { case.label() } else { "" };
    case.combinations
        .iter()
        .map(|combination| output::duty::row(&words, label, &case.system.needs, combination))
        .collect()
}

/// All cases in one table.
fn whole_table(options: &DutyOptions, solved: &[Solved], base: &System) -> Grid {
    let mut rows: Vec<_> = solved.iter().flat_map(|case| rows(case, true)).collect();
    let mut title = "Combinations";
    if options.worst_first {
        title = "Combinations, worst first";
        rows.sort_by(|a, b| a.room.total_cmp(&b.room));
    }
    output::duty::grid(title, output::duty::columns(&base.needs, &base.units), rows)
}

/// The table of one case.
pub(super) fn case_grid(case: &Solved) -> Grid {
    let title = match case.name.as_str() {
        "" => "As the file stands".to_owned(),
        name => format!("Case: {name}"),
    };
    let columns = output::duty::columns(&case.system.needs, &case.system.units);
    output::duty::grid(&title, columns, rows(case, false))
}

const LEGEND: &str = "\
NPSH spare: least margin of a running pump. Columns named after needs: room left, negative where unmet.
Cases that only change which pumps run are left out: every set is here already.
";

fn text(options: &DutyOptions, solved: &[Solved], base: &System, gains: &[Gain]) -> String {
    let words = Words {
        network: &base.network,
        units: &base.units,
    };
    let mut out = String::new();
    if let Some(title) = &base.title {
        out.push_str(&format!("{title}\n\n"));
    }
    for gain in gains {
        out.push_str(&words.gain(gain));
        out.push('\n');
    }
    if let Some(case) = solved.first() {
        let network = &case.system.network;
        let ranges = mains::ranges(network, &case.combinations);
        if !ranges.is_empty() {
            let words = Words {
                network,
                units: &case.system.units,
            };
            out.push_str(&words.velocities(&ranges, &case.combinations));
            out.push('\n');
        }
    }
    if options.worst_first {
        out.push_str(&whole_table(options, solved, base).text(&base.units));
        out.push('\n');
    } else {
        for case in solved {
            out.push_str(&case_grid(case).text(&base.units));
            out.push('\n');
        }
    }
    out.push_str(&format!("{LEGEND}\n{}\n", output::CAUTION));
    out
}

//! `dutybank solve`: the system as it stands.

use super::Failure;
use super::args::{ChangeOptions, SolveOptions};
use super::files::{Input, Pending, print};
use crate::output::words::Words;
use crate::output::{self, json};
use crate::read::{Change, System};
use crate::solve::Solver;
use crate::study::assessment::{Assessment, assess_balances};
use crate::study::threshold::threshold_speeds;

pub(super) fn solve(options: &SolveOptions) -> Result<(), Failure> {
    let input = Input::open(&options.input.file)?;
    let (system, _) = read_changed(&input, &options.changes)?;
    if let Some(folder) = &options.csv {
        std::fs::create_dir_all(folder).map_err(|why| {
            Failure::Broken(format!("{} cannot be made: {why}", folder.display()))
        })?;
    }
    let network = &system.network;
    let settings = network.settings();
    let mut solver = Solver::new(network);
    let balances = solver
        .balances(settings)
        .map_err(|why| Failure::Broken(format!("{}: {}", input.name, why.message(network))))?;
    let assessment = assess_balances(network, &system.needs, settings, &balances);
    let thresholds = threshold_speeds(&mut solver, settings);
    if let Some(folder) = &options.csv {
        write_tables(&system, &assessment, &thresholds, folder)?;
    }
    if options.json {
        let value = json::solve(
            network,
            &system.needs,
            &system.units,
            &assessment,
            &thresholds,
            &system.cautions,
        );
        print(&format!("{value:#}\n"))?;
    } else {
        print(&text(&system, &assessment, &thresholds))?;
    }
    let unmet = assessment.needs.iter().any(|need| !need.met);
    if options.fail_unmet && unmet {
        Err(Failure::Unmet)
    } else {
        Ok(())
    }
}

/// The system with the changes that the command line asks for, and those.
pub(super) fn read_changed(
    input: &Input,
    options: &ChangeOptions,
) -> Result<(System, Vec<Change>), Failure> {
    let mut changes = input.changes(options)?;
    let mut system = read(input, &changes)?;
    if let Some(running) = &options.running {
        changes.extend(only_running(&system, running)?);
        system = read(input, &changes)?;
    }
    Ok((system, changes))
}

pub(super) fn read(input: &Input, changes: &[Change]) -> Result<System, Failure> {
    input
        .with_load(|load| input.document.system(changes, load))
        .map_err(|diagnostics| input.rejected(&diagnostics))
}

/// Changes that run just the pumps named, of which a bank's name means all.
fn only_running(system: &System, names: &[String]) -> Result<Vec<Change>, Failure> {
    let wanted = super::duty::pumps_named(&system.network, names)?;
    let network = &system.network;
    let change = |id| {
        let running = if wanted.contains(&id) {
            "true"
        } else {
            "false"
        };
        Change::new(&format!("{}.running", network.pump(id).name), running)
    };
    Ok(network.pump_ids().map(change).collect())
}

fn write_tables(
    system: &System,
    assessment: &Assessment,
    thresholds: &[Option<f64>],
    folder: &std::path::Path,
) -> Result<(), Failure> {
    let words = Words {
        network: &system.network,
        units: &system.units,
    };
    let mut grids = output::solve::grids(&words, &system.needs, assessment, thresholds);
    grids.push(output::limits::grid(&words, assessment, false));
    grids.push(output::solve::cautions(&words, assessment));
    let files: Vec<(Pending, Vec<u8>)> = grids
        .iter()
        .map(|grid| {
            let pending = Pending::open(&folder.join(format!("{}.csv", grid.name)))?;
            let bytes = grid
                .csv(&system.units)
                .map_err(|why| Failure::Broken(why.to_string()))?;
            Ok((pending, bytes))
        })
        .collect::<Result<_, Failure>>()?;
    files
        .into_iter()
        .try_for_each(|(pending, bytes)| pending.write_whole(&bytes))
}

fn text(system: &System, assessment: &Assessment, thresholds: &[Option<f64>]) -> String {
    let mut out = String::new();
    if let Some(title) = &system.title {
        out.push_str(&format!("{title}\n\n"));
    }
    let words = Words {
        network: &system.network,
        units: &system.units,
    };
    let mut grids = output::solve::grids(&words, &system.needs, assessment, thresholds);
    grids.push(output::limits::grid(&words, assessment, true));
    for grid in grids.iter().filter(|grid| !grid.rows.is_empty()) {
        out.push_str(&grid.text(&system.units));
        out.push('\n');
    }
    let mut cautions: Vec<String> = assessment
        .cautions
        .iter()
        .map(|caution| words.caution(caution))
        .collect();
    cautions.extend(system.cautions.iter().map(|caution| {
        let line = caution.place.map_or_else(String::new, |place| {
            format!(" (line {} of the file)", place.line)
        });
        format!("{}{line}", caution.message)
    }));
    if !cautions.is_empty() {
        out.push_str("Cautions\n");
        for caution in cautions {
            out.push_str(&format!("  - {caution}\n"));
        }
        out.push('\n');
    }
    let balance = &assessment.balance;
    out.push_str(&format!(
        "Balance, recomputed from the answer: nodes within {:.1e} m3/s, lines within {:.1e} m; {} iterations\n\n{}\n",
        balance.worst_node,
        balance.worst_line,
        balance.iterations,
        output::CAUTION
    ));
    out
}

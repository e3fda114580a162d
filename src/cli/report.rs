//! `dutybank report`: a calculation note as one HTML page.

use sha2::{Digest, Sha256};

use super::Failure;
use super::args::ReportOptions;
use super::curves;
use super::duty::{self, solve_cases};
use super::files::{Input, Pending};
use super::shift::{Writer, over_time, run_plan};
use super::solve::read;
use crate::network::Network;
use crate::output;
use crate::output::chart::{Surface, draw};
use crate::output::grid::Grid;
use crate::output::report::{Picture, Report, RunShown, page};
use crate::output::run_picture::{self, Traces};
use crate::output::shift::Telling;
use crate::output::words::Words;
use crate::read::{OverTime, System};
use crate::solve::Solver;
use crate::study::assessment::assess_balances;
use crate::study::gain::gains;
use crate::study::ranking::Run;
use crate::study::threshold::threshold_speeds;
use crate::study::{mains, worked};

pub(super) fn report(options: &ReportOptions) -> Result<(), Failure> {
    let input = Input::open(&options.input.file)?;
    let system = read(&input, &[])?;
    let pending = Pending::open(&options.out)?;
    let network = &system.network;
    let settings = network.settings();
    let mut solver = Solver::new(network);
    let balances = solver
        .balances(settings)
        .map_err(|why| Failure::Broken(format!("{}: {}", input.name, why.message(network))))?;
    let assessment = assess_balances(network, &system.needs, settings, &balances);
    let words = Words {
        network,
        units: &system.units,
    };
    let solved = match network.pumps().is_empty() {
        true => Vec::new(),
        false => solve_cases(&options.duty(), &input, &system)?,
    };
    let velocities = solved.first().and_then(|case| {
        let ranges = mains::ranges(&case.system.network, &case.combinations);
        (!ranges.is_empty()).then(|| words.velocities(&ranges, &case.combinations))
    });
    let over_time = match input.document.has_shift() {
        true => Some(over_time(&input, &system, &[])?),
        false => None,
    };
    let runs = match &over_time {
        Some(over_time) => runs(&system, over_time)?,
        None => Vec::new(),
    };
    let report = Report {
        file: &input.name,
        job: options.job.as_deref(),
        fingerprint: &fingerprint(input.document.text()),
        version: env!("CARGO_PKG_VERSION"),
        system: &system,
        assessment: &assessment,
        thresholds: &threshold_speeds(&mut solver, settings),
        gains: gains(network, &system.needs, settings)
            .iter()
            .map(|gain| words.gain(gain))
            .collect(),
        velocities,
        combinations: solved.iter().map(duty::case_grid).collect(),
        curves: curves::embedded(&options.curves(), &input)?
            .map(|svg| Picture {
                caption: "What the pumps give, what the system asks for, and where they meet, in each case.".to_owned(),
                svg,
            })
            .into_iter()
            .collect(),
        scores: scores(network, &runs),
        runs,
        worked: worked::worked(network, settings, &balances.first),
        more: Vec::new(),
    };
    pending.write_whole(page(&report).as_bytes())
}

/// One run of every plan.
fn runs<'a>(system: &'a System, over_time: &'a OverTime) -> Result<Vec<RunShown<'a>>, Failure> {
    let telling = Telling {
        network: &system.network,
        units: &system.units,
        shift: &over_time.shift,
    };
    over_time
        .plans
        .iter()
        .enumerate()
        .map(|(number, plan)| {
            let mut writer = Writer::open(telling, None, None, "")?;
            writer.traces = Some(Traces::new(&telling));
            let (run, story) = run_plan(telling, over_time, plan, &mut writer)?;
            let answer = telling.answer(&story, &run.score, run.ends_at);
            let picture = |traces: Traces| {
                let mut figure = run_picture::figure(&telling, plan, &run, &traces, "", &answer);
                figure.id = format!("run-{number}");
                Picture {
                    caption: format!("Levels, flows and running pumps under {}.", plan.name),
                    svg: draw(&figure, Surface::Embedded),
                }
            };
            Ok(RunShown {
                telling,
                chart: writer.traces.take().map(picture),
                answer,
                run,
            })
        })
        .collect()
}

/// The scorecards side by side, where there are several.
fn scores(network: &Network, runs: &[RunShown]) -> Option<Grid> {
    let runs: Vec<&Run> = runs.iter().map(|shown| &shown.run).collect();
    (runs.len() > 1).then(|| output::shift::scores(network, &runs))
}

fn fingerprint(text: &str) -> String {
    let digest = Sha256::digest(text.as_bytes());
    digest.iter().map(|byte| format!("{byte:02x}")).collect()
}

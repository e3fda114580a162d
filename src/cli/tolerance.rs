//! `dutybank tolerance`: what is not known exactly, drawn many times.

use std::io::{BufWriter, Write};
use std::ops::ControlFlow;

use super::Failure;
use super::args::ToleranceOptions;
use super::files::{Input, Pending, print};
use super::solve::{read, read_changed};
use crate::diagnostic::{Diagnostic, Diagnostics};
use crate::output;
use crate::output::tolerance::Telling;
use crate::read::{ActsOn, Change, System, Tolerance, Tolerances};
use crate::solve::Solver;
use crate::study::assessment::{Assessment, assess_balances};
use crate::study::tolerance::{self, Case, Effect, Request, ResponseError, Responses, Study, run};

/// Cases where neither the file nor the command line says how many.
const SAMPLES: usize = 10_000;
/// What the draws start from where nothing is said.
const SEED: u64 = 1;
/// Most figures kept, cases times figures a case: 400 MB.
const MOST_FIGURES: usize = 50_000_000;

pub(super) fn tolerance(options: &ToleranceOptions) -> Result<(), Failure> {
    let input = Input::open(&options.input.file)?;
    let (system, changes) = read_changed(&input, &options.changes)?;
    let tolerances = tolerances(&input, &system, &changes)?;
    let responses = responses(&input, &tolerances, &changes)?;
    let samples = options.samples.or(tolerances.samples).unwrap_or(SAMPLES);
    let seed = options.seed.or(tolerances.seed).unwrap_or(SEED);
    let broken = |why: &crate::solve::SolveError| {
        Failure::Broken(format!("{}: {}", input.name, why.message(&system.network)))
    };
    let as_is = as_it_stands(&system).map_err(|why| broken(&why))?;
    check_counts(options, samples, &system, &as_is)?;
    let telling = Telling {
        network: &system.network,
        units: &system.units,
        needs: &system.needs,
        inputs: &tolerances.inputs,
        as_is: &as_is,
        seed,
        graded: tolerances.graded,
    };
    let request = Request {
        responses: &responses,
        needs: &system.needs,
        samples,
        seed,
        threads: options.threads,
    };
    let study = match &options.csv {
        None => run(request, &mut |_| ControlFlow::Continue(())),
        Some(path) => {
            let mut rows = Rows::open(telling, path)?;
            let study = run(request, &mut |case: Case| rows.case(&case));
            rows.finish()?;
            study
        }
    };
    let Some(study) = study.map_err(|why| broken(&why))? else {
        return Ok(());
    };
    if options.json {
        return print(&format!("{:#}\n", telling.json(&study)));
    }
    print(&text(&system, &telling, &study))
}

fn check_counts(
    options: &ToleranceOptions,
    samples: usize,
    system: &System,
    as_is: &Assessment,
) -> Result<(), Failure> {
    let broken = |message: String| Err(Failure::Broken(message));
    if options.threads == Some(0) {
        return broken("--threads must be 1 or more".to_owned());
    }
    if samples == 0 {
        return broken("--samples must be 1 or more".to_owned());
    }
    let figures = tolerance::measures(&system.network, &system.needs, as_is).len();
    let most = MOST_FIGURES / figures.max(1);
    if samples > most {
        return broken(format!(
            "{samples} cases of {figures} figures each are too many to keep; at most {most} here"
        ));
    }
    Ok(())
}

fn as_it_stands(system: &System) -> Result<Assessment, crate::solve::SolveError> {
    let settings = system.network.settings();
    let balances = Solver::new(&system.network).balances(settings)?;
    Ok(assess_balances(
        &system.network,
        &system.needs,
        settings,
        &balances,
    ))
}

fn tolerances(input: &Input, system: &System, changes: &[Change]) -> Result<Tolerances, Failure> {
    let tolerances = input
        .with_load(|load| input.document.tolerances(system, changes, load))
        .map_err(|diagnostics| input.rejected(&diagnostics))?;
    if tolerances.inputs.is_empty() {
        let message = format!(
            "{} has no `tolerances`: say what is not known exactly, for example\n\
             tolerances:\n  pumps: {{grade: 2B}}\n  rising_main.roughness: {{from: 0.1 mm, to: 1 mm, shape: log_even}}",
            input.name
        );
        return Err(Failure::Broken(message));
    }
    Ok(tolerances)
}

/// How the network follows what varies.
fn responses(
    input: &Input,
    tolerances: &Tolerances,
    changes: &[Change],
) -> Result<Responses, Failure> {
    let inputs = tolerances.inputs.iter().map(|of| tolerance::Input {
        name: of.name.clone(),
        spread: of.spread,
        effect: match &of.acts_on {
            ActsOn::Path(_) => Effect::Read,
            ActsOn::Built(figures) => Effect::Percent(figures.clone()),
        },
    });
    let read_at = |places: &[f64]| {
        let inputs = tolerances.inputs.iter().zip(places);
        let mut all = changes.to_vec();
        all.extend(inputs.filter_map(|(of, place)| of.change(*place)));
        read(input, &all).map(|system| system.network)
    };
    Responses::find(inputs.collect(), &read_at).map_err(|why| match why {
        ResponseError::Read(failure) => failure,
        ResponseError::NotFigures(i) => refused(
            input,
            &tolerances.inputs[i],
            "changes more than figures between its limits",
            "only figures can vary: not what runs, a curve, or a part that is there at one limit and gone at the other \
             (a `k` of 0)",
        ),
        ResponseError::Nothing(i) => refused(
            input,
            &tolerances.inputs[i],
            "changes nothing in the network",
            "remove it",
        ),
        ResponseError::Clash(a, b) => {
            let other = &tolerances.inputs[a].name;
            refused(
                input,
                &tolerances.inputs[b],
                &format!("acts on what `{other}` acts on"),
                "leave one of them out, or let them act on different lines or pumps",
            )
        }
    })
}

fn refused(input: &Input, of: &Tolerance, what: &str, help: &str) -> Failure {
    let mut diagnostics = Diagnostics::default();
    let message = format!("tolerance `{}` {what}", of.name);
    diagnostics.push(Diagnostic::error("tolerance", of.place, message).help(help));
    input.rejected(&diagnostics)
}

fn text(system: &System, telling: &Telling, study: &Study) -> String {
    let mut out = String::new();
    if let Some(title) = &system.title {
        out.push_str(&format!("{title}\n\n"));
    }
    out.push_str(&telling.answer(study));
    out.push('\n');
    for grid in telling.grids(study) {
        out.push_str(&grid.text(&system.units));
        out.push('\n');
    }
    out.push_str(&telling.notes(study));
    out.push_str(&format!("\n{}\n", output::CAUTION));
    out
}

/// The file of all cases, written as they come.
struct Rows<'a> {
    telling: Telling<'a>,
    file: csv::Writer<BufWriter<Pending>>,
    failure: Option<csv::Error>,
}

impl<'a> Rows<'a> {
    fn open(telling: Telling<'a>, path: &std::path::Path) -> Result<Self, Failure> {
        let file = csv::Writer::from_writer(BufWriter::new(Pending::open(path)?));
        Ok(Self {
            telling,
            file,
            failure: None,
        })
    }

    fn write(&mut self, fields: &[String]) {
        if self.failure.is_none() {
            self.failure = self.file.write_record(fields).err();
        }
    }

    fn case(&mut self, case: &Case) -> ControlFlow<()> {
        if case.number == 0 {
            self.write(&self.telling.headings(case.measures));
        }
        self.write(&self.telling.row(case));
        match self.failure {
            None => ControlFlow::Continue(()),
            Some(_) => ControlFlow::Break(()),
        }
    }

    fn finish(self) -> Result<(), Failure> {
        let cannot = |why: String| Failure::Broken(format!("the cases cannot be written: {why}"));
        if let Some(why) = self.failure {
            return Err(cannot(why.to_string()));
        }
        let buffer = self
            .file
            .into_inner()
            .map_err(|why| cannot(why.to_string()))?;
        let mut pending = buffer.into_inner().map_err(|why| cannot(why.to_string()))?;
        pending.flush().map_err(|why| cannot(why.to_string()))?;
        pending.place()
    }
}

//! `dutybank shift`: one plan over the shift.

use std::io::Write;
use std::ops::ControlFlow;

use super::Failure;
use super::args::ShiftOptions;
use super::files::{Input, Pending, print};
use super::solve::read_changed;
use crate::output;
use crate::output::chart::{Surface, draw};
use crate::output::run_picture::{self, Traces};
use crate::output::shift::{Story, Telling};
use crate::output::words::Words;
use crate::read::{Change, OverTime, System};
use crate::shift::{Event, Plan, Row, run};
use crate::study::ranking::Run;
use crate::study::starts;
use crate::units::Kind;

pub(super) fn shift(options: &ShiftOptions) -> Result<(), Failure> {
    let input = Input::open(&options.input.file)?;
    let (system, changes) = read_changed(&input, &options.changes)?;
    let over_time = over_time(&input, &system, &changes)?;
    let plan = plan_named(&over_time, options.plan.as_deref(), &input.name)?;
    let telling = Telling {
        network: &system.network,
        units: &system.units,
        shift: &over_time.shift,
    };
    let mut sink = Writer::open(
        telling,
        options.csv.as_deref(),
        options.events.as_deref(),
        "",
    )?;
    sink.keep = options.json;
    let picture = options.svg.as_deref().map(Pending::open).transpose()?;
    sink.traces = picture.is_some().then(|| Traces::new(&telling));
    let (run, story) = run_plan(telling, &over_time, &plan, &mut sink)?;
    let answer = telling.answer(&story, &run.score, run.ends_at);
    if let Some((picture, traces)) = picture.zip(sink.traces.take()) {
        let title = system.title.as_deref().unwrap_or("");
        let figure = run_picture::figure(&telling, &plan, &run, &traces, title, &answer);
        picture.write_whole(draw(&figure, Surface::StandAlone).as_bytes())?;
    }
    sink.finish()?;
    if options.json {
        return print(&format!("{:#}\n", telling.json(&run)));
    }
    let mut out = String::new();
    if let Some(title) = &system.title {
        out.push_str(&format!("{title}\n\n"));
    }
    out.push_str(&answer);
    out.push('\n');
    out.push_str(&output::shift::card(&telling, &run));
    out.push('\n');
    out.push_str(&output::shift::pumps(&system.network, &run).text(&system.units));
    let words = Words {
        network: &system.network,
        units: &system.units,
    };
    let too_many = starts::too_many(&system.network, &run.score);
    if !too_many.is_empty() {
        out.push_str("\nCautions\n");
    }
    for (pump, starts, allowed) in too_many {
        out.push_str(&format!("  - {}\n", words.starts(pump, starts, allowed)));
    }
    out.push_str(&format!("\n{}\n", output::CAUTION));
    print(&out)
}

pub(super) fn over_time(
    input: &Input,
    system: &System,
    changes: &[Change],
) -> Result<OverTime, Failure> {
    input
        .with_load(|load| input.document.over_time(system, changes, load))
        .map_err(|diagnostics| input.rejected(&diagnostics))
}

/// The plan of that name; without a name the only one, or none at all: pumps then run as the file has them.
fn plan_named(over_time: &OverTime, name: Option<&str>, file: &str) -> Result<Plan, Failure> {
    let names: Vec<&str> = over_time
        .plans
        .iter()
        .map(|plan| plan.name.as_str())
        .collect();
    match (name, over_time.plans.as_slice()) {
        (Some(name), plans) => plans
            .iter()
            .find(|plan| plan.name == name)
            .cloned()
            .ok_or_else(|| {
                let known = if names.is_empty() {
                    "it has none".to_owned()
                } else {
                    format!("it has {}", names.join(", "))
                };
                Failure::Broken(format!("{file} has no plan `{name}`; {known}"))
            }),
        (None, []) => Ok(Plan {
            name: "as the file has it".to_owned(),
            ..Plan::default()
        }),
        (None, [plan]) => Ok(plan.clone()),
        (None, _) => {
            let message = format!(
                "{file} has several plans: choose one with `--plan NAME` ({})",
                names.join(", ")
            );
            Err(Failure::Broken(message))
        }
    }
}

/// Runs a plan; rows and events go to the writer as they come.
pub(super) fn run_plan(
    telling: Telling,
    over_time: &OverTime,
    plan: &Plan,
    sink: &mut Writer,
) -> Result<(Run, Story), Failure> {
    let lasts = over_time.shift.lasts;
    // Only a terminal sees it, and only when there is something to wait for.
    let progress = indicatif::ProgressBar::new(1000);
    progress.set_draw_target(indicatif::ProgressDrawTarget::stderr_with_hz(4));
    let style = indicatif::ProgressStyle::with_template("{msg} {bar:30} {percent} %");
    progress.set_style(style.unwrap_or_else(|_| indicatif::ProgressStyle::default_bar()));
    progress.set_message(plan.name.clone());
    let mut story = Story::default();
    let outcome = run(telling.network, &over_time.shift, plan, &mut |row: Row<
        '_,
    >| {
        row.events.iter().for_each(|event| story.tell(event));
        progress.set_position((1000.0 * row.time / lasts) as u64);
        sink.row(row)
    });
    progress.finish_and_clear();
    if let Some(failure) = sink.failure.take() {
        return Err(failure);
    }
    let write = |kind, value| telling.units.with_unit(kind, value);
    let outcome = outcome.map_err(|why| {
        Failure::Broken(format!(
            "plan `{}`: {}",
            plan.name,
            why.message(telling.network, &write)
        ))
    })?;
    let run = Run {
        plan: plan.name.clone(),
        ends_at: outcome.ends_at,
        score: outcome.score,
        events: std::mem::take(&mut sink.events),
    };
    Ok((run, story))
}

/// Writes rows and events as they come.
pub(super) struct Writer<'a> {
    telling: Telling<'a>,
    kinds: Vec<Option<Kind>>,
    rows: Option<csv::Writer<Pending>>,
    happenings: Option<csv::Writer<Pending>>,
    /// The plan that each row begins with, where several share a file.
    pub plan: String,
    /// Whether events are kept.
    pub keep: bool,
    /// What a picture shows, where one is wanted.
    pub traces: Option<Traces>,
    events: Vec<Event>,
    failure: Option<Failure>,
}

impl<'a> Writer<'a> {
    pub fn open(
        telling: Telling<'a>,
        rows: Option<&std::path::Path>,
        happenings: Option<&std::path::Path>,
        first_column: &str,
    ) -> Result<Self, Failure> {
        let open = |path: Option<&std::path::Path>| path.map(Pending::open).transpose();
        let mut writer = Self {
            telling,
            kinds: telling.kinds(),
            rows: open(rows)?.map(csv::Writer::from_writer),
            happenings: open(happenings)?.map(csv::Writer::from_writer),
            plan: String::new(),
            keep: false,
            traces: None,
            events: Vec::new(),
            failure: None,
        };
        let first = (!first_column.is_empty()).then(|| first_column.to_owned());
        if let Some(rows) = &mut writer.rows {
            let headings = first.clone().into_iter().chain(telling.headings());
            rows.write_record(headings).map_err(broken)?;
        }
        if let Some(happenings) = &mut writer.happenings {
            let headings = ["time [s]", "clock", "what", "who", "event"].map(str::to_owned);
            happenings
                .write_record(first.into_iter().chain(headings))
                .map_err(broken)?;
        }
        Ok(writer)
    }

    fn row(&mut self, row: Row<'_>) -> ControlFlow<()> {
        match self.put(row) {
            Ok(()) => ControlFlow::Continue(()),
            Err(why) => {
                self.failure = Some(broken(why));
                ControlFlow::Break(())
            }
        }
    }

    fn put(&mut self, row: Row<'_>) -> Result<(), csv::Error> {
        if self.keep {
            self.events.extend_from_slice(row.events);
        }
        if let Some(traces) = &mut self.traces {
            traces.row(row);
        }
        let telling = self.telling;
        if let Some(happenings) = &mut self.happenings {
            for event in row.events {
                if !self.plan.is_empty() {
                    happenings.write_field(&self.plan)?;
                }
                happenings.write_record([
                    event.time.to_string(),
                    telling.clock(event.time),
                    event.what.word().to_owned(),
                    event.who.name(telling.network).to_owned(),
                    telling.happening(event),
                ])?;
            }
        }
        let Some(rows) = &mut self.rows else {
            return Ok(());
        };
        if !self.plan.is_empty() {
            rows.write_field(&self.plan)?;
        }
        rows.write_field(row.time.to_string())?;
        for (value, kind) in row.values.iter().zip(&self.kinds) {
            let value = kind.map_or(*value, |kind| telling.units.from_si(kind, *value));
            rows.write_field(if value.is_nan() {
                String::new()
            } else {
                (value + 0.0).to_string()
            })?;
        }
        let events: Vec<String> = row
            .events
            .iter()
            .map(|event| telling.happening(event))
            .collect();
        rows.write_field(events.join("; "))?;
        rows.write_record(None::<&[u8]>)
    }

    /// Puts the files in their places.
    pub fn finish(self) -> Result<(), Failure> {
        for writer in [self.rows, self.happenings].into_iter().flatten() {
            let mut pending = writer
                .into_inner()
                .map_err(|why| broken(why.into_error()))?;
            pending.flush().map_err(broken)?;
            pending.place()?;
        }
        Ok(())
    }
}

fn broken(why: impl std::fmt::Display) -> Failure {
    Failure::Broken(format!("the time series cannot be written: {why}"))
}

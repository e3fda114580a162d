//! `dutybank compare`: plans over the same shift, from the same start.

use super::Failure;
use super::args::CompareOptions;
use super::files::{Input, Pending, print};
use super::shift::{Writer, over_time, run_plan};
use super::solve::read_changed;
use crate::output;
use crate::output::shift::Telling;
use crate::shift::Plan;
use crate::study::ranking::{Measure, Order, Run, first_difference, rank};

pub(super) fn compare(options: &CompareOptions) -> Result<(), Failure> {
    let input = Input::open(&options.input.file)?;
    let order = order(&options.weights)?;
    let (system, changes) = read_changed(&input, &options.changes)?;
    let over_time = over_time(&input, &system, &changes)?;
    let plans = chosen(&over_time.plans, options.plans.as_deref(), &input.name)?;
    let telling = Telling {
        network: &system.network,
        units: &system.units,
        shift: &over_time.shift,
    };
    let scores = options.scores.as_deref().map(Pending::open).transpose()?;
    let mut sink = Writer::open(
        telling,
        options.csv.as_deref(),
        options.events.as_deref(),
        "plan",
    )?;
    sink.keep = true;
    let mut runs = Vec::new();
    for plan in plans {
        sink.plan.clone_from(&plan.name);
        runs.push(run_plan(telling, &over_time, plan, &mut sink)?.0);
    }
    let ranked: Vec<&Run> = rank(&runs, &order).into_iter().map(|i| &runs[i]).collect();
    let grid = output::shift::scores(&system.network, &ranked);
    if let Some(scores) = scores {
        scores.write_whole(
            &grid
                .csv(&system.units)
                .map_err(|why| Failure::Broken(why.to_string()))?,
        )?;
    }
    sink.finish()?;
    if options.json {
        let all: Vec<_> = ranked.iter().map(|run| telling.json(run)).collect();
        return print(&format!("{:#}\n", serde_json::Value::Array(all)));
    }
    let mut out = String::new();
    if let Some(title) = &system.title {
        out.push_str(&format!("{title}\n\n"));
    }
    out.push_str(&grid.text(&system.units));
    out.push_str(&format!("\n{}\n", how_ranked(&order)));
    out.push_str(&notes(telling, &ranked));
    out.push_str(&format!("\n{}\n", output::CAUTION));
    print(&out)
}

fn chosen<'p>(
    plans: &'p [Plan],
    names: Option<&[String]>,
    file: &str,
) -> Result<Vec<&'p Plan>, Failure> {
    let known: Vec<&str> = plans.iter().map(|plan| plan.name.as_str()).collect();
    if plans.is_empty() {
        return Err(Failure::Broken(format!(
            "{file} has no plans to compare: add them under `staging:`"
        )));
    }
    let Some(names) = names.filter(|names| *names != ["all"]) else {
        return Ok(plans.iter().collect());
    };
    let find = |name: &String| {
        plans
            .iter()
            .find(|plan| plan.name == name.trim())
            .ok_or_else(|| {
                Failure::Broken(format!(
                    "{file} has no plan `{name}`; it has {}",
                    known.join(", ")
                ))
            })
    };
    names.iter().map(find).collect()
}

/// `spilled=1000,starts=0.2,cost=1`.
fn order(weights: &[String]) -> Result<Order, Failure> {
    if weights.is_empty() {
        return Ok(Order::ViolationsFirst);
    }
    let words: Vec<&str> = Measure::ALL.iter().map(|measure| measure.word()).collect();
    let weight = |text: &String| {
        let (word, number) = text.split_once('=')?;
        let measure = Measure::ALL
            .into_iter()
            .find(|measure| measure.word() == word.trim())?;
        let number: f64 = number.trim().parse().ok()?;
        (number.is_finite() && number >= 0.0).then_some((measure, number))
    };
    let read: Result<Vec<_>, Failure> = weights
        .iter()
        .map(|text| {
            weight(text).ok_or_else(|| {
                Failure::Broken(format!(
                    "`{text}` is no weight: write MEASURE=NUMBER with one of {}",
                    words.join(", ")
                ))
            })
        })
        .collect();
    read.map(Order::Weighted)
}

fn how_ranked(order: &Order) -> String {
    match order {
        Order::ViolationsFirst => "Best first: violations before cost, in the order spilled, drawn in vain, above alarm, below trip, held \
            shut,\npast the curve, below least flow; then cost with the end level made good (energy without a tariff), then starts."
            .to_owned(),
        Order::Weighted(weights) => {
            let terms: Vec<String> =
                weights.iter().map(|(measure, weight)| format!("{weight} x {}", measure.word())).collect();
            format!("Best first: least {}", terms.join(" + "))
        }
    }
}

/// Unequal ends, and where each run parts from the best.
fn notes(telling: Telling, ranked: &[&Run]) -> String {
    let mut out = String::new();
    let volume = |value: f64| telling.units.with_unit(crate::units::Kind::Volume, value);
    let owed: Vec<f64> = ranked.iter().map(|run| run.score.owed).collect();
    let spread = owed.iter().copied().fold(f64::NEG_INFINITY, f64::max)
        - owed.iter().copied().fold(f64::INFINITY, f64::min);
    let pumped = ranked
        .iter()
        .map(|run| run.score.pumped)
        .fold(0.0, f64::max);
    if spread > 1e-3 * pumped {
        out.push_str(&format!(
            "The runs do not end alike: what they still owe differs by {}; the corrected cost charges that at each run's own cost.\n",
            volume(spread)
        ));
    }
    let Some((best, others)) = ranked.split_first() else {
        return out;
    };
    for other in others {
        let told = |event: Option<&crate::shift::Event>| {
            event.map_or_else(|| "nothing more".to_owned(), |event| telling.event(event))
        };
        match first_difference(best, other) {
            None => out.push_str(&format!("{} and {} run alike.\n", best.plan, other.plan)),
            Some((a, b)) => out.push_str(&format!(
                "{} and {} first differ: {}, against {}.\n",
                best.plan,
                other.plan,
                told(a),
                told(b)
            )),
        }
    }
    out
}

//! The study of tolerances for programs: one JSON object, and rows of cases.

use serde_json::{Map, Value, json};

use super::{KILOWATT_HOUR, Telling};
use crate::network::Shape;
use crate::output::json::{figure, number};
use crate::study::tolerance::{Case, Measure, Study, Way};

impl Telling<'_> {
    /// One JSON object.
    pub fn json(&self, study: &Study) -> Value {
        let share = |cases: usize| number(Some(cases as f64 / study.samples as f64));
        let inputs = self.inputs.iter().map(|input| {
            json!({
                "name": input.name, "from": input.spread.low, "to": input.spread.high, "unit": input.unit,
                "shape": shape_word(input.spread.shape),
            })
        });
        let needs = self.needs.iter().zip(&study.needs.met);
        let needs: Map<String, Value> = needs
            .map(|(need, met)| (need.name.clone(), json!({"met": share(*met)})))
            .collect();
        let limits = study.broken.iter().map(|broken| {
            json!({"code": broken.code, "about": self.about(broken.about), "share": share(broken.cases)})
        });
        let figures = study.measures.iter().enumerate();
        let figures = figures.map(|(i, measure)| self.figure_json(study, i, *measure));
        json!({
            "samples": study.samples,
            "seed": self.seed,
            "without_balance": study.unbalanced.as_ref().map_or(0, |(cases, _)| *cases),
            "inputs": inputs.collect::<Vec<_>>(),
            "needs": needs,
            "all_needs": share(study.needs.all),
            "limits": limits.collect::<Vec<_>>(),
            "no_limit_broken": share(study.sound),
            "figures": figures.collect::<Vec<_>>(),
        })
    }

    fn figure_json(&self, study: &Study, i: usize, measure: Measure) -> Value {
        let (of, word) = self.key(measure);
        let value = |value: Option<f64>| match self.kind(measure) {
            Some(kind) => figure(self.units, kind, value),
            None => number(value.map(|value| value / KILOWATT_HOUR)),
        };
        let band = study.bands[i].as_ref();
        let influence = &study.influences[i];
        let inputs = influence.shares.iter().zip(self.inputs).map(|(share, input)| {
            json!({
                "input": input.name, "change": value(Some(share.change)),
                "linear_share": number(Some(share.linear)), "sampled_share": number(Some(share.sampled)),
            })
        });
        json!({
            "of": of, "figure": word, "unit": self.unit(measure),
            "as_is": value(measure.of(self.as_is)),
            "p5": value(band.map(|band| band.p5)), "p50": value(band.map(|band| band.p50)),
            "p95": value(band.map(|band| band.p95)), "mean": value(band.map(|band| band.mean)),
            "standard_deviation": value(band.map(|band| band.deviation)),
            "cases": band.map_or(0, |band| band.cases),
            "slopes": match influence.way { Way::Gradient => "gradient", Way::BothSides(_) => "both sides" },
            "shares_disagree": influence.disagrees(),
            "inputs": inputs.collect::<Vec<_>>(),
        })
    }

    /// Headings of the rows of cases.
    pub fn headings(&self, measures: &[Measure]) -> Vec<String> {
        let with_unit = |name: String, unit: &str| match unit {
            "" => name,
            unit => format!("{name} [{unit}]"),
        };
        let mut headings = vec!["case".to_owned(), "balance".to_owned()];
        let inputs = self.inputs.iter();
        headings.extend(inputs.map(|input| with_unit(input.name.clone(), input.unit)));
        headings.extend(measures.iter().map(|measure| {
            let (of, word) = self.key(*measure);
            with_unit(format!("{of}.{word}"), self.unit(*measure))
        }));
        headings
    }

    /// The row of a case under [`Self::headings`].
    pub fn row(&self, case: &Case) -> Vec<String> {
        let mut row = vec![(case.number + 1).to_string(), case.balanced.to_string()];
        let inputs = self.inputs.iter().zip(case.draws);
        row.extend(inputs.map(|(input, draw)| input.spread.at(draw.place).to_string()));
        row.extend(case.measures.iter().zip(case.values).map(
            |(measure, value)| match value.is_nan() {
                true => String::new(),
                false => self.in_unit(*measure, *value).to_string(),
            },
        ));
        row
    }
}

fn shape_word(shape: Shape) -> &'static str {
    match shape {
        Shape::Even => "even",
        Shape::LogEven => "log_even",
        Shape::Normal { .. } => "normal",
    }
}

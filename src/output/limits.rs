//! Limits in a few words, and their table.

use super::grid::{Cell, Column, Grid};
use super::words::Words;
use crate::network::{LimitName, Measure};
use crate::study::assessment::Assessment;
use crate::study::limit::{Limit, LimitKind, Says};
use crate::units::Kind;

impl Words<'_> {
    /// The limit in a few words with its figure, as the one that binds.
    pub fn limit(&self, limit: &Limit) -> String {
        let name = self.name_of(limit.about);
        let value = limit.value;
        let pressure = || self.figure(Kind::Pressure, value);
        match limit.kind {
            LimitKind::DeliversNothing => format!("{name} delivers nothing"),
            LimitKind::Motor => format!("{name} motor at {}", Self::percent(value)),
            LimitKind::NpshRequired => {
                format!("{name} NPSH {:.2} x required", value / limit.bound)
            }
            LimitKind::NpshMargin { required } => {
                format!("{name} NPSH {:.2} x required", value / required)
            }
            LimitKind::AllowableLow
            | LimitKind::AllowableHigh
            | LimitKind::PreferredLow
            | LimitKind::PreferredHigh => format!("{name} at {} of BEP", Self::percent(value)),
            LimitKind::EndOfCurve if limit.is_broken() => format!("{name} past its curve"),
            LimitKind::EndOfCurve => {
                format!(
                    "{name} at {} of its curve",
                    Self::percent(value / limit.bound)
                )
            }
            LimitKind::MinimumFlow => format!(
                "{name} at {} of its minimum flow",
                Self::percent(value / limit.bound)
            ),
            LimitKind::Suction => format!("{name} suction at {}", pressure()),
            LimitKind::Casing => format!("{name} casing at {}", pressure()),
            LimitKind::CasingAtShutoff => format!("{name} casing at {} shut off", pressure()),
            LimitKind::Rating => format!("{name} at {}", pressure()),
            LimitKind::RatingAtShutoff => format!("{name} at {} shut off", pressure()),
            LimitKind::RatingIfLeaking => format!("{name} at {} if leaking", pressure()),
            LimitKind::Submergence => format!(
                "{name} bell {} under water",
                self.figure(Kind::Length, value)
            ),
            LimitKind::VelocityLow | LimitKind::VelocityHigh => {
                format!("{name} at {}", self.figure(Kind::Velocity, value))
            }
        }
    }

    /// Who says so.
    pub fn says(&self, limit: &Limit) -> &str {
        match limit.says {
            Says::Limits(name) => self.network.limits().source(name),
            Says::Maker => "the maker, as the pump model states it",
            Says::Curve => "the curve of the pump model",
            Says::Rating => "the rating in this file",
            Says::Submergence => "S = D (1 + 2.3 Fr), ANSI/HI 9.8 as quoted in the trade",
        }
    }

    /// Figure and limit of a kind, each with its unit.
    fn sides(&self, limit: &Limit) -> (String, String) {
        let kind = kind_of(limit.kind);
        let figure = |value: f64| match kind {
            Kind::Percent => Self::percent(value),
            kind => self.figure(kind, value),
        };
        (figure(limit.value), figure(limit.bound))
    }
}

/// What a kind of limit measures.
pub fn kind_of(limit: LimitKind) -> Kind {
    match limit {
        LimitKind::DeliversNothing | LimitKind::EndOfCurve | LimitKind::MinimumFlow => Kind::Flow,
        LimitKind::AllowableLow
        | LimitKind::AllowableHigh
        | LimitKind::PreferredLow
        | LimitKind::PreferredHigh
        | LimitKind::Motor => Kind::Percent,
        LimitKind::NpshRequired | LimitKind::NpshMargin { .. } | LimitKind::Submergence => {
            Kind::Length
        }
        LimitKind::Suction
        | LimitKind::Casing
        | LimitKind::CasingAtShutoff
        | LimitKind::Rating
        | LimitKind::RatingAtShutoff
        | LimitKind::RatingIfLeaking => Kind::Pressure,
        LimitKind::VelocityLow | LimitKind::VelocityHigh => Kind::Velocity,
    }
}

/// A kind of limit as a heading.
pub fn name_of(limit: LimitKind) -> &'static str {
    match limit {
        LimitKind::DeliversNothing => "delivers something",
        LimitKind::EndOfCurve => "end of curve",
        LimitKind::MinimumFlow => "minimum continuous flow",
        LimitKind::AllowableLow | LimitKind::AllowableHigh => "allowable region",
        LimitKind::PreferredLow | LimitKind::PreferredHigh => "preferred region",
        LimitKind::Motor => "motor load",
        LimitKind::NpshRequired => "NPSH required",
        LimitKind::NpshMargin { .. } => "NPSH with margin",
        LimitKind::Suction => "suction pressure",
        LimitKind::Casing => "casing pressure",
        LimitKind::CasingAtShutoff => "casing pressure at shut-off",
        LimitKind::Rating => "line pressure",
        LimitKind::RatingAtShutoff => "line pressure at shut-off",
        LimitKind::RatingIfLeaking => "line pressure if check valves leak",
        LimitKind::Submergence => "submergence of the bell",
        LimitKind::VelocityLow | LimitKind::VelocityHigh => "velocity in the main",
    }
}

/// Room beyond which a limit is left out of the table for people: twice the limit away or half of it.
const FAR: f64 = 1.0;

/// Limits with their figures, the room left and who says so; tightest first. Things that share all figures share a row. `near`: without
/// those that are far away.
pub fn grid(words: &Words, assessment: &Assessment, near: bool) -> Grid {
    let shown = |limit: &&Limit| !near || limit.room <= FAR;
    let mut limits: Vec<&Limit> = assessment.limits.iter().filter(shown).collect();
    limits.sort_by(|a, b| a.room.total_cmp(&b.room));
    let mut rows: Vec<Vec<Cell>> = Vec::new();
    for limit in limits {
        let (value, bound) = words.sides(limit);
        let side = if limit.kind.is_least() {
            "at least"
        } else {
            "at most"
        };
        let room = match limit.kind {
            LimitKind::DeliversNothing => "BROKEN".to_owned(),
            _ if limit.is_broken() => "BROKEN".to_owned(),
            _ => format!("{:.0} %", 100.0 * limit.room),
        };
        let what = [
            Cell::Text(name_of(limit.kind).to_owned()),
            Cell::Text(value),
            Cell::Text(format!("{side} {bound}")),
            Cell::Text(room),
            Cell::Text(words.says(limit).to_owned()),
        ];
        let name = words.name_of(limit.about);
        match rows.iter_mut().find(|row| row[1..] == what) {
            Some(row) => {
                if let Cell::Text(names) = &mut row[0] {
                    names.push_str(&format!(", {name}"));
                }
            }
            None => {
                let about = Cell::Text(name.to_owned());
                rows.push(std::iter::once(about).chain(what).collect());
            }
        }
    }
    Grid {
        title: match near {
            true => "Limits with at most 100 % of room, tightest first",
            false => "Limits, tightest first",
        }
        .to_owned(),
        name: "limits".to_owned(),
        columns: vec![
            Column::text("of", "about"),
            Column::text("limit", "limit"),
            Column::text("figure", "value"),
            Column::text("allowed", "allowed"),
            Column::text("room", "room"),
            Column::text("who says so", "source"),
        ],
        rows,
    }
}

/// The values that limits have here, given or by default, and who says so; those that are not judged left out.
pub fn values(words: &Words) -> Grid {
    let limits = words.network.limits();
    let rows = LimitName::all().filter_map(|name| {
        let value = limits.value(name)?;
        let shown = match name.measure() {
            Measure::Share => Words::percent(value),
            Measure::Number => format!("{value}"),
            Measure::Length => words.figure(Kind::Length, value),
            Measure::Pressure => words.figure(Kind::Pressure, value),
            Measure::Velocity => words.figure(Kind::Velocity, value),
        };
        Some(vec![
            Cell::Text(name.key().to_owned()),
            Cell::Text(shown),
            Cell::Text(limits.source(name).to_owned()),
        ])
    });
    Grid {
        title: "Limits as they are set".to_owned(),
        name: "limit_values".to_owned(),
        columns: vec![
            Column::text("limit", "limit"),
            Column::text("value", "value"),
            Column::text("who says so", "source"),
        ],
        rows: rows.collect(),
    }
}

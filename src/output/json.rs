//! Results as JSON: the file's units, full precision, `null` where a figure does not exist.

use serde_json::{Map, Value, json};

use super::limits;
use super::solve::state_word;
use super::words::Words;
use crate::diagnostic::Diagnostic;
use crate::network::{Need, Network, Target};
use crate::study::assessment::Assessment;
use crate::study::duty::Combination;
use crate::study::gain::Gain;
use crate::study::mains;
use crate::units::{Kind, UnitSet};

/// Joules in a kilowatt-hour.
const KILOWATT_HOUR: f64 = 3.6e6;

/// A figure of a kind; `null` where it does not exist.
pub fn figure(units: &UnitSet, kind: Kind, value: Option<f64>) -> Value {
    number(value.map(|value| units.from_si(kind, value)))
}

/// A number without a sign on zero.
pub fn number(value: Option<f64>) -> Value {
    value.map_or(Value::Null, |value| {
        json!(if value == 0.0 { 0.0 } else { value })
    })
}

/// The units that the figures of a result are in.
fn units_of(units: &UnitSet) -> Value {
    let symbol = |kind| units.unit(kind).symbol;
    json!({
        "flow": symbol(Kind::Flow), "head": symbol(Kind::Length), "pressure": symbol(Kind::Pressure),
        "power": symbol(Kind::Power), "efficiency": symbol(Kind::Percent), "velocity": symbol(Kind::Velocity),
    })
}

/// One solved state.
pub fn solve(
    network: &Network,
    needs: &[Need],
    units: &UnitSet,
    assessment: &Assessment,
    thresholds: &[Option<f64>],
    file_cautions: &[Diagnostic],
) -> Value {
    let mut cautions: Vec<Value> = file_cautions
        .iter()
        .map(|caution| {
            json!({"code": caution.code, "line": caution.place.map(|place| place.line), "message": caution.message})
        })
        .collect();
    let words = Words { network, units };
    cautions.extend(cautions_of(&words, assessment));
    let mut pumps = pumps(network, units, assessment);
    for (pump, threshold) in network.pumps().iter().zip(thresholds) {
        pumps[&pump.name]["threshold_speed"] = number(*threshold);
    }
    json!({
        "units": units_of(units),
        "nodes": nodes(network, units, assessment),
        "lines": lines(network, units, assessment),
        "pumps": pumps,
        "regulators": super::regulators::json(network, units, assessment),
        "needs": needs_of(needs, units, assessment),
        "limits": limits_of(&words, assessment),
        "mains": mains_of(&words, assessment),
        "balance": {
            "worst_node": number(Some(assessment.balance.worst_node)),
            "worst_line": number(Some(assessment.balance.worst_line)),
            "iterations": assessment.balance.iterations,
        },
        "cautions": cautions,
    })
}

fn cautions_of(words: &Words, assessment: &Assessment) -> Vec<Value> {
    let each = assessment.cautions.iter().map(|caution| {
        json!({"code": caution.code(), "about": words.about(caution), "message": words.caution(caution)})
    });
    each.collect()
}

fn limits_of(words: &Words, assessment: &Assessment) -> Value {
    let each = assessment.limits.iter().map(|limit| {
        let kind = limits::kind_of(limit.kind);
        let figure = |value| figure(words.units, kind, Some(value));
        json!({
            "about": words.name_of(limit.about), "limit": limits::name_of(limit.kind), "code": limit.kind.code(),
            "value": figure(limit.value), "bound": figure(limit.bound), "unit": words.units.unit(kind).symbol,
            "at_least": limit.kind.is_least(), "broken": limit.is_broken(), "source": words.says(limit),
        })
    });
    each.collect()
}

fn mains_of(words: &Words, assessment: &Assessment) -> Value {
    let mains = mains::states(words.network, &assessment.lines, &assessment.pumps);
    let each = mains.iter().map(|main| {
        let value = json!({
            "velocity": figure(words.units, Kind::Velocity, Some(main.velocity)),
            "retention_s": number(Some(main.retention)),
            "wave_speed": figure(words.units, Kind::Velocity, Some(main.wave_speed)),
            "wave_speed_known": main.wave_speed_known,
            "surge_head": figure(words.units, Kind::Length, Some(main.surge_head)),
            "return_time_s": number(Some(main.return_time)),
        });
        (words.network.line(main.line).name.clone(), value)
    });
    Value::Object(each.collect())
}

fn nodes(network: &Network, units: &UnitSet, assessment: &Assessment) -> Value {
    let each = network
        .nodes()
        .iter()
        .zip(&assessment.nodes)
        .map(|(node, does)| {
            let value = json!({
                "head": figure(units, Kind::Length, does.head),
                "pressure": figure(units, Kind::Pressure, does.pressure),
            });
            (node.name.clone(), value)
        });
    Value::Object(each.collect())
}

fn lines(network: &Network, units: &UnitSet, assessment: &Assessment) -> Value {
    let each = network
        .lines()
        .iter()
        .zip(&assessment.lines)
        .map(|(line, does)| {
            let value = json!({
                "flow": figure(units, Kind::Flow, Some(does.flow)),
                "state": state_word(does.state),
                "velocity": figure(units, Kind::Velocity, does.velocity),
                "head_loss": figure(units, Kind::Length, does.head_loss),
            });
            (line.name.clone(), value)
        });
    Value::Object(each.collect())
}

fn pumps(network: &Network, units: &UnitSet, assessment: &Assessment) -> Value {
    let each = network
        .pumps()
        .iter()
        .zip(&assessment.pumps)
        .map(|(pump, does)| {
            let value = json!({
                "running": does.running,
                "flow": figure(units, Kind::Flow, Some(does.flow)),
                "head": figure(units, Kind::Length, does.head),
                "efficiency": figure(units, Kind::Percent, does.efficiency),
                "shaft_power": figure(units, Kind::Power, does.shaft_power),
                "electrical_power": figure(units, Kind::Power, does.electrical_power),
                "motor_load": number(does.motor_load),
                "suction_pressure": figure(units, Kind::Pressure, does.suction_pressure),
                "npsh_available": figure(units, Kind::Length, does.npsh_available),
                "npsh_required": figure(units, Kind::Length, does.npsh_required),
                "share_of_bep": number(does.share_of_bep),
            });
            (pump.name.clone(), value)
        });
    Value::Object(each.collect())
}

fn needs_of(needs: &[Need], units: &UnitSet, assessment: &Assessment) -> Value {
    let each = needs.iter().zip(&assessment.needs).map(|(need, value)| {
        let kind = match need.target {
            Target::PressureAt(_) => Kind::Pressure,
            Target::FlowInto(_) | Target::FlowIn(_) => Kind::Flow,
        };
        let value = json!({"value": figure(units, kind, value.value), "met": value.met});
        (need.name.clone(), value)
    });
    Value::Object(each.collect())
}

/// One case of `duty`: its name, network and rows.
pub struct DutyCase<'a> {
    /// The case; empty for the file as it stands.
    pub name: &'a str,
    /// Its network.
    pub network: &'a Network,
    /// Its needs.
    pub needs: &'a [Need],
    /// Its rows.
    pub combinations: &'a [Combination],
}

/// The whole of `duty`.
pub fn duty(units: &UnitSet, network: &Network, gains: &[Gain], cases: &[DutyCase]) -> Value {
    let gains: Vec<Value> = gains
        .iter()
        .map(|gain| gain_of(network, units, gain))
        .collect();
    let rows: Vec<Value> = cases
        .iter()
        .flat_map(|case| {
            case.combinations
                .iter()
                .map(|combination| row(units, case, combination))
        })
        .collect();
    json!({"units": units_of(units), "gains": gains, "combinations": rows})
}

fn gain_of(network: &Network, units: &UnitSet, gain: &Gain) -> Value {
    let steps: Vec<Value> = gain
        .steps
        .iter()
        .map(|step| {
            let held: Vec<&str> = step
                .held_shut
                .iter()
                .map(|pump| network.pump(*pump).name.as_str())
                .collect();
            json!({
                "added": network.pump(step.added).name,
                "flow": figure(units, Kind::Flow, Some(step.delivered)),
                "friction_share": number(step.friction_share),
                "held_shut": held,
            })
        })
        .collect();
    json!({"bank": gain.bank, "steps": steps, "end": figure(units, Kind::Flow, gain.end)})
}

fn row(units: &UnitSet, case: &DutyCase, combination: &Combination) -> Value {
    let network = case.network;
    let running: Vec<&str> = combination
        .running
        .iter()
        .map(|pump| network.pump(*pump).name.as_str())
        .collect();
    let mut row = Map::new();
    row.insert(
        "case".into(),
        if case.name.is_empty() {
            Value::Null
        } else {
            json!(case.name)
        },
    );
    row.insert("running".into(), json!(running));
    match &combination.outcome {
        Err(error) => {
            row.insert("error".into(), json!(error.message(network)));
        }
        Ok(outcome) => {
            let words = Words { network, units };
            let assessment = &outcome.assessment;
            row.insert(
                "flow".into(),
                figure(units, Kind::Flow, Some(assessment.delivered)),
            );
            row.insert(
                "shaft_power".into(),
                figure(units, Kind::Power, outcome.shaft_power),
            );
            let energy = outcome.specific_energy.map(|energy| energy / KILOWATT_HOUR);
            row.insert("kWh_per_m3".into(), number(energy));
            row.insert("pumps".into(), pumps(network, units, assessment));
            row.insert("needs".into(), needs_of(case.needs, units, assessment));
            row.insert(
                "binding_limit".into(),
                outcome
                    .limit
                    .map_or(Value::Null, |limit| json!(words.limit(&limit))),
            );
            row.insert(
                "cautions".into(),
                Value::Array(cautions_of(&words, assessment)),
            );
        }
    }
    Value::Object(row)
}

//! How a pump of a file stands: its speed and trim over its model's, its wear.

use super::context::Context;
use super::spec::{Placed, PumpSpec};
use crate::diagnostic::{Diagnostic, Place};
use crate::network::PumpSetting;
use crate::part::pump::{Covers, PumpModel};
use crate::units::SpeedValue;

/// Trim ratio below which the affinity form is not to be relied on.
///
/// # Source
/// Limits of 75 % to 80 % of the full diameter are quoted in the trade, e.g. US Department of Energy, Improving Pumping System
/// Performance: A Sourcebook for Industry, on trimming (75 %, from memory); the upper end here.
const DEEPEST_TRIM: f64 = 0.8;

/// The setting of a pump called `base`; none where something does not fit, which is reported.
pub(super) fn setting(
    cx: &mut Context,
    pump: &PumpSpec,
    base: &str,
    model: &PumpModel,
) -> Option<PumpSetting> {
    let speed = match &pump.speed {
        None => 1.0,
        Some(Placed {
            value: SpeedValue::Ratio(ratio),
            ..
        }) => *ratio,
        Some(Placed {
            value: SpeedValue::Rpm(rpm),
            place,
        }) => ratio(
            cx,
            rpm / 60.0,
            model.speed,
            ("speed", "1480 rpm"),
            *place,
            &model.name,
        )?,
    };
    let trim = match &pump.impeller {
        None => 1.0,
        Some(Placed { value, place }) => {
            let keys = ("impeller", "320 mm");
            let trim = ratio(cx, *value, model.impeller, keys, *place, &model.name)?;
            judge_trim(cx, trim, *place, base, &model.name);
            trim
        }
    };
    let leakage = match &pump.leakage {
        None => 0.0,
        Some(Placed { value, place }) => leakage(cx, *value, model, *place)?,
    };
    Some(PumpSetting {
        running: pump.running,
        speed,
        trim,
        wear: pump.wear,
        leakage,
        ..PumpSetting::NEW
    })
}

fn ratio(
    cx: &mut Context,
    value: f64,
    full: Option<f64>,
    (key, example): (&str, &str),
    place: Place,
    model: &str,
) -> Option<f64> {
    let Some(full) = full else {
        let message = format!("pump model `{model}` does not say the {key} of its curve");
        let help = format!("add for example `{key}: {example}` to the model");
        cx.push(Diagnostic::error("missing-key", place, message).help(help));
        return None;
    };
    Some(value / full)
}

fn judge_trim(cx: &mut Context, trim: f64, place: Place, pump: &str, model: &str) {
    if trim > 1.0 {
        let message =
            format!("the impeller of pump `{pump}` is larger than the full one of `{model}`");
        let help = "its figures are then beyond those of the model's curve; check the diameters";
        cx.push(Diagnostic::caution("large-impeller", place, message).help(help));
    } else if trim < DEEPEST_TRIM {
        let message = format!(
            "the impeller of pump `{pump}` is trimmed to {:.0} % of the full one of `{model}`",
            100.0 * trim
        );
        let help = "below about 80 % efficiency falls and the scaled curve is not to be relied on (common practice): use the curve of that diameter";
        cx.push(Diagnostic::caution("deep-trim", place, message).help(help));
    }
}

/// A leakage needs a best efficiency that it is a share of, and a head that falls with flow.
fn leakage(cx: &mut Context, share: f64, model: &PumpModel, place: Place) -> Option<f64> {
    if share == 0.0 {
        return Some(0.0);
    }
    let name = &model.name;
    let (code, message, help) = if model.best_efficiency_flow.is_none() {
        (
            "missing-key",
            format!(
                "`leakage` is a share of the best-efficiency flow, which `{name}` does not tell"
            ),
            "give the model the column `efficiency` or `power`",
        )
    } else if Covers::of(&model.head).is_some() {
        (
            "drooping-curve",
            format!("`leakage` cannot be reckoned with the drooping head curve of `{name}`"),
            "use `wear`, or give the curve without its rise",
        )
    } else {
        return Some(share);
    };
    cx.push(Diagnostic::error(code, place, message).help(help));
    None
}

//! How a pump model's curves carry over to other liquids, speeds and impellers: `viscous`, `stages`, `inlet`,
//! `efficiency_with_speed`, `trim_exponent`.

use super::context::{Bound, Context, Fields, found, scalar_text};
use super::spec::{ModelSpec, SiteSpec};
use super::yaml::Marked;
use crate::diagnostic::{Diagnostic, Place};
use crate::part::pump::PowerCurve;
use crate::part::pump::performance::Scaling;
use crate::part::pump::viscous::{
    HIGHEST_SPECIFIC_SPEED, HIGHEST_VISCOSITY, Inlet, VISCOUS_FROM, ViscousBasis,
};
use crate::units::Kind;

pub(super) const KEYS: [&str; 5] = [
    "viscous",
    "stages",
    "inlet",
    "efficiency_with_speed",
    "trim_exponent",
];

/// Most stages of a pump, and the range of the exponent of flow on trimming.
const MOST_STAGES: f64 = 100.0;
const TRIM_EXPONENTS: (f64, f64) = (1.0, 3.0);

/// The model's scaling, its other keys being read; `place` is where its name stands.
pub(super) fn scaling(
    cx: &mut Context,
    site: &SiteSpec,
    fields: &Fields,
    model: &ModelSpec,
    place: Place,
) -> Option<Scaling> {
    let what = format!("pump model `{}`", model.name);
    let stages = stages(cx, fields, &what);
    let inlet = match fields.get("inlet") {
        None => Some(Inlet::default()),
        Some(node) => word(
            cx,
            node,
            "inlet",
            &what,
            &[("end", Inlet::End), ("side", Inlet::Side)],
        ),
    };
    let trim_exponent = trim_exponent(cx, fields, &what);
    let best_efficiency = by_speed(cx, site, fields, model, &what);
    let viscous = viscous(cx, site, fields, model, (stages?, inlet?), place);
    Some(Scaling {
        viscous: viscous?,
        best_efficiency: best_efficiency?,
        trim_exponent: trim_exponent?,
    })
}

/// One of several words.
fn word<T: Copy>(
    cx: &mut Context,
    node: &Marked,
    key: &str,
    what: &str,
    words: &[(&str, T)],
) -> Option<T> {
    let written = scalar_text(node);
    let chosen = words.iter().find(|(word, _)| Some(*word) == written);
    if chosen.is_none() {
        let names: Vec<String> = words.iter().map(|(word, _)| format!("`{word}`")).collect();
        let wanted = names.join(" or ");
        let message = format!("`{key}` of {what} must be {wanted}, found {}", found(node));
        cx.error("unknown-name", node.place, message);
    }
    chosen.map(|(_, value)| *value)
}

fn stages(cx: &mut Context, fields: &Fields, what: &str) -> Option<f64> {
    let Some(node) = fields.get("stages") else {
        return Some(1.0);
    };
    let value = cx.number(node, format_args!("`stages` of {what}"), Bound::Any)?;
    if value.fract() == 0.0 && (1.0..=MOST_STAGES).contains(&value) {
        return Some(value);
    }
    let message = format!(
        "`stages` of {what} must be a whole number from 1 to {MOST_STAGES}, found {}",
        found(node)
    );
    cx.error("out-of-range", node.place, message);
    None
}

fn trim_exponent(cx: &mut Context, fields: &Fields, what: &str) -> Option<f64> {
    let Some(node) = fields.get("trim_exponent") else {
        return Some(Scaling::default().trim_exponent);
    };
    let value = cx.number(node, format_args!("`trim_exponent` of {what}"), Bound::Any)?;
    let (low, high) = TRIM_EXPONENTS;
    if (low..=high).contains(&value) {
        return Some(value);
    }
    let message = format!(
        "`trim_exponent` of {what} must be from {low} to {high}, found {}",
        found(node)
    );
    let help = "flow goes with this power of the diameter, head with its square: 1 as with speed, 2 or 3 where a cut costs more flow";
    cx.push(Diagnostic::error("out-of-range", node.place, message).help(help));
    None
}

/// The best efficiency, where efficiency changes with speed.
fn by_speed(
    cx: &mut Context,
    site: &SiteSpec,
    fields: &Fields,
    model: &ModelSpec,
    what: &str,
) -> Option<Option<f64>> {
    let Some(node) = fields.get("efficiency_with_speed") else {
        return Some(None);
    };
    let words = [("constant", false), ("scaled", true)];
    if !word(cx, node, "efficiency_with_speed", what, &words)? {
        return Some(None);
    }
    let best = best_efficiency(site, model);
    if best.is_none() {
        let message =
            format!("`efficiency_with_speed: scaled` of {what} needs its best efficiency");
        let help = "give the column `efficiency` or `power`";
        cx.push(Diagnostic::error("missing-key", node.place, message).help(help));
        return None;
    }
    Some(best)
}

fn best_efficiency(site: &SiteSpec, model: &ModelSpec) -> Option<f64> {
    let q = model.best_efficiency_flow?;
    let best = match &model.power {
        PowerCurve::Unknown => return None,
        PowerCurve::Efficiency(curve) => curve.at(q).value,
        // E = 1000 g q H / P, as data sheets state power
        PowerCurve::Shaft(curve) => {
            1000.0 * site.gravity * q * model.head.at(q).value / curve.at(q).value
        }
    };
    (best > 0.0 && best <= 1.0).then_some(best)
}

/// What the correction for a viscous liquid starts from, where it is to be made.
fn viscous(
    cx: &mut Context,
    site: &SiteSpec,
    fields: &Fields,
    model: &ModelSpec,
    (stages, inlet): (f64, Inlet),
    place: Place,
) -> Option<Option<ViscousBasis>> {
    let what = format!("pump model `{}`", model.name);
    let nu = site.fluid.kinematic_viscosity;
    let liquid = cx.units.format(Kind::Viscosity, nu);
    let given = match fields.get("viscous") {
        Some(node) => {
            let words = [("corrected", true), ("none", false)];
            Some((node, word(cx, node, "viscous", &what, &words)?))
        }
        None => None,
    };
    if !given.map_or(nu > VISCOUS_FROM, |(_, wanted)| wanted) {
        return Some(None);
    }
    let stage_head = |q: f64| model.head.at(q).value / stages;
    let best = model.best_efficiency_flow.filter(|q| stage_head(*q) > 0.0);
    let Some((flow, speed)) = best.zip(model.speed) else {
        let lacking = match model.speed {
            None => "the `speed` of its curve",
            Some(_) => "its best efficiency",
        };
        let help = "give `speed`, and the column `efficiency` or `power`; or `viscous: none` if the curve was measured with this liquid";
        return match given {
            Some((node, _)) => {
                let message = format!("`viscous: corrected` of {what} needs {lacking}");
                cx.push(Diagnostic::error("missing-key", node.place, message).help(help));
                None
            }
            None => {
                let message = format!(
                    "the curve of {what} is taken as it is though the liquid has {liquid}: the correction needs {lacking}"
                );
                cx.push(Diagnostic::caution("viscous-uncorrected", place, message).help(help));
                Some(None)
            }
        };
    };
    let basis = ViscousBasis {
        flow,
        stage_head: stage_head(flow),
        speed,
        npsh_required: model.npsh_required.as_ref().map(|npsh| npsh.at(flow).value),
        inlet,
    };
    judge(
        cx,
        &basis,
        nu,
        &what,
        given.map_or(place, |(node, _)| node.place),
        given.is_none(),
    );
    Some(Some(basis))
}

/// What should be known of a correction: that it is made unasked, and where the method ends.
fn judge(cx: &mut Context, basis: &ViscousBasis, nu: f64, what: &str, place: Place, unasked: bool) {
    let liquid = cx.units.format(Kind::Viscosity, nu);
    let found = basis.correction(nu, 1.0, 1.0, 1.0);
    if unasked && found.b > 1.0 {
        let message = format!(
            "the curve of {what} is taken as one for water and corrected for {liquid}: at best efficiency and full speed flow and \
             head x {:.3}, efficiency x {:.3} (B = {:.2})",
            found.flow, found.efficiency, found.b
        );
        let help = "ANSI/HI 9.6.7, ISO/TR 17766, as quoted in the trade; write `viscous: corrected` if that is right, `viscous: none` if the curve was measured with this liquid";
        cx.push(Diagnostic::caution("viscous-corrected", place, message).help(help));
    }
    if nu > HIGHEST_VISCOSITY {
        let highest = cx.units.format(Kind::Viscosity, HIGHEST_VISCOSITY);
        let message = format!(
            "{liquid} is past {highest}, where the correction of {what} for viscous liquids ends"
        );
        let help = "its figures are a guess: ask for a curve measured with this liquid";
        cx.push(Diagnostic::caution("viscous-viscosity", place, message).help(help));
    }
    let specific = basis.specific_speed();
    if specific > HIGHEST_SPECIFIC_SPEED {
        let message = format!(
            "{what} has a specific speed of {specific:.0} (rpm, m3/s, m): the correction for viscous liquids is known to \
             {HIGHEST_SPECIFIC_SPEED:.0}"
        );
        let help = "it holds for radial pumps, impellers open or closed, and Newtonian liquids; check `stages` and the speed";
        cx.push(Diagnostic::caution("viscous-specific-speed", place, message).help(help));
    }
}

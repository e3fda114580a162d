//! Pumps: their names, sizes against those of their model, elevations.

use super::{Lowering, numbered};
use crate::diagnostic::{Diagnostic, Place};
use crate::network::{NodeId, PumpSetting};
use crate::part::Part;
use crate::part::pump::Pump;
use crate::read::spec::{LineSpec, PartSpec, Placed, PumpSpec};
use crate::units::SpeedValue;

impl Lowering<'_> {
    #[expect(
        clippy::too_many_arguments,
        reason = "one call; a struct for it would say no more"
    )]
    pub(super) fn pump(
        &mut self,
        line: &LineSpec,
        member: Option<u32>,
        pump: &PumpSpec,
        place: Place,
        parts: &[PartSpec],
        at: usize,
        from: Option<NodeId>,
    ) -> Option<Part> {
        let base = pump.name.as_ref().map_or(&line.name, |name| &name.value);
        let name = numbered(base, member);
        let name_place = pump.name.as_ref().map_or(line.place, |name| name.place);
        if pump.name.is_some() && member.is_none_or(|member| member == 1) {
            self.names.take(self.cx, base, name_place, "pump");
        }
        let when_stopped = match &pump.when_stopped {
            Some(loss) => Some(self.loss(loss, parts, at)?),
            None => None,
        };
        let model = *self.models.get(&pump.model.value)?;
        let (model_speed, model_impeller) = self.net.model_size(model);
        let speed = match &pump.speed {
            None => 1.0,
            Some(Placed {
                value: SpeedValue::Ratio(ratio),
                ..
            }) => *ratio,
            Some(Placed {
                value: SpeedValue::Rpm(rpm),
                place,
            }) => self.ratio(
                rpm / 60.0,
                model_speed,
                "speed",
                "1480 rpm",
                *place,
                &pump.model.value,
            )?,
        };
        let trim = match &pump.impeller {
            None => 1.0,
            Some(Placed { value, place }) => self.ratio(
                *value,
                model_impeller,
                "impeller",
                "320 mm",
                *place,
                &pump.model.value,
            )?,
        };
        if let Some(Placed { place, .. }) = pump.impeller.as_ref().filter(|_| trim > 1.0) {
            let message = format!(
                "the impeller of pump `{base}` is larger than the full one of `{}`",
                pump.model.value
            );
            let help =
                "its figures are then beyond those of the model's curve; check the diameters";
            let caution = Diagnostic::caution("large-impeller", *place, message);
            self.cx.push(caution.help(help));
        }
        let from = from?;
        let elevation = pump.elevation.unwrap_or_else(|| self.net.elevation(from));
        if pump.elevation.is_none() && member.is_none_or(|member| member == 1) {
            let message = format!(
                "pump `{base}` has no elevation: that of `{}` is taken, {}",
                line.from.value,
                self.cx.units.format(crate::units::Kind::Length, elevation)
            );
            let help = "NPSH and suction pressure depend on it; add for example `elevation: 0.8 m`";
            self.cx
                .push(Diagnostic::caution("pump-elevation", place, message).help(help));
        }
        let setting = PumpSetting {
            running: pump.running,
            speed,
            trim,
            wear: pump.wear,
            ..PumpSetting::NEW
        };
        let pump = Pump {
            name,
            model,
            elevation,
            elevation_given: pump.elevation.is_some(),
            when_stopped,
        };
        Some(Part::Pump(self.net.pump(pump, setting)))
    }

    fn ratio(
        &mut self,
        value: f64,
        full: Option<f64>,
        key: &str,
        example: &str,
        place: Place,
        model: &str,
    ) -> Option<f64> {
        let Some(full) = full else {
            let message = format!("pump model `{model}` does not say the {key} of its curve");
            let help = format!("add for example `{key}: {example}` to the model");
            self.cx
                .push(Diagnostic::error("missing-key", place, message).help(help));
            return None;
        };
        Some(value / full)
    }
}

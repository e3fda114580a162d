//! Pumps: their names, sizes against those of their model, elevations.

use super::{Lowering, numbered};
use crate::diagnostic::{Diagnostic, Place};
use crate::network::NodeId;
use crate::part::Part;
use crate::part::pump::Pump;
use crate::read::condition;
use crate::read::spec::{LineSpec, PartSpec, PumpSpec};

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
        let setting = condition::setting(self.cx, pump, base, self.net.model_at(model)?);
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
        let pump = Pump {
            name,
            model,
            elevation,
            elevation_given: pump.elevation.is_some(),
            when_stopped,
        };
        Some(Part::Pump(self.net.pump(pump, setting?)))
    }
}

//! From the typed file to the network: names resolved, banks written out, bores found.

use std::collections::HashMap;

use super::context::Context;
use super::spec::{
    FrictionSpec, LineSpec, LossSpec, NeedSpec, NodeKindSpec, PartKindSpec, PartSpec, Placed,
    PumpSpec, Spec, TargetSpec,
};
use crate::diagnostic::{Diagnostic, Place, nearest};
use crate::network::{
    End, LineId, Need, Network, NetworkBuilder, NodeId, NodeKind, PumpSetting, Target, ValveSetting,
};
use crate::part::Part;
use crate::part::friction::{Friction, Pipe};
use crate::part::pump::{Pump, PumpModel};
use crate::part::quadratic::QuadraticLoss;
use crate::part::valve::Valve;
use crate::units::SpeedValue;

struct Lowering<'c> {
    cx: &'c mut Context,
    spec: Spec,
    net: NetworkBuilder,
    nodes: HashMap<String, NodeId>,
    /// Lines by name; a bank's name leads to all members.
    lines: HashMap<String, Vec<LineId>>,
    models: HashMap<String, usize>,
    /// Every name that a path can begin with, and where it was given.
    taken: HashMap<String, Place>,
    pump_names: HashMap<String, Place>,
}

/// The network and the needs; none if there are errors.
pub(super) fn lower(cx: &mut Context, spec: Spec) -> Option<(Network, Vec<Need>)> {
    let site = spec.site;
    let net = NetworkBuilder::new(site.fluid, site.gravity, site.barometer);
    let mut lowering = Lowering {
        cx,
        spec,
        net,
        nodes: HashMap::new(),
        lines: HashMap::new(),
        models: HashMap::new(),
        taken: HashMap::new(),
        pump_names: HashMap::new(),
    };
    lowering.nodes();
    lowering.models();
    let lines = std::mem::take(&mut lowering.spec.lines);
    for line in &lines {
        lowering.line(line);
    }
    lowering.unused_nodes(&lines);
    let needs = std::mem::take(&mut lowering.spec.needs);
    let needs: Vec<Need> = needs
        .iter()
        .filter_map(|need| lowering.need(need))
        .collect();
    if lowering.cx.diagnostics.has_errors() {
        return None;
    }
    match lowering.net.build() {
        Ok(network) => Some((network, needs)),
        Err(why) => {
            cx.push(Diagnostic::whole("network", why.to_string()));
            None
        }
    }
}

impl Lowering<'_> {
    /// Takes a name; reports one that is taken.
    fn take(&mut self, name: &str, place: Place, what: &str) {
        if let Some(first) = self.taken.insert(name.to_owned(), place) {
            let message = format!("the name `{name}` of this {what} is used already");
            let help = format!(
                "it stands in line {} too; nodes, lines and pump models share their names",
                first.line
            );
            self.cx
                .push(Diagnostic::error("name-twice", place, message).help(help));
        }
    }

    fn nodes(&mut self) {
        let mut fixed = false;
        for node in std::mem::take(&mut self.spec.nodes) {
            self.take(&node.name, node.place, "node");
            let (kind, draw, level, pressure) = match node.kind {
                NodeKindSpec::Point { elevation, draw } => {
                    (NodeKind::Point { elevation }, draw, 0.0, 0.0)
                }
                NodeKindSpec::Reservoir { surface, pressure } => {
                    (NodeKind::Reservoir, 0.0, surface, pressure)
                }
                NodeKindSpec::Outlet { elevation } => {
                    (NodeKind::Outlet { elevation }, 0.0, 0.0, 0.0)
                }
                NodeKindSpec::Tank {
                    floor,
                    level,
                    pressure,
                } => (NodeKind::Tank { floor }, 0.0, level, pressure),
            };
            fixed |= !matches!(kind, NodeKind::Point { .. });
            let id = self.net.node(node.name.clone(), kind, draw, level);
            self.net.settings_mut().set_gas_pressure(id, pressure);
            self.nodes.insert(node.name, id);
        }
        if !fixed && !self.nodes.is_empty() && !self.cx.diagnostics.has_errors() {
            let message = "no node holds a head: every node is a point";
            let help = "at least one node must be a `reservoir`, a `tank` or an `outlet`";
            self.cx
                .push(Diagnostic::whole("no-fixed-head", message).help(help));
        }
    }

    fn models(&mut self) {
        for model in std::mem::take(&mut self.spec.models) {
            self.take(&model.name, model.place, "pump model");
            let position = self.net.model(PumpModel {
                name: model.name.clone(),
                speed: model.speed,
                impeller: model.impeller,
                head: model.head,
                power: model.power,
                npsh_required: model.npsh_required,
                best_efficiency_flow: model.best_efficiency_flow,
                motor: model.motor,
            });
            self.models.insert(model.name, position);
        }
    }

    fn node(&mut self, name: &Placed<String>) -> Option<NodeId> {
        if let Some(id) = self.nodes.get(&name.value) {
            return Some(*id);
        }
        let names = self.nodes.keys().map(String::as_str);
        unknown(self.cx, "node", name, names);
        None
    }

    fn line(&mut self, line: &LineSpec) {
        self.take(&line.name, line.place, "line");
        let (from, to) = (self.node(&line.from), self.node(&line.to));
        if from.is_some() && from == to {
            let message = format!(
                "line `{}` starts and ends at `{}`",
                line.name, line.to.value
            );
            self.cx.error("self-loop", line.to.place, message);
            return;
        }
        self.pumps_have_names(line);
        let mut ids = Vec::new();
        for member in 1..=line.count.unwrap_or(1) {
            let suffix = line.count.map(|_| member);
            let changed = line.members.iter().find(|(number, _)| *number == member);
            let parts = changed.map_or(&line.parts, |(_, parts)| parts);
            let parts = self.parts(line, suffix, parts, from);
            let (Some(from), Some(to), Some(parts)) = (from, to, parts) else {
                return;
            };
            let name = numbered(&line.name, suffix);
            let id = self.net.line(name.clone(), from, to, parts);
            for (end, port) in [End::From, End::To].into_iter().zip(line.ports) {
                if let Some(height) = port {
                    self.net.port(id, end, height);
                }
            }
            ids.push(id);
            if suffix.is_some() {
                self.lines.insert(name, vec![id]);
            }
        }
        if line.count.is_some() {
            self.net.bank(line.name.clone(), ids.clone());
        }
        self.lines.insert(line.name.clone(), ids);
    }

    /// Several pumps in one line each need a name.
    fn pumps_have_names(&mut self, line: &LineSpec) {
        let pumps: Vec<(&PumpSpec, Place)> = line
            .parts
            .iter()
            .filter_map(|part| match &part.kind {
                PartKindSpec::Pump(pump) => Some((pump.as_ref(), part.place)),
                _ => None,
            })
            .collect();
        if pumps.len() < 2 {
            return;
        }
        for (_, place) in pumps.iter().filter(|(pump, _)| pump.name.is_none()) {
            let message = format!(
                "line `{}` holds several pumps; this one has no name",
                line.name
            );
            self.cx.push(
                Diagnostic::error("pump-name", *place, message)
                    .help("add for example `name: booster`"),
            );
        }
    }

    fn parts(
        &mut self,
        line: &LineSpec,
        member: Option<u32>,
        specs: &[PartSpec],
        from: Option<NodeId>,
    ) -> Option<Vec<Part>> {
        let site = self.spec.site;
        let mut parts = Vec::new();
        let mut whole = true;
        for (i, spec) in specs.iter().enumerate() {
            match &spec.kind {
                PartKindSpec::Pipe {
                    length,
                    bore,
                    friction,
                    k,
                } => {
                    let (length, bore) = (*length, *bore);
                    let friction = match *friction {
                        FrictionSpec::Roughness(e) => Friction::roughness(
                            length,
                            bore,
                            e,
                            site.fluid.kinematic_viscosity,
                            site.gravity,
                        ),
                        FrictionSpec::HazenWilliams(c) => Friction::hazen_williams(length, bore, c),
                        FrictionSpec::FixedFactor(f) => {
                            Friction::fixed_factor(length, bore, f, site.gravity)
                        }
                    };
                    whole &= self.in_reach(spec.place, friction.is_finite());
                    parts.push(Part::Pipe(Pipe {
                        length,
                        bore,
                        friction,
                    }));
                    if *k > 0.0 {
                        parts.push(Part::Loss(QuadraticLoss::minor(*k, bore, site.gravity)));
                    }
                }
                PartKindSpec::Loss(loss) => match self.loss(loss, specs, i) {
                    Some(loss) => parts.push(Part::Loss(loss)),
                    None => whole = false,
                },
                PartKindSpec::Equipment(loss) => parts.push(Part::Loss(*loss)),
                PartKindSpec::Valve {
                    loss,
                    characteristic,
                    open,
                    opening,
                } => {
                    let Some(fully_open) = self.loss(loss, specs, i) else {
                        whole = false;
                        continue;
                    };
                    let valve = Valve {
                        fully_open,
                        characteristic: *characteristic,
                    };
                    let setting = ValveSetting {
                        open: *open,
                        opening: *opening,
                    };
                    parts.push(Part::Valve(self.net.valve(valve, setting)));
                }
                PartKindSpec::CheckValve {
                    loss,
                    characteristic,
                    opening,
                } => {
                    let Some(fully_open) = self.loss(loss, specs, i) else {
                        whole = false;
                        continue;
                    };
                    match (Valve {
                        fully_open,
                        characteristic: *characteristic,
                    })
                    .loss_at(*opening)
                    {
                        Some(loss) => parts.push(Part::CheckValve(loss)),
                        None => {
                            self.cx.error(
                                "out-of-range",
                                spec.place,
                                "a check valve cannot have an opening of 0 %",
                            );
                            whole = false;
                        }
                    }
                }
                PartKindSpec::Pump(pump) => {
                    match self.pump(line, member, pump, spec.place, specs, i, from) {
                        Some(part) => parts.push(part),
                        None => whole = false,
                    }
                }
            }
        }
        whole.then_some(parts)
    }

    fn in_reach(&mut self, place: Place, finite: bool) -> bool {
        if !finite {
            self.cx.error(
                "out-of-range",
                place,
                "the loss of this part is beyond any range; check its sizes and units",
            );
        }
        finite
    }

    /// A loss in its bore: its own, that of the pipe before it in the line, or else of the pipe after it.
    fn loss(&mut self, spec: &LossSpec, parts: &[PartSpec], at: usize) -> Option<QuadraticLoss> {
        let (k, bore) = match *spec {
            LossSpec::Known(loss) => return Some(loss),
            LossSpec::K { k, bore } => (k, bore),
        };
        let pipe = |part: &PartSpec| match part.kind {
            PartKindSpec::Pipe { bore, .. } => Some(bore),
            _ => None,
        };
        let before = parts[..at].iter().rev().find_map(pipe);
        let bore = bore
            .or(before)
            .or_else(|| parts[at..].iter().find_map(pipe));
        if let Some(bore) = bore {
            let loss = QuadraticLoss::minor_checked(k, bore, self.spec.site.gravity);
            self.in_reach(parts[at].place, loss.is_some());
            return loss;
        }
        if k == 0.0 {
            return Some(QuadraticLoss::NONE);
        }
        let message = "`k` needs a bore, and no pipe of this line gives one";
        self.cx.push(
            Diagnostic::error("missing-key", parts[at].place, message)
                .help("add for example `bore: 200 mm`"),
        );
        None
    }

    #[expect(
        clippy::too_many_arguments,
        reason = "one call; a struct for it would say no more"
    )]
    fn pump(
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
            self.take(base, name_place, "pump");
        }
        if let Some(first) = self.pump_names.insert(name.clone(), name_place) {
            let message = format!(
                "two pumps are called `{name}`; the other stands in line {}",
                first.line
            );
            self.cx.error("name-twice", name_place, message);
            return None;
        }
        let when_stopped = match &pump.when_stopped {
            Some(loss) => Some(self.loss(loss, parts, at)?),
            None => None,
        };
        let Some(&model) = self.models.get(&pump.model.value) else {
            unknown(
                self.cx,
                "pump model",
                &pump.model,
                self.models.keys().map(String::as_str),
            );
            return None;
        };
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

    /// Nodes that no line touches.
    fn unused_nodes(&mut self, lines: &[LineSpec]) {
        let used: std::collections::HashSet<&str> = lines
            .iter()
            .flat_map(|line| [line.from.value.as_str(), line.to.value.as_str()])
            .collect();
        let mut unused: Vec<(&String, &NodeId)> = self
            .nodes
            .iter()
            .filter(|(name, _)| !used.contains(name.as_str()))
            .collect();
        unused.sort_by_key(|(_, id)| id.index());
        for (name, _) in unused {
            let place = self.taken.get(name).copied().unwrap_or_default();
            self.cx.push(Diagnostic::caution(
                "unused-node",
                place,
                format!("no line touches node `{name}`"),
            ));
        }
    }

    fn need(&mut self, need: &NeedSpec) -> Option<Need> {
        let target = match &need.target {
            TargetSpec::FlowInto(name) => Target::FlowInto(self.node(name)?),
            TargetSpec::PressureAt(name) => Target::PressureAt(self.node(name)?),
            TargetSpec::FlowIn(name) => match self.lines.get(&name.value) {
                Some(lines) => Target::FlowIn(lines.clone()),
                None => {
                    unknown(self.cx, "line", name, self.lines.keys().map(String::as_str));
                    return None;
                }
            },
        };
        Some(Need {
            name: need.name.clone(),
            target,
            at_least: need.at_least,
            at_most: need.at_most,
        })
    }
}

fn numbered(name: &str, member: Option<u32>) -> String {
    member.map_or_else(|| name.to_owned(), |member| format!("{name}.{member}"))
}

fn unknown<'a>(
    cx: &mut Context,
    what: &str,
    name: &Placed<String>,
    names: impl Iterator<Item = &'a str>,
) {
    let message = format!("no {what} is called `{}`", name.value);
    let mut diagnostic = Diagnostic::error("unknown-name", name.place, message);
    if !cx.diagnostics.is_full() {
        let mut names: Vec<&str> = names.collect();
        names.sort_unstable();
        diagnostic.help = match nearest(&name.value, names.iter().copied()) {
            Some(near) => Some(format!("did you mean `{near}`?")),
            None if names.is_empty() => None,
            None => Some(format!("there are {}", listed(&names))),
        };
    }
    cx.push(diagnostic);
}

fn listed(names: &[&str]) -> String {
    const SHOWN: usize = 8;
    let shown: Vec<String> = names
        .iter()
        .take(SHOWN)
        .map(|name| format!("`{name}`"))
        .collect();
    let more = names.len().saturating_sub(SHOWN);
    if more > 0 {
        format!("{} and {more} more", shown.join(", "))
    } else {
        shown.join(", ")
    }
}

//! From the typed file to the network: names resolved, banks written out, bores found.

mod pumps;
mod regulators;

use std::collections::HashMap;

use super::context::{Context, Referent};
use super::limits::line_facts;
use super::lines::not_too_many;
use super::references::TakenNames;
use super::spec::{
    FrictionSpec, LineSpec, LossSpec, Names, NeedSpec, NodeKindSpec, PartKindSpec, PartSpec,
    PumpSpec, Spec, TargetSpec,
};
use crate::diagnostic::{Diagnostic, Place};
use crate::network::{
    End, LineId, Need, Network, NetworkBuilder, NodeId, NodeKind, Target, ValveSetting,
};
use crate::part::Part;
use crate::part::friction::{Friction, Pipe};
use crate::part::pump::PumpModel;
use crate::part::quadratic::QuadraticLoss;
use crate::part::valve::Valve;

struct Lowering<'c> {
    cx: &'c mut Context,
    spec: Spec,
    net: NetworkBuilder,
    nodes: HashMap<String, NodeId>,
    /// Lines by name; a bank's name leads to all members.
    lines: HashMap<String, Vec<LineId>>,
    models: HashMap<String, usize>,
    names: TakenNames,
    regulators: Vec<regulators::Placed>,
}

/// The network and the needs; none if there are errors.
pub(super) fn lower(cx: &mut Context, spec: Spec) -> Option<(Network, Vec<Need>)> {
    let site = spec.site;
    let names = TakenNames::of(cx, &spec.names);
    let mut net = NetworkBuilder::new(site.fluid, site.gravity, site.barometer);
    net.limits(spec.limits.clone());
    let mut lowering = Lowering {
        cx,
        spec,
        net,
        nodes: HashMap::new(),
        lines: HashMap::new(),
        models: HashMap::new(),
        names,
        regulators: Vec::new(),
    };
    lowering.nodes();
    lowering.models();
    lowering.names.check(
        lowering.cx,
        &[Referent::Node, Referent::PumpModel],
        &lowering.lines,
    );
    let lines = std::mem::take(&mut lowering.spec.lines);
    if not_too_many(lowering.cx, &lines) {
        lines.iter().for_each(|line| lowering.line(line));
    }
    lowering
        .names
        .check(lowering.cx, &[Referent::Line], &lowering.lines);
    lowering.names.find_unused_nodes(lowering.cx, &lines);
    lowering.check_regulators(&lines);
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
    fn nodes(&mut self) {
        let mut fixed = false;
        for node in std::mem::take(&mut self.spec.nodes) {
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
        let Names {
            nodes, nodes_place, ..
        } = &self.spec.names;
        let all_read = nodes
            .as_ref()
            .is_some_and(|names| names.len() == self.nodes.len());
        if !fixed && all_read {
            let message = "no node holds a head: every node is a point";
            let help = "at least one node must be a `reservoir`, a `tank` or an `outlet`";
            let problem = Diagnostic::error("no-fixed-head", *nodes_place, message);
            self.cx.push(problem.help(help));
        }
    }

    fn models(&mut self) {
        for model in std::mem::take(&mut self.spec.models) {
            let position = self.net.model(PumpModel {
                name: model.name.clone(),
                speed: model.speed,
                impeller: model.impeller,
                head: model.head,
                power: model.power,
                npsh_required: model.npsh_required,
                best_efficiency_flow: model.best_efficiency_flow,
                motor: model.motor,
                drive: model.drive,
                maker: model.maker,
                scaling: model.scaling,
            });
            self.models.insert(model.name, position);
        }
    }

    fn line(&mut self, line: &LineSpec) {
        let (from, to) = (
            self.nodes.get(&line.from.value).copied(),
            self.nodes.get(&line.to.value).copied(),
        );
        let is_loop = line.from.value == line.to.value;
        if is_loop && from.is_some() {
            let message = format!(
                "line `{}` starts and ends at `{}`",
                line.name, line.to.value
            );
            let help = "a line joins two nodes; name another one here";
            let problem = Diagnostic::error("self-loop", line.to.place, message);
            self.cx.push(problem.help(help));
        }
        let surface = from.is_none_or(|id| self.net.has_free_surface(id));
        let facts = line_facts(self.cx, line, self.spec.site.fluid.density, surface);
        let named = self.pumps_have_names(line);
        let to = to.filter(|_| named && !is_loop);
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
            self.net.facts(id, facts);
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

    /// Several pumps in one line each need a name; whether they have them.
    fn pumps_have_names(&mut self, line: &LineSpec) -> bool {
        let pumps: Vec<(&PumpSpec, Place)> = line
            .parts
            .iter()
            .filter_map(|part| match &part.kind {
                PartKindSpec::Pump(pump) => Some((pump.as_ref(), part.place)),
                _ => None,
            })
            .collect();
        let without = pumps.iter().filter(|(pump, _)| pump.name.is_none());
        if pumps.len() < 2 || without.clone().count() == 0 {
            return true;
        }
        for (_, place) in without {
            let message = format!(
                "line `{}` holds several pumps; this one has no name",
                line.name
            );
            self.cx.push(
                Diagnostic::error("pump-name", *place, message)
                    .help("add for example `name: booster`"),
            );
        }
        false
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
                    facts: _,
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
                PartKindSpec::Regulator(regulator) => {
                    match self.regulator(line, member, regulator, specs, i) {
                        Some(part) => parts.push(part),
                        None => whole = false,
                    }
                }
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
                            let message = "a check valve cannot have an opening of 0 %";
                            let help = "a valve that is shut is a `valve` with `open: false`";
                            let problem = Diagnostic::error("out-of-range", spec.place, message);
                            self.cx.push(problem.help(help));
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
            let message = "the loss of this part is beyond any range";
            let problem = Diagnostic::error("out-of-range", place, message);
            self.cx.push(problem.help("check its sizes and units"));
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

    fn need(&self, need: &NeedSpec) -> Option<Need> {
        let target = match &need.target {
            TargetSpec::FlowInto(name) => Target::FlowInto(*self.nodes.get(&name.value)?),
            TargetSpec::PressureAt(name) => Target::PressureAt(*self.nodes.get(&name.value)?),
            TargetSpec::FlowIn(name) => Target::FlowIn(self.lines.get(&name.value)?.clone()),
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

//! A network in words: what stands between what, banks, static lift, what can and cannot be reached.

use crate::network::{
    Direction, LineId, Network, NodeId, NodeKind, Passage, Reach, Settings, Standing, Target,
};
use crate::part::character::US_SPECIFIC_SPEED;
use crate::part::regulator::Regulates;
use crate::part::{Part, RegulatorId};
use crate::read::System;
use crate::units::{Kind, UnitSet};

/// Nodes named in a list before the rest is counted.
const SHOWN: usize = 12;

/// The description; one fact a line.
pub fn describe(system: &System) -> String {
    let mut out = Vec::new();
    if let Some(title) = &system.title {
        out.push(title.clone());
        out.push(String::new());
    }
    for (heading, facts) in sections(system, SHOWN) {
        if !heading.is_empty() {
            out.push(String::new());
            out.push(heading.to_owned());
        }
        let indent = if heading.is_empty() { "" } else { "  " };
        out.extend(facts.iter().map(|fact| format!("{indent}{fact}")));
    }
    out.join("\n") + "\n"
}

/// The description by heading, the first without one; at most so many nodes and lines are named.
pub fn sections(system: &System, shown: usize) -> Vec<(&'static str, Vec<String>)> {
    let describer = Describer {
        shown,
        ..Describer::new(system)
    };
    let needs = system.needs.iter().map(|need| describer.need(need));
    let sections = [
        ("", vec![describer.sizes()]),
        ("Nodes", describer.nodes()),
        ("Lines", describer.lines()),
        ("Static lift", describer.lifts()),
        ("Pump models", describer.models()),
        ("Reach", describer.reach()),
        ("Needs", needs.collect()),
    ];
    let said = |section: &(&str, Vec<String>)| !section.1.is_empty();
    sections.into_iter().filter(said).collect()
}

/// What the figures rest on: liquid, place, method.
pub fn basis(system: &System) -> Vec<String> {
    let (network, units) = (&system.network, &system.units);
    let fluid = network.fluid();
    let vapour = fluid.vapour_pressure.map_or(
        "vapour pressure not given, so NPSH available is not known".to_owned(),
        |vapour| {
            format!(
                "vapour pressure {} absolute",
                units.format(Kind::Pressure, vapour)
            )
        },
    );
    vec![
        format!(
            "Liquid: density {}, kinematic viscosity {}, {vapour}.",
            units.format(Kind::Density, fluid.density),
            units.format(Kind::Viscosity, fluid.kinematic_viscosity)
        ),
        format!(
            "Place: air pressure {} absolute, gravity {} m/s2.",
            units.format(Kind::Pressure, network.barometer()),
            network.gravity()
        ),
        "Pipes: Darcy–Weisbach with Colebrook–White (J. Inst. Civil Engineers 11, 1939), 64/Re up to Re 2000, a smooth rise between 2000 and \
         4000; Hazen–Williams where a C factor is given. Fittings and valves: K v2/2g."
            .to_owned(),
        "Pumps: monotone piecewise cubic through the points of the data sheet (Fritsch and Carlson, SIAM J. Numer. Anal. 17, 1980); head with \
         the square of the speed ratio, flow with the ratio, power with its cube. Wear takes head at unchanged shaft power."
            .to_owned(),
        "Balance: flows at every point and heads along every open line together by Newton's method; check valves open or held shut by \
         complementarity."
            .to_owned(),
        "Tanks and reservoirs stand at their levels in steady states; levels move only over time.".to_owned(),
    ]
}

struct Describer<'a> {
    network: &'a Network,
    units: &'a UnitSet,
    settings: &'a Settings,
    shown: usize,
}

impl<'a> Describer<'a> {
    fn new(system: &'a System) -> Self {
        Self {
            network: &system.network,
            units: &system.units,
            settings: system.network.settings(),
            shown: SHOWN,
        }
    }

    fn length(&self, value: f64) -> String {
        self.units.format(Kind::Length, value)
    }

    fn name(&self, node: NodeId) -> &'a str {
        &self.network.node(node).name
    }

    /// What the curves of each model say of its character.
    fn models(&self) -> Vec<String> {
        let flow = |q: f64| self.units.format(Kind::Flow, q);
        let models = self.network.models().iter();
        models
            .map(|model| {
                let mut facts = vec![format!(
                    "shut-off at {}, curve ends at {}",
                    self.length(model.shutoff_head()),
                    flow(model.end_of_curve())
                )];
                if let Some(best) = model.best_efficiency_flow {
                    let head = self.length(model.head.at(best).value);
                    facts.push(format!("best efficiency at {} and {head}", flow(best)));
                }
                if let Some(rise) = model.rise_to_shutoff() {
                    facts.push(format!("head rises {:.0} % to shut-off", 100.0 * rise));
                }
                if let Some(speed) = model.specific_speed() {
                    facts.push(format!(
                        "specific speed {speed:.0} (rpm, m3/s, m) or {:.0} (US)",
                        US_SPECIFIC_SPEED * speed
                    ));
                }
                if let Some(below) = model.hunts_below() {
                    facts.push(format!(
                        "droops: side by side such pumps hunt below {}",
                        flow(below)
                    ));
                }
                format!("{}: {}", model.name, facts.join("; "))
            })
            .collect()
    }

    fn sizes(&self) -> String {
        let count = |n: usize, one: &str| format!("{n} {one}{}", if n == 1 { "" } else { "s" });
        let fluid = self.network.fluid();
        format!(
            "{}, {}, {}; liquid of {} and {}",
            count(self.network.nodes().len(), "node"),
            count(self.network.lines().len(), "line"),
            count(self.network.pumps().len(), "pump"),
            self.units.format(Kind::Density, fluid.density),
            self.units
                .format(Kind::Viscosity, fluid.kinematic_viscosity),
        )
    }

    fn nodes(&self) -> Vec<String> {
        let ids: Vec<NodeId> = self.network.node_ids().collect();
        let mut out: Vec<String> = ids
            .iter()
            .take(self.shown)
            .map(|id| self.node(*id))
            .collect();
        if ids.len() > self.shown {
            out.push(format!("and {} more", ids.len() - self.shown));
        }
        out
    }

    fn node(&self, id: NodeId) -> String {
        let node = self.network.node(id);
        let level = self.settings.level(id);
        let gas = self.settings.gas_pressure(id);
        let under = if gas == 0.0 {
            String::new()
        } else {
            format!(" under {}", self.units.format(Kind::Pressure, gas))
        };
        let what = match node.kind {
            NodeKind::Point { elevation } => {
                let draw = self.settings.draw(id);
                let flow = |q: f64| self.units.format(Kind::Flow, q);
                let draws = match draw {
                    0.0 => String::new(),
                    q if q > 0.0 => format!(", {} leave the system there", flow(q)),
                    q => format!(", {} enter the system there", flow(-q)),
                };
                format!("point at {}{draws}", self.length(elevation))
            }
            NodeKind::Reservoir => format!("reservoir, surface at {}{under}", self.length(level)),
            NodeKind::Tank { floor } => format!(
                "tank, floor at {}, level {} above it{under}: fixed in `solve` and `duty`",
                self.length(floor),
                self.length(level)
            ),
            NodeKind::Outlet { elevation } => {
                format!(
                    "outlet at {}: free discharge, nothing comes back in",
                    self.length(elevation)
                )
            }
        };
        format!("{}: {what}", node.name)
    }

    fn lines(&self) -> Vec<String> {
        let mut out = Vec::new();
        let mut told = vec![false; self.network.lines().len()];
        for id in self.network.line_ids() {
            if std::mem::replace(&mut told[id.index()], true) {
                continue;
            }
            if out.len() == self.shown * 2 {
                out.push("and more".to_owned());
                break;
            }
            let bank = self
                .network
                .banks()
                .iter()
                .find(|bank| bank.lines.contains(&id));
            let (who, alike) = match bank {
                Some(bank) => {
                    let equal = bank
                        .lines
                        .iter()
                        .all(|line| self.network.equal_parts(id, *line, self.settings));
                    if equal {
                        bank.lines.iter().for_each(|line| told[line.index()] = true);
                        (
                            bank.name.clone(),
                            format!(", a bank of {} equal lines,", bank.lines.len()),
                        )
                    } else {
                        (self.network.line(id).name.clone(), String::new())
                    }
                }
                None => (self.network.line(id).name.clone(), String::new()),
            };
            out.push(format!("{who}{alike} {}", self.line(id)));
        }
        out
    }

    fn line(&self, id: LineId) -> String {
        let line = self.network.line(id);
        let parts: Vec<String> = line
            .parts
            .iter()
            .filter_map(|part| self.part(part))
            .collect();
        let way = match self.network.direction(id, self.settings) {
            Direction::Both => "",
            Direction::Forward => ", one way",
            Direction::Backward => ", one way towards its first node",
            Direction::Neither => ": nothing can pass, a check valve and an outlet face each other",
        };
        format!(
            "from {} to {}: {}{way}",
            self.name(line.from),
            self.name(line.to),
            parts.join(", ")
        )
    }

    fn part(&self, part: &Part) -> Option<String> {
        Some(match part {
            Part::Pipe(pipe) => format!(
                "{} of pipe, {} bore",
                self.length(pipe.length),
                self.units.format(Kind::Bore, pipe.bore)
            ),
            Part::Loss(_) => return None,
            Part::CheckValve(_) => "check valve".to_owned(),
            Part::Regulator(id) => self.regulator(*id),
            Part::Valve(id) => {
                let setting = self.settings.valve(*id);
                match (setting.open, setting.opening) {
                    (false, _) => "shut valve".to_owned(),
                    (true, 1.0) => "valve".to_owned(),
                    (true, opening) => format!("valve at {:.0} %", 100.0 * opening),
                }
            }
            Part::Pump(id) => {
                let setting = self.settings.pump(*id);
                let mut text = format!("pump {}", self.network.model(*id).name);
                if setting.speed != 1.0 {
                    text.push_str(&format!(" at {:.1} % speed", 100.0 * setting.speed));
                }
                if setting.trim != 1.0 {
                    text.push_str(&format!(" trimmed to {:.1} %", 100.0 * setting.trim));
                }
                if setting.wear > 0.0 {
                    text.push_str(&format!(" worn {:.1} %", 100.0 * setting.wear));
                }
                if setting.leakage > 0.0 {
                    text.push_str(&format!(" leaking {:.1} %", 100.0 * setting.leakage));
                }
                if !setting.running {
                    text.push_str(" (stopped)");
                }
                text
            }
        })
    }

    fn regulator(&self, id: RegulatorId) -> String {
        let setting = self.settings.regulator(id);
        let pressure = || self.units.format(Kind::Pressure, setting.set);
        let flow = || self.units.format(Kind::Flow, setting.set);
        let text = match self.network.regulator(id).regulates {
            Regulates::Downstream => format!("holds {} downstream", pressure()),
            Regulates::Upstream => format!("holds {} upstream", pressure()),
            Regulates::Flow => format!("limits its flow to {}", flow()),
            Regulates::MinimumFlow { pump } => {
                format!("keeps pump {} at {}", self.network.pump(pump).name, flow())
            }
        };
        match setting.open {
            true => text,
            false => format!("{text} (shut)"),
        }
    }

    /// Heads to be overcome between fixed heads on the two sides of pumps.
    fn lifts(&self) -> Vec<String> {
        let fixed: Vec<(NodeId, f64)> = self
            .network
            .node_ids()
            .filter_map(|id| Some((id, self.network.fixed_head(id, self.settings)?)))
            .collect();
        let supplies = |id: NodeId| !matches!(self.network.node(id).kind, NodeKind::Outlet { .. });
        let mut out = Vec::new();
        let lowest = fixed
            .iter()
            .filter(|(id, _)| supplies(*id))
            .min_by(|a, b| a.1.total_cmp(&b.1));
        if let (Some(low), false) = (lowest, self.network.pumps().is_empty()) {
            for high in fixed
                .iter()
                .filter(|(_, head)| *head > low.1)
                .take(self.shown)
            {
                out.push(format!(
                    "from {} to {}: {}",
                    self.name(low.0),
                    self.name(high.0),
                    self.length(high.1 - low.1)
                ));
            }
        }
        out
    }

    fn reach(&self) -> Vec<String> {
        let mut reach = Reach::new(self.network);
        if let Err(at) = reach.update(self.network, self.settings) {
            let node = self.name(at.node);
            let what = if at.draw > 0.0 {
                format!(
                    "no water can reach {node}, which draws {}",
                    self.units.format(Kind::Flow, at.draw)
                )
            } else {
                format!("the inflow at {node} has nowhere to go")
            };
            return vec![format!("{what}")];
        }
        let mut out = Vec::new();
        let named = |standing: Standing| {
            let names: Vec<&str> = self
                .network
                .node_ids()
                .filter(|id| self.network.is_point(*id))
                .filter(|id| {
                    reach.standing(*id) == standing
                        || (standing == Standing::Unserved
                            && reach.floats(*id)
                            && reach.standing(*id) == Standing::Joined)
                })
                .map(|id| self.name(id))
                .collect();
            names
        };
        let unserved = named(Standing::Unserved);
        if !unserved.is_empty() {
            out.push(format!(
                "cut off from every fixed head, so without a head: {}",
                listed(&unserved)
            ));
        }
        let blind = named(Standing::Blind);
        if !blind.is_empty() {
            out.push(format!(
                "water comes in but cannot go on: {}",
                listed(&blind)
            ));
        }
        for (passage, what) in [
            (Passage::Closed, "shut by a valve"),
            (Passage::Stopped, "shut by a stopped pump"),
        ] {
            let names: Vec<&str> = self
                .network
                .line_ids()
                .filter(|id| reach.passage(*id) == passage)
                .map(|id| self.network.line(id).name.as_str())
                .collect();
            if !names.is_empty() {
                out.push(format!("{what}: {}", listed(&names)));
            }
        }
        if out.is_empty() {
            out.push(
                "every point is joined to a fixed head by ways that water can take".to_owned(),
            );
        }
        out
    }

    fn need(&self, need: &crate::network::Need) -> String {
        let (what, kind) = match &need.target {
            Target::FlowInto(node) => (format!("flow into {}", self.name(*node)), Kind::Flow),
            Target::FlowIn(lines) => {
                let names: Vec<&str> = lines
                    .iter()
                    .map(|line| self.network.line(*line).name.as_str())
                    .collect();
                (format!("flow in {}", names.join(" + ")), Kind::Flow)
            }
            Target::PressureAt(node) => {
                (format!("pressure at {}", self.name(*node)), Kind::Pressure)
            }
        };
        let least = need
            .at_least
            .map(|limit| format!("at least {}", self.units.format(kind, limit)));
        let most = need
            .at_most
            .map(|limit| format!("at most {}", self.units.format(kind, limit)));
        let limits: Vec<String> = [least, most].into_iter().flatten().collect();
        format!("{}: {what}, {}", need.name, limits.join(", "))
    }
}

fn listed(names: &[&str]) -> String {
    let more = names.len().saturating_sub(SHOWN);
    let shown = names[..names.len().min(SHOWN)].join(", ");
    if more > 0 {
        format!("{shown} and {more} more")
    } else {
        shown
    }
}

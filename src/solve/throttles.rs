//! The regulating parts of a network as the solver sees them: per line one further loss, and the room of its parts.
//!
//! All parts of a line act on one flow, so a line is one *unit*: it adds one loss `s`, and the part with the least room rules.
//! Holders of one node that are set alike share one loss, as nothing else says how they would share the flow.

use super::system::{Role, State, System};
use super::tolerance::{HELD_FLOW, HELD_HEAD};
use crate::network::{LineId, Network, Settings, Standing};
use crate::part::regulator::Regulates;
use crate::part::{HeadLaw, RegulatorId};

/// One regulating part: what it feels, and against what.
#[derive(Clone, Copy, Debug)]
pub(super) struct Feeler {
    pub id: RegulatorId,
    pub regulates: Regulates,
    /// Set value: total head (m) or flow (m3/s).
    pub set: f64,
    /// The node or the line that it feels.
    pub at: usize,
}

/// The room of one part.
#[derive(Clone, Copy, Debug)]
pub(super) struct Felt {
    pub feeler: Feeler,
    /// In the unit of what is felt, and its slope by that.
    pub value: f64,
    pub slope: f64,
    /// As a head, m, to compare parts that feel different things.
    pub head: f64,
    /// What counts as no room while iterating, in the unit of what is felt.
    pub tolerance: f64,
}

pub(super) struct Throttles {
    /// The lines that hold regulating parts, ascending: one per unit.
    pub lines: Vec<usize>,
    /// Per unit: the further loss of its line, m.
    pub extra: Vec<f64>,
    /// Per unit: what [`System::lift`] of its line would be without that loss, m.
    pub base: Vec<f64>,
    /// Per unit: whether its line can carry a flow at all.
    pub acts: Vec<bool>,
    /// Per unit: the first unit that shares its loss.
    pub leader: Vec<usize>,
    /// Parts of unit u: `first[u]..first[u + 1]`.
    feelers: Vec<Feeler>,
    first: Vec<usize>,
}

impl Throttles {
    pub fn new(network: &Network) -> Self {
        let mut throttles = Self {
            lines: Vec::new(),
            extra: Vec::new(),
            base: Vec::new(),
            acts: Vec::new(),
            leader: Vec::new(),
            feelers: Vec::new(),
            first: vec![0],
        };
        for (index, line) in network.lines().iter().enumerate() {
            let feeler = |id| {
                let regulates = network.regulator(id).regulates;
                let at = match regulates {
                    Regulates::Downstream => line.to.index(),
                    Regulates::Upstream => line.from.index(),
                    Regulates::Flow => index,
                    Regulates::MinimumFlow { pump } => network.line_of(pump).index(),
                };
                Feeler {
                    id,
                    regulates,
                    set: 0.0,
                    at,
                }
            };
            throttles.feelers.extend(line.regulators().map(feeler));
            if throttles.feelers.len() > throttles.first[throttles.lines.len()] {
                throttles.first.push(throttles.feelers.len());
                throttles.leader.push(throttles.lines.len());
                throttles.lines.push(index);
                throttles.extra.push(0.0);
                throttles.base.push(0.0);
                throttles.acts.push(false);
            }
        }
        throttles
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.lines.is_empty()
    }

    /// Forgets the losses of the last answer.
    pub fn reset(&mut self) {
        self.extra.fill(0.0);
    }

    /// The lift of a line with its further loss, of that without, m.
    #[inline]
    pub fn lift(&mut self, line: LineId, base: f64) -> f64 {
        match self.unit_of(line.index()) {
            None => base,
            Some(unit) => {
                self.base[unit] = base;
                base - self.extra[unit]
            }
        }
    }

    /// The first line to whose loss a part adds; none if all parts stand wide open or shut.
    pub fn first_that_adds(&self) -> Option<LineId> {
        let adds = self.extra.iter().position(|extra| *extra > 0.0)?;
        Some(LineId(self.lines[adds] as u32))
    }

    /// The unit of a line.
    #[inline]
    pub fn unit_of(&self, line: usize) -> Option<usize> {
        if self.lines.is_empty() {
            return None;
        }
        self.lines.binary_search(&line).ok()
    }

    /// The parts of a unit.
    pub fn feelers(&self, unit: usize) -> &[Feeler] {
        &self.feelers[self.first[unit]..self.first[unit + 1]]
    }

    /// Takes the set values over and finds who shares a loss.
    pub fn set(&mut self, network: &Network, settings: &Settings) {
        for feeler in &mut self.feelers {
            let set = settings.regulator(feeler.id).set;
            feeler.set = match feeler.regulates {
                // h = z + p / (rho g)
                Regulates::Downstream | Regulates::Upstream => {
                    let node = network.node_ids().nth(feeler.at);
                    let elevation = node.map_or(0.0, |node| network.elevation(node, settings));
                    elevation + set / (network.fluid().density * network.gravity())
                }
                Regulates::Flow | Regulates::MinimumFlow { .. } => set,
            };
        }
        for unit in 0..self.lines.len() {
            let alike = |other: &usize| match (self.feelers(unit), self.feelers(*other)) {
                ([a], [b]) => {
                    a.regulates.holds_pressure()
                        && (a.regulates, a.at, a.set) == (b.regulates, b.at, b.set)
                }
                _ => false,
            };
            let acts = self.acts[unit];
            let leader = (0..unit).find(|other| acts && self.acts[*other] && alike(other));
            self.leader[unit] = leader.unwrap_or(unit);
        }
    }

    /// The units that share the loss of `leader`, itself among them.
    pub fn led_by(&self, leader: usize) -> impl Iterator<Item = usize> + '_ {
        (leader..self.leader.len()).filter(move |unit| self.leader[*unit] == leader)
    }

    /// The room of one part.
    pub fn felt(system: &System, state: &State, unit: usize, feeler: &Feeler) -> Felt {
        let felt = if feeler.regulates.holds_pressure() {
            state.heads[feeler.at]
        } else {
            state.flows[feeler.at]
        };
        let room = feeler.regulates.room(feeler.set, felt);
        let (scale, tolerance) = if feeler.regulates.holds_pressure() {
            (
                1.0,
                HELD_HEAD.absolute + HELD_HEAD.relative * feeler.set.abs(),
            )
        } else {
            let line = system.throttles.lines[unit];
            let slope = system.laws.line(line).loss(state.flows[line]).slope;
            // A slope of next to nothing would make any flow look small beside a head.
            let ordinary = system.start_flow[line].abs();
            let law = system.laws.line(line);
            let rise = law.loss(ordinary).head - law.loss(0.0).head;
            let steep = slope.max(rise / ordinary).max(1.0);
            (
                steep,
                HELD_FLOW.absolute + HELD_FLOW.relative * feeler.set.abs(),
            )
        };
        Felt {
            feeler: *feeler,
            value: room.value,
            slope: room.slope,
            head: scale * room.value,
            tolerance,
        }
    }

    /// The part of a unit with the least room; none if no part of it feels anything that means something.
    pub fn ruling(&self, system: &System, state: &State, unit: usize) -> Option<Felt> {
        let felt = |feeler: &Feeler| Self::felt(system, state, unit, feeler);
        self.feelers(unit)
            .iter()
            .filter(|feeler| system.feels(feeler))
            .map(felt)
            .min_by(|a, b| a.head.total_cmp(&b.head))
    }

    /// How far the head along a unit's line that stands still exceeds its loss at no flow, its parts adding nothing; no
    /// further than they let it come, and below everything where they would not open at all.
    pub fn push_in(&self, system: &System, state: &State, unit: usize) -> f64 {
        let line = self.lines[unit];
        let mut push = system.push(state, line) + self.extra[unit];
        for feeler in self.feelers(unit) {
            let felt = Self::felt(system, state, unit, feeler);
            match feeler.regulates {
                Regulates::Downstream => push = push.min(felt.value),
                Regulates::Upstream | Regulates::MinimumFlow { .. } if felt.value < 0.0 => {
                    push = f64::NEG_INFINITY;
                }
                _ => {}
            }
        }
        push
    }
}

impl System<'_> {
    /// Whether what a part feels means something: the head of a set of nodes that no fixed head is joined to does not.
    pub fn feels(&self, feeler: &Feeler) -> bool {
        if !feeler.regulates.holds_pressure() {
            return true;
        }
        let node = crate::network::NodeId(feeler.at as u32);
        !(self.reach.floats(node) && self.reach.standing(node) == Standing::Joined)
            && self.reach.standing(node) != Standing::Unserved
    }

    /// Whether nothing flows in the line of a unit.
    pub fn stands_still(&self, state: &State, unit: usize) -> bool {
        let line = self.throttles.lines[unit];
        state.shut[line] || self.sense[line] != 0.0 && state.flows[line] == 0.0
    }

    /// Whether nothing flows in any line that shares the loss of `leader`.
    pub fn all_stand_still(&self, state: &State, leader: usize) -> bool {
        let mut led = self.throttles.led_by(leader);
        led.all(|unit| self.stands_still(state, unit))
    }

    /// Prepares the regulating parts for these settings.
    pub fn set_throttles(&mut self, settings: &Settings) {
        for unit in 0..self.throttles.lines.len() {
            let acts = self.roles[self.throttles.lines[unit]] != Role::Idle;
            self.throttles.acts[unit] = acts;
            if !acts {
                self.throttle(unit, 0.0);
            }
        }
        self.throttles.set(self.network, settings);
        for unit in 0..self.throttles.lines.len() {
            let extra = self.throttles.extra[self.throttles.leader[unit]];
            self.throttle(unit, extra);
        }
    }
}

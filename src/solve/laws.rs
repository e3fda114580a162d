//! The law of a whole line: the sum of its parts' laws, ready to evaluate many times.

use crate::network::{Network, Settings};
use crate::part::curve::Cover;
use crate::part::friction::{DarcyWeisbachBatch, Friction};
use crate::part::pump::performance::Performance;
use crate::part::quadratic::QuadraticLoss;
use crate::part::{HeadLaw, HeadLoss, Part};

/// One term of a line's law that is neither quadratic nor Darcy–Weisbach friction.
#[derive(Clone, Copy, Debug)]
enum Term<'n> {
    HazenWilliams(Friction),
    Pump { law: Performance<'n>, running: bool },
}

/// The laws of all lines of a network under one set of settings.
///
/// Quadratic losses of a line are added up in one coefficient; Darcy–Weisbach pipes lie in a batch, the other terms side by
/// side in memory, those of a line together. Which terms there are depends on the network alone: new settings write
/// numbers only.
#[derive(Clone, Debug)]
pub(crate) struct Laws<'n> {
    /// Per line, the quadratic losses that no setting changes, and all of them.
    fixed_r: Vec<f64>,
    r: Vec<f64>,
    pipes: DarcyWeisbachBatch,
    /// Per pipe, its line and its flow.
    pipe_lines: Vec<u32>,
    pipe_flows: Vec<f64>,
    terms: Vec<Term<'n>>,
    /// Per pump, its term.
    pump_terms: Vec<u32>,
    /// Pipes of line i: `first_pipe[i]..first_pipe[i + 1]`; terms alike.
    first_pipe: Vec<u32>,
    first_term: Vec<u32>,
}

/// One line's law; a [`HeadLaw`] like those of its parts.
#[derive(Clone, Copy)]
pub(crate) struct LineLaw<'a, 'n> {
    laws: &'a Laws<'n>,
    line: usize,
}

impl HeadLaw for LineLaw<'_, '_> {
    fn loss(&self, q: f64) -> HeadLoss {
        let pipes = &self.laws.pipes;
        self.laws.sum(self.line, q, |pipe| pipes.law(pipe).loss(q))
    }
}

impl<'n> Laws<'n> {
    /// Lays out the terms of every line; [`Self::set`] writes their numbers.
    pub fn new(network: &'n Network) -> Self {
        let mut laws = Self {
            fixed_r: Vec::new(),
            r: vec![0.0; network.lines().len()],
            pipes: DarcyWeisbachBatch::default(),
            pipe_lines: Vec::new(),
            pipe_flows: Vec::new(),
            terms: Vec::new(),
            pump_terms: vec![0; network.pumps().len()],
            first_pipe: vec![0],
            first_term: vec![0],
        };
        for (index, line) in network.lines().iter().enumerate() {
            laws.fixed_r.push(0.0);
            for part in &line.parts {
                laws.lay_out(network, index, part);
            }
            laws.first_pipe.push(laws.pipes.len() as u32);
            laws.first_term.push(laws.terms.len() as u32);
        }
        laws.pipe_flows = vec![0.0; laws.pipes.len()];
        laws
    }

    fn lay_out(&mut self, network: &'n Network, line: usize, part: &Part) {
        match part {
            Part::Pipe(pipe) => match pipe.friction {
                Friction::DarcyWeisbach(law) => {
                    self.pipes.push(law);
                    self.pipe_lines.push(line as u32);
                }
                Friction::FixedFactor { r } => self.fixed_r[line] += r,
                Friction::HazenWilliams { .. } => {
                    self.terms.push(Term::HazenWilliams(pipe.friction))
                }
            },
            Part::Loss(loss) | Part::CheckValve(loss) => self.fixed_r[line] += loss.r(),
            Part::Regulator(id) => self.fixed_r[line] += network.regulator(*id).wide_open.r(),
            Part::Pump(id) => {
                let law = network.performance(*id, network.settings());
                self.pump_terms[id.index()] = self.terms.len() as u32;
                self.terms.push(Term::Pump {
                    law,
                    running: false,
                });
            }
            // its loss is a setting
            Part::Valve(_) => {}
        }
    }

    /// Writes the numbers of all fixed parts again, from a network of the same parts with other figures.
    pub fn set_parts(&mut self, network: &Network) {
        let mut pipe = 0;
        for (index, line) in network.lines().iter().enumerate() {
            let mut fixed = 0.0;
            let mut term = self.first_term[index] as usize;
            for part in &line.parts {
                match part {
                    Part::Pipe(of) => match of.friction {
                        Friction::DarcyWeisbach(law) => {
                            self.pipes.replace(pipe, law);
                            pipe += 1;
                        }
                        Friction::FixedFactor { r } => fixed += r,
                        Friction::HazenWilliams { .. } => {
                            self.terms[term] = Term::HazenWilliams(of.friction);
                            term += 1;
                        }
                    },
                    Part::Loss(loss) | Part::CheckValve(loss) => fixed += loss.r(),
                    Part::Pump(_) => term += 1,
                    Part::Regulator(id) => fixed += network.regulator(*id).wide_open.r(),
                    Part::Valve(_) => {}
                }
            }
            self.fixed_r[index] = fixed;
        }
    }

    /// Writes the numbers for these settings. With a `cover`, drooping head curves are replaced by that falling one. The
    /// head curves are those of `curves`; `network` has the same parts, perhaps with other figures.
    pub fn set(
        &mut self,
        curves: &'n Network,
        network: &Network,
        settings: &Settings,
        cover: Option<Cover>,
    ) {
        for ((r, fixed), line) in self.r.iter_mut().zip(&self.fixed_r).zip(network.line_ids()) {
            *r = fixed + settings.fouling(line);
        }
        for id in network.valve_ids() {
            let open = network.valve(id).loss_at(settings.valve(id).opening);
            self.r[network.line_of_valve(id).index()] += open.map_or(0.0, QuadraticLoss::r);
        }
        for id in network.pump_ids() {
            let setting = settings.pump(id);
            if let (false, Some(standing)) = (setting.running, network.pump(id).when_stopped) {
                self.r[network.line_of(id).index()] += standing.r();
            }
            let viscosity = network.fluid().kinematic_viscosity;
            let mut law = curves.performance_in(id, settings, viscosity);
            if let Some((cover, covers)) = cover.zip(curves.covers(id)) {
                law = law.with_head(covers.get(cover));
            }
            self.terms[self.pump_terms[id.index()] as usize] = Term::Pump {
                law,
                running: setting.running,
            };
        }
    }

    /// The law of line number `line`.
    #[inline]
    pub fn line(&self, line: usize) -> LineLaw<'_, 'n> {
        LineLaw { laws: self, line }
    }

    /// Prepares [`Self::loss_at`] for these flows, one per line.
    pub fn evaluate(&mut self, flows: &[f64]) {
        for (q, line) in self.pipe_flows.iter_mut().zip(&self.pipe_lines) {
            *q = flows[*line as usize];
        }
        self.pipes.evaluate(&self.pipe_flows);
    }

    /// The loss of a line at the flow `q` last given to [`Self::evaluate`].
    #[inline]
    pub fn loss_at(&self, line: usize, q: f64) -> HeadLoss {
        self.sum(line, q, |pipe| self.pipes.loss(pipe, q))
    }

    /// g(q) = r q |q| + sum over pipes + sum over the other terms
    #[inline]
    fn sum(&self, line: usize, q: f64, pipe: impl Fn(usize) -> HeadLoss) -> HeadLoss {
        let s = self.r[line] * q.abs();
        let mut sum = HeadLoss {
            head: s * q,
            slope: 2.0 * s,
        };
        for i in self.first_pipe[line]..self.first_pipe[line + 1] {
            sum += pipe(i as usize);
        }
        for term in &self.terms[self.first_term[line] as usize..self.first_term[line + 1] as usize]
        {
            match term {
                Term::HazenWilliams(law) => sum += law.loss(q),
                Term::Pump { law, running: true } => sum += law.loss(q),
                Term::Pump { running: false, .. } => {}
            }
        }
        sum
    }
}

/// A flow at which every line of the network is in its ordinary range: 1 m/s in its narrowest pipe, or its first pump's
/// best efficiency; 10 L/s where it has neither. Where a solution starts from when nothing better is known.
pub(crate) fn ordinary_flow(network: &Network, settings: &Settings, line: usize) -> f64 {
    const VELOCITY: f64 = 1.0;
    const FLOW: f64 = 0.01;
    let line = &network.lines()[line];
    if let Some(id) = line.pumps().find(|id| settings.pump(*id).running) {
        let model = network.model(id);
        let ordinary = model
            .best_efficiency_flow
            .unwrap_or(0.7 * model.end_of_curve());
        return network.performance(id, settings).delivered(ordinary);
    }
    line.narrowest_bore().map_or(FLOW, |bore| {
        VELOCITY * std::f64::consts::FRAC_PI_4 * bore * bore
    })
}

/// Head lost in one part at flow `q`, m; in a regulating part, what it loses wide open.
pub fn part_loss(network: &Network, settings: &Settings, part: &Part, q: f64) -> f64 {
    let loss = match part {
        Part::Pipe(pipe) => pipe.friction.loss(q),
        Part::Loss(loss) | Part::CheckValve(loss) => loss.loss(q),
        Part::Regulator(id) => network.regulator(*id).wide_open.loss(q),
        Part::Valve(id) => {
            let open = network.valve(*id).loss_at(settings.valve(*id).opening);
            open.unwrap_or(QuadraticLoss::NONE).loss(q)
        }
        Part::Pump(id) => {
            let setting = settings.pump(*id);
            if setting.running {
                network.performance(*id, settings).loss(q)
            } else {
                network
                    .pump(*id)
                    .when_stopped
                    .unwrap_or(QuadraticLoss::NONE)
                    .loss(q)
            }
        }
    };
    loss.head
}

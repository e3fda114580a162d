//! The law of a whole line: the sum of its parts' laws, ready to evaluate many times.

use crate::network::{Network, Settings};
use crate::part::curve::Cover;
use crate::part::friction::Friction;
use crate::part::pump::PumpLaw;
use crate::part::quadratic::QuadraticLoss;
use crate::part::{HeadLaw, HeadLoss, Part};

/// One term of a line's law that is not quadratic.
#[derive(Clone, Copy, Debug)]
enum Term<'n> {
    Friction(Friction),
    Pump { law: PumpLaw<'n>, running: bool },
}

/// The laws of all lines of a network under one set of settings.
///
/// Quadratic losses of a line are added up in one coefficient; the other terms lie side by side in memory, those of a line
/// together. Which terms there are depends on the network alone: new settings write numbers only.
#[derive(Clone, Debug)]
pub(crate) struct Laws<'n> {
    r: Vec<f64>,
    terms: Vec<Term<'n>>,
    /// Terms of line i: `terms[first[i]..first[i + 1]]`.
    first: Vec<u32>,
}

/// One line's law; a [`HeadLaw`] like those of its parts.
#[derive(Clone, Copy)]
pub(crate) struct LineLaw<'a, 'n> {
    r: f64,
    terms: &'a [Term<'n>],
}

impl HeadLaw for LineLaw<'_, '_> {
    #[inline]
    fn loss(&self, q: f64) -> HeadLoss {
        // g(q) = r q |q| + sum of the other terms
        let s = self.r * q.abs();
        let mut sum = HeadLoss {
            head: s * q,
            slope: 2.0 * s,
        };
        for term in self.terms {
            let loss = match term {
                Term::Friction(law) => law.loss(q),
                Term::Pump { law, running: true } => law.loss(q),
                Term::Pump { running: false, .. } => continue,
            };
            sum.head += loss.head;
            sum.slope += loss.slope;
        }
        sum
    }
}

impl<'n> Laws<'n> {
    /// Lays out the terms of every line; [`Self::set`] writes their numbers.
    pub fn new(network: &'n Network) -> Self {
        let mut terms = Vec::new();
        let mut first = vec![0];
        for line in network.lines() {
            terms.extend(line.parts.iter().filter_map(|part| match part {
                Part::Pipe(pipe) => Some(Term::Friction(pipe.friction)),
                Part::Pump(id) => {
                    let law = PumpLaw {
                        head: &network.model(*id).head,
                        ratio: 1.0,
                        wear: 0.0,
                    };
                    Some(Term::Pump {
                        law,
                        running: false,
                    })
                }
                Part::Loss(_) | Part::Valve(_) | Part::CheckValve(_) => None,
            }));
            first.push(terms.len() as u32);
        }
        Self {
            r: vec![0.0; network.lines().len()],
            terms,
            first,
        }
    }

    /// Writes the numbers for these settings. With a `cover`, drooping head curves are replaced by that falling one.
    pub fn set(&mut self, network: &'n Network, settings: &Settings, cover: Option<Cover>) {
        let mut terms = self.terms.iter_mut();
        for ((id, line), r) in network.line_ids().zip(network.lines()).zip(&mut self.r) {
            *r = settings.fouling(id);
            for part in &line.parts {
                match part {
                    Part::Pipe(_) => {
                        terms.next();
                    }
                    Part::Loss(loss) | Part::CheckValve(loss) => *r += loss.r(),
                    Part::Valve(id) => {
                        let open = network.valve(*id).loss_at(settings.valve(*id).opening);
                        *r += open.map_or(0.0, |loss| loss.r());
                    }
                    Part::Pump(id) => {
                        let setting = settings.pump(*id);
                        if let (false, Some(standing)) =
                            (setting.running, network.pump(*id).when_stopped)
                        {
                            *r += standing.r();
                        }
                        let head = cover
                            .and_then(|cover| network.covers(*id).map(|covers| covers.get(cover)))
                            .unwrap_or(&network.model(*id).head);
                        let law = PumpLaw {
                            head,
                            ratio: setting.ratio(),
                            wear: setting.wear,
                        };
                        if let Some(term) = terms.next() {
                            *term = Term::Pump {
                                law,
                                running: setting.running,
                            };
                        }
                    }
                }
            }
        }
    }

    /// The law of line number `line`.
    #[inline]
    pub fn line(&self, line: usize) -> LineLaw<'_, 'n> {
        let (from, to) = (self.first[line] as usize, self.first[line + 1] as usize);
        LineLaw {
            r: self.r[line],
            terms: &self.terms[from..to],
        }
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
        return settings.pump(id).ratio()
            * model
                .best_efficiency_flow
                .unwrap_or(0.7 * model.end_of_curve());
    }
    line.narrowest_bore().map_or(FLOW, |bore| {
        VELOCITY * std::f64::consts::FRAC_PI_4 * bore * bore
    })
}

/// Head lost in one part at flow `q`, m.
pub(crate) fn part_loss(network: &Network, settings: &Settings, part: &Part, q: f64) -> f64 {
    let loss = match part {
        Part::Pipe(pipe) => pipe.friction.loss(q),
        Part::Loss(loss) | Part::CheckValve(loss) => loss.loss(q),
        Part::Valve(id) => {
            let open = network.valve(*id).loss_at(settings.valve(*id).opening);
            open.unwrap_or(QuadraticLoss::NONE).loss(q)
        }
        Part::Pump(id) => {
            let setting = settings.pump(*id);
            if setting.running {
                let head = &network.model(*id).head;
                PumpLaw {
                    head,
                    ratio: setting.ratio(),
                    wear: setting.wear,
                }
                .loss(q)
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

//! All cases, in parallel, and what they come to.

use std::ops::ControlFlow;
use std::sync::Mutex;

use rayon::prelude::*;

use super::draw::{Draw, draw, stream};
use super::influence::{Influence, Share, changes};
use super::measure::{Measure, measures};
use super::response::Responses;
use super::tally::{About, Band, Broken, Needs, band, bins_for, variance_share};
use crate::network::{Need, Network, Settings, Varied};
use crate::solve::{SolveError, Solver};
use crate::study::assessment::assess;

/// What to draw.
#[derive(Clone, Copy)]
pub struct Request<'a> {
    /// The inputs and what they do.
    pub responses: &'a Responses,
    /// What the system has to do.
    pub needs: &'a [Need],
    /// How many cases, at least one.
    pub samples: usize,
    /// What the draws start from.
    pub seed: u64,
    /// How many threads; none: as many as there are processors.
    pub threads: Option<usize>,
}

/// One case, as it comes.
pub struct Case<'a> {
    /// Its number, from 0.
    pub number: usize,
    /// Where each input stands.
    pub draws: &'a [Draw],
    /// What was looked at.
    pub measures: &'a [Measure],
    /// Per measure, SI; NaN where it does not exist.
    pub values: &'a [f64],
    /// Whether it has a balance.
    pub balanced: bool,
}

/// What the cases come to.
#[derive(Clone, Debug)]
pub struct Study {
    /// Cases drawn.
    pub samples: usize,
    /// Those without a balance, and why the first of them has none.
    pub unbalanced: Option<(usize, SolveError)>,
    /// What was looked at.
    pub measures: Vec<Measure>,
    /// Per measure; none where it never exists.
    pub bands: Vec<Option<Band>>,
    /// In how many cases needs are met.
    pub needs: Needs,
    /// Limits broken in some case, the most often broken first.
    pub broken: Vec<Broken>,
    /// Cases in which no limit is broken.
    pub sound: usize,
    /// Per measure, what each input makes of it.
    pub influences: Vec<Influence>,
}

/// Cases that a worker takes at a time.
const BLOCK: usize = 256;
/// Blocks that are solved before any is counted.
const ROUND: usize = 64;

/// Draws and solves all cases; `each` sees them in order and may break off, and then there is no study.
///
/// # Errors
/// The middle of all limits has no balance.
pub fn run(
    request: Request,
    each: &mut (dyn FnMut(Case) -> ControlFlow<()> + Send),
) -> Result<Option<Study>, SolveError> {
    let middle = &request.responses.middle;
    let solution = Solver::new(middle).solve(middle.settings())?.clone();
    let assessment = assess(middle, request.needs, middle.settings(), &solution);
    let measures = measures(middle, request.needs, &assessment);
    let threads = request.threads.unwrap_or(0);
    let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build();
    match pool {
        Ok(pool) => pool.install(|| cases(request, measures, each)),
        // No threads to be had: the caller's own will do.
        Err(_) => cases(request, measures, each),
    }
}

fn cases(
    request: Request,
    measures: Vec<Measure>,
    each: &mut (dyn FnMut(Case) -> ControlFlow<()> + Send),
) -> Result<Option<Study>, SolveError> {
    let count = rayon::current_num_threads().max(1);
    let workers: Vec<Mutex<Worker>> = (0..count)
        .map(|_| Worker::new(request, &measures).map(Mutex::new))
        .collect::<Result<_, _>>()?;
    let mut ledger = Ledger::new(request, &measures);
    for round in (0..request.samples).step_by(BLOCK * ROUND) {
        let end = (round + BLOCK * ROUND).min(request.samples);
        let starts: Vec<usize> = (round..end).step_by(BLOCK).collect();
        let blocks: Vec<Block> = starts
            .par_iter()
            .map(|start| {
                let own = &workers[rayon::current_thread_index().unwrap_or(0) % count];
                // Every worker gives the same block, so one that broke elsewhere is as good.
                let mut worker = own.lock().unwrap_or_else(|broken| broken.into_inner());
                worker.block(*start, (*start + BLOCK).min(end))
            })
            .collect();
        for block in &blocks {
            if ledger.enter(block, each).is_break() {
                return Ok(None);
            }
        }
    }
    ledger.close().map(Some)
}

/// One thread's solver and the network that it varies.
struct Worker<'a> {
    request: Request<'a>,
    measures: &'a [Measure],
    solver: Solver<'a>,
    network: Varied,
    settings: Settings,
    draws: Vec<Draw>,
}

/// Some cases that follow each other.
struct Block {
    first: usize,
    /// Per case and input.
    draws: Vec<Draw>,
    /// Per case and measure.
    values: Vec<f64>,
    /// Per case and need.
    met: Vec<bool>,
    /// Per case.
    failures: Vec<Option<SolveError>>,
    /// By case, in order.
    cautions: Vec<(usize, &'static str, About)>,
}

impl<'a> Worker<'a> {
    fn new(request: Request<'a>, measures: &'a [Measure]) -> Result<Self, SolveError> {
        let middle: &Network = &request.responses.middle;
        let (network, settings) = (middle.varied(), middle.settings().clone());
        let mut solver = Solver::new(middle);
        solver.start_at(&network, &settings)?;
        Ok(Self {
            request,
            measures,
            solver,
            network,
            settings,
            draws: Vec::new(),
        })
    }

    fn block(&mut self, first: usize, end: usize) -> Block {
        let mut block = Block {
            first,
            draws: Vec::new(),
            values: Vec::new(),
            met: Vec::new(),
            failures: Vec::new(),
            cautions: Vec::new(),
        };
        for number in first..end {
            self.case(number, &mut block);
        }
        block
    }

    fn case(&mut self, number: usize, block: &mut Block) {
        let Request {
            responses,
            needs,
            seed,
            ..
        } = self.request;
        let mut stream = stream(seed, number as u64);
        self.draws.clear();
        let inputs = responses.inputs().iter();
        self.draws
            .extend(inputs.map(|input| draw(&mut stream, &input.spread)));
        block.draws.extend(&self.draws);
        responses.write(&self.draws, &mut self.network, &mut self.settings);
        match self.solver.solve_near(&self.network, &self.settings) {
            Ok(solution) => {
                let assessment = assess(&self.network, needs, &self.settings, solution);
                let value = |measure: &Measure| measure.of(&assessment).unwrap_or(f64::NAN);
                block.values.extend(self.measures.iter().map(value));
                block
                    .met
                    .extend(assessment.needs.iter().map(|need| need.met));
                let cautions = assessment.cautions.iter();
                block
                    .cautions
                    .extend(cautions.map(|c| (number, c.code(), About::of(c))));
                block.failures.push(None);
            }
            Err(why) => {
                block.values.extend(self.measures.iter().map(|_| f64::NAN));
                block.met.extend(needs.iter().map(|_| false));
                block.failures.push(Some(why));
            }
        }
    }
}

/// What has been counted so far, always in the order of the cases.
struct Ledger<'a> {
    request: Request<'a>,
    measures: &'a [Measure],
    /// Per measure and case.
    columns: Vec<Vec<f64>>,
    bins: usize,
    /// Per input and case, the bin of its way.
    places: Vec<Vec<u8>>,
    /// Per input, sum and sum of squares of its place less one half.
    sums: Vec<(f64, f64)>,
    unbalanced: Option<(usize, SolveError)>,
    needs: Needs,
    broken: Vec<Broken>,
    sound: usize,
}

impl<'a> Ledger<'a> {
    fn new(request: Request<'a>, measures: &'a [Measure]) -> Self {
        let inputs = request.responses.inputs().len();
        let column = || Vec::with_capacity(request.samples);
        Self {
            request,
            measures,
            columns: measures.iter().map(|_| column()).collect(),
            bins: bins_for(request.samples),
            places: vec![Vec::with_capacity(request.samples); inputs],
            sums: vec![(0.0, 0.0); inputs],
            unbalanced: None,
            needs: Needs {
                met: vec![0; request.needs.len()],
                all: 0,
            },
            broken: Vec::new(),
            sound: 0,
        }
    }

    fn enter(
        &mut self,
        block: &Block,
        each: &mut (dyn FnMut(Case) -> ControlFlow<()> + Send),
    ) -> ControlFlow<()> {
        let (inputs, needs) = (self.places.len(), self.needs.met.len());
        let mut cautions = block.cautions.iter().peekable();
        for (i, failure) in block.failures.iter().enumerate() {
            let number = block.first + i;
            let draws = &block.draws[i * inputs..(i + 1) * inputs];
            let values = &block.values[i * self.columns.len()..(i + 1) * self.columns.len()];
            for (column, value) in self.columns.iter_mut().zip(values) {
                column.push(*value);
            }
            for ((places, sums), draw) in self.places.iter_mut().zip(&mut self.sums).zip(draws) {
                places.push((draw.place * self.bins as f64).min(self.bins as f64 - 1.0) as u8);
                let off = draw.place - 0.5;
                sums.0 += off;
                sums.1 += off * off;
            }
            if let Some(why) = failure {
                self.unbalanced.get_or_insert((0, *why)).0 += 1;
            }
            let met = &block.met[i * needs..(i + 1) * needs];
            for (count, met) in self.needs.met.iter_mut().zip(met) {
                *count += usize::from(*met);
            }
            self.needs.all += usize::from(failure.is_none() && met.iter().all(|met| *met));
            let mut sound = failure.is_none();
            while let Some((_, code, about)) = cautions.next_if(|(of, ..)| *of == number) {
                sound = false;
                self.count(code, *about);
            }
            self.sound += usize::from(sound);
            each(Case {
                number,
                measures: self.measures,
                draws,
                values,
                balanced: failure.is_none(),
            })?;
        }
        ControlFlow::Continue(())
    }

    fn count(&mut self, code: &'static str, about: About) {
        let same = |broken: &&mut Broken| broken.code == code && broken.about == about;
        match self.broken.iter_mut().find(same) {
            Some(broken) => broken.cases += 1,
            None => self.broken.push(Broken {
                code,
                about,
                cases: 1,
            }),
        }
    }

    fn close(mut self) -> Result<Study, SolveError> {
        let n = self.request.samples as f64;
        // s2 = (sum x2 - (sum x)2/n) / (n - 1)
        let deviations: Vec<f64> = self
            .sums
            .iter()
            .map(|(sum, squares)| {
                ((squares - sum * sum / n) / (n - 1.0).max(1.0))
                    .max(0.0)
                    .sqrt()
            })
            .collect();
        let Request {
            responses, needs, ..
        } = self.request;
        let changes = changes(responses, needs, self.measures, &deviations)?;
        let sampled: Vec<Vec<f64>> = self
            .columns
            .par_iter()
            .map(|column| {
                let share = |places: &Vec<u8>| variance_share(column, places.iter().copied());
                self.places.iter().map(share).collect()
            })
            .collect();
        let influences = self.measures.iter().zip(changes).zip(sampled);
        let influences = influences
            .map(|((measure, (changes, way)), sampled)| {
                let whole: f64 = changes.iter().map(|change| change * change).sum();
                let linear = |change: f64| {
                    if whole > 0.0 {
                        change * change / whole
                    } else {
                        0.0
                    }
                };
                let shares = changes.into_iter().zip(sampled);
                Influence {
                    measure: *measure,
                    shares: shares
                        .map(|(change, sampled)| Share {
                            change,
                            linear: linear(change),
                            sampled,
                        })
                        .collect(),
                    way,
                }
            })
            .collect();
        self.broken
            .sort_by_key(|broken| std::cmp::Reverse(broken.cases));
        Ok(Study {
            samples: self.request.samples,
            unbalanced: self.unbalanced,
            bands: self.columns.par_iter().map(|column| band(column)).collect(),
            measures: self.measures.to_vec(),
            needs: self.needs,
            broken: self.broken,
            sound: self.sound,
            influences,
        })
    }
}

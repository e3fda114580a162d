//! Which curves and points there are, case by case, each different one once.

use super::combined::{Benches, Sampled, with_running};
use super::station::{Stage, branchings, choose};
use super::system::{Asked, SystemSide};
use super::{
    Case, CombinedCurve, Curves, CurvesError, FlowHead, Idle, MOST_CURVES, NEXT_TO_NONE,
    OperatingPoint, SystemCurve, flows, pumps,
};
use crate::network::{Network, Settings};
use crate::part::PumpId;
use crate::solve::operation;
use crate::solve::{SolveError, Solver};
use crate::study::sets;

/// Curves closer than this at every flow tried are one, m.
const ALIKE: f64 = 1e-7;
/// Flow below which a station is said to move nothing, m3/s.
const STILL: f64 = 1e-9;
/// Steps along a system curve.
const STEPS: usize = 80;
/// Curves reach so far past the last flow that is looked at.
const ROOM: f64 = 1.06;

/// A case and the station in it.
pub(super) struct Scene<'n> {
    pub network: &'n Network,
    pub stages: Vec<Stage>,
    /// Sets of running pumps of the station, fewest first.
    pub sets: Vec<Vec<PumpId>>,
    /// The pumps of the station that run as the case has them.
    pub running: Vec<PumpId>,
    one_by_one: bool,
}

impl<'n> Scene<'n> {
    fn new(case: &Case<'n>, bank: Option<&str>) -> Result<Self, CurvesError> {
        let network = case.network;
        let settings = network.settings();
        let stages = choose(network, bank).ok_or_else(|| match bank {
            Some(name) if !network.pumps().is_empty() => CurvesError::NoBank(name.to_owned()),
            _ => CurvesError::NoPumps,
        })?;
        let mut scene = Self {
            network,
            stages,
            sets: Vec::new(),
            running: Vec::new(),
            one_by_one: false,
        };
        let all = scene.pumps();
        let runs = |pump: &PumpId| settings.pump(*pump).running;
        scene.running = all.iter().copied().filter(runs).collect();
        let (switched, kept): (Vec<PumpId>, Vec<PumpId>) =
            all.iter().partition(|pump| case.switched.contains(pump));
        let kept: Vec<PumpId> = kept.into_iter().filter(runs).collect();
        let (sets, one_by_one) = scene.sets_of(&switched, &kept);
        (scene.sets, scene.one_by_one) = (sets, one_by_one);
        Ok(scene)
    }

    /// All pumps of the station.
    pub fn pumps(&self) -> Vec<PumpId> {
        let stages = self.stages.iter();
        let mut pumps: Vec<PumpId> = stages.flat_map(|stage| stage.pumps(self.network)).collect();
        pumps.sort();
        pumps
    }

    /// The distinct sets in which every stage has a pump that runs; past the limit pumps are added one by one.
    fn sets_of(&self, switched: &[PumpId], kept: &[PumpId]) -> (Vec<Vec<PumpId>>, bool) {
        let together = |set: Vec<PumpId>| {
            let mut set: Vec<PumpId> = set.into_iter().chain(kept.iter().copied()).collect();
            set.sort();
            set
        };
        let groups = sets::groups(self.network, self.network.settings(), switched);
        let few = sets::count(&groups) <= 4 * MOST_CURVES;
        let all = if few { sets::all(&groups) } else { Vec::new() };
        let all: Vec<Vec<PumpId>> = all
            .into_iter()
            .map(together)
            .filter(|set| self.can_pass(set))
            .collect();
        if few && all.len() <= MOST_CURVES {
            return (all, false);
        }
        let first = (1..=switched.len()).map(|n| together(switched[..n].to_vec()));
        let mut added: Vec<Vec<PumpId>> = first.filter(|set| self.can_pass(set)).collect();
        // the last ones bring least
        added.truncate(MOST_CURVES);
        (added, true)
    }

    fn can_pass(&self, set: &[PumpId]) -> bool {
        let stages = &mut self.stages.iter();
        stages.all(|stage| {
            let pumps = stage.pumps(self.network);
            pumps.iter().any(|pump| set.contains(pump))
        })
    }

    fn settings(&self, running: &[PumpId]) -> Settings {
        with_running(self.network.settings(), &self.pumps(), running)
    }

    fn benches(&self, running: &[PumpId]) -> Result<Benches, CurvesError> {
        Benches::new(self.network, &self.settings(running), &self.stages)
    }

    /// Where a set settles: its flow, its head and what its pumps do.
    fn settle(&self, solver: &mut Solver<'_>, running: &[PumpId]) -> Result<Settled, SolveError> {
        let settings = self.settings(running);
        let solution = solver.balances(&settings)?.first;
        let flow = self.stages[0]
            .lines
            .iter()
            .map(|line| solution.flow(*line))
            .sum();
        let head = |stage: &Stage| Some(solution.head(stage.to)? - solution.head(stage.from)?);
        let does = |id: &PumpId| {
            (
                *id,
                operation::pump(self.network, &settings, &solution, *id),
            )
        };
        let head: Option<f64> = self.stages.iter().map(head).sum();
        Ok(Settled {
            at: head.map(|head| FlowHead { flow, head }),
            pumps: running.iter().map(does).collect(),
        })
    }
}

struct Settled {
    at: Option<FlowHead>,
    pumps: Vec<(PumpId, operation::PumpOperation)>,
}

/// What tells curves apart: heads at a few flows.
type Signature = Vec<Option<f64>>;

fn alike(a: &Signature, b: &Signature) -> bool {
    let close = |(a, b): (&Option<f64>, &Option<f64>)| match (a, b) {
        (Some(a), Some(b)) => (a - b).abs() <= ALIKE,
        (None, None) => true,
        _ => false,
    };
    a.len() == b.len() && a.iter().zip(b).all(close)
}

/// A combined curve before it is drawn.
struct Given {
    case: usize,
    running: Vec<PumpId>,
    names: Vec<String>,
    signature: Signature,
}

/// Everything to draw for the station that holds `bank` (a bank, line or pump), or else for the one with the most pumps.
///
/// The first case gets all its sets of pumps; a further one its own system curve, and where its pumps differ a curve for those that run in it.
///
/// # Errors
/// [`CurvesError`]; a state that does not balance is none, but told in [`Curves::idle`].
pub fn curves(cases: &[Case], bank: Option<&str>) -> Result<Curves, CurvesError> {
    let scenes: Vec<Scene> = cases
        .iter()
        .map(|case| Scene::new(case, bank))
        .collect::<Result<_, _>>()?;
    let Some(first) = scenes.first() else {
        return Err(CurvesError::NoPumps);
    };
    let names = |scene: &Scene| -> Vec<String> {
        let stages = scene.stages.iter();
        stages.map(|stage| stage.name(scene.network)).collect()
    };
    if let Some(other) = scenes.iter().position(|scene| names(scene) != names(first)) {
        return Err(CurvesError::OtherStation(other));
    }
    let sides: Vec<SystemSide> = scenes
        .iter()
        .map(|scene| SystemSide::new(scene.network, scene.network.settings(), &scene.stages[0]))
        .collect::<Result<_, _>>()?;
    let mut asked: Vec<Asked> = sides
        .iter()
        .zip(&scenes)
        .map(|(side, scene)| Asked::new(side, &scene.stages[1..]))
        .collect();
    let scale = first.benches(&first.pumps())?.scale;

    let mut found = Found::default();
    for (case, scene) in scenes.iter().enumerate() {
        found.look_at(case, scene, &mut asked[case], scale)?;
    }
    let mut curves = Curves {
        stages: first.stages.clone(),
        branchings: branchings(first.network, first.network.settings(), &first.stages),
        one_by_one: first.one_by_one,
        systems: Vec::new(),
        combined: found.combined_curves(&scenes)?,
        pumps: Vec::new(),
        suctions: Vec::new(),
        points: found.points,
        idle: found.idle,
    };
    let last = |points: &[FlowHead]| points.last().map_or(0.0, |point| point.flow);
    let ends = curves
        .combined
        .iter()
        .map(|curve| last(&curve.points).max(last(&curve.beyond)));
    let largest = ROOM * ends.fold(0.0, f64::max);
    for (system, (_, cases)) in found.systems.into_iter().enumerate() {
        let points = curves.points.iter().filter(|point| point.system == system);
        let marks: Vec<f64> = points.map(|point| point.at.flow).collect();
        let side = &mut asked[cases[0]];
        let along = flows(NEXT_TO_NONE * scale, largest, STEPS, &marks).into_iter();
        let point = |flow| side.at(flow).map(|head| FlowHead { flow, head });
        curves.systems.push(SystemCurve {
            points: along.filter_map(point).collect(),
            cases,
        });
    }
    for curve in &curves.combined {
        pumps::add(&mut curves.pumps, &scenes, curve.case, &curve.running)?;
    }
    curves.suctions = pumps::suctions(&scenes)?;
    Ok(curves)
}

/// What has been found so far.
#[derive(Default)]
struct Found {
    systems: Vec<(Signature, Vec<usize>)>,
    given: Vec<Given>,
    points: Vec<OperatingPoint>,
    idle: Vec<Idle>,
}

impl Found {
    fn look_at(
        &mut self,
        case: usize,
        scene: &Scene,
        asked: &mut Asked,
        scale: f64,
    ) -> Result<(), CurvesError> {
        let tried = flows(NEXT_TO_NONE * scale, scale, 6, &[]).into_iter();
        let signature: Signature = tried.map(|flow| asked.at(flow)).collect();
        let system = match self
            .systems
            .iter()
            .position(|(other, _)| alike(other, &signature))
        {
            Some(system) => {
                self.systems[system].1.push(case);
                system
            }
            None => {
                self.systems.push((signature, vec![case]));
                self.systems.len() - 1
            }
        };
        let mut solver = Solver::new(scene.network);
        let mut sets = scene.sets.clone();
        if !sets.contains(&scene.running) && scene.can_pass(&scene.running) && case > 0 {
            sets.push(scene.running.clone());
        }
        for running in sets {
            let wanted = case == 0 || running == scene.running;
            let Some(combined) = self.given_by(case, scene, &running, wanted)? else {
                continue;
            };
            let known =
                |point: &OperatingPoint| (point.system, point.combined) == (system, combined);
            if self.points.iter().any(known) {
                continue;
            }
            match scene.settle(&mut solver, &running) {
                Ok(Settled {
                    at: Some(at),
                    pumps,
                }) if at.flow > STILL => {
                    self.points.push(OperatingPoint {
                        case,
                        system,
                        combined,
                        at,
                        pumps,
                    });
                }
                Ok(_) => self.idle.push(Idle {
                    case,
                    running,
                    error: None,
                }),
                Err(error) => self.idle.push(Idle {
                    case,
                    running,
                    error: Some(error),
                }),
            }
        }
        Ok(())
    }

    /// The combined curve of a set: a known one, or a new one if it is wanted.
    fn given_by(
        &mut self,
        case: usize,
        scene: &Scene,
        running: &[PumpId],
        wanted: bool,
    ) -> Result<Option<usize>, CurvesError> {
        let benches = scene.benches(running)?;
        let mut rig = benches.rig();
        let tried = flows(NEXT_TO_NONE * benches.scale, benches.scale, 6, &[]).into_iter();
        let signature: Signature = tried.map(|flow| Some(rig.at(flow)?.head)).collect();
        let name = |pump: &PumpId| scene.network.pump(*pump).name.clone();
        let names: Vec<String> = running.iter().map(name).collect();
        let known = self
            .given
            .iter()
            .position(|other| other.names == names && alike(&other.signature, &signature));
        if known.is_some() || !wanted {
            return Ok(known);
        }
        self.given.push(Given {
            case,
            running: running.to_vec(),
            names,
            signature,
        });
        Ok(Some(self.given.len() - 1))
    }

    /// The curves found, drawn; for pumps in series also what each stage gives alone in the first case.
    fn combined_curves(&self, scenes: &[Scene]) -> Result<Vec<CombinedCurve>, CurvesError> {
        let mut curves = Vec::new();
        for (position, given) in self.given.iter().enumerate() {
            let here = self
                .points
                .iter()
                .filter(|point| point.combined == position);
            let marks: Vec<f64> = here.map(|point| point.at.flow).collect();
            let scene = &scenes[given.case];
            curves.push(combined(scene, given.case, &given.running, None, &marks)?);
        }
        let first = &scenes[0];
        let alone = if first.stages.len() > 1 {
            first.stages.len()
        } else {
            0
        };
        for stage in 0..alone {
            let of_stage = first.stages[stage].pumps(first.network);
            let groups = sets::groups(first.network, first.network.settings(), &of_stage);
            if sets::count(&groups) > MOST_CURVES {
                continue;
            }
            for running in sets::all(&groups) {
                curves.push(combined(first, 0, &running, Some(stage), &[])?);
            }
        }
        Ok(curves)
    }
}

fn combined(
    scene: &Scene,
    case: usize,
    running: &[PumpId],
    stage: Option<usize>,
    marks: &[f64],
) -> Result<CombinedCurve, CurvesError> {
    let settings = scene.settings(running);
    let stages = stage.map_or(&scene.stages[..], |k| &scene.stages[k..=k]);
    let benches = Benches::new(scene.network, &settings, stages)?;
    let Sampled {
        points,
        beyond,
        preferred,
    } = benches.rig().sample(scene.network, &settings, marks);
    Ok(CombinedCurve {
        case,
        running: running.to_vec(),
        stage,
        points,
        beyond,
        preferred,
    })
}

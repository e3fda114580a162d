//! Each pump over its own flow: head, efficiency, power and NPSH required, and the NPSH that its suction leaves it.

use super::bench::Bench;
use super::combined::{end_of, with_running};
use super::draw::Scene;
use super::station::Stage;
use super::system::{Asked, SystemSide};
use super::{CurvesError, NEXT_TO_NONE, PumpCurve, SuctionCurve, flows};
use crate::network::{Network, Settings};
use crate::part::PumpId;
use crate::solve::Solver;

/// Steps along a curve.
const STEPS: usize = 48;

/// NPSH curves closer than this everywhere are one, m.
const ALIKE: f64 = 1e-6;

/// Whether two pumps, each in its own network, do the same at the same flow.
fn alike(a: (&Network, PumpId), b: (&Network, PumpId)) -> bool {
    let state = |(network, id): (&Network, PumpId)| {
        let setting = network.settings().pump(id);
        (
            setting.ratio(),
            setting.speed,
            setting.wear,
            network.fluid().density,
        )
    };
    a.0.model(a.1).name == b.0.model(b.1).name && state(a) == state(b)
}

/// Adds pumps of a case to the curves that hold for them, new ones where there is none yet.
pub(super) fn add(
    curves: &mut Vec<PumpCurve>,
    scenes: &[Scene],
    case: usize,
    running: &[PumpId],
) -> Result<(), CurvesError> {
    let network = scenes[case].network;
    for &pump in running {
        let fits = |curve: &&mut PumpCurve| {
            alike(
                (scenes[curve.case].network, curve.pumps[0]),
                (network, pump),
            )
        };
        match curves.iter_mut().find(fits) {
            Some(curve) if curve.case == case && !curve.pumps.contains(&pump) => {
                curve.pumps.push(pump);
            }
            Some(_) => {}
            None => curves.push(curve(&scenes[case], case, pump)?),
        }
    }
    Ok(())
}

/// One pump's own curves, by running its line alone.
fn curve(scene: &Scene, case: usize, pump: PumpId) -> Result<PumpCurve, CurvesError> {
    let network = scene.network;
    let settings = &with_running(network.settings(), &scene.pumps(), &[pump]);
    // The other pumps of its line run with it, or it would give nothing.
    let settings = &line_running(network, settings, pump);
    let stage = Stage {
        from: network.line(network.line_of(pump)).from,
        to: network.line(network.line_of(pump)).to,
        lines: vec![network.line_of(pump)],
    };
    let bench = Bench::new(network, settings, &stage)?;
    let mut solver = Solver::new(bench.network());
    let end = end_of(network, settings, pump);
    let model = network.model(pump);
    let points = flows(NEXT_TO_NONE * end, end, STEPS, &[])
        .into_iter()
        .filter_map(|flow| {
            let given = bench.at(&mut solver, flow, 0.0)?;
            given.pumps.into_iter().find(|(id, _)| *id == pump)
        })
        .map(|(_, operation)| operation);
    Ok(PumpCurve {
        case,
        pumps: vec![pump],
        points: points.collect(),
        best_efficiency_flow: model
            .best_efficiency_flow
            .map(|flow| settings.pump(pump).ratio() * flow),
        rated: model.motor.as_ref().map(|motor| motor.rated),
    })
}

fn line_running(network: &Network, settings: &Settings, pump: PumpId) -> Settings {
    let mut settings = settings.clone();
    for other in network.line(network.line_of(pump)).pumps() {
        settings.pump_mut(other).running = true;
    }
    settings
}

/// NPSH available to the pumps of every case; curves that are alike are one.
pub(super) fn suctions(scenes: &[Scene]) -> Result<Vec<SuctionCurve>, CurvesError> {
    let mut found: Vec<SuctionCurve> = Vec::new();
    let ends = scenes.iter().flat_map(|scene| {
        let settings = scene.network.settings();
        let end = move |pump| end_of(scene.network, settings, pump);
        scene.pumps().into_iter().map(end)
    });
    let longest = ends.fold(0.0, f64::max);
    let all_flows = flows(NEXT_TO_NONE * longest, longest, STEPS, &[]);
    for (case, scene) in scenes.iter().enumerate() {
        for stage in &scene.stages {
            for pump in kinds_of(scene, stage) {
                for curve in suction(scene, case, stage, pump, &all_flows)? {
                    match found.iter_mut().find(|other| same(other, &curve)) {
                        Some(other) if !other.cases.contains(&case) => other.cases.push(case),
                        Some(_) => {}
                        None => found.push(curve),
                    }
                }
            }
        }
    }
    Ok(found)
}

/// The first pump of each kind in a stage.
fn kinds_of(scene: &Scene, stage: &Stage) -> Vec<PumpId> {
    let network = scene.network;
    let mut firsts: Vec<PumpId> = Vec::new();
    for pump in stage.pumps(network) {
        let known = |first: &PumpId| alike((network, *first), (network, pump));
        if !firsts.iter().any(known) {
            firsts.push(pump);
        }
    }
    firsts
}

fn same(a: &SuctionCurve, b: &SuctionCurve) -> bool {
    let close =
        |(a, b): (&(f64, f64), &(f64, f64))| (a.0 - b.0).abs() < 1e-9 && (a.1 - b.1).abs() < ALIKE;
    a.beside.is_some() == b.beside.is_some() && a.points.iter().zip(&b.points).all(close)
}

/// For one pump alone, and where the suction header's head falls with flow also with all that run in the case.
fn suction(
    scene: &Scene,
    case: usize,
    stage: &Stage,
    pump: PumpId,
    all_flows: &[f64],
) -> Result<Vec<SuctionCurve>, CurvesError> {
    let network = scene.network;
    let side = SystemSide::new(network, network.settings(), stage)?;
    let mut asked = Asked::new(&side, &[]);
    let of_stage = stage.pumps(network);
    let held = network.fixed_head(stage.from, network.settings()).is_some();
    let mut sets = vec![vec![pump]];
    let together: Vec<PumpId> = scene
        .running
        .iter()
        .copied()
        .filter(|id| of_stage.contains(id))
        .collect();
    if !held && together.len() > 1 && together.contains(&pump) {
        sets.push(together);
    }
    let end = end_of(network, network.settings(), pump);
    let several = sets.len() > 1;
    let mut curves = Vec::new();
    for set in sets {
        let settings = with_running(network.settings(), &of_stage, &set);
        let settings = line_running(network, &settings, pump);
        let bench = Bench::new(network, &settings, stage)?;
        let mut solver = Solver::new(bench.network());
        let point = |flow: f64| {
            let given = bench.at(&mut solver, flow, asked.suction_head(flow)?)?;
            let (_, does) = given.pumps.into_iter().find(|(id, _)| *id == pump)?;
            Some((does.flow, does.npsh_available?))
        };
        let own = all_flows.iter().map(|flow| flow * set.len() as f64);
        let points: Vec<(f64, f64)> = own
            .filter_map(point)
            .filter(|(flow, _)| *flow <= end * (1.0 + 1e-9))
            .collect();
        if points.len() > 1 {
            curves.push(SuctionCurve {
                cases: vec![case],
                pump,
                beside: several.then_some(set.len()),
                points,
            });
        }
    }
    Ok(curves)
}

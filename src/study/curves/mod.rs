//! The curves that people in this trade look at first: what the pumps give against what the system asks for, over flow, and
//! where the two meet; beside it what each pump takes and needs at its own flow.
//!
//! Everything is solved: the pumps' side by running the station's lines alone with a flow asked of them ([`CombinedCurve`]), the
//! system's side by taking those lines out and imposing their flow ([`SystemCurve`]), the points where they meet by solving
//! the whole network ([`OperatingPoint`]). The last are not computed from the first two; that they lie on both is a test.

mod bench;
mod combined;
mod draw;
mod excerpt;
mod pumps;
mod station;
mod system;

pub use draw::curves;
pub use station::{Branching, Stage, stages};

use crate::network::{BuildError, Network};
use crate::part::PumpId;
use crate::solve::SolveError;
use crate::solve::operation::PumpOperation;

/// Most sets of running pumps that are drawn one by one; past it pumps are added in the order of the file.
pub const MOST_CURVES: usize = 8;

/// One state of the file.
#[derive(Clone, Debug)]
pub struct Case<'n> {
    /// The network in that state.
    pub network: &'n Network,
    /// The pumps to switch; those of the station that are not among them stay as they are.
    pub switched: Vec<PumpId>,
}

/// All there is to draw, SI. Pumps are ids in the network of the case that stands beside them.
#[derive(Clone, Debug)]
pub struct Curves {
    /// The stages that carry the same flow one after the other; one for pumps side by side.
    pub stages: Vec<Stage>,
    /// Why the system curve is that of these pumps' headers only; empty where one curve tells all.
    pub branchings: Vec<Branching>,
    /// Whether sets were left out and pumps are added one by one.
    pub one_by_one: bool,
    /// What the system asks for, one for each different one.
    pub systems: Vec<SystemCurve>,
    /// What the pumps give, one for each different one.
    pub combined: Vec<CombinedCurve>,
    /// Where they meet.
    pub points: Vec<OperatingPoint>,
    /// Sets that give nothing or do not balance.
    pub idle: Vec<Idle>,
    /// Each different pump over its own flow.
    pub pumps: Vec<PumpCurve>,
    /// NPSH available over the flow of one pump, one for each different one.
    pub suctions: Vec<SuctionCurve>,
}

/// A flow (m3/s) and a head (m).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FlowHead {
    /// Flow, m3/s.
    pub flow: f64,
    /// Head, m.
    pub head: f64,
}

/// The head that all but the station's pumps and branches asks for at each flow.
#[derive(Clone, Debug)]
pub struct SystemCurve {
    /// Positions of the cases for which it holds, at least one.
    pub cases: Vec<usize>,
    /// Points, flow rising; the first at next to no flow, which is where the static head shows.
    pub points: Vec<FlowHead>,
}

/// The head that a set of pumps gives between the headers at each flow, their branches' losses taken off.
#[derive(Clone, Debug)]
pub struct CombinedCurve {
    /// Position of the first case for which it holds.
    pub case: usize,
    /// The pumps that run.
    pub running: Vec<PumpId>,
    /// For pumps in series: only one stage, which alone lifts nothing.
    pub stage: Option<usize>,
    /// Points from next to no flow to the first end of a pump's curve, flow rising.
    pub points: Vec<FlowHead>,
    /// Points beyond that end, as far as an operating point lies there; the pumps' curves are a guess there.
    pub beyond: Vec<FlowHead>,
    /// Flows between which every running pump is in the preferred region; none where no flow suits them all.
    pub preferred: Option<(f64, f64)>,
}

/// The state that a set settles at in a system.
#[derive(Clone, Debug)]
pub struct OperatingPoint {
    /// Position of the first case with that system and these pumps.
    pub case: usize,
    /// Position of its system curve.
    pub system: usize,
    /// Position of its combined curve.
    pub combined: usize,
    /// Flow through the station and head between its headers (added up over stages).
    pub at: FlowHead,
    /// What each running pump of the station does.
    pub pumps: Vec<(PumpId, PumpOperation)>,
}

impl OperatingPoint {
    /// Flow over best efficiency of each running pump, least and greatest; none where none is known.
    pub fn shares(&self) -> Option<(f64, f64)> {
        let shares = self.pumps.iter().filter_map(|(_, pump)| pump.share_of_bep);
        shares.fold(None, |range, share| match range {
            None => Some((share, share)),
            Some((low, high)) => Some((f64::min(low, share), f64::max(high, share))),
        })
    }

    /// Least NPSH margin of a running pump, m.
    pub fn npsh_margin(&self) -> Option<f64> {
        let margins = self.pumps.iter().filter_map(|(_, pump)| pump.npsh_margin());
        margins.min_by(f64::total_cmp)
    }
}

/// A set that moves nothing in a case.
#[derive(Clone, Debug)]
pub struct Idle {
    /// Position of the case.
    pub case: usize,
    /// The pumps that run.
    pub running: Vec<PumpId>,
    /// Why there is no balance; none where there is one, at no flow.
    pub error: Option<SolveError>,
}

/// One pump, or several alike, over its own flow.
#[derive(Clone, Debug)]
pub struct PumpCurve {
    /// Position of the first case with it.
    pub case: usize,
    /// The pumps alike.
    pub pumps: Vec<PumpId>,
    /// What it does at each flow, from none to the end of its curve; NPSH available is not filled in.
    pub points: Vec<PumpOperation>,
    /// Flow at best efficiency at its speed, m3/s.
    pub best_efficiency_flow: Option<f64>,
    /// The motor's rating, W.
    pub rated: Option<f64>,
}

/// NPSH available to a pump over its own flow.
#[derive(Clone, Debug)]
pub struct SuctionCurve {
    /// Positions of the cases for which it holds, at least one.
    pub cases: Vec<usize>,
    /// Which pump, in the first of them.
    pub pump: PumpId,
    /// How many pumps of its stage draw from the same header; none where that makes no difference.
    pub beside: Option<usize>,
    /// Its flow (m3/s) and the NPSH available to it (m).
    pub points: Vec<(f64, f64)>,
}

/// Why nothing can be drawn.
#[derive(Clone, Debug, PartialEq)]
pub enum CurvesError {
    /// The network has no pump.
    NoPumps,
    /// No bank, line or pump of that name holds a pump.
    NoBank(String),
    /// In the case at that position the station is not the same.
    OtherStation(usize),
    /// The station's lines alone, or the rest without them, are no network.
    Apart(BuildError),
}

impl std::fmt::Display for CurvesError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::NoPumps => write!(f, "there are no pumps to draw"),
            Self::NoBank(name) => write!(f, "no bank, line or pump is called `{name}`"),
            Self::OtherStation(case) => {
                write!(f, "case number {} has other banks", case + 1)
            }
            Self::Apart(why) => write!(f, "the pumps cannot be looked at on their own: {why}"),
        }
    }
}

impl std::error::Error for CurvesError {}

impl From<BuildError> for CurvesError {
    fn from(why: BuildError) -> Self {
        Self::Apart(why)
    }
}

/// Next to no flow, as a share of what the pumps could carry: at none at all the water might stand anywhere.
const NEXT_TO_NONE: f64 = 1e-6;

/// Evenly spaced flows from next to none to `end`, and `more` of them where they lie in that range; rising.
fn flows(start: f64, end: f64, steps: usize, more: &[f64]) -> Vec<f64> {
    let step = |i: usize| start + (end - start) * i as f64 / steps as f64;
    let mut flows: Vec<f64> = (0..=steps).map(step).collect();
    flows.extend(
        more.iter()
            .copied()
            .filter(|flow| (start..=end).contains(flow)),
    );
    flows.sort_by(f64::total_cmp);
    flows.dedup();
    flows
}

//! Why a run ended before its time.

use super::event::Why;
use super::plan::PlanError;
use crate::network::Network;
use crate::solve::SolveError;
use crate::units::Kind;

/// Why a run ended before its time. Times in s from the start of the shift.
#[derive(Clone, Debug, PartialEq)]
pub enum ShiftError {
    /// The shift or the plan cannot be run.
    Plan(PlanError),
    /// The network has no answer at some instant.
    Solve {
        /// When.
        time: f64,
        /// Why.
        error: SolveError,
    },
    /// A rule switches on and off without time passing.
    Chatter {
        /// When.
        time: f64,
        /// The rule, by the names of its plan and group.
        rule: String,
        /// Which of its steps, from 1.
        step: usize,
        /// What it followed.
        why: Why,
    },
    /// The steps of the integration became too small to go on.
    Stuck {
        /// When.
        time: f64,
    },
    /// The sink wants no more.
    Stopped {
        /// When.
        time: f64,
    },
}

impl From<PlanError> for ShiftError {
    fn from(error: PlanError) -> Self {
        Self::Plan(error)
    }
}

impl ShiftError {
    /// The message in the user's names; `write` writes a figure (SI) of a kind with its unit.
    pub fn message(&self, network: &Network, write: &dyn Fn(Kind, f64) -> String) -> String {
        match self {
            Self::Plan(error) => error.to_string(),
            Self::Solve { time, error } => {
                format!("after {time:.1} s: {}", error.message(network))
            }
            Self::Chatter {
                time,
                rule,
                step,
                why,
            } => format!(
                "after {time:.1} s: step {step} of `{rule}` switches on and off without time passing, {}; set its start and \
                 stop further apart or give it a min_run",
                why.words(network, write)
            ),
            Self::Stuck { time } => {
                format!("after {time:.1} s: the course of the levels is too abrupt to follow")
            }
            Self::Stopped { time } => format!("stopped after {time:.1} s"),
        }
    }
}

impl std::fmt::Display for ShiftError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Plan(error) => write!(f, "{error}"),
            Self::Solve { time, error } => write!(f, "after {time} s: {error}"),
            Self::Chatter {
                time, rule, step, ..
            } => {
                write!(
                    f,
                    "after {time} s: step {step} of `{rule}` switches without time passing"
                )
            }
            Self::Stuck { time } => write!(f, "after {time} s: the steps became too small"),
            Self::Stopped { time } => write!(f, "stopped after {time} s"),
        }
    }
}

impl std::error::Error for ShiftError {}

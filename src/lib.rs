//! Operating points of centrifugal pumps that share a system, in parallel and in series.
//!
//! ```text
//! text -read-> Network + Settings + needs          checked / adjustable
//!                   |
//!   part::HeadLaw <- Line = ordered parts, one flow
//!                   |
//!      Network + Settings -solve-> Solution -study-> Assessment, combinations, gains
//!                                                       |
//!                                                    output: tables · CSV · JSON · words
//! ```
//!
//! # Example
//!
//! ```
//! use dutybank::solve::{Solver, operation};
//!
//! let system = dutybank::read::system(include_str!("../networks/starter.yaml"))?;
//! let network = &system.network;
//! let mut solver = Solver::new(network);
//! let mut settings = network.settings().clone();
//! let both = solver.solve(&settings)?.clone();
//!
//! // the second pump slowed down to 90 %
//! let second = network.find_pump("duty.2").unwrap();
//! settings.pump_mut(second).speed = 0.9;
//! let slowed = solver.resolve(&settings)?.clone();
//!
//! let flow = |solution, id| operation::pump(network, &settings, solution, id).flow;
//! assert!(flow(&slowed, second) < flow(&both, second));
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```

pub mod cli;
pub mod diagnostic;
pub mod fluid;
pub mod network;
pub mod output;
pub mod part;
pub mod read;
pub mod shift;
pub mod solve;
pub mod study;
pub mod units;

//! Solving a network: the balance of flows at every point and of heads along every line.
//!
//! # Problem
//! Unknowns are a head for each point and a flow for each line. Each line's law is a loss `g(q)` that rises with `q`
//! (pumps enter with a minus sign). Wanted:
//!
//! ```text
//! every point:           flows in - flows out = draw
//! every line in use:     h_from - h_to = g(q)
//! every one-way line:    q >= 0 with the above, or q = 0 with h_from - h_to <= g(0)
//! ```
//!
//! With rising laws this is the optimum of a strictly convex function, so there is at most one such set of flows.
//!
//! # Method
//! 1. Reachability ([`crate::network::Reach`]): draws that nothing can reach, parts cut off, lines that can carry nothing.
//! 2. Leaves are settled by continuity.
//! 3. Fast path: Newton on heads and flows together, one-way lines as an active set; where shut lines cut nodes off that
//!    water must reach, the line that opens first is opened.
//! 4. Where that stalls, the certain path: minimise the co-content in the heads, then finish with 3, changing one-way lines
//!    one at a time.
//! 5. Certificate: all three balances are recomputed from the answer with the plain laws. No certificate, no answer.
//!
//! Drooping head curves break the uniqueness; see [`Solver::balances`].
//!
//! This module knows no names, units, files or clock.

mod bracket;
mod certain;
mod certificate;
mod floating;
mod islands;
mod laws;
mod linear;
mod near;
mod newton;
pub mod operation;
mod outskirts;
mod paths;
mod regulate;
mod response;
pub mod sensitivity;
mod solution;
mod solver;
mod state;
mod supernodal;
mod system;
mod throttles;
mod tolerance;

pub use certificate::Balance;
pub use solution::{Balances, LineState, Regulation, Solution};
pub use solver::{SolveError, Solver};

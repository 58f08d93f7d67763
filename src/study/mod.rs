//! Owns the questions that take many optima to answer: what would have to give, what each requirement costs, what a
//! little more would buy.
//!
//! Invariant: every answer is a change of the question that was really solved; nothing is extrapolated.

mod ladder;
mod lever;
mod prices;
mod relax;
mod room;
mod which;
mod wish;

pub use prices::{Price, Prices, prices};
pub use relax::{Relaxation, Relaxed, relax};
pub use room::{Room, Share, roomiest};

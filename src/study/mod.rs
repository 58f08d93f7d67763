//! Owns the questions that are answered by asking the optimizer several times: second sources, substitutes, why a part
//! stays out; and what the shelf says about a build.
//!
//! Invariant: decides nothing itself. Whether a build passes is the audit's word, which build is best the optimizer's.

pub mod each;
pub mod shelf;
pub mod swap;
pub mod why;

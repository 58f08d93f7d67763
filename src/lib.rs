//! binrail: from rail requirements to a proven bill of materials for a mains-fed linear supply.
#![cfg_attr(test, allow(clippy::unwrap_used))]

pub mod audit;
pub mod build;
pub mod catalogue;
pub mod fault;
pub mod physics;
pub mod supply;
pub mod units;

//! binrail: from rail requirements to a proven bill of materials for a mains-fed linear supply.
#![cfg_attr(test, allow(clippy::unwrap_used))]

pub mod audit;
pub mod build;
pub mod catalogue;
pub mod cli;
pub mod fault;
pub mod optimise;
pub mod physics;
pub mod report;
pub mod saved;
pub mod screen;
pub mod study;
pub mod suggest;
pub mod supply;
pub mod text;
pub mod units;

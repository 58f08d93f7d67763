//! Owns the formulas: pure functions of SI quantities, each with its formula, range and source.
//!
//! Invariant: knows no catalogue, no supply file and no solver, so that each formula can be held against a book's page.

pub mod constants;
pub mod diode;
pub mod raw_section;
pub mod regulator;
pub mod reservoir;
pub mod thermal;
pub mod winding;

//! Owns the supply file: what is to be built.

mod types;

pub use types::*;

//! Owns the catalogue: the parts of a firm, read from its CSV files.

mod parts;

pub use parts::*;

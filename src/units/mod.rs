//! Owns numbers with units: money, and quantities as people write them.

mod money;

pub use money::Money;

//! Owns the limits of the whole build: height, cost, heat, stock.

use super::check::{Check, Corner, Known, Limit};
use crate::catalogue::Part;
use crate::supply::Supply;
use crate::units::Money;

/// Height of one part against the cap, if there is one.
#[must_use]
pub fn height(supply: &Supply, part: &Part) -> Option<Check> {
    let cap = supply.caps.height_m?;
    Some(Check::new(
        Limit::Height,
        None,
        part.height_m.ok_or("height_mm"),
        Ok(cap),
    ))
}

/// Cost of one unit against the cap, if there is one.
#[must_use]
pub fn cost(supply: &Supply, cost: Money) -> Option<Check> {
    Some(Check::new(Limit::Cost, None, Ok(cost.value()), Ok(supply.caps.cost?)))
}

/// Heat of one unit against the cap, if there is one.
#[must_use]
pub fn heat(supply: &Supply, heat_w: Known<f64>) -> Option<Check> {
    Some(Check::new(Limit::Heat, Corner::High, heat_w, Ok(supply.caps.heat_w?)))
}

/// Pieces of a part for the whole run against its stock, if that is limited.
#[must_use]
#[allow(clippy::cast_precision_loss)] // both below 2^53
pub fn stock(supply: &Supply, part: &Part, per_unit: u64) -> Option<Check> {
    let pieces = (per_unit * supply.builds) as f64;
    Some(Check::new(Limit::Stock, None, Ok(pieces), Ok(part.stock? as f64)))
}

//! Owns what may come into question: for each rail the columns (one section with its device) that its own limits allow.
//!
//! Invariant: drops only what the audit would reject, by asking the audit's own functions or by bounds that are proved
//! beside the code; never decides by a rule of its own.

mod bounds;
mod column;
mod prices;
mod reach;
mod shelf;
mod solved;
mod stop;
mod walk;

pub use column::Column;
pub use prices::FloorPrices;
pub use reach::Reach;
pub use shelf::{Must, Shelf};
pub use stop::Stop;
pub use walk::Walk;

/// What is to be least.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Objective {
    /// Cost, then heat.
    Cost,
    /// Heat, then cost.
    Heat,
}

impl Objective {
    /// The word for it in files and reports.
    #[must_use]
    pub fn word(self) -> &'static str {
        match self {
            Objective::Cost => "cost",
            Objective::Heat => "heat",
        }
    }

    /// The other one.
    #[must_use]
    pub fn other(self) -> Objective {
        match self {
            Objective::Cost => Objective::Heat,
            Objective::Heat => Objective::Cost,
        }
    }

    /// Orders a (cost, heat) pair of integers by this objective.
    #[must_use]
    pub fn order(self, cost: i64, heat: i64) -> (i64, i64) {
        match self {
            Objective::Cost => (cost, heat),
            Objective::Heat => (heat, cost),
        }
    }
}

/// Counts of the work done, for -v and for regression guards.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct Counts {
    /// Transformer hook-ups with a path, over all rails.
    pub sources: u64,
    /// Raw sections looked at (source, rectifier, bank).
    pub sections: u64,
    /// Steady states solved.
    pub solves: u64,
    /// Columns handed to the search.
    pub columns: u64,
    /// Nodes of the search.
    pub nodes: u64,
    /// Runs of the integer-programming solver.
    pub solver_calls: u64,
}

impl Counts {
    /// Adds another worker's counts.
    pub fn add(&mut self, other: &Counts) {
        self.sources += other.sources;
        self.sections += other.sections;
        self.solves += other.solves;
        self.columns += other.columns;
        self.nodes += other.nodes;
        self.solver_calls += other.solver_calls;
    }
}

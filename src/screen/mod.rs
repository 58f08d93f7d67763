//! Owns what may come into question: the groups of rails that may share a section, the plans of what a transformer can
//! feed, and for each outlet of a plan the feeds (section, devices, sinks) that their own limits allow.
//!
//! Invariant: drops only what the audit would reject, by asking the audit's own functions or by bounds that are proved
//! beside the code; never decides by a rule of its own.

mod bounds;
mod feed;
mod plan;
mod prices;
mod reach;
mod shelf;
mod solved;
mod stop;
mod walk;

pub use feed::Feed;
pub use plan::{FlowKey, Outlet, Plan, plans};
pub use reach::Group;
pub use shelf::Must;
pub use stop::{Glance, Progress, Stop};
pub use walk::{Apart, Walk, heat_floor};

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

/// What a search adds up: so much for each millionth of the currency and for each microwatt.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Weights {
    /// For each millionth of the currency.
    pub cost: f64,
    /// For each microwatt.
    pub heat: f64,
}

impl Weights {
    /// An objective alone. Scores are then whole numbers, exact below 2^53.
    #[must_use]
    pub fn of(objective: Objective) -> Weights {
        let (cost, heat) = match objective {
            Objective::Cost => (1.0, 0.0),
            Objective::Heat => (0.0, 1.0),
        };
        Weights { cost, heat }
    }

    /// The score of a cost and a heat, or of lower bounds of them.
    #[must_use]
    #[allow(clippy::cast_precision_loss)] // both far below 2^53
    pub fn score(self, cost: i64, heat: i64) -> f64 {
        self.cost * cost as f64 + self.heat * heat as f64
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

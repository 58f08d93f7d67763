//! Owns what a bound is: the least tightness that builds with some parts in common can have at best.

use crate::audit::{Check, Known, Limit};

/// Rounding slack on solved bounds: they may let through what is of no interest, never the reverse.
pub(super) const SLACK: f64 = 1e-8;

/// Upper bound on the least tightness of all builds with some parts in common.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Bound {
    /// By the limits that are judged in any case.
    pub(super) any: f64,
    /// By the limits that are judged unless the section collapses.
    pub(super) held: f64,
}

/// Lower bounds on what a section with a device loses, or the losses themselves; minus infinity: not known.
#[derive(Debug, Clone, Copy)]
pub(super) struct Losses {
    /// In one package of the rectifier.
    pub(super) package_w: f64,
    /// In the device.
    pub(super) pass_w: f64,
}

impl Bound {
    pub(super) const NONE: Bound = Bound {
        any: f64::INFINITY,
        held: f64::INFINITY,
    };

    pub(super) fn and(self, other: Bound) -> Bound {
        Bound {
            any: self.any.min(other.any),
            held: self.held.min(other.held),
        }
    }

    pub(super) fn any(self, check: impl Into<Option<Check>>) -> Bound {
        let tightness = check.into().map_or(f64::INFINITY, |c| c.tightness());
        Bound {
            any: self.any.min(tightness),
            ..self
        }
    }

    pub(super) fn held(self, check: impl Into<Option<Check>>) -> Bound {
        let tightness = check.into().map_or(f64::INFINITY, |c| c.tightness());
        Bound {
            held: self.held.min(tightness),
            ..self
        }
    }

    /// With a value that every build needs: where a cell of it is blank no section is solved, so none collapses, and
    /// limits fail as unknown in any case.
    pub(super) fn knows<T>(self, value: Known<T>) -> Bound {
        match value {
            Ok(_) => self,
            Err(column) => self.any(Check::new(Limit::Collapse, None, Err(column), Ok(1.0))),
        }
    }

    /// Of builds of which a collapsed one has tightness `collapse` (minus infinity: none collapses).
    pub(super) fn least(self, collapse: f64) -> f64 {
        self.any.min(self.held.max(collapse))
    }
}

/// Least and most of something over all parts that state it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Span {
    pub(super) least: f64,
    pub(super) most: f64,
}

/// One end of a span.
#[derive(Debug, Clone, Copy)]
pub(super) enum End {
    Least,
    Most,
}

impl Span {
    pub(super) fn at(self, end: End) -> f64 {
        match end {
            End::Least => self.least,
            End::Most => self.most,
        }
    }

    pub(super) fn over(values: impl Iterator<Item = f64>) -> Option<Span> {
        values.fold(None, |span, value| {
            let span = span.unwrap_or(Span {
                least: value,
                most: value,
            });
            Some(Span {
                least: span.least.min(value),
                most: span.most.max(value),
            })
        })
    }
}

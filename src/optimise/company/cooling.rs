//! Owns what is remembered of junctions: how tight one is with the best sink at some loss, and how much loss a sink bears.
//!
//! Only bounds: a junction falls with the loss, so rounding the loss down rounds tightness up.

use std::cell::{Cell, RefCell};

use super::aisle::{Aisle, Sinks};
use crate::audit::{Check, Corner, rectifier};
use crate::catalogue::Sink;

/// Losses are rounded down to this one times a power of the ratio, and below it to none.
const LEAST_W: f64 = 1e-3;
const RATIO: f64 = 1.003;
/// Above this no part bears anything.
const MOST_W: f64 = 1e7;
/// Bisections of a loss: down to its last digits.
const HALVINGS: u32 = 48;

/// The junctions of all rectifiers and devices of an aisle.
pub(super) struct Cooling<'a, 's> {
    aisle: &'a Aisle<'s, 's>,
    /// By device, by rounded loss; NaN: not worked out.
    best: Vec<RefCell<Vec<f64>>>,
    /// By device, by place among its sinks.
    under_device: Vec<Vec<Cell<Borne>>>,
    under_rectifier: Vec<Vec<Cell<Borne>>>,
}

/// The loss up to which a junction is less tight than `need`.
#[derive(Debug, Clone, Copy)]
struct Borne {
    need: f64,
    loss_w: f64,
}

impl<'a, 's> Cooling<'a, 's> {
    pub(super) fn new(aisle: &'a Aisle<'s, 's>) -> Cooling<'a, 's> {
        let none = Borne {
            need: f64::NEG_INFINITY,
            loss_w: f64::INFINITY,
        };
        let per = |sinks: &Sinks| vec![Cell::new(none); sinks.all.len()];
        Cooling {
            aisle,
            best: aisle.devices.iter().map(|_| RefCell::default()).collect(),
            under_device: aisle.devices.iter().map(|d| per(&d.sinks)).collect(),
            under_rectifier: aisle.rectifiers.iter().map(|d| per(&d.sinks)).collect(),
        }
    }

    /// Junction of a device with that loss.
    pub(super) fn device(&self, device: usize, loss_w: f64, sink: Option<&Sink>) -> Check {
        let stage = &self.aisle.devices[device].stage;
        stage.junction(self.aisle.site, Corner::High, Ok(loss_w), sink)
    }

    /// Junction of a rectifier with that loss of a package.
    pub(super) fn rectifier(&self, rectifier: usize, loss_w: f64, sink: Option<&Sink>) -> Check {
        rectifier::junction(self.aisle.site, self.aisle.rectifiers[rectifier].part, Ok(loss_w), sink)
    }

    /// Upper bound on the tightness of a device's junction, and of what its sink fails by itself, with the best sink.
    pub(super) fn best(&self, device: usize, loss_w: f64) -> f64 {
        if !(0.0..MOST_W).contains(&loss_w) {
            return f64::INFINITY;
        }
        #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // some thousands
        let step = if loss_w < LEAST_W {
            0
        } else {
            1 + ((loss_w / LEAST_W).ln() / RATIO.ln()).floor() as usize
        };
        let mut known = self.best[device].borrow_mut();
        if known.len() <= step {
            known.resize(step + 1, f64::NAN);
        }
        if known[step].is_nan() {
            #[allow(clippy::cast_precision_loss)]
            let rounded_w = if step == 0 {
                0.0
            } else {
                // A step lower, lest the logarithm was rounded up.
                LEAST_W * RATIO.powf(step as f64 - 1.01)
            };
            let alone = self.device(device, rounded_w, None).tightness();
            let sinks = self.aisle.devices[device]
                .sinks
                .best
                .iter()
                .map(|&k| &self.aisle.sinks[k]);
            let with = |s: &super::aisle::Cooler| {
                let junction = self.device(device, rounded_w, Some(s.part)).tightness();
                junction.min(s.own.tightness)
            };
            known[step] = sinks.map(with).fold(alone, f64::max);
        }
        known[step]
    }

    /// Whether a device with that loss can be less tight than `need` on one of its sinks, by place among them.
    pub(super) fn device_bears(&self, device: usize, place: usize, need: f64, loss_w: f64) -> bool {
        let sink = &self.aisle.sinks[self.aisle.devices[device].sinks.all[place]];
        let junction = |w: f64| self.device(device, w, Some(sink.part)).tightness();
        bears(&self.under_device[device][place], need, loss_w, &junction)
    }

    /// The same for a rectifier.
    pub(super) fn rectifier_bears(&self, rectifier: usize, place: usize, need: f64, loss_w: f64) -> bool {
        let sink = &self.aisle.sinks[self.aisle.rectifiers[rectifier].sinks.all[place]];
        let junction = |w: f64| self.rectifier(rectifier, w, Some(sink.part)).tightness();
        bears(&self.under_rectifier[rectifier][place], need, loss_w, &junction)
    }
}

#[allow(clippy::float_cmp)] // the very need that it was worked out for
fn bears(cell: &Cell<Borne>, need: f64, loss_w: f64, junction: &dyn Fn(f64) -> f64) -> bool {
    if loss_w < 0.0 {
        return true;
    }
    let mut borne = cell.get();
    if borne.need != need {
        let (mut low, mut high) = (0.0, MOST_W);
        if junction(high) > need {
            low = f64::INFINITY;
            high = low;
        } else if junction(0.0) <= need {
            high = 0.0;
        } else {
            for _ in 0..HALVINGS {
                let middle = 0.5 * (low + high);
                if junction(middle) > need {
                    low = middle;
                } else {
                    high = middle;
                }
            }
        }
        borne = Borne { need, loss_w: high };
        cell.set(borne);
    }
    loss_w < borne.loss_w
}

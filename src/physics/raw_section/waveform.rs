//! Owns the figures of a periodic state, each worked out when asked for.

use std::f64::consts::SQRT_2;

use super::RawSection;
use super::root::falling;
use super::stretch::{Basis, Integrals, Sum};

/// The steady state: its figures are worked out when asked for. Source currents are those of the rectified pulses.
#[derive(Debug, Clone, Copy)]
pub struct Waveform {
    pub(super) section: RawSection,
    /// Radians of a period of the raw voltage.
    pub(super) period: f64,
    pub(super) reactance: f64,
    pub(super) off_decay: f64,
    pub(super) pulse: Option<Pulse>,
    pub(super) integrals: Integrals,
}

/// A pulse of conduction: what the voltages and currents do in it.
#[derive(Debug, Clone, Copy)]
pub(super) struct Pulse {
    /// Radians of conduction.
    pub(super) length: f64,
    /// Decay of the exponential part, per radian.
    pub(super) decay: f64,
    /// Slope at the start, per radian, of the capacitor voltage at which current would start.
    pub(super) rise: f64,
    /// Source current.
    pub(super) current: Sum,
    /// Capacitor voltage.
    pub(super) stored: Sum,
    /// Raw voltage.
    pub(super) raw: Sum,
}

/// Steps below this leave angles that are exact but for rounding, since the next step would be its square.
pub(super) const SETTLED_RAD: f64 = 1e-9;

impl Waveform {
    /// Lowest raw voltage: where conduction starts, or behind it while the load still takes more than the source gives.
    #[must_use]
    pub fn valley_v(&self) -> f64 {
        let Some(p) = &self.pulse else { return self.open_v() };
        if p.raw.slope_at_start(p.decay) >= 0.0 {
            return p.raw.one;
        }
        // The voltage rises where the current crests; the middle of the pulse mostly shows it, and saves that root.
        let middle = 0.5 * p.length;
        let rising = if p.raw.slopes(&p.point(middle)).0 > 0.0 {
            middle
        } else {
            p.crest_at()
        };
        p.raw.one.min(p.raw.at(&p.point(p.flat(p.raw, 0.0, rising, -1.0))))
    }

    /// Highest raw voltage.
    #[must_use]
    pub fn peak_v(&self) -> f64 {
        let Some(p) = &self.pulse else { return self.open_v() };
        p.raw.at(&p.point(p.flat(p.raw, p.crest_at(), p.length, 1.0)))
    }

    /// Peak-to-peak ripple of the raw voltage.
    #[must_use]
    pub fn ripple_v(&self) -> f64 {
        self.peak_v() - self.valley_v()
    }

    /// Mean raw voltage.
    #[must_use]
    pub fn mean_v(&self) -> f64 {
        let Some(p) = &self.pulse else { return self.open_v() };
        let s = &self.section;
        // While off, the capacitor's voltage decays exponentially (straight, without conductance).
        let spread = 1.0 + s.bank_esr_ohm * s.load_s;
        let (rest, lost) = (self.rest(p), self.off_decay * self.rest(p));
        let steady = s.load_a * self.reactance / spread;
        let stored = (p.stored_at_end() * decay_mean(lost) - steady * rest * decay_mean_of_mean(lost)) * rest;
        (self.integrals.of(p.raw) + (stored - s.bank_esr_ohm * s.load_a * rest) / spread) / self.period
    }

    /// Mean rectified source current.
    #[must_use]
    pub fn source_mean_a(&self) -> f64 {
        self.pulse.map_or(0.0, |p| self.integrals.of(p.current) / self.period)
    }

    /// Its rms.
    #[must_use]
    pub fn source_rms_a(&self) -> f64 {
        self.pulse.map_or(0.0, |p| {
            (self.integrals.of_square(p.current).max(0.0) / self.period).sqrt()
        })
    }

    /// Its crest.
    #[must_use]
    pub fn source_peak_a(&self) -> f64 {
        self.pulse.map_or(0.0, |p| p.current.at(&p.point(p.crest_at())))
    }

    /// Rms current in the bank.
    #[must_use]
    pub fn reservoir_rms_a(&self) -> f64 {
        let Some(p) = &self.pulse else { return 0.0 };
        let s = &self.section;
        let load = Sum {
            one: s.load_a,
            sin: 0.0,
            cos: 0.0,
            exp: 0.0,
        }
        .mix(1.0, p.raw, s.load_s);
        let charging = p.current.mix(1.0, load, -1.0);
        // While off, the bank carries the load current, which decays as the voltage does.
        let rest = self.rest(p);
        let spread = 1.0 + s.bank_esr_ohm * s.load_s;
        let load_at_end = (s.load_a + s.load_s * p.stored_at_end()) / spread;
        let off = load_at_end * load_at_end * rest * decay_mean(2.0 * self.off_decay * rest);
        ((self.integrals.of_square(charging) + off).max(0.0) / self.period).sqrt()
    }

    /// Length of one pulse in radians of the mains period.
    #[must_use]
    pub fn conduction_rad(&self) -> f64 {
        self.pulse.map_or(0.0, |p| p.length)
    }

    /// Without load: the crest less the drop.
    fn open_v(&self) -> f64 {
        SQRT_2 * self.section.source_rms_v - self.section.drop_v
    }

    fn rest(&self, pulse: &Pulse) -> f64 {
        self.period - pulse.length
    }
}

impl Pulse {
    fn point(&self, x: f64) -> Basis {
        Basis::new(x, self.decay)
    }

    fn stored_at_end(&self) -> f64 {
        self.stored.at(&self.point(self.length))
    }

    /// Where the current is highest.
    fn crest_at(&self) -> f64 {
        if self.current.slope_at_start(self.decay) > 0.0 {
            self.flat(self.current, 0.0, self.length, 1.0)
        } else {
            0.0
        }
    }

    /// Where a quantity stops to rise (`sign` 1) or to fall (-1) between two angles after the start.
    fn flat(&self, quantity: Sum, low: f64, high: f64, sign: f64) -> f64 {
        falling(low, high, 0.5 * (low + high), SETTLED_RAD, |x| {
            let (first, second) = quantity.slopes(&Basis::new(x, self.decay));
            (sign * first, sign * second)
        })
    }
}

/// Below this decay the closed forms lose more digits than their series drop.
const SMALL_DECAY: f64 = 1e-3;

/// Mean of e^-x over x from 0 to z: (1 - e^-z)/z.
pub(super) fn decay_mean(z: f64) -> f64 {
    if z < SMALL_DECAY {
        1.0 - z / 2.0 * (1.0 - z / 3.0 * (1.0 - z / 4.0 * (1.0 - z / 5.0)))
    } else {
        -(-z).exp_m1() / z
    }
}

/// (z - 1 + e^-z)/z^2: what a constant drain takes off the mean of a decaying voltage.
fn decay_mean_of_mean(z: f64) -> f64 {
    if z < SMALL_DECAY {
        0.5 * (1.0 - z / 3.0 * (1.0 - z / 4.0 * (1.0 - z / 5.0 * (1.0 - z / 6.0))))
    } else {
        (z + (-z).exp_m1()) / (z * z)
    }
}

//! Owns the raw section's periodic steady state: winding, rectifier, reservoir, load.
//!
//! The circuit is linear between the two instants at which conduction starts and ends, so everything but these two
//! angles is closed form. The state is one voltage and its trajectories cannot cross, so the map of that voltage over
//! one period rises with slope below 1: the periodic state is the single root of "voltage after a period minus voltage
//! before", that is of the charge balance, and the slope of that map (e^-(losses)) is known exactly for Newton's step.
//!
//! Invariant: no time stepping; no solution with a raw voltage >= 0 is an answer (`None`: the section collapses).
//!
//! Source: the circuit is that of O. H. Schade, "Analysis of Rectifier Operation", Proc. IRE 31 (1943) 341-361, with
//! a reservoir of finite capacitance and series resistance and a load of constant current and conductance.

use std::f64::consts::{FRAC_PI_2, PI, SQRT_2};

use super::root::falling;
use super::stretch::{Integrals, Sum};

/// Everything that the steady state depends on.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RawSection {
    /// Open-circuit voltage of the winding (of one half for centre-tap), rms of the sine with the same crest, volts; > 0.
    pub source_rms_v: f64,
    /// Mains frequency, hertz; > 0.
    pub mains_hz: f64,
    /// `true`: a pulse every half period (bridge, centre-tap, dual); `false`: one per period (half-wave).
    pub full_wave: bool,
    /// Series resistance of winding and diode slopes, ohms; >= 0.
    pub series_ohm: f64,
    /// Sum of the thresholds of the diodes in the path, volts; >= 0.
    pub drop_v: f64,
    /// Capacitance of the whole bank, farads; > 0.
    pub bank_f: f64,
    /// Series resistance of the whole bank, ohms; >= 0.
    pub bank_esr_ohm: f64,
    /// Constant part of the load current, amperes.
    pub load_a: f64,
    /// Conductive part of the load, siemens; >= 0.
    pub load_s: f64,
}

/// What the steady state looks like. Currents of the source are those of the rectified pulses.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Waveform {
    /// Lowest raw voltage.
    pub valley_v: f64,
    /// Highest raw voltage.
    pub peak_v: f64,
    /// Mean raw voltage.
    pub mean_v: f64,
    /// Mean rectified source current.
    pub source_mean_a: f64,
    /// Its rms.
    pub source_rms_a: f64,
    /// Its crest.
    pub source_peak_a: f64,
    /// Rms current in the bank.
    pub reservoir_rms_a: f64,
    /// Length of one pulse in radians of the mains period.
    pub conduction_rad: f64,
}

impl Waveform {
    /// Peak-to-peak ripple of the raw voltage.
    #[must_use]
    pub fn ripple_v(&self) -> f64 {
        self.peak_v - self.valley_v
    }
}

/// A pulse of conduction: where it starts, what the voltages and currents do in it.
struct Pulse {
    /// Radians of conduction.
    length: f64,
    /// Decay of the exponential part, per radian.
    decay: f64,
    /// Source current.
    current: Sum,
    /// Capacitor voltage.
    stored: Sum,
    /// Raw voltage.
    raw: Sum,
}

/// The steady state, or `None` when there is none with a raw voltage >= 0 (the section collapses).
///
/// Formula: with v_s = sqrt 2 `source_rms_v` |sin wt|, on: i `series_ohm` = v_s - `drop_v` - v, i > 0; off: i = 0;
/// C dv_C/dt = i - i_L, v = v_C + ESR (i - i_L), i_L = `load_a` + `load_s` v.
/// Valid for: any values of the stated signs. Accuracy: charge balance to 1e-9 relative, figures to about 1e-10.
/// A section without load sits at the crest less the drop, with no current.
/// Source: module head.
///
/// # Examples
/// Full wave, w C R_L = 20, R_s/R_L = 5 %: V_dc/V_pk = 0.8281, I_rms/I_dc = 1.788 (exact Schade grid):
/// ```
/// use binrail::physics::raw_section::{RawSection, steady_state};
/// let hz = 50.0;
/// let section = RawSection {
///     source_rms_v: 0.5_f64.sqrt(), mains_hz: hz, full_wave: true, series_ohm: 0.05, drop_v: 0.0,
///     bank_f: 20.0 / (std::f64::consts::TAU * hz), bank_esr_ohm: 0.0, load_a: 0.0, load_s: 1.0,
/// };
/// let wave = steady_state(&section).expect("does not collapse");
/// assert!((wave.mean_v - 0.8281).abs() < 5e-5);
/// assert!((wave.source_rms_a / wave.mean_v - 1.788).abs() < 5e-4);
/// ```
#[must_use]
pub fn steady_state(section: &RawSection) -> Option<Waveform> {
    Solver::new(section).solve()
}

/// The section's constants in radians of the mains and in the form that the pulse needs.
struct Solver<'a> {
    section: &'a RawSection,
    crest: f64,
    period: f64,
    /// 1/(w C).
    reactance: f64,
    /// 1 + ESR G.
    spread: f64,
    /// Loop resistance that limits the current: R (1 + ESR G) + ESR; 0: the source clamps the capacitor.
    loop_ohm: f64,
    /// Decay per radian during conduction, and its forcing amplitude factor.
    decay: f64,
    /// Decay per radian of the capacitor while the load alone discharges it.
    off_decay: f64,
}

impl<'a> Solver<'a> {
    fn new(section: &'a RawSection) -> Self {
        let s = section;
        let spread = 1.0 + s.bank_esr_ohm * s.load_s;
        let loop_ohm = s.series_ohm * spread + s.bank_esr_ohm;
        let reactance = 1.0 / (2.0 * PI * s.mains_hz * s.bank_f);
        let decay = if loop_ohm > 0.0 {
            reactance * (1.0 + s.load_s * s.series_ohm) / loop_ohm
        } else {
            0.0
        };
        Solver {
            section,
            crest: SQRT_2 * s.source_rms_v,
            period: if s.full_wave { PI } else { 2.0 * PI },
            reactance,
            spread,
            loop_ohm,
            decay,
            off_decay: s.load_s * reactance / spread,
        }
    }

    fn solve(&self) -> Option<Waveform> {
        let s = self.section;
        let open = self.crest - s.drop_v;
        if open <= 0.0 {
            return None;
        }
        if s.load_a + s.load_s * open <= 0.0 {
            return Some(Waveform {
                valley_v: open,
                peak_v: open,
                mean_v: open,
                source_mean_a: 0.0,
                source_rms_a: 0.0,
                source_peak_a: 0.0,
                reservoir_rms_a: 0.0,
                conduction_rad: 0.0,
            });
        }
        // Conduction starts where the rising source meets a raw voltage >= 0, and before the crest: a start behind it
        // could not bring back the charge that a period takes.
        let first = (s.drop_v / self.crest).asin();
        if self.surplus(first).0 < 0.0 {
            return None;
        }
        let start = falling(first, FRAC_PI_2, self.guess(first), |angle| self.surplus(angle));
        let wave = self.figures(start);
        (wave.valley_v >= 0.0).then_some(wave)
    }

    /// Start angle if the bank were discharged for the whole period by the load at the crest: close, and cheap.
    fn guess(&self, first: f64) -> f64 {
        let s = self.section;
        let load = s.load_a + s.load_s * (self.crest - s.drop_v);
        let level = 1.0 - load * (self.reactance * 0.75 * self.period + 2.0 * self.loop_ohm) / self.crest;
        level.clamp(-1.0, 1.0).asin().clamp(first, FRAC_PI_2)
    }

    /// Capacitor voltage at which current starts or ends at this angle: there i = 0 and the raw voltage is the source's.
    fn edge(&self, angle: f64) -> f64 {
        let s = self.section;
        self.spread * (self.crest * angle.sin() - s.drop_v) + s.bank_esr_ohm * s.load_a
    }

    /// Charge balance of a period that starts to conduct at `start`, as a capacitor voltage: after minus before; and
    /// its slope. Falls with `start`. Below zero also when the voltage cannot even be held up during the pulse.
    fn surplus(&self, start: f64) -> (f64, f64) {
        let before = self.edge(start);
        let rise = self.spread * self.crest * start.cos();
        let pulse = self.pulse(start);
        let Some(pulse) = pulse else {
            return (-self.crest, -self.crest);
        };
        let rest = self.period - pulse.length;
        // Gain and loss apart from the voltage itself: their difference keeps its digits when the ripple is tiny.
        let gain = Sum {
            one: 0.0,
            ..pulse.stored
        }
        .at(pulse.length, pulse.decay);
        let loss = self.discharge(before + gain, rest);
        let after = before + gain - loss;
        let leak_before = -self.load_slope(before);
        let leak_after = -self.load_slope(after);
        let kept = (-self.off_decay * rest).exp()
            * if self.loop_ohm > 0.0 {
                (-pulse.decay * pulse.length).exp()
            } else {
                // The clamp forgets the start: what is kept hangs on the end angle, which does not move.
                0.0
            };
        (gain - loss, kept * (rise - leak_before) + leak_after - rise)
    }

    /// Rate per radian at which the load alone lowers a capacitor voltage.
    fn load_slope(&self, stored: f64) -> f64 {
        (self.section.load_a + self.section.load_s * stored) * self.reactance / self.spread
    }

    /// What the load alone takes off a capacitor voltage in `length` radians.
    fn discharge(&self, stored: f64, length: f64) -> f64 {
        let steady = self.section.load_a * self.reactance / self.spread;
        let lost = self.off_decay * length;
        steady * length * decay_mean(lost) - stored * (-lost).exp_m1()
    }

    /// The pulse that starts at `start`; `None` when the current has not ended at the source's zero (the raw voltage
    /// has then fallen below zero).
    fn pulse(&self, start: f64) -> Option<Pulse> {
        let s = self.section;
        let (sin, cos) = start.sin_cos();
        let source = Sum {
            one: self.crest * sin - s.drop_v,
            sin: self.crest * cos,
            cos: self.crest * sin,
            exp: 0.0,
        };
        let pulse = if self.loop_ohm > 0.0 {
            let beta = self.reactance / self.loop_ohm;
            let a = self.decay;
            let k = beta * self.crest / (1.0 + a * a);
            // Forced solution k (a sin - cos) + constant, written around the start of the pulse. The exponential part
            // follows from the known slope there (the load alone), and the current from C dv_C/dt + i_L: as differences
            // of voltages both would lose their digits where the loop resistance is small.
            let leak = self.reactance * (s.load_a + s.load_s * source.one);
            let stored = Sum {
                one: self.edge(start),
                sin: k * (a * cos + sin),
                cos: k * (a * sin - cos),
                exp: (k * (a * cos + sin) + leak) / a,
            };
            let charging = Sum {
                one: 0.0,
                sin: -stored.cos,
                cos: stored.sin,
                exp: -a * stored.exp,
            };
            let share = 1.0 / (1.0 + s.load_s * s.series_ohm);
            let mut current = charging.mix(share / self.reactance, source, share * s.load_s);
            current.one = 0.0; // by definition of the start
            let raw = source.mix(1.0, current, -s.series_ohm);
            Pulse {
                length: 0.0,
                decay: a,
                current,
                stored,
                raw,
            }
        } else {
            // No resistance at all: the capacitor follows the source, and the current is its charging plus the load.
            let charging = Sum {
                one: self.crest * cos / self.reactance,
                sin: -self.crest * sin / self.reactance,
                cos: self.crest * cos / self.reactance,
                exp: 0.0,
            };
            let mut current = charging.mix(1.0, source, s.load_s);
            current.one += s.load_a;
            Pulse {
                length: 0.0,
                decay: 0.0,
                current,
                stored: source,
                raw: source,
            }
        };
        let longest = PI - start;
        if pulse.current.at(longest, pulse.decay) > 0.0 {
            return None;
        }
        let length = if self.loop_ohm > 0.0 {
            // i(0) = 0 is no end of the pulse: divide it out.
            falling(0.0, longest, PI - 2.0 * start, |x| {
                if x <= 0.0 {
                    return (pulse.current.slope_at_start(pulse.decay), -1.0);
                }
                let value = pulse.current.at(x, pulse.decay) / x;
                (value, (pulse.current.slopes(x, pulse.decay).0 - value) / x)
            })
        } else {
            falling(0.0, longest, FRAC_PI_2 - start, |x| {
                (pulse.current.at(x, 0.0), pulse.current.slopes(x, 0.0).0)
            })
        };
        Some(Pulse { length, ..pulse })
    }

    fn figures(&self, start: f64) -> Waveform {
        let s = self.section;
        let Some(pulse) = self.pulse(start) else {
            // Cannot be: the root lies where the surplus is not negative, and there the pulse ends.
            return Waveform {
                valley_v: -1.0,
                peak_v: 0.0,
                mean_v: 0.0,
                source_mean_a: 0.0,
                source_rms_a: 0.0,
                source_peak_a: 0.0,
                reservoir_rms_a: 0.0,
                conduction_rad: 0.0,
            };
        };
        let (a, length) = (pulse.decay, pulse.length);
        let integrals = Integrals::new(length, a);
        let rest = self.period - length;

        // Crest of the current, then the extremes of the raw voltage on either side of it.
        let zero_slope = |f: Sum, low: f64, high: f64, sign: f64| {
            falling(low, high, 0.5 * (low + high), |x| {
                let (first, second) = f.slopes(x, a);
                (sign * first, sign * second)
            })
        };
        let crest_at = if pulse.current.slope_at_start(a) > 0.0 {
            zero_slope(pulse.current, 0.0, length, 1.0)
        } else {
            0.0
        };
        let at_start = pulse.raw.one;
        let valley_v = if pulse.raw.slope_at_start(a) < 0.0 && crest_at > 0.0 {
            at_start.min(pulse.raw.at(zero_slope(pulse.raw, 0.0, crest_at, -1.0), a))
        } else {
            at_start
        };
        let peak_v = pulse.raw.at(zero_slope(pulse.raw, crest_at, length, 1.0), a);

        // While off, voltage and load current decay exponentially (or the voltage falls straight, without conductance).
        let stored_at_end = pulse.stored.at(length, a);
        let load_at_end = (s.load_a + s.load_s * stored_at_end) / self.spread;
        let lost = self.off_decay * rest;
        let load_square = load_at_end * load_at_end * rest * decay_mean(2.0 * lost);
        let steady = s.load_a * self.reactance / self.spread;
        let stored_off = (stored_at_end * decay_mean(lost) - steady * rest * decay_mean_of_mean(lost)) * rest;
        let raw_off = (stored_off - s.bank_esr_ohm * s.load_a * rest) / self.spread;

        let load = Sum {
            one: s.load_a,
            sin: 0.0,
            cos: 0.0,
            exp: 0.0,
        }
        .mix(1.0, pulse.raw, s.load_s);
        let charging = pulse.current.mix(1.0, load, -1.0);
        let per_period = 1.0 / self.period;
        Waveform {
            valley_v,
            peak_v,
            mean_v: (integrals.of(pulse.raw) + raw_off) * per_period,
            source_mean_a: integrals.of(pulse.current) * per_period,
            source_rms_a: (integrals.of_square(pulse.current).max(0.0) * per_period).sqrt(),
            source_peak_a: pulse.current.at(crest_at, a),
            reservoir_rms_a: ((integrals.of_square(charging) + load_square).max(0.0) * per_period).sqrt(),
            conduction_rad: length,
        }
    }
}

/// Below this decay the closed forms lose more digits than their series drop.
const SMALL_DECAY: f64 = 1e-3;

/// Mean of e^-x over x from 0 to z: (1 - e^-z)/z.
fn decay_mean(z: f64) -> f64 {
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

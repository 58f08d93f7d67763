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
use super::stretch::{Basis, Integrals, Sum};

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

/// The steady state: its figures are worked out when asked for. Source currents are those of the rectified pulses.
#[derive(Debug, Clone, Copy)]
pub struct Waveform {
    section: RawSection,
    /// Radians of a period of the raw voltage.
    period: f64,
    reactance: f64,
    off_decay: f64,
    pulse: Option<Pulse>,
    integrals: Integrals,
}

/// A pulse of conduction: what the voltages and currents do in it.
#[derive(Debug, Clone, Copy)]
struct Pulse {
    /// Radians of conduction.
    length: f64,
    /// Decay of the exponential part, per radian.
    decay: f64,
    /// Slope at the start, per radian, of the capacitor voltage at which current would start.
    rise: f64,
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
/// assert!((wave.mean_v() - 0.8281).abs() < 5e-5);
/// assert!((wave.source_rms_a() / wave.mean_v() - 1.788).abs() < 5e-4);
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
            return Some(self.waveform(None));
        }
        // Conduction starts where the rising source meets a raw voltage >= 0, and before the crest: a start behind it
        // could not bring back the charge that a period takes.
        let first = (s.drop_v / self.crest).asin();
        let guess = self.guess(first);
        let pulse = match self.both_angles(first, guess) {
            Some(pulse) => pulse,
            None if self.surplus(first).0 < 0.0 => return None,
            None => self.pulse(falling(first, FRAC_PI_2, guess, 0.0, |angle| self.surplus(angle)))?,
        };
        let wave = self.waveform(Some(pulse));
        (wave.valley_v() >= 0.0).then_some(wave)
    }

    fn waveform(&self, pulse: Option<Pulse>) -> Waveform {
        Waveform {
            section: *self.section,
            period: self.period,
            reactance: self.reactance,
            off_decay: self.off_decay,
            pulse,
            integrals: pulse.map_or(Integrals::new(0.0, 0.0), |p| Integrals::new(p.length, p.decay)),
        }
    }

    /// Start angle from two rules of thumb: narrow pulses of a stiff voltage, and a bank that the load discharges.
    fn guess(&self, first: f64) -> f64 {
        let s = self.section;
        let load = s.load_a + s.load_s * (self.crest - s.drop_v);
        let half_pulse = (1.5 * self.period * self.loop_ohm * load / self.crest).cbrt().min(1.4);
        let discharge = 0.75 * load * self.reactance * (self.period - half_pulse) / self.crest;
        (half_pulse.cos() - discharge)
            .clamp(-1.0, 1.0)
            .asin()
            .clamp(first, FRAC_PI_2)
    }

    /// Newton's steps on start and end of the pulse at once; `None` where they leave their range or do not settle (the
    /// bracketed root then decides, also whether the section collapses).
    ///
    /// The end hardly moves the balance (there the current is zero, so charging and mere discharge agree), so the start
    /// has a step of its own; how the end follows it is known from how fast trajectories close up.
    fn both_angles(&self, first: f64, guess: f64) -> Option<Pulse> {
        if self.loop_ohm <= 0.0 {
            return None;
        }
        let mut start = guess;
        let mut end = (FRAC_PI_2 + 0.5 * (FRAC_PI_2 - start)).min(PI);
        for _ in 0..MOST_NEWTON_STEPS {
            let pulse = Pulse {
                length: end - start,
                ..self.opened(start)
            };
            let at_end = Basis::new(pulse.length, pulse.decay);
            let (balance, slope) = self.balance(&pulse, &at_end);
            let current = pulse.current.at(&at_end);
            let current_slope = pulse.current.slopes(&at_end).0;
            let by_start = -(1.0 + at_end.exp) * pulse.current.slope_at_start(pulse.decay);
            let start_step = -balance / slope;
            let end_step = -(current + by_start * start_step) / current_slope;
            let settled = start_step.abs() <= SETTLED_RAD && end_step.abs() <= SETTLED_RAD;
            start += start_step;
            end += end_step;
            if !(start > first && start < FRAC_PI_2 && end > FRAC_PI_2 && end < PI) {
                return None;
            }
            if settled {
                return Some(Pulse {
                    length: end - start,
                    ..self.opened(start)
                });
            }
        }
        None
    }

    /// Capacitor voltage at which current starts or ends at this angle: there i = 0 and the raw voltage is the source's.
    fn edge(&self, angle: f64) -> f64 {
        let s = self.section;
        self.spread * (self.crest * angle.sin() - s.drop_v) + s.bank_esr_ohm * s.load_a
    }

    /// Charge balance of a period that starts to conduct at `start`, as a capacitor voltage: after minus before; and
    /// its slope. Falls with `start`. Below zero also when the voltage cannot even be held up during the pulse.
    fn surplus(&self, start: f64) -> (f64, f64) {
        self.pulse(start).map_or((-self.crest, -self.crest), |pulse| {
            self.balance(&pulse, &Basis::new(pulse.length, pulse.decay))
        })
    }

    /// The same for a pulse whose length is known.
    fn balance(&self, pulse: &Pulse, at_end: &Basis) -> (f64, f64) {
        let before = pulse.stored.one;
        let rest = self.period - pulse.length;
        // Gain and loss apart from the voltage itself: their difference keeps its digits when the ripple is tiny.
        let gain = Sum {
            one: 0.0,
            ..pulse.stored
        }
        .at(at_end);
        let loss = self.discharge(before + gain, rest);
        let after = before + gain - loss;
        let leak_before = -self.load_slope(before);
        let leak_after = -self.load_slope(after);
        // The clamp of a section without resistance forgets the start: what is kept hangs on its end, which stays.
        let kept = if self.loop_ohm > 0.0 {
            (-self.off_decay * rest).exp() * (1.0 + at_end.exp)
        } else {
            0.0
        };
        (gain - loss, kept * (pulse.rise - leak_before) + leak_after - pulse.rise)
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

    /// What voltages and currents do from `start` on, for as long as current flows.
    fn opened(&self, start: f64) -> Pulse {
        let s = self.section;
        let (sin, cos) = start.sin_cos();
        let source = Sum {
            one: self.crest * sin - s.drop_v,
            sin: self.crest * cos,
            cos: self.crest * sin,
            exp: 0.0,
        };
        if self.loop_ohm > 0.0 {
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
                rise: self.spread * self.crest * cos,
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
                rise: self.spread * self.crest * cos,
                current,
                stored: source,
                raw: source,
            }
        }
    }

    /// The pulse that starts at `start`; `None` when the current has not ended at the source's zero (the raw voltage
    /// has then fallen below zero).
    fn pulse(&self, start: f64) -> Option<Pulse> {
        let pulse = self.opened(start);
        let longest = PI - start;
        if pulse.current.at(&Basis::new(longest, pulse.decay)) > 0.0 {
            return None;
        }
        let length = if self.loop_ohm > 0.0 {
            // i(0) = 0 is no end of the pulse: divide it out.
            falling(0.0, longest, PI - 2.0 * start, 0.0, |x| {
                if x <= 0.0 {
                    return (pulse.current.slope_at_start(pulse.decay), -1.0);
                }
                let here = Basis::new(x, pulse.decay);
                let value = pulse.current.at(&here) / x;
                (value, (pulse.current.slopes(&here).0 - value) / x)
            })
        } else {
            falling(0.0, longest, FRAC_PI_2 - start, 0.0, |x| {
                let here = Basis::new(x, 0.0);
                (pulse.current.at(&here), pulse.current.slopes(&here).0)
            })
        };
        Some(Pulse { length, ..pulse })
    }
}

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

/// Newton's steps on both angles settle in four to seven; more means a guess too far off.
const MOST_NEWTON_STEPS: u32 = 12;
/// Steps below this leave angles that are exact but for rounding, since the next step would be its square.
const SETTLED_RAD: f64 = 1e-9;

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

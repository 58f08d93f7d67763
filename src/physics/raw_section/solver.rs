//! Owns the way to the periodic state: Newton's steps on both angles of a pulse, or one bracketed root.

use std::f64::consts::{FRAC_PI_2, PI, SQRT_2};

use super::RawSection;
use super::root::falling;
use super::stretch::{Basis, Integrals, Sum};
use super::waveform::{Pulse, SETTLED_RAD, Waveform, decay_mean};

/// Newton's steps on both angles settle in four to seven; more means a guess too far off.
const MOST_NEWTON_STEPS: u32 = 12;
/// The section's constants in radians of the mains and in the form that the pulse needs.
pub(super) struct Solver<'a> {
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
    pub(super) fn new(section: &'a RawSection) -> Self {
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

    pub(super) fn solve(&self) -> Option<Waveform> {
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
        // During the pulse the load alone lowers the voltage at most by this; mostly that settles it without the valley.
        let most_lost = self.load_slope(pulse.stored.one).max(0.0) * pulse.length;
        (pulse.raw.one > most_lost || wave.valley_v() >= 0.0).then_some(wave)
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

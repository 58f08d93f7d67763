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

mod root;
mod solver;
mod stretch;
mod waveform;

pub use waveform::Waveform;

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
    solver::Solver::new(section).solve()
}

//! The formulas and the solver against numbers that others printed. On one side stands the project's function, on the
//! other a published number with its source.
//!
//! "Seen": data or formula, and where stated the result, stood in a public text; a companion is worked code for a
//! textbook's examples. "From memory" and "common practice" are said where they apply; "exact" values were computed
//! for the same circuit by other means. What tests/raw_section.rs and the doc tests hold is not repeated here.
//! Tolerances: closed forms 1e-9, printed numbers their last digit, rules of thumb 10 %.
#![allow(clippy::unwrap_used)]

mod common;

use std::f64::consts::{PI, SQRT_2, TAU};

use binrail::audit::transformer::winding_rms_a;
use binrail::audit::{Site, rectifier, reservoir};
use binrail::catalogue::{Catalogue, SavedPart, Slot, from_cells};
use binrail::physics::constants::HALF_WAVE_RIPPLE;
use binrail::physics::raw_section::{RawSection, Waveform, steady_state};
use binrail::physics::regulator::{dissipation_w, output_ripple_v};
use binrail::physics::reservoir::{hot_c, life_h};
use binrail::physics::thermal::sink_rise_k;
use binrail::physics::winding::{WindingLoad, copper_ohm, open_circuit_v, series_ohm};
use binrail::supply::{Path, Supply, from_json};
use binrail::units::{Dimension, Measure, Range};
use common::assert_close;
use serde_json::{Value, json};

const CLOSED: f64 = 1e-9;
const RULE: f64 = 0.1;

/// Agrees to the last digit that is printed: within half of it.
#[track_caller]
fn printed(what: &str, got: f64, text: &str) {
    let wanted: f64 = text.parse().unwrap();
    let decimals = text.split_once('.').map_or(0, |(_, d)| d.len());
    let half = 0.5 * 10_f64.powi(-i32::try_from(decimals).unwrap());
    assert!(
        (got - wanted).abs() <= half * (1.0 + 1e-9),
        "{what}: got {got}, printed {text}"
    );
}

/// A rule that errs upwards, by no more than a rule of thumb may.
#[track_caller]
fn rule_above(what: &str, exact: f64, rule: f64) {
    assert!(exact <= rule, "{what}: {exact} is above the rule's {rule}");
    assert_close(what, exact, rule, RULE);
}

// ---- 1 Peak rectifier with capacitor

/// Ideal diodes, no series resistance; the crest is that behind the diodes, as the textbooks take it.
#[derive(Clone, Copy)]
struct Peak {
    crest_v: f64,
    hz: f64,
    pulses: u32,
    farad: f64,
    load_a: f64,
    load_s: f64,
}

impl Peak {
    fn resistive(crest_v: f64, hz: f64, pulses: u32, farad: f64, load_ohm: f64) -> Peak {
        let (load_a, load_s) = (0.0, 1.0 / load_ohm);
        Peak {
            crest_v,
            hz,
            pulses,
            farad,
            load_a,
            load_s,
        }
    }

    fn constant(crest_v: f64, hz: f64, farad: f64, load_a: f64) -> Peak {
        Peak {
            crest_v,
            hz,
            pulses: 2,
            farad,
            load_a,
            load_s: 0.0,
        }
    }

    fn solve(self) -> Waveform {
        steady_state(&RawSection {
            source_rms_v: self.crest_v / SQRT_2,
            mains_hz: self.hz,
            full_wave: self.pulses == 2,
            series_ohm: 0.0,
            drop_v: 0.0,
            bank_f: self.farad,
            bank_esr_ohm: 0.0,
            load_a: self.load_a,
            load_s: self.load_s,
        })
        .unwrap()
    }
}

/// Mean source current while the diodes conduct.
fn while_conducting_a(w: &Waveform, pulses: u32) -> f64 {
    w.source_mean_a() * TAU / f64::from(pulses) / w.conduction_rad()
}

/// Source: Sedra & Smith, Microelectronic Circuits, 5th ed., example 3.9, half-wave (data and formula seen in a
/// companion, results from memory). Ripple, peak current and mean: tests/raw_section.rs.
#[test]
fn sedra_half_wave_example_3_9() {
    let w = Peak::resistive(100.0, 60.0, 1, 1.0 / (60.0 * 10e3 * 0.02), 10e3).solve();
    printed("conduction, exact", w.conduction_rad(), "0.1994");
    printed(
        "share of the cycle in %, exact",
        100.0 * w.conduction_rad() / TAU,
        "3.173",
    );
    printed(
        "mean while conducting in mA, exact",
        1e3 * while_conducting_a(&w, 1),
        "312.1",
    );
    rule_above("conduction, book", w.conduction_rad(), 0.2);
    rule_above("share of the cycle, book", 100.0 * w.conduction_rad() / TAU, 3.18);
    rule_above("mean while conducting, book", 1e3 * while_conducting_a(&w, 1), 324.0);
}

/// Source: Sedra & Smith, exercise behind example 3.9, bridge: 12 V rms, 60 Hz, 100 ohm, 0.8 V per diode (from
/// memory; a homework page works the same data, seen: 15.370 V crest).
#[test]
fn sedra_bridge_exercise() {
    let w = Peak::resistive(15.3706, 60.0, 2, 1280.9e-6, 100.0).solve();
    printed("ripple, exact", w.ripple_v(), "0.8642");
    printed("conduction, exact", w.conduction_rad(), "0.3576");
    printed("mean while conducting, exact", while_conducting_a(&w, 2), "1.313");
    printed("peak current, exact", w.source_peak_a(), "2.599");
    printed("V_dc, exact", w.mean_v(), "14.95");
    assert!(w.ripple_v() < 1.0, "the book's ripple is an upper bound");
    rule_above("conduction, book", w.conduction_rad(), 0.36);
    rule_above("conduction in degrees, book", w.conduction_rad().to_degrees(), 20.7);
    rule_above("mean while conducting, book", while_conducting_a(&w, 2), 1.45);
    rule_above("peak current, book", w.source_peak_a(), 2.74);
    assert_close("V_dc, book", w.mean_v(), 14.9, 0.01);
}

/// Source: Neamen, Microelectronics, design example 2.3, bridge: 12 V crest at the output, 0.12 A, ripple 5 % (data and
/// formula seen in a companion, title from memory).
#[test]
fn neamen_design_2_3() {
    let w = Peak::resistive(12.0, 60.0, 2, 1666.7e-6, 100.0).solve();
    printed("ripple, exact", w.ripple_v(), "0.5295");
    printed("peak current, exact", w.source_peak_a(), "2.330");
    printed("V_dc, exact", w.mean_v(), "11.742");
    assert!(w.ripple_v() < 0.6, "the book's 5 % is an upper bound");
    rule_above("peak current, book", w.source_peak_a(), 2.504);
}

/// Source: Floyd, Electronic Devices, example 2-8, bridge: 120 V rms, 10:1, 60 Hz, 1000 uF, 220 ohm, 2 x 0.7 V (data
/// and formula seen, results from memory). The source takes the crest as 1.414 rms: 15.568 V.
#[test]
fn floyd_2_8() {
    let w = Peak::resistive(15.568, 60.0, 2, 1e-3, 220.0).solve();
    printed("ripple, exact", w.ripple_v(), "0.5302");
    printed("V_dc, exact", w.mean_v(), "15.309");
    assert!(w.ripple_v() < 0.591, "the book's ripple is an upper bound");
    assert_close("V_dc, book", w.mean_v(), 15.3, 0.01);
    assert!(
        w.ripple_v() / w.mean_v() < 0.039,
        "the book's ripple factor is an upper bound"
    );
}

/// Source: Jaeger & Blalock, Microelectronic Circuit Design, half-wave example: 12.6 V rms, 60 Hz, 15 ohm, 25 mF, 1 V
/// (from memory).
#[test]
fn jaeger_half_wave() {
    let w = Peak::resistive(12.6 * SQRT_2 - 1.0, 60.0, 1, 25e-3, 15.0).solve();
    printed("ripple, exact", w.ripple_v(), "0.6978");
    printed("peak current, exact", w.source_peak_a(), "46.26");
    printed("V_dc, exact", w.mean_v(), "16.47");
    rule_above("ripple, book", w.ripple_v(), 0.747);
    rule_above("peak current, book", w.source_peak_a(), 48.6);
    rule_above("V_dc, book (the crest)", w.mean_v(), 16.8);
    rule_above("load current, book", w.source_mean_a(), 1.12);
    assert_close("conduction, book", w.conduction_rad(), 0.290, RULE);
    assert_close(
        "conduction in degrees, book",
        w.conduction_rad().to_degrees(),
        16.6,
        RULE,
    );
    assert_close(
        "conduction in ms, book",
        1e3 * w.conduction_rad() / (TAU * 60.0),
        0.769,
        RULE,
    );
}

/// Source: Rashid, Power Electronics, 3rd ed., example of a C filter: bridge, 120 V, 60 Hz, 500 ohm, ripple factor 5 %
/// (from memory; the companion marks the 4th edition's number as wrong). The book's formula is conservative.
#[test]
fn rashid_c_filter() {
    let w = Peak::resistive(120.0 * SQRT_2, 60.0, 2, 126.2e-6, 500.0).solve();
    printed("ripple in % rms, exact", ripple_rms_pct(&w, 1.0 / 500.0), "3.32");
    printed("V_dc, exact", w.mean_v(), "161.09");
    assert!(ripple_rms_pct(&w, 1.0 / 500.0) < 5.0, "book");
    assert!(w.mean_v() > 158.49, "book");
    assert_close("V_dc, book", w.mean_v(), 158.49, 0.02);
}

/// Constant current on a full-wave bank at 60 Hz: the books' straight discharge over the whole period is the worst.
///
/// Sources, in order: Boylestad & Nashelsky, Electronic Devices and Circuit Theory, examples 15.3 to 15.5 (data and
/// formula seen in a companion, book from memory): triangle of 1.2 V rms, V_dc 27.9 V. A companion's example 10.1 of
/// the same type (seen): 17.76 V. Boylestad, example 15.13 (from memory): 8.35 V, valley 1.70 V. Example 15.14 (from
/// memory): 229 mA keeps 7.3 V.
#[test]
fn straight_discharge_is_the_worst_case() {
    let w = Peak::constant(30.0, 60.0, 100e-6, 0.05).solve();
    let triangle_pp_v = 2.0 * 3_f64.sqrt() * 1.2;
    assert!(w.ripple_v() < triangle_pp_v);
    assert!(w.mean_v() > 27.9);
    assert_close("V_dc", w.mean_v(), 27.9, RULE);
    assert!(Peak::constant(24.0, 60.0, 200e-6, 0.3).solve().mean_v() > 17.76);
    let w = Peak::constant(15.0, 60.0, 250e-6, 0.4).solve();
    assert!(w.mean_v() > 8.35 && w.valley_v() > 1.70);
    assert!(Peak::constant(15.0, 60.0, 250e-6, 0.229).solve().valley_v() > 7.3);
}

/// Source: item on a half-wave rectifier's peak inverse voltage: 12 V rms, 0.7 V, no load (seen on a public page).
#[test]
fn half_wave_without_load() {
    let section = RawSection {
        source_rms_v: 12.0,
        mains_hz: 60.0,
        full_wave: false,
        series_ohm: 0.0,
        drop_v: 0.7,
        bank_f: 1e-3,
        bank_esr_ohm: 0.0,
        load_a: 0.0,
        load_s: 0.0,
    };
    printed("output", steady_state(&section).unwrap().mean_v(), "16.27");
}

// ---- 2 Schade's charts, exact

/// Ideal diode, series resistance, load of 1 ohm, crest 1 V; `w_c_r` with the mains' frequency also for two pulses.
fn schade(pulses: u32, w_c_r: f64, rs: f64) -> Waveform {
    steady_state(&RawSection {
        source_rms_v: 1.0 / SQRT_2,
        mains_hz: 1.0 / TAU,
        full_wave: pulses == 2,
        series_ohm: rs,
        drop_v: 0.0,
        bank_f: w_c_r,
        bank_esr_ohm: 0.0,
        load_a: 0.0,
        load_s: 1.0,
    })
    .unwrap()
}

/// Ripple, rms, in per cent of the mean. Over a period a capacitor takes no power, so without ESR the squares of load
/// and bank current add up to that of the source; the load's is the raw voltage's.
fn ripple_rms_pct(w: &Waveform, load_s: f64) -> f64 {
    let raw_square = (w.source_rms_a().powi(2) - w.reservoir_rms_a().powi(2)) / load_s.powi(2);
    100.0 * (raw_square - w.mean_v().powi(2)).sqrt() / w.mean_v()
}

/// Source: exact grid for O. H. Schade, "Analysis of Rectifier Operation", Proc. IRE 31 (1943): its column of rms
/// ripple (the others: tests/raw_section.rs), and the printed cells of this page's text.
#[test]
fn schade_ripple() {
    let mut rows = csv::Reader::from_path("tests/data/schade_grid.csv").unwrap();
    let mut count = 0;
    for row in rows.records() {
        let x: Vec<f64> = row.unwrap().iter().map(|c| c.parse().unwrap()).collect();
        let got = ripple_rms_pct(&schade(x[0] as u32, x[1], x[2]), 1.0);
        assert_close(&format!("n={} wCR={} Rs/RL={}", x[0], x[1], x[2]), got, x[8], 1e-4);
        count += 1;
    }
    assert_eq!(count, 60);
    // Series resistance lowers the ripple: full wave, w C R 20, from 0.5 to 10 %.
    printed("0.5 %", ripple_rms_pct(&schade(2, 20.0, 0.005), 1.0), "3.81");
    printed("10 %", ripple_rms_pct(&schade(2, 20.0, 0.10), 1.0), "2.94");
}

/// Source: diode-detector theory, e.g. Terman, Radio Engineers' Handbook (1943), Clarke & Hess (1971) (from memory; the
/// derivation is two lines): tan t - t = pi Rs/(n R_L), V_dc/V_pk = cos t. Those not in tests/raw_section.rs.
#[test]
fn large_reservoir_limit() {
    for (pulses, rs, v) in [
        (1, 0.01, 0.903_536),
        (1, 0.02, 0.852_905),
        (1, 0.10, 0.645_461),
        (2, 0.005, 0.960_061),
        (2, 0.01, 0.937_639),
        (2, 0.02, 0.903_536),
    ] {
        assert_close(&format!("n={pulses} r={rs}"), schade(pulses, 2e4, rs).mean_v(), v, 2e-6);
    }
    let w = schade(1, 2e5, 0.05);
    assert_close("I_rms/I_dc", w.source_rms_a() / w.mean_v(), 2.294_05, 5e-6);
}

/// Source: Schade 1943 (from memory): what one diode carries depends on n w C R_L and Rs/(n R_L); exactly so only for
/// a large reservoir. A centre-tap's half-winding carries what its diode does.
#[test]
fn schade_universal_abscissa() {
    // One diode of two carries half of the mean.
    let full = |w_c_r, rs| {
        let w = schade(2, w_c_r, rs);
        let mean_a = w.mean_v() / 2.0;
        (
            winding_rms_a(Path::CentreTap, w.source_rms_a()) / mean_a,
            w.source_peak_a() / mean_a,
        )
    };
    let half = |w_c_r, rs| {
        let w = schade(1, w_c_r, rs);
        (
            winding_rms_a(Path::HalfWave, w.source_rms_a()) / w.mean_v(),
            w.source_peak_a() / w.mean_v(),
        )
    };
    printed("full wave (20, 10 %), rms", full(20.0, 0.10).0, "2.2908");
    printed("full wave (20, 10 %), peak", full(20.0, 0.10).1, "6.586");
    printed("half wave (40, 5 %), rms", half(40.0, 0.05).0, "2.2916");
    printed("half wave (40, 5 %), peak", half(40.0, 0.05).1, "6.591");
    printed("full wave (5, 2 %), rms", full(5.0, 0.02).0, "2.599");
    printed("half wave (10, 1 %), rms", half(10.0, 0.01).0, "2.625");
}

/// Source: physics: I_C about sqrt(I_rms^2 - I_dc^2), a little below it for a resistive load (exact values computed).
#[test]
fn reservoir_current() {
    for (pulses, w_c_r, rs, exact, by_root) in [
        (2, 20.0, 0.05, "1.48195", "1.48231"),
        (1, 10.0, 0.02, "2.27854", "2.28369"),
    ] {
        let w = schade(pulses, w_c_r, rs);
        let mean_a = w.source_mean_a();
        printed("exact", w.reservoir_rms_a() / mean_a, exact);
        printed(
            "root",
            (w.source_rms_a().powi(2) - mean_a.powi(2)).sqrt() / mean_a,
            by_root,
        );
    }
}

/// Makers' rules for the winding current against the exact one at the source resistance at which their voltage rules
/// hold. Sources, all seen on public pages: bridge 1.8 x I_dc (another page 1.7); V_ac = 0.8 (V_dc + 2) for a bridge;
/// centre-tap 1.2 x I_dc per half at 1.7 (V_dc + 1); half wave 2.6 x I_dc at 0.88 (V_dc + 1).
#[test]
fn makers_rules_for_the_winding() {
    let ratio = |pulses, path, w_c_r, rs| {
        let w = schade(pulses, w_c_r, rs);
        (winding_rms_a(path, w.source_rms_a()) / w.source_mean_a(), w.mean_v())
    };
    for (rs, printed_ratio) in [(0.109, "1.6"), (0.048, "1.8"), (0.02, "2.04")] {
        printed(
            &format!("bridge at {rs}"),
            ratio(2, Path::Bridge, 20.0, rs).0,
            printed_ratio,
        );
    }
    assert_close("bridge, 1.7", ratio(2, Path::Bridge, 20.0, 0.048).0, 1.7, RULE);
    let (amps, volts) = ratio(2, Path::Bridge, 20.0, 0.024);
    printed("bridge at its voltage rule", amps, "1.99");
    assert_close("its voltage", volts, 0.884, 1e-3);
    let (amps, volts) = ratio(2, Path::CentreTap, 20.0, 0.048);
    printed("centre-tap at its voltage rule", amps, "1.27");
    assert_close("its voltage", volts, 0.832, 1e-3);
    assert_close("centre-tap, 1.2", amps, 1.2, RULE);
    for (w_c_r, rs, exact) in [(20.0, 0.0265, "2.49"), (100.0, 0.032, "2.44")] {
        let (amps, volts) = ratio(1, Path::HalfWave, w_c_r, rs);
        assert_close("half wave, its voltage", volts, 0.8035, 5e-3);
        assert_close("half wave, exact", amps, exact.parse().unwrap(), 5e-3);
        assert_close("half wave, 2.6", amps, 2.6, RULE);
    }
}

// ---- 3 Ripple approximation and peak inverse voltage

/// Source: exact ideal-diode solution, no series resistance (computed): ripple as a share of the crest, its ratio to
/// I T/C with the crest's current, and with the mean current. Every ratio is below 1: the rule is a safe upper bound.
/// (Three ratios were first listed one digit too high, as 0.594, 0.503 and 0.562; scipy's brentq and quad give these.)
#[test]
fn ripple_against_the_rule_resistive() {
    for (pulses, w_c_r, exact, to_crest, to_mean) in [
        (1, 2.0, "0.89841", "0.286", "0.593"),
        (1, 5.0, "0.63142", "0.502", "0.754"),
        (1, 10.0, "0.41095", "0.654", "0.827"),
        (1, 20.0, "0.24222", "0.771", "0.877"),
        (1, 50.0, "0.10954", "0.872", "0.922"),
        (1, 100.0, "0.05764", "0.917", "0.944"),
        (2, 2.0, "0.58488", "0.372", "0.505"),
        (2, 5.0, "0.35278", "0.561", "0.672"),
        (2, 10.0, "0.21520", "0.685", "0.763"),
        (2, 20.0, "0.12262", "0.781", "0.829"),
        (2, 50.0, "0.05446", "0.867", "0.890"),
        (2, 100.0, "0.02855", "0.909", "0.922"),
    ] {
        let w = schade(pulses, w_c_r, 0.0);
        let rule = TAU / (f64::from(pulses) * w_c_r);
        let at = format!("n={pulses} wCR={w_c_r}");
        printed(&at, w.ripple_v(), exact);
        printed(&format!("{at}, crest"), w.ripple_v() / rule, to_crest);
        printed(&format!("{at}, mean"), w.ripple_v() / (rule * w.mean_v()), to_mean);
    }
}

/// Source: the same for a constant current, full wave: k = I/(w C V_pk), rule pi k.
#[test]
fn ripple_against_the_rule_constant_current() {
    for (k, exact, ratio) in [
        (0.20, "0.41826", "0.666"),
        (0.10, "0.23862", "0.760"),
        (0.05, "0.13005", "0.828"),
        (0.02, "0.05591", "0.890"),
        (0.01, "0.02895", "0.922"),
    ] {
        let w = Peak::constant(1.0, 1.0 / TAU, 1.0 / k, 1.0).solve();
        printed(&format!("k={k}"), w.ripple_v(), exact);
        printed(&format!("k={k}, ratio"), w.ripple_v() / (PI * k), ratio);
    }
}

/// Peak inverse voltages: the audit counts the unloaded crest without the diode's drop, so it lies one drop above the
/// books. Sources: half wave 33.24 V (12 V rms, 0.7 V; seen on a public page); bridge 16.2 V (Sedra & Smith's exercise
/// behind example 3.9, 0.8 V; from memory) and 12.70 V (Neamen 2.3, 13.4 V crest, 0.7 V; data and formula seen in a
/// companion); centre-tap 2 V_pk - V_D (seen in public notes) on the half-wave row's numbers.
#[test]
fn peak_inverse_voltage() {
    let supply = supply(&json!({"margins": {"reverse": "0 %"}}));
    let site = Site::new(&supply);
    let catalogue = parts(&[(
        Slot::Rectifier,
        "D",
        &[("price", "1"), ("kind", "diode"), ("vrrm_v", "50")],
    )]);
    let crest_12_v = 12.0 * SQRT_2;
    for (path, crest_v, diode_v, book) in [
        (Path::HalfWave, crest_12_v, 0.7, "33.24"),
        (Path::CentreTap, crest_12_v, 0.7, "33.24"),
        (Path::Bridge, crest_12_v, 0.8, "16.2"),
        (Path::Bridge, 13.4, 0.7, "12.70"),
    ] {
        let check = rectifier::reverse_voltage(&site, &catalogue.rectifiers[0], path, crest_v);
        printed(path.word(), check.bound.unwrap() - diode_v, book);
    }
}

// ---- 4 Standards

/// The keys that every supply needs, with others on top.
fn supply(more: &Value) -> Supply {
    let mut content = json!({
        "mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": "50 Hz"},
        "ambient": {"low": "0 degC", "high": "40 degC"},
        "rail": [{"name": "main", "voltage": "12 V", "current": "1 A"}],
    });
    for (key, value) in more.as_object().unwrap() {
        content[key] = value.clone();
    }
    from_json(&content, "published.rs").unwrap()
}

/// Slot, name, cells as (column, text).
type Row<'a> = (Slot, &'a str, &'a [(&'a str, &'a str)]);

fn parts(rows: &[Row]) -> Catalogue {
    let owned = |cells: &[(&str, &str)]| cells.iter().map(|&(c, t)| (c.to_owned(), t.to_owned())).collect();
    let rows: Vec<SavedPart> = rows
        .iter()
        .map(|(slot, name, cells)| (*slot, (*name).to_owned(), owned(cells)))
        .collect();
    from_cells(rows, "published.rs", None).unwrap()
}

/// Mains limits through a supply file. Sources: 230 V, 10 %: 207 to 253 V, IEC 60038:1983+A2:1997 table 1 (seen);
/// 120 V, 5 %: 114 to 126 V, ANSI C84.1 range A, service (seen); 117 V, 6 %: as the row on line changes has it.
#[test]
fn mains_limits() {
    for (voltage, tolerance, low_v, high_v) in [
        ("230 V", "10 %", 207.0, 253.0),
        ("120 V", "5 %", 114.0, 126.0),
        ("117 V", "6 %", 109.98, 124.02),
    ] {
        let mains = json!({"voltage": voltage, "tolerance": tolerance, "frequency": "50 Hz"});
        let supply = supply(&json!({"mains": mains}));
        assert_close(voltage, supply.mains.low_v, low_v, CLOSED);
        assert_close(voltage, supply.mains.high_v, high_v, CLOSED);
    }
}

/// Source: IEC 60028:1925: alpha20 = 0.00393/K (exactly 1/254.5), R2/R1 = (234.5+t2)/(234.5+t1) (seen), and the
/// correction table from 25 degC of a public page (seen).
#[test]
fn copper() {
    for (c, table, exact) in [
        (40.0, "1.058", "1.0578"),
        (75.0, "1.193", "1.1927"),
        (100.0, "1.289", "1.2890"),
        (125.0, "1.385", "1.3854"),
        (150.0, "1.482", "1.4817"),
    ] {
        let factor = 1.0 / copper_ohm(1.0, 25.0, c);
        printed("table", factor, table);
        printed("recomputed", factor, exact);
    }
    let per_kelvin = 1.0 - copper_ohm(1.0, 19.0, 20.0);
    printed("alpha20", per_kelvin, "0.00393");
    printed("alpha20, more digits", per_kelvin, "0.0039293");
}

/// Source: IEC 60062:2016+A1:2019 (resistors seen, capacitors from memory).
#[test]
fn letter_codes() {
    let any = Range::above(0.0).to(1e12);
    let ohms = Measure::new(Dimension::Resistance, "ohm", any);
    for (code, ohm) in [
        ("R47", 0.47),
        ("4R7", 4.7),
        ("470R", 470.0),
        ("4K7", 4.7e3),
        ("47K3", 47.3e3),
        ("4M7", 4.7e6),
    ] {
        assert_close(code, ohms.cell(code).unwrap(), ohm, CLOSED);
    }
    let farads = Measure::new(Dimension::Capacitance, "uF", any);
    for (code, farad) in [("4u7", 4.7e-6), ("2n2", 2.2e-9)] {
        assert_close(code, farads.cell(code).unwrap(), farad, CLOSED);
    }
}

// ---- 5 Electrolytic capacitors

/// Life by the 10-kelvin rule, L = L0 2^((T0 - T)/10), which the project states at rated ripple current (5 K).
fn by_rule_h(rated_h: f64, rated_c: f64, air_c: f64) -> f64 {
    life_h(rated_h, rated_c, hot_c(air_c, 1.0, 1.0))
}

/// Sources: a Python library's demo page (seen; it prints 32000 h for 70 degC, which belongs to 65); a power-supply
/// maker's note on life at varying ambient (seen). 85 degC of the first: doc test.
#[test]
fn ten_kelvin_rule() {
    for (rated_h, air_c, printed_h) in [
        (2000.0, 85.0, "8000"),
        (2000.0, 70.0, "22627"),
        (2000.0, 65.0, "32000"),
        (1000.0, 45.0, "64000"),
        (1000.0, 55.0, "32000"),
        (1000.0, 65.0, "16000"),
    ] {
        printed(
            &format!("{rated_h} h at {air_c}"),
            by_rule_h(rated_h, 105.0, air_c),
            printed_h,
        );
    }
}

/// Source: the same maker's note (seen): 8 h a day each at 45, 55 and 65 degC wear a can as 57.2 degC does.
#[test]
fn varying_ambient() {
    let each = [45.0, 55.0, 65.0].map(|c| 1.0 / by_rule_h(1000.0, 105.0, c));
    let together_h = 3.0 / each.iter().sum::<f64>();
    printed("hours", together_h, "27428.6");
    assert!(by_rule_h(1000.0, 105.0, 57.23) < together_h && together_h < by_rule_h(1000.0, 105.0, 57.21));
}

/// Source: Albertsen, "Electrolytic capacitor lifetime estimation", Jianghai Europe 2010/2018 (seen): K_R at half the
/// rated ripple current with 5 K at all of it; the example's 144 991 h on that model are own numbers, and include the
/// voltage factor 1.7469, which the project leaves out: the safe side.
#[test]
fn ripple_factor() {
    printed("K_R", life_h(1.0, 105.0, hot_c(105.0, 0.5, 1.0)), "1.2968");
    let without_voltage_h = life_h(2000.0, 105.0, hot_c(55.0, 0.5, 1.0));
    assert_close("example", without_voltage_h * 1.7469, 144_991.0, 2e-5);
}

/// Source: a snap-in capacitor's data sheet, table 4 (seen): ripple current at 50 Hz counts 0.91 of that at 100 Hz. The
/// project's factor for half-wave pulses, 0.8 from memory, must be stricter.
#[test]
fn half_wave_ripple_is_stricter_than_a_data_sheet() {
    let can: &[(&str, &str)] = &[("price", "1"), ("c_uf", "1000"), ("ripple_a", "2")];
    let catalogue = parts(&[(Slot::Reservoir, "C", can)]);
    let supply = supply(&json!({}));
    let [ripple, ..] = reservoir::wear(&Site::new(&supply), &catalogue.reservoirs[0], Path::HalfWave, Ok(1.0));
    let counts = ripple.bound.unwrap() / 2.0;
    assert_close("factor", counts, HALF_WAVE_RIPPLE, CLOSED);
    assert!(counts <= 0.91);
}

// ---- 6 Heat sinks

/// Next to no thermal resistance: columns take none of 0.
const NONE: &str = "1e-9";

/// Junction of a package at a power: from the air of `air_c` through `[jc, cs, sa]`, or free-standing through `[ja]`.
fn junction_c(air_c: f64, rth: &[&str], power_w: f64) -> f64 {
    let supply = supply(&json!({"ambient": {"low": "0 degC", "high": format!("{air_c} degC")}}));
    let mut cells = vec![("price", "1"), ("kind", "bridge"), ("tj_max_c", "200")];
    let mut sink = vec![("price", "1"), ("cases", "X")];
    match *rth {
        [ja] => cells.push(("rth_ja_k_w", ja)),
        [jc, cs, sa] => {
            cells.push(("rth_jc_k_w", jc));
            sink.extend([("rth_cs_k_w", cs), ("rth_sa_k_w", sa)]);
        }
        _ => panic!("ja, or jc, cs and sa"),
    }
    let catalogue = parts(&[(Slot::Rectifier, "B", &cells), (Slot::Sink, "S", &sink)]);
    let sink = (rth.len() == 3).then(|| &catalogue.sinks[0]);
    let check = rectifier::junction(&Site::new(&supply), &catalogue.rectifiers[0], Ok(power_w), sink);
    check.value.unwrap()
}

/// The printed power brings the printed junction about: P is printed to half a digit, which is what the tolerance is.
///
/// Sources: Sedra & Smith, 5th ed., example 14.5 (data seen in a companion): free air, on a sink, on an infinite one.
/// Neamen, Microelectronics, examples 8.1 and 8.2 (data seen in a companion). Boylestad, power amplifiers (from
/// memory): as P = (T_J - T_A)/sum.
#[test]
fn sink_examples() {
    for (junction, air_c, rth, printed_w, half_digit_w) in [
        (150.0, 50.0, &["62.5"][..], 1.6, 5e-4),
        (150.0, 50.0, &["3.12", "0.5", "4"], 13.123, 5e-4),
        (150.0, 50.0, &["3.12", NONE, NONE], 32.05, 5e-3),
        (150.0, 30.0, &["1.75", NONE, "50"], 2.319, 5e-4),
        (150.0, 30.0, &["1.75", "1", "5"], 15.484, 5e-4),
        (200.0, 40.0, &["0.5", "0.6", "1.5"], 61.54, 5e-3),
    ] {
        let low_c = junction_c(air_c, rth, printed_w - half_digit_w);
        let high_c = junction_c(air_c, rth, printed_w + half_digit_w);
        assert!(
            low_c <= junction && junction <= high_c,
            "{printed_w} W: {low_c} to {high_c} degC"
        );
    }
    // The books print 1.6, 13.1 and 32 W; 2.32 and 15.5 W; 61.5 W: these, rounded.
    printed("Neamen's case", junction_c(30.0, &[NONE, "1", "5"], 15.484), "122.9");
}

/// Source: Boylestad, power amplifiers (from memory): 80 W at 25 degC less 0.5 W/K leaves 30 W at a case of 125 degC;
/// 1/0.5 W/K is a resistance of 2 K/W, at which both powers bring about the same junction.
#[test]
fn derating_line() {
    let on_ideal_sink = |case_c: f64, power_w: f64| junction_c(case_c, &["2", NONE, NONE], power_w);
    assert_close("junction", on_ideal_sink(125.0, 30.0), on_ideal_sink(25.0, 80.0), 1e-8);
    printed("junction", on_ideal_sink(25.0, 80.0), "185");
}

/// Source: a heat-sink extrusion maker's note "Temperature Correction Considerations" (seen, full table; its 1.106
/// is 1.1067 cut), the factor on the resistance stated at 75 K; theory says (75/rise)^0.25 (McAdams 1954). And from
/// Churchill & Chu, IJHMT 18 (1975) 1323, by another program: 1.255 from 75 to 30 K.
#[test]
fn natural_convection_table() {
    let rth_sa = 2.0;
    for (rise_k, table, theory) in [
        (75.0, 1.000, "1.0000"),
        (70.0, 1.017, "1.0174"),
        (60.0, 1.057, "1.0574"),
        (50.0, 1.106, "1.1067"),
        (40.0, 1.170, "1.1702"),
        (30.0, 1.257, "1.2574"),
    ] {
        // At the power that the table's factor makes of this rise, the project must find the rise, and so the factor.
        let power_w = rise_k / (rth_sa * table);
        let got_k = sink_rise_k(power_w, rth_sa, Some(75.0));
        assert_close("factor", got_k / (power_w * rth_sa), table, 1e-3);
        assert_close("rise", got_k, rise_k, 1e-3);
        let exact_w = rise_k / (rth_sa * theory.parse::<f64>().unwrap());
        let exact_k = sink_rise_k(exact_w, rth_sa, Some(75.0));
        printed("theory", exact_k / (exact_w * rth_sa), theory);
    }
    let power_w = 30.0 / (rth_sa * 1.255);
    assert_close("Churchill & Chu", sink_rise_k(power_w, rth_sa, Some(75.0)), 30.0, 3e-3);
}

// ---- 7 Linear regulators, integrated

/// Sources: P = (V_in - V_out) I_out, US amateur question pool E7D13, public domain (seen); efficiencies from memory
/// (an identity): 5 V from 12 V 41.7 %, from 9 V 55.6 % with 4 W at 1 A.
#[test]
fn series_regulator_loss() {
    assert_close("9 V", dissipation_w(9.0, 5.0, 1.0, 0.0), 4.0, CLOSED);
    for (in_v, percent, fraction) in [(12.0, "41.7", "0.4167"), (9.0, "55.6", "0.5556")] {
        let efficiency = 5.0 / (5.0 + dissipation_w(in_v, 5.0, 1.0, 0.0));
        printed("in %", 100.0 * efficiency, percent);
        printed("efficiency", efficiency, fraction);
        // With ground current: V_out I_out/(V_in (I_out + I_q)).
        let with_ground = 5.0 / (5.0 + dissipation_w(in_v, 5.0, 1.0, 0.01));
        assert_close("identity", with_ground, 5.0 / (in_v * 1.01), CLOSED);
    }
}

/// Source: definition of ripple rejection in decibels (an encyclopedia's article, seen): 60 dB: doc test; 65 dB of
/// 2 V. And a companion's ratio of 0.05200 = 25.7 dB (data seen).
#[test]
fn ripple_rejection() {
    printed("in mV", 1e3 * output_ripple_v(2.0, 65.0), "1.125");
    assert_close(
        "25.7 dB",
        output_ripple_v(1.0, 25.7),
        0.05200,
        0.05 / 20.0 * std::f64::consts::LN_10,
    );
}

// ---- 8 Transformers

/// Sources: regulation on the full-load base, 11 V to 10 V = 10 % (seen on public pages); the 5 % example from 100 V
/// to 95 V is on the no-load base (seen), so 5/95 here; 9.1 % of the no-load voltage is 1/11 likewise.
#[test]
fn regulation_is_on_the_full_load_base() {
    assert_close("10 %", open_circuit_v(10.0, 0.10, 230.0, 230.0), 11.0, CLOSED);
    assert_close(
        "100 to 95 V",
        open_circuit_v(95.0, 5.0 / 95.0, 230.0, 230.0),
        100.0,
        CLOSED,
    );
    let no_load_v = open_circuit_v(10.0, 0.10, 230.0, 230.0);
    printed(
        "makers on the other base",
        100.0 * (no_load_v - 10.0) / no_load_v,
        "9.09",
    );
}

/// Sources: R = reg V^2/S, derived; 50 VA, 18 V, 12 %: 0.7776 ohm, 20.16 V (doc tests). Regulation scales with load,
/// reg' = reg VA_used/VA_rated (seen on a public page): half the current, half the drop. The drop at full load leaves
/// the rated voltage.
#[test]
fn regulation_scales_with_load() {
    for share in [1.0, 0.5, 0.1] {
        let rated_a = 50.0 / 18.0;
        let own = WindingLoad {
            volts_v: 18.0,
            load_a: share * rated_a,
        };
        let drop_v = series_ohm(0.12, 0.5, 50.0, own, rated_a, &[own]) * own.load_a;
        assert_close("reg'", drop_v / 18.0, 0.12 * share, CLOSED);
        if share > 0.9 {
            assert_close("rated", open_circuit_v(18.0, 0.12, 230.0, 230.0) - drop_v, 18.0, CLOSED);
        }
    }
}

/// Source: a public page (data seen, result derived): 12 V at 117 V, 6 %: 11.28 and 12.72 V.
#[test]
fn line_changes_carry_through() {
    let supply = supply(&json!({"mains": {"voltage": "117 V", "tolerance": "6 %", "frequency": "60 Hz"}}));
    for (mains_v, wanted_v) in [(supply.mains.low_v, 11.28), (supply.mains.high_v, 12.72)] {
        assert_close("secondary", open_circuit_v(12.0, 0.0, mains_v, 117.0), wanted_v, CLOSED);
    }
}

//! Owns the table of columns. Nothing else in the program states a unit, a range or a default of a cell.
//!
//! Upper ends lie far beyond any part, only so that a slip of six digits is a fault and no formula overflows.

use super::Missing::{Blank, Default, Derived, Required};
use super::{Column, DeviceKind, Form, Missing};
use crate::units::Dimension as D;
use crate::units::{Measure, Range};

const TEMPERATURE: Range = Range::from(-100.0).to(500.0);
const POSITIVE: Range = Range::above(0.0).to(100_000.0);
const NOT_NEGATIVE: Range = Range::from(0.0).to(100_000.0);
const PERCENT: Range = Range::from(0.0).to(100.0);
const BELOW_ALL: Range = Range::from(0.0).below(100.0);

const fn column(name: &'static str, form: Form, missing: Missing, meaning: &'static str) -> Column {
    Column {
        name,
        meaning,
        form,
        missing,
    }
}

const fn of(dimension: D, unit: &'static str, range: Range) -> Form {
    Form::Quantity(Measure::new(dimension, unit, range))
}

const fn volts(range: Range) -> Form {
    of(D::Voltage, "V", range)
}

const fn amps(range: Range) -> Form {
    of(D::Current, "A", range)
}

const fn milliamps(range: Range) -> Form {
    of(D::Current, "mA", range)
}

const fn percent(range: Range) -> Form {
    of(D::Percentage, "%", range)
}

const fn thermal() -> Form {
    of(D::ThermalResistance, "K/W", POSITIVE)
}

const fn celsius(range: Range) -> Form {
    of(D::Temperature, "degC", range)
}

const RATED_AT: Form = Form::RatedAt(Measure::new(D::Frequency, "Hz", Range::above(0.0).to(1e9)));
const WINDING_V: Measure = Measure::new(D::Voltage, "V", POSITIVE);
const WINDING_A: Measure = Measure::new(D::Current, "A", POSITIVE);

/// Of every file.
pub(super) const COMMON: &[Column] = &[
    column(
        "part",
        Form::Name,
        Required,
        "the firm's name of the part, unique in the whole catalogue",
    ),
    column("description", Form::Text, Blank, "free text"),
    column("price", Form::Money, Required, "price of one piece"),
    column(
        "breaks",
        Form::Breaks,
        Blank,
        "price of one piece from so many pieces on",
    ),
    column("stock", Form::Count, Derived("not limited"), "pieces on the shelf"),
    column(
        "status",
        Form::Word(&["current", "last-buy", "withdrawn"]),
        Default("current"),
        "whether it may still be bought",
    ),
    column("height_mm", of(D::Length, "mm", POSITIVE), Blank, "mounted height"),
];

/// Of transformers.csv.
pub(super) const TRANSFORMERS: &[Column] = &[
    column(
        "primary_v",
        Form::Primary(WINDING_V),
        Required,
        "rated primary voltage; 115+115: two equal primaries; 100/120/230: taps",
    ),
    column(
        "freq_min_hz",
        of(D::Frequency, "Hz", Range::from(1.0).to(1000.0)),
        Default("50"),
        "lowest rated frequency",
    ),
    column(
        "va",
        of(D::ApparentPower, "VA", Range::from(0.1).to(100_000.0)),
        Required,
        "rated apparent power",
    ),
    column(
        "secondary_v",
        Form::Windings(WINDING_V),
        Required,
        "rated secondary voltages; 9+9: two windings; 12-0-12: one winding of two halves",
    ),
    column(
        "secondary_a",
        Form::Windings(WINDING_A),
        Derived("va / sum of secondary_v, for each"),
        "rated secondary currents, written as secondary_v is",
    ),
    column(
        "regulation_pct",
        percent(Range::above(0.0).to(300.0)),
        Required,
        "(no-load - full-load voltage) / full-load voltage, all secondaries loaded",
    ),
    column(
        "winding_c",
        celsius(Range::above(-200.0).to(500.0)),
        Default("85"),
        "winding temperature at full load",
    ),
    column(
        "primary_share_pct",
        percent(PERCENT),
        Default("50"),
        "share of the copper drop in the primary",
    ),
    column(
        "v_tol_pct",
        percent(BELOW_ALL),
        Default("0"),
        "tolerance of the no-load voltage",
    ),
    column(
        "core_loss_w",
        of(D::Power, "W", NOT_NEGATIVE),
        Derived("0.27 W x va^0.62, with a caution"),
        "iron loss at rated voltage",
    ),
    column(
        "core",
        Form::Word(&["laminated", "toroid"]),
        Blank,
        "core; half-wave needs to know",
    ),
    column(
        "ta_c",
        celsius(TEMPERATURE),
        Default("40"),
        "highest ambient temperature",
    ),
];

/// Of rectifiers.csv.
pub(super) const RECTIFIERS: &[Column] = &[
    column(
        "kind",
        Form::Word(&["bridge", "diode"]),
        Required,
        "module or single diode",
    ),
    column(
        "type",
        Form::Word(&["junction", "schottky"]),
        Default("junction"),
        "decides the temperature coefficient of the threshold",
    ),
    column("vrrm_v", volts(POSITIVE), Blank, "repetitive peak reverse voltage"),
    column(
        "io_a",
        amps(POSITIVE),
        Blank,
        "rated mean current; of a bridge: its direct output",
    ),
    column(
        "io_for",
        Form::Word(&["resistive", "capacitive"]),
        Default("resistive"),
        "load for which io_a is stated",
    ),
    column("ifsm_a", amps(POSITIVE), Blank, "non-repetitive surge current"),
    column(
        "threshold_v",
        volts(Range::from(0.0).to(100.0)),
        Blank,
        "threshold of one diode, with slope_mohm",
    ),
    column(
        "slope_mohm",
        of(D::Resistance, "mohm", Range::from(0.0).to(1e6)),
        Blank,
        "slope resistance of one diode, with threshold_v",
    ),
    column(
        "vf_v",
        volts(Range::above(0.2).to(100.0)),
        Blank,
        "highest forward voltage of one diode at vf_a; used where threshold_v is blank",
    ),
    column("vf_a", amps(POSITIVE), Blank, "current at which vf_v is stated"),
    column("rth_ja_k_w", thermal(), Blank, "junction to ambient, free-standing"),
    column("rth_jc_k_w", thermal(), Blank, "junction to case"),
    column("case", Form::Case, Blank, "outline, JEDEC name"),
    column("tj_max_c", celsius(TEMPERATURE), Blank, "highest junction temperature"),
];

/// Of reservoirs.csv.
pub(super) const RESERVOIRS: &[Column] = &[
    column(
        "c_uf",
        of(D::Capacitance, "uF", Range::above(0.0).to(1e8)),
        Required,
        "rated capacitance",
    ),
    column(
        "tol_minus_pct",
        percent(BELOW_ALL),
        Default("20"),
        "tolerance downwards",
    ),
    column(
        "tol_plus_pct",
        percent(Range::from(0.0).to(1000.0)),
        Default("20"),
        "tolerance upwards",
    ),
    column("v_rated_v", volts(POSITIVE), Blank, "rated voltage"),
    column(
        "esr_mohm",
        of(D::Resistance, "mohm", Range::from(0.0).to(1e6)),
        Blank,
        "series resistance at esr_hz",
    ),
    column(
        "esr_hz",
        RATED_AT,
        Default("100"),
        "frequency at which esr_mohm is stated",
    ),
    column(
        "ripple_a",
        amps(POSITIVE),
        Blank,
        "rated ripple current, rms, at ripple_hz",
    ),
    column(
        "ripple_hz",
        RATED_AT,
        Default("100"),
        "frequency at which ripple_a is stated",
    ),
    column("t_max_c", celsius(TEMPERATURE), Blank, "rated temperature"),
    column(
        "life_h",
        of(D::Life, "h", Range::above(0.0).to(1e7)),
        Blank,
        "life at rated temperature and ripple current",
    ),
];

/// Words of the column `kind` of pass_devices.csv and of the supply key `devices`.
pub(crate) const DEVICE_KINDS: &[&str] = &[
    DeviceKind::Fixed.word(),
    DeviceKind::Adjustable.word(),
    DeviceKind::Follower.word(),
    DeviceKind::Darlington.word(),
    DeviceKind::Shunt.word(),
];

/// Of pass_devices.csv.
pub(super) const PASS_DEVICES: &[Column] = &[
    column(
        "kind",
        Form::Word(DEVICE_KINDS),
        Required,
        "integrated regulator, discrete transistor or pair, shunt regulator",
    ),
    column(
        "polarity",
        Form::Word(&["+", "-"]),
        Default("+"),
        "sign of the rail that it serves",
    ),
    column(
        "vout_v",
        volts(POSITIVE),
        Derived("required of kind fixed"),
        "output voltage, a magnitude",
    ),
    column(
        "vout_min_v",
        volts(POSITIVE),
        Derived("required of kind adjustable"),
        "lowest output, a magnitude",
    ),
    column(
        "vout_max_v",
        volts(POSITIVE),
        Derived("required of kind adjustable"),
        "highest output, a magnitude",
    ),
    column(
        "vref_v",
        volts(POSITIVE),
        Derived("required of kind adjustable"),
        "reference voltage",
    ),
    column("tol_pct", percent(BELOW_ALL), Blank, "output tolerance"),
    column(
        "dropout_v",
        volts(NOT_NEGATIVE),
        Blank,
        "dropout, a maximum over temperature",
    ),
    column(
        "dropout_light_v",
        volts(NOT_NEGATIVE),
        Derived("dropout_v at every current"),
        "dropout at no load",
    ),
    column("vin_max_v", volts(POSITIVE), Blank, "highest input voltage"),
    column(
        "vdiff_max_v",
        volts(POSITIVE),
        Blank,
        "highest input minus output voltage",
    ),
    column("iout_max_a", amps(POSITIVE), Blank, "highest output current"),
    column(
        "ground_ma",
        milliamps(NOT_NEGATIVE),
        Blank,
        "current into the ground pin at full load",
    ),
    column(
        "min_load_ma",
        milliamps(NOT_NEGATIVE),
        Default("0"),
        "least load that regulates",
    ),
    column(
        "psrr_db",
        of(D::Decibels, "dB", Range::from(0.0).to(200.0)),
        Blank,
        "least ripple rejection at twice the mains frequency",
    ),
    column(
        "psrr_vout_v",
        volts(POSITIVE),
        Derived("vref_v"),
        "output at which psrr_db is stated",
    ),
    column(
        "load_reg_pct",
        percent(PERCENT),
        Default("0"),
        "load regulation up to iout_max_a",
    ),
    column(
        "line_reg_pct_v",
        of(D::PercentagePerVolt, "%/V", PERCENT),
        Default("0"),
        "line regulation per volt of input",
    ),
    column("rth_jc_k_w", thermal(), Blank, "junction to case"),
    column("rth_ja_k_w", thermal(), Blank, "junction to ambient, free-standing"),
    column("tj_max_c", celsius(TEMPERATURE), Blank, "highest junction temperature"),
    column("case", Form::Case, Blank, "outline, JEDEC name"),
    column(
        "vbe_v",
        volts(Range::above(0.0).to(100.0)),
        Blank,
        "follower, darlington: whole base-emitter drop",
    ),
    column(
        "hfe_min",
        Form::Quantity(Measure::plain(Range::from(1.0).to(1e6))),
        Blank,
        "follower, darlington: least current gain",
    ),
    column(
        "soa",
        Form::Soa(WINDING_V, WINDING_A),
        Blank,
        "follower, darlington: safe operating area at 25 degC case",
    ),
    column(
        "fitted_price",
        Form::Money,
        Default("0"),
        "price of the small parts that come with it",
    ),
    column("iz_min_ma", milliamps(NOT_NEGATIVE), Blank, "shunt: least current"),
    column("iz_max_ma", milliamps(POSITIVE), Blank, "shunt: highest current"),
    column(
        "rz_ohm",
        of(D::Resistance, "ohm", NOT_NEGATIVE),
        Blank,
        "shunt: dynamic resistance",
    ),
];

/// Of sinks.csv.
pub(super) const SINKS: &[Column] = &[
    column("cases", Form::Cases, Required, "outlines that it takes, in any case"),
    column("rth_sa_k_w", thermal(), Blank, "sink to ambient"),
    column(
        "rise_k",
        of(D::Rise, "K", Range::above(0.0).to(500.0)),
        Derived("rth_sa_k_w is constant"),
        "rise at which rth_sa_k_w is stated, natural convection",
    ),
    column("rth_cs_k_w", thermal(), Default("1.2"), "case to sink"),
];

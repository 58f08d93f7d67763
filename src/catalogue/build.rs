//! Owns the making of a part from its row: one function a slot, and the checks that need two cells.

use super::row::Row;
use super::schema::Form;
use super::{
    Catalogue, Core, DeviceKind, Forward, Junction, PassDevice, Polarity, Rectifier, RectifierKind, Reservoir,
    Secondary, Sink, Slot, Transformer, lists,
};
use crate::units::Wrong;

/// Reads the row; a part without fault joins the catalogue.
pub(super) fn add(row: &mut Row<'_>, catalogue: &mut Catalogue) {
    match row.slot {
        Slot::Transformer => {
            let part = transformer(row);
            keep(row, part, &mut catalogue.transformers);
        }
        Slot::Rectifier => {
            let part = rectifier(row);
            keep(row, part, &mut catalogue.rectifiers);
        }
        Slot::Reservoir => {
            let part = reservoir(row);
            keep(row, part, &mut catalogue.reservoirs);
        }
        Slot::Pass => {
            let part = pass_device(row);
            keep(row, part, &mut catalogue.pass_devices);
        }
        Slot::Sink => {
            let part = sink(row);
            keep(row, part, &mut catalogue.sinks);
        }
    }
}

fn keep<T>(row: &Row<'_>, part: T, parts: &mut Vec<T>) {
    if !row.broken {
        parts.push(part);
    }
}

fn transformer(row: &mut Row<'_>) -> Transformer {
    let part = row.common();
    let va = row.number("va");
    Transformer {
        part,
        primary_v: row
            .read("primary_v", |form, text| match form {
                Form::Primary(m) => lists::primaries(&m, text),
                _ => Err(Wrong::new("is not a primary", "")),
            })
            .unwrap_or_default(),
        freq_min_hz: row.number("freq_min_hz"),
        va,
        secondaries: secondaries(row, va),
        regulation: row.number("regulation_pct"),
        winding_c: row.number("winding_c"),
        primary_share: row.number("primary_share_pct"),
        v_tol: row.number("v_tol_pct"),
        core_loss_w: row.optional("core_loss_w"),
        core: row.optional_word("core").map(|word| match word {
            "toroid" => Core::Toroid,
            _ => Core::Laminated,
        }),
        ta_c: row.number("ta_c"),
    }
}

/// Pairs volts with amperes of the same form; without amperes, all windings carry the same current at full VA.
fn secondaries(row: &mut Row<'_>, va: f64) -> Vec<Secondary> {
    let windings = |form, text: &str| match form {
        Form::Windings(m) => lists::windings(&m, text),
        _ => Err(Wrong::new("is not a winding", "")),
    };
    let volts = row.read("secondary_v", windings);
    let amps = row.read("secondary_a", windings);
    let Some(volts) = volts else {
        return Vec::new();
    };
    let sum: f64 = (volts.iter())
        .map(|w| if w.tapped { 2.0 * w.value } else { w.value })
        .sum();
    let forms = |list: &[lists::Winding]| -> Vec<bool> { list.iter().map(|w| w.tapped).collect() };
    if amps.as_ref().is_some_and(|a| forms(a) != forms(&volts)) {
        let form = row.cell("secondary_v").unwrap_or_default().to_owned();
        row.fault(
            "secondary_a",
            Wrong::new(
                "has another form than secondary_v",
                format!("write one current for each voltage of \"{form}\""),
            ),
        );
        return Vec::new();
    }
    let mut out = Vec::new();
    let mut taps = 0;
    for (k, winding) in volts.iter().enumerate() {
        let secondary = Secondary {
            volts_v: winding.value,
            amps_a: amps.as_ref().map_or(va / sum, |a| a[k].value),
            tapped: winding.tapped.then_some(taps),
        };
        out.push(secondary);
        if winding.tapped {
            out.push(secondary);
            taps += 1;
        }
    }
    out
}

fn rectifier(row: &mut Row<'_>) -> Rectifier {
    Rectifier {
        part: row.common(),
        kind: match row.word("kind") {
            "bridge" => RectifierKind::Bridge,
            _ => RectifierKind::Diode,
        },
        junction: match row.word("type") {
            "schottky" => Junction::Schottky,
            _ => Junction::Junction,
        },
        vrrm_v: row.optional("vrrm_v"),
        io_a: row.optional("io_a"),
        io_capacitive: row.word("io_for") == "capacitive",
        ifsm_a: row.optional("ifsm_a"),
        forward: forward(row),
        rth_ja_k_w: row.optional("rth_ja_k_w"),
        rth_jc_k_w: row.optional("rth_jc_k_w"),
        case: row.case("case"),
        tj_max_c: row.optional("tj_max_c"),
    }
}

fn forward(row: &mut Row<'_>) -> Result<Forward, &'static str> {
    for (one, other) in [("threshold_v", "slope_mohm"), ("vf_v", "vf_a")] {
        match (row.cell(one).is_some(), row.cell(other).is_some()) {
            (true, false) => row.demand(other, &format!("{one} and {other} are stated together")),
            (false, true) => row.demand(one, &format!("{one} and {other} are stated together")),
            _ => {}
        }
    }
    let line = (row.optional("threshold_v"), row.optional("slope_mohm"));
    let point = (row.optional("vf_v"), row.optional("vf_a"));
    match (line, point) {
        ((Some(threshold_v), Some(slope_ohm)), _) => Ok(Forward::Line { threshold_v, slope_ohm }),
        (_, (Some(vf_v), Some(vf_a))) => Ok(Forward::Point { vf_v, vf_a }),
        _ => Err("threshold_v"),
    }
}

fn reservoir(row: &mut Row<'_>) -> Reservoir {
    Reservoir {
        part: row.common(),
        c_f: row.number("c_uf"),
        tol_minus: row.number("tol_minus_pct"),
        tol_plus: row.number("tol_plus_pct"),
        v_rated_v: row.optional("v_rated_v"),
        esr_ohm: row.optional("esr_mohm"),
        esr_hz: row.number("esr_hz"),
        ripple_a: row.optional("ripple_a"),
        ripple_hz: row.number("ripple_hz"),
        t_max_c: row.optional("t_max_c"),
        life_h: row.optional("life_h"),
    }
}

fn pass_device(row: &mut Row<'_>) -> PassDevice {
    let part = row.common();
    let word = row.word("kind");
    let kind = (DeviceKind::ALL.into_iter().find(|k| k.word() == word)).unwrap_or(DeviceKind::Shunt);
    // Without these no rail could ever match the device, and no report would say why.
    let demands: &[&str] = match kind {
        DeviceKind::Fixed => &["vout_v"],
        DeviceKind::Adjustable => &["vout_min_v", "vout_max_v", "vref_v"],
        _ => &[],
    };
    for column in demands {
        row.demand(column, &format!("a device of kind {word} needs {column}"));
    }
    let vref_v = row.optional("vref_v");
    let device = PassDevice {
        part,
        kind,
        polarity: match row.word("polarity") {
            "-" => Polarity::Negative,
            _ => Polarity::Positive,
        },
        vout_v: row.optional("vout_v"),
        vout_min_v: row.optional("vout_min_v"),
        vout_max_v: row.optional("vout_max_v"),
        vref_v,
        tol: row.optional("tol_pct"),
        dropout_v: row.optional("dropout_v"),
        dropout_light_v: row.optional("dropout_light_v"),
        vin_max_v: row.optional("vin_max_v"),
        vdiff_max_v: row.optional("vdiff_max_v"),
        iout_max_a: row.optional("iout_max_a"),
        ground_a: row.optional("ground_ma"),
        min_load_a: row.number("min_load_ma"),
        psrr_db: row.optional("psrr_db"),
        psrr_vout_v: row.optional("psrr_vout_v").or(vref_v),
        load_reg: row.number("load_reg_pct"),
        line_reg_per_v: row.number("line_reg_pct_v"),
        rth_jc_k_w: row.optional("rth_jc_k_w"),
        rth_ja_k_w: row.optional("rth_ja_k_w"),
        tj_max_c: row.optional("tj_max_c"),
        case: row.case("case"),
        vbe_v: row.optional("vbe_v"),
        hfe_min: row.optional("hfe_min"),
        soa: row
            .read("soa", |form, text| match form {
                Form::Soa(volts, amps) => lists::soa(&volts, &amps, text),
                _ => Err(Wrong::new("is not an area", "")),
            })
            .unwrap_or_default(),
        fitted_price: row.money("fitted_price"),
        iz_min_a: row.optional("iz_min_ma"),
        iz_max_a: row.optional("iz_max_ma"),
        rz_ohm: row.optional("rz_ohm"),
    };
    rising(
        row,
        ("vout_min_v", device.vout_min_v),
        ("vout_max_v", device.vout_max_v),
    );
    rising(row, ("vref_v", device.vref_v), ("vout_min_v", device.vout_min_v));
    rising(row, ("iz_min_ma", device.iz_min_a), ("iz_max_ma", device.iz_max_a));
    device
}

/// Faults the first column where both are stated and it is the greater.
fn rising(row: &mut Row<'_>, low: (&str, Option<f64>), high: (&str, Option<f64>)) {
    if let (Some(a), Some(b)) = (low.1, high.1)
        && a > b
    {
        let other = row.cell(high.0).unwrap_or_default().to_owned();
        let wrong = Wrong::new(format!("is above {}", high.0), format!("at most its \"{other}\""));
        row.fault(low.0, wrong);
    }
}

fn sink(row: &mut Row<'_>) -> Sink {
    Sink {
        part: row.common(),
        cases: row
            .read("cases", |_, text| {
                Ok(text.split_whitespace().map(str::to_uppercase).collect())
            })
            .unwrap_or_default(),
        rth_sa_k_w: row.optional("rth_sa_k_w"),
        rise_k: row.optional("rise_k"),
        rth_cs_k_w: row.number("rth_cs_k_w"),
    }
}

//! Parts around what a rail needs, with what makes a catalogue awkward: windings of every form, both ways to state a
//! diode, cells left blank, ratings at 100 kHz, outlines in either case, data just beside the limits.
#![allow(dead_code)]

use binrail::catalogue::Slot;

use crate::common::Random;

pub type Cells = Vec<(&'static str, String)>;

/// Output voltages to draw from.
pub const VOLTS: [f64; 5] = [3.3, 5.0, 9.0, 12.0, 15.0];

/// What a rail asks of its parts.
#[derive(Debug, Clone, Copy)]
pub struct Ask {
    pub out_v: f64,
    pub negative: bool,
    /// Negative, and no negative device serves it.
    pub floating: bool,
    pub amps: f64,
    /// Mostly on a half-wave path: more copper, more capacitance.
    pub half_wave: bool,
}

impl Ask {
    /// A part for this rail, with its price in tenths.
    pub fn part(&self, r: &mut Random, slot: Slot, mains_v: u32) -> (Cells, usize) {
        match slot {
            Slot::Transformer => (self.transformer(r, mains_v), 20 + r.below(8)),
            Slot::Rectifier => self.rectifier(r),
            Slot::Reservoir => (self.reservoir(r), 3 + r.below(5)),
            Slot::Pass => (self.pass_device(r), 4 + r.below(5)),
            Slot::Sink => (sink(r), 1 + r.below(5)),
        }
    }

    /// What a section asks that feeds all of these.
    pub fn joined(asks: &[Ask]) -> Ask {
        let most_v = asks.iter().map(|ask| ask.out_v).fold(0.0, f64::max);
        Ask {
            out_v: most_v,
            amps: asks.iter().map(|ask| ask.amps).sum(),
            half_wave: asks.iter().all(|ask| ask.half_wave),
            ..asks[0]
        }
    }

    /// Rated voltage of a winding that feeds it through a bridge.
    fn winding_v(&self, r: &mut Random) -> f64 {
        ((self.out_v + r.between(5.0, 9.0)) / 1.2 * 2.0).round() / 2.0
    }

    fn transformer(&self, r: &mut Random, mains_v: u32) -> Cells {
        let volts = self.winding_v(r);
        let half = (volts / 2.0 * 2.0).ceil() / 2.0;
        let (secondary, windings) = match r.below(9) {
            0 => (format!("{volts}"), 1.0),
            1 | 2 => (format!("{half}+{half}"), 1.0),
            3 => (format!("{volts}+{volts}"), 1.6),
            4 => (format!("{volts}-0-{volts}"), 1.6),
            5 => (format!("{half}-0-{half}"), 1.0),
            6 => (format!("{volts}+{volts}+8"), 2.2),
            7 => (format!("8+{half}-0-{half}"), 1.5),
            _ => (format!("{half}+{half}+{half}"), 1.5),
        };
        let va = volts * self.amps * 2.0 * windings * r.between(0.7, 2.0);
        core(r, secondary, va, mains_v)
    }

    fn rectifier(&self, r: &mut Random) -> (Cells, usize) {
        let bridge = r.chance(0.65);
        let mut cells = vec![
            ("kind", (if bridge { "bridge" } else { "diode" }).to_owned()),
            ("vrrm_v", r.pick(&[60, 100, 200]).to_string()),
            ("io_a", format!("{:.2}", self.amps * r.between(1.1, 3.0))),
            ("ifsm_a", r.pick(&[30, 50, 100]).to_string()),
            ("rth_ja_k_w", r.pick(&[20, 35, 50]).to_string()),
            ("tj_max_c", r.pick(&[125, 150, 150]).to_string()),
        ];
        if r.chance(0.3) {
            cells.push(("type", "schottky".into()));
        }
        if r.chance(0.5) {
            cells.push(("io_for", "capacitive".into()));
        }
        if r.chance(0.5) {
            cells.push(("vf_v", "1.0".into()));
            cells.push(("vf_a", r.pick(&[1, 2, 3]).to_string()));
        } else {
            cells.push(("threshold_v", r.pick(&["0.7", "0.75", "0.45"]).to_string()));
            cells.push(("slope_mohm", r.pick(&[20, 40, 60]).to_string()));
        }
        if r.chance(0.5) {
            // Of a diode too: it stands free all the same.
            cells.push(("case", "GBU".into()));
            cells.push(("rth_jc_k_w", r.pick(&[2, 4]).to_string()));
        }
        blank(r, &mut cells, &["vrrm_v", "ifsm_a", "rth_ja_k_w", "rth_jc_k_w"]);
        (cells, if bridge { 3 + r.below(4) } else { 1 + r.below(2) })
    }

    fn reservoir(&self, r: &mut Random) -> Cells {
        let wanted_uf = self.amps * r.between(2200.0, 7000.0) * if self.half_wave { 2.0 } else { 1.0 };
        let volts = (self.out_v + 7.0) * 1.7;
        let mut cells = vec![
            ("c_uf", format!("{:.0}", (wanted_uf / 100.0).ceil() * 100.0)),
            ("v_rated_v", r.pick(&[25, 35, 50, 63]).max(&(volts as i32)).to_string()),
            ("ripple_a", format!("{:.2}", self.amps * r.between(0.9, 3.0))),
            ("t_max_c", r.pick(&[85, 105, 105]).to_string()),
            ("life_h", r.pick(&[2000, 5000]).to_string()),
        ];
        if r.chance(0.3) {
            cells.push(("esr_mohm", r.pick(&[15, 30, 60]).to_string()));
            cells.push(("esr_hz", "100000".into()));
        } else {
            cells.push(("esr_mohm", r.pick(&[30, 60, 150]).to_string()));
        }
        if r.chance(0.2) {
            cells.push(("ripple_hz", "100 kHz".into()));
        }
        if r.chance(0.3) {
            cells.push(("tol_plus_pct", "30".into()));
            cells.push(("tol_minus_pct", "10".into()));
        }
        blank(r, &mut cells, &["esr_mohm", "ripple_a", "life_h"]);
        cells
    }

    fn pass_device(&self, r: &mut Random) -> Cells {
        let fixed = r.chance(0.6);
        let minus = self.negative && !self.floating && r.chance(0.7);
        let mut cells = vec![
            ("kind", (if fixed { "fixed" } else { "adjustable" }).to_owned()),
            ("polarity", (if minus { "-" } else { "+" }).to_owned()),
            ("tol_pct", r.pick(&[1, 2, 4]).to_string()),
            ("dropout_v", r.pick(&["0.6", "1.3", "2", "2.5"]).to_string()),
            ("iout_max_a", format!("{:.1}", self.amps * r.between(1.0, 2.0) + 0.05)),
            ("ground_ma", r.pick(&["5", "5", "5", "8", "0.1"]).to_string()),
            ("psrr_db", r.pick(&[50, 60, 70]).to_string()),
            ("load_reg_pct", r.pick(&["0.5", "1"]).to_string()),
            ("line_reg_pct_v", r.pick(&["0.02", "0.1"]).to_string()),
            ("rth_jc_k_w", r.pick(&[2, 4]).to_string()),
            ("rth_ja_k_w", r.pick(&[30, 50, 65]).to_string()),
            ("tj_max_c", r.pick(&[125, 150, 150]).to_string()),
            ("case", (*r.pick(&["TO-220", "to-220", "TO-252"])).to_owned()),
        ];
        if fixed {
            cells.push(("vout_v", self.out_v.to_string()));
        } else {
            cells.extend([
                ("vref_v", "1.25".to_owned()),
                ("vout_min_v", "1.25".into()),
                ("vout_max_v", "30".into()),
            ]);
            if r.chance(0.3) {
                cells.push(("psrr_vout_v", "10".into()));
            }
        }
        if r.chance(0.3) {
            cells.push(("dropout_light_v", "0.4".into()));
        }
        let idle_v = (self.out_v + 7.0) * 1.6;
        if r.chance(0.75) {
            cells.push(("vin_max_v", format!("{:.0}", idle_v * r.between(0.9, 1.4))));
        } else {
            cells.push((
                "vdiff_max_v",
                format!("{:.0}", (idle_v - self.out_v) * r.between(0.9, 1.4)),
            ));
        }
        if r.chance(0.3) {
            cells.push(("fitted_price", (*r.pick(&["0.1", "0.2"])).to_owned()));
        }
        blank(r, &mut cells, &["psrr_db", "ground_ma", "rth_ja_k_w", "case"]);
        cells
    }
}

/// A transformer with a winding for each of these sections: often equal ones, two of them often the halves of x-0-x.
pub fn shared_transformer(r: &mut Random, sections: &[Ask], mains_v: u32) -> Cells {
    let mut volts: Vec<f64> = sections.iter().map(|s| s.winding_v(r)).collect();
    let mut amps: Vec<f64> = sections.iter().map(|s| s.amps * r.between(1.5, 2.6)).collect();
    let most = |of: &[f64]| of.iter().copied().fold(0.0, f64::max);
    let equal = r.chance(0.6);
    if equal {
        volts = vec![most(&volts); volts.len().max(2)];
        amps = vec![most(&amps); volts.len()];
    }
    let va = volts.iter().zip(&amps).map(|(v, a)| v * a).sum::<f64>() * r.between(0.8, 1.5);
    let tapped = equal && volts.len() == 2 && r.chance(0.4);
    let list = |of: &[f64], digits: usize| {
        let numbers: Vec<String> = of.iter().map(|x| format!("{x:.digits$}")).collect();
        numbers.join("+")
    };
    let secondary = if tapped {
        format!("{:.1}-0-{0:.1}", volts[0])
    } else {
        list(&volts, 1)
    };
    let mut cells = core(r, secondary, va, mains_v);
    if !tapped && r.chance(0.6) {
        cells.push(("secondary_a", list(&amps, 2)));
    }
    cells
}

/// The cells of a transformer with these secondaries.
fn core(r: &mut Random, secondary: String, va: f64, mains_v: u32) -> Cells {
    let va = va.max(3.0).ceil();
    let primary = match (mains_v, r.below(3)) {
        (230, 0) => "230",
        (120, 0) => "120",
        (230, 1) => "115+115",
        _ => "100/120/230",
    };
    let mut cells = vec![
        ("primary_v", primary.to_owned()),
        ("va", va.to_string()),
        ("secondary_v", secondary),
        ("regulation_pct", r.pick(&[8, 10, 12, 15]).to_string()),
        ("core", (*r.pick(&["laminated", "laminated", "toroid"])).to_owned()),
        ("ta_c", r.pick(&[50, 60, 70]).to_string()),
    ];
    if r.chance(0.6) {
        cells.push(("core_loss_w", format!("{}", (va * 0.4).round() / 10.0)));
    }
    if r.chance(0.3) {
        cells.push(("v_tol_pct", "2".into()));
    }
    if r.chance(0.1) {
        cells.retain(|(column, _)| *column != "core" && *column != "ta_c");
    }
    cells
}

fn sink(r: &mut Random) -> Cells {
    let mut cells = vec![
        (
            "cases",
            (*r.pick(&["TO-220", "TO-220 GBU", "to-220 TO-252", "GBU TO-252"])).to_owned(),
        ),
        ("rth_sa_k_w", r.pick(&[3, 6, 10, 15, 20]).to_string()),
    ];
    if r.chance(0.3) {
        cells.push(("rise_k", "60".into()));
    }
    if r.chance(0.4) {
        cells.push(("rth_cs_k_w", "0.5".into()));
    }
    cells
}

/// Leaves one of these cells out of some rows.
fn blank(r: &mut Random, cells: &mut Cells, columns: &[&str]) {
    if r.chance(0.12) {
        let column = *r.pick(columns);
        cells.retain(|(c, _)| *c != column);
    }
}

//! Small supplies and catalogues to hold best companies against brute force.

use std::collections::BTreeSet;

use binrail::catalogue::*;
use binrail::optimise::Question;
use binrail::screen::Objective;
use binrail::supply::{Ageing, Ambient, Caps, Mains, Margins, Path, Rail, Supply};
use binrail::units::Money;

use crate::common::Random;

/// A question with what it asks about.
pub(crate) struct Case {
    pub(crate) supply: Supply,
    pub(crate) catalogue: Catalogue,
    pub(crate) without: BTreeSet<PartId>,
    pub(crate) with: Vec<(PartId, Option<usize>)>,
}

impl Case {
    pub(crate) fn question(&self) -> Question<'_> {
        Question {
            without: self.without.clone(),
            with: self.with.clone(),
            ..Question::new(&self.supply, &self.catalogue, Objective::Cost)
        }
    }

    pub(crate) fn id(&self, name: &str) -> PartId {
        self.catalogue.find(name).unwrap().id
    }
}

pub(crate) fn part(slot: Slot, name: String, price: i64) -> Part {
    Part {
        id: PartId(0),
        slot,
        name,
        description: String::new(),
        price: Money(price * 10_000),
        breaks: Vec::new(),
        stock: None,
        status: Status::Current,
        height_m: Some(0.03),
        cells: Vec::new(),
        line: 0,
    }
}

/// Ids as the reader gives them.
pub(crate) fn numbered(mut c: Catalogue) -> Catalogue {
    let parts = (c.transformers.iter_mut().map(|x| &mut x.part))
        .chain(c.rectifiers.iter_mut().map(|x| &mut x.part))
        .chain(c.reservoirs.iter_mut().map(|x| &mut x.part))
        .chain(c.pass_devices.iter_mut().map(|x| &mut x.part))
        .chain(c.sinks.iter_mut().map(|x| &mut x.part));
    for (id, part) in (0..).zip(parts) {
        part.id = PartId(id);
    }
    c
}

pub(crate) fn supply(rails: Vec<Rail>) -> Supply {
    Supply {
        name: "case".into(),
        builds: 10,
        catalogue: None,
        mains: Mains {
            low_v: 207.0,
            nominal_v: 230.0,
            high_v: 253.0,
            frequency_hz: 50.0,
            flat_top: 0.03,
        },
        ambient: Ambient {
            low_c: 0.0,
            high_c: 40.0,
            inside_rise_k: 5.0,
        },
        margins: Margins {
            headroom_v: 0.25,
            reservoir: 0.1,
            reverse: 0.5,
            junction_k: 15.0,
        },
        ageing: Ageing {
            capacitance_loss: 0.2,
            esr_rise: 2.0,
            life_h: 10000.0,
        },
        caps: Caps {
            cost: None,
            heat_w: None,
            height_m: None,
            cans: 2,
        },
        share_never: true,
        rails,
        content: serde_json::Value::Null,
    }
}

pub(crate) fn rail(name: &str, voltage_v: f64, current_a: f64) -> Rail {
    Rail {
        name: name.into(),
        voltage_v,
        current_a,
        idle_a: 0.0,
        accuracy: None,
        ripple_v: None,
        dip_s: None,
        paths: vec![Path::Bridge, Path::CentreTap],
        devices: vec![DeviceKind::Fixed, DeviceKind::Adjustable],
        isolated: false,
        short_circuit_survive: false,
        section: None,
    }
}

pub(crate) fn transformer(name: &str, va: f64, volts: &[f64]) -> Transformer {
    let amps_a = va / volts.iter().sum::<f64>();
    Transformer {
        part: part(Slot::Transformer, name.into(), 600),
        primary_v: vec![230.0],
        freq_min_hz: 50.0,
        va,
        secondaries: volts
            .iter()
            .map(|&volts_v| Secondary {
                volts_v,
                amps_a,
                tapped: None,
            })
            .collect(),
        regulation: 0.12,
        winding_c: 85.0,
        primary_share: 0.5,
        v_tol: 0.0,
        core_loss_w: Some(1.0),
        core: Some(Core::Laminated),
        ta_c: 60.0,
    }
}

pub(crate) fn bridge(name: &str) -> Rectifier {
    Rectifier {
        part: part(Slot::Rectifier, name.into(), 40),
        kind: RectifierKind::Bridge,
        junction: Junction::Junction,
        vrrm_v: Some(200.0),
        io_a: Some(4.0),
        io_capacitive: true,
        ifsm_a: Some(150.0),
        forward: Ok(Forward::Line {
            threshold_v: 0.75,
            slope_ohm: 0.03,
        }),
        rth_ja_k_w: Some(22.0),
        rth_jc_k_w: Some(4.0),
        case: Some("GBU".into()),
        tj_max_c: Some(150.0),
    }
}

pub(crate) fn can(name: &str, c_uf: f64, v_rated_v: f64) -> Reservoir {
    Reservoir {
        part: part(Slot::Reservoir, name.into(), 50),
        c_f: c_uf * 1e-6,
        tol_minus: 0.2,
        tol_plus: 0.2,
        v_rated_v: Some(v_rated_v),
        esr_ohm: Some(0.05),
        esr_hz: 100.0,
        ripple_a: Some(3.0),
        ripple_hz: 100.0,
        t_max_c: Some(105.0),
        life_h: Some(3000.0),
    }
}

pub(crate) fn fixed(name: &str, vout_v: f64) -> PassDevice {
    PassDevice {
        part: part(Slot::Pass, name.into(), 60),
        kind: DeviceKind::Fixed,
        polarity: Polarity::Positive,
        vout_v: Some(vout_v),
        vout_min_v: None,
        vout_max_v: None,
        vref_v: None,
        tol: Some(0.03),
        dropout_v: Some(2.0),
        dropout_light_v: None,
        vin_max_v: Some(35.0),
        vdiff_max_v: None,
        iout_max_a: Some(1.5),
        ground_a: Some(0.006),
        min_load_a: 0.0,
        psrr_db: Some(60.0),
        psrr_vout_v: None,
        load_reg: 0.005,
        line_reg_per_v: 0.0002,
        rth_jc_k_w: Some(3.0),
        rth_ja_k_w: Some(60.0),
        tj_max_c: Some(150.0),
        case: Some("TO-220".into()),
        vbe_v: None,
        hfe_min: None,
        soa: Vec::new(),
        fitted_price: Money(0),
        iz_min_a: None,
        iz_max_a: None,
        rz_ohm: None,
    }
}

pub(crate) fn sink(name: &str, cases: &[&str], rth: f64) -> Sink {
    Sink {
        part: part(Slot::Sink, name.into(), 70),
        cases: cases.iter().map(ToString::to_string).collect(),
        rth_sa_k_w: Some(rth),
        rise_k: None,
        rth_cs_k_w: 1.0,
    }
}

/// A cell that is blank now and then.
fn blank<T>(r: &mut Random, cell: Option<T>) -> Option<T> {
    cell.filter(|_| !r.chance(0.02))
}

fn vary(r: &mut Random, part: &mut Part) {
    part.price = Money((part.price.0 as f64 * r.between(0.4, 2.0) / 1e4).round() as i64 * 10_000);
    if r.chance(0.4) {
        let price = Money(part.price.0 * 8 / 10);
        part.breaks = vec![Break {
            pieces: 1 + r.below(30) as u64,
            price,
        }];
    }
    part.stock = r.chance(0.35).then(|| r.below(60) as u64);
    part.height_m = if r.chance(0.97) {
        Some(r.between(0.005, 0.06))
    } else {
        None
    };
    part.status = *r.pick(&[
        Status::Current,
        Status::Current,
        Status::Current,
        Status::Current,
        Status::LastBuy,
        Status::Withdrawn,
    ]);
}

/// Even on a logarithmic scale from the first of `least` where it is hard, from the second where not.
fn between_decades(r: &mut Random, hard: f64, least: [f64; 2], most: f64) -> f64 {
    let low = least[usize::from(!r.chance(hard))];
    r.decades(low, most)
}

/// A small catalogue around what the rails need, and demands between easy and far too hard.
pub(crate) fn case(r: &mut Random) -> Case {
    let hard = r.unit();
    let rails: Vec<Rail> = (0..1 + r.below(2)).map(|place| random_rail(r, place, hard)).collect();
    let (out_v, load_a) = (rails[0].voltage_v.abs(), rails[0].current_a);
    let mut c = Catalogue::default();
    for i in 0..2 + r.below(4) {
        c.transformers.push(random_transformer(r, i, out_v, load_a, hard));
    }
    for i in 0..1 + r.below(4) {
        c.rectifiers.push(random_rectifier(r, i, out_v, load_a, hard));
    }
    for i in 0..1 + r.below(4) {
        c.reservoirs.push(random_reservoir(r, i, load_a, hard));
    }
    for i in 0..2 + r.below(4) {
        c.pass_devices.push(random_device(r, i, &rails, hard));
    }
    for i in 0..r.below(5) {
        let outlines: [&[&str]; 5] = [&["TO-220"], &["TO-220", "GBU"], &["GBU"], &["TO-247"], &["TO-3"]];
        let cases = *r.pick(&outlines);
        let mut s = sink(&format!("S{i}"), cases, r.decades(1.0, 30.0));
        vary(r, &mut s.part);
        s.rise_k = r.chance(0.5).then(|| *r.pick(&[60.0, 75.0]));
        s.rth_sa_k_w = blank(r, s.rth_sa_k_w);
        c.sinks.push(s);
    }
    let catalogue = numbered(c);
    let mut supply = supply(rails);
    supply.builds = 1 + r.below(20) as u64;
    supply.ambient.low_c = *r.pick(&[-20.0, 0.0, 20.0]);
    if r.chance(hard) {
        supply.ambient.high_c = *r.pick(&[45.0, 60.0, 75.0]);
    }
    if r.chance(0.5) {
        supply.ageing.life_h = 5000.0;
    }
    supply.caps.cost = r.chance(0.5 * hard).then(|| r.between(4.0, 20.0));
    supply.caps.heat_w = r
        .chance(0.5 * hard)
        .then(|| (out_v + 3.0) * load_a * r.decades(0.1, 3.0));
    supply.caps.height_m = r.chance(0.5 * hard).then(|| r.between(0.01, 0.06));
    let count = catalogue.parts().count();
    let id = |r: &mut Random| PartId(r.below(count) as u32);
    Case {
        supply,
        catalogue,
        without: if r.chance(0.15) {
            BTreeSet::from([id(r)])
        } else {
            BTreeSet::new()
        },
        with: if r.chance(0.15) {
            vec![(id(r), None)]
        } else {
            Vec::new()
        },
    }
}

fn random_rail(r: &mut Random, place: usize, hard: f64) -> Rail {
    let out_v = *r.pick(&[5.0, 12.0, -12.0, 3.3, 24.0]);
    let mut rail = rail(["one", "two"][place], out_v, r.decades(0.05, 1.5));
    rail.accuracy = r.chance(0.6 * hard).then(|| r.between(0.01, 0.08));
    rail.ripple_v = r.chance(0.6 * hard).then(|| r.decades(0.0005, 0.05));
    rail.dip_s = r.chance(0.6 * hard).then(|| r.between(0.002, 0.021));
    rail.paths.extend(r.chance(0.3).then_some(Path::HalfWave));
    rail.paths.extend(r.chance(0.3).then_some(Path::Dual));
    rail
}

fn random_transformer(r: &mut Random, place: usize, out_v: f64, load_a: f64, hard: f64) -> Transformer {
    let name = format!("T{place}");
    let (least, most) = if r.chance(hard) { (0.5, 2.0) } else { (0.9, 1.3) };
    let volts = (out_v + 4.0) * r.between(least, most);
    let va = volts * load_a * between_decades(r, hard, [0.5, 2.0], 8.0);
    let mut t = match r.below(4) {
        0 => transformer(&name, va, &[volts]),
        1 => transformer(&name, va, &[volts, volts]),
        2 => transformer(&name, va, &[volts, volts * 1.5]),
        _ => {
            let mut t = transformer(&name, va, &[volts / 2.0, volts / 2.0]);
            t.secondaries.iter_mut().for_each(|s| s.tapped = Some(1));
            t
        }
    };
    vary(r, &mut t.part);
    t.regulation = r.between(0.05, 0.25);
    t.v_tol = *r.pick(&[0.0, 0.02]);
    t.core = *r.pick(&[None, Some(Core::Laminated), Some(Core::Toroid)]);
    if r.chance(hard) {
        t.ta_c = *r.pick(&[40.0, 60.0, 70.0]);
        t.freq_min_hz = *r.pick(&[50.0, 50.0, 60.0]);
        t.primary_v = r.pick(&[vec![230.0], vec![115.0, 230.0], vec![120.0]]).clone();
    }
    t
}

fn random_rectifier(r: &mut Random, place: usize, out_v: f64, load_a: f64, hard: f64) -> Rectifier {
    let mut d = bridge(&format!("D{place}"));
    vary(r, &mut d.part);
    if r.chance(0.5) {
        d.kind = RectifierKind::Diode;
    }
    d.junction = *r.pick(&[Junction::Junction, Junction::Schottky]);
    d.vrrm_v = Some((out_v + 5.0) * r.decades(2.0, 20.0));
    d.io_a = Some(load_a * between_decades(r, hard, [0.5, 1.5], 4.0));
    d.io_capacitive = r.chance(0.5);
    d.ifsm_a = Some(load_a * between_decades(r, hard, [5.0, 50.0], 200.0));
    let point = Forward::Point {
        vf_v: r.between(0.5, 1.1),
        vf_a: load_a * 2.0,
    };
    let line = Forward::Line {
        threshold_v: r.between(0.3, 0.8),
        slope_ohm: r.decades(0.01, 0.3) / load_a.max(0.3),
    };
    d.forward = *r.pick(&[Ok(point), Ok(line), Ok(line)]);
    if r.chance(0.02) {
        d.forward = Err("threshold_v");
    }
    d.rth_ja_k_w = Some(r.decades(15.0, 100.0));
    d.case = r.pick(&[None, Some("GBU".into()), Some("TO-220".into())]).clone();
    let cells = [
        &mut d.vrrm_v,
        &mut d.io_a,
        &mut d.ifsm_a,
        &mut d.rth_ja_k_w,
        &mut d.rth_jc_k_w,
        &mut d.tj_max_c,
    ];
    cells.into_iter().for_each(|cell| *cell = blank(r, *cell));
    d
}

fn random_reservoir(r: &mut Random, place: usize, load_a: f64, hard: f64) -> Reservoir {
    let c_uf = load_a * between_decades(r, hard, [200.0, 2000.0], 10000.0);
    let v_rated_v = if r.chance(hard) {
        *r.pick(&[16.0, 25.0, 35.0])
    } else {
        63.0
    };
    let mut x = can(&format!("C{place}"), c_uf, v_rated_v);
    vary(r, &mut x.part);
    x.esr_ohm = Some(r.decades(0.02, 0.5) / load_a.max(0.3));
    x.esr_hz = *r.pick(&[100.0, 100_000.0]);
    x.ripple_a = Some(load_a * between_decades(r, hard, [0.3, 2.0], 4.0));
    x.t_max_c = Some(*r.pick(&[85.0, 105.0]));
    x.life_h = Some(r.decades(1000.0, 10000.0));
    let cells = [
        &mut x.v_rated_v,
        &mut x.esr_ohm,
        &mut x.ripple_a,
        &mut x.t_max_c,
        &mut x.life_h,
    ];
    cells.into_iter().for_each(|cell| *cell = blank(r, *cell));
    x
}

fn random_device(r: &mut Random, place: usize, rails: &[Rail], hard: f64) -> PassDevice {
    let rail = r.pick(rails);
    let load_a = rail.current_a;
    let out_v = if r.chance(0.95) { rail.voltage_v.abs() } else { 9.0 };
    let mut p = fixed(&format!("P{place}"), out_v);
    vary(r, &mut p.part);
    if r.chance(0.35) {
        (p.kind, p.vout_v) = (DeviceKind::Adjustable, None);
        (p.vout_min_v, p.vout_max_v, p.vref_v) = (Some(1.25), Some(30.0), Some(1.25));
    }
    if rail.voltage_v < 0.0 && r.chance(0.5) || r.chance(0.05) {
        p.polarity = Polarity::Negative;
    }
    p.tol = Some(*r.pick(&[0.01, 0.02, 0.04]));
    p.dropout_v = Some(r.between(0.4, 2.5));
    p.dropout_light_v = r.chance(0.3).then_some(0.3);
    p.vin_max_v = r.chance(0.7).then(|| (out_v + 10.0) * r.between(1.0, 3.0));
    p.vdiff_max_v = r.chance(0.3).then(|| r.between(8.0, 40.0));
    p.iout_max_a = Some(load_a * between_decades(r, hard, [0.5, 1.1], 3.0));
    p.ground_a = Some(load_a * r.decades(0.0001, 0.05));
    p.psrr_db = Some(r.between(30.0, 70.0));
    p.rth_jc_k_w = Some(r.decades(1.0, 8.0));
    p.tj_max_c = Some(*r.pick(&[125.0, 150.0]));
    if r.chance(hard) {
        p.case = r.pick(&[None, Some("TO-247".into())]).clone();
    }
    p.fitted_price = *r.pick(&[Money(0), Money(150_000)]);
    let cells = [
        &mut p.tol,
        &mut p.dropout_v,
        &mut p.iout_max_a,
        &mut p.ground_a,
        &mut p.psrr_db,
        &mut p.rth_jc_k_w,
        &mut p.rth_ja_k_w,
        &mut p.tj_max_c,
        &mut p.vref_v,
    ];
    cells.into_iter().for_each(|cell| *cell = blank(r, *cell));
    p
}

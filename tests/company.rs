//! Best companies and joint limits against brute force: every build of one rail, through the full audit.
#![allow(clippy::unwrap_used)]

mod common;

use std::collections::{BTreeMap, BTreeSet};
use std::time::Instant;

use binrail::audit::{Limit, audit};
use binrail::build::{
    Build, Instance, RailChoice, Section, device_serves, hookups, misfits, pieces_of_rectifier, sink_takes,
};
use binrail::catalogue::*;
use binrail::optimise::{Joint, Question, companies, optimise, rejections};
use binrail::screen::{Objective, Stop};
use binrail::supply::{Ageing, Ambient, Caps, Mains, Margins, Path, Rail, Supply};
use binrail::units::Money;
use common::Random;

/// Best company of a part: its least tightness, whether it is met, and the first tightest limit of every build that ties.
struct Best {
    tightness: f64,
    met: bool,
    limits: BTreeSet<Limit>,
}

struct Case {
    supply: Supply,
    catalogue: Catalogue,
    without: BTreeSet<PartId>,
    with: Vec<(PartId, Option<usize>)>,
}

impl Case {
    fn question(&self) -> Question<'_> {
        Question {
            supply: &self.supply,
            catalogue: &self.catalogue,
            objective: Objective::Cost,
            top: 1,
            without: self.without.clone(),
            with: self.with.clone(),
            stop: Stop::default(),
            node_budget: binrail::optimise::NODE_BUDGET,
        }
    }

    fn usable(&self, part: &Part) -> bool {
        let named = self.with.iter().any(|&(id, _)| id == part.id);
        (part.status != Status::Withdrawn || named) && !self.without.contains(&part.id)
    }

    /// Every build of one rail alone.
    fn builds(&self, supply: &Supply, mut to: impl FnMut(&Build)) {
        let (rail, c) = (&supply.rails[0], &self.catalogue);
        let coolers = |case: Option<&str>| -> Vec<Option<&Sink>> {
            let fitting = c.sinks.iter().filter(|s| self.usable(&s.part) && sink_takes(s, case));
            std::iter::once(None).chain(fitting.map(Some)).collect()
        };
        for transformer in c.transformers.iter().filter(|t| self.usable(&t.part)) {
            for hookup in hookups(transformer) {
                for &path in rail.paths.iter().filter(|&&p| hookup.kind.takes(p)) {
                    for rectifier in c.rectifiers.iter().filter(|r| self.usable(&r.part)) {
                        if pieces_of_rectifier(rectifier.kind, path) == 0 {
                            continue;
                        }
                        let module = rectifier.kind == RectifierKind::Bridge;
                        for rectifier_sink in coolers(rectifier.case.as_deref().filter(|_| module)) {
                            for reservoir in c.reservoirs.iter().filter(|r| self.usable(&r.part)) {
                                for cans in 1..=supply.caps.cans {
                                    for pass in c.pass_devices.iter().filter(|d| self.usable(&d.part)) {
                                        if !device_serves(pass, rail, true) {
                                            continue;
                                        }
                                        for sink in coolers(pass.case.as_deref()) {
                                            to(&Build {
                                                transformers: vec![Instance {
                                                    id: "T1".into(),
                                                    part: transformer,
                                                }],
                                                sections: vec![Section {
                                                    id: "A".into(),
                                                    transformer: 0,
                                                    hookup: hookup.clone(),
                                                    path,
                                                    rectifier,
                                                    rectifier_sink,
                                                    reservoir,
                                                    cans,
                                                    rails: vec![0],
                                                }],
                                                rails: vec![RailChoice { section: 0, pass, sink }],
                                            });
                                        }
                                    }
                                }
                            }
                        }
                    }
                }
            }
        }
    }

    fn brute(&self) -> (BTreeMap<PartId, Best>, Vec<bool>) {
        let mut best: BTreeMap<PartId, Best> = BTreeMap::new();
        let mut passes = Vec::new();
        for rail in &self.supply.rails {
            let alone = Supply {
                rails: vec![rail.clone()],
                ..self.supply.clone()
            };
            let mut passing = false;
            self.builds(&alone, |build| {
                assert_eq!(misfits(&alone, build), []);
                let verdict = audit(&alone, build);
                passing |= verdict.passes();
                let least = verdict.tightest().unwrap().check;
                let ties = verdict
                    .margins
                    .iter()
                    .map(|m| m.check)
                    .filter(|c| c.tightness() == least.tightness());
                let limit = ties.map(|c| c.limit).min().unwrap();
                for (part, _) in build.uses() {
                    let entry = best.entry(part.id).or_insert(Best {
                        tightness: f64::NEG_INFINITY,
                        met: false,
                        limits: BTreeSet::new(),
                    });
                    entry.met |= verdict.passes();
                    if least.tightness() > entry.tightness {
                        entry.tightness = least.tightness();
                        entry.limits.clear();
                    }
                    if least.tightness() == entry.tightness {
                        entry.limits.insert(limit);
                    }
                }
            });
            passes.push(passing);
        }
        (best, passes)
    }
}

#[test]
fn best_companies_equal_brute_force() {
    let mut seen: BTreeMap<&str, usize> = BTreeMap::new();
    let mut limits: BTreeMap<Limit, usize> = BTreeMap::new();
    let seeds = std::env::var("SEEDS").map_or(120, |s| s.parse().unwrap());
    for seed in 1..=seeds {
        let case = case(&mut Random::new(seed));
        let (best, passes) = case.brute();
        let got = companies(&case.question());
        let mut count = |what: &'static str| *seen.entry(what).or_insert(0) += 1;
        assert!(got.complete, "seed {seed}");
        assert_eq!(got.passes, passes, "seed {seed}");
        count(if passes.iter().all(|&p| p) { "passes" } else { "fails" });
        for part in case.catalogue.parts() {
            let at = format!("seed {seed}, {}", part.name);
            match (best.get(&part.id), got.of[part.id.0 as usize]) {
                (None, None) => count("in no build"),
                (Some(wanted), Some(company)) if wanted.met => assert!(company.met, "{at}"),
                (Some(wanted), Some(company)) => {
                    assert!(!company.met, "{at}");
                    let off = (company.tightness - wanted.tightness).abs();
                    assert!(
                        off <= 1e-12 * wanted.tightness.abs(),
                        "{at}: got {company:?}, wanted {} by {:?}",
                        wanted.tightness,
                        wanted.limits
                    );
                    assert!(
                        wanted.limits.contains(&company.limit),
                        "{at}: {:?} is not in {:?}",
                        company.limit,
                        wanted.limits
                    );
                    assert_eq!(company.margin.is_none(), wanted.tightness == -1e9, "{at}");
                    *limits.entry(company.limit).or_insert(0) += 1;
                    count("rejected");
                }
                (wanted, company) => panic!("{at}: wanted {}, got {company:?}", wanted.is_some()),
            }
        }
        let reasons = rejections(&case.question()).unwrap();
        let rejected: usize = reasons.rejected.iter().map(|r| r.count).sum();
        assert_eq!(rejected, best.values().filter(|b| !b.met).count(), "seed {seed}");
    }
    println!("{seen:?}\n{limits:?}");
    assert!(
        seen["fails"] >= 60 && seen["rejected"] >= 500 && seen["in no build"] >= 20,
        "{seen:?}"
    );
    assert!(limits.len() >= 18, "{limits:?}");
}

fn part(slot: Slot, name: String, price: i64) -> Part {
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
fn numbered(mut c: Catalogue) -> Catalogue {
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

fn supply(rails: Vec<Rail>) -> Supply {
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
            life_h: 20000.0,
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

fn rail(name: &str, voltage_v: f64, current_a: f64) -> Rail {
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

fn transformer(name: &str, va: f64, volts: &[f64]) -> Transformer {
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

fn bridge(name: &str) -> Rectifier {
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

fn can(name: &str, c_uf: f64, v_rated_v: f64) -> Reservoir {
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

fn fixed(name: &str, vout_v: f64) -> PassDevice {
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

fn sink(name: &str, cases: &[&str], rth: f64) -> Sink {
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
    cell.filter(|_| !r.chance(0.03))
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

/// A small catalogue around what the rails need, and demands that are mostly too hard.
fn case(r: &mut Random) -> Case {
    let outs: Vec<f64> = (0..1 + r.below(2))
        .map(|_| *r.pick(&[5.0, 12.0, -12.0, 3.3, 24.0]))
        .collect();
    let mut rails = Vec::new();
    for (place, &out_v) in outs.iter().enumerate() {
        let mut rail = rail(["one", "two"][place], out_v, r.decades(0.05, 2.0));
        rail.accuracy = r.chance(0.4).then(|| r.between(0.02, 0.08));
        rail.ripple_v = r.chance(0.4).then(|| r.decades(0.0005, 0.05));
        rail.dip_s = r.chance(0.3).then(|| r.between(0.002, 0.021));
        if r.chance(0.3) {
            rail.paths.push(Path::HalfWave);
        }
        if r.chance(0.3) {
            rail.paths.push(Path::Dual);
        }
        rails.push(rail);
    }
    let (out_v, load_a) = (outs[0].abs(), rails[0].current_a);
    let mut c = Catalogue::default();
    for i in 0..1 + r.below(3) {
        let volts = (out_v + 4.0) * r.between(0.5, 2.0);
        let va = volts * load_a * r.decades(0.5, 8.0);
        let mut t = match r.below(4) {
            0 => transformer(&format!("T{i}"), va, &[volts]),
            1 => transformer(&format!("T{i}"), va, &[volts, volts]),
            2 => transformer(&format!("T{i}"), va, &[volts, volts * 1.5]),
            _ => {
                let mut t = transformer(&format!("T{i}"), va, &[volts / 2.0, volts / 2.0]);
                t.secondaries.iter_mut().for_each(|s| s.tapped = Some(1));
                t
            }
        };
        vary(r, &mut t.part);
        t.regulation = r.between(0.05, 0.25);
        t.v_tol = *r.pick(&[0.0, 0.02]);
        t.ta_c = *r.pick(&[40.0, 60.0, 70.0]);
        t.freq_min_hz = *r.pick(&[50.0, 50.0, 50.0, 60.0]);
        t.core = *r.pick(&[None, Some(Core::Laminated), Some(Core::Toroid)]);
        t.primary_v = r.pick(&[vec![230.0], vec![115.0, 230.0], vec![120.0]]).clone();
        c.transformers.push(t);
    }
    for i in 0..1 + r.below(3) {
        let mut d = bridge(&format!("D{i}"));
        vary(r, &mut d.part);
        if r.chance(0.5) {
            d.kind = RectifierKind::Diode;
            d.rth_ja_k_w = Some(50.0);
        }
        d.junction = *r.pick(&[Junction::Junction, Junction::Schottky]);
        d.vrrm_v = Some(r.decades(20.0, 400.0));
        d.io_a = Some(load_a * r.decades(0.5, 4.0));
        d.io_capacitive = r.chance(0.5);
        d.ifsm_a = Some(r.decades(5.0, 200.0));
        let point = Forward::Point {
            vf_v: r.between(0.5, 1.1),
            vf_a: load_a * 2.0,
        };
        let line = Forward::Line {
            threshold_v: r.between(0.3, 0.8),
            slope_ohm: r.decades(0.01, 0.3),
        };
        d.forward = *r.pick(&[Ok(point), Ok(line), Ok(line)]);
        if r.chance(0.03) {
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
        c.rectifiers.push(d);
    }
    for i in 0..1 + r.below(3) {
        let mut x = can(
            &format!("C{i}"),
            load_a * r.decades(300.0, 10000.0),
            *r.pick(&[16.0, 25.0, 35.0, 63.0]),
        );
        vary(r, &mut x.part);
        x.esr_ohm = Some(r.decades(0.02, 0.5));
        x.esr_hz = *r.pick(&[100.0, 100_000.0]);
        x.ripple_a = Some(load_a * r.decades(0.3, 4.0));
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
        c.reservoirs.push(x);
    }
    for i in 0..1 + r.below(4) {
        let out_v = if r.chance(0.9) { r.pick(&outs).abs() } else { 9.0 };
        let mut p = fixed(&format!("P{i}"), out_v);
        vary(r, &mut p.part);
        if r.chance(0.35) {
            (p.kind, p.vout_v) = (DeviceKind::Adjustable, None);
            (p.vout_min_v, p.vout_max_v, p.vref_v) = (Some(1.25), Some(30.0), Some(1.25));
        }
        if r.chance(0.25) {
            p.polarity = Polarity::Negative;
        }
        p.tol = Some(*r.pick(&[0.01, 0.02, 0.04]));
        p.dropout_v = Some(r.between(0.4, 2.5));
        p.dropout_light_v = r.chance(0.3).then_some(0.3);
        p.vin_max_v = r.chance(0.7).then(|| r.between(15.0, 45.0));
        p.vdiff_max_v = r.chance(0.3).then(|| r.between(8.0, 40.0));
        p.iout_max_a = Some(load_a * r.decades(0.5, 3.0));
        p.ground_a = Some(load_a * r.decades(0.0001, 0.05));
        p.psrr_db = Some(r.between(30.0, 70.0));
        p.rth_jc_k_w = Some(r.decades(1.0, 8.0));
        p.tj_max_c = Some(*r.pick(&[125.0, 150.0]));
        p.case = r
            .pick(&[
                None,
                Some("TO-220".into()),
                Some("TO-220".into()),
                Some("TO-247".into()),
            ])
            .clone();
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
        c.pass_devices.push(p);
    }
    for i in 0..r.below(4) {
        let outlines: [&[&str]; 5] = [&["TO-220"], &["TO-220", "GBU"], &["GBU"], &["TO-247"], &["TO-3"]];
        let cases = *r.pick(&outlines);
        let mut s = sink(&format!("S{i}"), cases, r.decades(1.0, 30.0));
        vary(r, &mut s.part);
        s.rise_k = r.chance(0.5).then_some(60.0);
        s.rth_sa_k_w = blank(r, s.rth_sa_k_w);
        c.sinks.push(s);
    }
    let catalogue = numbered(c);
    let mut supply = supply(rails);
    supply.builds = 1 + r.below(20) as u64;
    supply.ambient.low_c = *r.pick(&[-20.0, 0.0, 20.0]);
    supply.ambient.high_c = *r.pick(&[40.0, 45.0, 60.0, 75.0]);
    supply.caps.cost = r.chance(0.4).then(|| r.between(4.0, 20.0));
    supply.caps.heat_w = r.chance(0.4).then(|| (out_v + 3.0) * load_a * r.decades(0.1, 3.0));
    supply.caps.height_m = r.chance(0.4).then(|| r.between(0.01, 0.06));
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

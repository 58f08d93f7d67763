//! What the readers make of good files: every column and key, defaults, and the order of parts.
#![allow(clippy::unwrap_used, clippy::float_cmp)] // Readers scale exactly: equal quantities are equal bits.

use std::path::Path;

use binrail::catalogue::{self, Core, DeviceKind, Forward, Junction, Loaded, Polarity, RectifierKind, Slot, Status};
use binrail::supply;
use binrail::units::Money;

const TRANSFORMERS: &str = "\
part,price,breaks,stock,status,height_mm,description,primary_v,freq_min_hz,va,secondary_v,secondary_a,regulation_pct,winding_c,primary_share_pct,v_tol_pct,core_loss_w,core,ta_c
T-9,11.5,100:10 1000:9.25,40,last-buy,45,\"toroid, 50 VA\",115+115,60,50,12-0-12+5,1.5-0-1.5+2,12,95,45,2,1.5,toroid,60
T-10,8,,,,,,230,,30,15+15,,15,,,,,,
";
const RECTIFIERS: &str = "\
part,price,kind,type,vrrm_v,io_a,io_for,ifsm_a,threshold_v,slope_mohm,vf_v,vf_a,rth_ja_k_w,rth_jc_k_w,case,tj_max_c
B1,0.5,bridge,junction,400,4,capacitive,150,0.75,33 mohm,,,22,3,gbu,150
D1,0.1,Diode,Schottky,60,3,,80,,,0.55,3,50,,,125
D2,0.1,diode,,,,,,,,,,,,,
";
const RESERVOIRS: &str = "\
part,price,c_uf,tol_minus_pct,tol_plus_pct,v_rated_v,esr_mohm,esr_hz,ripple_a,ripple_hz,t_max_c,life_h
C1,0.41,4m7,10,30,35,R033,100 kHz,2.5,120,105,2000
C2,0.4,1000,,,,,,,,,
";
const PASS_DEVICES: &str = "\
part,price,kind,polarity,vout_v,vout_min_v,vout_max_v,vref_v,tol_pct,dropout_v,dropout_light_v,vin_max_v,vdiff_max_v,iout_max_a,ground_ma,min_load_ma,psrr_db,psrr_vout_v,load_reg_pct,line_reg_pct_v,rth_jc_k_w,rth_ja_k_w,tj_max_c,case,vbe_v,hfe_min,soa,fitted_price,iz_min_ma,iz_max_ma,rz_ohm
F1,0.5,fixed,-,5,,,,4,2,1.5,35,30,1.5,8,5,62,,1,0.02,5,65,125,to-220,,,,,,,
A1,0.6,adjustable,,,1.25,37,1.25,4,2.5,,,40,1.5,,,65,10,,,5,,125,TO-220,,,,,,,
N1,1.2,follower,,,,,,,,,,,10,,,,,,,,,,,0.9,25,10:5 30:1.2,0.05,,,
Z1,0.1,shunt,,5.1,,,,,,,,,,,,,,,,,,,,,,,,1,100,8
";
const SINKS: &str = "\
part,price,cases,rth_sa_k_w,rise_k,rth_cs_k_w
S1,0.9,to-220  TO-247,9,60,0.8
00470,0.2,GBU,20,,
";

fn folder(files: [&str; 5]) -> tempfile::TempDir {
    let dir = tempfile::tempdir().unwrap();
    for (slot, text) in Slot::ALL.into_iter().zip(files) {
        std::fs::write(dir.path().join(slot.file()), text).unwrap();
    }
    dir
}

fn load(files: [&str; 5]) -> Loaded {
    let dir = folder(files);
    std::fs::write(dir.path().join("catalogue.toml"), "currency = \"EUR\"\n").unwrap();
    let loaded = catalogue::load(dir.path());
    assert_eq!(loaded.faults, []);
    loaded
}

const ALL: [&str; 5] = [TRANSFORMERS, RECTIFIERS, RESERVOIRS, PASS_DEVICES, SINKS];

#[test]
fn every_column_arrives_in_si_units() {
    let loaded = load(ALL);
    let c = &loaded.catalogue;
    assert_eq!(loaded.counts, [2, 3, 2, 4, 2]);
    assert_eq!(c.currency.as_deref(), Some("EUR"));
    assert!(Path::new(&c.folder).is_absolute());

    let t = &c.transformers[1];
    assert_eq!(
        (t.part.name.as_str(), t.part.description.as_str()),
        ("T-9", "toroid, 50 VA")
    );
    assert_eq!(
        (t.part.price, t.part.stock, t.part.status),
        (Money(11_500_000), Some(40), Status::LastBuy)
    );
    assert_eq!(
        (t.part.unit_price(999), t.part.height_m),
        (Money(10_000_000), Some(0.045))
    );
    assert_eq!(t.part.line, 2);
    assert_eq!(t.part.cells[0], ("price", "11.5".to_owned()));
    assert_eq!(t.part.cells.len(), 18);
    assert_eq!(
        (t.primary_v.as_slice(), t.freq_min_hz, t.va),
        ([115.0, 230.0].as_slice(), 60.0, 50.0)
    );
    let windings: Vec<_> = t.secondaries.iter().map(|s| (s.volts_v, s.amps_a, s.tapped)).collect();
    assert_eq!(windings, [(12.0, 1.5, Some(0)), (12.0, 1.5, Some(0)), (5.0, 2.0, None)]);
    assert_eq!(
        (t.regulation, t.winding_c, t.primary_share, t.v_tol),
        (0.12, 95.0, 0.45, 0.02)
    );
    assert_eq!((t.core_loss_w, t.core, t.ta_c), (Some(1.5), Some(Core::Toroid), 60.0));

    let b = &c.rectifiers[0];
    assert_eq!(
        (b.kind, b.junction, b.io_capacitive),
        (RectifierKind::Bridge, Junction::Junction, true)
    );
    assert_eq!(
        (b.vrrm_v, b.io_a, b.ifsm_a, b.tj_max_c),
        (Some(400.0), Some(4.0), Some(150.0), Some(150.0))
    );
    let line = Forward::Line {
        threshold_v: 0.75,
        slope_ohm: 0.033,
    };
    assert_eq!((b.forward, b.case.as_deref()), (Ok(line), Some("GBU")));
    assert_eq!((b.rth_ja_k_w, b.rth_jc_k_w), (Some(22.0), Some(3.0)));
    let point = Forward::Point { vf_v: 0.55, vf_a: 3.0 };
    assert_eq!(
        (c.rectifiers[1].junction, c.rectifiers[1].forward),
        (Junction::Schottky, Ok(point))
    );

    let r = &c.reservoirs[0];
    assert_eq!(
        (r.c_f, r.tol_minus, r.tol_plus, r.v_rated_v),
        (0.0047, 0.1, 0.3, Some(35.0))
    );
    assert_eq!(
        (r.esr_ohm, r.esr_hz, r.ripple_a, r.ripple_hz),
        (Some(0.033), 1e5, Some(2.5), 120.0)
    );
    assert_eq!((r.t_max_c, r.life_h), (Some(105.0), Some(2000.0)));

    let [a, f, n, z] = &c.pass_devices[..] else {
        panic!("four devices");
    };
    assert_eq!(
        (f.kind, f.polarity, f.vout_v, f.tol),
        (DeviceKind::Fixed, Polarity::Negative, Some(5.0), Some(0.04))
    );
    assert_eq!(
        (f.dropout_v, f.dropout_light_v, f.vin_max_v),
        (Some(2.0), Some(1.5), Some(35.0))
    );
    assert_eq!(
        (f.vdiff_max_v, f.iout_max_a, f.ground_a),
        (Some(30.0), Some(1.5), Some(0.008))
    );
    assert_eq!(
        (f.min_load_a, f.psrr_db, f.load_reg, f.line_reg_per_v),
        (0.005, Some(62.0), 0.01, 0.0002)
    );
    assert_eq!(
        (f.rth_jc_k_w, f.rth_ja_k_w, f.tj_max_c),
        (Some(5.0), Some(65.0), Some(125.0))
    );
    assert_eq!((f.case.as_deref(), f.psrr_vout_v), (Some("TO-220"), None));
    assert_eq!(
        (a.vout_min_v, a.vout_max_v, a.vref_v, a.psrr_vout_v),
        (Some(1.25), Some(37.0), Some(1.25), Some(10.0))
    );
    assert_eq!(
        (n.vbe_v, n.hfe_min, n.fitted_price),
        (Some(0.9), Some(25.0), Money(50_000))
    );
    assert_eq!(n.soa, [(10.0, 5.0), (30.0, 1.2)]);
    assert_eq!((z.iz_min_a, z.iz_max_a, z.rz_ohm), (Some(0.001), Some(0.1), Some(8.0)));

    let s = &c.sinks[1];
    assert_eq!(s.cases, ["TO-220", "TO-247"]);
    assert_eq!((s.rth_sa_k_w, s.rise_k, s.rth_cs_k_w), (Some(9.0), Some(60.0), 0.8));
}

#[test]
fn blank_cells_take_their_defaults() {
    let c = load(ALL).catalogue;
    let t = &c.transformers[0];
    assert_eq!(
        (t.freq_min_hz, t.winding_c, t.primary_share, t.v_tol, t.ta_c),
        (50.0, 85.0, 0.5, 0.0, 40.0)
    );
    assert_eq!(
        (t.core_loss_w, t.core, t.part.stock, t.part.status),
        (None, None, None, Status::Current)
    );
    assert_eq!(t.secondaries[1].amps_a, 1.0);
    let d = &c.rectifiers[2];
    assert_eq!(
        (d.vrrm_v, d.io_capacitive, d.forward),
        (None, false, Err("threshold_v"))
    );
    let r = &c.reservoirs[1];
    assert_eq!(
        (r.tol_minus, r.tol_plus, r.esr_ohm, r.esr_hz, r.ripple_hz),
        (0.2, 0.2, None, 100.0, 100.0)
    );
    let n = &c.pass_devices[2];
    assert_eq!(
        (n.polarity, n.min_load_a, n.load_reg, n.line_reg_per_v),
        (Polarity::Positive, 0.0, 0.0, 0.0)
    );
    assert_eq!(c.sinks[0].rth_cs_k_w, 1.2);
}

#[test]
fn parts_are_in_order_of_name_and_keep_it_as_text() {
    let c = load(ALL).catalogue;
    let names: Vec<_> = c.parts().map(|p| p.name.as_str()).collect();
    let expected = [
        "T-10", "T-9", "B1", "D1", "D2", "C1", "C2", "A1", "F1", "N1", "Z1", "00470", "S1",
    ];
    assert_eq!(names, expected);
    assert!(c.parts().zip(0..).all(|(p, k)| p.id.0 == k));
}

#[test]
fn form_of_the_file_changes_no_part() {
    let plain = load(ALL).catalogue;
    let variants = [
        SINKS.replace('\n', "\r\n"),
        SINKS.replace('\n', "\n\n , , \n").replacen("\n\n , , \n", "\n", 1),
        format!("\u{FEFF}{SINKS}"),
        SINKS.replace("S1,0.9,to-220  TO-247", " S1 , \"0.9\" ,\"to-220\nTO-247\""),
        SINKS
            .replace("part,price", "price,part")
            .replace("S1,0.9", "0.9,S1")
            .replace("00470,0.2", "0.2,00470"),
        SINKS.replace('\n', ",,\n"),
    ];
    for text in variants {
        let mut other = load([TRANSFORMERS, RECTIFIERS, RESERVOIRS, PASS_DEVICES, &text]).catalogue;
        for (a, b) in other.sinks.iter_mut().zip(&plain.sinks) {
            (a.part.line, a.part.cells) = (b.part.line, b.part.cells.clone());
        }
        assert_eq!(other.sinks, plain.sinks, "{text}");
    }
}

#[test]
fn parts_come_back_from_a_saved_build() {
    let mut c = load(ALL).catalogue;
    let rows = (c.parts())
        .map(|p| {
            (
                p.slot,
                p.name.clone(),
                p.cells.iter().map(|(k, v)| ((*k).to_owned(), v.clone())).collect(),
            )
        })
        .collect();
    let mut saved = catalogue::from_cells(rows, "build.json", Some("EUR".into())).unwrap();
    c.folder.clear();
    for part in saved.transformers.iter_mut().map(|t| &mut t.part) {
        assert_eq!(part.line, 0);
        part.line = c.find(&part.name).unwrap().line;
    }
    assert_eq!(saved.transformers, c.transformers);
    assert_eq!(saved.parts().count(), c.parts().count());
    let faults = catalogue::from_cells(
        vec![
            (
                Slot::Sink,
                "S1".into(),
                vec![("price".into(), "1".into()), ("casse".into(), "X".into())],
            ),
            (
                Slot::Reservoir,
                "S1".into(),
                vec![("price".into(), "1".into()), ("c_uf".into(), "-1".into())],
            ),
        ],
        "build.json",
        None,
    );
    let told: Vec<_> = faults.unwrap_err().iter().map(ToString::to_string).collect();
    assert_eq!(
        told,
        [
            "build.json: parts.S1.casse: \"casse\" is not a column of sinks.csv; did you mean \"cases\"?",
            "build.json: parts.S1.cases: is blank; required: one outline or more",
            "build.json: parts.S1: is listed twice; list each part once",
            "build.json: parts.S1.c_uf: \"-1\" is out of range; allowed: above 0 up to 100000000 uF",
        ]
    );
}

#[test]
fn odd_rows_get_a_warning() {
    let sinks = "part,price,cases\n2.20E+02,1,X\n";
    let loaded = load([TRANSFORMERS, RECTIFIERS, RESERVOIRS, PASS_DEVICES, sinks]);
    assert_eq!(loaded.warnings.len(), 1);
    let told = loaded.warnings[0].to_string();
    assert!(
        told.ends_with(
            "sinks.csv:2: part 2.20E+02: part: \"2.20E+02\" looks like a name that a spreadsheet turned into a number; \
         format the column as text"
        ),
        "{told}"
    );
}

const SUPPLY: &str = r#"
name = "Vent"
builds = 250
catalogue = "../../catalog"
[mains]
voltage = "230 V"
tolerance = "10 %"
frequency = "50 Hz"
[ambient]
low = "0 degC"
high = "45 °C"
[[rail]]
name = "logic"
voltage = "5 V"
current = "1.1 A"
"#;

fn read(text: &str) -> supply::Supply {
    let dir = tempfile::tempdir().unwrap();
    let path = dir.path().join("supply.toml");
    std::fs::write(&path, text).unwrap();
    supply::read(&path).unwrap()
}

#[test]
fn a_short_supply_takes_its_defaults() {
    let s = read(SUPPLY);
    assert_eq!(
        (s.name.as_str(), s.builds, s.catalogue.as_deref()),
        ("Vent", 250, Some("../../catalog"))
    );
    assert_eq!(
        (s.mains.low_v, s.mains.nominal_v, s.mains.frequency_hz, s.mains.flat_top),
        (207.0, 230.0, 50.0, 0.03)
    );
    assert_eq!(s.mains.high_v, 253.0);
    assert_eq!(
        (s.ambient.low_c, s.ambient.high_c, s.ambient.inside_rise_k),
        (0.0, 45.0, 0.0)
    );
    let m = s.margins;
    assert_eq!(
        (m.headroom_v, m.reservoir, m.reverse, m.junction_k),
        (0.25, 0.1, 0.5, 15.0)
    );
    assert_eq!(
        (s.ageing.capacitance_loss, s.ageing.esr_rise, s.ageing.life_h),
        (0.2, 2.0, 20_000.0)
    );
    assert_eq!(
        (s.caps.cost, s.caps.heat_w, s.caps.height_m, s.caps.cans),
        (None, None, None, 3)
    );
    let r = &s.rails[0];
    assert_eq!((r.voltage_v, r.current_a, r.idle_a), (5.0, 1.1, 0.0));
    assert_eq!((r.accuracy, r.ripple_v, r.dip_s, &r.section), (None, None, None, &None));
    assert_eq!(
        r.paths,
        [supply::Path::CentreTap, supply::Path::Bridge, supply::Path::Dual]
    );
    assert_eq!(r.devices, [DeviceKind::Fixed, DeviceKind::Adjustable]);
    assert!(!r.isolated && !r.short_circuit_survive && !s.share_never);
    assert_eq!(read("[[rail]]\nname='r'\nvoltage='-5V'\ncurrent='1A'\n[mains]\nvoltage='230V'\nlow='200V'\nhigh='240V'\nfrequency='50Hz'\n[ambient]\nlow='0degC'\nhigh='0degC'").builds, 1);
}

#[test]
fn a_full_supply_and_its_saved_copy_are_the_same() {
    let text = SUPPLY.replace(
        "tolerance = \"10 %\"",
        "low = \"207 V\"\nhigh = \"253 V\"\nflat_top = \"5 %\"",
    ) + r#"
idle = "20 mA"
accuracy = "5 %"
ripple = "5 mV"
dip = "10 ms"
paths = ["bridge", "half-wave"]
devices = ["fixed"]
isolated = true
short_circuit = "survive"
section = "A"
[margins]
headroom = "500 mV"
reservoir = "20 %"
reverse = "100 %"
junction = "25 K"
[ageing]
capacitance_loss = "30 %"
esr_rise = 1.5
life = "40000 h"
[caps]
cost = 25
heat = "30 W"
height = "45 mm"
cans = 4
"#;
    let s = read(&format!("share = \"never\"\n{text}"));
    assert_eq!((s.mains.low_v, s.mains.high_v, s.mains.flat_top), (207.0, 253.0, 0.05));
    assert_eq!(
        (s.caps.cost, s.caps.heat_w, s.caps.height_m, s.caps.cans),
        (Some(25.0), Some(30.0), Some(0.045), 4)
    );
    let r = &s.rails[0];
    assert_eq!(
        (r.idle_a, r.accuracy, r.ripple_v, r.dip_s),
        (0.02, Some(0.05), Some(0.005), Some(0.01))
    );
    assert_eq!(r.paths, [supply::Path::Bridge, supply::Path::HalfWave]);
    assert!(r.isolated && r.short_circuit_survive && s.share_never);
    assert_eq!(r.section.as_deref(), Some("A"));
    assert_eq!(
        (s.ageing.esr_rise, s.ageing.life_h, s.margins.junction_k),
        (1.5, 40_000.0, 25.0)
    );
    assert_eq!(supply::from_json(&s.content, "build.json").unwrap(), s);
    assert_eq!(s.content["caps"]["cost"], 25);
    assert_eq!(s.content["rail"][0]["idle"], "20 mA");
}

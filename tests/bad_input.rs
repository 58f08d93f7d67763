//! What the readers say about bad files: whole messages, all of them at once, and never a panic.
#![allow(clippy::unwrap_used)]

use std::path::Path;

use binrail::catalogue::{self, Form, Slot, columns};
use binrail::supply;
use proptest::prelude::*;

/// A folder whose other files are good but empty.
fn folder(slot: Slot, bytes: &[u8]) -> tempfile::TempDir {
    let dir = tempfile::tempdir().unwrap();
    for other in Slot::ALL {
        let header: Vec<_> = columns(other).map(|c| c.name).collect();
        std::fs::write(dir.path().join(other.file()), header.join(",")).unwrap();
    }
    std::fs::write(dir.path().join(slot.file()), bytes).unwrap();
    dir
}

fn faults(dir: &Path) -> Vec<String> {
    let base = format!("{}/", dir.display());
    let faults = catalogue::load(dir).faults;
    faults.iter().map(|f| f.to_string().replace(&base, "")).collect()
}

#[track_caller]
fn csv(slot: Slot, text: impl AsRef<[u8]>, expected: &[&str]) {
    let dir = folder(slot, text.as_ref());
    assert_eq!(faults(dir.path()), expected);
}

#[track_caller]
fn toml(text: &str, expected: &[&str]) {
    let dir = tempfile::tempdir().unwrap();
    let path = dir.path().join("s.toml");
    std::fs::write(&path, text).unwrap();
    let faults = supply::read(&path).unwrap_err();
    let base = format!("{}/", dir.path().display());
    let told: Vec<_> = faults.iter().map(|f| f.to_string().replace(&base, "")).collect();
    assert_eq!(told, expected);
}

#[test]
fn files_and_headers() {
    use Slot::{Rectifier, Sink};
    csv(
        Sink,
        "",
        &["sinks.csv:1: has no header; the first row names the columns"],
    );
    csv(
        Sink,
        "\n\n , \n",
        &["sinks.csv:1: has no header; the first row names the columns"],
    );
    csv(
        Sink,
        "part;price;cases\nS1;1,2;X\n",
        &[
            "sinks.csv:1: \"part;price;cases\" is separated by semicolons; save the file with commas, and decimals with a point",
        ],
    );
    csv(
        Sink,
        "part\tprice\tcases\n",
        &[
            "sinks.csv:1: \"part\tprice\tcases\" is separated by tabs; save the file with commas, and decimals with a point",
        ],
    );
    csv(
        Sink,
        "\nS1,1,TO-220\n",
        &[
            "sinks.csv:2: \"S1\" names no column of this file; the first row holds the column names, such as part, price",
        ],
    );
    csv(
        Rectifier,
        "part,price,kind,vrm_v,price,xyzzy\n",
        &[
            "rectifiers.csv:1: \"vrm_v\" is not a column of rectifiers.csv; did you mean \"vrrm_v\"?",
            "rectifiers.csv:1: \"price\" names a column twice; name each column once",
            "rectifiers.csv:1: \"xyzzy\" is not a column of rectifiers.csv",
        ],
    );
    csv(
        Sink,
        "Part,cases\nS1,X\n",
        &[
            "sinks.csv:1: \"Part\" is not a column of sinks.csv; did you mean \"part\"?",
            "sinks.csv:1: part: the column is missing; it is required",
            "sinks.csv:1: price: the column is missing; it is required",
        ],
    );
    csv(
        Sink,
        b"part,price,cases\r\nS1,1,X\r\nS2,1,\xB5\r\n",
        &["sinks.csv:3: the line is not UTF-8 text; save the file as UTF-8"],
    );
    csv(
        Sink,
        b"\xFF\xFEp\0a\0",
        &["sinks.csv:1: the file is UTF-16; save the file as UTF-8"],
    );
}

#[test]
fn rows_and_their_lines() {
    let header = "part,price,cases,rth_sa_k_w";
    // CRLF, a blank line and a quoted line break: where the csv crate's own line numbers are wrong.
    csv(
        Slot::Sink,
        format!("{header}\r\n\r\nS1,1,\"X\r\nY\",2\r\n,,,\r\nS2,1,X,-2\r\n"),
        &["sinks.csv:6: part S2: rth_sa_k_w: \"-2\" is out of range; allowed: above 0 up to 100000 K/W"],
    );
    csv(
        Slot::Sink,
        format!("{header}\nS1,1,X\nS2,1,X,2,,\nS3,1,X,2,3\nS4,1,X,1,5\n"),
        &[
            "sinks.csv:2: the row has 3 cells, the header 4; a blank cell still needs its comma",
            "sinks.csv:4: the row has 5 cells, the header 4; quote a cell that holds a comma; write a decimal comma as a point",
            "sinks.csv:5: the row has 5 cells, the header 4; quote a cell that holds a comma; write a decimal comma as a point",
        ],
    );
    csv(
        Slot::Sink,
        format!("{header}\nS1,1,X,0\n\"S2,1,X,2\nS3,1,X,3\n"),
        &[
            "sinks.csv:2: part S1: rth_sa_k_w: \"0\" is out of range; allowed: above 0 up to 100000 K/W",
            "sinks.csv:3: a quote opens here and never closes; close it, or write a quote inside a quoted cell twice",
        ],
    );
    csv(
        Slot::Sink,
        format!("{header}\n\"S\"1,1,X,2\n"),
        &["sinks.csv:2: text follows a closing quote; quote the whole cell, and write a quote inside it twice"],
    );
    csv(
        Slot::Sink,
        "part,price,cases,,\nS1,1,X,,y\nS2,1,X,,\n",
        &["sinks.csv:2: \"y\" stands under no column name; name the column, or empty the cell"],
    );
}

#[test]
fn part_names_and_common_cells() {
    let header = "part,price,breaks,stock,status,height_mm,cases";
    let long = "x".repeat(81);
    csv(
        Slot::Sink,
        format!("{header}\n,1,,,,,X\nS1,,,,,,X\nS2,1,,,,,\n{long},1,,,,,X\n\"a\tb\",1,,,,,X\nS1,1,,,,,Y\n"),
        &[
            "sinks.csv:2: part: is blank; required: up to 80 characters",
            "sinks.csv:3: part S1: price: is blank; required: 0 to 1000000, at most 6 decimals",
            "sinks.csv:4: part S2: cases: is blank; required: one outline or more",
            &format!(
                "sinks.csv:5: part {0}...: part: \"{0}...\" is too long; a part name has up to 80 characters",
                "x".repeat(80)
            ),
            "sinks.csv:6: part a\tb: part: \"a\tb\" has a control character; a part name is one line of text",
            "sinks.csv:7: part S1: part: \"S1\" is listed twice; sinks.csv:3 has it too; a part name is unique in the whole catalogue",
        ],
    );
    let row = |cells: &str, message: &str| {
        let dir = folder(Slot::Sink, format!("{header}\nS,{cells},X\n").as_bytes());
        assert_eq!(faults(dir.path()), [format!("sinks.csv:2: part S: {message}")]);
    };
    let amount = "an amount from 0 to 1000000, at most 6 decimals, without a currency sign";
    row("-1,,,,", &format!("price: \"-1\" is out of range; {amount}"));
    row("NaN,,,,", &format!("price: \"NaN\" is not an amount; {amount}"));
    row("inf,,,,", &format!("price: \"inf\" is not an amount; {amount}"));
    row("1e400,,,,", &format!("price: \"1e400\" is not an amount; {amount}"));
    row(
        "0.1234567,,,,",
        &format!("price: \"0.1234567\" has more than 6 decimals; {amount}"),
    );
    row(
        "\"9,99\",,,,",
        "price: \"9,99\" has a comma; write a decimal comma as a point, thousands without separator",
    );
    row(
        "1,1:0.5,,,",
        "breaks: \"1:0.5\" is out of range; a whole number from 2 to 1000000000",
    );
    row(
        "1,10:0.5 5:0.4,,,",
        "breaks: \"10:0.5 5:0.4\" has pieces that do not rise; write the breaks from few pieces to many",
    );
    row(
        "1,10:1.5,,,",
        "breaks: \"10:1.5\" has a price above the one before; prices never rise with pieces",
    );
    row(
        "1,0.38,,,",
        "breaks: \"0.38\" is not pieces:price; write 100:0.38 1000:0.29",
    );
    row(
        "1,,-1,,",
        "stock: \"-1\" is out of range; a whole number from 0 to 1000000000",
    );
    row(
        "1,,2.5,,",
        "stock: \"2.5\" is not a whole number; a whole number from 0 to 1000000000",
    );
    row(
        "1,,,last buy,",
        "status: \"last buy\" is not a known word; did you mean \"last-buy\"? allowed: current, last-buy, withdrawn",
    );
    row(
        "1,,,,0",
        "height_mm: \"0\" is out of range; allowed: above 0 up to 100000 mm",
    );
    row(
        "1,,,,5 V",
        "height_mm: \"5 V\" is not a length; its unit is one of m, um, mm, cm",
    );
}

/// One row with these cells beside part and price, and its one message or more.
#[track_caller]
fn row(slot: Slot, cells: &[(&str, &str)], expected: &[&str]) {
    let header: Vec<_> = cells.iter().map(|c| c.0).collect();
    let texts: Vec<_> = cells.iter().map(|c| format!("\"{}\"", c.1)).collect();
    let text = format!("part,price,{}\nP,1,{}\n", header.join(","), texts.join(","));
    let dir = folder(slot, text.as_bytes());
    let expected: Vec<_> = expected
        .iter()
        .map(|m| format!("{}:2: part P: {m}", slot.file()))
        .collect();
    assert_eq!(faults(dir.path()), expected, "{text}");
}

#[test]
fn transformers() {
    let good = [
        ("primary_v", "230"),
        ("va", "30"),
        ("secondary_v", "12"),
        ("regulation_pct", "10"),
    ];
    row(Slot::Transformer, &good, &[]);
    let bad = |column: &'static str, text: &'static str, message: &str| {
        let mut cells: Vec<_> = good.into_iter().filter(|c| c.0 != column).collect();
        cells.push((column, text));
        row(Slot::Transformer, &cells, &[message]);
    };
    bad(
        "regulation_pct",
        "0",
        "regulation_pct: \"0\" is out of range; allowed: above 0 up to 300 %",
    );
    bad(
        "regulation_pct",
        "301",
        "regulation_pct: \"301\" is out of range; allowed: above 0 up to 300 %",
    );
    bad("va", "0.05", "va: \"0.05\" is out of range; allowed: 0.1 to 100000 VA");
    bad(
        "va",
        "NaN",
        "va: \"NaN\" is not a number; an apparent power: 0.1 to 100000 VA",
    );
    bad(
        "va",
        "30 W",
        "va: \"30 W\" is not an apparent power; its unit is one of VA, mVA, kVA",
    );
    bad("va", "", "va: is blank; required: 0.1 to 100000 VA");
    bad(
        "primary_v",
        "115+120",
        "primary_v: \"115+120\" is not a pair of equal primaries; write two equal voltages, such as 115+115",
    );
    bad(
        "primary_v",
        "115+115/230",
        "primary_v: \"115+115/230\" mixes + and /; write 115+115 for two equal primaries, 100/120/230 for taps",
    );
    bad(
        "primary_v",
        "230/230",
        "primary_v: \"230/230\" repeats a tap; write each tap once",
    );
    bad(
        "secondary_v",
        "12-0-9",
        "secondary_v: \"12-0-9\" has unequal halves; write x-0-x with both halves equal, or two windings with +",
    );
    bad(
        "secondary_v",
        "0",
        "secondary_v: \"0\" is out of range; allowed: above 0 up to 100000 V",
    );
    bad(
        "secondary_a",
        "1+1",
        "secondary_a: \"1+1\" has another form than secondary_v; write one current for each voltage of \"12\"",
    );
    bad(
        "secondary_a",
        "1-0-1",
        "secondary_a: \"1-0-1\" has another form than secondary_v; write one current for each voltage of \"12\"",
    );
    bad(
        "winding_c",
        "-200",
        "winding_c: \"-200\" is out of range; allowed: above -200 up to 500 degC",
    );
    bad(
        "v_tol_pct",
        "100",
        "v_tol_pct: \"100\" is out of range; allowed: 0 to below 100 %",
    );
    bad(
        "core",
        "toriod",
        "core: \"toriod\" is not a known word; did you mean \"toroid\"? allowed: laminated, toroid",
    );
}

#[test]
fn rectifiers() {
    let bad = |cells: &[(&'static str, &'static str)], expected: &[&str]| {
        row(Slot::Rectifier, &[&[("kind", "bridge")], cells].concat(), expected);
    };
    bad(
        &[("threshold_v", "0.7")],
        &["slope_mohm: is blank; threshold_v and slope_mohm are stated together"],
    );
    bad(
        &[("slope_mohm", "20")],
        &["threshold_v: is blank; threshold_v and slope_mohm are stated together"],
    );
    bad(
        &[("vf_v", "1.1")],
        &["vf_a: is blank; vf_v and vf_a are stated together"],
    );
    bad(
        &[("vf_v", "0.2"), ("vf_a", "-1")],
        &[
            "vf_v: \"0.2\" is out of range; allowed: above 0.2 up to 100 V",
            "vf_a: \"-1\" is out of range; allowed: above 0 up to 100000 A",
        ],
    );
    bad(
        &[("case", "TO 220")],
        &["case: \"TO 220\" is not one word; write one outline, such as TO-220"],
    );
    bad(
        &[("tj_max_c", "150 K")],
        &["tj_max_c: \"150 K\" is not a temperature; its unit is one of degC, \u{B0}C"],
    );
    row(
        Slot::Rectifier,
        &[("kind", "quad")],
        &["kind: \"quad\" is not a known word; allowed: bridge, diode"],
    );
}

#[test]
fn reservoirs() {
    let bad = |column, text, message| row(Slot::Reservoir, &[("c_uf", "1000"), (column, text)], &[message]);
    bad(
        "esr_hz",
        "50",
        "esr_hz: \"50\" is a frequency without a rule; allowed: 100, 120, or 10000 and more Hz",
    );
    bad(
        "ripple_hz",
        "1 kHz",
        "ripple_hz: \"1 kHz\" is a frequency without a rule; allowed: 100, 120, or 10000 and more Hz",
    );
    bad(
        "esr_mohm",
        "-1",
        "esr_mohm: \"-1\" is out of range; allowed: 0 to 1000000 mohm",
    );
    bad(
        "esr_mohm",
        "33m",
        "esr_mohm: \"33m\" is not a resistance; its unit is one of ohm, uohm, mohm, kohm, Mohm, Gohm, \u{3A9}",
    );
    bad(
        "tol_minus_pct",
        "100",
        "tol_minus_pct: \"100\" is out of range; allowed: 0 to below 100 %",
    );
    bad(
        "life_h",
        "0",
        "life_h: \"0\" is out of range; allowed: above 0 up to 10000000 h",
    );
    row(
        Slot::Reservoir,
        &[("c_uf", "4,7 mF")],
        &["c_uf: \"4,7 mF\" has a comma; write a decimal comma as a point, thousands without separator"],
    );
}

#[test]
fn pass_devices() {
    row(
        Slot::Pass,
        &[("kind", "adjustable"), ("vout_v", "5")],
        &[
            "vout_min_v: is blank; a device of kind adjustable needs vout_min_v",
            "vout_max_v: is blank; a device of kind adjustable needs vout_max_v",
            "vref_v: is blank; a device of kind adjustable needs vref_v",
        ],
    );
    row(
        Slot::Pass,
        &[("kind", "fixed")],
        &["vout_v: is blank; a device of kind fixed needs vout_v"],
    );
    row(
        Slot::Pass,
        &[
            ("kind", "adjustable"),
            ("vout_min_v", "5"),
            ("vout_max_v", "3"),
            ("vref_v", "6"),
        ],
        &[
            "vout_min_v: \"5\" is above vout_max_v; at most its \"3\"",
            "vref_v: \"6\" is above vout_min_v; at most its \"5\"",
        ],
    );
    let bad = |column, text, message| row(Slot::Pass, &[("kind", "follower"), (column, text)], &[message]);
    bad(
        "polarity",
        "pos",
        "polarity: \"pos\" is not a known word; allowed: +, -",
    );
    bad(
        "soa",
        "10:5 10:4",
        "soa: \"10:5 10:4\" has volts that do not rise; write the points from low volts to high",
    );
    bad("soa", "10", "soa: \"10\" is not volts:amps; write 10:5 30:1.2");
    bad(
        "psrr_db",
        "201",
        "psrr_db: \"201\" is out of range; allowed: 0 to 200 dB",
    );
    bad(
        "ground_ma",
        "-1",
        "ground_ma: \"-1\" is out of range; allowed: 0 to 100000 mA",
    );
    bad(
        "hfe_min",
        "25 A",
        "hfe_min: \"25 A\" is not a number; a plain number: 1 to 1000000",
    );
}

#[test]
fn a_part_name_is_unique_over_all_files() {
    let dir = folder(Slot::Sink, b"part,price,cases\nX1,1,A\n");
    std::fs::write(dir.path().join("reservoirs.csv"), "part,price,c_uf\n\nX1,1,100\n").unwrap();
    assert_eq!(
        faults(dir.path()),
        [
            "sinks.csv:2: part X1: part: \"X1\" is listed twice; reservoirs.csv:3 has it too; a part name is unique in the whole catalogue"
        ]
    );
}

#[test]
fn folders() {
    let dir = folder(Slot::Sink, b"part,price,cases\n");
    std::fs::remove_file(dir.path().join("rectifiers.csv")).unwrap();
    assert_eq!(
        faults(dir.path()),
        [
            "rectifiers.csv: is missing; a catalogue has transformers.csv, rectifiers.csv, reservoirs.csv, pass_devices.csv, sinks.csv"
        ]
    );
    let lost = catalogue::load(Path::new("no/such/folder")).faults;
    let told: Vec<_> = lost.iter().map(ToString::to_string).collect();
    assert_eq!(
        told,
        ["no/such/folder: is missing; name a folder with the catalogue's files"]
    );
    let file = catalogue::load(Path::new("Cargo.toml")).faults;
    assert_eq!(
        file[0].to_string(),
        "Cargo.toml: is not a folder; name a folder with the catalogue's files"
    );
}

#[test]
fn catalogue_toml() {
    let check = |text: &str, expected: &[&str]| {
        let dir = folder(Slot::Sink, b"part,price,cases\n");
        std::fs::write(dir.path().join("catalogue.toml"), text).unwrap();
        assert_eq!(faults(dir.path()), expected);
    };
    check("", &[]);
    let form = "three capital letters, such as \"EUR\" (ISO 4217)";
    check(
        "currency = \"eur\"\n",
        &[&format!(
            "catalogue.toml:1: currency: \"eur\" is not a currency; {form}"
        )],
    );
    check(
        "currency = 5\n",
        &[&format!("catalogue.toml:1: currency: is not a currency; {form}")],
    );
    check(
        "\ncurency = \"EUR\"\nzzz = 1\n",
        &[
            "catalogue.toml:2: \"curency\" is not a known key; did you mean \"currency\"?",
            "catalogue.toml:3: \"zzz\" is not a known key",
        ],
    );
    check(
        "currency = \n",
        &["catalogue.toml:1: string values must be quoted, expected literal string"],
    );
}

#[test]
fn every_column_is_read() {
    for slot in Slot::ALL {
        for column in columns(slot) {
            let text = match column.form {
                Form::Text | Form::Cases => continue,
                Form::Case => "a b",
                _ => "a\u{1}b",
            };
            let cells = format!("part,price,{0}\nP,1,{text}\n", column.name);
            let cells = match column.name {
                "part" => format!("part\n{text}\n"),
                "price" => format!("part,price\nP,{text}\n"),
                _ => cells,
            };
            let dir = folder(slot, cells.as_bytes());
            let faults = catalogue::load(dir.path()).faults;
            let told = faults
                .iter()
                .any(|f| f.line == Some(2) && f.column.as_deref() == Some(column.name));
            assert!(told, "{} of {}", column.name, slot.file());
        }
    }
}

const MAINS: &str = "[mains]\nvoltage = \"230 V\"\ntolerance = \"10 %\"\nfrequency = \"50 Hz\"\n";
const AMBIENT: &str = "[ambient]\nlow = \"0 degC\"\nhigh = \"45 degC\"\n";
const RAIL: &str = "[[rail]]\nname = \"logic\"\nvoltage = \"5 V\"\ncurrent = \"1 A\"\n";

/// A good supply (mains from line 1, ambient from 5, the rail from 8) with a line more at the end.
#[track_caller]
fn rail(line: &str, message: &str) {
    toml(
        &format!("{MAINS}{AMBIENT}{RAIL}{line}\n"),
        &[&format!("s.toml:12: rail.logic.{message}")],
    );
}

#[test]
fn an_empty_supply_names_all_it_needs() {
    let need = |key: &str, what: &str| format!("s.toml: {key}: is missing; write {what}");
    let expected = [
        need(
            "mains.voltage",
            "a voltage in quotes with its unit, above 0 up to 1000 V",
        ),
        need("mains.tolerance", "tolerance = \"10 %\", or low and high"),
        need("mains.frequency", "a frequency in quotes with its unit, 10 to 1000 Hz"),
        need("ambient.low", "a temperature in quotes with its unit, -60 to 150 degC"),
        need("ambient.high", "a temperature in quotes with its unit, -60 to 150 degC"),
        need("rail", "one [[rail]] or more, with its keys below"),
    ];
    toml("", &expected.each_ref().map(String::as_str));
}

#[test]
fn tables_of_a_supply() {
    toml(
        &format!("buildz = 2\nbuilds = 1.5\nshare = \"always\"\nmains = 5\n{AMBIENT}{RAIL}[margns]\n"),
        &[
            "s.toml: mains.voltage: is missing; write a voltage in quotes with its unit, above 0 up to 1000 V",
            "s.toml: mains.tolerance: is missing; write tolerance = \"10 %\", or low and high",
            "s.toml: mains.frequency: is missing; write a frequency in quotes with its unit, 10 to 1000 Hz",
            "s.toml:1: \"buildz\" is not a known key; did you mean \"builds\"?",
            "s.toml:2: builds: \"1.5\" is not a whole number; a whole number from 1 to 1000000000",
            "s.toml:3: share: \"always\" is not a known word; allowed: never",
            "s.toml:4: mains: \"5\" is not a table; write [mains] and its keys below",
            "s.toml:12: \"margns\" is not a known key; did you mean \"margins\"?",
        ],
    );
    toml(
        &format!("[mains]\nvoltage = 230\nfrequency = \"50\"\ntolerance = 10\n{AMBIENT}{RAIL}"),
        &[
            "s.toml:2: mains.voltage: \"230\" has no unit; write \"230 V\"",
            "s.toml:3: mains.frequency: \"50\" has no unit; write \"50 Hz\"",
            "s.toml:4: mains.tolerance: \"10\" has no unit; write \"10 %\"",
        ],
    );
    toml(
        &format!(
            "[mains]\nvoltage = \"230 V\"\nlow = \"240 V\"\nhigh = \"220 V\"\nfrequency = \"5 Hz\"\nflat_top = \"50 %\"\n{AMBIENT}{RAIL}"
        ),
        &[
            "s.toml:3: mains.low: \"240 V\" is above voltage; low <= voltage <= high",
            "s.toml:4: mains.high: \"220 V\" is below voltage; low <= voltage <= high",
            "s.toml:5: mains.frequency: \"5 Hz\" is out of range; allowed: 10 to 1000 Hz",
            "s.toml:6: mains.flat_top: \"50 %\" is out of range; allowed: 0 to below 50 %",
        ],
    );
    toml(
        &format!("{MAINS}low = \"207 V\"\n{AMBIENT}{RAIL}"),
        &["s.toml:3: mains.tolerance: \"10 %\" stands beside low or high; write tolerance, or low and high"],
    );
    toml(
        &format!(
            "{}{AMBIENT}{RAIL}",
            MAINS.replace("tolerance = \"10 %\"", "low = \"207 V\"")
        ),
        &["s.toml:1: mains.high: is missing; low and high are stated together"],
    );
    toml(
        &format!("{MAINS}[ambient]\nlow = \"50 degC\"\nhigh = \"45 K\"\ninside_rise = \"-1 K\"\n{RAIL}"),
        &[
            "s.toml:7: ambient.high: \"45 K\" is not a temperature; its unit is one of degC, \u{B0}C",
            "s.toml:8: ambient.inside_rise: \"-1 K\" is out of range; allowed: 0 to 200 K",
        ],
    );
    toml(
        &format!("{MAINS}{}{RAIL}", AMBIENT.replace("0 degC", "50 degC")),
        &["s.toml:6: ambient.low: \"50 degC\" is above high; low <= high"],
    );
    toml(
        &format!(
            "{MAINS}{AMBIENT}{RAIL}[ageing]\nesr_rise = 0.5\nlife = \"0 h\"\n[caps]\ncost = nan\ncans = 0\nheat = \"inf W\"\nheight = \"4,5 mm\"\n[margins]\njunction = \"1e400 K\"\nreservoir = true\nreverse = \"50\"\n"
        ),
        &[
            "s.toml:13: ageing.esr_rise: \"0.5\" is out of range; allowed: 1 to 1000",
            "s.toml:14: ageing.life: \"0 h\" is out of range; allowed: above 0 up to 10000000 h",
            "s.toml:16: caps.cost: \"nan\" is not a number; a plain number: above 0 up to 1000000",
            "s.toml:17: caps.cans: \"0\" is out of range; a whole number from 1 to 99",
            "s.toml:18: caps.heat: \"inf W\" is not a number; a power: above 0 up to 1000000 W",
            "s.toml:19: caps.height: \"4,5 mm\" has a comma; write a decimal comma as a point, thousands without separator",
            "s.toml:21: margins.junction: \"1e400 K\" is out of range; allowed: 0 to 500 K",
            "s.toml:22: margins.reservoir: \"true\" is of another type; write a percentage in quotes with its unit, 0 to below 100 %",
            "s.toml:23: margins.reverse: \"50\" has no unit; write \"50 %\"",
        ],
    );
}

#[test]
fn syntax_of_a_supply() {
    toml("\n[mains\nvoltage = 1\n", &["s.toml:2: unclosed table, expected `]`"]);
    toml("a = 1\na = 2\n", &["s.toml:2: duplicate key"]);
    let dir = tempfile::tempdir().unwrap();
    let lost = supply::read(&dir.path().join("s.toml")).unwrap_err();
    assert!(lost[0].to_string().ends_with("s.toml: is missing"));
}

#[test]
fn rails() {
    rail(
        "ripples = \"5 mV\"",
        "ripples: \"ripples\" is not a known key; did you mean \"ripple\"?",
    );
    rail(
        "idle = \"2 A\"",
        "idle: \"2 A\" is above current; at most the full-load current",
    );
    rail(
        "idle = \"-1 A\"",
        "idle: \"-1 A\" is out of range; allowed: 0 to 1000 A",
    );
    rail(
        "accuracy = \"0 %\"",
        "accuracy: \"0 %\" is out of range; allowed: above 0 up to 100 %",
    );
    rail(
        "ripple = \"5 mA\"",
        "ripple: \"5 mA\" is not a voltage; its unit is one of V, uV, mV, kV",
    );
    rail("dip = 10", "dip: \"10\" has no unit; write \"10 s\"");
    rail(
        "paths = []",
        "paths: is empty; a list of some of \"half-wave\", \"centre-tap\", \"bridge\", \"dual\"",
    );
    rail(
        "paths = \"bridge\"",
        "paths: \"bridge\" is not a list; a list of some of \"half-wave\", \"centre-tap\", \"bridge\", \"dual\"",
    );
    rail(
        "paths = [\"bridge\", \"bridge\"]",
        "paths: \"bridge\" is listed twice; list each word once",
    );
    rail(
        "paths = [\"center-tap\"]",
        "paths: \"center-tap\" is not a known word; did you mean \"centre-tap\"? allowed: half-wave, centre-tap, bridge, dual",
    );
    rail(
        "devices = [5]",
        "devices: \"5\" is not a word; a list of some of \"fixed\", \"adjustable\", \"follower\", \"darlington\", \"shunt\"",
    );
    rail(
        "isolated = \"yes\"",
        "isolated: \"yes\" is of another type; write true or false, without quotes",
    );
    rail(
        "short_circuit = \"die\"",
        "short_circuit: \"die\" is not a known word; allowed: survive",
    );
    rail(
        "section = \"\"",
        "section: is blank; write a text, or leave the key out",
    );
    let other = |text: &str, expected: &[&str]| toml(&format!("{MAINS}{AMBIENT}{text}"), expected);
    other(
        "[rail]\nname = \"logic\"\n",
        &["s.toml:8: rail: is a single table; write [[rail]] with two brackets"],
    );
    other(
        "[[rail]]\nvoltage = \"0 V\"\n",
        &[
            "s.toml:8: rail[1].current: is missing; write a current in quotes with its unit, above 0 up to 1000 A",
            "s.toml:8: rail[1].name: is missing; write a text in quotes",
            "s.toml:9: rail[1].voltage: \"0 V\" is out of range; allowed: -1000 to 1000 V, not 0",
        ],
    );
    other(
        &format!("{RAIL}{RAIL}"),
        &["s.toml:13: rail.logic.name: \"logic\" is the name of two rails; give each rail its own name"],
    );
}

#[test]
fn rails_that_contradict_each_other() {
    let two = |first: &str, second: &str, top: &str| {
        let negative = RAIL.replace("logic", "bias").replace("5 V", "-5 V");
        format!("{top}{MAINS}{AMBIENT}{RAIL}section = \"A\"\n{first}{negative}section = \"A\"\n{second}")
    };
    toml(
        &two("", "isolated = true\n", ""),
        &[
            "s.toml:17: rail.bias.section: \"A\" rail logic names this section too, with the other polarity; a section has one polarity",
            "s.toml:17: rail.bias.section: \"A\" rail logic names this section too; an isolated rail shares no section",
        ],
    );
    let same = two("", "", "share = \"never\"\n").replace("-5 V", "12 V");
    toml(
        &same,
        &[
            "s.toml:18: rail.bias.section: \"A\" rail logic names this section too; share = \"never\" gives every rail its own section",
        ],
    );
}

#[test]
fn what_this_version_does_not_offer() {
    rail(
        "devices = [\"fixed\", \"shunt\"]",
        "devices: shunt is not yet offered by this version; write fixed, adjustable, or both",
    );
}

#[test]
fn supplies_of_saved_builds() {
    let told = |value: serde_json::Value| -> Vec<String> {
        let faults = supply::from_json(&value, "b.json").unwrap_err();
        faults.iter().map(ToString::to_string).collect()
    };
    assert_eq!(
        told(serde_json::json!(5)),
        ["b.json: \"5\" is not a supply; a table of keys"]
    );
    let value = serde_json::json!({
        "builds": null,
        "mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": 50},
        "ambient": {"low": "0 degC", "high": "45 degC"},
        "rail": [{"name": "x", "voltage": "5 V", "current": "1 A"}, 7]
    });
    assert_eq!(
        told(value),
        [
            "b.json: builds: \"null\" is of another type; write a whole number from 1 to 1000000000, without quotes",
            "b.json: mains.frequency: \"50\" has no unit; write \"50 Hz\"",
            "b.json: rail: \"7\" is not a table; write one [[rail]] or more, with its keys below",
        ]
    );
}

/// Text that looks enough like a file to get behind the first check.
fn scraps(words: &'static [&'static str]) -> impl Strategy<Value = String> {
    proptest::collection::vec(proptest::sample::select(words), 0..60).prop_map(|w| w.concat())
}

proptest! {
    #[test]
    fn no_bytes_make_the_catalogue_reader_panic(
        bytes in proptest::collection::vec(any::<u8>(), 0..200),
        text in scraps(&[
            ",", ",", ",", "\n", "\n", "\r\n", "\"", "part", "price", "kind", "c_uf", "fixed", "1", "0.5", "-", "+", "0",
            "12-0-12", "1e999999999", "\u{B5}", "\u{3A9}", "m", "R", ":", " ", "\0", "e", "E+", ".", "%", "\u{FEFF}",
        ]),
        slot in proptest::sample::select(Slot::ALL.as_slice()),
    ) {
        let header: Vec<_> = columns(slot).map(|c| c.name).collect();
        let with_header = [header.join(",").as_bytes(), b"\n", text.as_bytes()].concat();
        for content in [bytes.as_slice(), text.as_bytes(), &with_header] {
            let dir = folder(slot, content);
            std::fs::write(dir.path().join("catalogue.toml"), content).unwrap();
            let _ = catalogue::load(dir.path());
        }
    }

    #[test]
    fn no_cell_makes_the_catalogue_reader_panic(text in "\\PC{0,12}|[0-9.eE+:/ munpRKV%-]{0,12}") {
        for slot in Slot::ALL {
            let cells: Vec<_> = columns(slot).map(|c| (c.name.to_owned(), text.clone())).collect();
            let _ = catalogue::from_cells(vec![(slot, text.clone(), cells)], "b.json", None);
        }
    }

    #[test]
    fn no_bytes_make_the_supply_reader_panic(
        bytes in proptest::collection::vec(any::<u8>(), 0..200),
        text in scraps(&[
            "\n", "\n", "\n", " = ", " = ", "\"5 V\"", "\"10 %\"", "5", "nan", "[mains]", "[[rail]]", "[rail]", "voltage",
            "name", "paths", "[", "]", "\"bridge\"", "{", "}", ",", ".", "'", "\"", "1979-05-27", "true", "low", "rail", "#",
        ]),
        line in "(voltage|idle|paths|section|name|devices) = \\PC{0,20}",
    ) {
        let dir = tempfile::tempdir().unwrap();
        let path = dir.path().join("s.toml");
        let with_rail = format!("{MAINS}{AMBIENT}{RAIL}{line}\n");
        for content in [bytes.as_slice(), text.as_bytes(), with_rail.as_bytes()] {
            std::fs::write(&path, content).unwrap();
            let _ = supply::read(&path);
        }
    }
}

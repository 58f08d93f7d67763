//! Settings: every key of a supply can be set from outside its file, is read as if it stood there, and bad ones are told.
#![allow(clippy::unwrap_used, clippy::float_cmp)] // settings are read exactly

use std::fs;

use binrail::supply::{Form, Supply, changed, keys, read_with, stated};

/// Two rails whose names hold points, hyphens, spaces and an equals sign; a tolerance; no table but those required.
const FILE: &str = r#"
name = "Sluice gate"
builds = 40

[mains]
voltage = "230 V"
tolerance = "10 %"
frequency = "50 Hz"

[ambient]
low = "0 degC"
high = "45 degC"

[[rail]]
name = "logic"
voltage = "5 V"
current = "1 A"

[[rail]]
name = "logic.aux-2 = b"
voltage = "12 V"
current = "0.5 A"
ripple = "5 mV"
"#;

fn read(settings: &[&str]) -> Result<Supply, Vec<String>> {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("supply.toml");
    fs::write(&path, FILE).unwrap();
    let settings: Vec<String> = settings.iter().map(|s| (*s).to_owned()).collect();
    let path = path.display().to_string();
    let told = |faults: Vec<binrail::fault::Fault>| {
        faults
            .iter()
            .map(|f| f.to_string().replace(&path, "supply.toml"))
            .collect()
    };
    read_with(path.as_ref(), &settings).map_err(told)
}

#[track_caller]
fn check(settings: &[&str], problem: &str) {
    let faults = read(settings).unwrap_err();
    assert_eq!(faults, [problem]);
}

/// Another value of a key, as people write it.
fn sample(table: &str, key: &str, form: Form) -> Option<&'static str> {
    Some(match (table, key, form) {
        (_, _, Form::Table | Form::Tables) => return None,
        ("rail", "name", _) => "renamed",
        (_, _, Form::Text) => "Lock \"keeper\"",
        (_, _, Form::Word(words)) => words[0],
        (_, _, Form::Words(words)) if words.contains(&"bridge") => "[\"bridge\"]",
        (_, _, Form::Words(_)) => "[\"fixed\"]",
        (_, _, Form::Flag) => "true",
        (_, _, Form::Count(..)) => "7",
        ("mains", "low", _) => "211.5 V",
        ("mains", "high", _) => "249 V",
        ("mains", "voltage", _) => "240 V",
        ("ambient", "high", _) => "43 degC",
        ("rail", "idle", _) => "20 mA",
        (_, _, Form::Quantity(m)) => match m.unit {
            "V" => "6 V",
            "A" => "0.7 A",
            "%" => "7 %",
            "Hz" => "49 Hz",
            "degC" => "-5 degC",
            "K" => "3 K",
            "h" => "12 kh",
            "W" => "20 W",
            "mm" => "4.5 cm",
            "s" => "10 ms",
            "" => "1.5",
            unit => panic!("{unit}"),
        },
    })
}

/// The value as it stands in a file.
fn in_file(form: Form, value: &str) -> String {
    match form {
        Form::Flag | Form::Count(..) | Form::Words(_) => value.to_owned(),
        Form::Quantity(m) if m.unit.is_empty() => value.to_owned(),
        _ => format!("'{value}'"),
    }
}

#[test]
fn every_key_can_be_set() {
    let plain = read(&[]).unwrap();
    let mut set = 0;
    for table in ["", "mains", "ambient", "margins", "ageing", "caps", "rail"] {
        for key in keys(table) {
            let Some(value) = sample(table, key.name, key.form) else {
                continue;
            };
            let path = match table {
                "" => key.name.to_owned(),
                "rail" => format!("rail.logic.{}", key.name),
                table => format!("{table}.{}", key.name),
            };
            // As it is, and as TOML.
            let supply = read(&[&format!("{path}={value}")]).unwrap_or_else(|faults| panic!("{path}: {faults:?}"));
            let toml = format!(" {path} = {} ", in_file(key.form, value));
            assert_eq!(read(&[&toml]).unwrap(), supply, "{toml}");
            assert_ne!(supply, plain, "{path}");
            // As if it stood in the file: the copy in a saved build is all that there is to it.
            assert_eq!(changed(&supply, &[]).unwrap(), supply, "{path}");
            let table = match table {
                "" => &supply.content,
                "rail" => &supply.content["rail"][0],
                table => &supply.content[table],
            };
            let told = match key.form {
                Form::Words(_) => table[key.name].to_string(),
                _ => table[key.name]
                    .as_str()
                    .map_or_else(|| table[key.name].to_string(), str::to_owned),
            };
            assert_eq!(told, value, "{path}");
            if key.name != "name" && !matches!(key.form, Form::Words(_)) {
                assert_eq!(stated(&supply, &path).as_deref(), Some(value), "{path}");
            }
            set += 1;
        }
    }
    assert_eq!(set, 36);
}

#[test]
fn later_settings_win_and_absent_tables_come_into_being() {
    let supply = read(&["caps.heat=30 W", "builds=7", "caps.heat=20 W", "ageing.esr_rise=1"]).unwrap();
    assert_eq!(
        (supply.caps.heat_w, supply.builds, supply.ageing.esr_rise),
        (Some(20.0), 7, 1.0)
    );
    let supply = read(&["rail.logic.aux-2 = b.ripple=6 mV", "rail.logic.ripple=\"7 mV\""]).unwrap();
    assert_eq!(supply.rails[0].ripple_v, Some(0.007));
    assert_eq!(supply.rails[1].ripple_v, Some(0.006));
    // A name that is set counts from there on.
    let supply = read(&["rail.logic.name=display", "rail.display.dip=10 ms"]).unwrap();
    assert_eq!(
        (supply.rails[0].name.as_str(), supply.rails[0].dip_s),
        ("display", Some(0.01))
    );
}

#[test]
fn a_setting_of_the_mains_takes_the_place_of_the_other_form() {
    let plain = read(&[]).unwrap().mains;
    assert_eq!((plain.low_v, plain.high_v), (207.0, 253.0));
    let low = read(&["mains.low=212 V"]).unwrap();
    assert_eq!((low.mains.low_v, low.mains.high_v), (212.0, 253.0));
    assert!(low.content["mains"].get("tolerance").is_none());
    let both = read(&["mains.high=250 V", "mains.low=212 V"]).unwrap().mains;
    assert_eq!((both.low_v, both.high_v), (212.0, 250.0));
    let back = read(&["mains.low=212 V", "mains.tolerance=6 %"]).unwrap();
    assert_eq!(back.mains.high_v, 230.0 + 230.0 * 0.06);
    assert!(back.content["mains"].get("low").is_none());
    // What no key states.
    let supply = read(&[]).unwrap();
    let said = |key: &str| stated(&supply, key);
    assert_eq!(said("mains.low").as_deref(), Some("207 V"));
    assert_eq!(said("ageing.life").as_deref(), Some("20000 h"));
    assert_eq!(said("caps.cans").as_deref(), Some("3"));
    assert_eq!(said("rail.logic.aux-2 = b.ripple").as_deref(), Some("5 mV"));
    assert_eq!(
        (said("caps.cost"), said("rail.logic.ripple"), said("no.such")),
        (None, None, None)
    );
}

#[test]
fn bad_settings_are_told_with_what_was_written() {
    for (setting, problem) in [
        (
            "ambient.high",
            "has no equals sign; write KEY=VALUE, for example ambient.high=\"43 degC\"",
        ),
        (
            "ambient.hihg=43 degC",
            "is not a known key; did you mean \"ambient.high\"?",
        ),
        (
            "ambeint.high=43 degC",
            "is not a known key; did you mean \"ambient.high\"?",
        ),
        ("bulids=3", "is not a known key; did you mean \"builds\"?"),
        ("ripple=6 mV", "is not a known key; did you mean \"rail.logic.ripple\"?"),
        (
            "rail.logic.riple=6 mV",
            "is not a known key; did you mean \"rail.logic.ripple\"?",
        ),
        (
            "rail.logik.ripple=6 mV",
            "names no rail: \"logik\"; did you mean \"logic\"?",
        ),
        (
            "rail.zz.ripple=6 mV",
            "names no rail: \"zz\"; the rails are logic, logic.aux-2 = b",
        ),
        (
            "ambient.xyzzy=3",
            "is not a known key; known are ambient.low, ambient.high, ambient.inside_rise",
        ),
        (
            "xyzzy=3",
            "is not a known key; known are the keys of the supply file: builds, ambient.high, rail.NAME.ripple",
        ),
        (
            "ambient=3",
            "is a table; set one of ambient.low, ambient.high, ambient.inside_rise",
        ),
        ("ambient.high=43", "\"43\" has no unit; write \"43 degC\""),
        (
            "ambient.high=43 W",
            "\"43 W\" is not a temperature; its unit is one of degC, \u{B0}C",
        ),
        ("ambient.high=", "is not a number; a temperature: -60 to 150 degC"),
        ("builds=0", "\"0\" is out of range; a whole number from 1 to 1000000000"),
        (
            "builds=many",
            "\"many\" is not a whole number; a whole number from 1 to 1000000000",
        ),
        (
            "caps.cost=1e9",
            "\"1e9\" is out of range; allowed: above 0 up to 1000000",
        ),
        (
            "rail.logic.isolated=yes",
            "\"yes\" is of another type; write true or false, without quotes",
        ),
        (
            "rail.logic.paths=bridge",
            "\"bridge\" is not a list; a list of some of \"half-wave\", \"centre-tap\", \"bridge\", \"dual\"",
        ),
        (
            "rail.logic.paths=[\"bridg\"]",
            "\"bridg\" is not a known word; did you mean \"bridge\"? allowed: half-wave, centre-tap, bridge, dual",
        ),
        (
            "rail.logic.idle=2 A",
            "\"2 A\" is above current; at most the full-load current",
        ),
        ("mains.low=240 V", "\"240 V\" is above voltage; low <= voltage <= high"),
        (
            "name=a\nbuilds=3",
            "\"a\nbuilds=3\" has a control character; write one line of text",
        ),
    ] {
        check(&[setting], &format!("--set {setting}: {problem}"));
    }
    // A key of the file that a setting makes wrong is told where it stands.
    check(
        &["ambient.high=-5 degC"],
        "supply.toml:11: ambient.low: \"0 degC\" is above high; low <= high",
    );
    // All of them at once, and those of the file with them.
    assert_eq!(read(&["builds=0", "xy=1", "caps.cans=0"]).unwrap_err().len(), 3);
}

proptest::proptest! {
    #[test]
    fn no_setting_brings_the_reader_down(setting in ".*", key in "[a-z.]{0,12}", value in ".*") {
        let _ = read(&[&setting]);
        let _ = read(&[&format!("{key}={value}")]);
        let _ = read(&[&format!("rail.logic.paths={value}")]);
    }
}

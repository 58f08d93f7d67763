//! Owns the reading of a supply, from its TOML file or from the copy in a saved build.

use super::rails;
use super::reader::{Reader, Table};
use super::settings::apply;
use super::tree::{Node, Value};
use super::{Ageing, Ambient, Caps, Mains, Margins, Supply};
use crate::fault::Fault;
use crate::text;
use crate::units::Wrong;

/// Reads a supply file.
///
/// # Errors
/// Every fault of the file, with line and key path; of a TOML syntax error that one alone.
pub fn read(path: &std::path::Path) -> Result<Supply, Vec<Fault>> {
    read_with(path, &[])
}

/// Reads a supply file with settings ("KEY=VALUE"), each as if it stood in the file instead of what does.
///
/// # Errors
/// As [`read`]; a fault of a setting names the setting instead of a line.
pub fn read_with(path: &std::path::Path, settings: &[String]) -> Result<Supply, Vec<Fault>> {
    let file = path.display().to_string();
    let text = text::read(path)?;
    let mut node = Node::from_toml(&text).map_err(|(line, message)| {
        vec![Fault {
            file: file.clone(),
            line,
            problem: message,
            ..Fault::default()
        }]
    })?;
    let faults = apply(&mut node, settings);
    with(faults, supply(&node, &file))
}

/// A supply with settings ("KEY=VALUE"), checked as a whole once more.
///
/// # Errors
/// Every fault; one of a setting names the setting.
pub fn changed(supply: &Supply, settings: &[String]) -> Result<Supply, Vec<Fault>> {
    let mut node = Node::from_json(&supply.content);
    let faults = apply(&mut node, settings);
    with(faults, self::supply(&node, ""))
}

/// Faults of the settings come first.
fn with(mut faults: Vec<Fault>, supply: Result<Supply, Vec<Fault>>) -> Result<Supply, Vec<Fault>> {
    match supply {
        Ok(supply) if faults.is_empty() => Ok(supply),
        Ok(_) => Err(faults),
        Err(more) => {
            faults.extend(more);
            Err(faults)
        }
    }
}

/// Reads the supply of a saved build.
///
/// # Errors
/// Every fault, with the key path.
pub fn from_json(value: &serde_json::Value, file: &str) -> Result<Supply, Vec<Fault>> {
    supply(&Node::from_json(value), file)
}

fn supply(node: &Node, file: &str) -> Result<Supply, Vec<Fault>> {
    let Value::Table(entries) = &node.value else {
        return Err(vec![Fault {
            file: file.to_owned(),
            text: node.text(),
            problem: "is not a supply".into(),
            allowed: "a table of keys".into(),
            ..Fault::default()
        }]);
    };
    let mut reader = Reader {
        file,
        faults: Vec::new(),
    };
    let r = &mut reader;
    let top = Table {
        name: "",
        path: String::new(),
        line: None,
        entries,
    };
    r.check_keys(&top);
    let share_never = r.word(&top, "share").is_some();
    let supply = Supply {
        name: r.text(&top, "name").unwrap_or_default(),
        builds: r.count(&top, "builds").unwrap_or_default(),
        catalogue: r.text(&top, "catalogue"),
        mains: mains(r, &top),
        ambient: ambient(r, &top),
        margins: margins(r, &top),
        ageing: ageing(r, &top),
        caps: caps(r, &top),
        share_never,
        rails: rails::rails(r, &top, share_never),
        content: node.to_json(),
    };
    if reader.faults.is_empty() {
        return Ok(supply);
    }
    // In order of the file; what is missing altogether comes first.
    reader.faults.sort_by_key(|f| f.line);
    Err(reader.faults)
}

fn mains(r: &mut Reader<'_>, top: &Table<'_>) -> Mains {
    let t = r.table(top, "mains");
    let nominal = r.number(&t, "voltage");
    let tolerance = r.number(&t, "tolerance");
    let (mut low, mut high) = (r.number(&t, "low"), r.number(&t, "high"));
    let stated = |key| t.get(key).is_some();
    match (stated("tolerance"), stated("low"), stated("high")) {
        (true, false, false) => {
            low = nominal.zip(tolerance).map(|(v, t)| v - v * t);
            high = nominal.zip(tolerance).map(|(v, t)| v + v * t);
        }
        (false, true, true) => {}
        (false, false, false) => {
            let wrong = Wrong::new("is missing", "write tolerance = \"10 %\", or low and high");
            r.fault(&t, "tolerance", wrong);
        }
        (true, ..) => {
            let wrong = Wrong::new("stands beside low or high", "write tolerance, or low and high");
            r.fault(&t, "tolerance", wrong);
        }
        (false, true, false) => {
            r.fault(&t, "high", Wrong::new("is missing", "low and high are stated together"));
        }
        (false, false, true) => {
            r.fault(&t, "low", Wrong::new("is missing", "low and high are stated together"));
        }
    }
    if low.zip(nominal).is_some_and(|(l, v)| l > v) {
        r.fault(&t, "low", Wrong::new("is above voltage", "low <= voltage <= high"));
    }
    if high.zip(nominal).is_some_and(|(h, v)| h < v) {
        r.fault(&t, "high", Wrong::new("is below voltage", "low <= voltage <= high"));
    }
    Mains {
        low_v: low.unwrap_or_default(),
        nominal_v: nominal.unwrap_or_default(),
        high_v: high.unwrap_or_default(),
        frequency_hz: r.number(&t, "frequency").unwrap_or_default(),
        flat_top: r.number(&t, "flat_top").unwrap_or_default(),
    }
}

fn ambient(r: &mut Reader<'_>, top: &Table<'_>) -> Ambient {
    let t = r.table(top, "ambient");
    let (low, high) = (r.number(&t, "low"), r.number(&t, "high"));
    if low.zip(high).is_some_and(|(l, h)| l > h) {
        r.fault(&t, "low", Wrong::new("is above high", "low <= high"));
    }
    Ambient {
        low_c: low.unwrap_or_default(),
        high_c: high.unwrap_or_default(),
        inside_rise_k: r.number(&t, "inside_rise").unwrap_or_default(),
    }
}

fn margins(r: &mut Reader<'_>, top: &Table<'_>) -> Margins {
    let t = r.table(top, "margins");
    Margins {
        headroom_v: r.number(&t, "headroom").unwrap_or_default(),
        reservoir: r.number(&t, "reservoir").unwrap_or_default(),
        reverse: r.number(&t, "reverse").unwrap_or_default(),
        junction_k: r.number(&t, "junction").unwrap_or_default(),
    }
}

fn ageing(r: &mut Reader<'_>, top: &Table<'_>) -> Ageing {
    let t = r.table(top, "ageing");
    Ageing {
        capacitance_loss: r.number(&t, "capacitance_loss").unwrap_or_default(),
        esr_rise: r.number(&t, "esr_rise").unwrap_or_default(),
        life_h: r.number(&t, "life").unwrap_or_default(),
    }
}

fn caps(r: &mut Reader<'_>, top: &Table<'_>) -> Caps {
    let t = r.table(top, "caps");
    let cans = r.count(&t, "cans").unwrap_or_default();
    Caps {
        cost: r.number(&t, "cost"),
        heat_w: r.number(&t, "heat"),
        height_m: r.number(&t, "height"),
        cans: u32::try_from(cans).unwrap_or_default(),
    }
}

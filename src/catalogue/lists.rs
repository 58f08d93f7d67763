//! Owns cells that hold several values: primaries, secondaries, break prices, safe operating area.

use super::Break;
use crate::units::{Measure, Money, Wrong, money, whole};

/// One value of secondary_v or secondary_a; a tapped one counts for two halves.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Winding {
    /// Volts or amperes, of one half where tapped.
    pub(super) value: f64,
    /// Written x-0-x.
    pub(super) tapped: bool,
}

/// Rated primary voltages in every wiring, rising.
pub(super) fn primaries(measure: &Measure, text: &str) -> Result<Vec<f64>, Wrong> {
    let values = |sign| -> Result<Vec<f64>, Wrong> { text.split(sign).map(|t| measure.cell(t)).collect() };
    if text.contains('+') && !text.contains('/') {
        return match values('+')?[..] {
            [a, b] if equal(a, b) => Ok(vec![a, a + b]),
            _ => Err(Wrong::new(
                "is not a pair of equal primaries",
                "write two equal voltages, such as 115+115",
            )),
        };
    }
    if text.contains('+') {
        return Err(Wrong::new(
            "mixes + and /",
            "write 115+115 for two equal primaries, 100/120/230 for taps",
        ));
    }
    let mut taps = values('/')?;
    taps.sort_by(f64::total_cmp);
    if taps.windows(2).any(|w| equal(w[0], w[1])) {
        return Err(Wrong::new("repeats a tap", "write each tap once"));
    }
    Ok(taps)
}

/// Secondaries as written.
pub(super) fn windings(measure: &Measure, text: &str) -> Result<Vec<Winding>, Wrong> {
    text.split('+').map(|item| winding(measure, item)).collect()
}

fn winding(measure: &Measure, item: &str) -> Result<Winding, Wrong> {
    let pieces: Vec<&str> = item.split('-').map(str::trim).collect();
    let [left, "0", right] = pieces[..] else {
        let value = measure.cell(item)?;
        return Ok(Winding { value, tapped: false });
    };
    let (left, right) = (measure.cell(left)?, measure.cell(right)?);
    if !equal(left, right) {
        return Err(Wrong::new(
            "has unequal halves",
            "write x-0-x with both halves equal, or two windings with +",
        ));
    }
    Ok(Winding {
        value: left,
        tapped: true,
    })
}

/// Break prices: pieces rise from 2, prices never rise, from `price` on.
pub(super) fn breaks(price: Option<Money>, text: &str) -> Result<Vec<Break>, Wrong> {
    let mut out: Vec<Break> = Vec::new();
    let mut last = (1, price);
    for item in text.split_whitespace() {
        let (pieces, amount) = item
            .split_once(':')
            .ok_or_else(|| Wrong::new("is not pieces:price", "write 100:0.38 1000:0.29"))?;
        let (pieces, amount) = (whole(pieces, 2, u64::MAX)?, money(amount)?);
        if pieces <= last.0 {
            return Err(Wrong::new(
                "has pieces that do not rise",
                "write the breaks from few pieces to many",
            ));
        }
        if last.1.is_some_and(|before| amount > before) {
            return Err(Wrong::new(
                "has a price above the one before",
                "prices never rise with pieces",
            ));
        }
        last = (pieces, Some(amount));
        out.push(Break { pieces, price: amount });
    }
    Ok(out)
}

/// Points of the safe operating area, volts rising.
pub(super) fn soa(volts: &Measure, amps: &Measure, text: &str) -> Result<Vec<(f64, f64)>, Wrong> {
    let mut points: Vec<(f64, f64)> = Vec::new();
    for item in text.split_whitespace() {
        let (v, a) = item
            .split_once(':')
            .ok_or_else(|| Wrong::new("is not volts:amps", "write 10:5 30:1.2"))?;
        let point = (volts.cell(v)?, amps.cell(a)?);
        if points.last().is_some_and(|before| point.0 <= before.0) {
            return Err(Wrong::new(
                "has volts that do not rise",
                "write the points from low volts to high",
            ));
        }
        points.push(point);
    }
    Ok(points)
}

/// Texts of the same number give the same bits, so this only spells `==` where lints forbid it.
fn equal(a: f64, b: f64) -> bool {
    a.total_cmp(&b).is_eq()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::{Dimension, Range};

    const V: Measure = Measure::new(Dimension::Voltage, "V", Range::above(0.0).to(1000.0));

    #[test]
    fn primary_wirings() {
        assert_eq!(primaries(&V, "230"), Ok(vec![230.0]));
        assert_eq!(primaries(&V, "115+115"), Ok(vec![115.0, 230.0]));
        assert_eq!(primaries(&V, "230/100 / 120 V"), Ok(vec![100.0, 120.0, 230.0]));
        for (text, problem) in [
            ("115+120", "is not a pair of equal primaries"),
            ("115+115+115", "is not a pair of equal primaries"),
            ("115+115/230", "mixes + and /"),
            ("230/230", "repeats a tap"),
            ("230/", "is not a number"),
            ("0-115-230", "is out of range"),
        ] {
            let found = primaries(&V, text).unwrap_err().problem;
            assert!(found == problem || text.contains('-'), "{text}: {found}");
        }
    }

    #[test]
    fn secondary_forms() {
        let forms = |text| -> Vec<(f64, bool)> {
            let list = windings(&V, text).unwrap();
            list.iter().map(|w| (w.value, w.tapped)).collect()
        };
        assert_eq!(forms("12"), [(12.0, false)]);
        assert_eq!(forms("15+15 + 8"), [(15.0, false), (15.0, false), (8.0, false)]);
        assert_eq!(forms("12-0-12"), [(12.0, true)]);
        assert_eq!(forms("12 - 0 - 12 V + 500 mV"), [(12.0, true), (0.5, false)]);
        for text in [
            "12-0-9",
            "12-0",
            "12-12",
            "0",
            "12-0-12-0-12",
            "+",
            "-12",
            "12\u{2013}0\u{2013}12",
        ] {
            assert!(windings(&V, text).is_err(), "{text}");
        }
    }

    #[test]
    fn breaks_rise_in_pieces_and_never_in_price() {
        let read = |text| breaks(Some(Money(1_000_000)), text).map(|b| b.len());
        assert_eq!(read("100:0.38 1000:0.29"), Ok(2));
        assert_eq!(read("2:1 3:1"), Ok(2));
        for text in [
            "1:0.5",
            "100:0.3 100:0.2",
            "100:0.3 50:0.2",
            "100:1.01",
            "10:0.5 20:0.6",
            "10",
            "10:",
            ":1",
        ] {
            assert!(read(text).is_err(), "{text}");
        }
    }

    #[test]
    fn soa_points() {
        assert_eq!(soa(&V, &V, "10:5 30:1.2"), Ok(vec![(10.0, 5.0), (30.0, 1.2)]));
        for text in ["10", "10:5 10:4", "30:1 10:5", "0:5", "10:0", "10:5;30:1"] {
            assert!(soa(&V, &V, text).is_err(), "{text}");
        }
    }
}

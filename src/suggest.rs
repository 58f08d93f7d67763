//! Owns "did you mean": the nearest known name to one that is not known.

/// Below this similarity (Jaro-Winkler, 0 to 1) a guess looks like nonsense; tried on the column and key names.
const LEAST: f64 = 0.82;

/// The known name most like `word`, the first of equals; `None` where nothing is like it.
#[must_use]
pub fn nearest<'a>(word: &str, known: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let word = word.to_lowercase();
    let mut best = None;
    let mut likeness = LEAST;
    for name in known {
        let likely = strsim::jaro_winkler(&word, &name.to_lowercase());
        if likely > likeness {
            (best, likeness) = (Some(name), likely);
        }
    }
    best
}

/// `did you mean "vrrm_v"?`, or "" where nothing is like it.
#[must_use]
pub fn did_you_mean<'a>(word: &str, known: impl IntoIterator<Item = &'a str>) -> String {
    nearest(word, known).map_or_else(String::new, |name| format!("did you mean \"{name}\"?"))
}

#[cfg(test)]
mod tests {
    use super::*;

    const NAMES: [&str; 8] = [
        "part",
        "price",
        "vrrm_v",
        "esr_mohm",
        "ripple_a",
        "va",
        "io_a",
        "tolerance",
    ];

    #[test]
    fn slips_find_their_name() {
        for (word, name) in [
            ("vrm_v", "vrrm_v"),
            ("VRRM_V", "vrrm_v"),
            ("esr", "esr_mohm"),
            ("ripple_ma", "ripple_a"),
            ("prise", "price"),
            ("tollerance", "tolerance"),
            ("PART", "part"),
        ] {
            assert_eq!(nearest(word, NAMES), Some(name), "{word}");
        }
    }

    #[test]
    fn nonsense_finds_nothing() {
        for word in ["", "xyzzy", "foo", "0", "quux", "\u{1F600}", "colour"] {
            assert_eq!(nearest(word, NAMES), None, "{word}");
        }
        assert_eq!(did_you_mean("xyzzy", NAMES), "");
    }
}

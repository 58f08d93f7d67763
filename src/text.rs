//! Owns files as text: UTF-8 with or without a byte order mark, and the line at which a byte stands.

use std::path::Path;

use crate::fault::Fault;

/// The text of a file, without a byte order mark.
///
/// # Errors
/// One fault: the file is missing, cannot be read, or is not UTF-8 (with the line of the first bad byte).
pub fn read(path: &Path) -> Result<String, Vec<Fault>> {
    let file = path.display().to_string();
    match std::fs::read(path) {
        Ok(bytes) => decode(&bytes, &file),
        Err(e) => Err(vec![Fault {
            problem: if e.kind() == std::io::ErrorKind::NotFound {
                "is missing".into()
            } else {
                format!("cannot be read: {e}")
            },
            file,
            ..Fault::default()
        }]),
    }
}

/// The text of these bytes, without a byte order mark.
///
/// # Errors
/// One fault where they are not UTF-8. Nothing is guessed: the signs at stake are micro and ohm.
pub fn decode(bytes: &[u8], file: &str) -> Result<String, Vec<Fault>> {
    let fault = |line, problem: &str| {
        Err(vec![Fault {
            file: file.into(),
            line: Some(line),
            problem: problem.into(),
            allowed: "save the file as UTF-8".into(),
            ..Fault::default()
        }])
    };
    if bytes.starts_with(&[0xFF, 0xFE]) || bytes.starts_with(&[0xFE, 0xFF]) {
        return fault(1, "the file is UTF-16");
    }
    let bytes = bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(bytes);
    match std::str::from_utf8(bytes) {
        Ok(text) => Ok(text.to_owned()),
        Err(e) => {
            let newlines = bytes[..e.valid_up_to()].iter().filter(|b| **b == b'\n').count();
            fault(newlines as u64 + 1, "the line is not UTF-8 text")
        }
    }
}

/// The line, counted from 1, at which the byte stands.
#[must_use]
pub fn line_at(text: &str, byte: usize) -> u64 {
    let before = &text.as_bytes()[..byte.min(text.len())];
    before.iter().filter(|b| **b == b'\n').count() as u64 + 1
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_byte_order_mark_is_not_text() {
        assert_eq!(decode(b"\xEF\xBB\xBFpart", "f").unwrap(), "part");
        assert_eq!(decode(b"part", "f").unwrap(), "part");
    }

    #[test]
    fn other_encodings_are_refused_with_the_line() {
        assert_eq!(
            decode(b"part\r\n5 \xB5F\r\n", "f").unwrap_err()[0].to_string(),
            "f:2: the line is not UTF-8 text; save the file as UTF-8"
        );
        assert_eq!(
            decode(b"\xFF\xFEp\0", "f").unwrap_err()[0].to_string(),
            "f:1: the file is UTF-16; save the file as UTF-8"
        );
    }

    #[test]
    fn lines_count_from_one() {
        assert_eq!(line_at("a\nb", 0), 1);
        assert_eq!(line_at("a\nb", 2), 2);
        assert_eq!(line_at("a\nb", 99), 2);
    }
}

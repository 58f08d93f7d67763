//! Owns the splitting of CSV text into records, with the true line of each.
//!
//! The csv crate is not used here: its lines are wrong after CRLF and blank lines (rust-csv issues 208 and 395), and it
//! takes an opening quote without an end as a cell that swallows the rest of the file. A test holds that both agree
//! on the cells of well-formed text.

use crate::units::Wrong;

/// One row.
#[derive(Debug, PartialEq, Eq)]
pub(super) struct Record {
    /// Line at which it starts, counted from 1.
    pub(super) line: u64,
    /// Cells, without quotes.
    pub(super) cells: Vec<String>,
}

impl Record {
    /// Whether no cell holds anything.
    pub(super) fn blank(&self) -> bool {
        self.cells.iter().all(|c| c.trim().is_empty())
    }
}

/// All rows of the text but wholly blank ones, and what is wrong with its quotes, by line.
pub(super) fn split(text: &str) -> (Vec<Record>, Vec<(u64, Wrong)>) {
    let mut reader = Reader {
        rest: text,
        line: 1,
        wrongs: Vec::new(),
    };
    let mut records = Vec::new();
    while !reader.rest.is_empty() {
        let line = reader.line;
        let mut cells = Vec::new();
        while reader.cell(&mut cells) {}
        let record = Record { line, cells };
        if !record.blank() {
            records.push(record);
        }
    }
    (records, reader.wrongs)
}

struct Reader<'a> {
    rest: &'a str,
    line: u64,
    wrongs: Vec<(u64, Wrong)>,
}

impl Reader<'_> {
    /// Reads one cell and what ends it; `true` where a comma does, so that another cell follows.
    fn cell(&mut self, cells: &mut Vec<String>) -> bool {
        let mut cell = String::new();
        // Blanks before a quote are no text: people write `a, "b, c"`.
        let inner = self.rest.trim_start_matches([' ', '\t']);
        if let Some(quoted) = inner.strip_prefix('"') {
            self.rest = quoted;
            if !self.quoted(&mut cell) {
                // What was swallowed is no row: one fault is enough.
                cells.clear();
                return false;
            }
        }
        let end = self.rest.find([',', '\n', '\r']).unwrap_or(self.rest.len());
        let (plain, rest) = self.rest.split_at(end);
        cell.push_str(plain);
        cells.push(cell);
        if let Some(rest) = rest.strip_prefix(',') {
            self.rest = rest;
            return true;
        }
        let rest_of_line = rest.strip_prefix("\r\n").or_else(|| rest.strip_prefix(['\r', '\n']));
        self.line += u64::from(rest_of_line.is_some());
        self.rest = rest_of_line.unwrap_or("");
        false
    }

    /// Reads on to behind the closing quote; `false` where there is none.
    fn quoted(&mut self, cell: &mut String) -> bool {
        let opened = self.line;
        loop {
            let Some(end) = self.rest.find('"') else {
                self.wrongs.push((
                    opened,
                    Wrong::new(
                        "a quote opens here and never closes",
                        "close it, or write a quote inside a quoted cell twice",
                    ),
                ));
                self.rest = "";
                return false;
            };
            let inside = &self.rest[..end];
            let breaks = inside.matches('\n').count() + inside.matches('\r').count() - inside.matches("\r\n").count();
            self.line += breaks as u64;
            cell.push_str(inside);
            self.rest = &self.rest[end + 1..];
            match self.rest.strip_prefix('"') {
                Some(rest) => {
                    cell.push('"');
                    self.rest = rest;
                }
                None => break,
            }
        }
        let behind = self.rest.trim_start_matches([' ', '\t']);
        if !(behind.is_empty() || behind.starts_with([',', '\n', '\r'])) {
            self.wrongs.push((
                self.line,
                Wrong::new(
                    "text follows a closing quote",
                    "quote the whole cell, and write a quote inside it twice",
                ),
            ));
        }
        true
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[track_caller]
    fn check(text: &str, expected: &[(u64, &[&str])]) {
        let (records, wrongs) = split(text);
        let got: Vec<(u64, Vec<&str>)> = (records.iter())
            .map(|r| (r.line, r.cells.iter().map(String::as_str).collect()))
            .collect();
        let expected: Vec<(u64, Vec<&str>)> = (expected.iter()).map(|(line, cells)| (*line, cells.to_vec())).collect();
        assert_eq!(got, expected);
        assert_eq!(wrongs, []);
    }

    #[test]
    fn lines_are_true_after_any_line_end() {
        for end in ["\n", "\r\n", "\r"] {
            let text = ["a,b", "", "1,2", " , ", "\"x", "y\",\"say \"\"hi\"\"\"", "3,"].join(end);
            let cell = format!("x{end}y");
            check(
                &text,
                &[
                    (1, &["a", "b"]),
                    (3, &["1", "2"]),
                    (5, &[&cell, "say \"hi\""]),
                    (7, &["3", ""]),
                ],
            );
        }
    }

    #[test]
    fn quotes_inside_plain_text_are_text() {
        check("5\" rack, \"a,b\" ,c\n", &[(1, &["5\" rack", "a,b ", "c"])]);
    }

    #[test]
    fn an_unclosed_quote_names_its_own_line() {
        let (records, wrongs) = split("a,b\n1,2\n3,\"x\n4,5\n6,7\n");
        assert_eq!(records.len(), 2);
        assert_eq!(wrongs.len(), 1);
        assert_eq!(wrongs[0].0, 3);
    }

    #[test]
    fn text_behind_a_quote_is_told() {
        let (records, wrongs) = split("a\n\"x\ny\"z,1\n");
        assert_eq!(records[1].cells, ["x\nyz", "1"]);
        assert_eq!(wrongs[0].0, 3);
    }

    proptest! {
        #[test]
        fn cells_are_those_of_the_csv_crate(
            text in "((a|\u{B5}5|\"b\"|\"b,\"\"\nc\")?(,|\n|\r\n)){0,12}(a|\"b\")?",
        ) {
            let (records, wrongs) = split(&text);
            prop_assert_eq!(wrongs, []);
            let mut reader = csv::ReaderBuilder::new();
            let mut reader = reader.has_headers(false).flexible(true).from_reader(text.as_bytes());
            let theirs: Vec<Vec<String>> = reader.records()
                .map(|r| r.unwrap().iter().map(str::to_owned).collect())
                .filter(|r: &Vec<String>| r.iter().any(|c| !c.trim().is_empty()))
                .collect();
            let ours: Vec<Vec<String>> = records.into_iter().map(|r| r.cells).collect();
            prop_assert_eq!(ours, theirs);
        }
    }
}

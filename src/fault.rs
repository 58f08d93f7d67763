//! Owns what is said about bad input: where it stands, its text, what is wrong, what is allowed.

use std::fmt;

/// One fault of a file or of the call. Readers collect all of them, then stop.
#[derive(Debug, Clone, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct Fault {
    /// File (as the user named it) or "" for the command line.
    pub file: String,
    /// Line counted from 1.
    pub line: Option<u64>,
    /// Column header of a CSV file, key path of a TOML or JSON file, or flag.
    pub column: Option<String>,
    /// Part that the row describes.
    pub part: Option<String>,
    /// The bad text as it stands in the file.
    pub text: String,
    /// What is wrong, a short clause: "is not a number".
    pub problem: String,
    /// What is allowed or what to do.
    pub allowed: String,
}

impl Fault {
    /// What is wrong and what is allowed, in one sentence.
    #[must_use]
    pub fn message(&self) -> String {
        if self.allowed.is_empty() {
            self.problem.clone()
        } else {
            format!("{}; {}", self.problem, self.allowed)
        }
    }
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if !self.file.is_empty() {
            write!(f, "{}", self.file)?;
            if let Some(line) = self.line {
                write!(f, ":{line}")?;
            }
            write!(f, ": ")?;
        }
        if let Some(part) = &self.part {
            write!(f, "part {part}: ")?;
        }
        // An unknown column is its own bad text: once is enough.
        if let Some(column) = self.column.as_ref().filter(|c| **c != self.text) {
            write!(f, "{column}: ")?;
        }
        if !self.text.is_empty() {
            write!(f, "\"{}\" ", self.text)?;
        }
        write!(f, "{}", self.message())
    }
}

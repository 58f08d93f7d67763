//! Owns the JSON Schema of the documents, as committed and as the tool prints it.

/// The schema of every document that this version writes.
pub const DOCUMENTS: &str = include_str!("schema.json");

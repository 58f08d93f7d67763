//! Owns the catalogue: the parts of a firm, read from its CSV files.

mod build;
mod columns;
mod file;
mod lists;
mod parts;
mod read;
mod row;
mod schema;
mod split;

pub(crate) use columns::DEVICE_KINDS;
pub use parts::*;
pub use read::{Loaded, SavedPart, from_cells, load};
pub(crate) use schema::unknown_word;
pub use schema::{Column, Form, Missing, columns, markdown};

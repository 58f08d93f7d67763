//! Owns the supply file: what is to be built.

mod form;
mod keys;
mod rails;
mod read;
mod reader;
mod settings;
mod tree;
mod types;

pub use form::Form;
pub use keys::{Key, keys, markdown};
pub use read::{changed, from_json, read, read_with};
pub use settings::stated;
pub use types::*;

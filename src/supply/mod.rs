//! Owns the supply file: what is to be built.

mod form;
mod keys;
mod rails;
mod read;
mod reader;
mod tree;
mod types;

pub use form::Form;
pub use keys::{Key, keys, markdown};
pub use read::{from_json, read};
pub use types::*;

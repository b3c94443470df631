//! A session in the fragment of an address: `v1.<payload>.<checksum>`.

mod configuration;
mod envelope;

pub use configuration::{SCHEMA_VERSION, decode, encode, known_blocks};
pub use envelope::{open, seal};

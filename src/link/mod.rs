//! A session in the fragment of an address: `v1.<payload>.<checksum>`.

mod configuration;
mod envelope;

pub(crate) use configuration::name_with_unit;
pub use configuration::{SCHEMA_VERSION, decode, encode, known_blocks, read_file, write_file};
pub use envelope::{open, seal};

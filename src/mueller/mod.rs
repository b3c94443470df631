//! Mueller and Jones matrices, the elements, composing and turning.

pub mod elements;
mod jones;
mod matrix;

pub use jones::Jones;
pub(crate) use jones::PAULI;
pub use matrix::Mueller;

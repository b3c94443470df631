//! Mueller and Jones matrices, the elements, composing and turning.

pub mod elements;
mod interface;
mod jones;
mod matrix;

pub(crate) use elements::unit_diattenuator;
pub use interface::Interface;
pub use jones::Jones;
pub(crate) use jones::PAULI;
pub use matrix::Mueller;
pub(crate) use matrix::frame_rotation;

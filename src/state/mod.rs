//! States of light: Jones vector, Stokes vector, polarization ellipse.

mod jones_vector;
mod stokes;

pub use jones_vector::JonesVector;
pub(crate) use stokes::half_turn;
pub use stokes::{Ellipse, PhysicalStokes, Stokes};

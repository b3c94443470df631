//! Decompositions, one method a file.

mod isotropic;
mod polar;
mod spectral;

pub use isotropic::{Isotropic, isotropic};
pub use polar::{PolarFactors, RetarderParameters, polar_forward, polar_reverse};
pub use spectral::{PureComponent, spectral};

//! Decompositions, one method a file.

mod characteristic;
mod differential;
mod isotropic;
mod polar;
mod spectral;

pub use characteristic::{MixedComponent, characteristic};
pub use differential::{Differential, Properties, differential};
pub use isotropic::{Isotropic, isotropic};
pub use polar::{PolarFactors, RetarderParameters, polar_forward, polar_reverse};
pub use spectral::{PureComponent, spectral};

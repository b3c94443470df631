//! Trains of elements: following the light, fitting what is unknown, taking known optics
//! away.
//!
//! A train is a list of elements; light meets them in list order, so that the matrix of
//! the whole is the product from the last to the first. Every parameter is fixed, free
//! or tied to another one. Angles in radians, canonical convention.

mod direct;
mod element;
mod fit;
mod follow;
mod kind;
mod null;
mod remove;
mod sample;
mod sequence;
mod solver;
mod symmetry;
mod weights;

pub use direct::{DirectWeight, direct_weight};
pub use element::{Element, Parameter, Role};
pub use fit::{Equivalent, FitOptions, FittedParameter, TrainFit, fit_train};
pub use follow::{Followed, Step, follow};
pub use kind::{Definition, Kind, Quantity};
pub use null::{Combination, NullDirection};
pub use remove::{Removal, Removed, Sample, remove_optics};
pub use sequence::{Place as ParameterPlace, Train};
pub use solver::Stop;
pub use symmetry::{Symmetry, SymmetryTest, symmetries};

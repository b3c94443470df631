//! Least squares, the candidate models, and which of them explains a measurement.

mod bootstrap;
mod candidate;
mod derived;
mod least_squares;
mod mixtures;
mod models;
mod parameters;
mod profile;
mod selection;
mod starts;
mod target;

pub use bootstrap::Samples;
pub use candidate::{Fit, Fitter, Parameter};
pub use least_squares::{
    Determination, Minimum, Problem, Stop, determination, minimise, minimise_from,
};
pub use models::{Model, Side};
pub use parameters::Name;
pub use profile::Profile;
pub use selection::{Recommendation, Rule, recommend, remarks};

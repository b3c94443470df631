//! The scalar figures of a measured matrix, their standard errors and intervals.

mod compare;
mod detection;
mod errors;
mod samples;
mod table;
mod values;

pub use compare::{Comparison, Difference, compare};
pub use detection::{Detectable, detectable};
pub(crate) use samples::Samples;
pub(crate) use table::figures;
pub use table::{Figure, FigureTable, Interval, Method, figures_of};
pub(crate) use values::Analysis;
pub use values::{FigureName, Unit};

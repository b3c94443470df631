//! The scalar figures of a measured matrix, and their standard errors.

mod errors;
mod values;

pub(crate) use errors::figures;
pub use errors::{Figure, FigureTable};
pub(crate) use values::Analysis;
pub use values::{FigureName, Unit};

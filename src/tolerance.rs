//! Every tolerance of the engine, by name.

/// Largest magnitude that is taken as a measured number. Squares and products of
/// four such numbers, after scaling, stay far from overflow.
pub const LARGEST_NUMBER: f64 = 1e150;

/// "Exactly zero", relative to M00: what rounding of the arithmetic leaves.
pub const ZERO: f64 = 1e-12;

/// What decides *not determined* where no noise is stated.
pub const NOT_DETERMINED: f64 = 1e-9;

/// What decides *not determined* where noise is stated, in standard errors.
pub const STANDARD_ERRORS: f64 = 3.0;

/// The level of every test.
pub const SIGNIFICANCE: f64 = 0.05;

/// An eigenvalue whose argument is this near π, in radians, counts as negative and
/// real: rounding moves a double eigenvalue by the square root of the precision.
pub const NEGATIVE_AXIS: f64 = 1e-7;

/// Largest element that is left of a difference when a matrix square root has
/// settled: rounding of a few operations on numbers of order one.
pub const ROOT_SETTLED: f64 = 1e-14;

/// Largest and, inverted, smallest refractive index that is taken: far beyond any
/// material, and squares stay exact enough.
pub const LARGEST_INDEX: f64 = 1e6;

/// How far a covariance may be from symmetric, and its correlations from positive, by
/// the rounding of what printed it.
pub const SYMMETRY: f64 = 1e-9;

/// Correlations with a smaller eigenvalue make some combination of elements exact.
pub const SINGULAR_COVARIANCE: f64 = 1e-12;

/// Where the weighted nearest matrix has settled: `tr(H Z)` over the larger of one and
/// the squared distance.
pub const COMPLEMENTARITY: f64 = 1e-11;

/// Singular values this far below the largest are zero: the matrix has no inverse.
pub const SINGULAR: f64 = 1e-12;

/// Neighbours whose exchange changes the product by less, relative to the sizes of both,
/// may stand in either order.
pub const COMMUTING: f64 = 1e-12;

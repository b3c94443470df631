use nalgebra::{Matrix3, Matrix4, Vector3};
use num_complex::Complex64;

use crate::coherency::Coherency;
use crate::mueller::frame_rotation;

/// What may explain a measured matrix, in order of parameters. α is that of a parallel
/// mixture, `(1 − α) M_J + α M_J00 diag(1, 0, 0, 0)`, unless the side says otherwise.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Model {
    /// T, δ, azimuth of the fast axis, α.
    LinearRetarder,
    /// T, D, azimuth of the more transmitting axis, α.
    LinearDiattenuator,
    /// T, D, δ, common axis, α.
    AlignedDiattenuatingRetarder,
    /// T, retardance times axis (3), α.
    EllipticalRetarder,
    /// T, diattenuation vector (3), α.
    EllipticalDiattenuator,
    /// A Jones matrix.
    Pure,
    /// A Jones matrix and α.
    PureIsotropic,
    /// A Jones matrix and the depolarizer `diag(1, dL, dL, dC)`.
    PureLinearCircular,
    /// A Jones matrix and the depolarizer `diag(1, d1, d2, d3)`.
    PureDiagonal,
    /// A mixture of two Jones matrices.
    RankTwo,
    /// A mixture of three.
    RankThree,
    /// Any realizable matrix.
    RankFour,
}

/// Where the depolarization stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Side {
    /// Beside the element: light that goes past it loses its polarization.
    #[default]
    Parallel,
    /// In series, behind the element.
    After,
    /// In series, in front of the element.
    Before,
}

impl Model {
    /// All of them.
    pub const ALL: [Self; 12] = [
        Self::LinearRetarder,
        Self::LinearDiattenuator,
        Self::AlignedDiattenuatingRetarder,
        Self::EllipticalRetarder,
        Self::EllipticalDiattenuator,
        Self::Pure,
        Self::PureIsotropic,
        Self::PureLinearCircular,
        Self::PureDiagonal,
        Self::RankTwo,
        Self::RankThree,
        Self::RankFour,
    ];

    /// How many numbers it has.
    #[must_use]
    pub fn parameter_count(self) -> usize {
        match self {
            Self::LinearRetarder | Self::LinearDiattenuator => 4,
            Self::AlignedDiattenuatingRetarder
            | Self::EllipticalRetarder
            | Self::EllipticalDiattenuator => 5,
            Self::Pure => 7,
            Self::PureIsotropic => 8,
            Self::PureLinearCircular => 9,
            Self::PureDiagonal => 10,
            Self::RankTwo => 12,
            Self::RankThree => 15,
            Self::RankFour => 16,
        }
    }

    /// How many Jones matrices it mixes; `None` for those with fewer parameters than one.
    #[must_use]
    pub fn rank(self) -> Option<usize> {
        match self {
            Self::Pure | Self::PureIsotropic | Self::PureLinearCircular | Self::PureDiagonal => {
                Some(1)
            }
            Self::RankTwo => Some(2),
            Self::RankThree => Some(3),
            Self::RankFour => Some(4),
            _ => None,
        }
    }

    /// Whether it is a mixture, whose misfit follows no χ².
    #[must_use]
    pub fn is_mixture(self) -> bool {
        self.rank().is_some_and(|rank| rank > 1)
    }

    /// Whether the side makes a difference, which of the sides there are.
    #[must_use]
    pub fn side(self, asked: Side) -> Option<Side> {
        match self {
            Self::Pure | Self::RankTwo | Self::RankThree | Self::RankFour => None,
            Self::PureLinearCircular | Self::PureDiagonal if asked == Side::Parallel => {
                Some(Side::After)
            }
            _ => Some(asked),
        }
    }

    /// Whether its diattenuation may not pass one.
    pub(super) fn has_bound(self) -> bool {
        matches!(
            self,
            Self::LinearDiattenuator | Self::EllipticalDiattenuator
        )
    }

    /// Models that it contains, whose minimum it may not miss.
    pub(super) fn specials(self) -> &'static [Self] {
        match self {
            Self::AlignedDiattenuatingRetarder => &[Self::LinearRetarder, Self::LinearDiattenuator],
            Self::EllipticalRetarder => &[Self::LinearRetarder],
            Self::EllipticalDiattenuator => &[Self::LinearDiattenuator],
            _ => &[],
        }
    }

    /// The fitted parameters of one of them as its own.
    pub(super) fn embedding(self, special: Self, x: &[f64]) -> Option<Vec<f64>> {
        let &[t, size, azimuth, alpha] = x else {
            return None;
        };
        let (sine, cosine) = (2.0 * azimuth).sin_cos();
        match (self, special) {
            (Self::AlignedDiattenuatingRetarder, Self::LinearRetarder) => {
                Some(vec![t, 0.0, size, azimuth, alpha])
            }
            (Self::AlignedDiattenuatingRetarder, _) => Some(vec![t, size, 0.0, azimuth, alpha]),
            _ => Some(vec![t, size * cosine, size * sine, 0.0, alpha]),
        }
    }

    /// How many parameters stand at the end for the depolarization.
    pub(super) fn depolarizations(self) -> usize {
        match self {
            Self::Pure | Self::RankTwo | Self::RankThree | Self::RankFour => 0,
            Self::PureLinearCircular => 2,
            Self::PureDiagonal => 3,
            _ => 1,
        }
    }
}

/// A model with what is not fitted of it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Shape {
    pub model: Model,
    pub side: Side,
    /// The order in which the entries of a Jones matrix are eliminated: the first is real.
    pub pivots: [usize; 4],
    /// The diattenuation is one, and no parameter.
    pub is_polarizer: bool,
}

/// A matrix and its derivatives with respect to the parameters.
pub(super) struct Evaluated {
    pub matrix: Matrix4<f64>,
    pub derivatives: Vec<Matrix4<f64>>,
}

impl Shape {
    /// With the parameters that are fitted: those of the element, then those of the
    /// depolarization. A diattenuation is the sine of its parameter.
    pub fn evaluate(&self, x: &[f64]) -> Evaluated {
        let (own, depolarization) = x.split_at(x.len() - self.model.depolarizations());
        let element = match self.model {
            Model::LinearRetarder => linear(own[0], None, Some(own[1]), own[2]),
            Model::LinearDiattenuator => linear(own[0], Some(own[1]), None, own[2]),
            Model::AlignedDiattenuatingRetarder => {
                linear(own[0], Some(own[1]), Some(own[2]), own[3])
            }
            Model::EllipticalRetarder => vector(own, retarder_block),
            Model::EllipticalDiattenuator if self.is_polarizer => vector(own, polarizer),
            Model::EllipticalDiattenuator => vector(own, diattenuator_block),
            _ => mixture(own, self.model.rank().unwrap_or(1), &self.pivots),
        };
        self.depolarized(element, depolarization)
    }

    fn depolarized(&self, element: Evaluated, depolarization: &[f64]) -> Evaluated {
        if depolarization.is_empty() {
            return element;
        }
        let retained: [f64; 3] = match self.model {
            Model::PureLinearCircular => [depolarization[0], depolarization[0], depolarization[1]],
            Model::PureDiagonal => [depolarization[0], depolarization[1], depolarization[2]],
            _ => [1.0 - depolarization[0]; 3],
        };
        let apply = |m: &Matrix4<f64>, factors: [f64; 3], first: f64| {
            Matrix4::from_fn(|i, j| {
                let line = match self.side {
                    Side::Before => j,
                    _ => i,
                };
                let is_constant = match self.side {
                    Side::Parallel => i == 0 && j == 0,
                    _ => line == 0,
                };
                let factor = if is_constant {
                    first
                } else if self.side == Side::Parallel {
                    factors[0]
                } else {
                    factors[line - 1]
                };
                m[(i, j)] * factor
            })
        };
        let mut derivatives: Vec<_> = element
            .derivatives
            .iter()
            .map(|derivative| apply(derivative, retained, 1.0))
            .collect();
        let directions: &[[f64; 3]] = match self.model {
            Model::PureLinearCircular => &[[1.0, 1.0, 0.0], [0.0, 0.0, 1.0]],
            Model::PureDiagonal => &[[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]],
            _ => &[[-1.0, -1.0, -1.0]],
        };
        derivatives.extend(
            directions
                .iter()
                .map(|direction| apply(&element.matrix, *direction, 0.0)),
        );
        Evaluated {
            matrix: apply(&element.matrix, retained, 1.0),
            derivatives,
        }
    }
}

/// An element with linear eigenstates: T, then what there is of the parameter of D and of
/// δ, then the azimuth.
fn linear(
    transmittance: f64,
    lean: Option<f64>,
    retardance: Option<f64>,
    azimuth: f64,
) -> Evaluated {
    let (d, g) = lean.map_or((0.0, 1.0), f64::sin_cos);
    let (s, c) = retardance.map_or((0.0, 1.0), f64::sin_cos);
    let frame = frame_rotation(azimuth);
    let turned = |m: Matrix4<f64>| frame.transpose() * m * frame;
    let block = |one: f64, d: f64, gc: f64, gs: f64| {
        Matrix4::new(
            one, d, 0.0, 0.0, //
            d, one, 0.0, 0.0, //
            0.0, 0.0, gc, gs, //
            0.0, 0.0, -gs, gc,
        )
    };
    let unit = turned(block(1.0, d, g * c, g * s));
    let matrix = unit * transmittance;
    let mut derivatives = vec![unit];
    if lean.is_some() {
        derivatives.push(turned(block(0.0, g, -d * c, -d * s)) * transmittance);
    }
    if retardance.is_some() {
        derivatives.push(turned(block(0.0, 0.0, -g * s, g * c)) * transmittance);
    }
    let mut turn = Matrix4::zeros();
    turn[(1, 2)] = 2.0;
    turn[(2, 1)] = -2.0;
    derivatives.push(matrix * turn - turn * matrix);
    Evaluated {
        matrix,
        derivatives,
    }
}

/// A matrix with its derivatives along the three components of a vector.
type ByVector = (Matrix4<f64>, [Matrix4<f64>; 3]);

/// T and an element given by a vector.
fn vector(own: &[f64], element: fn(&Vector3<f64>) -> ByVector) -> Evaluated {
    let (unit, derivatives) = element(&Vector3::new(own[1], own[2], own[3]));
    Evaluated {
        matrix: unit * own[0],
        derivatives: std::iter::once(unit)
            .chain(derivatives.map(|derivative| derivative * own[0]))
            .collect(),
    }
}

/// `(1 − cos v)/v²`, `sin v / v` and the derivatives of both, each over v.
fn shapes(length: f64) -> [f64; 4] {
    let square = length * length;
    if length < 0.02 {
        // To the sixth order: below rounding.
        return [
            0.5 - square / 24.0 + square * square / 720.0,
            1.0 - square / 6.0 + square * square / 120.0,
            -1.0 / 12.0 + square / 180.0 - square * square / 6720.0,
            -1.0 / 3.0 + square / 30.0 - square * square / 840.0,
        ];
    }
    let (sine, cosine) = length.sin_cos();
    let (a, b) = ((1.0 - cosine) / square, sine / length);
    [a, b, (b - 2.0 * a) / square, (cosine - b) / square]
}

fn cross(v: &Vector3<f64>) -> Matrix3<f64> {
    // ε_ijk v_k
    Matrix3::new(0.0, v[2], -v[1], -v[2], 0.0, v[0], v[1], -v[0], 0.0)
}

fn lower(block: Matrix3<f64>, first: f64) -> Matrix4<f64> {
    let mut matrix = Matrix4::zeros();
    matrix[(0, 0)] = first;
    matrix.fixed_view_mut::<3, 3>(1, 1).copy_from(&block);
    matrix
}

/// A retarder with the vector retardance times axis.
fn retarder_block(v: &Vector3<f64>) -> ByVector {
    let length = v.norm();
    let [a, b, da, db] = shapes(length);
    let block = Matrix3::identity() * length.cos() + v * v.transpose() * a + cross(v) * b;
    let derivatives = std::array::from_fn(|k| {
        let unit = Vector3::ith(k, 1.0);
        let change = Matrix3::identity() * (-b * v[k])
            + v * v.transpose() * (da * v[k])
            + (unit * v.transpose() + v * unit.transpose()) * a
            + cross(v) * (db * v[k])
            + cross(&unit) * b;
        lower(change, 0.0)
    });
    (lower(block, 1.0), derivatives)
}

/// A diattenuator whose D is the sine of the length of a vector along it.
fn diattenuator_block(v: &Vector3<f64>) -> ByVector {
    let length = v.norm();
    let [a, b, da, db] = shapes(length);
    let with = |mut matrix: Matrix4<f64>, d: Vector3<f64>| {
        for k in 0..3 {
            matrix[(0, k + 1)] = d[k];
            matrix[(k + 1, 0)] = d[k];
        }
        matrix
    };
    let block = Matrix3::identity() * length.cos() + v * v.transpose() * a;
    let derivatives = std::array::from_fn(|k| {
        let unit = Vector3::ith(k, 1.0);
        let change = Matrix3::identity() * (-b * v[k])
            + v * v.transpose() * (da * v[k])
            + (unit * v.transpose() + v * unit.transpose()) * a;
        with(lower(change, 0.0), unit * b + v * (db * v[k]))
    });
    (with(lower(block, 1.0), v * b), derivatives)
}

/// A polarizer along a vector, whose length means nothing.
fn polarizer(v: &Vector3<f64>) -> ByVector {
    let length = v.norm().max(f64::MIN_POSITIVE);
    let d = v / length;
    let of = |d: Vector3<f64>, block: Matrix3<f64>, first: f64| {
        let mut matrix = lower(block, first);
        for k in 0..3 {
            matrix[(0, k + 1)] = d[k];
            matrix[(k + 1, 0)] = d[k];
        }
        matrix
    };
    let derivatives = std::array::from_fn(|k| {
        let unit = Vector3::ith(k, 1.0);
        let change = (unit - d * d[k]) / length;
        of(change, change * d.transpose() + d * change.transpose(), 0.0)
    });
    (of(d, d * d.transpose(), 1.0), derivatives)
}

/// `H = ½ L L†`, L with as many columns as Jones matrices are mixed, triangular in the
/// order of the pivots: for one column the entries of the Jones matrix themselves.
fn mixture(own: &[f64], rank: usize, pivots: &[usize; 4]) -> Evaluated {
    let columns = columns_of(own, rank, pivots);
    let places = places_of(rank, pivots);
    let mut h = Matrix4::<Complex64>::zeros();
    for column in &columns {
        for i in 0..4 {
            for j in 0..4 {
                h[(i, j)] += 0.5 * column[i] * column[j].conj();
            }
        }
    }
    let derivatives = places
        .iter()
        .map(|&(column, row, phase)| {
            let mut change = Matrix4::<Complex64>::zeros();
            for (k, &entry) in columns[column].iter().enumerate() {
                change[(row, k)] += 0.5 * phase * entry.conj();
                change[(k, row)] += 0.5 * (phase * entry.conj()).conj();
            }
            *Coherency::from_matrix(change).mueller().matrix()
        })
        .collect();
    Evaluated {
        matrix: *Coherency::from_matrix(h).mueller().matrix(),
        derivatives,
    }
}

/// The columns of L.
pub(super) fn columns_of(own: &[f64], rank: usize, pivots: &[usize; 4]) -> Vec<[Complex64; 4]> {
    let mut columns = vec![[Complex64::ZERO; 4]; rank];
    for ((column, row, phase), &value) in places_of(rank, pivots).into_iter().zip(own) {
        columns[column][row] += phase * value;
    }
    columns
}

/// Column and row of L that each parameter moves, along the real or the imaginary axis.
pub(super) fn places_of(rank: usize, pivots: &[usize; 4]) -> Vec<(usize, usize, Complex64)> {
    let mut places = Vec::new();
    for column in 0..rank {
        for (k, &row) in pivots.iter().enumerate().skip(column) {
            places.push((column, row, Complex64::ONE));
            if k > column {
                places.push((column, row, Complex64::I));
            }
        }
    }
    places
}

/// The parameters of [`mixture`] whose H has these columns, `H = ½ Σ c c†`, and the pivots
/// that suit them.
pub(super) fn triangular(columns: &[[Complex64; 4]]) -> (Vec<f64>, [usize; 4]) {
    let mut h = Matrix4::<Complex64>::zeros();
    for column in columns {
        for i in 0..4 {
            for j in 0..4 {
                h[(i, j)] += column[i] * column[j].conj();
            }
        }
    }
    let mut pivots = [0, 1, 2, 3];
    let mut triangle = Vec::new();
    for column in 0..columns.len() {
        let left = &mut pivots[column..];
        left.sort_by(|&a, &b| h[(b, b)].re.total_cmp(&h[(a, a)].re));
        let pivot = pivots[column];
        let root = h[(pivot, pivot)].re.max(0.0).sqrt();
        // A column of nothing would have no way to grow.
        let root = if root > 0.0 { root } else { 1e-8 };
        let entries: [Complex64; 4] = std::array::from_fn(|i| h[(i, pivot)] / root);
        triangle.push((root, entries));
        for i in 0..4 {
            for j in 0..4 {
                h[(i, j)] -= entries[i] * entries[j].conj();
            }
        }
    }
    let mut parameters = Vec::new();
    for (column, (root, entries)) in triangle.into_iter().enumerate() {
        for (k, &row) in pivots.iter().enumerate().skip(column) {
            parameters.push(if k == column { root } else { entries[row].re });
            if k > column {
                parameters.push(entries[row].im);
            }
        }
    }
    (parameters, pivots)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::stats::NormalDraws;

    /// *Derived*: each derivative against a central difference.
    #[test]
    fn derivatives_are_those_of_finite_differences() {
        const STEP: f64 = 1e-5;
        let mut draws = NormalDraws::new(3);
        for model in Model::ALL {
            for side in [Side::Parallel, Side::After, Side::Before] {
                for is_polarizer in [false, true] {
                    let shape = Shape {
                        model,
                        side: model.side(side).unwrap_or_default(),
                        pivots: [2, 0, 3, 1],
                        is_polarizer,
                    };
                    // The direction of a short vector turns too fast for such steps.
                    let scales: &[f64] = if is_polarizer { &[0.5] } else { &[1e-3, 0.5] };
                    for scale in scales {
                        let mut x: Vec<f64> = (0..model.parameter_count())
                            .map(|_| scale * draws.draw())
                            .collect();
                        x[0] += 1.0;
                        let evaluated = shape.evaluate(&x);
                        assert_eq!(evaluated.derivatives.len(), x.len());
                        for k in 0..x.len() {
                            let at = |by: f64| {
                                let mut x = x.clone();
                                x[k] += by;
                                shape.evaluate(&x).matrix
                            };
                            let difference = (at(STEP) - at(-STEP)) / (2.0 * STEP);
                            let error = (difference - evaluated.derivatives[k]).amax();
                            assert!(error < 1e-8, "{model:?} {side:?} {k}: {error}");
                        }
                    }
                }
            }
        }
    }

    /// *Derived*: 8r − r² parameters give back any H of rank r.
    #[test]
    fn a_triangle_holds_every_mixture() {
        let mut draws = NormalDraws::new(5);
        for rank in 1..=4 {
            let columns: Vec<[Complex64; 4]> = (0..rank)
                .map(|_| std::array::from_fn(|_| Complex64::new(draws.draw(), draws.draw())))
                .collect();
            let (x, pivots) = triangular(&columns);
            assert_eq!(x.len(), 8 * rank - rank * rank);
            let found = mixture(&x, rank, &pivots).matrix;
            let mut h = Matrix4::<Complex64>::zeros();
            for column in &columns {
                h += Matrix4::from_fn(|i, j| 0.5 * column[i] * column[j].conj());
            }
            let expected = *Coherency::from_matrix(h).mueller().matrix();
            assert!((found - expected).amax() < 1e-12, "{rank}");
        }
    }
}

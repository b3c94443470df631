//! Identities that hold for every matrix.

mod common;

use common::{
    any_jones, any_matrix, any_mixture, close, close_matrix, diagonal, measurement, mueller,
    polarizing_series,
};
use halfshade::coherency::{Coherency, Verdict, nearest};
use halfshade::decompose::{differential, isotropic, polar_forward, polar_reverse};
use halfshade::examine::examine;
use halfshade::figures::FigureName;
use halfshade::mueller::{Mueller, elements};
use halfshade::noise::Noise;
use proptest::prelude::*;

fn value(found: &halfshade::examine::Examination, name: FigureName) -> f64 {
    found.figures.get(name).value.unwrap()
}

proptest! {
    /// Cloude 1986: a mixture of Jones matrices has a positive semidefinite H.
    #[test]
    fn mixtures_are_realizable(m in any_mixture()) {
        let found = common::examined(m);
        prop_assert_eq!(found.realizability.verdict, Verdict::Realizable);
        prop_assert!(found.realizability.stokes_condition);
        prop_assert_eq!(found.realizability.violation, Some(0.0));
        prop_assert_eq!(found.nearest.unwrap().mueller, m);
    }

    #[test]
    fn coherency_and_back(m in any_matrix()) {
        close_matrix(&Coherency::from_mueller(&m).mueller(), &m, 1e-13);
    }

    /// `‖M‖² = 4 ‖H‖²` (reference section 0, recomputed).
    #[test]
    fn coherency_is_an_isometry(m in any_matrix()) {
        let mueller: f64 = m.row_major().iter().map(|v| v * v).sum();
        let coherency: f64 = Coherency::from_mueller(&m).row_major().iter().map(|h| h.norm_sqr()).sum();
        close(mueller, 4.0 * coherency, 1e-12);
    }

    /// `H = ½ v v†` for a Jones matrix: one eigenvalue, and `Tr MᵀM = 4 M00²`
    /// (Gil 2000, seen).
    #[test]
    fn pure_matrices_have_one_eigenvalue(jones in any_jones()) {
        let m = jones.mueller();
        let eigen = Coherency::from_mueller(&m).eigen().unwrap();
        close(eigen.values[0], m.m00(), 1e-13);
        close(eigen.values[1].abs().max(eigen.values[3].abs()), 0.0, 1e-13);
        let trace: f64 = m.row_major().iter().map(|v| v * v).sum();
        close(trace, 4.0 * m.m00() * m.m00(), 1e-12);
    }

    #[test]
    fn nearest_is_realizable_and_no_farther_than_any_mixture(
        m in any_matrix(), other in any_mixture(), exact in any::<bool>()
    ) {
        let m = if m.m00() > 0.0 { m } else { mueller([[0.5, 0.1, 0.0, 0.0], [0.0, 0.6, 0.1, 0.0], [0.0, 0.0, 0.2, 0.4], [0.1, 0.0, 0.0, 0.7]]) };
        let found = nearest(&m, exact).unwrap().unwrap();
        let eigen = Coherency::from_mueller(&found.mueller).eigen().unwrap();
        prop_assert!(eigen.values[3] >= -1e-12);
        close(found.distance, m.distance(&found.mueller), 1e-12);
        let mut rival = other.row_major();
        if exact {
            prop_assert_eq!(found.mueller.m00(), m.m00());
            rival = rival.map(|v| v * m.m00() / other.m00());
        }
        let rival = Mueller::from_row_major(&rival).unwrap();
        prop_assert!(found.distance <= m.distance(&rival) + 1e-12);
    }

    #[test]
    fn polar_factors_recompose(m in any_mixture()) {
        let m = m.normalised().unwrap();
        for factors in [polar_forward(&m, None).unwrap(), polar_reverse(&m, None).unwrap()] {
            if let Some(residual) = factors.residual {
                // The inverse diattenuator grows as 1/(1 - D²).
                let d = factors.diattenuator.row_major();
                let rest = 1.0 - (d[1] * d[1] + d[2] * d[2] + d[3] * d[3]);
                prop_assert!(residual <= 1e-10_f64.max(1e-13 / rest), "{residual}");
            }
        }
    }

    /// Lu & Chipman 1996: the factors of a series are found again (abstract seen:
    /// unique unless singular).
    #[test]
    fn polar_factors_are_those_of_the_series((diattenuator, retarder, depolarizer) in polarizing_series()) {
        let forward = polar_forward(&(depolarizer * retarder * diattenuator).normalised().unwrap(), None).unwrap();
        close_matrix(&forward.depolarizer.unwrap(), &depolarizer, 1e-10);
        close_matrix(&forward.retarder.unwrap(), &retarder, 1e-9);
        close_matrix(&forward.diattenuator, &diattenuator.normalised().unwrap(), 1e-12);
        let reverse = polar_reverse(&(diattenuator * retarder * depolarizer).normalised().unwrap(), None).unwrap();
        close_matrix(&reverse.depolarizer.unwrap(), &depolarizer, 1e-10);
        close_matrix(&reverse.retarder.unwrap(), &retarder, 1e-9);
    }

    /// The closed form finds a parallel mixture with an ideal depolarizer exactly.
    #[test]
    fn isotropic_closed_form_is_exact(jones in any_jones(), alpha in 0.0..1.32_f64) {
        let pure = jones.mueller();
        prop_assume!(pure.m00() > 0.01 && (alpha - 1.0).abs() > 1e-3);
        let mut mixed = pure.row_major().map(|v| (1.0 - alpha) * v);
        mixed[0] = pure.m00();
        let m = Mueller::from_row_major(&mixed).unwrap();
        let eigen = Coherency::from_mueller(&m).eigen().unwrap();
        let model = isotropic(&measurement(m, false, Noise::None), &eigen).unwrap();
        close(model.alpha, alpha, 1e-12);
        close_matrix(&model.mueller, &m, 1e-12);
        close_matrix(&model.jones.unwrap().mueller(), &pure, 1e-11);
    }

    /// Gil 2007: the four parts add up to the nearest matrix, which is physical (the
    /// sum: from memory; weights that fall from one to zero: derived).
    #[test]
    fn characteristic_parts_recompose(m in any_matrix(), exact in any::<bool>()) {
        let mut elements = m.row_major();
        elements[0] += 1.0;
        let m = Mueller::from_row_major(&elements).unwrap();
        let found = examine(&measurement(m, exact, Noise::None), None).unwrap();
        let nearest = found.nearest.unwrap().mueller.normalised().unwrap();
        let parts = found.characteristic.unwrap();
        let sum: [f64; 16] = std::array::from_fn(|k| parts.iter().map(|part| part.weight * part.mueller.row_major()[k]).sum());
        close_matrix(&Mueller::from_row_major(&sum).unwrap(), &nearest, 1e-10);
        for part in parts {
            prop_assert!(part.weight >= 0.0);
            close(part.mueller.m00(), 1.0, 1e-14);
        }
        // Rank one, two and three.
        for (k, part) in parts.iter().take(3).enumerate() {
            let values = Coherency::from_mueller(&part.mueller).eigen().unwrap().values;
            for (n, value) in values.iter().enumerate() {
                close(*value, if n <= k { 1.0 / (k as f64 + 1.0) } else { 0.0 }, 1e-13);
            }
        }
    }

    /// A retarder is `exp` of its retardance about its axis (derived).
    #[test]
    fn logarithm_of_a_retarder(retardance in 0.0..3.1_f64, azimuth in 0.0..3.1_f64, ellipticity in -0.7..0.7_f64) {
        let m = elements::elliptical_retarder(retardance, azimuth, ellipticity).unwrap();
        let found = differential(&m);
        let axis = [(2.0 * ellipticity).cos() * (2.0 * azimuth).cos(), (2.0 * ellipticity).cos() * (2.0 * azimuth).sin(), (2.0 * ellipticity).sin()];
        let properties = found.properties.unwrap();
        for (k, part) in axis.into_iter().enumerate() {
            close(properties.birefringence[k], retardance * part, 1e-12);
            close(properties.dichroism[k], 0.0, 1e-12);
        }
        close_matrix(&found.depolarizing.unwrap(), &diagonal([0.0; 4]), 1e-12);
    }

    /// A diattenuator is `exp` of artanh D along its axis, which is half of the
    /// logarithm of the ratio of its transmittances (derived).
    #[test]
    fn logarithm_of_a_diattenuator(low in 0.01..1.0_f64, axis in 0.0..3.1_f64) {
        let m = elements::linear_diattenuator(1.0, low, axis).unwrap().normalised().unwrap();
        let found = differential(&m);
        let properties = found.properties.unwrap();
        for (k, part) in [(2.0 * axis).cos(), (2.0 * axis).sin(), 0.0].into_iter().enumerate() {
            close(properties.dichroism[k], -0.5 * low.ln() * part, 1e-11);
            close(properties.birefringence[k], 0.0, 1e-11);
        }
        close_matrix(&found.depolarizing.unwrap(), &diagonal([0.0; 4]), 1e-11);
    }

    /// `exp(Lm + Lu)` is the matrix again, but for the isotropic absorption that the
    /// depolarizing part leaves out; there det m gives it (Jacobi: det exp = exp tr).
    #[test]
    fn logarithm_recomposes((diattenuator, retarder, depolarizer) in polarizing_series()) {
        let m = (depolarizer * retarder * diattenuator).normalised().unwrap();
        let found = differential(&m);
        prop_assume!(found.reason.is_none());
        let (mean, rest) = (found.mean.unwrap().row_major(), found.depolarizing.unwrap().row_major());
        let whole = nalgebra::Matrix4::from_row_slice(&std::array::from_fn::<f64, 16, _>(|k| mean[k] + rest[k]));
        let again = whole.exp();
        let m = nalgebra::Matrix4::from_row_slice(&m.row_major());
        let absorption = (m.determinant() / again.determinant()).powf(0.25);
        close((again * absorption - m).amax(), 0.0, 1e-10);
        // The first of the depolarizing part is left out, as Lu = ½ ln(1 - D²) I of a diattenuator.
        close(rest[0], 0.0, 0.0);
    }

    /// `3 PΔ² = 2 P1² + ⅔ P2² + ⅓ P3²` (San José & Gil 2011) and
    /// `PΔ² = (D² + P²)/3 + PS²` (Gil, arXiv 1512.06821): from memory, recomputed.
    #[test]
    fn purity_identities(m in any_mixture()) {
        let found = common::examined(m);
        let get = |name| value(&found, name);
        let index = get(FigureName::DepolarizationIndex);
        let from_indices = 2.0 * get(FigureName::PurityIndex1).powi(2)
            + get(FigureName::PurityIndex2).powi(2) * 2.0 / 3.0
            + get(FigureName::PurityIndex3).powi(2) / 3.0;
        close(3.0 * index * index, from_indices, 1e-11);
        let from_vectors = (get(FigureName::Diattenuation).powi(2) + get(FigureName::Polarizance).powi(2)) / 3.0
            + get(FigureName::SphericalPurity).powi(2);
        close(index * index, from_vectors, 1e-12);
    }

    /// An element turned by θ has its axes turned by θ and nothing else changed.
    #[test]
    fn turning_moves_axes_only(retardance in 0.2..2.9_f64, angle in 0.0..3.1_f64) {
        let turned = elements::linear_retarder(retardance, 0.0).unwrap().turned(angle);
        let found = common::examined(turned);
        close(value(&found, FigureName::Retardance), retardance, 1e-12);
        let axis = value(&found, FigureName::FastAxis);
        close((axis - angle).sin(), 0.0, 1e-12);
        close_matrix(&turned, &elements::linear_retarder(retardance, angle).unwrap(), 1e-14);
    }

    /// Any sixteen finite numbers get an answer without NaN or infinity.
    #[test]
    fn every_matrix_gets_finite_answers(
        m in prop::array::uniform16(prop_oneof![
            Just(0.0), Just(1.0), Just(-1.0), Just(1e150), Just(-1e150), Just(1e-150), Just(5e-324),
            -1.0..1.0_f64, any::<f64>().prop_filter("in range", |v| v.abs() <= 1e150),
        ]),
        exact in any::<bool>(),
        noise in prop_oneof![
            Just(Noise::None), Just(Noise::Uniform { sigma: 0.01 }),
            Just(Noise::Uniform { sigma: 1e150 }), Just(Noise::Uniform { sigma: 1e-150 }),
            Just(Noise::Rounding { decimals: 3 }),
        ],
    ) {
        let m = Mueller::from_row_major(&m).unwrap();
        let found = examine(&measurement(m, exact, noise), Some(7)).unwrap();
        common::all_finite(&found);
    }

    #[test]
    fn signs_of_zero_matrices_do_not_matter(scale in prop_oneof![Just(0.0), Just(1.0), Just(-1.0), Just(1e-150), Just(1e150)]) {
        for shape in [[1.0, 0.0, 0.0, 0.0], [1.0, 1.0, 1.0, 1.0], [1.0, 1.0, 0.0, 0.0], [0.0, 1.0, 1.0, 1.0], [1.0, 1.0, -1.0, -1.0]] {
            let m = diagonal(shape.map(|v| v * scale));
            for exact in [false, true] {
                common::all_finite(&examine(&measurement(m, exact, Noise::None), Some(1)).unwrap());
            }
        }
    }
}

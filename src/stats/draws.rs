use rand_distr::{ChiSquared, Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;
use rand_xoshiro::rand_core::SeedableRng;

/// Standard normal numbers from a seed: the same seed gives the same numbers.
#[derive(Debug, Clone)]
pub struct NormalDraws(Xoshiro256PlusPlus);

impl NormalDraws {
    /// A stream of its own for every seed.
    #[must_use]
    pub fn new(seed: u64) -> Self {
        Self(Xoshiro256PlusPlus::seed_from_u64(seed))
    }

    /// One number of mean 0 and variance 1.
    pub fn draw(&mut self) -> f64 {
        StandardNormal.sample(&mut self.0)
    }

    /// The ratio of an estimated σ with these degrees of freedom to the true one:
    /// `sqrt(χ²_ν / ν)`.
    pub fn draw_sigma_ratio(&mut self, freedom: f64) -> f64 {
        match ChiSquared::new(freedom) {
            Ok(distribution) => (distribution.sample(&mut self.0) / freedom).sqrt(),
            Err(_) => 1.0,
        }
    }

    /// Sixteen of them, as a matrix row by row.
    pub fn draw_matrix(&mut self) -> [f64; 16] {
        std::array::from_fn(|_| self.draw())
    }
}

use rand_distr::{Distribution, StandardNormal};
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

    /// Sixteen of them, as a matrix row by row.
    pub fn draw_matrix(&mut self) -> [f64; 16] {
        std::array::from_fn(|_| self.draw())
    }
}

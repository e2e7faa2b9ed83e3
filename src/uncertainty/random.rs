//! Random numbers that do not depend on who draws them.

use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

/// A stream of draws. Stream `n` of a seed is the same wherever and whenever it is drawn: ChaCha
/// with 8 rounds in counter mode (Bernstein 2008), one stream a chunk of samples.
pub(super) struct Draws(ChaCha8Rng);

impl Draws {
    pub(super) fn new(seed: u64, stream: u64) -> Self {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        rng.set_stream(stream);
        Self(rng)
    }

    /// Within (0, 1), both ends left out.
    pub(super) fn uniform(&mut self) -> f64 {
        ((self.0.next_u64() >> 11) as f64 + 0.5) * 2f64.powi(-53)
    }

    /// Of the standard normal distribution (Box and Muller 1958). Logarithm and cosine are the
    /// library's own, so that every machine gives the same bits.
    pub(super) fn normal(&mut self) -> f64 {
        let radius = (-2.0 * libm::log(self.uniform())).sqrt();
        radius * libm::cos(std::f64::consts::TAU * self.uniform())
    }
}

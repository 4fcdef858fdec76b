//! Random numbers from an explicit seed, in streams that do not disturb one another.

use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};
use rand_distr::{Distribution, StandardNormal};

/// What a stream of random numbers is for. The number is the stream's, and stays.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Stream {
    Drift = 1,
    SaccadeTimes = 2,
    SaccadeAmplitudes = 3,
    SaccadeDirections = 4,
    Tremor = 5,
    Blinks = 6,
    LeftNoise = 7,
    RightNoise = 8,
    LeftStill = 9,
    RightStill = 10,
    Surrogates = 11,
    Insertions = 12,
}

/// Random numbers of one stream: the cipher `ChaCha` with eight rounds, whose key is the seed (eight
/// bytes, the lowest first, then zeros) and whose nonce is the stream's number.
#[derive(Debug)]
pub(crate) struct Draws(ChaCha8Rng);

impl Draws {
    pub(crate) fn new(seed: u64, stream: Stream) -> Self {
        Self::numbered(seed, stream as u64)
    }

    fn numbered(seed: u64, stream: u64) -> Self {
        let mut key = [0; 32];
        for (byte, seed_byte) in key.iter_mut().zip(seed.to_le_bytes()) {
            *byte = seed_byte;
        }
        let mut generator = ChaCha8Rng::from_seed(key);
        generator.set_stream(stream);
        Self(generator)
    }

    /// Uniform in `[0, 1)`: the upper 53 bits of a draw.
    pub(crate) fn uniform(&mut self) -> f64 {
        (self.0.next_u64() >> 11) as f64 / 9_007_199_254_740_992.0
    }

    /// A whole number below `n`, each as likely (to 2⁻⁵³); 0 if `n` is.
    pub(crate) fn below(&mut self, n: usize) -> usize {
        ((self.uniform() * n as f64) as usize).min(n.saturating_sub(1))
    }

    /// Puts `values` into random order (Fisher & Yates).
    pub(crate) fn shuffle(&mut self, values: &mut [f64]) {
        for i in (1..values.len()).rev() {
            let other = self.below(i + 1);
            values.swap(i, other);
        }
    }

    /// Normal, mean 0, standard deviation 1 (ziggurat of Doornik 2005).
    #[inline]
    pub(crate) fn normal(&mut self) -> f64 {
        StandardNormal.sample(&mut self.0)
    }

    /// Exponential, mean 1.
    pub(crate) fn exponential(&mut self) -> f64 {
        -(-self.uniform()).ln_1p()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// First bytes of the key stream at eight rounds for an all-zero 256-bit key and nonce, 3e 00 ef 2f
    /// 89 5f 40 d6 7f 5b b8 e8 1f 09 a5 a1 (test vectors of the cipher in draft-strombergson-chacha-test-vectors,
    /// TC1; quoted from memory).
    #[test]
    fn the_generator_is_the_published_cipher() {
        let mut draws = Draws::numbered(0, 0);
        assert_eq!(draws.0.next_u64(), 0xd640_5f89_2fef_003e);
        assert_eq!(draws.0.next_u64(), 0xa1a5_091f_e8b8_5b7f);
    }

    #[test]
    fn the_seed_is_the_key_and_each_stream_is_another() {
        let first = |seed, stream| Draws::numbered(seed, stream).0.next_u64();
        let all: Vec<u64> = [(0, 0), (0, 1), (1, 0), (1, 1), (1 << 63, 0), (0, 1 << 63)]
            .map(|(seed, stream)| first(seed, stream))
            .into();
        for (i, a) in all.iter().enumerate() {
            assert!(all.iter().skip(i + 1).all(|b| a != b), "{i}");
        }
        assert_eq!(Draws::new(3, Stream::Drift).0.next_u64(), Draws::numbered(3, 1).0.next_u64());
    }

    /// Means and mean squares within 5 standard errors: uniform 1/2 and 1/3, exponential 1 and 2
    /// (E x⁴ = 24), normal 0 and 1 (E x⁴ = 3).
    #[test]
    fn moments_are_those_of_the_distributions() {
        let n = 200_000;
        let check =
            |name: &str, draw: fn(&mut Draws) -> f64, mean: f64, square: f64, fourth: f64| {
                let mut draws = Draws::new(11, Stream::Drift);
                let values: Vec<f64> = (0..n).map(|_| draw(&mut draws)).collect();
                let average =
                    |power| values.iter().map(|v| v.powi(power)).sum::<f64>() / f64::from(n);
                let allowed = |variance: f64| 5.0 * (variance / f64::from(n)).sqrt();
                assert!((average(1) - mean).abs() < allowed(square - mean * mean), "{name}: mean");
                assert!(
                    (average(2) - square).abs() < allowed(fourth - square * square),
                    "{name}: square"
                );
                values
            };
        let uniform = check("uniform", Draws::uniform, 0.5, 1.0 / 3.0, 0.2);
        assert!(uniform.iter().all(|u| (0.0..1.0).contains(u)));
        let exponential = check("exponential", Draws::exponential, 1.0, 2.0, 24.0);
        assert!(exponential.iter().all(|e| e.is_finite() && *e >= 0.0));
        check("normal", Draws::normal, 0.0, 1.0, 3.0);
    }
}

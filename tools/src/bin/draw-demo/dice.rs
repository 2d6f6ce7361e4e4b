//! Seeded chance. Everything is drawn from whole 32-bit words, so the same seed gives the same picture everywhere.

use rand_chacha::{
    ChaCha8Rng,
    rand_core::{Rng, SeedableRng},
};

/// A source of seeded chance, one stream a picture.
pub struct Dice(ChaCha8Rng);

impl Dice {
    /// A source for `seed`; different `stream`s of one seed are independent of each other.
    pub fn new(seed: u64, stream: u64) -> Self {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        rng.set_stream(stream);
        Self(rng)
    }

    /// Uniform in [0, 1).
    pub fn unit(&mut self) -> f32 {
        (self.0.next_u32() >> 8) as f32 / 16_777_216.0
    }

    /// Uniform in [low, high).
    pub fn range(&mut self, low: f32, high: f32) -> f32 {
        low + (high - low) * self.unit()
    }

    /// True with this probability.
    pub fn chance(&mut self, probability: f32) -> bool {
        self.unit() < probability
    }

    /// A whole number in [low, high].
    pub fn whole(&mut self, low: u32, high: u32) -> u32 {
        low + self.below(high - low + 1)
    }

    /// A whole number in [0, end).
    pub fn below(&mut self, end: u32) -> u32 {
        ((u64::from(self.0.next_u32()) * u64::from(end)) >> 32) as u32
    }

    /// One of the choices, all equally likely.
    pub fn pick<T: Copy>(&mut self, choices: &[T]) -> T {
        choices[self.below(choices.len() as u32) as usize]
    }

    /// Roughly normal (the sum of four uniforms), mean 0, deviation 1.
    pub fn normal(&mut self) -> f32 {
        (self.unit() + self.unit() + self.unit() + self.unit() - 2.0) * 1.732_050_8
    }

    /// Puts the items in a random order.
    pub fn shuffle<T>(&mut self, items: &mut [T]) {
        for last in (1..items.len()).rev() {
            items.swap(last, self.below(last as u32 + 1) as usize);
        }
    }
}

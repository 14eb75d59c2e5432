//! Reproducible pseudo-random numbers: the same seed, the same numbers on every machine.

use super::distributions::normal_quantile;

/// SplitMix64 (Steele, Lea & Flood 2014): passes the usual batteries, is seeded by any number. Not
/// for secrets.
#[derive(Debug, Clone)]
pub struct Random {
    state: u64,
}

impl Random {
    #[allow(missing_docs)]
    pub fn seeded(seed: u64) -> Self {
        Self { state: seed }
    }

    /// 64 uniform bits.
    pub fn bits(&mut self) -> u64 {
        self.state = self.state.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.state;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Uniform in (0, 1), neither end included.
    pub fn uniform(&mut self) -> f64 {
        ((self.bits() >> 11) as f64 + 0.5) / (1u64 << 53) as f64
    }

    /// Uniform among 0 … count − 1; 0 for a count of 0. Its bias is below count/2⁶⁴.
    pub fn below(&mut self, count: usize) -> usize {
        let product = u128::from(self.bits()) * count as u128;
        (product >> 64) as usize
    }

    /// Standard normal, by inversion.
    pub fn normal(&mut self) -> f64 {
        normal_quantile(self.uniform())
    }
}

//! Which random numbers belong to which replications.

use rand_pcg::Lcg128CmDxsm64;
use sha2::{Digest, Sha256};

/// The version of everything that decides which path a replication takes: the rule below, the quantised rows, the layout
/// of the alias tables and the order of draws. The same model, seed and number of replications give the same tally
/// wherever this number is the same.
pub const STREAM_VERSION: u32 = 1;

/// Replications that share one stream: block `b` holds the replications `b · BLOCK` to `(b + 1) · BLOCK − 1`.
pub const BLOCK: u64 = 4096;

/// The random streams of one seed: one for every block of [`BLOCK`] consecutive replications.
///
/// # Rule (stream version 1)
/// Let h be the SHA-256 digest of the 36 bytes `"tallystone stream 1"`, a zero byte, the seed and the number of the
/// block, both as 8 bytes little-endian. The generator is PCG64-DXSM (`cm_setseq_dxsm_128_64`, 128 bits of state, 64-bit
/// output), seeded with initial state h₀…h₁₅ and stream h₁₆…h₃₁, both read little-endian.
///
/// State and stream are both hashed because streams of a linear congruential generator that differ in the increment
/// alone are one and the same orbit, entered at places related by a fixed affine map: such "independent" streams are
/// correlated. With hashed states the streams of a run start at unrelated places; each has period 2¹²⁸.
///
/// # References
/// M. J. Durst, Using linear congruential generators for parallel random number generation, Proceedings of the Winter
/// Simulation Conference, 1989. M. E. O'Neill, PCG: a family of simple fast space-efficient statistically good
/// algorithms for random number generation, HMC-CS-2014-0905, 2014.
///
/// ```
/// use rand_pcg::rand_core::Rng;
/// use tallystone::sampling::Streams;
/// let streams = Streams::new(1);
/// assert_eq!(streams.block(7).next_u64(), streams.block(7).next_u64());
/// assert_ne!(streams.block(7).next_u64(), streams.block(8).next_u64());
/// ```
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Streams {
    seed: u64,
}

impl Streams {
    /// The streams of a seed. Every seed is as good as any other.
    pub fn new(seed: u64) -> Self {
        Self { seed }
    }

    /// The seed.
    pub fn seed(&self) -> u64 {
        self.seed
    }

    /// The stream of a block, at its beginning.
    pub fn block(&self, index: u64) -> Lcg128CmDxsm64 {
        let [state, stream] = self.parameters(index);
        Lcg128CmDxsm64::new(state, stream)
    }

    /// Initial state and stream number.
    fn parameters(self, index: u64) -> [u128; 2] {
        let mut hash = Sha256::new();
        hash.update(b"tallystone stream 1\0");
        hash.update(self.seed.to_le_bytes());
        hash.update(index.to_le_bytes());
        let digest = hash.finalize();
        let half = |from: usize| {
            digest[from..from + 16].iter().rev().fold(0_u128, |value, byte| (value << 8) | u128::from(*byte))
        };
        [half(0), half(16)]
    }
}

#[cfg(test)]
mod tests {
    use std::collections::HashSet;

    use rand_pcg::rand_core::Rng;

    use super::*;

    fn first(seed: u64, block: u64) -> [u64; 3] {
        let mut stream = Streams::new(seed).block(block);
        std::array::from_fn(|_| stream.next_u64())
    }

    // Stability of stream version 1. Source: a separate computation from the documented rule, with Python's hashlib and
    // its unbounded integers.
    #[test]
    fn the_first_draws_of_stream_version_1() {
        assert_eq!(STREAM_VERSION, 1);
        assert_eq!(first(0, 0), PIN_0_0);
        assert_eq!(first(1, 0), PIN_1_0);
        assert_eq!(first(1, 1), PIN_1_1);
        assert_eq!(first(u64::MAX, u64::MAX), PIN_MAX);
    }

    const PIN_0_0: [u64; 3] = [0xbd19_38c8_ae35_7ca5, 0x98bb_aee4_5b1a_8111, 0x8c89_a560_315b_683f];
    const PIN_1_0: [u64; 3] = [0xaa01_7e06_92aa_6c51, 0x0efb_fd2a_6262_b71a, 0x27e9_1a67_12c0_ca5f];
    const PIN_1_1: [u64; 3] = [0xa733_9814_33ec_ab07, 0xdb1b_cf00_1c9d_376f, 0xe3fd_d144_a04d_55c0];
    const PIN_MAX: [u64; 3] = [0xade7_2258_0535_b511, 0x2d9d_a61e_49ec_aca8, 0x9a8b_152f_089e_5e43];

    // Streams that share a state or an increment would be the correlated kind. A hash repeats one of the 64-bit halves
    // among 4,000 with probability below 4 · 4000²/2⁶⁵ < 2e-12.
    #[test]
    fn no_two_blocks_share_half_a_state_or_half_an_increment() {
        let blocks = (0..2).flat_map(|seed| (0..2000).map(move |block| Streams::new(seed).parameters(block)));
        let mut seen: [HashSet<u64>; 4] = Default::default();
        for [state, stream] in blocks {
            for (halves, value) in seen.iter_mut().zip([state, state >> 64, stream, stream >> 64]) {
                assert!(halves.insert(value as u64));
            }
        }
    }

    // In increment-only streams the difference of two states after n steps is (c₂ − c₁)(1 + a + … + aⁿ⁻¹), so its low
    // bits are the same for every pair whose increments agree in theirs. Here initial states differ freely: over 2000
    // neighbours their low bytes take nearly all 256 differences (all missing 40 or more: below 1e-30).
    #[test]
    fn neighbouring_blocks_start_at_unrelated_states() {
        let streams = Streams::new(3);
        let low_bytes: HashSet<u8> = (0..2000)
            .map(|block| streams.parameters(block + 1)[0].wrapping_sub(streams.parameters(block)[0]) as u8)
            .collect();
        assert!(low_bytes.len() > 216);
    }
}

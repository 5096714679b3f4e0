//! The random generator that the streams rest on gives the published values, so a new version of its library cannot
//! change results unseen.

use rand_pcg::rand_core::Rng;
use rand_pcg::{Lcg128CmDxsm64, Lcg128Xsl64};

fn first<const N: usize>(mut rng: impl Rng) -> [u64; N] {
    std::array::from_fn(|_| rng.next_u64())
}

// Source: `cm_setseq_dxsm_128_64` of the PCG reference library in C++, seeded (42, 54).
#[test]
fn dxsm_agrees_with_the_reference_library() {
    let expected = [
        17_331_114_245_835_578_256,
        10_267_467_544_499_227_306,
        9_726_600_296_081_716_989,
        10_165_951_391_103_677_450,
        12_131_334_649_314_727_261,
        10_134_094_537_930_450_875,
    ];
    assert_eq!(first(Lcg128CmDxsm64::new(42, 54)), expected);
}

// Source: the check output of the PCG reference library in C, pcg64 seeded (42, 54).
#[test]
fn the_underlying_congruential_generator_agrees_with_the_reference_library() {
    let expected = [
        0x86b1_da1d_7206_2b68,
        0x1304_aa46_c985_3d39,
        0xa367_0e9e_0dd5_0358,
        0xf909_0e52_9a7d_ae00,
        0xc85b_9fd8_3799_6f2c,
        0x6061_21f8_e391_9196,
    ];
    assert_eq!(first(Lcg128Xsl64::new(42, 54)), expected);
}

/// Four 64-bit words hashed from a 32-bit seed, as NumPy's `SeedSequence` does; after M. E. O'Neill, Developing a
/// `seed_seq` alternative, 2015.
fn seed_words(entropy: u32) -> [u64; 4] {
    fn hash(value: u32, constant: &mut u32, multiplier: u32) -> u32 {
        let value = value ^ *constant;
        *constant = constant.wrapping_mul(multiplier);
        let value = value.wrapping_mul(*constant);
        value ^ (value >> 16)
    }
    fn mix(x: u32, y: u32) -> u32 {
        let mixed = x.wrapping_mul(0xca01_f9dd).wrapping_sub(y.wrapping_mul(0x4973_f715));
        mixed ^ (mixed >> 16)
    }
    let mut constant = 0x43b0_d7e5;
    let mut pool = [entropy, 0, 0, 0].map(|word| hash(word, &mut constant, 0x931e_8875));
    for from in 0..4 {
        for to in (0..4).filter(|to| *to != from) {
            pool[to] = mix(pool[to], hash(pool[from], &mut constant, 0x931e_8875));
        }
    }
    let mut constant = 0x8b51_f9dd;
    let words: [u32; 8] = std::array::from_fn(|i| hash(pool[i % 4], &mut constant, 0x58f3_8ded));
    std::array::from_fn(|i| u64::from(words[2 * i]) | (u64::from(words[2 * i + 1]) << 32))
}

/// Initial state and stream, as NumPy seeds its PCG64 generators.
fn numpy_seeding(entropy: u32) -> (u128, u128) {
    let [a, b, c, d] = seed_words(entropy).map(u128::from);
    ((a << 64) | b, (c << 64) | d)
}

// Source: `numpy.random.SeedSequence(12345).generate_state(4, numpy.uint64)`.
#[test]
fn the_seeding_that_the_next_tests_need_agrees_with_numpy() {
    let expected = [0xb5ae_6482_a03d_837c, 0xbbe2_996f_fa1f_7a2f, 0x64e3_9a9f_3715_8f94, 0x3ebb_0f96_a013_fd73];
    assert_eq!(seed_words(12345), expected);
}

/// The generator in a given state, by undoing what its constructor does to the state: x ↦ (x + c) a + c.
fn dxsm_in_state(state: u128, stream: u128) -> Lcg128CmDxsm64 {
    let multiplier = 0xda94_2042_e4dd_58b5_u128;
    let increment = (stream << 1) | 1;
    // Newton's iteration for the inverse modulo 2¹²⁸; each round doubles the three bits that an odd number starts with.
    let inverse = (0..6).fold(multiplier, |inverse: u128, _| {
        inverse.wrapping_mul(2_u128.wrapping_sub(multiplier.wrapping_mul(inverse)))
    });
    let initial = state.wrapping_sub(increment).wrapping_mul(inverse).wrapping_sub(increment);
    Lcg128CmDxsm64::new(initial, stream)
}

// Source: numpy/random/tests/data/pcg64dxsm-testset-1.csv (seed 0xdeadbeaf) and -2.csv (seed 0). NumPy seeds this
// generator by one step with the long multiplier of the other PCG64.
#[test]
fn dxsm_agrees_with_numpy() {
    let long_multiplier = 0x2360_ed05_1fc6_5da4_4385_df64_9fcc_f645_u128;
    for (seed, expected) in [
        (0xdead_beaf, [0xdf1d_dcf1_e225_21fe, 0xc71b_2f9c_706c_f151, 0x6922_a8cc_24ad_96b2]),
        (0, [0xd97e_4a14_7f78_8a70, 0x8dfa_7bce_56e3_a253, 0x1355_6ed9_f53d_3c10]),
    ] {
        let (initial, stream) = numpy_seeding(seed);
        let increment = (stream << 1) | 1;
        let state = initial.wrapping_add(increment).wrapping_mul(long_multiplier).wrapping_add(increment);
        assert_eq!(first(dxsm_in_state(state, stream)), expected, "seed {seed:#x}");
    }
}

// Source: numpy/random/tests/data/pcg64-testset-1.csv (seed 0xdeadbeaf) and -2.csv (seed 0).
#[test]
fn the_underlying_congruential_generator_agrees_with_numpy() {
    for (seed, expected) in [
        (0xdead_beaf, [0x60d2_4054_e17a_0698, 0xd5e7_9d89_856e_4f12, 0xd254_972f_e64b_d782]),
        (0, [0xa30f_ebcf_d9c2_825f, 0x4510_bdf8_82d9_d721, 0x0a7d_3da9_4ecd_e8b8]),
    ] {
        let (state, stream) = numpy_seeding(seed);
        assert_eq!(first(Lcg128Xsl64::new(state, stream)), expected, "seed {seed:#x}");
    }
}

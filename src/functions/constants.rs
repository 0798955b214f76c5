//! Leading words of ln 2, pi and Euler's constant.
//!
//! The first time MPFR is asked for one of them it computes it, for Euler's constant in some fifty
//! microseconds already at a hundred bits and once for each thread; these words are there at once.
//!
//! Source: computed with Arb (python-flint 0.9.0) at 1200 bits and cut after 704 bits; the numbers
//! are those of DLMF 4.2.11 with `z = 2`, 3.12.1 and 5.2.3. A test compares all bits with MPFR.

/// Words after the point of a constant, most significant first.
pub(crate) const WORDS: usize = 11;

/// A constant rounded down to [`WORDS`] words after the point.
pub(crate) struct Leading {
    pub(crate) whole: u64,
    pub(crate) fraction: [u64; WORDS],
}

/// The natural logarithm of two.
pub(crate) static LN_2: Leading = Leading {
    whole: 0,
    fraction: [
        0xb172_17f7_d1cf_79ab,
        0xc9e3_b398_03f2_f6af,
        0x40f3_4326_7298_b62d,
        0x8a0d_175b_8baa_fa2b,
        0xe7b8_7620_6deb_ac98,
        0x5595_52fb_4afa_1b10,
        0xed2e_ae35_c138_2144,
        0x2757_3b29_1169_b825,
        0x3e96_ca16_224a_e8c5,
        0x1acb_da11_317c_387e,
        0xb9ea_9bc3_b136_603b,
    ],
};

/// The circle constant.
pub(crate) static PI: Leading = Leading {
    whole: 3,
    fraction: [
        0x243f_6a88_85a3_08d3,
        0x1319_8a2e_0370_7344,
        0xa409_3822_299f_31d0,
        0x082e_fa98_ec4e_6c89,
        0x4528_21e6_38d0_1377,
        0xbe54_66cf_34e9_0c6c,
        0xc0ac_29b7_c97c_50dd,
        0x3f84_d5b5_b547_0917,
        0x9216_d5d9_8979_fb1b,
        0xd131_0ba6_98df_b5ac,
        0x2ffd_72db_d01a_dfb7,
    ],
};

/// Euler's constant.
pub(crate) static EULER_GAMMA: Leading = Leading {
    whole: 0,
    fraction: [
        0x93c4_67e3_7db0_c7a4,
        0xd1be_3f81_0152_cb56,
        0xa1ce_cc3a_f65c_c019,
        0x0c03_df34_709a_ffbd,
        0x8e4b_59fa_03a9_f0ee,
        0xd064_9ccb_6210_57d1,
        0x1056_ae91_3213_5a08,
        0xe43b_4673_d74b_afea,
        0x58de_b878_cc86_d733,
        0xdbe7_bf38_154b_36cf,
        0x8a96_d156_7899_aaae,
    ],
};

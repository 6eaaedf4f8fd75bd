//! Constants to the precision of [`Real`].
//!
//! Each pair is the double nearest to the constant and the double nearest to
//! what that leaves, computed with exact rational arithmetic; the shortest
//! decimals that denote those doubles stand here. The tests recompute them.

use super::Real;

/// ln 2.
pub(super) const LN_2: Real = Real::pair(std::f64::consts::LN_2, 2.3190468138462996e-17);

/// 1 / ln 10.
pub(super) const LOG10_E: Real = Real::pair(std::f64::consts::LOG10_E, 1.098319650216765e-17);

/// ln 2 in three parts, the first two of 42 bits, so that their products with
/// a whole number below 2^11 are exact.
pub(super) const LN_2_PARTS: [f64; 3] = [0.6931471805598903, 5.49792301870721e-14, 1.1612227229362532e-26];

/// 1/k! for k = 2 to 13.
pub(super) const INVERSE_FACTORIALS: [Real; 12] = [
    Real::pair(0.5, 0.0),                                       // 1/2!
    Real::pair(0.16666666666666666, 9.25185853854297e-18),      // 1/3!
    Real::pair(0.041666666666666664, 2.3129646346357427e-18),   // 1/4!
    Real::pair(0.008333333333333333, 1.1564823173178714e-19),   // 1/5!
    Real::pair(0.001388888888888889, -5.300543954373577e-20),   // 1/6!
    Real::pair(0.0001984126984126984, 1.7209558293420705e-22),  // 1/7!
    Real::pair(2.48015873015873e-05, 2.1511947866775882e-23),   // 1/8!
    Real::pair(2.7557319223985893e-06, -1.858393274046472e-22), // 1/9!
    Real::pair(2.755731922398589e-07, 2.3767714622250297e-23),  // 1/10!
    Real::pair(2.505210838544172e-08, -1.448814070935912e-24),  // 1/11!
    Real::pair(2.08767569878681e-09, -1.20734505911326e-25),    // 1/12!
    Real::pair(1.6059043836821613e-10, 1.2585294588752098e-26), // 1/13!
];

/// 1/k for k = 3, 5, 7 to 43.
pub(super) const INVERSE_ODDS: [Real; 21] = [
    Real::pair(0.3333333333333333, 1.850371707708594e-17), // 1/3
    Real::pair(0.2, -1.1102230246251566e-17),              // 1/5
    Real::pair(0.14285714285714285, 7.93016446160826e-18), // 1/7
    Real::pair(0.1111111111111111, 6.1679056923619804e-18), // 1/9
    Real::pair(0.09090909090909091, -2.523234146875356e-18), // 1/11
    Real::pair(0.07692307692307693, -4.270088556250602e-18), // 1/13
    Real::pair(0.06666666666666667, 9.251858538542971e-19), // 1/15
    Real::pair(0.058823529411764705, 8.163404592832033e-19), // 1/17
    Real::pair(0.05263157894736842, 2.921639538487254e-18), // 1/19
    Real::pair(0.047619047619047616, 2.64338815386942e-18), // 1/21
    Real::pair(0.043478260869565216, 1.206764157201257e-18), // 1/23
    Real::pair(0.04, -8.326672684688674e-19),              // 1/25
    Real::pair(0.037037037037037035, 2.05596856412066e-18), // 1/27
    Real::pair(0.034482758620689655, 4.785444071660157e-19), // 1/29
    Real::pair(0.03225806451612903, 8.953411488912552e-19), // 1/31
    Real::pair(0.030303030303030304, -8.410780489584519e-19), // 1/33
    Real::pair(0.02857142857142857, 8.921435019309293e-19), // 1/35
    Real::pair(0.02702702702702703, -1.50030138462859e-18), // 1/37
    Real::pair(0.02564102564102564, 8.896017825522087e-19), // 1/39
    Real::pair(0.024390243902439025, -8.46206573647223e-19), // 1/41
    Real::pair(0.023255813953488372, 3.2273925134452225e-19), // 1/43
];

/// The powers of ten that a `u128` holds.
pub(super) const TENS: [u128; 39] = {
    let mut tens = [1; 39];
    let mut i = 1;
    while i < 39 {
        tens[i] = tens[i - 1] * 10;
        i += 1;
    }
    tens
};

/// The same as [`Real`], exactly: 10^38 = 2^38 * 5^38, and 5^38 < 2^106.
pub(super) const REAL_TENS: [Real; 39] = {
    let mut tens = [Real::ONE; 39];
    let mut i = 0;
    while i < 39 {
        tens[i] = Real::from_u128(TENS[i]);
        i += 1;
    }
    tens
};

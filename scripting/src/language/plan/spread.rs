//! Spreads: how a quantity of a process scatters, as the inverse of its cumulative distribution.

use epiloom_solver::math::elementary::{exp, ln};

use crate::language::quantity::Quantity;

/// A distribution of a quantity.
#[derive(Clone, Debug)]
pub enum Spread {
    /// Normal.
    Normal {
        /// Mean.
        mean: Quantity,
        /// Standard deviation.
        deviation: Quantity,
    },
    /// Its logarithm is normal.
    LogNormal {
        /// Median.
        median: Quantity,
        /// Standard deviation of the natural logarithm.
        sigma: f64,
    },
    /// The same density from the lowest to the highest value.
    Uniform {
        /// Lowest.
        low: Quantity,
        /// Highest.
        high: Quantity,
    },
    /// A density that rises in a straight line to the most likely value, and falls so from there.
    Triangular {
        /// Lowest.
        low: Quantity,
        /// Most likely.
        mode: Quantity,
        /// Highest.
        high: Quantity,
    },
}

impl Spread {
    /// A quantity of this kind: its dimension and shown unit are those of the values.
    pub fn kind(&self) -> &Quantity {
        match self {
            Spread::Normal { mean, .. } => mean,
            Spread::LogNormal { median, .. } => median,
            Spread::Uniform { low, .. } | Spread::Triangular { low, .. } => low,
        }
    }

    /// Whether a bound or width is not known, while checking.
    pub fn unknown(&self) -> bool {
        match self {
            Spread::Normal { mean, deviation } => mean.unknown || deviation.unknown,
            Spread::LogNormal { median, .. } => median.unknown,
            Spread::Uniform { low, high } => low.unknown || high.unknown,
            Spread::Triangular { low, mode, high } => low.unknown || mode.unknown || high.unknown,
        }
    }

    /// The SI value below which the share `u` of all lies, `0 < u < 1`.
    pub fn value(&self, u: f64) -> f64 {
        match self {
            Spread::Normal { mean, deviation } => mean.value + deviation.value * inverse_normal(u),
            Spread::LogNormal { median, sigma } => median.value * exp(sigma * inverse_normal(u)),
            Spread::Uniform { low, high } => low.value + (high.value - low.value) * u,
            Spread::Triangular { low, mode, high } => {
                let width = high.value - low.value;
                let (rise, fall) = (mode.value - low.value, high.value - mode.value);
                if u * width < rise {
                    low.value + (u * width * rise).sqrt()
                } else {
                    high.value - ((1.0 - u) * width * fall).sqrt()
                }
            }
        }
    }

    /// In words: "normal, 30 nm with standard deviation 1.5 nm".
    pub fn words(&self) -> String {
        match self {
            Spread::Normal { mean, deviation } => {
                format!("normal, {mean} with standard deviation {deviation}")
            }
            Spread::LogNormal { median, sigma } => {
                format!("log-normal, {median} with standard deviation {sigma} of the logarithm")
            }
            Spread::Uniform { low, high } => format!("uniform from {low} to {high}"),
            Spread::Triangular { low, mode, high } => {
                format!("triangular from {low} over {mode} to {high}")
            }
        }
    }
}

/// The number below which the share `p` of a standard normal distribution lies, to about one part in 1e15.
///
/// Source: M. J. Wichura, Applied Statistics 37, 477 (1988), algorithm AS 241, the more precise of its two routines.
pub fn inverse_normal(p: f64) -> f64 {
    let q = p - 0.5;
    if q.abs() <= 0.425 {
        let r = 0.180625 - q * q;
        return q * ratio(r, &CENTRE.0, &CENTRE.1);
    }
    let tail = if q < 0.0 { p } else { 1.0 - p };
    let r = (-ln(tail)).sqrt();
    let size = if r <= 5.0 {
        ratio(r - 1.6, &NEAR_TAIL.0, &NEAR_TAIL.1)
    } else {
        ratio(r - 5.0, &FAR_TAIL.0, &FAR_TAIL.1)
    };
    if q < 0.0 { -size } else { size }
}

/// Quotient of two polynomials of degree 7, coefficients by rising power.
fn ratio(x: f64, above: &[f64; 8], below: &[f64; 8]) -> f64 {
    let horner = |c: &[f64; 8]| c.iter().rev().fold(0.0, |sum, coefficient| sum * x + coefficient);
    horner(above) / horner(below)
}

const CENTRE: ([f64; 8], [f64; 8]) = (
    [
        3.387_132_872_796_366_608,
        133.141_667_891_784_377_45,
        1_971.590_950_306_551_442_7,
        13_731.693_765_509_461_125,
        45_921.953_931_549_871_457,
        67_265.770_927_008_700_853,
        33_430.575_583_588_128_105,
        2_509.080_928_730_122_672_7,
    ],
    [
        1.0,
        42.313_330_701_600_911_252,
        687.187_007_492_057_908_3,
        5_394.196_021_424_751_107_7,
        21_213.794_301_586_595_867,
        39_307.895_800_092_710_61,
        28_729.085_735_721_942_674,
        5_226.495_278_852_854_561,
    ],
);
const NEAR_TAIL: ([f64; 8], [f64; 8]) = (
    [
        1.423_437_110_749_683_577_34,
        4.630_337_846_156_545_295_9,
        5.769_497_221_460_691_405_5,
        3.647_848_324_763_204_605_04,
        1.270_458_252_452_368_382_58,
        0.241_780_725_177_450_611_77,
        2.272_384_498_926_918_458_33e-2,
        7.745_450_142_783_414_076_4e-4,
    ],
    [
        1.0,
        2.053_191_626_637_758_821_87,
        1.676_384_830_183_803_849_4,
        0.689_767_334_985_100_004_55,
        0.148_103_976_427_480_074_59,
        1.519_866_656_361_645_719_66e-2,
        5.475_938_084_995_344_946e-4,
        1.050_750_071_644_416_843_24e-9,
    ],
);
const FAR_TAIL: ([f64; 8], [f64; 8]) = (
    [
        6.657_904_643_501_103_777_2,
        5.463_784_911_164_114_369_9,
        1.784_826_539_917_291_335_8,
        0.296_560_571_828_504_891_23,
        2.653_218_952_657_612_309_3e-2,
        1.242_660_947_388_078_438_6e-3,
        2.711_555_568_743_487_578_15e-5,
        2.010_334_399_292_288_132_65e-7,
    ],
    [
        1.0,
        0.599_832_206_555_887_937_69,
        0.136_929_880_922_735_805_31,
        1.487_536_129_085_061_485_25e-2,
        7.868_691_311_456_132_591e-4,
        1.846_318_317_510_054_681_8e-5,
        1.421_511_758_316_445_888_7e-7,
        2.044_263_103_389_939_785_64e-15,
    ],
);

//! From one random `u64` to one delay: inverse distribution functions, cut and not clamped.
//!
//! `ln`, `exp`, `sqrt` come from pure Rust code, so that the same number gives the same delay on every machine.

use serde::{Deserialize, Serialize};

use super::DelayRange;
use crate::time::Span;

/// How delays spread over their range.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Marginal {
    /// Every value of the range alike.
    #[default]
    Uniform,
    /// A triangle over the range with its top at typical.
    Triangular,
    /// Median typical; min and max lie at 3 sigma of their own side and cut it.
    Normal,
    /// Either min or max, by the top bit.
    Corners,
    /// Every value of the range alike, each draw of a sweep in a part of the range of its own (Latin hypercube).
    Hypercube,
}

impl Marginal {
    /// All of them, in the order of the documentation.
    pub const ALL: [Marginal; 5] =
        [Marginal::Uniform, Marginal::Triangular, Marginal::Normal, Marginal::Corners, Marginal::Hypercube];

    /// The name in a scenario.
    pub const fn name(self) -> &'static str {
        match self {
            Marginal::Uniform => "uniform",
            Marginal::Triangular => "triangular",
            Marginal::Normal => "normal",
            Marginal::Corners => "corners",
            Marginal::Hypercube => "hypercube",
        }
    }

    /// May a share of its draws have an interval? Corners stand for no part's probability, and a hypercube's draws are not
    /// independent of each other.
    pub const fn allows_intervals(self) -> bool {
        !matches!(self, Marginal::Corners | Marginal::Hypercube)
    }

    /// The marginal of this name.
    pub fn from_name(name: &str) -> Option<Marginal> {
        Marginal::ALL.into_iter().find(|marginal| marginal.name() == name)
    }

    /// The value of a range at the random number `u`: one number a quantity, whatever the range.
    pub fn quantile(self, range: DelayRange, u: u64) -> Span {
        let (min, max) = (range.min.fs(), range.max.fs());
        if min == max {
            return range.min;
        }
        let uniform = min + ((u128::from(u) * u128::from(max - min + 1)) >> 64) as u64;
        let fs = match self {
            Marginal::Uniform | Marginal::Hypercube => uniform,
            Marginal::Corners => {
                if u >> 63 == 0 {
                    min
                } else {
                    max
                }
            }
            Marginal::Triangular => triangular(range, unit(u)),
            Marginal::Normal => normal(range, unit(u)),
        };
        Span::from_fs(fs)
    }
}

/// The middle of the 2^53 cells of the open unit interval that `u` falls into.
pub(super) fn unit(u: u64) -> f64 {
    ((u >> 11) as f64 + 0.5) / (1u64 << 53) as f64
}

fn round(offset: f64, from: u64, down: bool) -> u64 {
    let fs = libm::round(offset) as u64;
    if down { from.saturating_sub(fs) } else { from + fs }
}

fn triangular(range: DelayRange, p: f64) -> u64 {
    let (min, typ, max) = (range.min.fs(), range.typ.fs(), range.max.fs());
    let (left, right) = ((typ - min) as f64, (max - typ) as f64);
    let whole = left + right;
    let fs = if p * whole < left {
        round(libm::sqrt(p * whole * left), min, false)
    } else {
        round(libm::sqrt((1.0 - p) * whole * right), max, true)
    };
    fs.clamp(min, max)
}

/// Φ(3), the upper end of the cut normal distribution (computed from erfc; agrees with printed tables: 0.99865).
const PHI_3: f64 = 0.998_650_101_968_369_9;

fn normal(range: DelayRange, p: f64) -> u64 {
    let (min, typ, max) = (range.min.fs(), range.typ.fs(), range.max.fs());
    let z = normal_quantile((1.0 - PHI_3) + p * (2.0 * PHI_3 - 1.0));
    let side = if z < 0.0 { typ - min } else { max - typ };
    round(z.abs() / 3.0 * side as f64, typ, z < 0.0).clamp(min, max)
}

/// Φ, the standard normal distribution function.
pub(super) fn normal_distribution(z: f64) -> f64 {
    0.5 * libm::erfc(-z * std::f64::consts::FRAC_1_SQRT_2)
}

/// Φ⁻¹, the inverse of the standard normal distribution function, to about 1 part in 10^16.
///
/// Source: M. J. Wichura, "Algorithm AS 241: The percentage points of the normal distribution", Applied Statistics
/// 37 (1988) 477-484, routine PPND16 (coefficients from memory; tested against an independent implementation).
pub(super) fn normal_quantile(p: f64) -> f64 {
    const A: [f64; 8] = [
        3.387_132_872_796_366_5,
        1.331_416_678_917_843_8e2,
        1.971_590_950_306_551_3e3,
        1.373_169_376_550_946e4,
        4.592_195_393_154_987e4,
        6.726_577_092_700_87e4,
        3.343_057_558_358_813e4,
        2.509_080_928_730_122_7e3,
    ];
    const B: [f64; 8] = [
        1.0,
        4.231_333_070_160_091e1,
        6.871_870_074_920_579e2,
        5.394_196_021_424_751e3,
        2.121_379_430_158_659_7e4,
        3.930_789_580_009_271e4,
        2.872_908_573_572_194_3e4,
        5.226_495_278_852_854e3,
    ];
    const C: [f64; 8] = [
        1.423_437_110_749_683_5,
        4.630_337_846_156_546,
        5.769_497_221_460_691,
        3.647_848_324_763_204_5,
        1.270_458_252_452_368_4,
        2.417_807_251_774_506e-1,
        2.272_384_498_926_918_4e-2,
        7.745_450_142_783_414e-4,
    ];
    const D: [f64; 8] = [
        1.0,
        2.053_191_626_637_759,
        1.676_384_830_183_803_8,
        6.897_673_349_851e-1,
        1.481_039_764_274_800_8e-1,
        1.519_866_656_361_645_7e-2,
        5.475_938_084_995_345e-4,
        1.050_750_071_644_416_9e-9,
    ];
    const E: [f64; 8] = [
        6.657_904_643_501_103,
        5.463_784_911_164_114,
        1.784_826_539_917_291_3,
        2.965_605_718_285_048_7e-1,
        2.653_218_952_657_612_4e-2,
        1.242_660_947_388_078_4e-3,
        2.711_555_568_743_487_6e-5,
        2.010_334_399_292_288_1e-7,
    ];
    const F: [f64; 8] = [
        1.0,
        5.998_322_065_558_88e-1,
        1.369_298_809_227_358e-1,
        1.487_536_129_085_061_5e-2,
        7.868_691_311_456_133e-4,
        1.846_318_317_510_054_8e-5,
        1.421_511_758_316_446e-7,
        2.044_263_103_389_939_8e-15,
    ];
    let ratio = |num: &[f64; 8], den: &[f64; 8], r: f64| {
        let poly = |c: &[f64; 8]| c.iter().rev().fold(0.0, |sum, c| sum * r + c);
        poly(num) / poly(den)
    };
    let q = p - 0.5;
    if q.abs() <= 0.425 {
        return q * ratio(&A, &B, 0.180_625 - q * q);
    }
    let r = libm::sqrt(-libm::log(if q < 0.0 { p } else { 1.0 - p }));
    let z = if r <= 5.0 { ratio(&C, &D, r - 1.6) } else { ratio(&E, &F, r - 5.0) };
    if q < 0.0 { -z } else { z }
}

#[cfg(test)]
mod tests {
    use statrs::distribution::{ContinuousCDF, Normal};

    use super::*;

    fn range() -> DelayRange {
        DelayRange { min: Span::from_fs(1_000), typ: Span::from_fs(4_000), max: Span::from_fs(6_000) }
    }

    #[test]
    fn quantile_of_the_normal_agrees_with_a_statistics_library() {
        // outside check: crate statrs, an independent implementation
        let reference = Normal::standard();
        for i in 1..2000 {
            let p = f64::from(i) / 2000.0;
            let (ours, theirs) = (normal_quantile(p), reference.inverse_cdf(p));
            assert!((ours - theirs).abs() < 1e-9, "{p}: {ours} {theirs}");
            assert!((reference.cdf(ours) - p).abs() < 1e-10, "{p}: {ours}");
        }
        for p in [1e-6, 1e-9, 1e-12] {
            assert!((reference.cdf(normal_quantile(p)) / p - 1.0).abs() < 1e-6);
        }
    }

    #[test]
    fn draws_keep_to_the_range_and_rise_with_the_number() {
        for marginal in Marginal::ALL {
            let mut last = Span::ZERO;
            for i in 0..=1000u64 {
                let u = (u128::from(i) * u128::from(u64::MAX) / 1000) as u64;
                let span = marginal.quantile(range(), u);
                assert!(span >= last && range().min <= span && span <= range().max, "{marginal:?} {i} {span:?}");
                last = span;
            }
            assert_eq!(marginal.quantile(range(), 0), range().min, "{marginal:?}");
            assert_eq!(last, range().max, "{marginal:?}");
        }
    }

    #[test]
    fn medians_are_where_they_are_said_to_be() {
        assert_eq!(Marginal::Uniform.quantile(range(), 1 << 63), Span::from_fs(3_500));
        assert!(Marginal::Normal.quantile(range(), 1 << 63).fs().abs_diff(4_000) <= 1);
        // triangle: left half has 3/5 of the area; median at min + sqrt(0.5 * 5000 * 3000)
        assert!(Marginal::Triangular.quantile(range(), 1 << 63).fs().abs_diff(1_000 + 2_739) <= 1);
    }
}

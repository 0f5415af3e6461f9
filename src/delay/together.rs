//! Delays that belong together: gates of one package or die.
//!
//! Every delay of a group still takes its own random number, and the group one more; a rule joins the two.

use serde::{Deserialize, Serialize};

use super::quantile::{normal_distribution, normal_quantile, unit};
use super::{DelayRange, Marginal};
use crate::circuit::GateId;
use crate::time::Span;

/// A factor or a share in whole parts of 10^-9, so that ranges of it are drawn by the same exact maps as delays.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct Billionths(pub u64);

impl Billionths {
    /// One.
    pub const ONE: Billionths = Billionths(1_000_000_000);
    /// Greatest that can be written: far more than any factor that keeps a delay in its range.
    const MOST: u64 = 1 << 62;

    /// The nearest, of a number from 0 up.
    pub fn nearest(number: f64) -> Billionths {
        Billionths(((number * 1e9).round() as u64).min(Billionths::MOST))
    }

    /// As a float, for formulas.
    pub fn as_f64(self) -> f64 {
        self.0 as f64 / 1e9
    }
}

/// How the delays of a group belong together.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Together {
    /// They track: a Gaussian copula over whatever the marginal is. Any two delays of the group have this correlation of
    /// their normal scores, so that each alone is spread as it would be without the group.
    Tracking(Billionths),
    /// Typical times a common factor times a deviation of each delay's own, cut to the range.
    Scale {
        /// Least common factor.
        least: Billionths,
        /// Greatest common factor.
        greatest: Billionths,
        /// Greatest deviation either way, as a share of the scaled delay; below 1.
        mismatch: Billionths,
    },
}

/// Gates whose delays belong together. Wires of these gates do not: they are no part of the package.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Group {
    /// The gates.
    pub gates: Vec<GateId>,
    /// How.
    pub how: Together,
}

impl Together {
    /// The delay at a quantity's own random number and that of its group.
    ///
    /// Tracking: the normal score √ρ·Φ⁻¹(common) + √(1−ρ)·Φ⁻¹(own) takes the place of Φ⁻¹(own) (one-factor Gaussian copula;
    /// common practice). With ρ = 0 it is exactly the draw without a group, with ρ = 1 all delays of the group take the
    /// group's number as it is.
    ///
    /// Scale: factor and deviation are drawn by the marginal, typically 1 (or the end of the range nearest to 1) and 0;
    /// their product with typical is rounded to the nearest fs.
    pub fn draw(self, marginal: Marginal, range: DelayRange, own: u64, common: u64) -> Span {
        match self {
            Together::Tracking(rho) => marginal.quantile(range, tracked(rho, own, common)),
            Together::Scale { least, greatest, mismatch } => {
                let scale = between(least.0, Billionths::ONE.0.clamp(least.0, greatest.0), greatest.0);
                let one = Billionths::ONE.0;
                let deviation = between(one - mismatch.0.min(one), one, one + mismatch.0);
                let (scale, deviation) =
                    (marginal.quantile(scale, common).fs(), marginal.quantile(deviation, own).fs());
                scaled(range, scale, deviation)
            }
        }
    }
}

fn between(min: u64, typ: u64, max: u64) -> DelayRange {
    DelayRange { min: Span::from_fs(min), typ: Span::from_fs(typ), max: Span::from_fs(max) }
}

/// Typical times two factors, in the range.
fn scaled(range: DelayRange, scale: u64, deviation: u64) -> Span {
    const UNIT: u128 = 1_000_000_000_000_000_000;
    let product = u128::from(range.typ.fs()).checked_mul(u128::from(scale));
    // what overflows is far above 2^62 fs, and so above every range
    let product = product.and_then(|it| it.checked_mul(u128::from(deviation))).unwrap_or(u128::MAX - UNIT);
    let fs = u64::try_from((product + UNIT / 2) / UNIT).unwrap_or(u64::MAX);
    Span::from_fs(fs.clamp(range.min.fs(), range.max.fs()))
}

/// The random number of a delay that tracks its group.
fn tracked(rho: Billionths, own: u64, common: u64) -> u64 {
    match rho.0 {
        0 => own,
        rho if rho >= Billionths::ONE.0 => common,
        _ => {
            let rho = rho.as_f64();
            // the middle of the last cell is no float: it rounds to 1, whose score is no number
            let normal = |u: u64| normal_quantile(unit(u).min(1.0 - f64::EPSILON / 2.0));
            let score = libm::sqrt(rho) * normal(common) + libm::sqrt(1.0 - rho) * normal(own);
            // the cast stays below 2^64 by itself
            (normal_distribution(score) * 18_446_744_073_709_551_616.0) as u64
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn range() -> DelayRange {
        between(1_000, 4_000, 6_000)
    }

    #[test]
    fn the_ends_of_tracking_are_exact() {
        let numbers = [0, 1, 1 << 32, 1 << 63, 0xAE90_BFB5_395D_5BA1, u64::MAX];
        for own in numbers {
            for common in numbers {
                assert_eq!(tracked(Billionths(0), own, common), own);
                assert_eq!(tracked(Billionths::ONE, own, common), common);
                let half = Together::Tracking(Billionths::nearest(0.5));
                for marginal in Marginal::ALL {
                    let span = half.draw(marginal, range(), own, common);
                    assert!((range().min..=range().max).contains(&span), "{marginal:?} {own} {common}");
                }
            }
        }
        let [least, greatest] = [0, u64::MAX].map(|u| tracked(Billionths::nearest(0.5), u, u));
        assert!(least < 1 << 11 && greatest > u64::MAX - (1 << 11), "{least} {greatest}");
        // a score of two equal numbers: Φ((√0.5 + √0.5)·Φ⁻¹(Φ(1))) = Φ(√2) = 0.92135 [computed]
        let phi_1 = (0.841_344_746_068_542_9 * 18_446_744_073_709_551_616.0) as u64;
        let u = tracked(Billionths::nearest(0.5), phi_1, phi_1) as f64 / 18_446_744_073_709_551_616.0;
        assert!((u - 0.921_350_396).abs() < 1e-8, "{u}");
    }

    #[test]
    fn a_scaled_delay_is_typical_times_both_factors() {
        let wide = between(1, 4_000, 1 << 61);
        let group = Together::Scale {
            least: Billionths::nearest(0.5),
            greatest: Billionths::nearest(1.5),
            mismatch: Billionths::nearest(0.1),
        };
        assert_eq!(group.draw(Marginal::Corners, wide, 0, 0).fs(), 1_800, "4000 · 0.5 · 0.9");
        assert_eq!(group.draw(Marginal::Corners, wide, u64::MAX, 0).fs(), 2_200, "4000 · 0.5 · 1.1");
        assert_eq!(group.draw(Marginal::Corners, wide, u64::MAX, u64::MAX).fs(), 6_600, "4000 · 1.5 · 1.1");
        assert_eq!(group.draw(Marginal::Normal, wide, 1 << 63, 1 << 63).fs(), 4_000, "typical");
        assert_eq!(group.draw(Marginal::Corners, range(), u64::MAX, u64::MAX).fs(), 6_000, "cut to the range");
        let huge = Together::Scale {
            least: Billionths::nearest(1e30),
            greatest: Billionths::nearest(1e300),
            mismatch: Billionths(0),
        };
        let long = between(1, 1 << 60, (1 << 62) - 1);
        assert_eq!(huge.draw(Marginal::Uniform, long, 5, u64::MAX), long.max, "cut, and no overflow");
        let tiny = Together::Scale { least: Billionths(0), greatest: Billionths(0), mismatch: Billionths(0) };
        assert_eq!(tiny.draw(Marginal::Uniform, wide, 5, 5), wide.min);
    }
}

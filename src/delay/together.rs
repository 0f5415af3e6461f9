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

impl Together {
    /// Delays of a group of which some are given: the others such that all of them can come of one draw. `None`: the given
    /// ones exclude each other, whatever is drawn. `delays` has a range each, and the delay where it is given.
    ///
    /// Groups that track with a correlation below 1 exclude nothing. With 1 all delays lie at the same share of their
    /// draws. Where a common factor scales, the given delays must leave one that each of them is within its mismatch of.
    pub fn complete(self, marginal: Marginal, delays: &[(DelayRange, Option<Span>)]) -> Option<Vec<Span>> {
        // corners are draws of the ends alone: what the range allows between them lies as in a uniform draw
        let marginal = if marginal == Marginal::Corners { Marginal::Uniform } else { marginal };
        let (mut first, mut last) = match self {
            Together::Tracking(_) => (0, u64::MAX),
            Together::Scale { least, greatest, .. } => (least.0, greatest.0),
        };
        for (range, given) in delays {
            let Some(given) = given else { continue };
            let [low, high] = self.ends(marginal, *range);
            first = first_where(first, last, |common| high(common) >= *given)?;
            // the first that is too much, less one
            match first_where(first, last, |common| low(common) > *given) {
                Some(beyond) if beyond == first => return None,
                Some(beyond) => last = beyond - 1,
                None => {}
            }
        }
        let common = match self {
            Together::Tracking(_) => first + (last - first) / 2,
            Together::Scale { .. } => Billionths::ONE.0.clamp(first, last),
        };
        let other = |range: DelayRange| match self {
            Together::Tracking(rho) if rho < Billionths::ONE => range.typ,
            Together::Tracking(_) => marginal.quantile(range, common),
            Together::Scale { .. } => scaled(range, common, Billionths::ONE.0),
        };
        Some(delays.iter().map(|(range, given)| given.unwrap_or_else(|| other(*range))).collect())
    }

    /// The least and greatest delay of a range by what the group has in common; both grow with it.
    fn ends(self, marginal: Marginal, range: DelayRange) -> [Box<dyn Fn(u64) -> Span>; 2] {
        match self {
            Together::Tracking(rho) if rho < Billionths::ONE => {
                [Box::new(move |_| range.min), Box::new(move |_| range.max)]
            }
            Together::Tracking(_) => {
                [Box::new(move |u| marginal.quantile(range, u)), Box::new(move |u| marginal.quantile(range, u))]
            }
            Together::Scale { mismatch, .. } => {
                let one = Billionths::ONE.0;
                let mismatch = mismatch.0.min(one);
                [
                    Box::new(move |scale| scaled(range, scale, one - mismatch)),
                    Box::new(move |scale| scaled(range, scale, one + mismatch)),
                ]
            }
        }
    }
}

/// The first number of `first ..= last` of which something holds that then holds of all that follow.
fn first_where(first: u64, last: u64, holds: impl Fn(u64) -> bool) -> Option<u64> {
    if !holds(last) {
        return None;
    }
    let (mut low, mut high) = (first, last);
    while low < high {
        let middle = low + (high - low) / 2;
        if holds(middle) { high = middle } else { low = middle + 1 }
    }
    Some(low)
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

    #[test]
    fn given_delays_of_a_group_leave_a_draw_of_all_or_none() {
        let fs = Span::from_fs;
        let wide = between(1, 4_000, 1 << 40);
        let group = |least: f64, greatest: f64, mismatch: f64| Together::Scale {
            least: Billionths::nearest(least),
            greatest: Billionths::nearest(greatest),
            mismatch: Billionths::nearest(mismatch),
        };
        let two = |a: u64, b: Option<u64>| [(wide, Some(fs(a))), (wide, b.map(fs))];
        let of = |group: Together, a: u64, b: Option<u64>| group.complete(Marginal::Uniform, &two(a, b));
        // 4000 times 0.5 to 1.5, each within a tenth: 3600 and 4400 are a fifth apart about 1, 3599 and 4401 more
        let tenth = group(0.5, 1.5, 0.1);
        assert_eq!(of(tenth, 3_600, Some(4_400)), Some(vec![fs(3_600), fs(4_400)]));
        assert_eq!(of(tenth, 3_500, Some(4_400)), None);
        assert_eq!(of(tenth, 1_800, Some(2_200)), Some(vec![fs(1_800), fs(2_200)]), "both ends at a factor of 0.5");
        assert_eq!(of(tenth, 1_799, None), None, "below what any factor gives");
        assert_eq!(of(tenth, 6_601, None), None, "above");
        // the other follows, as near to typical as it may
        assert_eq!(of(tenth, 4_000, None), Some(vec![fs(4_000), fs(4_000)]));
        let low = of(tenth, 2_200, None).unwrap()[1];
        assert!(low > fs(2_200) && low <= fs(2_445), "{low:?}");
        // what is clipped by its range is reached by every larger factor
        let clipped = between(3_000, 4_000, 5_000);
        let both = [(clipped, Some(fs(5_000))), (wide, Some(fs(6_600)))];
        assert!(tenth.complete(Marginal::Uniform, &both).is_some());

        let whole = Together::Tracking(Billionths::ONE);
        for marginal in [Marginal::Uniform, Marginal::Triangular, Marginal::Normal, Marginal::Corners] {
            let narrow = between(1_000, 4_000, 6_000);
            let given = [(narrow, Some(fs(1_500))), (between(100, 400, 600), None)];
            let all = whole.complete(marginal, &given).unwrap();
            assert!(all[0] == fs(1_500) && all[1] < fs(400), "{marginal:?} {all:?}");
            let apart = [(narrow, Some(fs(1_000))), (narrow, Some(fs(6_000)))];
            assert_eq!(whole.complete(marginal, &apart), None, "{marginal:?}");
            let half = Together::Tracking(Billionths::nearest(0.5));
            assert_eq!(half.complete(marginal, &apart), Some(vec![fs(1_000), fs(6_000)]), "{marginal:?}");
        }
        // every draw of a group fits it
        for own in [0, 1 << 40, 1 << 62, u64::MAX] {
            for common in [3, 1 << 41, 1 << 63, u64::MAX - 9] {
                for group in [tenth, whole, group(0.0, 0.2, 0.9)] {
                    let draw = |own| group.draw(Marginal::Triangular, range(), own, common);
                    let given = [(range(), Some(draw(own))), (range(), Some(draw(own / 3)))];
                    assert!(group.complete(Marginal::Triangular, &given).is_some(), "{group:?} {own} {common}");
                }
            }
        }
    }
}

//! The rank test of two samples.

/// How far one sample lies above another.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ranks {
    /// Of all pairs the share in which the first is greater less the share in which it is less: -1 to 1.
    pub strength: f64,
    /// The same in standard deviations of what chance does, 0 where all values are one.
    pub z: f64,
}

impl Ranks {
    /// The probability that chance alone gets this far either way, by the normal approximation.
    pub fn chance(&self) -> f64 {
        libm::erfc(self.z.abs() / std::f64::consts::SQRT_2)
    }
}

/// Compares two samples by ranks; equal values share the middle of their ranks. `None` if one is empty.
///
/// Sources: H. B. Mann, D. R. Whitney, "On a test of whether one of two random variables is stochastically larger than the
/// other", Ann. Math. Statist. 18 (1947) 50-60; the variance with ties is that of W. H. Kruskal, W. A. Wallis, J. Amer.
/// Statist. Assoc. 47 (1952) 583-621; the strength 2U/(mn) − 1 is the rank-biserial correlation (all from memory).
///
/// ```
/// // of six pairs the first is greater in five and less in one
/// let ranks = stillgate::review::mann_whitney(&[4, 9], &[1, 3, 8]).unwrap();
/// assert!((ranks.strength - 4.0 / 6.0).abs() < 1e-12);
/// ```
pub fn mann_whitney(first: &[u64], second: &[u64]) -> Option<Ranks> {
    if first.is_empty() || second.is_empty() {
        return None;
    }
    let mut all: Vec<(u64, bool)> =
        first.iter().map(|it| (*it, true)).chain(second.iter().map(|it| (*it, false))).collect();
    all.sort_unstable();
    // twice the sum of the ranks of the first; the sum of t^3 - t over ties of t
    let (mut ranks, mut ties, mut below) = (0u128, 0u128, 0u128);
    for equal in all.chunk_by(|a, b| a.0 == b.0) {
        let count = equal.len() as u128;
        let ours = equal.iter().filter(|it| it.1).count() as u128;
        // ranks below + 1 ..= below + count
        ranks += ours * (2 * below + count + 1);
        ties += count * count * count - count;
        below += count;
    }
    let (m, n) = (first.len() as f64, second.len() as f64);
    let twice_u = (ranks - first.len() as u128 * (first.len() as u128 + 1)) as f64;
    let total = m + n;
    let variance = m * n / 12.0 * ((total + 1.0) - ties as f64 / (total * (total - 1.0)));
    let z = if variance > 0.0 { (twice_u - m * n) / 2.0 / libm::sqrt(variance) } else { 0.0 };
    Some(Ranks { strength: twice_u / (m * n) - 1.0, z })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// By hand: U counts pairs, ties by half.
    fn slow(first: &[u64], second: &[u64]) -> f64 {
        let sign = |a: &u64, b: &u64| (a > b) as i64 as f64 - (a < b) as i64 as f64;
        first.iter().flat_map(|a| second.iter().map(move |b| sign(a, b))).sum::<f64>()
            / (first.len() * second.len()) as f64
    }

    #[test]
    fn strength_counts_pairs() {
        let cases: [(&[u64], &[u64]); 5] =
            [(&[1], &[2]), (&[5, 5, 5], &[5]), (&[1, 2, 2, 9], &[2, 3, 9, 9]), (&[7, 8], &[1, 2]), (&[3, 1], &[2])];
        for (first, second) in cases {
            let ranks = mann_whitney(first, second).unwrap();
            assert!((ranks.strength - slow(first, second)).abs() < 1e-12, "{first:?} {second:?} {ranks:?}");
            let turned = mann_whitney(second, first).unwrap();
            assert!((ranks.strength + turned.strength).abs() < 1e-12 && (ranks.z + turned.z).abs() < 1e-12);
        }
        assert_eq!(mann_whitney(&[], &[1]), None);
        assert_eq!(mann_whitney(&[5, 5], &[5]).unwrap(), Ranks { strength: 0.0, z: 0.0 });
    }

    /// Every way to choose which values are the first sample is alike by chance: mean 0 and variance 1 over all of them.
    #[test]
    fn z_has_unit_variance_over_all_ways_to_choose() {
        for values in [&[1u64, 2, 3, 4, 5, 6, 7][..], &[1, 1, 1, 2, 2, 3, 9, 9], &[0, 0, 0, 0, 1, 1, 1, 1]] {
            for size in 1..values.len() {
                let (mut sum, mut squares, mut ways) = (0.0, 0.0, 0.0);
                for choice in (0u32..1 << values.len()).filter(|it| it.count_ones() as usize == size) {
                    let side = |inside: bool| {
                        let each = values.iter().enumerate().filter(|(i, _)| (choice >> i & 1 == 1) == inside);
                        each.map(|(_, value)| *value).collect::<Vec<u64>>()
                    };
                    let z = mann_whitney(&side(true), &side(false)).unwrap().z;
                    (sum, squares, ways) = (sum + z, squares + z * z, ways + 1.0);
                }
                assert!(
                    sum.abs() < 1e-9 && (squares / ways - 1.0).abs() < 1e-9,
                    "{values:?} {size}: {}",
                    squares / ways
                );
            }
        }
    }

    #[test]
    fn chance_is_that_of_the_normal_distribution() {
        let ranks = |z| Ranks { strength: 0.0, z };
        // common values of the two-sided normal distribution
        assert!((ranks(1.959_964).chance() - 0.05).abs() < 1e-7);
        assert!((ranks(-2.575_829).chance() - 0.01).abs() < 1e-7);
        assert_eq!(ranks(0.0).chance(), 1.0);
    }
}

//! How sure a share of draws is.

use statrs::distribution::{Beta, ContinuousCDF};

/// The two-sided Clopper–Pearson interval of a share: `count` of `of` independent draws, at this confidence (0.95).
/// `None` if `of` is 0 or `count` exceeds it.
///
/// Source: C. J. Clopper, E. S. Pearson, "The use of confidence or fiducial limits illustrated in the case of the
/// binomial", Biometrika 26 (1934) 404-413; in terms of beta quantiles as in R. G. Newcombe, Statistics in Medicine 17
/// (1998) 857-872.
///
/// ```
/// let (low, high) = stillgate::sweep::clopper_pearson(81, 263, 0.95).unwrap();
/// assert!((low - 0.2527).abs() < 5e-5 && (high - 0.3676).abs() < 5e-5);
/// ```
pub fn clopper_pearson(count: u64, of: u64, confidence: f64) -> Option<(f64, f64)> {
    if of == 0 || count > of {
        return None;
    }
    let (k, n, tail) = (count as f64, of as f64, (1.0 - confidence) / 2.0);
    let low = if count == 0 { 0.0 } else { quantile(k, n - k + 1.0, tail)? };
    let high = if count == of { 1.0 } else { quantile(k + 1.0, n - k, 1.0 - tail)? };
    Some((low, high))
}

/// What the probability of something is at most, at this confidence (0.95), one-sided, if it was seen in none of `of`
/// independent draws: 1 − (1 − confidence)^(1/of), about 3/of ("rule of three"). `None` if `of` is 0.
///
/// Source: B. D. Jovanovic, P. S. Levy, "A look at the rule of three", The American Statistician 51 (1997) 137-139.
///
/// ```
/// let at_most = stillgate::sweep::none_in(300, 0.95).unwrap();
/// assert!((at_most - 0.009936).abs() < 5e-7);
/// ```
pub fn none_in(of: u64, confidence: f64) -> Option<f64> {
    (of > 0).then(|| -libm::expm1(libm::log1p(-confidence) / of as f64))
}

/// The quantile of the beta distribution, by bisection on its distribution function: the library's own inverse stops at
/// a fixed number of steps, which is too coarse for shares near 0 of many draws.
fn quantile(a: f64, b: f64, p: f64) -> Option<f64> {
    let beta = Beta::new(a, b).ok()?;
    let (mut low, mut high) = (0.0f64, 1.0f64);
    for _ in 0..200 {
        let middle = if low == 0.0 && high > 1e-300 { high / 2.0 } else { (low + high) / 2.0 };
        if middle <= low || middle >= high {
            break;
        }
        if beta.cdf(middle) < p {
            low = middle;
        } else {
            high = middle;
        }
    }
    Some((low + high) / 2.0)
}

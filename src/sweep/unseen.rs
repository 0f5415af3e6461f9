//! How much the sweep has not seen yet: the probability that one more draw does something new.
//!
//! Behaviour is the order in which loop nets changed on the way from one state at rest to the next, one behaviour a window.
//! The probability of all that was not seen is estimated by how much was seen only once (I. J. Good, "The population
//! frequencies of species and the estimation of population parameters", Biometrika 40 (1953) 237-264, after A. M. Turing).

use super::tally::WindowTally;

/// How much of one window's behaviour was not seen yet.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct UnseenMass {
    /// The moment of the window.
    pub moment: u32,
    /// Orders seen in one draw only.
    pub once: u64,
    /// Draws in which the window led from rest to rest.
    pub of: u64,
    /// Estimated probability of an order not seen yet: once / of.
    pub estimate: f64,
    /// Upper bound of that probability, with the confidence for all windows of the sweep at once.
    pub upper: f64,
}

impl UnseenMass {
    /// From here on the sweep says that it has seen too little: one draw in a hundred would do something new.
    pub const HIGH: f64 = 0.01;

    /// Has too little been seen?
    pub fn is_high(&self) -> bool {
        self.estimate >= UnseenMass::HIGH
    }

    /// The unseen of one window among `windows`; `None` where it cannot be told: no draw led from rest to rest, or there
    /// were more orders than are kept.
    ///
    /// The draws must be independent.
    pub(super) fn of(moment: u32, tally: &WindowTally, windows: u64, confidence: f64) -> Option<UnseenMass> {
        if tally.orders.is_truncated() {
            return None;
        }
        let of = tally.orders.total();
        let once = tally.orders.iter().filter(|(_, seen)| seen.count == 1).count() as u64;
        // the chance to be wrong is shared out among the windows
        let confidence = 1.0 - (1.0 - confidence) / windows.max(1) as f64;
        let (estimate, upper) = unseen_mass(once, of, confidence)?;
        Some(UnseenMass { moment, once, of, estimate, upper })
    }
}

/// The Good-Turing estimate of the probability of everything that was not seen in `of` independent draws, of which `once`
/// showed what no other showed; and an upper bound of that probability at this confidence (0.95), one-sided.
/// `None` if `of` is 0 or `once` exceeds it.
///
/// Source of the bound: D. A. McAllester, R. E. Schapire, "On the convergence rate of Good-Turing estimators", COLT 2000:
/// with probability 1 − δ the unseen mass is at most the estimate + (2√2 + √3)·√(ln(3/δ) / n) (from memory).
///
/// ```
/// // ten carp, three perch, two whitefish, one trout, one salmon, one eel: the next fish is a new kind one time in six
/// let (estimate, upper) = stillgate::sweep::unseen_mass(3, 18, 0.95).unwrap();
/// assert!((estimate - 3.0 / 18.0).abs() < 1e-12 && upper == 1.0);
/// ```
pub fn unseen_mass(once: u64, of: u64, confidence: f64) -> Option<(f64, f64)> {
    if of == 0 || once > of {
        return None;
    }
    let (n, delta) = (of as f64, 1.0 - confidence);
    let estimate = once as f64 / n;
    let width = (2.0 * 2f64.sqrt() + 3f64.sqrt()) * libm::sqrt(libm::log(3.0 / delta) / n);
    Some((estimate, (estimate + width).min(1.0)))
}

//! The delay of an involution gate, which depends on how long ago its output last changed.
//!
//! Involution delay model: Függer, Najvirt, Nowak, Schmid, "A faithful binary circuit model", IEEE TCAD 39 (2020), in the
//! form of an exponential channel given by its delays after a long rest. `ln`, `exp` come from pure Rust code, so that a
//! delay is the same on every machine.

use crate::time::Span;

/// Is an involution gate with this time constant and these delays after a long rest causal: e^(−rise/τ) + e^(−fall/τ) < 1?
/// `tau` is above 0.
pub fn is_causal(tau: Span, rise: Span, fall: Span) -> bool {
    let ratio = |delay: Span| libm::exp(-(delay.fs() as f64) / tau.fs() as f64);
    ratio(rise) + ratio(fall) < 1.0
}

/// The delay in femtoseconds of an output change, rounded to the nearest; below zero if the change would lie in the
/// past, `None` if it lies infinitely far there.
///
/// `full` is the delay of this edge after a long rest, `other` that of the other edge, `tau` the time constant, all above
/// 0. `since` is the time in femtoseconds from the previous computed change of the output to the change of the inputs,
/// below zero if the former lies ahead; `None` if there was none:
///
/// δ(T) = τ·ln(1 − e^−(T + other)/τ) + full
///
/// ```
/// use stillgate::delay::involution;
/// use stillgate::time::Span;
/// let ns = |fs| Span::from_fs(fs);
/// // tau = 1, rise 2, fall 1.5 (ns): the rise right after a fall
/// assert_eq!(involution(ns(1_000_000), ns(2_000_000), ns(1_500_000), Some(0)), Some(1_747_518));
/// assert_eq!(involution(ns(1_000_000), ns(2_000_000), ns(1_500_000), None), Some(2_000_000));
/// ```
pub fn involution(tau: Span, full: Span, other: Span, since: Option<i128>) -> Option<i128> {
    let full = i128::from(full.fs());
    let Some(since) = since else { return Some(full) };
    let age = since + i128::from(other.fs());
    if age <= 0 {
        return None;
    }
    let tau = tau.fs() as f64;
    let x = age as f64 / tau;
    // ln(1 - e^-x), each half in the form that keeps its digits
    let ln = if x < core::f64::consts::LN_2 { libm::log(-libm::expm1(-x)) } else { libm::log1p(-libm::exp(-x)) };
    // a whole number is added to what is rounded: nothing is lost with long delays
    Some(full + (tau * ln).round() as i128)
}

/// Has a gate with these delays `[fall, rise]` forgotten a change of its output that lies `since` femtoseconds back: is
/// every delay from now on the full one?
pub fn recovered(tau: Span, delay: [Span; 2], since: i128) -> bool {
    let [fall, rise] = delay;
    let full = |span: Span, other| involution(tau, span, other, Some(since)) == Some(i128::from(span.fs()));
    full(rise, fall) && full(fall, rise)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const UNIT: f64 = 1e9;

    fn span(units: f64) -> Span {
        Span::from_fs((units * UNIT).round() as u64)
    }

    /// `[tau, rise, fall]` in units of 10^9 fs.
    fn delta(set: [f64; 3], rise: bool, since: f64) -> f64 {
        let [tau, up, down] = set.map(span);
        let (full, other) = if rise { (up, down) } else { (down, up) };
        involution(tau, full, other, Some((since * UNIT).round() as i128)).unwrap() as f64 / UNIT
    }

    /// Delays of four channels [computed]; the first three are RC stages with pure delay Tp and threshold V:
    /// rise = Tp − τ·ln(1 − V), fall = Tp − τ·ln V.
    #[test]
    fn delays_of_known_channels() {
        let a = [1.0, 1.193147181, 1.193147181];
        let b = [3.0, 3.748872196, 2.532476871];
        let c = [10.0, 10.108256238, 14.162907319];
        let d = [1.0, 2.0, 1.5];
        for (set, rise, since, delay) in [
            (a, true, 0.0, 0.831796566),
            (a, false, 1.0, 1.074853299),
            (b, true, 0.0, 2.062942851),
            (b, false, 0.0, 1.519285186),
            (b, true, 3.0, 3.232382395),
            (b, false, 3.0, 2.198210805),
            (c, true, 0.0, 7.329456680),
            (c, false, 0.0, 9.638623164),
            (c, true, 10.0, 9.173365143),
            (c, false, 10.0, 12.725611182),
            (d, true, 0.0, 1.747517541),
            (d, false, 0.0, 1.354586542),
            // the fixed point: the least delay of the channel
            (a, true, -0.5, 0.5),
            (b, false, -1.0, 1.0),
            (c, true, -5.0, 5.0),
            (d, true, -1.025923016, 1.025923016),
        ] {
            let found = delta(set, rise, since);
            assert!((found - delay).abs() < 3e-9, "{set:?} {rise} {since}: {found} and not {delay}");
        }
    }

    #[test]
    fn far_back_is_the_full_delay_and_too_near_is_never() {
        let (tau, rise, fall) = (span(1.0), span(2.0), span(1.5));
        assert_eq!(involution(tau, rise, fall, None), Some(2_000_000_000));
        assert_eq!(involution(tau, rise, fall, Some(i128::from(u64::MAX))), Some(2_000_000_000));
        assert_eq!(involution(tau, rise, fall, Some(-1_500_000_000)), None);
        // one femtosecond inside the edge: ln of 10^-9
        assert_eq!(involution(tau, rise, fall, Some(-1_499_999_999)), Some(2_000_000_000 - 20_723_265_837));
        // the greatest delays there are
        let long = Span::from_fs((1 << 62) - 1);
        assert_eq!(involution(span(1.0), long, long, Some(0)), Some((1 << 62) - 1));
        assert!(!recovered(tau, [fall, rise], 0) && recovered(tau, [fall, rise], 40_000_000_000));
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 2000, failure_persistence: None, rng_seed: proptest::test_runner::RngSeed::Fixed(1), ..ProptestConfig::default() })]
        /// −δ↑(−δ↓(T)) = T, the property that the model is named after. Of both delays the rounding is at most half a
        /// femtosecond; the outer delay stretches the inner one's by its slope.
        #[test]
        fn it_is_an_involution(tau in 1_000_000u64..1_000_000_000, rise in 1.0f64..4.0, fall in 1.0f64..4.0, since in -0.6f64..6.0) {
            let [rise, fall] = [rise, fall].map(|times| Span::from_fs((tau as f64 * times) as u64));
            let (back, tau) = ((tau as f64 * since) as i128, Span::from_fs(tau));
            let inner = involution(tau, fall, rise, Some(back)).unwrap();
            let outer = involution(tau, rise, fall, Some(-inner)).unwrap();
            let slope = {
                let x = (-inner + i128::from(fall.fs())) as f64 / tau.fs() as f64;
                (-x).exp() / -(-x).exp_m1()
            };
            // and what a double holds of the logarithm
            let lost = tau.fs() as f64 * 1e-15 * (1.0 + slope);
            prop_assert!((-outer - back).abs() as f64 <= 1.0 + 0.5 * slope + lost, "{} {} slope {slope}", -outer, back);
        }
    }
}

//! Log axes: the part that shows some numbers, and where it has labels.

/// Most decades with a label.
const MOST_TICKS: usize = 6;

/// The part of a log axis that shows some numbers above 0, with a little room at both ends.
pub(super) fn stretch(numbers: impl Iterator<Item = f64> + Clone) -> (f64, f64) {
    let low = numbers.clone().fold(f64::INFINITY, f64::min);
    let high = numbers.fold(0.0, f64::max);
    let room = 0.05 * libm::log10(high / low).max(0.1);
    (libm::log10(low) - room, libm::log10(high) + room)
}

/// Round numbers on a log axis from 10^`from` to 10^`to`, rising: decades; of few decades also twice and five times each; of
/// less than one, round steps.
pub(super) fn ticks(from: f64, to: f64) -> Vec<f64> {
    let inside = |tick: &f64| (from..=to).contains(&libm::log10(*tick));
    let (first, last) = (libm::floor(from) as i32, libm::ceil(to) as i32);
    // divided, and not multiplied by a power below 1, so that labels are round
    let times = |digit: f64, power: i32| match power {
        0.. => digit * 10f64.powi(power),
        _ => digit / 10f64.powi(-power),
    };
    let each = |digits: &[f64]| -> Vec<f64> {
        (first..=last).flat_map(|power| digits.iter().map(move |digit| times(*digit, power))).filter(inside).collect()
    };
    let decades = each(&[1.0]);
    if decades.len() >= 4 {
        let every = decades.len().div_ceil(MOST_TICKS);
        return decades.into_iter().step_by(every).collect();
    }
    let some = each(&[1.0, 2.0, 5.0]);
    if some.len() >= 3 {
        return some;
    }
    let (low, high) = (libm::exp10(from), libm::exp10(to));
    let power = libm::floor(libm::log10((high - low) / 3.0)) as i32;
    let steps = [5.0, 2.0, 1.0].map(|digit| times(digit, power));
    let step = steps.into_iter().find(|step| (high - low) / step >= 3.0).unwrap_or(steps[2]);
    let numbers = libm::ceil(low / step) as u64..=libm::floor(high / step) as u64;
    let each = numbers.map(|n| match power {
        0.. => n as f64 * step,
        // as above
        _ => n as f64 * (step * 10f64.powi(-power)).round() / 10f64.powi(-power),
    });
    each.filter(inside).take(3 * MOST_TICKS).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn between(low: f64, high: f64) -> Vec<f64> {
        ticks(libm::log10(low), libm::log10(high))
    }

    #[test]
    fn ticks_are_round_and_few() {
        assert_eq!(between(900.0, 9000.0), [1000.0, 2000.0, 5000.0]);
        assert_eq!(between(900.0, 2_000_000.0), [1e3, 1e4, 1e5, 1e6]);
        assert_eq!(between(0.11, 0.17), [0.12, 0.14, 0.16]);
        assert_eq!(between(3e-5, 4e-2), [5e-5, 1e-4, 2e-4, 5e-4, 1e-3, 2e-3, 5e-3, 1e-2, 2e-2]);
        assert_eq!(between(0.9991, 1.0), [0.9992, 0.9994, 0.9996, 0.9998, 1.0]);
        assert_eq!(between(2e-9, 0.9).len(), 4, "every second decade");
        for (low, high) in [(1e-9, 1.1e-9), (0.5, 0.5001), (1e3, 4e18), (0.9, 1.3), (1.0, 1.25)] {
            let ticks = between(low, high);
            assert!((2..=12).contains(&ticks.len()), "{low} {high}: {ticks:?}");
            assert!(ticks.windows(2).all(|two| two[0] < two[1]), "{ticks:?}");
        }
    }
}

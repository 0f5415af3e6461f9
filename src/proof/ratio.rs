//! Exact fractions.

use std::cmp::Ordering;
use std::fmt;

/// A fraction of at least 0 in lowest terms.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Ratio {
    numerator: i128,
    denominator: i128,
}

/// The greatest common divisor of two numbers, not below 0.
pub(super) fn common(a: i128, b: i128) -> i128 {
    let (mut a, mut b) = (a.abs(), b.abs());
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a
}

impl Ratio {
    /// 0.
    pub const ZERO: Ratio = Ratio::whole(0);
    /// 1.
    pub const ONE: Ratio = Ratio::whole(1);

    /// A whole number.
    pub const fn whole(number: u32) -> Ratio {
        Ratio { numerator: number as i128, denominator: 1 }
    }

    /// A fraction; `None` if it is below 0 or no number.
    pub fn new(numerator: i128, denominator: i128) -> Option<Ratio> {
        let divisor = common(numerator, denominator);
        let (numerator, denominator) = match denominator.cmp(&0) {
            Ordering::Less => (-numerator / divisor, -denominator / divisor),
            Ordering::Equal => return None,
            Ordering::Greater => (numerator / divisor, denominator / divisor),
        };
        (numerator >= 0).then_some(Ratio { numerator, denominator })
    }

    /// Above the line.
    pub const fn numerator(self) -> i128 {
        self.numerator
    }

    /// Below the line, at least 1.
    pub const fn denominator(self) -> i128 {
        self.denominator
    }

    /// The nearest float, to show.
    pub fn to_f64(self) -> f64 {
        self.numerator as f64 / self.denominator as f64
    }

    /// The sum; `None` if the numbers grow too large.
    pub fn plus(self, other: Ratio) -> Option<Ratio> {
        let ours = self.numerator.checked_mul(other.denominator)?;
        let theirs = other.numerator.checked_mul(self.denominator)?;
        Ratio::new(ours.checked_add(theirs)?, self.denominator.checked_mul(other.denominator)?)
    }

    /// The difference; `None` if it is below 0 or the numbers grow too large.
    pub fn minus(self, other: Ratio) -> Option<Ratio> {
        let ours = self.numerator.checked_mul(other.denominator)?;
        let theirs = other.numerator.checked_mul(self.denominator)?;
        Ratio::new(ours.checked_sub(theirs)?, self.denominator.checked_mul(other.denominator)?)
    }

    /// The product; `None` if the numbers grow too large.
    pub fn times(self, other: Ratio) -> Option<Ratio> {
        Ratio::new(self.numerator.checked_mul(other.numerator)?, self.denominator.checked_mul(other.denominator)?)
    }

    /// A whole number of times this, rounded down; `None` if the numbers grow too large.
    pub(super) fn of(self, number: i128) -> Option<i128> {
        Some(self.numerator.checked_mul(number)?.div_euclid(self.denominator))
    }
}

impl PartialOrd for Ratio {
    fn partial_cmp(&self, other: &Ratio) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Ratio {
    fn cmp(&self, other: &Ratio) -> Ordering {
        // by continued fractions, so that nothing overflows
        let (mut a, mut b) = (*self, *other);
        let mut turned = false;
        loop {
            let (whole, other) = (a.numerator / a.denominator, b.numerator / b.denominator);
            let (left, right) = (a.numerator % a.denominator, b.numerator % b.denominator);
            let order = match (whole.cmp(&other), left == 0, right == 0) {
                (Ordering::Equal, true, true) => Some(Ordering::Equal),
                (Ordering::Equal, true, false) => Some(Ordering::Less),
                (Ordering::Equal, false, true) => Some(Ordering::Greater),
                (Ordering::Equal, false, false) => None,
                (order, ..) => Some(order),
            };
            if let Some(order) = order {
                return if turned { order.reverse() } else { order };
            }
            (a, b) = (
                Ratio { numerator: a.denominator, denominator: left },
                Ratio { numerator: b.denominator, denominator: right },
            );
            turned = !turned;
        }
    }
}

impl fmt::Display for Ratio {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.denominator {
            1 => write!(f, "{}", self.numerator),
            denominator => write!(f, "{}/{denominator}", self.numerator),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fractions_are_exact() {
        let of = |a, b| Ratio::new(a, b).expect("a fraction");
        assert_eq!(of(14, 6).to_string(), "7/3");
        assert_eq!(of(-14, -7).to_string(), "2");
        assert_eq!((Ratio::new(1, 0), Ratio::new(-1, 2)), (None, None));
        assert_eq!(of(1, 3).plus(of(1, 6)), Some(of(1, 2)));
        assert_eq!(of(1, 3).minus(of(1, 2)), None);
        assert_eq!(of(7, 3).of(10), Some(23));
        assert_eq!(of(i128::MAX, 2).plus(of(1, 3)), None);
        for (a, b) in
            [(of(1, 3), of(1, 2)), (of(2, 5), of(3, 7)), (Ratio::ZERO, of(1, i128::MAX)), (of(3, 2), of(2, 1))]
        {
            assert!(a.cmp(&b).is_lt() && b.cmp(&a).is_gt() && a.cmp(&a).is_eq(), "{a} {b}");
        }
        assert!(of(i128::MAX, 3) > of(i128::MAX - 2, 3));
    }
}

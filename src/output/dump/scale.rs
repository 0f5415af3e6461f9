//! The tick of a dump.

use std::fmt;

use crate::time::{Time, Unit};

/// 1, 10 or 100 of a unit of time, from 1 fs to 100 s.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Tick {
    /// The power of ten of femtoseconds, 0 to 17.
    exponent: u32,
}

impl Tick {
    /// 1 fs: every time is a whole number of it.
    pub const FINEST: Tick = Tick { exponent: 0 };
    /// 100 s.
    const COARSEST: Tick = Tick { exponent: Unit::S.exponent() + 2 };

    /// The coarsest tick of which every time is a whole number; where there is none but 0, the unit.
    pub fn of(times: impl IntoIterator<Item = Time>, unit: Unit) -> Tick {
        let mut tick = Tick::COARSEST;
        let mut any = false;
        for time in times {
            any |= time != Time::ZERO;
            tick = tick.holding(time);
        }
        if any { tick } else { Tick { exponent: unit.exponent() } }
    }

    /// The coarsest tick, not above this one, of which the time is a whole number.
    fn holding(mut self, time: Time) -> Tick {
        while !time.fs().is_multiple_of(10u64.pow(self.exponent)) {
            self.exponent -= 1;
        }
        self
    }

    /// Of times that come one by one: nothing yet.
    pub(super) fn unset() -> Tick {
        Tick::COARSEST
    }

    /// Of times that come one by one: and this one.
    pub(super) fn and(self, time: Time) -> Tick {
        self.holding(time)
    }

    /// Zeros at the end of a number of femtoseconds that this tick makes needless.
    pub(super) fn zeros(self) -> usize {
        self.exponent as usize
    }

    /// The time in ticks; `None` if that is no whole number.
    pub fn count(self, time: Time) -> Option<u64> {
        let one = 10u64.pow(self.exponent);
        time.fs().is_multiple_of(one).then(|| time.fs() / one)
    }
}

impl fmt::Display for Tick {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let unit = Unit::ALL[(self.exponent / 3) as usize];
        write!(f, "{} {unit}", 10u32.pow(self.exponent % 3))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_tick_is_the_coarsest_that_loses_nothing() {
        let of = |times: &[u64]| Tick::of(times.iter().map(|fs| Time::from_fs(*fs)), Unit::Ns).to_string();
        assert_eq!(of(&[0, 100_000_000, 12_500_000]), "100 ps");
        assert_eq!(of(&[1]), "1 fs");
        assert_eq!(of(&[0]), "1 ns");
        assert_eq!(of(&[30_000_000_000]), "10 us");
        assert_eq!(of(&[(1 << 63) - 1]), "1 fs");
        assert_eq!(of(&[9_000_000_000_000_000_000]), "100 s");
        for exponent in 0..18 {
            let times = [3 * 10u64.pow(exponent), 20 * 10u64.pow(exponent)].map(Time::from_fs);
            let tick = Tick::of(times, Unit::Ns);
            assert_eq!(tick.exponent, exponent);
            assert_eq!((tick.count(times[0]), tick.count(times[1])), (Some(3), Some(20)));
        }
        assert_eq!(Tick { exponent: 2 }.count(Time::from_fs(150)), None);
    }
}

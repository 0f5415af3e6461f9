//! Exact time in whole femtoseconds: the only place that turns text into time and time into text.
//!
//! [`Time`] is an instant counted from the start of a run, [`Span`] a length of time. Both hold a `u64` of
//! femtoseconds. Text such as `2.5` with a unit is converted by decimal arithmetic on its digits and never
//! passes through a float, so what a file says is what a run uses.

use std::fmt;
use std::ops::{Add, Sub};

use serde::{Deserialize, Serialize};

/// An instant, in whole femtoseconds since the start of a run. A run ends below 2^63 fs (about 2.5 hours).
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct Time(u64);

/// A length of time in whole femtoseconds. One delay or wait stays below 2^62 fs.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct Span(u64);

/// A unit of time as written in a scenario.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Unit {
    /// Femtoseconds.
    Fs,
    /// Picoseconds.
    Ps,
    /// Nanoseconds, the default.
    #[default]
    Ns,
    /// Microseconds.
    Us,
    /// Milliseconds.
    Ms,
    /// Seconds.
    S,
}

/// Why a text is no time.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum TimeError {
    /// Neither a number nor a number with a unit.
    #[error("`{0}` is no time; write a number such as 6 or 2.5, or text with a unit such as \"2.5 us\"")]
    NotANumber(String),
    /// Below zero.
    #[error("`{0}` is negative; a time is zero or more")]
    Negative(String),
    /// Not a whole number of femtoseconds.
    #[error("`{0}` is finer than 1 fs, the resolution of all times")]
    TooFine(String),
    /// 2^62 fs or more.
    #[error("`{0}` is too long; a delay or wait stays below 2^62 fs (about 77 minutes)")]
    TooLarge(String),
    /// The letters behind the number are no unit.
    #[error("`{0}` is no unit of time; the units are fs, ps, ns, us, ms, s")]
    UnknownUnit(String),
}

impl Unit {
    /// All units, smallest first.
    pub const ALL: [Unit; 6] = [Unit::Fs, Unit::Ps, Unit::Ns, Unit::Us, Unit::Ms, Unit::S];

    /// The power of ten of femtoseconds in one unit.
    pub const fn exponent(self) -> u32 {
        self as u32 * 3
    }

    /// Femtoseconds in one unit.
    pub const fn femtoseconds(self) -> u64 {
        10u64.pow(self.exponent())
    }

    /// The unit's sign, as in `ns`.
    pub const fn name(self) -> &'static str {
        match self {
            Unit::Fs => "fs",
            Unit::Ps => "ps",
            Unit::Ns => "ns",
            Unit::Us => "us",
            Unit::Ms => "ms",
            Unit::S => "s",
        }
    }

    /// The unit with this sign (`us` and `µs` are the same).
    pub fn from_name(name: &str) -> Option<Unit> {
        match name {
            "µs" | "μs" => Some(Unit::Us),
            _ => Unit::ALL.into_iter().find(|unit| unit.name() == name),
        }
    }
}

impl fmt::Display for Unit {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}

impl Time {
    /// The start of a run.
    pub const ZERO: Time = Time(0);
    /// A run ends before this instant.
    pub const END: Time = Time(1 << 63);

    /// The instant this many femtoseconds after the start.
    pub const fn from_fs(fs: u64) -> Time {
        Time(fs)
    }

    /// Femtoseconds since the start.
    pub const fn fs(self) -> u64 {
        self.0
    }

    /// The time from `earlier` to here, zero if `earlier` is later.
    pub const fn since(self, earlier: Time) -> Span {
        Span(self.0.saturating_sub(earlier.0))
    }

    /// The time from the start to here.
    pub const fn from_start(self) -> Span {
        Span(self.0)
    }
}

impl Add<Span> for Time {
    type Output = Time;
    fn add(self, span: Span) -> Time {
        Time(self.0 + span.0)
    }
}

impl Add for Span {
    type Output = Span;
    fn add(self, other: Span) -> Span {
        Span(self.0 + other.0)
    }
}

impl Sub for Span {
    type Output = Span;
    fn sub(self, other: Span) -> Span {
        Span(self.0 - other.0)
    }
}

impl Span {
    /// No time at all.
    pub const ZERO: Span = Span(0);
    /// The shortest time there is: 1 fs.
    pub const TICK: Span = Span(1);
    /// A delay or wait stays below this.
    pub const LIMIT: Span = Span(1 << 62);

    /// A span of this many femtoseconds.
    pub const fn from_fs(fs: u64) -> Span {
        Span(fs)
    }

    /// The span in femtoseconds.
    pub const fn fs(self) -> u64 {
        self.0
    }

    /// Reads a number, with an optional unit, exactly: `6`, `2.50`, `1e3`, `"2.5 us"`.
    ///
    /// A bare number is in `unit`. Errors: see [`TimeError`]; the result is below [`Span::LIMIT`].
    ///
    /// ```
    /// use stillgate::time::{Span, Unit};
    /// assert_eq!(Span::parse("2.50", Unit::Ns).unwrap(), Span::from_fs(2_500_000));
    /// assert_eq!(Span::parse("2.5 us", Unit::Ns).unwrap(), Span::from_fs(2_500_000_000));
    /// assert!(Span::parse("0.0000001", Unit::Ns).is_err());
    /// ```
    pub fn parse(text: &str, unit: Unit) -> Result<Span, TimeError> {
        let text = text.trim();
        let split = text.find(|c: char| c.is_alphabetic() && !matches!(c, 'e' | 'E')).unwrap_or(text.len());
        let (number, sign) = text.split_at(split);
        let unit = match sign.trim() {
            "" => unit,
            sign => Unit::from_name(sign).ok_or_else(|| TimeError::UnknownUnit(sign.to_string()))?,
        };
        let bad = || TimeError::NotANumber(text.to_string());
        let number = number.trim();
        let (negative, number) = match number.strip_prefix('-') {
            Some(rest) => (true, rest),
            None => (false, number.strip_prefix('+').unwrap_or(number)),
        };
        let (mantissa, exponent) = match number.find(['e', 'E']) {
            Some(at) => {
                let power = number[at + 1..].parse::<i32>().map_err(|_| bad())?;
                (&number[..at], power)
            }
            None => (number, 0),
        };
        let (whole, part) = mantissa.split_once('.').unwrap_or((mantissa, ""));
        let digits_only = |s: &str| s.bytes().all(|b| b.is_ascii_digit());
        if (whole.is_empty() && part.is_empty()) || !digits_only(whole) || !digits_only(part) {
            return Err(bad());
        }
        let digits = format!("{whole}{part}");
        let significant = digits.trim_start_matches('0').trim_end_matches('0');
        if significant.is_empty() {
            return Ok(Span::ZERO);
        }
        if negative {
            return Err(TimeError::Negative(text.to_string()));
        }
        let trailing = digits.len() - digits.trim_end_matches('0').len();
        let power = i64::from(exponent) + i64::from(unit.exponent()) - part.len() as i64 + trailing as i64;
        if power < 0 {
            return Err(TimeError::TooFine(text.to_string()));
        }
        let large = || TimeError::TooLarge(text.to_string());
        if significant.len() as i64 + power > 19 {
            return Err(large());
        }
        let value = significant.parse::<u64>().ok().and_then(|v| v.checked_mul(10u64.checked_pow(power as u32)?));
        match value {
            Some(fs) if fs < Span::LIMIT.0 => Ok(Span(fs)),
            _ => Err(large()),
        }
    }

    /// The exact decimal of this span in a unit, without trailing zeros.
    pub fn decimal(self, unit: Unit) -> Decimal {
        Decimal::new(i128::from(self.0), unit)
    }

    /// The span with three significant digits and the largest unit that keeps it at 1 or more, for people.
    pub fn rounded(self) -> String {
        rounded(i128::from(self.0))
    }
}

/// An exact decimal number of units, positive or negative; `Display` writes it without trailing zeros.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Decimal {
    fs: i128,
    unit: Unit,
}

impl Decimal {
    /// This many femtoseconds, to be written in `unit`.
    pub fn new(fs: i128, unit: Unit) -> Decimal {
        Decimal { fs, unit }
    }
}

impl fmt::Display for Decimal {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let one = i128::from(self.unit.femtoseconds());
        let (whole, part) = (self.fs.abs() / one, self.fs.abs() % one);
        let sign = if self.fs < 0 { "-" } else { "" };
        if part == 0 {
            return f.pad_integral(true, "", &format!("{sign}{whole}"));
        }
        let width = self.unit.exponent() as usize;
        let part = format!("{part:0width$}");
        f.pad_integral(true, "", &format!("{sign}{whole}.{}", part.trim_end_matches('0')))
    }
}

/// A signed number of femtoseconds with three significant digits and a fitting unit, for people: `-2.45 ns`.
pub fn rounded(fs: i128) -> String {
    let size = fs.unsigned_abs();
    if size == 0 {
        return "0".to_string();
    }
    let unit = Unit::ALL.into_iter().rev().find(|u| size >= u128::from(u.femtoseconds())).unwrap_or(Unit::Fs);
    let mut unit = unit;
    let text = loop {
        let value = size as f64 / unit.femtoseconds() as f64;
        let places = if value < 9.995 {
            2
        } else if value < 99.95 {
            1
        } else {
            0
        };
        let text = format!("{value:.places$}");
        // 999.7 ps reads 1.00 ns
        match (text.as_str(), Unit::ALL.get(unit as usize + 1)) {
            ("1000", Some(larger)) => unit = *larger,
            _ => break text,
        }
    };
    let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_string() } else { text };
    format!("{}{text} {unit}", if fs < 0 { "-" } else { "" })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn text_is_read_exactly() {
        let fs = |text: &str, unit| Span::parse(text, unit).map(Span::fs);
        assert_eq!(fs("0.1", Unit::Ns), Ok(100_000));
        assert_eq!(fs("1234567.001", Unit::Ns), Ok(1_234_567_001_000));
        assert_eq!(fs("1e3", Unit::Ps), Ok(1_000_000));
        assert_eq!(fs("1.5e-3", Unit::Ns), Ok(1_500));
        assert_eq!(fs("3 µs", Unit::Ns), Ok(3_000_000_000));
        assert_eq!(fs("2.5ns", Unit::S), Ok(2_500_000));
        assert_eq!(fs("0000.000000000", Unit::Fs), Ok(0));
        assert_eq!(fs("1.000", Unit::Fs), Ok(1));
        assert!(matches!(fs("0.5", Unit::Fs), Err(TimeError::TooFine(_))));
        assert!(matches!(fs("-1", Unit::Ns), Err(TimeError::Negative(_))));
        assert!(matches!(fs("nan", Unit::Ns), Err(TimeError::NotANumber(_) | TimeError::UnknownUnit(_))));
        assert!(matches!(fs("3 yd", Unit::Ns), Err(TimeError::UnknownUnit(_))));
        assert!(matches!(fs("1e999999999", Unit::Ns), Err(TimeError::TooLarge(_))));
        assert_eq!(fs("4611686018427387903", Unit::Fs), Ok((1 << 62) - 1));
        assert!(matches!(fs("4611686018427387904", Unit::Fs), Err(TimeError::TooLarge(_))));
    }

    #[test]
    fn decimals_are_exact() {
        assert_eq!(Span::from_fs(u64::MAX).decimal(Unit::Ns).to_string(), "18446744073709.551615");
        assert_eq!(Span::from_fs(2_500_000).decimal(Unit::Ns).to_string(), "2.5");
        assert_eq!(Decimal::new(-1, Unit::Ns).to_string(), "-0.000001");
        assert_eq!(Span::ZERO.decimal(Unit::S).to_string(), "0");
    }

    #[test]
    fn rounding_keeps_three_digits() {
        assert_eq!(rounded(-2_449_000), "-2.45 ns");
        assert_eq!(rounded(999_700), "1 ns");
        assert_eq!(rounded(21_400_000), "21.4 ns");
        assert_eq!(rounded(0), "0");
        assert_eq!(rounded(123_456_000), "123 ns");
    }
}

//! What a net can be in the kernel: two values, or three.

use crate::circuit::Compiled;
use crate::logic::{State, Value};

/// A kind of value. Two kinds exist: [`Bit`] for the fast path and [`Ternary`] for runs with X.
pub trait Level: Copy + PartialEq + std::fmt::Debug {
    /// What a gate adds up of its inputs; see [`Compiled`].
    type Sum: Copy + Default + std::fmt::Debug;

    /// The value of this kind. [`Bit`] takes X as 0: no X ever reaches it.
    fn of(value: Value) -> Self;
    /// The value.
    fn value(self) -> Value;
    /// A source of this weight changes.
    fn absorb(sum: &mut Self::Sum, weight: u64, old: Self, new: Self);
    /// A source of this weight is added to an empty sum.
    fn add(sum: &mut Self::Sum, weight: u64, value: Self);
    /// The value of a one-word table.
    fn look_up(table: u64, sum: Self::Sum) -> Self;
    /// The value of any function.
    fn evaluate(function: &Compiled, sum: Self::Sum) -> Self;
    /// The delay to this value, of `[fall, rise]`.
    fn delay(self, delay: &[u64; 2]) -> u64;
    /// Writes the value of a net that changes.
    fn write(self, state: &mut State, net: usize);
}

/// 0 or 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Bit(bool);

/// 0, 1 or X.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Ternary(Value);

impl Level for Bit {
    type Sum = u64;

    #[inline]
    fn of(value: Value) -> Bit {
        Bit(value == Value::One)
    }

    #[inline]
    fn value(self) -> Value {
        Value::from(self.0)
    }

    #[inline]
    fn absorb(sum: &mut u64, weight: u64, _old: Bit, new: Bit) {
        // plus the weight, or minus: all ones or none flips it
        let down = u64::from(new.0).wrapping_sub(1);
        *sum = sum.wrapping_add((weight ^ down).wrapping_sub(down));
    }

    #[inline]
    fn add(sum: &mut u64, weight: u64, value: Bit) {
        *sum += if value.0 { weight } else { 0 };
    }

    #[inline]
    fn look_up(table: u64, sum: u64) -> Bit {
        Bit(table >> (sum & 63) & 1 == 1)
    }

    #[inline]
    fn evaluate(function: &Compiled, sum: u64) -> Bit {
        Bit(function.value(sum))
    }

    #[inline]
    fn delay(self, delay: &[u64; 2]) -> u64 {
        delay[usize::from(self.0)]
    }

    #[inline]
    fn write(self, state: &mut State, net: usize) {
        state.ones.flip(net);
    }
}

impl Level for Ternary {
    /// Weights of the sources at 1, and of those at X.
    type Sum = (u64, u64);

    #[inline]
    fn of(value: Value) -> Ternary {
        Ternary(value)
    }

    #[inline]
    fn value(self) -> Value {
        self.0
    }

    #[inline]
    fn absorb(sum: &mut (u64, u64), weight: u64, old: Ternary, new: Ternary) {
        match old.0 {
            Value::Zero => {}
            Value::One => sum.0 -= weight,
            Value::X => sum.1 -= weight,
        }
        Ternary::add(sum, weight, new);
    }

    #[inline]
    fn add(sum: &mut (u64, u64), weight: u64, value: Ternary) {
        match value.0 {
            Value::Zero => {}
            Value::One => sum.0 += weight,
            Value::X => sum.1 += weight,
        }
    }

    #[inline]
    fn look_up(table: u64, sum: (u64, u64)) -> Ternary {
        Ternary(Compiled::Table(table).value_with_unknown(sum.0, sum.1))
    }

    #[inline]
    fn evaluate(function: &Compiled, sum: (u64, u64)) -> Ternary {
        Ternary(function.value_with_unknown(sum.0, sum.1))
    }

    #[inline]
    fn delay(self, delay: &[u64; 2]) -> u64 {
        match self.0 {
            Value::Zero => delay[0],
            Value::One => delay[1],
            Value::X => delay[0].min(delay[1]),
        }
    }

    #[inline]
    fn write(self, state: &mut State, net: usize) {
        state.set(net, self.0);
    }
}

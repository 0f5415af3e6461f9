//! Gate functions in the form that is evaluated: a function of one sum.
//!
//! Every gate keeps a sum. A source net at 1 adds its weight, a source net at 0 adds nothing, so a change of a net is
//! one addition, whatever the function. For tables the weights are powers of two and the sum is the row number; for
//! counting functions the weight is the number of pins on that net and the sum is the number of pins at 1.

use super::{Function, NetId};
use crate::logic::Value;

/// A function of a gate's input sum.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Compiled {
    /// At most 6 different nets: bit `sum` of the table is the value.
    Table(u64),
    /// 1 when `low ≤ sum ≤ high`. One of the two bounds is always out of reach, so the function is monotone.
    Count {
        /// Least sum that gives 1.
        low: u64,
        /// Greatest sum that gives 1.
        high: u64,
    },
    /// 1 when the sum is odd (or even, with `odd` false).
    Parity {
        /// The parity that gives 1.
        odd: bool,
    },
    /// 7 to 16 different nets: bit `sum` of the table is the value.
    Wide(Box<[u64]>),
}

/// Different nets up to which a gate is a one-word table.
const TABLE_NETS: usize = 6;

impl Compiled {
    /// Compiles a function of these pins. Returns the form, and each different source with its weight.
    pub fn of(function: &Function, pins: &[NetId]) -> (Compiled, Vec<(NetId, u64)>) {
        let mut nets: Vec<NetId> = Vec::new();
        let mut place = rustc_hash::FxHashMap::default();
        let slot: Vec<usize> = pins
            .iter()
            .map(|net| {
                *place.entry(*net).or_insert_with(|| {
                    nets.push(*net);
                    nets.len() - 1
                })
            })
            .collect();
        let tabled = nets.len() <= TABLE_NETS || matches!(function, Function::Expr(_) | Function::Mux);
        if tabled {
            let weights = nets.iter().enumerate().map(|(i, net)| (*net, 1 << i)).collect();
            let mut table = vec![0u64; (1usize << nets.len()).div_ceil(64)];
            let mut values = vec![false; pins.len()];
            for row in 0..1usize << nets.len() {
                for (value, slot) in values.iter_mut().zip(&slot) {
                    *value = row >> slot & 1 == 1;
                }
                if function.value(&values) {
                    table[row >> 6] |= 1 << (row & 63);
                }
            }
            let form = if table.len() == 1 && nets.len() <= TABLE_NETS {
                Compiled::Table(table[0])
            } else {
                Compiled::Wide(table.into())
            };
            return (form, weights);
        }
        let mut count = vec![0u64; nets.len()];
        for slot in slot {
            count[slot] += 1;
        }
        let all = pins.len() as u64;
        let form = match function {
            Function::And => Compiled::Count { low: all, high: all },
            Function::Nand => Compiled::Count { low: 0, high: all - 1 },
            Function::Or => Compiled::Count { low: 1, high: all },
            Function::Nor => Compiled::Count { low: 0, high: 0 },
            Function::Majority => Compiled::Count { low: all / 2 + 1, high: all },
            Function::Xor => Compiled::Parity { odd: true },
            Function::Xnor => Compiled::Parity { odd: false },
            Function::Buf | Function::Not | Function::Mux | Function::Expr(_) => unreachable!("tabled above"),
        };
        if matches!(form, Compiled::Parity { .. }) {
            for weight in &mut count {
                *weight %= 2;
            }
        }
        (form, nets.into_iter().zip(count).collect())
    }

    /// The value for a sum of known inputs.
    pub fn value(&self, sum: u64) -> bool {
        match self {
            Compiled::Table(table) => table >> sum & 1 == 1,
            Compiled::Count { low, high } => (*low..=*high).contains(&sum),
            Compiled::Parity { odd } => (sum & 1 == 1) == *odd,
            Compiled::Wide(table) => table[(sum >> 6) as usize] >> (sum & 63) & 1 == 1,
        }
    }

    /// The value when the inputs at 1 add up to `ones` and those at X to `unknown`: known exactly when every
    /// completion of the X's gives it.
    pub fn value_with_unknown(&self, ones: u64, unknown: u64) -> Value {
        match self {
            _ if unknown == 0 => Value::from(self.value(ones)),
            Compiled::Parity { .. } => Value::X,
            Compiled::Count { .. } => {
                let least = self.value(ones);
                if least == self.value(ones + unknown) { Value::from(least) } else { Value::X }
            }
            Compiled::Table(_) | Compiled::Wide(_) => {
                let first = self.value(ones);
                // all subsets of the unknown pins
                let mut rest = unknown;
                while rest != 0 {
                    if self.value(ones + rest) != first {
                        return Value::X;
                    }
                    rest = (rest - 1) & unknown;
                }
                Value::from(first)
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::Expr;

    fn check(function: &Function, pins: &[NetId]) {
        let (form, sources) = Compiled::of(function, pins);
        let nets = sources.len();
        let sum = |row: usize| sources.iter().enumerate().map(|(i, s)| if row >> i & 1 == 1 { s.1 } else { 0 }).sum();
        let truth = |row: usize| {
            let pin = |net: &NetId| row >> sources.iter().position(|s| s.0 == *net).unwrap() & 1 == 1;
            function.value(&pins.iter().map(pin).collect::<Vec<_>>())
        };
        for row in 0..1usize << nets {
            assert_eq!(form.value(sum(row)), truth(row), "{function:?} {pins:?} row {row:b}");
            for unknown in 0..1usize << nets {
                if row & unknown == 0 {
                    let all: Vec<bool> =
                        (0..1usize << nets).filter(|fill| fill & !unknown == 0).map(|f| truth(row | f)).collect();
                    let want = if all.iter().all(|v| *v == all[0]) { Value::from(all[0]) } else { Value::X };
                    assert_eq!(
                        form.value_with_unknown(sum(row), sum(unknown)),
                        want,
                        "{function:?} {row:b} X {unknown:b}"
                    );
                }
            }
        }
    }

    #[test]
    fn every_form_is_its_function_and_x_is_exact() {
        let nets = |n: u32| (0..n).map(NetId).collect::<Vec<_>>();
        for function in Function::LISTED {
            for n in [1, 2, 3, 5, 7, 9] {
                if function.arity().accepts(n) {
                    check(&function, &nets(n as u32));
                }
            }
            // the same net on two pins
            for n in [3usize, 9] {
                let mut pins = nets(n as u32);
                pins[n - 1] = pins[0];
                if function.arity().accepts(n) {
                    check(&function, &pins);
                }
            }
        }
        let expr = Expr::parse("(a & !b) ^ (c | d & e) | f & g & !h").unwrap();
        check(&Function::Expr(expr), &nets(8));
    }

    #[test]
    fn counting_functions_take_hundreds_of_pins() {
        let pins: Vec<NetId> = (0..301).map(NetId).collect();
        let (form, sources) = Compiled::of(&Function::Majority, &pins);
        assert_eq!(sources.len(), 301);
        assert!(!form.value(150) && form.value(151));
        assert_eq!(form.value_with_unknown(150, 1), Value::X);
        assert_eq!(form.value_with_unknown(151, 150), Value::One);
        assert_eq!(form.value_with_unknown(0, 150), Value::Zero);
    }
}

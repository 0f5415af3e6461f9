//! Gate functions as written.

use std::fmt;

use super::expr::Expr;

/// What a gate computes of its pins.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Function {
    /// The pin.
    Buf,
    /// The inverse of the pin.
    Not,
    /// All pins 1.
    And,
    /// Any pin 1.
    Or,
    /// Not all pins 1.
    Nand,
    /// No pin 1.
    Nor,
    /// An odd number of pins 1.
    Xor,
    /// An even number of pins 1: the complement of the parity.
    Xnor,
    /// More than half of an odd number of pins 1.
    Majority,
    /// Pins are select, value when 0, value when 1.
    Mux,
    /// A Boolean expression; the pins are its nets.
    Expr(Expr),
}

/// How many pins a function takes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Arity {
    /// Just this many.
    Exactly(usize),
    /// This many or more.
    AtLeast(usize),
    /// An odd number, 3 or more.
    Odd,
}

impl Arity {
    /// Does it take this many?
    pub fn accepts(self, pins: usize) -> bool {
        match self {
            Arity::Exactly(n) => pins == n,
            Arity::AtLeast(n) => pins >= n,
            Arity::Odd => pins >= 3 && pins % 2 == 1,
        }
    }
}

impl fmt::Display for Arity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Arity::Exactly(1) => f.write_str("exactly 1 input"),
            Arity::Exactly(n) => write!(f, "exactly {n} inputs"),
            Arity::AtLeast(n) => write!(f, "{n} or more inputs"),
            Arity::Odd => f.write_str("an odd number of inputs, 3 or more"),
        }
    }
}

impl Function {
    /// The functions that a scenario names with a list of nets, in the order of the documentation.
    pub const LISTED: [Function; 10] = [
        Function::Buf,
        Function::Not,
        Function::And,
        Function::Or,
        Function::Nand,
        Function::Nor,
        Function::Xor,
        Function::Xnor,
        Function::Majority,
        Function::Mux,
    ];

    /// The function's name in a scenario.
    pub const fn name(&self) -> &'static str {
        match self {
            Function::Buf => "buf",
            Function::Not => "not",
            Function::And => "and",
            Function::Or => "or",
            Function::Nand => "nand",
            Function::Nor => "nor",
            Function::Xor => "xor",
            Function::Xnor => "xnor",
            Function::Majority => "majority",
            Function::Mux => "mux",
            Function::Expr(_) => "expr",
        }
    }

    /// The listed function of this name; `expr` is none of them.
    pub fn from_name(name: &str) -> Option<Function> {
        Function::LISTED.into_iter().find(|function| function.name() == name)
    }

    /// How many pins it takes. An expression takes each of its nets once.
    pub fn arity(&self) -> Arity {
        match self {
            Function::Buf | Function::Not => Arity::Exactly(1),
            Function::And | Function::Or | Function::Nand | Function::Nor | Function::Xor | Function::Xnor => {
                Arity::AtLeast(2)
            }
            Function::Majority => Arity::Odd,
            Function::Mux => Arity::Exactly(3),
            Function::Expr(expr) => Arity::Exactly(expr.nets().len()),
        }
    }

    /// The value for these pins: the definition that every other form is tested against.
    pub fn value(&self, pins: &[bool]) -> bool {
        let ones = pins.iter().filter(|pin| **pin).count();
        match self {
            Function::Buf => pins[0],
            Function::Not => !pins[0],
            Function::And => ones == pins.len(),
            Function::Or => ones > 0,
            Function::Nand => ones != pins.len(),
            Function::Nor => ones == 0,
            Function::Xor => ones % 2 == 1,
            Function::Xnor => ones % 2 == 0,
            Function::Majority => ones > pins.len() / 2,
            Function::Mux => {
                if pins[0] {
                    pins[2]
                } else {
                    pins[1]
                }
            }
            Function::Expr(expr) => expr.value(pins),
        }
    }

    /// As one gate it can show no hazard of its own, though a circuit of several gates for it might.
    pub fn hides_hazards(&self) -> bool {
        match self {
            Function::Mux => true,
            Function::Expr(expr) => expr.repeats(),
            _ => false,
        }
    }
}

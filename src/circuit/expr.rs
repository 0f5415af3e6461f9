//! Boolean expressions: `!` `&` `^` `|` (binding in that order, tightest first), parentheses, `0`, `1`, net names.

use std::ops::Range;

/// Most different nets in one expression: a gate is a table of its nets, and its X is exact.
pub const MAX_EXPR_NETS: usize = 16;

/// Deepest nesting of parentheses and `!`.
const MAX_DEPTH: usize = 200;

/// A Boolean expression with its text, as written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Expr {
    text: Box<str>,
    nets: Vec<Box<str>>,
    code: Vec<Op>,
    repeats: bool,
}

/// One step of a stack machine, in postfix order.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Op {
    /// A constant.
    Const(bool),
    /// A pin, by its number in [`Expr::nets`].
    Pin(u8),
    /// The inverse of the last operand.
    Not,
    /// Both of the last two.
    And,
    /// One of the last two.
    Xor,
    /// At least one of the last two.
    Or,
}

/// What is wrong with an expression, and where in its text (bytes).
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("{what}")]
pub struct ExprError {
    /// The wrong part of the text.
    pub at: Range<usize>,
    /// What is wrong and what would be right.
    pub what: String,
}

impl Expr {
    /// Reads an expression.
    ///
    /// ```
    /// use stillgate::circuit::Expr;
    /// let e = Expr::parse("a & !b | 0").unwrap();
    /// assert_eq!(e.nets().len(), 2);
    /// assert!(e.value(&[true, false]));
    /// assert!(Expr::parse("a &").is_err());
    /// ```
    ///
    /// Errors: syntax, more than [`MAX_EXPR_NETS`] different nets, nesting deeper than 200.
    pub fn parse(text: &str) -> Result<Expr, ExprError> {
        let mut parser = Parser { text, at: 0, nets: Vec::new(), code: Vec::new(), repeats: false };
        parser.level(0, 0)?;
        match parser.peek() {
            None => Ok(Expr { text: text.into(), nets: parser.nets, code: parser.code, repeats: parser.repeats }),
            Some(')') => Err(parser.error("this `)` closes nothing; remove it or add a `(` before")),
            Some(_) => Err(parser.error("expected an operator here: `&`, `^` or `|`")),
        }
    }

    /// The text as written.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// The different nets, in the order of their first appearance: the pins of the gate.
    pub fn nets(&self) -> &[Box<str>] {
        &self.nets
    }

    /// Does a net occur more than once?
    pub fn repeats(&self) -> bool {
        self.repeats
    }

    /// Operands and operators in postfix order: every operator stands behind its operands.
    pub fn code(&self) -> &[Op] {
        &self.code
    }

    /// The value for these pins. Panics if there are fewer than [`Expr::nets`].
    pub fn value(&self, pins: &[bool]) -> bool {
        let mut stack = Vec::with_capacity(8);
        for op in &self.code {
            let value = match op {
                Op::Const(bit) => *bit,
                Op::Pin(pin) => pins[*pin as usize],
                Op::Not => !pop(&mut stack),
                Op::And => pop(&mut stack) & pop(&mut stack),
                Op::Xor => pop(&mut stack) ^ pop(&mut stack),
                Op::Or => pop(&mut stack) | pop(&mut stack),
            };
            stack.push(value);
        }
        pop(&mut stack)
    }
}

fn pop(stack: &mut Vec<bool>) -> bool {
    stack.pop().expect("the parser emits operands before operators")
}

struct Parser<'a> {
    text: &'a str,
    at: usize,
    nets: Vec<Box<str>>,
    code: Vec<Op>,
    repeats: bool,
}

const OPERATORS: [(char, Op); 3] = [('|', Op::Or), ('^', Op::Xor), ('&', Op::And)];

impl Parser<'_> {
    fn peek(&mut self) -> Option<char> {
        let rest = &self.text[self.at..];
        self.at += rest.len() - rest.trim_start().len();
        self.text[self.at..].chars().next()
    }

    fn error(&mut self, what: &str) -> ExprError {
        let end = self.peek().map_or(self.at, |c| self.at + c.len_utf8());
        ExprError { at: self.at.min(self.text.len())..end, what: what.to_string() }
    }

    /// Operands joined by the operator of this level (0 loosest), left to right.
    fn level(&mut self, level: usize, depth: usize) -> Result<(), ExprError> {
        let Some(&(sign, op)) = OPERATORS.get(level) else { return self.operand(depth) };
        self.level(level + 1, depth)?;
        while self.peek() == Some(sign) {
            self.at += sign.len_utf8();
            if self.peek() == Some(sign) {
                return Err(self.error(&format!("write a single `{sign}`")));
            }
            self.level(level + 1, depth)?;
            self.code.push(op);
        }
        Ok(())
    }

    fn operand(&mut self, depth: usize) -> Result<(), ExprError> {
        if depth > MAX_DEPTH {
            return Err(self.error("nested too deeply (200 levels); split the expression into several gates"));
        }
        match self.peek() {
            Some('!') => {
                self.at += 1;
                self.operand(depth + 1)?;
                self.code.push(Op::Not);
                Ok(())
            }
            Some('(') => {
                let open = self.at;
                self.at += 1;
                self.level(0, depth + 1)?;
                match self.peek() {
                    Some(')') => {
                        self.at += 1;
                        Ok(())
                    }
                    None => Err(ExprError { at: open..open + 1, what: "this `(` is never closed; add a `)`".into() }),
                    Some(_) => Err(self.error("expected `)` or an operator here: `&`, `^` or `|`")),
                }
            }
            Some(bit @ ('0' | '1')) => {
                self.at += 1;
                self.code.push(Op::Const(bit == '1'));
                Ok(())
            }
            Some(c) if c.is_alphabetic() || c == '_' => self.net(),
            Some('~') => Err(self.error("write `!` for the inverse")),
            Some(_) => Err(self.error("expected a net name, `!`, `(`, `0` or `1` here")),
            None => Err(self.error("the expression ends too early; expected a net name, `!`, `(`, `0` or `1`")),
        }
    }

    fn net(&mut self) -> Result<(), ExprError> {
        let rest = &self.text[self.at..];
        let part_of_name = |c: char| c.is_alphanumeric() || matches!(c, '_' | '.' | '[' | ']');
        let end = self.at + rest.find(|c| !part_of_name(c)).unwrap_or(rest.len());
        let name = &self.text[self.at..end];
        let pin = match self.nets.iter().position(|net| &**net == name) {
            Some(pin) => {
                self.repeats = true;
                pin
            }
            None if self.nets.len() == MAX_EXPR_NETS => {
                let what = format!("an expression may hold at most {MAX_EXPR_NETS} different nets; split it");
                return Err(ExprError { at: self.at..end, what });
            }
            None => {
                self.nets.push(name.into());
                self.nets.len() - 1
            }
        };
        self.code.push(Op::Pin(pin as u8));
        self.at = end;
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn operators_bind_not_and_xor_or() {
        let e = Expr::parse("a | b ^ c & !d").unwrap();
        for i in 0..16u8 {
            let [a, b, c, d] = [0, 1, 2, 3].map(|k| i >> k & 1 == 1);
            assert_eq!(e.value(&[a, b, c, d]), a | (b ^ (c & !d)), "{i:04b}");
        }
    }

    #[test]
    fn faults_are_placed() {
        for (text, at) in [("a && b", 3..4), ("(a", 0..1), ("a)", 1..2), ("a b", 2..3), ("", 0..0), ("a & ~b", 4..5)] {
            assert_eq!(Expr::parse(text).unwrap_err().at, at, "{text}");
        }
        assert!(Expr::parse(&"!".repeat(100_000)).is_err());
        assert!(Expr::parse(&"(".repeat(100_000)).is_err());
    }
}

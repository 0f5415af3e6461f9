//! A circuit in which expressions and multiplexers are built of several gates.
//!
//! A gate is one delay element however complex its function, so it shows no hazard of its own. Whoever builds it of
//! simple gates gets more: here each operator of an expression in which a net occurs twice is a gate, and a multiplexer
//! is two ANDs, an OR and an inverter. (An expression in which each net occurs once is a tree of gates whose branches
//! share nothing; it can do no more than the one gate can.)

use crate::circuit::{Circuit, Function, GateId, GateSpec, NetId, Op};
use crate::logic::Bits;

/// The circuit of many gates. Nets and gates of the original keep their numbers; the new gates come after them.
#[derive(Clone, Debug)]
pub struct Built {
    /// The circuit, without wires of their own delay.
    pub circuit: Circuit,
    /// Gates in an order in which each comes after every gate that it reads, but for the *original's* feedback nets.
    pub order: Vec<GateId>,
    /// Gates of the original.
    gates: usize,
}

impl Built {
    /// Builds it; `None` if there is no expression and no multiplexer that hides anything.
    ///
    /// ```
    /// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
    /// use stillgate::statics::built::Built;
    /// let mux = GateSpec { name: "out".into(), function: Function::Mux, pins: vec![NetId(0), NetId(1), NetId(2)] };
    /// let circuit = Circuit::new(&["choose", "low", "high"], vec![mux], vec![]).unwrap();
    /// assert_eq!(Built::of(&circuit).unwrap().circuit.gate_count(), 4);
    /// ```
    pub fn of(circuit: &Circuit) -> Option<Built> {
        if !circuit.gates().any(|gate| circuit.function(gate).hides_hazards()) {
            return None;
        }
        let mut parts = Parts { circuit, specs: Vec::new(), next_name: 0 };
        let mut heads = Vec::with_capacity(circuit.gate_count());
        // the new gates of each gate, as a range of `parts.specs`
        let mut own = Vec::with_capacity(circuit.gate_count());
        for gate in circuit.gates() {
            let before = parts.specs.len();
            let (function, pins) = parts.head(gate);
            own.push(before..parts.specs.len());
            heads.push(GateSpec { name: circuit.name(circuit.net_of(gate)).to_string(), function, pins });
        }
        let gates = circuit.gate_count();
        let mut order = Vec::with_capacity(gates + parts.specs.len());
        for gate in circuit.evaluation_order() {
            order.extend(own[gate.index()].clone().map(|part| GateId((gates + part) as u32)));
            order.push(*gate);
        }
        heads.extend(parts.specs);
        let inputs: Vec<&str> = circuit.inputs().map(|net| circuit.name(net)).collect();
        let built =
            Circuit::new(&inputs, heads, Vec::new()).expect("parts of a circuit fit together, their names are new");
        Some(Built { circuit: built, order, gates })
    }

    /// A stable state of the original, with the values of the new nets.
    ///
    /// Panics if the state has fewer nets than the original.
    pub fn state(&self, original: &Bits) -> Bits {
        let mut state = Bits::zeros(self.circuit.net_count());
        for net in 0..self.circuit.input_count() + self.gates {
            state.set(net, original.get(net));
        }
        for gate in self.order.iter().filter(|gate| gate.index() >= self.gates) {
            let value = self.circuit.wants(*gate, |net| state.get(net.index()));
            state.set(self.circuit.net_of(*gate).index(), value);
        }
        state
    }
}

/// New gates in the making.
struct Parts<'a> {
    circuit: &'a Circuit,
    specs: Vec<GateSpec>,
    next_name: usize,
}

impl Parts<'_> {
    fn part(&mut self, function: Function, pins: Vec<NetId>) -> NetId {
        let name = loop {
            let name = format!("_{}", self.next_name);
            self.next_name += 1;
            if self.circuit.net(&name).is_none() {
                break name;
            }
        };
        self.specs.push(GateSpec { name, function, pins });
        NetId((self.circuit.net_count() + self.specs.len() - 1) as u32)
    }

    /// The last gate of what a gate is built of; the others become parts.
    fn head(&mut self, gate: GateId) -> (Function, Vec<NetId>) {
        let (function, pins) = (self.circuit.function(gate), self.circuit.pins(gate));
        match function {
            Function::Mux => {
                let not = self.part(Function::Not, vec![pins[0]]);
                let low = self.two(Function::And, not, pins[1]);
                let high = self.two(Function::And, pins[0], pins[2]);
                let (low, high) = (self.part(low.0, low.1), self.part(high.0, high.1));
                (Function::Or, vec![low, high])
            }
            Function::Expr(expr) if expr.repeats() => {
                let mut stack: Vec<NetId> = Vec::new();
                let mut pop = |stack: &mut Vec<NetId>| stack.pop().expect("operands come before operators");
                let (last, code) = expr.code().split_last().expect("an expression has an operand");
                for op in code {
                    let net = match self.operator(*op, pins, &mut stack, &mut pop) {
                        Ok(pin) => pin,
                        Err((function, pins)) => self.part(function, pins),
                    };
                    stack.push(net);
                }
                match self.operator(*last, pins, &mut stack, &mut pop) {
                    Ok(pin) => (Function::Buf, vec![pin]),
                    Err(gate) => gate,
                }
            }
            _ => (function.clone(), pins.to_vec()),
        }
    }

    /// A pin as it is, or the gate of an operator.
    fn operator(
        &mut self,
        op: Op,
        pins: &[NetId],
        stack: &mut Vec<NetId>,
        pop: &mut impl FnMut(&mut Vec<NetId>) -> NetId,
    ) -> Result<NetId, (Function, Vec<NetId>)> {
        let function = match op {
            Op::Pin(pin) => return Ok(pins[pin as usize]),
            Op::Const(bit) => {
                let text = if bit { "1" } else { "0" };
                let constant = crate::circuit::Expr::parse(text).expect("a constant is an expression");
                return Err((Function::Expr(constant), Vec::new()));
            }
            Op::Not => return Err((Function::Not, vec![pop(stack)])),
            Op::And => Function::And,
            Op::Xor => Function::Xor,
            Op::Or => Function::Or,
        };
        let (b, a) = (pop(stack), pop(stack));
        Err(self.two(function, a, b))
    }

    /// A gate of two pins. Two wires from one net are two delays: a buffer stands for the second.
    fn two(&mut self, function: Function, a: NetId, b: NetId) -> (Function, Vec<NetId>) {
        let b = if a == b { self.part(Function::Buf, vec![b]) } else { b };
        (function, vec![a, b])
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::Expr;

    #[test]
    fn what_is_built_has_the_same_functions() {
        let texts = ["a & b | !a & c", "!(a ^ a & b) | 1 & !c", "a ^ a", "(a | b) & (!a | c) & (b | !c)"];
        for text in texts {
            let expr = Expr::parse(text).unwrap();
            let gates = vec![
                GateSpec { name: "a_hidden".into(), function: Function::Mux, pins: vec![NetId(0), NetId(1), NetId(1)] },
                GateSpec {
                    name: "_0".into(),
                    pins: (0..expr.nets().len() as u32).map(NetId).collect(),
                    function: Function::Expr(expr),
                },
            ];
            let circuit = Circuit::new(&["a", "b", "c"], gates, vec![]).unwrap();
            let built = Built::of(&circuit).unwrap();
            assert_eq!(built.order.len(), built.circuit.gate_count());
            assert!(built.circuit.gates().all(|gate| !built.circuit.function(gate).hides_hazards()), "{text}");
            for row in 0..8usize {
                let mut state = Bits::of((0..5).map(|i| i < 3 && row >> i & 1 == 1));
                for gate in circuit.gates() {
                    state.set(3 + gate.index(), circuit.wants(gate, |net| state.get(net.index())));
                }
                let full = built.state(&state);
                for gate in built.circuit.gates() {
                    let wanted = built.circuit.wants(gate, |net| full.get(net.index()));
                    assert_eq!(full.get(built.circuit.net_of(gate).index()), wanted, "{text} row {row}");
                }
            }
        }
    }
}

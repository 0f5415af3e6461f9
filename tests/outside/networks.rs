//! Circuits to test with, and their stable states by trying everything.

use stillgate::circuit::{Circuit, Expr, Function, GateSpec, NetId};
use stillgate::logic::Bits;

/// A circuit from `(net, function, nets read)`.
pub fn circuit(inputs: &[&str], gates: &[(&str, Function, &[&str])]) -> Circuit {
    let own = |pins: &[&str]| pins.iter().map(|pin| pin.to_string()).collect();
    let gates: Vec<_> =
        gates.iter().map(|(name, function, pins)| (name.to_string(), function.clone(), own(pins))).collect();
    owned(inputs, &gates)
}

/// The D flip-flop of six NANDs, its gates and nets prefixed.
pub fn six_nand_flip_flop(prefix: &str, clock: &str, data: &str) -> Vec<(String, Function, Vec<String>)> {
    let own = |name: &str| format!("{prefix}{name}");
    let nand = |name: &str, pins: Vec<String>| (own(name), Function::Nand, pins);
    vec![
        nand("n1", vec![own("n4"), own("n2")]),
        nand("n2", vec![own("n1"), clock.into()]),
        nand("n3", vec![own("n2"), clock.into(), own("n4")]),
        nand("n4", vec![own("n3"), data.into()]),
        nand("q", vec![own("n2"), own("qb")]),
        nand("qb", vec![own("n3"), own("q")]),
    ]
}

/// Dividers by two, each clocked by the one before; the first by the input `c`.
pub fn divider_chain(stages: usize) -> Circuit {
    let mut gates = Vec::new();
    for stage in 0..stages {
        let clock = if stage == 0 { "c".to_string() } else { format!("s{}q", stage - 1) };
        gates.extend(six_nand_flip_flop(&format!("s{stage}"), &clock, &format!("s{stage}qb")));
    }
    owned(&["c"], &gates)
}

/// A circuit from owned names.
pub fn owned(inputs: &[&str], gates: &[(String, Function, Vec<String>)]) -> Circuit {
    let number: std::collections::HashMap<&str, u32> =
        inputs.iter().copied().chain(gates.iter().map(|gate| gate.0.as_str())).zip(0..).collect();
    let specs = gates
        .iter()
        .map(|(name, function, pins)| GateSpec {
            name: name.clone(),
            function: function.clone(),
            pins: pins.iter().map(|pin| NetId(number[pin.as_str()])).collect(),
        })
        .collect();
    Circuit::new(inputs, specs, vec![]).unwrap()
}

/// The ISCAS-85 circuit c17: six NANDs, as printed in many places.
pub fn c17() -> Circuit {
    use Function::Nand;
    circuit(
        &["n1", "n2", "n3", "n6", "n7"],
        &[
            ("n10", Nand, &["n1", "n3"]),
            ("n11", Nand, &["n3", "n6"]),
            ("n16", Nand, &["n2", "n11"]),
            ("n19", Nand, &["n11", "n7"]),
            ("n22", Nand, &["n10", "n16"]),
            ("n23", Nand, &["n16", "n19"]),
        ],
    )
}

/// Every stable state, by trying all values of all nets; net 0 is the highest digit, so they come in lexicographic order.
pub fn stable_by_trying(circuit: &Circuit) -> Vec<Vec<bool>> {
    let nets = circuit.net_count();
    (0..1u64 << nets)
        .map(|row| (0..nets).map(|net| row >> (nets - 1 - net) & 1 == 1).collect::<Vec<bool>>())
        .filter(|state| {
            circuit.gates().all(|gate| {
                let pins: Vec<bool> = circuit.pins(gate).iter().map(|net| state[net.index()]).collect();
                circuit.function(gate).value(&pins) == state[circuit.net_of(gate).index()]
            })
        })
        .collect()
}

/// The values of all nets.
pub fn values(circuit: &Circuit, state: &Bits) -> Vec<bool> {
    circuit.nets().map(|net| state.get(net.index())).collect()
}

/// A state of letters, for messages and tables.
pub fn letters(values: &[bool]) -> String {
    values.iter().map(|bit| if *bit { '1' } else { '0' }).collect()
}

/// Numbers that look random and are the same in every run (xorshift).
pub struct Draw(pub u64);

impl Draw {
    pub fn below(&mut self, bound: usize) -> usize {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as usize % bound
    }

    /// A random network: every kind of function, wired to any nets, to later ones and themselves, too. With `local`, only
    /// to inputs and to gates at most that far away.
    pub fn network(&mut self, inputs: usize, gates: usize, local: usize) -> Circuit {
        let specs = (0..gates)
            .map(|gate| {
                let function = match self.below(11) {
                    10 => Function::Expr(Expr::parse("(a & !b | c) ^ (b & d)").unwrap()),
                    listed => Function::LISTED[listed].clone(),
                };
                let pins = match function {
                    Function::Buf | Function::Not => 1,
                    Function::Mux => 3,
                    Function::Majority => 3 + 2 * self.below(2),
                    Function::Expr(_) => 4,
                    // sometimes more than a one-word table takes
                    _ if self.below(6) == 0 => 7 + self.below(3),
                    _ => 2 + self.below(3),
                };
                let pins = (0..pins)
                    .map(|_| {
                        if self.below(3) == 0 && inputs > 0 {
                            return NetId(self.below(inputs) as u32);
                        }
                        let (from, to) = (gate.saturating_sub(local), (gate + local + 1).min(gates));
                        NetId((inputs + from + self.below(to - from)) as u32)
                    })
                    .collect();
                GateSpec { name: format!("g{gate}"), function, pins }
            })
            .collect();
        let names: Vec<String> = (0..inputs).map(|i| format!("i{i}")).collect();
        Circuit::new(&names, specs, vec![]).unwrap()
    }
}

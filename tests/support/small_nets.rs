//! Small networks: all of them up to a size, random ones, several put together, and smaller ones of a failing one.

use std::fmt;

use rand::RngExt;
use rand::seq::IndexedRandom;
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::{Circuit, Expr, Function, GateSpec, NetId};

/// A network on paper. Nets are numbers, inputs first.
#[derive(Clone, PartialEq)]
pub struct SmallNet {
    pub inputs: usize,
    pub gates: Vec<(Function, Vec<usize>)>,
}

/// All functions of two pins; with both pins on one net they are a buffer, an inverter and the constants, too.
pub const OF_TWO: [Function; 6] =
    [Function::And, Function::Or, Function::Nand, Function::Nor, Function::Xor, Function::Xnor];

impl SmallNet {
    pub fn circuit(&self) -> Circuit {
        let names: Vec<String> = (0..self.inputs).map(|net| self.name(net)).collect();
        let spec = |(number, (function, pins)): (usize, &(Function, Vec<usize>))| GateSpec {
            name: self.name(self.inputs + number),
            function: function.clone(),
            pins: pins.iter().map(|net| NetId(*net as u32)).collect(),
        };
        Circuit::new(&names, self.gates.iter().enumerate().map(spec).collect(), vec![]).unwrap()
    }

    fn name(&self, net: usize) -> String {
        if net < self.inputs { format!("i{net}") } else { format!("g{}", net - self.inputs) }
    }

    fn nets(&self) -> usize {
        self.inputs + self.gates.len()
    }

    /// A network of any functions, of 1 to 4 pins, wired to any nets, to later ones and themselves, too.
    pub fn random(rng: &mut ChaCha8Rng, inputs: usize, gates: usize) -> SmallNet {
        let nets = inputs + gates;
        let gate = |_| {
            let function = match rng.random_range(0..12) {
                11 => Function::Expr(Expr::parse("a & !b | b & c").unwrap()),
                // small gates of both kinds make the liveliest loops
                10 => Function::Nor,
                listed => Function::LISTED[listed].clone(),
            };
            let pins = match function {
                Function::Buf | Function::Not => 1,
                Function::Mux | Function::Majority | Function::Expr(_) => 3,
                _ => *[2, 2, 2, 3, 4].choose(rng).unwrap(),
            };
            // expressions have each net once
            let mut own: Vec<usize> = Vec::new();
            while own.len() < pins {
                let net = if rng.random_bool(0.25) { rng.random_range(0..inputs) } else { rng.random_range(0..nets) };
                if !matches!(function, Function::Expr(_)) || !own.contains(&net) || nets < 3 {
                    own.push(net);
                }
            }
            (function, own)
        };
        SmallNet { inputs, gates: (0..gates).map(gate).collect() }
    }

    /// A network of gates with two pins.
    pub fn random_of_two(rng: &mut ChaCha8Rng, inputs: usize, gates: usize) -> SmallNet {
        let nets = inputs + gates;
        let gate = |_| {
            let function = OF_TWO.choose(rng).unwrap().clone();
            (function, vec![rng.random_range(0..nets), rng.random_range(0..nets)])
        };
        SmallNet { inputs, gates: (0..gates).map(gate).collect() }
    }

    /// Puts a network beside this one; its inputs are these nets of this one.
    pub fn append(&mut self, part: &SmallNet, sources: &[usize]) {
        assert_eq!(sources.len(), part.inputs);
        let offset = self.nets();
        for (function, pins) in &part.gates {
            let place = |net: &usize| if *net < part.inputs { sources[*net] } else { offset + net - part.inputs };
            self.gates.push((function.clone(), pins.iter().map(place).collect()));
        }
    }

    /// Networks with one gate less, whose readers read another net instead, or with one gate of fewer pins.
    pub fn smaller(&self) -> Vec<SmallNet> {
        let mut smaller = Vec::new();
        for gone in self.inputs..self.nets() {
            for instead in (0..self.nets()).filter(|net| *net != gone) {
                let place = |net: &usize| {
                    let net = if *net == gone { instead } else { *net };
                    if net > gone { net - 1 } else { net }
                };
                let mut gates = self.gates.clone();
                gates.remove(gone - self.inputs);
                for (_, pins) in &mut gates {
                    *pins = pins.iter().map(place).collect();
                }
                smaller.push(SmallNet { inputs: self.inputs, gates });
            }
        }
        for (number, (_, pins)) in self.gates.iter().enumerate() {
            let mut simpler: Vec<(Function, Vec<usize>)> = Vec::new();
            for net in pins.iter().filter(|_| pins.len() > 1) {
                simpler.extend([Function::Buf, Function::Not].map(|function| (function, vec![*net])));
            }
            for (at, a) in pins.iter().enumerate().filter(|_| pins.len() > 2) {
                for b in &pins[at + 1..] {
                    simpler.extend(OF_TWO.map(|function| (function, vec![*a, *b])));
                }
            }
            for gate in simpler {
                let mut gates = self.gates.clone();
                gates[number] = gate;
                smaller.push(SmallNet { inputs: self.inputs, gates });
            }
        }
        smaller
    }
}

impl fmt::Display for SmallNet {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for (number, (function, pins)) in self.gates.iter().enumerate() {
            let pins: Vec<String> = pins.iter().map(|net| self.name(*net)).collect();
            let function = match function {
                Function::Expr(expr) => expr.text(),
                listed => listed.name(),
            };
            writeln!(f, "  g{number} = {function}({})", pins.join(", "))?;
        }
        Ok(())
    }
}

/// Calls `check` with every network of `gates` two-pin gates. Both pins of a gate may read one net; the order of pins
/// does not matter.
pub fn every_network(inputs: usize, gates: usize, check: &mut impl FnMut(&SmallNet)) {
    let nets = inputs + gates;
    let mut kinds = Vec::new();
    for function in OF_TWO {
        for a in 0..nets {
            kinds.extend((a..nets).map(|b| (function.clone(), vec![a, b])));
        }
    }
    for mut choice in 0..kinds.len().pow(gates as u32) {
        let mut pick = |_| {
            let kind = kinds[choice % kinds.len()].clone();
            choice /= kinds.len();
            kind
        };
        check(&SmallNet { inputs, gates: (0..gates).map(&mut pick).collect() });
    }
}

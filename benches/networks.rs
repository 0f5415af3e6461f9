//! Networks of any size with a known answer, for the benchmarks, for `examples/growth/` and for the tests.

use stillgate::circuit::{Circuit, Function, GateSpec, NetId};

/// A list of gates that may be named before they are there.
struct Drawing {
    inputs: Vec<String>,
    gates: Vec<(String, Function, Vec<String>)>,
}

impl Drawing {
    fn new(inputs: Vec<String>) -> Drawing {
        Drawing { inputs, gates: Vec::new() }
    }

    fn gate(&mut self, name: String, function: Function, pins: Vec<String>) {
        self.gates.push((name, function, pins));
    }

    fn finish(self) -> Circuit {
        let names = self.inputs.iter().chain(self.gates.iter().map(|gate| &gate.0));
        let number: std::collections::HashMap<&str, u32> = names.map(String::as_str).zip(0..).collect();
        let pins = |pins: &[String]| pins.iter().map(|pin| NetId(number[pin.as_str()])).collect();
        let gates = self.gates.iter().map(|(name, function, read)| GateSpec {
            name: name.clone(),
            function: function.clone(),
            pins: pins(read),
        });
        Circuit::new(&self.inputs, gates.collect(), Vec::new()).expect("the drawing is a circuit")
    }
}

/// A chain of dividers by two, each an edge-triggered flip-flop of six NANDs that reads its inverted output, clocked by
/// the output of the one before; the first by the input `c`. Stage k has the nets `{k}.n1` to `{k}.n4`, `{k}.q`, `{k}.qn`.
pub fn dividers(stages: usize) -> Circuit {
    let mut drawing = Drawing::new(vec!["c".into()]);
    for stage in 0..stages {
        let n = |part: &str| format!("s{stage}.{part}");
        let clock = if stage == 0 { "c".to_string() } else { format!("s{}.q", stage - 1) };
        let mut nand = |out: &str, pins: Vec<String>| drawing.gate(n(out), Function::Nand, pins);
        nand("n1", vec![n("n4"), n("n2")]);
        nand("n2", vec![n("n1"), clock.clone()]);
        nand("n3", vec![n("n2"), clock, n("n4")]);
        nand("n4", vec![n("n3"), n("qn")]);
        nand("q", vec![n("n2"), n("qn")]);
        nand("qn", vec![n("n3"), n("q")]);
    }
    drawing.finish()
}

/// Address bits for a side of this many lines.
pub fn address_bits(side: usize) -> usize {
    side.next_power_of_two().trailing_zeros() as usize
}

/// A square of gated latches (four NANDs each) with decoded rows and columns. Inputs: row address `r0`…, column address
/// `k0`… (bit 0 first), data `d`, write `w`. Latch `q{i}.{j}` follows `d` while `w` is 1 and its row and column are
/// addressed; `out` shows the latch that is addressed.
pub fn array(side: usize) -> Circuit {
    let bits = address_bits(side);
    let address = |line: &str| (0..bits).map(|bit| format!("{line}{bit}")).collect::<Vec<_>>();
    let mut drawing = Drawing::new([address("r"), address("k"), vec!["d".into(), "w".into()]].concat());
    let all = |pins: &[String]| if pins.len() == 1 { Function::Buf } else { Function::And };
    drawing.gate("dn".into(), Function::Not, vec!["d".into()]);
    for line in ["r", "k"] {
        for bit in 0..bits {
            drawing.gate(format!("{line}n{bit}"), Function::Not, vec![format!("{line}{bit}")]);
        }
        for at in 0..side {
            let mut pins: Vec<String> = (0..bits)
                .map(|bit| if at >> bit & 1 == 1 { format!("{line}{bit}") } else { format!("{line}n{bit}") })
                .collect();
            if line == "r" {
                drawing.gate(format!("row{at}"), all(&pins), pins.clone());
                pins.push("w".into());
                drawing.gate(format!("write{at}"), Function::And, pins);
            } else {
                drawing.gate(format!("column{at}"), all(&pins), pins);
            }
        }
    }
    for i in 0..side {
        for j in 0..side {
            let n = |part: &str| format!("{part}{i}.{j}");
            drawing.gate(n("e"), Function::And, vec![format!("write{i}"), format!("column{j}")]);
            drawing.gate(n("s"), Function::Nand, vec!["d".into(), n("e")]);
            drawing.gate(n("t"), Function::Nand, vec!["dn".into(), n("e")]);
            drawing.gate(n("q"), Function::Nand, vec![n("s"), n("qn")]);
            drawing.gate(n("qn"), Function::Nand, vec![n("t"), n("q")]);
            drawing.gate(n("a"), Function::And, vec![format!("row{i}"), n("q")]);
        }
    }
    for j in 0..side {
        drawing.gate(format!("bus{j}"), Function::Or, (0..side).map(|i| format!("a{i}.{j}")).collect());
        drawing.gate(format!("b{j}"), Function::And, vec![format!("bus{j}"), format!("column{j}")]);
    }
    drawing.gate("out".into(), Function::Or, (0..side).map(|j| format!("b{j}")).collect());
    drawing.finish()
}

/// How a random network is wired.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Wiring {
    /// A gate reads gates anywhere in the line.
    Scattered,
    /// A gate reads gates at most this many places away.
    Within(usize),
}

/// A random network. The gates stand in a line. Each is a nand, nor, and, or, not or xor, all equally likely; all but
/// not have two, three or four pins, equally likely. A pin reads an input in one case of five; in `back` cases of a
/// thousand a gate from its own place in the line on; else a gate before it (an input if there is none). Inside these
/// choices every net is equally likely. The same seed gives the same network everywhere.
pub fn random(wiring: Wiring, inputs: usize, gates: usize, back: usize, seed: u64) -> Circuit {
    let mut draw = Draw::new(seed);
    let mut specs = Vec::with_capacity(gates);
    for at in 0..gates {
        use Function::{And, Nand, Nor, Not, Or, Xor};
        let function = [Nand, Nor, And, Or, Not, Xor][draw.below(6)].clone();
        let pins = if function == Not { 1 } else { 2 + draw.below(3) };
        let (first, end) = match wiring {
            Wiring::Scattered => (0, gates),
            Wiring::Within(reach) => (at.saturating_sub(reach), (at + reach + 1).min(gates)),
        };
        let pin = |draw: &mut Draw| {
            let (from_input, goes_back) = (draw.below(5) == 0, draw.below(1000) < back);
            let net = if from_input || (!goes_back && at == first) {
                draw.below(inputs)
            } else if goes_back {
                inputs + at + draw.below(end - at)
            } else {
                inputs + first + draw.below(at - first)
            };
            NetId(net as u32)
        };
        let pins = (0..pins).map(|_| pin(&mut draw)).collect();
        specs.push(GateSpec { name: format!("g{at}"), function, pins });
    }
    let names: Vec<String> = (0..inputs).map(|at| format!("i{at}")).collect();
    Circuit::new(&names, specs, Vec::new()).expect("every pin is a net")
}

/// Numbers that look random and are the same everywhere (splitmix64: Steele, Lea, Flood 2014).
pub struct Draw(u64);

impl Draw {
    pub fn new(seed: u64) -> Draw {
        Draw(seed)
    }

    pub fn below(&mut self, bound: usize) -> usize {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut mixed = self.0;
        mixed = (mixed ^ mixed >> 30).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        mixed = (mixed ^ mixed >> 27).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((mixed ^ mixed >> 31) % bound as u64) as usize
    }
}

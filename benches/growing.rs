//! Circuits of growing size for the proof, each with one step or more, as scenarios.

use std::fmt::Write as _;

use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::proof::Plant;
use stillgate::reader;

/// A family of circuits.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Family {
    /// Latches of two NORs that have nothing to do with each other, both inputs of each let go at once.
    Apart,
    /// Latches each of which sets the next.
    Setting,
    /// Latches set at once, and an AND of their outputs.
    Joined,
    /// Gated latches of four NANDs in a chain that hold 0 and 1 by turns, all opened at once: a 1 runs through.
    Chained,
    /// Dividers by two in a chain, each a flip-flop of six NANDs; 64 edges of their clock, each at rest.
    Dividers,
    /// A ring of C-elements with one inversion, let go: it runs for ever.
    Ring,
}

impl Family {
    /// All of them.
    pub const ALL: [Family; 6] =
        [Family::Apart, Family::Setting, Family::Joined, Family::Chained, Family::Dividers, Family::Ring];

    /// The word for it.
    pub fn word(self) -> &'static str {
        match self {
            Family::Apart => "apart",
            Family::Setting => "setting",
            Family::Joined => "joined",
            Family::Chained => "chained",
            Family::Dividers => "dividers",
            Family::Ring => "ring",
        }
    }

    /// The scenario of this size. All delays are in ns.
    pub fn text(self, size: usize) -> String {
        let mut gates = String::new();
        let mut gate = |name: &str, function: &str, pins: &[String], delay: [u32; 2]| {
            let pins: Vec<String> = pins.iter().map(|pin| format!("\"{pin}\"")).collect();
            let [least, most] = delay;
            writeln!(gates, "{name} = {{ {function} = [{}], delay = [{least}, {most}] }}", pins.join(", "))
                .expect("a string takes it");
        };
        let n = |letter: &str, number: usize| format!("{letter}{number}");
        let (mut inputs, mut initial, mut steps) =
            ("go = 0", String::new(), "[[steps]]\nset = { go = 1 }\n".to_string());
        match self {
            Family::Apart => {
                (inputs, steps) = ("go = 1", steps.replace("go = 1", "go = 0"));
                for k in 0..size {
                    gate(&n("q", k), "nor", &["go".into(), n("p", k)], [4, 8]);
                    gate(&n("p", k), "nor", &["go".into(), n("q", k)], [5, 9]);
                }
            }
            Family::Setting => {
                inputs = "go = 0\nclear = 0";
                for k in 0..size {
                    let set = if k == 0 { "go".into() } else { n("q", k - 1) };
                    gate(&n("q", k), "nor", &["clear".into(), n("p", k)], [4, 8]);
                    gate(&n("p", k), "nor", &[set, n("q", k)], [5, 9]);
                    writeln!(initial, "q{k} = 0").expect("a string takes it");
                }
            }
            Family::Joined => {
                inputs = "go = 0\nclear = 0";
                for k in 0..size {
                    gate(&n("q", k), "nor", &["clear".into(), n("p", k)], [4, 8]);
                    gate(&n("p", k), "nor", &["go".into(), n("q", k)], [5, 9]);
                    writeln!(initial, "q{k} = 0").expect("a string takes it");
                }
                let all: Vec<String> = (0..size).map(|k| n("q", k)).collect();
                gate("all", if size == 1 { "buf" } else { "and" }, &all, [3, 6]);
            }
            Family::Chained => {
                inputs = "go = 0\nd = 1";
                for k in 0..size {
                    let data = if k == 0 { "d".into() } else { n("q", k - 1) };
                    gate(&n("s", k), "nand", &[data, "go".into()], [3, 5]);
                    gate(&n("r", k), "nand", &[n("s", k), "go".into()], [3, 6]);
                    gate(&n("q", k), "nand", &[n("s", k), n("p", k)], [3, 6]);
                    gate(&n("p", k), "nand", &[n("r", k), n("q", k)], [3, 6]);
                    writeln!(initial, "q{k} = {}", k % 2).expect("a string takes it");
                }
            }
            Family::Dividers => {
                for k in 0..size {
                    let clock = if k == 0 { "go".to_string() } else { n("q", k - 1) };
                    gate(&n("a", k), "nand", &[n("d", k), n("b", k)], [4, 6]);
                    gate(&n("b", k), "nand", &[n("a", k), clock.clone()], [4, 6]);
                    gate(&n("c", k), "nand", &[n("b", k), clock, n("d", k)], [4, 6]);
                    gate(&n("d", k), "nand", &[n("c", k), n("p", k)], [4, 6]);
                    gate(&n("q", k), "nand", &[n("b", k), n("p", k)], [4, 6]);
                    gate(&n("p", k), "nand", &[n("c", k), n("q", k)], [4, 6]);
                    writeln!(initial, "q{k} = 0").expect("a string takes it");
                }
                steps = (1..=64).map(|edge| format!("[[steps]]\nset = {{ go = {} }}\n", edge % 2)).collect();
            }
            Family::Ring => {
                gate("into", "and", &["back".into(), "go".into()], [1, 2]);
                gate("back", "not", &[n("c", size - 1)], [1, 2]);
                for k in 0..size {
                    let before = if k == 0 { "into".into() } else { n("c", k - 1) };
                    let after = if k + 1 == size { n("c", 0) } else { n("e", k + 1) };
                    gate(&n("c", k), "majority", &[n("c", k), before, after], [3, 4]);
                    if k > 0 {
                        gate(&n("e", k), "not", &[n("c", k)], [1, 2]);
                    }
                    writeln!(initial, "c{k} = 0").expect("a string takes it");
                }
            }
        }
        format!("[inputs]\n{inputs}\n[initial]\n{initial}[gates]\n{gates}{steps}")
    }

    /// What is explored: one plant with its start for each part of the circuit.
    pub fn plants(self, size: usize) -> Vec<(Plant, Vec<bool>)> {
        let scenario = reader::read(&self.text(size), "growing").unwrap_or_else(|faults| panic!("{faults}")).scenario;
        let program = Program::new(&scenario, &Control::default()).expect("it has a start");
        let start = program.start().expect("it begins at rest").clone();
        let circuit = &*scenario.circuit;
        let mut parts: Vec<Vec<NetId>> = vec![Vec::new(); circuit.block_count()];
        for gate in circuit.gates() {
            parts[circuit.block(gate) as usize].push(circuit.net_of(gate));
        }
        let plant = |nets: &Vec<NetId>| {
            let plant = Plant::of(&scenario, nets, &[]).expect("it is covered");
            let start = plant.nets.iter().map(|net| start.ones.get(net.index())).collect();
            (plant, start)
        };
        parts.iter().map(plant).collect()
    }
}

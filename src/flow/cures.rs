//! Terms that cover static logic hazards.
//!
//! A static-1 hazard goes if one product is 1 all the way: it must hold at both ends of the change and may not read an
//! input that changes. The smallest choice is all other sources of the net at their values; literals fall away as long as
//! the product stays within the function, which leaves a prime implicant (the consensus term of the textbooks; Huffman
//! 1957, Unger 1969). Static-0 is the dual, with a sum. Nothing is offered that was not checked in a network with the
//! term in it.

use std::rc::Rc;

use rustc_hash::{FxHashMap, FxHashSet};

use super::{Cure, FlowTable};
use crate::circuit::{Circuit, Compiled, Expr, Function, GateId, GateSpec, NetId, Op};
use crate::logic::{Bits, Shape};
use crate::statics::built::Built;
use crate::statics::transients::{Open, Transients, Verdict};

/// Most sources of a net for which a cure is looked for: its function is a table of them.
pub const MAX_SOURCES: usize = 16;

/// Most gates of its cone.
pub const MAX_GATES: usize = 4096;

/// Most steps of the search for cures in all: values of gates at 64 places at once, words of gates.
pub const MAX_WORK: u64 = 1 << 24;

/// Largest majority gate that is written as an expression.
const MAX_MAJORITY: usize = 5;

/// Looks for cures, and remembers what it knows of each net.
pub(super) struct Cures<'a> {
    circuit: &'a Circuit,
    plain: &'a Open<'a>,
    built: Option<&'a Open<'a>>,
    table: &'a FlowTable,
    /// By net and whether expressions are built of several gates.
    known: FxHashMap<(NetId, bool), Option<Rc<Cone>>>,
    work: u64,
    /// Work ran out, so that there may be more cures.
    pub exhausted: bool,
}

/// The open cone of one net as a circuit of its own; the sources are its inputs, the net's gate is the last.
struct Cone {
    sources: Vec<NetId>,
    specs: Vec<GateSpec>,
    /// The number in the cone of each net of the circuit that is in it.
    place: FxHashMap<NetId, NetId>,
    function: Vec<u64>,
    /// The changes of the flow table as the sources see them: values before, sources that move.
    changes: Vec<(u32, u32)>,
}

impl<'a> Cures<'a> {
    pub fn new(circuit: &'a Circuit, plain: &'a Open<'a>, built: Option<&'a Open<'a>>, table: &'a FlowTable) -> Self {
        Cures { circuit, plain, built, table, known: FxHashMap::default(), work: 0, exhausted: false }
    }

    /// A cure of the static logic hazard that a net has when these inputs change from this state, if there is one.
    pub fn of(&mut self, net: NetId, built: bool, state: &Bits, moving: &[NetId], shape: Shape) -> Option<Cure> {
        if self.exhausted {
            return None;
        }
        let cone = match self.known.get(&(net, built)) {
            Some(cone) => cone.clone(),
            None => {
                let cone = self.cone(net, built).map(Rc::new);
                self.known.insert((net, built), cone.clone());
                cone
            }
        }?;
        let value = shape == Shape::Static1;
        let (row, moves) = cone.see(state, |net| moving.contains(&net));
        if cone.never_leaves(net, value) {
            return None;
        }
        let (held, steps) = cone.prime(row, moves, value);
        self.spend(steps)?;
        let held = held?;
        let literals: Vec<(NetId, bool)> = held.iter().map(|&at| (cone.sources[at], row >> at & 1 == 1)).collect();
        let cure = Cure { expression: self.written(net, value, &literals)?, literals };
        self.holds(&cone, built, value, &cure, (row, moves)).map(|()| cure)
    }

    fn cone(&mut self, net: NetId, built: bool) -> Option<Cone> {
        let open = if built { self.built? } else { self.plain };
        let circuit = open.circuit;
        let mut gates = vec![circuit.driver(net)?];
        let (mut sources, mut seen, mut next) = (Vec::new(), FxHashSet::default(), 0);
        while let Some(gate) = gates.get(next) {
            next += 1;
            for (source, _) in circuit.sources(*gate) {
                if !seen.insert(*source) {
                    continue;
                }
                match circuit.driver(*source) {
                    Some(driver) if !open.is_source(*source) => gates.push(driver),
                    _ => sources.push(*source),
                }
            }
            if sources.len() > MAX_SOURCES || gates.len() > MAX_GATES {
                return None;
            }
        }
        sources.sort_unstable();
        gates.sort_unstable_by_key(|gate| open.rank(*gate));
        let mut place: FxHashMap<NetId, NetId> = sources.iter().copied().zip((0..).map(NetId)).collect();
        for (at, gate) in gates.iter().enumerate() {
            // the net itself may be a source, too
            place.entry(circuit.net_of(*gate)).or_insert(NetId((sources.len() + at) as u32));
        }
        let specs: Vec<GateSpec> = gates
            .iter()
            .enumerate()
            .map(|(at, gate)| GateSpec {
                name: gate_name(at),
                function: circuit.function(*gate).clone(),
                pins: circuit.pins(*gate).iter().map(|pin| place[pin]).collect(),
            })
            .collect();
        let mut cone = Cone { sources, specs, place, function: Vec::new(), changes: Vec::new() };
        let own = cone.circuit(cone.specs.clone());
        let top = last_net(&own);
        cone.function = self.table(&own, top)?;
        let mut changes: FxHashSet<(u32, u32)> = FxHashSet::default();
        for transition in self.table.steps.iter().chain(&self.table.single) {
            let state = &self.table.states[transition.from as usize].values;
            self.spend(1 + cone.sources.len() as u64)?;
            let moves = |net: NetId| transition.change.moving(state).any(|(input, _)| input == net);
            let (row, moves) = cone.see(state, moves);
            if moves != 0 {
                changes.insert((row, moves));
            }
        }
        cone.changes = changes.into_iter().collect();
        cone.changes.sort_unstable();
        Some(cone)
    }

    /// Counts work; `None` once it is too much.
    fn spend(&mut self, steps: u64) -> Option<()> {
        self.work += steps;
        self.exhausted |= self.work > MAX_WORK;
        (!self.exhausted).then_some(())
    }

    fn table(&mut self, circuit: &Circuit, net: NetId) -> Option<Vec<u64>> {
        self.spend(table_work(circuit))?;
        Some(table(circuit, net))
    }

    /// Does the net of a trial change no more than it must?
    fn clean(&mut self, trial: &mut Trial<'_>, (row, moves): (u32, u32)) -> Option<bool> {
        let before = trial.transients.work();
        let verdict = trial.verdict(row, moves, before + (MAX_WORK - self.work));
        self.spend(trial.transients.work() - before + trial.circuit.gate_count() as u64)?;
        Some(verdict == Some(Verdict::Clean))
    }

    /// Four things are checked in a network with the term built in: the function is the same; the net is clean for this
    /// change and its opposite; it is still clean for every change of the flow table for which it was; and the same of a
    /// network with the expression.
    fn holds(&mut self, cone: &Cone, built: bool, value: bool, cure: &Cure, (row, moves): (u32, u32)) -> Option<()> {
        let mut changes = vec![(row, moves), (row ^ moves, moves)];
        let own = cone.circuit(cone.specs.clone());
        let open = Open::of(&own);
        let mut trial = Trial { top: last_net(&own), transients: Transients::new(&open), circuit: &own };
        self.spend(cone.changes.len() as u64)?;
        for change in cone.changes.iter().filter(|change| cone.term_moves(cure, **change)) {
            if self.clean(&mut trial, *change)? {
                changes.push(*change);
            }
        }
        let with_term = cone.circuit(cone.with_term(value, cure));
        self.holds_in(cone, &with_term, last_net(&with_term), &changes)?;
        let written = cone.circuit(cone.with_expression(self.circuit, cure)?);
        let parts = if built { Built::of(&written) } else { None };
        let whole = parts.as_ref().map_or(&written, |parts| &parts.circuit);
        self.holds_in(cone, whole, last_net(&written), &changes)
    }

    fn holds_in(&mut self, cone: &Cone, circuit: &Circuit, top: NetId, changes: &[(u32, u32)]) -> Option<()> {
        if self.table(circuit, top)? != cone.function {
            return None;
        }
        let open = Open::of(circuit);
        let mut trial = Trial { top, transients: Transients::new(&open), circuit };
        for change in changes {
            self.clean(&mut trial, *change)?.then_some(())?;
        }
        Some(())
    }

    /// The net's own function with the term, as a scenario says it; `None` if it holds too many nets.
    fn written(&self, net: NetId, value: bool, literals: &[(NetId, bool)]) -> Option<String> {
        let (own, binding) = own_function(self.circuit, self.circuit.driver(net)?)?;
        let name =
            |inverted: bool, net: NetId| format!("{}{}", if inverted { "!" } else { "" }, self.circuit.name(net));
        let text = if value {
            let product: Vec<String> = literals.iter().map(|(net, bit)| name(!bit, *net)).collect();
            format!("{own} | {}", product.join(" & "))
        } else {
            let sum: Vec<String> = literals.iter().map(|(net, bit)| name(*bit, *net)).collect();
            let sum = if sum.len() == 1 { sum.concat() } else { format!("({})", sum.join(" | ")) };
            let own = if binding < Binding::And { format!("({own})") } else { own };
            format!("{own} & {sum}")
        };
        Expr::parse(&text).is_ok().then_some(text)
    }
}

/// The net of the last gate.
fn last_net(circuit: &Circuit) -> NetId {
    NetId(circuit.net_count() as u32 - 1)
}

fn gate_name(at: usize) -> String {
    format!("gate{at}")
}

impl Cone {
    fn circuit(&self, specs: Vec<GateSpec>) -> Circuit {
        let inputs: Vec<String> = (0..self.sources.len()).map(|at| format!("source{at}")).collect();
        Circuit::new(&inputs, specs, Vec::new()).expect("a cone of a circuit is a circuit, its names are numbers")
    }

    /// Values of the sources in a state, and which of them move.
    fn see(&self, state: &Bits, moves: impl Fn(NetId) -> bool) -> (u32, u32) {
        let bits = |of: &dyn Fn(NetId) -> bool| {
            self.sources.iter().enumerate().fold(0, |bits, (at, net)| bits | u32::from(of(*net)) << at)
        };
        (bits(&|net| state.get(net.index())), bits(&moves))
    }

    /// Does the function of a feedback net never ask it to leave this value? If it still takes the other in some stable
    /// state, what leads there is the pulse itself (where the delay of the loop is decides), and must not be covered.
    fn never_leaves(&self, net: NetId, value: bool) -> bool {
        let Some(own) = self.sources.iter().position(|source| *source == net) else { return false };
        let value_at = |row: usize| self.function[row >> 6] >> (row & 63) & 1 == 1;
        (0..1usize << self.sources.len()).filter(|row| (row >> own & 1 == 1) == value).all(|row| value_at(row) == value)
    }

    /// The sources that have to hold their values of `row` for the function to have this value; none that moves.
    /// Beside them the values that were looked at.
    fn prime(&self, row: u32, moves: u32, value: bool) -> (Option<Vec<usize>>, u64) {
        let all = (1u32 << self.sources.len()) - 1;
        let mut held = all & !moves;
        let mut steps = 0;
        let mut within = |held: u32| {
            let free = all & !held;
            let mut part = free;
            loop {
                steps += 1;
                let at = (row & held | part) as usize;
                if (self.function[at >> 6] >> (at & 63) & 1 == 1) != value {
                    return false;
                }
                if part == 0 {
                    return true;
                }
                part = (part - 1) & free;
            }
        };
        if !within(held) {
            return (None, steps);
        }
        for at in 0..self.sources.len() {
            if held >> at & 1 == 1 && within(held & !(1 << at)) {
                held &= !(1 << at);
            }
        }
        // a function that is constant needs no term but no gates
        let list = (held != 0).then(|| (0..self.sources.len()).filter(|at| held >> at & 1 == 1).collect());
        (list, steps)
    }

    /// May the term change? One of its literals does, and no other keeps it from it. Else it is constant, and the net does
    /// what it did or stays.
    fn term_moves(&self, cure: &Cure, (row, moves): (u32, u32)) -> bool {
        let mut moving = false;
        for (net, bit) in &cure.literals {
            let at = self.place[net].0;
            match moves >> at & 1 == 1 {
                true => moving = true,
                false if (row >> at & 1 == 1) != *bit => return false,
                false => {}
            }
        }
        moving
    }

    /// The gates of the cone with the term as gates of its own.
    fn with_term(&self, value: bool, cure: &Cure) -> Vec<GateSpec> {
        let mut specs = self.specs.clone();
        let mut add = |function: Function, pins: Vec<NetId>| {
            specs.push(GateSpec { name: gate_name(specs.len()), function, pins });
            NetId((self.sources.len() + specs.len() - 1) as u32)
        };
        let old = NetId((self.sources.len() + self.specs.len() - 1) as u32);
        let mut pins = Vec::new();
        for (net, bit) in &cure.literals {
            let source = self.place[net];
            pins.push(if *bit == value { source } else { add(Function::Not, vec![source]) });
        }
        let (inner, outer) = if value { (Function::And, Function::Or) } else { (Function::Or, Function::And) };
        let term = if let [pin] = pins[..] { pin } else { add(inner, pins) };
        add(outer, vec![old, term]);
        specs
    }

    /// The gates of the cone with the expression in place of the net's own gate.
    fn with_expression(&self, circuit: &Circuit, cure: &Cure) -> Option<Vec<GateSpec>> {
        let expr = Expr::parse(&cure.expression).ok()?;
        let nets: Option<Vec<NetId>> =
            expr.nets().iter().map(|name| self.place.get(&circuit.net(name)?).copied()).collect();
        let mut specs = self.specs.clone();
        let own = specs.last_mut().expect("the net's own gate is in its cone");
        own.pins = nets?;
        own.function = Function::Expr(expr);
        Some(specs)
    }
}

/// A loop-free circuit that is put to the test, and the net asked for.
struct Trial<'a> {
    circuit: &'a Circuit,
    top: NetId,
    transients: Transients<'a>,
}

impl Trial<'_> {
    /// `None` if there is too much work.
    fn verdict(&mut self, row: u32, moves: u32, most: u64) -> Option<Verdict> {
        let mut state = Bits::zeros(self.circuit.net_count());
        let mut moving = Vec::new();
        for input in self.circuit.inputs() {
            state.set(input.index(), row >> input.0 & 1 == 1);
            if moves >> input.0 & 1 == 1 {
                moving.push(input);
            }
        }
        for gate in self.circuit.evaluation_order() {
            let value = self.circuit.wants(*gate, |net| state.get(net.index()));
            state.set(self.circuit.net_of(*gate).index(), value);
        }
        self.transients.change(&state, &moving, most).ok()?;
        Some(self.transients.wanted(&state, self.top).verdict())
    }
}

/// How tightly an expression is bound by its outermost operator.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum Binding {
    Or,
    Xor,
    And,
    Tight,
}

/// A gate's function as an expression of the nets it reads; `None` for what is too long to be written.
fn own_function(circuit: &Circuit, gate: GateId) -> Option<(String, Binding)> {
    let pins: Vec<&str> = circuit.pins(gate).iter().map(|net| circuit.name(*net)).collect();
    let not = |text: String| (format!("!({text})"), Binding::Tight);
    Some(match circuit.function(gate) {
        Function::Buf => (pins[0].to_string(), Binding::Tight),
        Function::Not => (format!("!{}", pins[0]), Binding::Tight),
        Function::And => (pins.join(" & "), Binding::And),
        Function::Or => (pins.join(" | "), Binding::Or),
        Function::Xor => (pins.join(" ^ "), Binding::Xor),
        Function::Nand => not(pins.join(" & ")),
        Function::Nor => not(pins.join(" | ")),
        Function::Xnor => not(pins.join(" ^ ")),
        Function::Mux => (format!("!{} & {} | {} & {}", pins[0], pins[1], pins[0], pins[2]), Binding::Or),
        Function::Majority if pins.len() <= MAX_MAJORITY => {
            let products: Vec<String> = (0..1u32 << pins.len())
                .rev()
                .filter(|choice| choice.count_ones() as usize == pins.len() / 2 + 1)
                .map(|choice| {
                    let chosen = (0..pins.len()).filter(|at| choice >> (pins.len() - 1 - at) & 1 == 1);
                    chosen.map(|at| pins[at]).collect::<Vec<_>>().join(" & ")
                })
                .collect();
            (products.join(" | "), Binding::Or)
        }
        Function::Majority => return None,
        Function::Expr(expr) => {
            let text: Vec<&str> = expr.text().split_whitespace().collect();
            let binding = match expr.code().last() {
                Some(Op::Or) => Binding::Or,
                Some(Op::Xor) => Binding::Xor,
                Some(Op::And) => Binding::And,
                _ => Binding::Tight,
            };
            (text.join(" "), binding)
        }
    })
}

/// The values of a net of a loop-free circuit for all values of its inputs; input 0 is the lowest digit of the row.
fn table(circuit: &Circuit, net: NetId) -> Vec<u64> {
    /// The first six inputs within a word.
    const LOW: [u64; 6] = [
        0xaaaa_aaaa_aaaa_aaaa,
        0xcccc_cccc_cccc_cccc,
        0xf0f0_f0f0_f0f0_f0f0,
        0xff00_ff00_ff00_ff00,
        0xffff_0000_ffff_0000,
        0xffff_ffff_0000_0000,
    ];
    let inputs = circuit.input_count();
    let rows = 1usize << inputs;
    let mut values = vec![0u64; circuit.net_count()];
    let mut column = Vec::with_capacity(rows.div_ceil(64));
    for block in 0..rows.div_ceil(64) {
        for (input, value) in values.iter_mut().enumerate().take(inputs) {
            *value = match LOW.get(input) {
                Some(low) => *low,
                None if block >> (input - 6) & 1 == 1 => u64::MAX,
                None => 0,
            };
        }
        for gate in circuit.evaluation_order() {
            values[circuit.net_of(*gate).index()] = in_64_rows(circuit, *gate, &values);
        }
        let used = if rows < 64 { (1 << rows) - 1 } else { u64::MAX };
        column.push(values[net.index()] & used);
    }
    column
}

/// A gate's value in 64 rows at once.
fn in_64_rows(circuit: &Circuit, gate: GateId, values: &[u64]) -> u64 {
    let sources = circuit.sources(gate);
    match circuit.compiled(gate) {
        Compiled::Table(table) => {
            // fold the table by one source after the other
            let mut folded = [0u64; 64];
            let mut size = 1usize << sources.len();
            for (row, place) in folded.iter_mut().enumerate().take(size) {
                *place = if table >> row & 1 == 1 { u64::MAX } else { 0 };
            }
            for (source, _) in sources {
                let on = values[source.index()];
                size /= 2;
                for at in 0..size {
                    folded[at] = (folded[2 * at + 1] & on) | (folded[2 * at] & !on);
                }
            }
            folded[0]
        }
        Compiled::Parity { odd } => sources
            .iter()
            .filter(|(_, weight)| weight % 2 == 1)
            .fold(if *odd { 0 } else { u64::MAX }, |all, (source, _)| all ^ values[source.index()]),
        form @ (Compiled::Count { .. } | Compiled::Wide(_)) => (0..64).fold(0, |word, row| {
            let sum =
                sources.iter().map(|(net, weight)| if values[net.index()] >> row & 1 == 1 { *weight } else { 0 }).sum();
            word | u64::from(form.value(sum)) << row
        }),
    }
}

/// Steps that [`table`] takes.
fn table_work(circuit: &Circuit) -> u64 {
    let of = |gate: GateId| match circuit.compiled(gate) {
        Compiled::Table(_) => 1 << circuit.sources(gate).len(),
        Compiled::Parity { .. } => circuit.sources(gate).len() as u64,
        Compiled::Count { .. } | Compiled::Wide(_) => 64 * circuit.sources(gate).len() as u64,
    };
    let blocks = (1u64 << circuit.input_count()).div_ceil(64);
    blocks * circuit.gates().map(of).sum::<u64>()
}

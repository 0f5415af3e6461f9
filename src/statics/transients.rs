//! How often may a net change? Words of nets in the open network, for any delays of gates and wires.
//!
//! The *open network* is the circuit with its feedback nets cut: readers of a feedback net see the value that it has in
//! the stable state before, and what its gate makes of the change is what is *wanted* of it. This is the first half of
//! every move in fundamental mode: the logic sees the new inputs with the state as it was (Huffman 1954; Unger 1969).
//!
//! A [`Word`] is a start value and the greatest number of changes, as far as it matters. The word of a gate follows from
//! those of its sources: of all orders in which the changes of the sources may come, the one in which the function changes
//! most often. An order is a monotone path through the lattice of positions (how many changes of each source have come), and
//! the longest alternation over all paths is found by dynamic programming (algebra of transients: J. Brzozowski, Z. Ésik,
//! Formal Methods in System Design 23 (2003) 223-256 \[PAGE <https://link.springer.com/article/10.1023/A:1026218512171>\]; closed
//! forms for AND and OR there, too, from memory).
//!
//! What the number means. Let every wire between a net and a gate that reads it be a queue: it delivers each change once,
//! in order, after any time, which may be another one for every change. Then the number is reached, and never exceeded.
//! It is reached for all nets of the open network in one run, too: each gate has wires of its own, so nothing
//! keeps it from taking all changes of all its sources in its own best order. Inertial gates, wires without delay,
//! and delays that are the same for every change can only do less. A net moves at all exactly where ternary simulation
//! (Eichelberger 1965) of the open network with the changing inputs at X gives X.

use std::cmp::Reverse;
use std::collections::BinaryHeap;

use rustc_hash::FxHashMap;

use crate::circuit::{Circuit, Compiled, Function, GateId, NetId, NetSet};
use crate::logic::{Bits, Shape};

/// Changes are counted up to here: more are 3 if odd and 4 if even. That is enough to find every hazard. Three changes of a
/// gate need no more than three of each source, and the source then ends as it should with one more at most; so words that
/// are cut in this way give words that are cut in this way, and none is longer or shorter for it up to the cut.
pub const MAX_CHANGES: u32 = 4;

/// Most positions of a lattice; a gate whose sources have more is not counted exactly. Enough for one change of each net of
/// the longest expression, or for six nets that may change as often as they like.
pub const MAX_POSITIONS: usize = 1 << 16;

/// What a net may do: it starts at a value and then changes so many times at most.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Word {
    /// Value before.
    pub start: bool,
    /// Greatest number of changes, up to [`MAX_CHANGES`]; 0 exactly if the net never moves.
    pub changes: u32,
    /// Is it the greatest? Else a lattice was too large: the net may do this, and perhaps more.
    pub exact: bool,
}

/// What a word says of its net.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Verdict {
    /// It changes at most once, and only if it must.
    Clean,
    /// It may glitch.
    Hazard(Shape),
    /// A lattice was too large, and what was looked at shows no hazard.
    Unknown,
}

impl Word {
    /// A net that does not move.
    pub const fn constant(bit: bool) -> Word {
        Word { start: bit, changes: 0, exact: true }
    }

    /// A net that moves once.
    pub const fn one_change(from: bool) -> Word {
        Word { start: from, changes: 1, exact: true }
    }

    /// Value after.
    pub const fn end(self) -> bool {
        self.start ^ (self.changes & 1 == 1)
    }

    /// Clean, static hazard (two changes or more where none is wanted), dynamic hazard (three or more for one).
    pub const fn verdict(self) -> Verdict {
        match self.changes {
            0 => Verdict::Clean,
            1 if self.exact => Verdict::Clean,
            1 => Verdict::Unknown,
            n if n % 2 == 1 => Verdict::Hazard(Shape::Dynamic),
            _ if self.start => Verdict::Hazard(Shape::Static1),
            _ => Verdict::Hazard(Shape::Static0),
        }
    }

    const fn inverse(self) -> Word {
        Word { start: !self.start, ..self }
    }

    /// A word of a count that is a lower bound, and the greatest number if `exact`.
    fn of_count(start: bool, changes: u64, exact: bool) -> Word {
        let most = u64::from(MAX_CHANGES) - (changes & 1);
        Word { start, changes: changes.min(most) as u32, exact: exact || changes == 0 || changes >= 3 }
    }
}

/// The longest alternation over the monotone paths through a lattice, from its first to its last position. `sizes` are
/// the numbers of positions of each source, `values` the values at all positions, those of the first source next to
/// each other.
///
/// ```
/// // AND of a net that goes 0, 1 and one that goes 1, 0
/// assert_eq!(stillgate::statics::transients::longest_alternation(&[2, 2], &[false, true, false, false]), 2);
/// ```
///
/// Panics if `values` has another length than the product of `sizes`.
pub fn longest_alternation(sizes: &[u32], values: &[bool]) -> u32 {
    let positions: usize = sizes.iter().map(|size| *size as usize).product();
    assert_eq!(values.len(), positions, "one value for each position");
    let mut longest = vec![0u32; values.len()];
    let mut place = vec![0u32; sizes.len()];
    for at in 1..values.len() {
        for (digit, size) in place.iter_mut().zip(sizes) {
            *digit += 1;
            if *digit < *size {
                break;
            }
            *digit = 0;
        }
        let mut stride = 1;
        for (digit, size) in place.iter().zip(sizes) {
            if *digit > 0 {
                let before = at - stride;
                longest[at] = longest[at].max(longest[before] + u32::from(values[at] != values[before]));
            }
            stride *= *size as usize;
        }
    }
    longest.last().copied().unwrap_or(0)
}

/// Word of an AND of nets with these words, by counting 1s: of two words that move, the longest AND has as many 1s as
/// both together, less one.
fn conjunction(words: impl Iterator<Item = Word>) -> Word {
    let (mut start, mut end, mut ones, mut exact) = (true, true, 1u64, true);
    for word in words {
        if word.changes == 0 {
            if !word.start {
                return Word::constant(false);
            }
            continue;
        }
        ones += (u64::from(word.changes) + u64::from(word.start) + u64::from(word.end())) / 2 - 1;
        start &= word.start;
        end &= word.end();
        exact &= word.exact;
    }
    Word::of_count(start, 2 * ones - u64::from(start) - u64::from(end), exact)
}

/// Word of any function of a sum. `base` is the sum before, `moving` the weight and the word of each source that moves.
fn by_lattice(form: &Compiled, base: u64, moving: &[(u64, Word)], work: &mut u64) -> Word {
    let start = form.value(base);
    let mut exact = moving.iter().all(|(_, word)| word.exact);
    let mut sizes: Vec<u32> = moving.iter().map(|(_, word)| word.changes + 1).collect();
    let product = |sizes: &[u32]| {
        sizes.iter().try_fold(1usize, |all, size| all.checked_mul(*size as usize)).filter(|all| *all <= MAX_POSITIONS)
    };
    // a prefix with the same end shows a part of what the whole word can do
    let positions = loop {
        match product(&sizes) {
            Some(positions) => break Some(positions),
            None => match sizes.iter_mut().filter(|size| **size > 3).max() {
                Some(size) => *size = ((*size / 2) & !1) + (*size & 1),
                None => break None,
            },
        }
        exact = false;
    };
    let Some(positions) = positions else {
        // far too many: only whether it moves at all is known
        let after = moving.iter().fold(base, |sum, (weight, word)| turned(sum, *weight, word.start, word.end()));
        let low = moving.iter().fold(base, |sum, (weight, word)| turned(sum, *weight, word.start, false));
        let all = moving.iter().map(|(weight, _)| weight).sum();
        *work += moving.len() as u64;
        let end = form.value(after);
        let constant = form.value_with_unknown(low, all).known().is_some();
        return match (constant, start == end) {
            (true, _) => Word::constant(start),
            (false, true) => Word { start, changes: 2, exact: false },
            (false, false) => Word { start, changes: 1, exact: false },
        };
    };
    *work += positions as u64 * moving.len() as u64;
    let mut values = Vec::with_capacity(positions);
    let (mut place, mut sum) = (vec![0u32; sizes.len()], base);
    values.push(start);
    for _ in 1..positions {
        for ((digit, size), (weight, word)) in place.iter_mut().zip(&sizes).zip(moving) {
            let now = word.start ^ (*digit & 1 == 1);
            *digit += 1;
            if *digit < *size {
                sum = turned(sum, *weight, now, !now);
                break;
            }
            *digit = 0;
            sum = turned(sum, *weight, now, word.start);
        }
        values.push(form.value(sum));
    }
    Word::of_count(start, u64::from(longest_alternation(&sizes, &values)), exact)
}

fn turned(sum: u64, weight: u64, from: bool, to: bool) -> u64 {
    match (from, to) {
        (false, true) => sum + weight,
        (true, false) => sum - weight,
        _ => sum,
    }
}

/// Most lattices that are remembered.
const MAX_MEMORY: usize = 1 << 16;

/// A table, the words of its sources in five bits each, and their number.
type Met = (u64, u32, u8);

/// What counting has taken, and lattices that it has met: few are different.
#[derive(Clone, Debug, Default)]
pub struct Counting {
    /// Steps so far: sources read, positions of lattices times their sources.
    pub work: u64,
    met: FxHashMap<Met, Word>,
}

impl Counting {
    fn by_lattice(&mut self, form: &Compiled, base: u64, moving: &[(u64, Word)], key: Option<Met>) -> Word {
        if let Some(word) = key.and_then(|key| self.met.get(&key)) {
            return *word;
        }
        let word = by_lattice(form, base, moving, &mut self.work);
        if let Some(key) = key
            && self.met.len() < MAX_MEMORY
        {
            self.met.insert(key, word);
        }
        word
    }
}

/// The word of a gate's output, from those of what it reads.
pub fn word_of(circuit: &Circuit, gate: GateId, source: impl Fn(NetId) -> Word, counting: &mut Counting) -> Word {
    let sources = circuit.sources(gate);
    counting.work += 1 + sources.len() as u64;
    let words = || sources.iter().map(|(net, _)| source(*net));
    match circuit.function(gate) {
        Function::Buf => source(circuit.pins(gate)[0]),
        Function::Not => source(circuit.pins(gate)[0]).inverse(),
        Function::And => conjunction(words()),
        Function::Nand => conjunction(words()).inverse(),
        Function::Or => conjunction(words().map(Word::inverse)).inverse(),
        Function::Nor => conjunction(words().map(Word::inverse)),
        Function::Xor | Function::Xnor => {
            // every change of a source that counts is a change
            let pins = circuit.pins(gate);
            let single = pins.len() == sources.len();
            let counts = |net: NetId| single || pins.iter().filter(|pin| **pin == net).count() % 2 == 1;
            let (mut changes, mut exact) = (0u64, true);
            for (net, _) in sources {
                let word = source(*net);
                if word.changes > 0 && counts(*net) {
                    changes += u64::from(word.changes);
                    exact &= word.exact;
                }
            }
            Word::of_count(circuit.wants(gate, |net| source(net).start), changes, exact)
        }
        Function::Majority | Function::Mux | Function::Expr(_) => {
            let (mut base, mut moving, mut letters) = (0, Vec::new(), 0u32);
            for (net, weight) in sources {
                let word = source(*net);
                base += if word.start { *weight } else { 0 };
                // at most six sources of a table, five bits each
                letters = letters << 5 | word.changes << 2 | u32::from(word.start) << 1 | u32::from(word.exact);
                if word.changes > 0 {
                    moving.push((*weight, word));
                }
            }
            let form = circuit.compiled(gate);
            let key = match form {
                Compiled::Table(table) => Some((*table, letters, sources.len() as u8)),
                _ => None,
            };
            counting.by_lattice(form, base, &moving, key)
        }
    }
}

/// A circuit with some nets cut, and an order of its gates.
#[derive(Clone, Debug)]
pub struct Open<'a> {
    /// The circuit.
    pub circuit: &'a Circuit,
    order: &'a [GateId],
    /// Place in the order, by gate.
    rank: Vec<u32>,
    cut: NetSet,
}

impl<'a> Open<'a> {
    /// Cuts the circuit's own feedback nets.
    pub fn of(circuit: &'a Circuit) -> Open<'a> {
        Open::cut_at(circuit, circuit.evaluation_order(), circuit.feedback())
    }

    /// Cuts these nets. `order` has every gate once, behind all gates that it reads but for the nets that are cut.
    pub fn cut_at(circuit: &'a Circuit, order: &'a [GateId], nets: &[NetId]) -> Open<'a> {
        let mut rank = vec![0; circuit.gate_count()];
        for (at, gate) in order.iter().enumerate() {
            rank[gate.index()] = at as u32;
        }
        let mut cut = NetSet::none(circuit.net_count());
        for net in nets {
            cut.insert(*net);
        }
        Open { circuit, order, rank, cut }
    }

    /// Is the net a source of the open network: an input, or cut?
    pub fn is_source(&self, net: NetId) -> bool {
        self.circuit.is_input(net) || self.cut.contains(net)
    }

    /// The gate's place in the order of evaluation.
    pub fn rank(&self, gate: GateId) -> u32 {
        self.rank[gate.index()]
    }
}

/// The work that was allowed is done, and the words are not complete.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Exhausted;

/// The words of one change after the other. Only gates that may move are looked at.
#[derive(Clone, Debug)]
pub struct Transients<'a> {
    open: &'a Open<'a>,
    /// The word wanted of each net; holds where `round_of` is the present round.
    words: Vec<Word>,
    round_of: Vec<u32>,
    round: u32,
    /// Ranks of the gates to look at.
    queue: BinaryHeap<Reverse<u32>>,
    queued: Vec<u32>,
    looked_at: Vec<GateId>,
    counting: Counting,
}

impl<'a> Transients<'a> {
    /// Nothing has changed yet.
    pub fn new(open: &'a Open<'a>) -> Transients<'a> {
        let (nets, gates) = (open.circuit.net_count(), open.circuit.gate_count());
        Transients {
            open,
            words: vec![Word::constant(false); nets],
            round_of: vec![0; nets],
            round: 1,
            queue: BinaryHeap::new(),
            queued: vec![0; gates],
            looked_at: Vec::new(),
            counting: Counting::default(),
        }
    }

    /// The words for a change of these inputs, each once and once each, from this stable state. Gives up when
    /// [`Transients::work`] passes `most`.
    ///
    /// ```
    /// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
    /// use stillgate::logic::Bits;
    /// use stillgate::statics::transients::{Open, Transients};
    /// // a & !a
    /// let gate = |name: &str, function, pins: &[u32]| GateSpec {
    ///     name: name.into(), function, pins: pins.iter().map(|pin| NetId(*pin)).collect(),
    /// };
    /// let gates = vec![gate("not", Function::Not, &[0]), gate("out", Function::And, &[0, 1])];
    /// let circuit = Circuit::new(&["a"], gates, vec![]).unwrap();
    /// let open = Open::of(&circuit);
    /// let mut transients = Transients::new(&open);
    /// let state = Bits::of([false, true, false].into_iter());
    /// transients.change(&state, &[NetId(0)], u64::MAX).unwrap();
    /// assert_eq!(transients.wanted(&state, NetId(2)).changes, 2, "it should stay at 0");
    /// ```
    ///
    /// Panics if the state has fewer nets than the circuit.
    pub fn change(&mut self, state: &Bits, moving: &[NetId], most: u64) -> Result<(), Exhausted> {
        self.round += 1;
        self.looked_at.clear();
        self.queue.clear();
        let circuit = self.open.circuit;
        for net in moving {
            self.set(*net, Word::one_change(state.get(net.index())));
            self.wake(*net);
        }
        while let Some(Reverse(rank)) = self.queue.pop() {
            let gate = self.open.order[rank as usize];
            let net = circuit.net_of(gate);
            let mut counting = std::mem::take(&mut self.counting);
            let word = word_of(circuit, gate, |source| self.seen(state, source), &mut counting);
            self.counting = counting;
            if self.counting.work > most {
                return Err(Exhausted);
            }
            self.set(net, word);
            self.looked_at.push(gate);
            if word.changes > 0 && !self.open.is_source(net) {
                self.wake(net);
            }
        }
        Ok(())
    }

    /// Steps of all changes so far; see [`Counting::work`].
    pub fn work(&self) -> u64 {
        self.counting.work
    }

    /// Adds steps of other work on the same allowance.
    pub fn add_work(&mut self, steps: u64) {
        self.counting.work += steps;
    }

    fn set(&mut self, net: NetId, word: Word) {
        self.words[net.index()] = word;
        self.round_of[net.index()] = self.round;
    }

    fn wake(&mut self, net: NetId) {
        for reader in self.open.circuit.readers(net) {
            if std::mem::replace(&mut self.queued[reader.gate.index()], self.round) != self.round {
                self.queue.push(Reverse(self.open.rank[reader.gate.index()]));
            }
        }
    }

    /// The word that readers of a net see.
    pub fn seen(&self, state: &Bits, net: NetId) -> Word {
        if self.open.cut.contains(net) { Word::constant(state.get(net.index())) } else { self.wanted(state, net) }
    }

    /// The word of a net's driving function, of an input its own.
    pub fn wanted(&self, state: &Bits, net: NetId) -> Word {
        if self.round_of[net.index()] == self.round {
            self.words[net.index()]
        } else {
            Word::constant(state.get(net.index()))
        }
    }

    /// The gates with a source that may move, in the order of evaluation.
    pub fn looked_at(&self) -> &[GateId] {
        &self.looked_at
    }
}

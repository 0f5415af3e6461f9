//! Flow tables of well-known circuits: for every stable state and every change of one input, what follows for any delays.
//!
//! A table is written as a person would: inputs and gates of the state, then the gates after each input's change.
//! Alternatives are joined by `/`, `~` is a cycle that may last, `?` marks a race that does not matter.

use std::collections::{BTreeMap, BTreeSet};

use stillgate::circuit::{Circuit, Expr, Function, NetId};
use stillgate::control::Control;
use stillgate::logic::Bits;
use stillgate::statics::{Change, Outcome, Race, StateSet, outcome};

use super::networks::{circuit, letters, owned, six_nand_flip_flop, values};
use crate::support::explorer::{Delays, Explorer};

/// What follows one change.
#[derive(Debug, PartialEq, Eq)]
struct Next {
    /// Values of the gates.
    states: BTreeSet<String>,
    cycles: u64,
    race: Race,
}

type Table = BTreeMap<String, Vec<Next>>;

fn next(text: &str) -> Next {
    let (text, harmless) = text.strip_suffix('?').map_or((text, false), |text| (text, true));
    let (cycles, states): (Vec<&str>, Vec<&str>) = text.split('/').partition(|one| *one == "~");
    let race = match (states.len() + cycles.len(), harmless) {
        (1, false) => Race::None,
        (1, true) => Race::NonCritical,
        _ => Race::Critical,
    };
    Next { states: states.into_iter().map(String::from).collect(), cycles: cycles.len() as u64, race }
}

/// Reads a table: its first line names inputs and gates, then the inputs that change.
fn parse(circuit: &Circuit, text: &str) -> Table {
    let mut lines = text.lines().map(str::trim).filter(|line| !line.is_empty());
    let words = |line: &str| line.replace('|', " ").split_whitespace().map(String::from).collect::<Vec<_>>();
    let names: Vec<&str> = circuit.nets().map(|net| circuit.name(net)).collect();
    let heading: Vec<&str> = names.iter().chain(&names[..circuit.input_count()]).copied().collect();
    assert_eq!(words(lines.next().unwrap()), heading, "the heading names all nets, then the inputs that change");
    lines
        .map(|line| {
            let words = words(line);
            assert_eq!(words.len(), 2 + circuit.input_count(), "{line}");
            (format!("{} {}", words[0], words[1]), words[2..].iter().map(|text| next(text)).collect())
        })
        .collect()
}

/// What may follow, by the program and by visiting every state.
fn after(circuit: &Circuit, from: &[bool], change: &Change) -> Next {
    let gates = |state: &[bool]| letters(&state[circuit.input_count()..]);
    let explored = Explorer::new(circuit, Delays::Gates).explore(from, change);
    let from = Bits::of(from.iter().copied());
    let Outcome::Exact { states, cycles, race } = outcome(circuit, &from, change, &Control::default()).unwrap() else {
        panic!("a small circuit is done exactly");
    };
    let next = Next { states: states.iter().map(|state| gates(&values(circuit, state))).collect(), cycles, race };
    let visited = Next {
        states: explored.stable.iter().map(|state| gates(state)).collect(),
        cycles: explored.cycles.len() as u64,
        race: explored.race,
    };
    assert_eq!(next, visited, "from {from:?}, {change:?}");
    next
}

/// The whole table of a circuit, from all its stable states.
fn table(circuit: &Circuit) -> Table {
    let set = StateSet::of(circuit, &Control::default()).unwrap();
    let mut table = Table::new();
    for vector in set.by_inputs(1 << 8, 1 << 8) {
        for state in vector.states {
            let all = values(circuit, &state);
            let (inputs, gates) = all.split_at(circuit.input_count());
            let change = |input| after(circuit, &all, &Change::of_one(&state, input));
            table.insert(format!("{} {}", letters(inputs), letters(gates)), circuit.inputs().map(change).collect());
        }
    }
    table
}

/// What may follow when the inputs change from one vector to another, at once or apart.
fn together(circuit: &Circuit, from: &str, to: &str, apart: bool) -> Next {
    let bits = |text: &str| text.chars().filter(|c| *c != ' ').map(|c| c == '1').collect::<Vec<bool>>();
    let from = bits(from);
    let set = circuit.inputs().zip(bits(to)).filter(|(net, bit)| from[net.index()] != *bit).collect();
    after(circuit, &from, &Change { set, apart })
}

fn check(circuit: &Circuit, expected: &str) {
    assert_eq!(table(circuit), parse(circuit, expected));
}

fn variables(circuit: &Circuit) -> Vec<String> {
    let variables = StateSet::of(circuit, &Control::default()).unwrap().state_variables(1000).unwrap();
    assert!(variables.exact);
    variables.nets.iter().map(|net| circuit.name(*net).to_string()).collect()
}

fn expr(name: &str, text: &str) -> (String, Function, Vec<String>) {
    let expr = Expr::parse(text).unwrap();
    let nets = expr.nets().iter().map(ToString::to_string).collect();
    (name.to_string(), Function::Expr(expr), nets)
}

#[test]
fn nor_latch() {
    // common practice, no source: set, reset, hold, and both outputs at 0 while both inputs are at 1
    let latch = circuit(&["s", "r"], &[("q", Function::Nor, &["r", "qb"]), ("qb", Function::Nor, &["s", "q"])]);
    check(
        &latch,
        "s r  q qb | s   r
         00   01   | 10  01
         00   10   | 10  01
         01   01   | 00  01
         10   10   | 10  00
         11   00   | 01  10",
    );
    assert_eq!(variables(&latch), ["q"]);
    // both let go at once: either way, or for ever between 00 and 11 (textbooks call it forbidden)
    assert_eq!(together(&latch, "11 00", "00", false), next("01/10/~"));
    // one after the other: the last to go decides; at once still may be
    assert_eq!(together(&latch, "11 00", "00", true), next("01/10/~"));
    assert_eq!(together(&latch, "01 01", "10", false), next("10"));
}

#[test]
fn nand_latch() {
    // common practice, no source: the NOR latch with all values inverted
    let latch = circuit(&["sn", "rn"], &[("q", Function::Nand, &["sn", "qb"]), ("qb", Function::Nand, &["rn", "q"])]);
    check(
        &latch,
        "sn rn  q qb | sn  rn
         11     01   | 10  01
         11     10   | 10  01
         10     01   | 11  01
         01     10   | 10  11
         00     11   | 01  10",
    );
    assert_eq!(together(&latch, "00 11", "11", false), next("01/10/~"));
}

#[test]
fn gated_d_latch_of_nands() {
    // common practice, no source: while g is 1 the output follows d, else it holds; gates are s, r, then the latch. With
    // an inverter for d, and in the form of four gates that takes the inverse of d from s
    let latch = circuit(
        &["d", "g"],
        &[
            ("nd", Function::Not, &["d"]),
            ("s", Function::Nand, &["d", "g"]),
            ("r", Function::Nand, &["nd", "g"]),
            ("q", Function::Nand, &["s", "qb"]),
            ("qb", Function::Nand, &["r", "q"]),
        ],
    );
    check(
        &latch,
        "d g  nd s r q qb | d      g
         00   11101       | 01101  11001
         00   11110       | 01110  11001
         01   11001       | 00110  11101
         10   01101       | 11101  00110
         10   01110       | 11110  00110
         11   00110       | 11001  01110",
    );
    assert_eq!(variables(&latch), ["q"]);
    let four = circuit(
        &["d", "g"],
        &[
            ("s", Function::Nand, &["d", "g"]),
            ("r", Function::Nand, &["s", "g"]),
            ("q", Function::Nand, &["s", "qb"]),
            ("qb", Function::Nand, &["r", "q"]),
        ],
    );
    check(
        &four,
        "d g  s r q qb | d     g
         00   1101     | 1101  1001
         00   1110     | 1110  1001
         01   1001     | 0110  1101
         10   1101     | 1101  0110
         10   1110     | 1110  0110
         11   0110     | 1001  1110",
    );
    assert_eq!(variables(&four), ["q"]);
}

#[test]
fn gated_d_latch_with_a_static_hazard_loses_its_bit() {
    // the latch as a selector, gd + g'q: closing it while d is 1 may lose the bit or never end; the consensus term dq
    // cures it (consensus: textbooks, from memory; outcomes [computed])
    let latch = circuit(
        &["g", "d"],
        &[
            ("gn", Function::Not, &["g"]),
            ("p", Function::And, &["g", "d"]),
            ("h", Function::And, &["gn", "q"]),
            ("q", Function::Or, &["p", "h"]),
        ],
    );
    assert_eq!(together(&latch, "11 0101", "01", false), next("1000/1011/~"));
    let cured = circuit(
        &["g", "d"],
        &[
            ("gn", Function::Not, &["g"]),
            ("p", Function::And, &["g", "d"]),
            ("h", Function::And, &["gn", "q"]),
            ("c", Function::And, &["d", "q"]),
            ("q", Function::Or, &["p", "h", "c"]),
        ],
    );
    assert_eq!(together(&cured, "11 01011", "01", false), next("10111"));
}

#[test]
fn six_nand_flip_flop_takes_d_when_the_clock_rises() {
    // the usual edge-triggered D flip-flop (textbooks, from memory): q takes d when c rises, and nothing else moves it;
    // its stable states are [computed], what follows is worked out by hand gate by gate
    let flip_flop = owned(&["c", "d"], &six_nand_flip_flop("", "c", "d"));
    check(
        &flip_flop,
        "c d  n1 n2 n3 n4 q qb | c       d
         00   011101           | 010101  111001
         00   011110           | 010101  111010
         01   111001           | 101010  011101
         01   111010           | 101010  011110
         10   010101           | 011101  010101
         10   101110           | 011110  101010
         11   010101           | 111001  010101
         11   101010           | 111010  101110",
    );
    assert_eq!(variables(&flip_flop), ["q"]);
}

#[test]
fn c_element() {
    // common practice, no source: it follows its inputs where they agree, and holds where they do not. As one majority
    // gate, and as three ANDs and an OR, where the two terms that hold the output rise together behind it
    let one = circuit(&["a", "b"], &[("c", Function::Majority, &["a", "b", "c"])]);
    check(
        &one,
        "a b  c | a  b
         00   0 | 0  0
         01   0 | 1  0
         01   1 | 1  0
         10   0 | 0  1
         10   1 | 0  1
         11   1 | 1  1",
    );
    assert_eq!(variables(&one), ["c"]);
    assert_eq!(together(&one, "00 0", "11", true), next("1"));
    assert_eq!(together(&one, "11 1", "00", true), next("0"));
    assert_eq!(together(&one, "01 0", "10", false), next("0"), "at one instant");
    assert_eq!(together(&one, "01 0", "10", true), next("0/1"), "one after the other: it may see them both");
    let four = circuit(
        &["a", "b"],
        &[
            ("p", Function::And, &["a", "b"]),
            ("q", Function::And, &["a", "c"]),
            ("r", Function::And, &["b", "c"]),
            ("c", Function::Or, &["p", "q", "r"]),
        ],
    );
    check(
        &four,
        "a b  p q r c | a      b
         00   0000    | 0000   0000
         01   0000    | 1111?  0000
         01   0011    | 1111   0000
         10   0000    | 0000   1111?
         10   0101    | 0000   1111
         11   1111    | 0011   0101",
    );
    assert_eq!(variables(&four), ["c"]);
}

#[test]
fn mutual_exclusion() {
    // cross-coupled NANDs, and output gates that wait until the two differ (Seitz, in Mead and Conway, 1980, from
    // memory): one grant at a time, first come, first served; both requests at once: either, or neither for ever
    let gates = [
        ("x1".to_string(), Function::Nand, vec!["r1".to_string(), "x2".to_string()]),
        ("x2".to_string(), Function::Nand, vec!["r2".to_string(), "x1".to_string()]),
        expr("g1", "x2 & !x1"),
        expr("g2", "x1 & !x2"),
    ];
    let element = owned(&["r1", "r2"], &gates);
    check(
        &element,
        "r1 r2  x1 x2 g1 g2 | r1    r2
         00     1100        | 0110  1001
         10     0110        | 1100  0110
         01     1001        | 1001  1100
         11     0110        | 1001  0110
         11     1001        | 1001  0110",
    );
    assert_eq!(variables(&element), ["x1"]);
    assert_eq!(together(&element, "00 1100", "11", false), next("0110/1001/~"));
    assert_eq!(together(&element, "11 0110", "00", true), next("1100"));
    let both = Change { set: vec![(NetId(0), true), (NetId(1), true)], apart: false };
    let explored = Explorer::new(&element, Delays::Gates).explore(&[false, false, true, true, false, false], &both);
    assert!(!explored.reached.iter().any(|state| state[4] && state[5]), "never two grants");
    assert!(!explored.cycles.iter().flatten().any(|state| state[4] || state[5]), "no grant while they are undecided");
}

/// The stable states that a toggle passes through while its input rises and falls, from the first: `(input, gates)`.
fn turn(table: &Table, from: &str, changes: usize) -> Vec<String> {
    let mut states = vec![from.to_string()];
    for _ in 0..changes {
        let at = states.last().unwrap();
        let input = if at.starts_with('0') { '1' } else { '0' };
        let [Next { states: next, cycles: 0, .. }] = &table[at][..] else { panic!("{at} has one input and one way") };
        assert_eq!(next.len(), 1);
        states.push(format!("{input} {}", next.first().unwrap()));
    }
    states
}

#[test]
fn toggle_of_two_latches() {
    // common practice, no source: a first latch takes the inverse of the second while the input is 1, the second takes the
    // first while it is 0. Four states for one input, two nets to remember them: four moves around, and for each value of
    // the input two states that stay
    let toggle = owned(&["t"], &[expr("m", "t & !s | !t & m"), expr("s", "t & s | !t & m")]);
    check(
        &toggle,
        "t  m s | t
         0   00 | 10
         1   10 | 11
         0   11 | 01
         1   01 | 00",
    );
    let round = turn(&table(&toggle), "0 00", 8);
    assert_eq!(round, ["0 00", "1 10", "0 11", "1 01", "0 00", "1 10", "0 11", "1 01", "0 00"]);
    let output: String = round.iter().map(|state| &state[3..]).collect();
    assert_eq!(output, "001100110", "two changes of the output in four of the input: half the frequency");
    // the two latches tell the four states apart without the input, neither does alone; beside the input one is enough
    let set = StateSet::of(&toggle, &Control::default()).unwrap();
    let nets = [toggle.net("m").unwrap(), toggle.net("s").unwrap()];
    assert_eq!(set.count(), 4u8.into());
    assert_eq!(set.feedback(), nets);
    assert_eq!(set.project(&nets).unwrap().count(), 4u8.into());
    assert!(nets.iter().all(|net| set.project(&[*net]).unwrap().count() == 2u8.into()));
    assert_eq!(variables(&toggle), ["m"]);
}

#[test]
fn toggle_of_three_nand_latches() {
    // the six-NAND flip-flop (textbooks, from memory) whose inverse output is its data: moves worked out by hand
    let toggle = owned(&["c"], &six_nand_flip_flop("", "c", "qb"));
    check(
        &toggle,
        "c  n1 n2 n3 n4 q qb | c
         0   111001          | 101110
         1   101110          | 011110
         0   011110          | 010101
         1   010101          | 111001",
    );
    let round = turn(&table(&toggle), "0 111001", 8);
    let output: String = round.iter().map(|state| &state[6..7]).collect();
    assert_eq!(output, "011001100", "two changes of the output in four of the input: half the frequency");
    assert_eq!(variables(&toggle), ["n1"], "the first of the nets that do alone");
}

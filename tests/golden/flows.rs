//! Flow tables, written by hand: every kind of outcome and remark occurs somewhere.

use stillgate::circuit::NetId;
use stillgate::flow::{
    Automaton, Beyond, Cause, Choice, Compared, Contained, Coverage, Cure, Flow, FlowState, FlowTable, Hazard, Reached,
    Reading, StateNumber, Transition, TransitionRef,
};
use stillgate::logic::{Bits, Shape};
use stillgate::scenario::Scenario;
use stillgate::statics::{Change, Race};

use super::cases::net;
use super::results::state;

/// A table in the making.
struct Draft<'a> {
    scenario: &'a Scenario,
    table: FlowTable,
}

impl<'a> Draft<'a> {
    /// States as letters in net order, all reachable; a run begins in the first.
    fn new(scenario: &'a Scenario, states: &[&str]) -> Draft<'a> {
        let state = |text: &&str| FlowState { values: bits(text), reachable: true, explored: true };
        let states = states.iter().map(state).collect();
        Draft { scenario, table: FlowTable { states, start: vec![0], ..FlowTable::default() } }
    }

    fn change(&self, set: &[(&str, u8)]) -> Change {
        let set = set.iter().map(|(name, value)| (net(self.scenario, name), *value == 1)).collect();
        Change { set, apart: false }
    }

    fn step(mut self, moment: u32, from: StateNumber, set: &[(&str, u8)], to: Reached, sure: bool) -> Draft<'a> {
        let change = self.change(set);
        self.table.steps.push(Transition { moment: Some(moment), from, change, to, essential: None, sure });
        self
    }

    fn single(mut self, from: StateNumber, name: &str, to: Reached, essential: Option<bool>) -> Draft<'a> {
        let change = Change::of_one(&self.table.states[from as usize].values, net(self.scenario, name));
        self.table.single.push(Transition { moment: None, from, change, to, essential, sure: true });
        self
    }
}

fn bits(letters: &str) -> Bits {
    Bits::of(letters.bytes().map(|letter| letter == b'1'))
}

fn to(state: StateNumber) -> Reached {
    Reached::Exact { states: vec![state], cycles: 0, race: Race::None }
}

fn race(states: &[StateNumber], cycles: u64) -> Reached {
    Reached::Exact { states: states.into(), cycles, race: Race::Critical }
}

/// The flow table of [`super::cases::lock`] (two cross-coupled NANDs and two inverters): worked out by hand.
pub fn lock(scenario: &Scenario) -> Flow {
    let named = |name: &str| net(scenario, name);
    let (upper, lower) = (named("call_upper"), named("call_lower"));
    let states = ["001100", "100110", "110110", "011001", "111001"];
    let draft = Draft::new(scenario, &states)
        .step(0, 0, &[("call_upper", 1)], to(1), true)
        .step(1, 1, &[("call_lower", 1)], to(2), true)
        .step(2, 2, &[("call_upper", 0), ("call_lower", 0)], to(0), true)
        .step(3, 0, &[("call_upper", 1), ("call_lower", 1)], race(&[2, 4], 1), true)
        .single(0, "call_upper", to(1), Some(false))
        .single(0, "call_lower", to(3), Some(false))
        .single(1, "call_upper", to(0), Some(false))
        .single(1, "call_lower", to(2), Some(false))
        .single(2, "call_upper", to(3), Some(true))
        .single(2, "call_lower", to(1), Some(false))
        .single(3, "call_upper", to(4), Some(false))
        .single(3, "call_lower", to(0), Some(false))
        .single(4, "call_upper", to(3), Some(false))
        .single(4, "call_lower", to(1), Some(true));
    let together = draft.change(&[("call_upper", 1), ("call_lower", 1)]);
    let hazard = Hazard {
        net: named("open_lower"),
        shape: Shape::Static0,
        cause: Cause::Function,
        built: false,
        moment: Some(3),
        from: 0,
        change: together,
        states: 1,
        cure: None,
    };
    let cure = Cure {
        literals: vec![(named("call_upper"), false), (named("call_lower"), true)],
        expression: "!hold_upper | !call_upper & call_lower".into(),
    };
    let logic = Hazard {
        net: named("open_upper"),
        shape: Shape::Static1,
        cause: Cause::Logic,
        built: true,
        moment: None,
        from: 2,
        change: draft.change(&[("call_lower", 0)]),
        states: 3,
        cure: Some(cure),
    };
    Flow {
        coverage: Coverage {
            all: 10,
            exercised: 2,
            perhaps: vec![(4, upper)],
            missing: vec![(0, lower), (1, upper), (2, upper), (2, lower), (3, upper), (3, lower), (4, lower)],
            truncated: false,
        },
        automaton: Automaton {
            reading: Reading::Mealy(0, 3),
            unreachable: vec![],
            dead_ends: vec![vec![1, 2], vec![4]],
            equal: vec![vec![3, 4]],
            truncated: false,
        },
        table: draft.table,
        hazards: vec![hazard, logic],
        hazards_truncated: false,
        hazards_not_judged: 2,
        compared: None,
    }
}

/// What a comparison of the lock with a reference could say.
pub fn compared(scenario: &Scenario) -> Compared {
    let values = ["call_upper", "call_lower", "open_upper", "open_lower"];
    Compared {
        states: Contained::Not(values.iter().map(|name| (net(scenario, name), true)).collect()),
        beyond: vec![Beyond {
            transition: TransitionRef::Single(4),
            reached: 3,
            allowed: vec![vec![true, false], vec![false, false]],
        }],
        choices: vec![Choice {
            transition: TransitionRef::Step(3),
            outcomes: vec![vec![true, false], vec![false, true]],
        }],
        compared: 12,
        not_compared: 2,
    }
}

/// The flow table of [`super::cases::ring`]: at rest while nobody rings, else never.
pub fn ring(scenario: &Scenario) -> Flow {
    let endless = || Reached::Exact { states: vec![], cycles: 1, race: Race::None };
    let draft = Draft::new(scenario, &["010101"]);
    // ring, a, b, c, hammer, still: a = 1, b = 0, c = 1, hammer = c
    let draft = draft.step(0, 0, &[("ring", 1)], endless(), true).single(0, "ring", endless(), None);
    let mut table = draft.table;
    table.states[0].values = bits("010111");
    table.notes = vec!["no stable state is known that \"hush\" could meet".into()];
    Flow { table, coverage: Coverage { all: 1, exercised: 1, ..Coverage::default() }, ..Flow::default() }
}

/// The flow table of [`super::cases::unknown`], a latch after power-up, as if only a bound were known where both inputs go;
/// with a state that nothing leads to.
pub fn unknown(scenario: &Scenario) -> Flow {
    // clear, load, q, qn, both, steady
    let mut bound = state("00XXX1");
    bound.unknown.set(4, true);
    let open = || Reached::Bound { state: bound.clone(), states: vec![0, 1], truncated: false };
    let mut draft = Draft::new(scenario, &["000101", "001001", "100101", "011000", "110000"])
        .step(1, 0, &[("clear", 1)], to(2), false)
        .step(1, 1, &[("clear", 1)], to(2), false)
        .step(2, 2, &[("clear", 0)], to(0), true)
        .single(0, "clear", to(2), None)
        .single(0, "load", to(3), None)
        .single(1, "clear", to(2), None)
        .single(1, "load", to(3), None)
        .single(2, "clear", to(0), None)
        .single(2, "load", to(4), None)
        .single(3, "clear", to(4), None)
        .single(3, "load", open(), None)
        .single(4, "clear", to(3), None)
        .single(4, "load", to(2), None);
    draft.table.start = vec![0, 1];
    draft.table.states[4].reachable = false;
    draft.table.states_truncated = true;
    let gaps: Vec<(StateNumber, NetId)> = (0..4).map(|state| (state, net(scenario, "load"))).collect();
    Flow {
        coverage: Coverage { all: 8, exercised: 4, perhaps: vec![], missing: gaps, truncated: true },
        automaton: Automaton { unreachable: vec![4], truncated: true, ..Automaton::default() },
        table: draft.table,
        hazards_truncated: true,
        ..Flow::default()
    }
}

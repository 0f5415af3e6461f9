//! Flow tables, coverage and readings against tables derived by hand.

use super::table::{Limits, table};
use super::*;
use crate::scenario::{Builder, NewStep};
use crate::statics::StateSet;

pub(super) fn scenario(text: &str) -> Scenario {
    match crate::reader::read(text, "test.toml") {
        Ok(loaded) => loaded.scenario,
        Err(faults) => panic!("{}", faults.render(false)),
    }
}

/// A scenario with its delay-free view.
struct Seen {
    scenario: Scenario,
    flow: Flow,
}

impl Seen {
    fn of(text: &str) -> Seen {
        let scenario = scenario(text);
        let states = StateSet::of(&scenario.circuit, &Control::default()).unwrap();
        let variables = states.state_variables(1000).unwrap().nets;
        drop(states);
        let flow = flow(&scenario, &variables, &Control::default()).unwrap();
        Seen { scenario, flow }
    }

    /// The values of a state in net order: inputs, then gates.
    fn word(&self, state: StateNumber) -> String {
        let values = &self.flow.table.states[state as usize].values;
        self.scenario.circuit.nets().map(|net| if values.get(net.index()) { '1' } else { '0' }).collect()
    }

    fn words(&self, states: &[StateNumber]) -> Vec<String> {
        states.iter().map(|state| self.word(*state)).collect()
    }

    fn states(&self) -> Vec<String> {
        self.words(&(0..self.flow.table.states.len() as u32).collect::<Vec<_>>())
    }

    fn reached(&self, to: &Reached) -> String {
        let states = self.words(to.states()).join(" ");
        match to {
            Reached::Exact { cycles, race, .. } => format!("{states} {cycles} {}", race.word()),
            Reached::Bound { state, truncated, .. } => {
                let bound: String = self.scenario.circuit.nets().map(|net| state.get(net.index()).letter()).collect();
                format!("{states} of {bound}{}", if *truncated { " and more" } else { "" })
            }
        }
    }

    /// A transition: state before, changes, what is reached.
    fn line(&self, transition: &Transition) -> String {
        let set: Vec<String> = transition
            .change
            .set
            .iter()
            .map(|(net, bit)| format!("{}={}", self.scenario.circuit.name(*net), u8::from(*bit)))
            .collect();
        format!("{} {} → {}", self.word(transition.from), set.join(" "), self.reached(&transition.to))
    }

    fn singles(&self) -> Vec<String> {
        let mut lines: Vec<String> = self.flow.table.single.iter().map(|single| self.line(single)).collect();
        lines.sort_unstable();
        lines
    }

    /// The steps, those that are not sure with a question mark.
    fn steps(&self) -> Vec<String> {
        let sure = |step: &Transition| if step.sure { "" } else { " ?" };
        self.flow.table.steps.iter().map(|step| format!("{}{}", self.line(step), sure(step))).collect()
    }

    fn pairs(&self, pairs: &[(StateNumber, NetId)]) -> Vec<String> {
        let mut all: Vec<String> = pairs
            .iter()
            .map(|(state, net)| format!("{} {}", self.word(*state), self.scenario.circuit.name(*net)))
            .collect();
        all.sort_unstable();
        all
    }
}

const LATCH: &str = r#"
outputs = ["q"]
[inputs]
r = 0
s = 0
[initial]
q = 0
[gates]
q = { nor = ["r", "qn"] }
qn = { nor = ["s", "q"] }
"#;

#[test]
fn the_nor_latch() {
    // by hand: q and qn hold while r = s = 0; r resets, s sets, both together drive both outputs low
    let seen = Seen::of(&format!(
        "{LATCH}{}",
        r#"
        [[steps]]
        set = { s = 1 }
        [[steps]]
        set = { r = 1 }
        [[steps]]
        label = "both released"
        set = { r = 0, s = 0 }
        [[steps]]
        set = { s = 1 }
        [[steps]]
        set = { s = 0 }
        "#
    ));
    // in the order in which they are found: start, steps, then single changes
    assert_eq!(seen.states(), ["0001", "0110", "1100", "0010", "1001"]);
    assert_eq!(seen.flow.table.start, [0]);
    assert_eq!(
        seen.singles(),
        [
            "0001 r=1 → 1001 0 none",
            "0001 s=1 → 0110 0 none",
            "0010 r=1 → 1001 0 none",
            "0010 s=1 → 0110 0 none",
            "0110 r=1 → 1100 0 none",
            "0110 s=0 → 0010 0 none",
            "1001 r=0 → 0001 0 none",
            "1001 s=1 → 1100 0 none",
            "1100 r=0 → 0110 0 none",
            "1100 s=0 → 1001 0 none",
        ]
    );
    // released together either may win, or both toggle for ever; a set puts an end to the doubt
    assert_eq!(
        seen.steps(),
        [
            "0001 s=1 → 0110 0 none",
            "0110 r=1 → 1100 0 none",
            "1100 r=0 s=0 → 0001 0010 1 critical",
            "0001 s=1 → 0110 0 none ?",
            "0010 s=1 → 0110 0 none ?",
            "0110 s=0 → 0010 0 none",
        ]
    );
    let moments: Vec<Option<u32>> = seen.flow.table.steps.iter().map(|step| step.moment).collect();
    assert_eq!(moments, [0, 1, 2, 3, 3, 4].map(Some));
    let table = &seen.flow.table;
    assert!(table.states.iter().all(|state| state.reachable && state.explored));
    assert!(!table.states_truncated && !table.steps_truncated && table.notes.is_empty(), "{:?}", table.notes);
    // there and back and there again is the same as there: no essential hazard; two inputs have none to ask for
    assert!(table.single.iter().all(|single| single.essential == Some(false)));
    assert_eq!(table.steps[0].essential, Some(false));
    assert_eq!(table.steps[2].essential, None);

    let coverage = &seen.flow.coverage;
    assert_eq!((coverage.all, coverage.exercised, coverage.truncated), (10, 3, false));
    assert_eq!(seen.pairs(&coverage.perhaps), ["0010 s"], "0001 s is made for sure by the first step");
    assert_eq!(seen.pairs(&coverage.missing), ["0001 r", "0010 r", "1001 r", "1001 s", "1100 r", "1100 s"]);

    let automaton = &seen.flow.automaton;
    assert_eq!(automaton.reading, Reading::Moore);
    assert_eq!(*automaton, Automaton { reading: Reading::Moore, ..Automaton::default() });
}

#[test]
fn with_both_outputs_the_latch_is_a_mealy_automaton() {
    // q = 0 in 1001 and in 1100, where the forbidden input drives qn low as well
    let seen = Seen::of(&LATCH.replace(r#"["q"]"#, r#"["q", "qn"]"#));
    let Reading::Mealy(a, b) = seen.flow.automaton.reading else { panic!("{:?}", seen.flow.automaton.reading) };
    assert_eq!(seen.words(&[a, b]), ["0001", "1100"]);
}

#[test]
fn the_c_element() {
    // c follows where a and b agree and holds where they do not (majority of a, b and c itself)
    let seen = Seen::of(
        r#"
        outputs = ["c"]
        [inputs]
        a = 0
        b = 0
        [gates]
        c = { majority = ["a", "b", "c"] }
        "#,
    );
    assert_eq!(
        seen.singles(),
        [
            "000 a=1 → 100 0 none",
            "000 b=1 → 010 0 none",
            "010 a=1 → 111 0 none",
            "010 b=0 → 000 0 none",
            "011 a=1 → 111 0 none",
            "011 b=0 → 000 0 none",
            "100 a=0 → 000 0 none",
            "100 b=1 → 111 0 none",
            "101 a=0 → 000 0 none",
            "101 b=1 → 111 0 none",
            "111 a=0 → 011 0 none",
            "111 b=0 → 101 0 none",
        ]
    );
    let coverage = &seen.flow.coverage;
    assert_eq!((coverage.all, coverage.exercised, coverage.missing.len()), (12, 0, 12));
    assert_eq!(seen.flow.automaton.reading, Reading::Moore);
}

#[test]
fn a_ring_oscillates_and_comes_back() {
    let seen = Seen::of(
        r#"
        outputs = ["ring"]
        [inputs]
        on = 0
        [gates]
        ring = { nand = ["on", "ring"] }
        [[steps]]
        set = { on = 1 }
        [[steps]]
        set = { on = 0 }
        [[steps]]
        set = { on = 1 }
        "#,
    );
    // while it is on it never rests: the second step meets no stable state, and ends all doubt
    assert_eq!(seen.states(), ["01"]);
    assert_eq!(seen.singles(), ["01 on=1 →  1 none"]);
    assert_eq!(seen.steps(), ["01 on=1 →  1 none", "01 on=1 →  1 none"]);
    assert_eq!(seen.flow.table.steps[1].moment, Some(2));
    let notes = &seen.flow.table.notes;
    assert!(notes.len() == 1 && notes[0].contains("\"step 2\""), "{notes:?}");
    assert_eq!(seen.flow.table.single[0].essential, Some(false), "no outcome is unique");
}

#[test]
fn a_divider_by_two_has_four_essential_hazards() {
    // methods: Unger 1959; the worked table 1 → 2 → 3 → 4 → 1 with codes 00, 01, 11, 10 [computed]: one change from each
    // of the four states leads to the next row, three lead two rows further
    let seen = Seen::of(
        r#"
        outputs = ["y1"]
        [inputs]
        x = 0
        [initial]
        y1 = 0
        [gates]
        y1 = { expr = "!x & y2 | x & y1 | y1 & y2" }
        y2 = { expr = "x & !y1 | !x & y2 | !y1 & y2" }
        [[steps]]
        set = { x = 1 }
        "#,
    );
    let expected = ["000 x=1 → 101 0 none", "011 x=1 → 110 0 none", "101 x=0 → 011 0 none", "110 x=0 → 000 0 none"];
    assert_eq!(seen.singles(), expected);
    assert!(seen.flow.table.single.iter().all(|single| single.essential == Some(true)));
    assert_eq!(seen.flow.table.steps[0].essential, Some(true));
}

#[test]
fn skew_lets_a_pulse_through_and_the_walk_goes_on_with_both() {
    // p pulses only if a rises before b falls; q then keeps the pulse for ever
    let seen = Seen::of(
        r#"
        outputs = ["q"]
        [inputs]
        a = 0
        b = 1
        [initial]
        q = 0
        [gates]
        p = { and = ["a", "b"] }
        q = { or = ["p", "q"] }
        [[steps]]
        set = { a = 1, b = 0 }
        skew = [0, 5]
        [[steps]]
        set = { a = 0 }
        [[steps]]
        set = { a = 1, b = 1 }
        [[steps]]
        set = { a = 0 }
        "#,
    );
    assert_eq!(
        seen.steps(),
        [
            "0100 a=1 b=0 → 1000 1001 0 critical",
            "1000 a=0 → 0000 0 none ?",
            "1001 a=0 → 0001 0 none ?",
            "0000 a=1 b=1 → 1111 0 none ?",
            "0001 a=1 b=1 → 1111 0 none ?",
            "1111 a=0 → 0101 0 none",
        ],
        "both ways lead to the same state in the end"
    );
    // once set, q stays: a dead end, since it was 0 elsewhere
    let ends = &seen.flow.automaton.dead_ends;
    assert_eq!(ends.len(), 1);
    let mut end = seen.words(&ends[0]);
    end.sort_unstable();
    assert_eq!(end, ["0001", "0101", "1001", "1111"]);
    assert!(ends[0].is_sorted());
}

#[test]
fn after_power_up_all_states_with_these_inputs_may_be() {
    let text = LATCH.replace("[inputs]", "begin = \"random\"\n[inputs]").replace("[initial]\nq = 0\n", "");
    let seen = Seen::of(&format!("{text}[[steps]]\nset = {{ s = 1 }}\n[[steps]]\nset = {{ s = 0 }}\n"));
    assert_eq!(seen.words(&seen.flow.table.start), ["0001", "0010"]);
    assert_eq!(
        seen.steps(),
        ["0001 s=1 → 0110 0 none ?", "0010 s=1 → 0110 0 none ?", "0110 s=0 → 0010 0 none"],
        "the set ends all doubt"
    );
    let moments: Vec<Option<u32>> = seen.flow.table.steps.iter().map(|step| step.moment).collect();
    assert_eq!(moments, [1, 1, 2].map(Some), "moment 0 is power-up");
    assert_eq!(seen.pairs(&seen.flow.coverage.perhaps), ["0001 s", "0010 s"]);
    assert_eq!(seen.flow.coverage.exercised, 1);
}

#[test]
fn wires_leave_only_the_bound() {
    // a wire of its own into q: a short pulse may still be on its way, so the exact method does not hold
    let text = LATCH.replace(r#"["r", "qn"] }"#, r#"["r", "qn"], wires = { qn = 1 } }"#);
    let steps = "[[steps]]\nset = { r = 1, s = 1 }\n[[steps]]\nset = { r = 0, s = 0 }\n[[steps]]\nset = { r = 1 }\n";
    let seen = Seen::of(&format!("{text}{steps}"));
    assert_eq!(
        seen.steps(),
        [
            "0001 r=1 s=1 → 1100 of 1100",
            "1100 r=0 s=0 → 0001 0010 of 00XX",
            "0001 r=1 → 1001 of 1001 ?",
            "0010 r=1 → 1001 of 1001 ?",
        ]
    );
    assert!(seen.flow.table.single.iter().all(|single| single.essential.is_none()));
    assert_eq!(seen.flow.table.single[0].to.only().map(|state| seen.word(state)).as_deref(), Some("1001"));
}

#[test]
fn bounce_is_bounded_by_ternary_simulation() {
    // q toggles whenever x has gone up and down: a bounce may leave it either way
    let toggle = r#"
        outputs = ["y1"]
        [inputs]
        x = 0
        [initial]
        y1 = 0
        [gates]
        y1 = { expr = "!x & y2 | x & y1 | y1 & y2" }
        y2 = { expr = "x & !y1 | !x & y2 | !y1 & y2" }
        [[steps]]
        set = { x = 1 }
        bounce = { lasting = 5, pulses = [0, 2] }
    "#;
    let seen = Seen::of(toggle);
    assert_eq!(seen.steps(), ["000 x=1 → 101 110 of 1XX"]);
    assert_eq!(seen.flow.table.steps[0].essential, None);
    // a contact that ends where it was bounces all the same
    let still = toggle.replace("x = 1 }", "x = 0 }");
    assert_eq!(Seen::of(&still).steps(), ["000 x=0 → 000 011 of 0XX"]);
}

#[test]
fn states_that_nothing_leads_to_come_last() {
    // k keeps a 1 only, which no change can bring back
    let seen = Seen::of(
        r#"
        outputs = ["k"]
        [inputs]
        a = 0
        [gates]
        k = { and = ["a", "k"] }
        "#,
    );
    assert_eq!(seen.states(), ["00", "10", "11"]);
    let table = &seen.flow.table;
    assert_eq!(table.states.iter().map(|state| state.reachable).collect::<Vec<_>>(), [true, true, false]);
    assert!(table.states[2].explored && !table.states_truncated);
    assert_eq!(seen.singles(), ["00 a=1 → 10 0 none", "10 a=0 → 00 0 none", "11 a=0 → 00 0 none"]);
    assert_eq!(seen.flow.coverage.all, 2, "what cannot be reached needs no test");
    assert_eq!(seen.flow.automaton.unreachable, [2]);
    assert_eq!(seen.flow.automaton.reading, Reading::Moore, "over the reachable states");
}

#[test]
fn a_latch_that_no_output_shows_makes_states_equal() {
    // k remembers that a was ever 1, and nobody looks at it
    let seen = Seen::of(
        r#"
        outputs = ["out"]
        [inputs]
        a = 0
        [initial]
        k = 0
        [gates]
        out = { buf = ["a"] }
        k = { or = ["a", "k"] }
        "#,
    );
    assert_eq!(seen.states(), ["000", "111", "001"]);
    assert_eq!(seen.flow.automaton.equal, [vec![0, 2]]);
    assert_eq!(seen.flow.automaton.reading, Reading::Mealy(1, 2), "out follows a, not k");
    // with k shown they differ
    let shown = Seen::of(
        r#"
        outputs = ["out"]
        [inputs]
        a = 0
        [initial]
        k = 0
        [gates]
        k = { or = ["a", "k"] }
        out = { xor = ["a", "k"] }
        "#,
    );
    assert!(shown.flow.automaton.equal.is_empty());
    assert_eq!(shown.words(&shown.flow.automaton.dead_ends[0]), ["110", "011"]);
}

#[test]
fn states_that_differ_only_later_are_not_equal() {
    // b sets k while a = 0; out shows k only while a = 1
    let seen = Seen::of(
        r#"
        outputs = ["out"]
        [inputs]
        a = 0
        b = 0
        [initial]
        k = 0
        [gates]
        k = { expr = "b & !a | k" }
        out = { and = ["a", "k"] }
        "#,
    );
    assert!(seen.flow.automaton.equal.is_empty(), "{:?}", seen.flow.automaton.equal);
}

#[test]
fn without_feedback_it_is_combinational() {
    let seen = Seen::of("outputs = [\"y\"]\n[inputs]\na = 0\nb = 1\n[gates]\ny = { and = [\"a\", \"b\"] }\n");
    assert_eq!(seen.flow.automaton, Automaton::default());
    assert_eq!(seen.flow.automaton.reading, Reading::Combinational);
    assert_eq!((seen.flow.table.states.len(), seen.flow.coverage.all), (4, 8));
}

#[test]
fn limits_that_cut_are_named() {
    let steps = "[[steps]]\ntimes = 40\nsteps = [{ set = { s = 1 } }, { set = { s = 0 } }, { set = { r = 1 } }, \
                 { set = { r = 0 } }]\n";
    let scenario = scenario(&format!("{LATCH}{steps}"));
    let control = Control::default();
    let cut = |limits: Limits| table(&scenario, limits, &control).unwrap();
    let all = cut(Limits::default());
    assert_eq!((all.steps.len(), all.single.len()), (160, 10));
    assert!(!all.steps_truncated && !all.states_truncated);
    // half of 30 for steps; the rest is enough for five states with two inputs
    let few = cut(Limits { transitions: 30, ..Limits::default() });
    assert_eq!((few.steps.len(), few.single.len()), (15, 10));
    assert!(few.steps_truncated && !few.states_truncated);
    assert_eq!(few.steps[..], all.steps[..15]);
    // eight for steps: all five states but 1100 are met, one of them is left without its changes
    let fewer = cut(Limits { transitions: 16, ..Limits::default() });
    assert_eq!((fewer.steps.len(), fewer.single.len()), (8, 8));
    assert!(fewer.steps_truncated && fewer.states_truncated);
    let explored: Vec<bool> = fewer.states.iter().map(|state| state.explored).collect();
    assert_eq!(explored, [true, true, true, true, false]);
    let none = cut(Limits { values: 1, ..Limits::default() });
    assert!(none.steps.len() <= 1 && none.single.is_empty() && none.steps_truncated && none.states_truncated);
    let coverage = Coverage::of(&none);
    assert!(coverage.truncated && coverage.all == 0);
    assert!(Automaton::of(&scenario, &none, &[]).truncated);
}

#[test]
fn a_budget_that_is_not_enough_leaves_the_bound_and_says_so() {
    let scenario = scenario(&format!("{LATCH}[[steps]]\nset = {{ r = 1, s = 1 }}\n"));
    let control = Control::default();
    let cut = table(&scenario, Limits { effort: 0, ..Limits::default() }, &control).unwrap();
    let bounds = cut.single.iter().filter(|single| matches!(single.to, Reached::Bound { .. })).count();
    assert!(bounds > 0);
    assert_eq!(cut.notes.len(), 1);
    assert!(cut.notes[0].contains("more than the budget of the multiple-winner method"), "{:?}", cut.notes);
    // the bound is as wide at least
    let whole = table(&scenario, Limits::default(), &control).unwrap();
    assert!(whole.notes.is_empty());
    for (narrow, wide) in whole.single.iter().zip(&cut.single) {
        assert!(narrow.to.states().iter().all(|state| {
            let values = &whole.states[*state as usize].values;
            wide.to.states().iter().any(|other| cut.states[*other as usize].values == *values)
        }));
    }
}

#[test]
fn without_one_state_to_start_from_the_rest_is_told() {
    let mut latch = Builder::new("latch");
    latch.input("r", false).input("s", false);
    latch.gate("q", crate::circuit::Function::Nor, ["r", "qn"]);
    latch.gate("qn", crate::circuit::Function::Nor, ["s", "q"]);
    latch.step(NewStep::rest("0").set("s", true));
    let scenario = latch.finish().unwrap();
    let q = scenario.circuit.net("q").unwrap();
    let flow = flow(&scenario, &[q], &Control::default()).unwrap();
    assert!(flow.table.start.is_empty());
    let notes = &flow.table.notes;
    assert!(notes[0].contains("no state to start from") && notes[1].contains("\"step 1\""), "{notes:?}");
    assert!(flow.table.steps.is_empty(), "nobody knows what the step meets");
    // what it leads to is known all the same, and so is what follows
    assert!(flow.automaton.unreachable.is_empty());
    assert_eq!((flow.table.states.len(), flow.coverage.all, flow.coverage.exercised), (5, 10, 0));
}

#[test]
fn a_hundred_thousand_gates_and_a_long_loop_of_steps() {
    let n = 100_000;
    let mut chain = Builder::new("chain");
    chain.input("in", false);
    for gate in 0..n {
        let before = if gate == 0 { "in".into() } else { format!("g{}", gate - 1) };
        chain.gate(format!("g{gate}"), crate::circuit::Function::Not, [before]);
    }
    let steps = vec![NewStep::rest("0").set("in", true), NewStep::rest("0").set("in", false)];
    chain.repeat(10_000, steps);
    let scenario = chain.finish().unwrap();
    let table = table(&scenario, Limits::default(), &Control::default()).unwrap();
    // two states and two changes: what recurs costs nothing, and the number of steps is the limit
    assert_eq!((table.states.len(), table.single.len(), table.steps.len()), (2, 2, 4096));
    assert!(table.steps_truncated && !table.states_truncated);
    assert_eq!(Coverage::of(&table).exercised, 2);
}

#[test]
fn a_caller_may_stop_it() {
    let scenario = scenario(LATCH);
    let control = Control::default();
    control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
    assert_eq!(flow(&scenario, &[], &control).unwrap_err(), FlowError::Cancelled);
}

/// Random networks of four gates: all stable states by trying every vector, and what can be reached by following changes
/// one by one.
#[test]
fn states_and_reach_of_random_networks() {
    // a small generator with a fixed seed (xorshift)
    let mut seed = 0x2545_f491_4f6c_dd1du64;
    let mut below = |most: usize| {
        seed ^= seed << 13;
        seed ^= seed >> 7;
        seed ^= seed << 17;
        (seed >> 33) as usize % most
    };
    const NAMES: [&str; 6] = ["a", "b", "w", "x", "y", "z"];
    let control = Control::default();
    let (mut unreachable, mut races) = (0, 0);
    for case in 0..300 {
        let mut text = String::from("outputs = [\"z\"]\nbegin = \"random\"\n[inputs]\na = 0\nb = 0\n[gates]\n");
        for gate in &NAMES[2..] {
            let function = ["nand", "nor", "and", "or", "xor"][below(5)];
            text += &format!("{gate} = {{ {function} = [\"{}\", \"{}\"] }}\n", NAMES[below(6)], NAMES[below(6)]);
        }
        let scenario = scenario(&text);
        let circuit = &scenario.circuit;
        let table = table(&scenario, Limits::default(), &control).unwrap();
        assert!(!table.states_truncated, "{text}");
        let all: Vec<Bits> = (0..64u32)
            .map(|vector| Bits::of((0..6).map(|net| vector >> net & 1 == 1)))
            .filter(|state| crate::statics::is_stable(circuit, &State::known(state.clone())))
            .collect();
        let mut listed: Vec<Bits> = table.states.iter().map(|state| state.values.clone()).collect();
        listed.sort_unstable();
        assert_eq!(listed, all, "case {case}:\n{text}");
        // with both inputs at 0 the run may begin in any state
        let mut reach: Vec<Bits> = all.iter().filter(|state| !state.get(0) && !state.get(1)).cloned().collect();
        assert_eq!(table.start.len(), reach.len());
        let mut next = 0;
        while next < reach.len() {
            for input in circuit.inputs() {
                let change = Change::of_one(&reach[next], input);
                let crate::statics::Outcome::Exact { states, race, .. } =
                    follow(&scenario, &reach[next], &change, false, &control).unwrap()
                else {
                    panic!("small enough");
                };
                races += usize::from(race == Race::Critical);
                for state in states {
                    if !reach.contains(&state) {
                        reach.push(state);
                    }
                }
            }
            next += 1;
        }
        for state in &table.states {
            assert_eq!(state.reachable, reach.contains(&state.values), "case {case}:\n{text}");
            unreachable += usize::from(!state.reachable);
        }
    }
    assert!(unreachable > 0 && races > 0, "{unreachable} unreachable, {races} races: both kinds are met");
}

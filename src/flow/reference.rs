//! What the reference network allows: the oracle that judges ask, and the comparison without delays as well.
//!
//! A settled state is allowed if what the reference can see of it, the inputs and the compared nets, is
//!
//! * that of a stable state of the reference for the inputs after the step, and
//! * where the step came at rest: among the stable states that the reference can reach, on that change of inputs and
//!   with any delays, from any of its stable states that shows what was seen before. No such state: nothing is allowed.
//!
//! What the reference can reach is found by the general multiple-winner method ([`outcome`]); where only a ternary bound
//! is known, nothing is claimed.

use std::collections::BTreeSet;
use std::sync::{Arc, Mutex, PoisonError};

use rustc_hash::FxHashMap;
use serde::{Deserialize, Serialize};

use crate::circuit::{Circuit, NetId};
use crate::control::Control;
use crate::logic::{Bits, State, Value};
use crate::scenario::Reference;
use crate::statics::{Change, GaveUp, Outcome, bound_restless, outcome, stable_states};

/// Stable states of the reference from which one change is followed, at most.
const STATES: usize = 256;
/// Most nodes of the decision diagram of one question, about 25 MB: a sweep may ask thousands.
const NODES: usize = 1 << 20;
/// Different views that a list of allowed ones keeps, at most.
const VIEWS: usize = 4096;
/// Words that are remembered: about 16 MB.
const REMEMBERED: usize = 1 << 21;

/// What the reference can see of a state: the inputs, then the compared nets in their order.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct View(Bits);

/// How the inputs of a step change.
#[derive(Clone, Debug, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Coming {
    /// All at one instant.
    Together,
    /// One after the other, in any order (skew).
    Apart,
    /// These, and whichever others change, any number of times before they stay: bounce, or steps of one instant that set
    /// an input twice, with skew.
    Restless(Vec<NetId>),
}

/// A window that ended at rest, as the reference sees it.
#[derive(Clone, Copy, Debug)]
pub struct Passed<'a> {
    /// Before the step, if it came at rest.
    pub before: Option<&'a View>,
    /// How the inputs changed.
    pub coming: &'a Coming,
    /// Where the window ended.
    pub after: &'a View,
}

/// What the reference says of a window.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Answer {
    /// It may end there.
    Allowed,
    /// It may not.
    NotAllowed,
    /// A budget ran out before that was known.
    GaveUp,
}

/// What the reference allows.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct List {
    /// Values of the compared nets in their order, ascending.
    pub values: Vec<Vec<bool>>,
    /// There may be more: a budget ran out, or a limit cut the list.
    pub open: bool,
}

/// The oracle of one reference network. It may be asked from several threads, answers the same whatever it was asked
/// before, and remembers a bounded number of answers.
pub struct Allowed {
    reference: Arc<Reference>,
    control: Control,
    memo: Mutex<Memo>,
}

/// Views that may follow, and whether there may be more.
#[derive(Clone, Debug, Default)]
struct Offer {
    views: BTreeSet<View>,
    open: bool,
}

/// A question whose answer is remembered.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
enum Key {
    /// What may follow this view when the inputs change to these?
    Follows(View, Coming, Bits),
    /// Is this the view of a stable state?
    Rests(View),
}

#[derive(Clone, Debug)]
enum Known {
    Offer(Arc<Offer>),
    /// `None`: gave up
    Rests(Option<bool>),
}

#[derive(Default)]
struct Memo {
    known: FxHashMap<Key, Known>,
    words: usize,
}

impl Memo {
    fn keep(&mut self, key: Key, known: Known) {
        let of = |view: &View| view.0.words().len() + 4;
        let words = match (&key, &known) {
            (Key::Follows(view, _, _), Known::Offer(offer)) => of(view) * (2 + offer.views.len()),
            (Key::Follows(view, _, _) | Key::Rests(view), _) => of(view),
        };
        if self.words + words > REMEMBERED {
            *self = Memo::default();
        }
        self.words += words;
        self.known.insert(key, known);
    }
}

impl std::fmt::Debug for Allowed {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Allowed").field("reference", &self.reference).finish_non_exhaustive()
    }
}

impl Allowed {
    /// The oracle of a reference. Of `control` only the budget counts, up to a million nodes: an answer is given whole.
    pub fn of(reference: Arc<Reference>, control: &Control) -> Allowed {
        let nodes = if control.nodes == 0 { NODES } else { control.nodes.min(NODES) };
        let control = Control { nodes, ..Control::default() };
        Allowed { reference, control, memo: Mutex::default() }
    }

    /// The reference network.
    pub fn reference(&self) -> &Reference {
        &self.reference
    }

    /// A view of all zeros, to be filled by [`Allowed::look`].
    pub fn blank(&self) -> View {
        View(Bits::zeros(self.inputs() + self.reference.compare.len()))
    }

    /// What the reference sees of a state of the circuit: values of all its nets.
    pub fn view(&self, state: &Bits) -> View {
        let mut view = self.blank();
        self.look(state, &mut view);
        view
    }

    /// As [`Allowed::view`], into a view that exists.
    pub fn look(&self, state: &Bits, view: &mut View) {
        let inputs = self.inputs();
        for input in 0..inputs {
            view.0.set(input, state.get(input));
        }
        for (at, (net, _)) in self.reference.compare.iter().enumerate() {
            view.0.set(inputs + at, state.get(net.index()));
        }
    }

    /// The compared nets of a view, in their order.
    pub fn compared(&self, view: &View) -> Vec<bool> {
        (self.inputs()..self.inputs() + self.reference.compare.len()).map(|at| view.0.get(at)).collect()
    }

    /// May the window end as it did?
    pub fn answer(&self, passed: &Passed<'_>) -> Answer {
        if let Some(before) = passed.before {
            let offer = self.offer(before, passed.coming, passed.after);
            if offer.views.contains(passed.after) {
                return Answer::Allowed;
            }
            if !offer.open {
                return Answer::NotAllowed;
            }
        }
        match (self.rests(passed.after), passed.before) {
            (Some(false), _) => Answer::NotAllowed,
            (Some(true), None) => Answer::Allowed,
            _ => Answer::GaveUp,
        }
    }

    /// What the reference allows in place of where the window ended: what may follow the view before; where that is not
    /// asked or not known, all its stable states for the inputs after.
    pub fn list(&self, passed: &Passed<'_>) -> List {
        let followed = passed.before.map(|before| self.offer(before, passed.coming, passed.after));
        let offer = match followed.filter(|offer| !offer.open) {
            Some(offer) => offer,
            None => Arc::new(self.at_rest(passed.after)),
        };
        let mut values: Vec<Vec<bool>> = offer.views.iter().map(|view| self.compared(view)).collect();
        values.sort_unstable();
        List { values, open: offer.open }
    }

    /// Is there one stable state of the reference that shows this view, from which the change offers all of these?
    /// `None`: gave up.
    pub fn offers(&self, before: &View, coming: &Coming, all: &[View]) -> Option<bool> {
        let Some(first) = all.first() else { return Some(true) };
        let Ok((starts, mut open)) = self.starts(before) else { return None };
        for start in &starts {
            let mut offer = Offer::default();
            self.follow(start, coming, first, &mut offer);
            if all.iter().all(|view| offer.views.contains(view)) {
                return Some(true);
            }
            open |= offer.open;
        }
        (!open).then_some(false)
    }

    fn inputs(&self) -> usize {
        self.reference.circuit.input_count()
    }

    /// What may follow a view when the inputs change to those of `after`.
    fn offer(&self, before: &View, coming: &Coming, after: &View) -> Arc<Offer> {
        let mut inputs = Bits::zeros(self.inputs());
        (0..self.inputs()).for_each(|input| inputs.set(input, after.0.get(input)));
        let key = Key::Follows(before.clone(), coming.clone(), inputs);
        if let Some(Known::Offer(offer)) = self.recall(&key) {
            return offer;
        }
        let mut offer = Offer::default();
        match self.starts(before) {
            Ok((starts, more)) => {
                offer.open |= more;
                starts.iter().for_each(|start| self.follow(start, coming, after, &mut offer));
            }
            Err(_) => offer.open = true,
        }
        let offer = Arc::new(offer);
        self.keep(key, Known::Offer(offer.clone()));
        offer
    }

    /// Adds what may follow one stable state of the reference.
    fn follow(&self, start: &Bits, coming: &Coming, after: &View, offer: &mut Offer) {
        let circuit = &self.reference.circuit;
        let restless = |net: &NetId| matches!(coming, Coming::Restless(inputs) if inputs.contains(net));
        let inputs = circuit.inputs().map(|net| (net, after.0.get(net.index())));
        let set = inputs.filter(|(net, bit)| start.get(net.index()) != *bit || restless(net)).collect();
        let change = Change { set, apart: *coming == Coming::Apart };
        let found = match coming {
            _ if change.set.is_empty() => Ok(Outcome::Bound(State::known(start.clone()))),
            Coming::Restless(_) => Ok(Outcome::Bound(bound_restless(circuit, start, &change).1)),
            _ => outcome(circuit, start, &change, &self.control),
        };
        match found {
            Ok(Outcome::Exact { states, .. }) => states.iter().for_each(|state| self.add(state, offer)),
            // known everywhere, it is the one state that can follow
            Ok(Outcome::Bound(state)) if !state.has_unknown() => self.add(&state.ones, offer),
            Ok(Outcome::Bound(_)) | Err(_) => offer.open = true,
        }
    }

    /// Adds the view of a state of the reference.
    fn add(&self, state: &Bits, offer: &mut Offer) {
        let inputs = self.inputs();
        let mut view = self.blank();
        for input in 0..inputs {
            view.0.set(input, state.get(input));
        }
        for (at, (_, net)) in self.reference.compare.iter().enumerate() {
            view.0.set(inputs + at, state.get(net.0.index()));
        }
        if offer.views.len() < VIEWS {
            offer.views.insert(view);
        } else {
            offer.open |= !offer.views.contains(&view);
        }
    }

    /// The stable states of the reference that show a view, and whether there are more.
    fn starts(&self, view: &View) -> Result<(Vec<Bits>, bool), GaveUp> {
        match self.known(view) {
            Some(known) => stable_states(&self.reference.circuit, &known, STATES, &self.control),
            None => Ok((Vec::new(), false)),
        }
    }

    /// Is a view that of a stable state of the reference? `None`: gave up.
    fn rests(&self, view: &View) -> Option<bool> {
        let Some(known) = self.known(view) else { return Some(false) };
        let key = Key::Rests(view.clone());
        if let Some(Known::Rests(rests)) = self.recall(&key) {
            return rests;
        }
        let found = stable_states(&self.reference.circuit, &known, 1, &self.control);
        let rests = found.ok().map(|(states, _)| !states.is_empty());
        self.keep(key, Known::Rests(rests));
        rests
    }

    /// All stable states of the reference for the inputs of a view.
    fn at_rest(&self, view: &View) -> Offer {
        let mut offer = Offer::default();
        match stable_states(&self.reference.circuit, &self.with_inputs(view), STATES, &self.control) {
            Ok((states, more)) => {
                offer.open = more;
                states.iter().for_each(|state| self.add(state, &mut offer));
            }
            Err(_) => offer.open = true,
        }
        offer
    }

    /// The reference with the inputs of a view, and no gate known.
    fn with_inputs(&self, view: &View) -> State {
        let circuit: &Circuit = &self.reference.circuit;
        let mut state = State::zeros(circuit.net_count());
        for net in circuit.nets() {
            let known = circuit.is_input(net).then(|| view.0.get(net.index()));
            state.set(net.index(), known.map_or(Value::X, Value::from));
        }
        state
    }

    /// What a view says of the nets of the reference; `None` if it says two things of one.
    fn known(&self, view: &View) -> Option<State> {
        let mut state = self.with_inputs(view);
        for (at, (_, net)) in self.reference.compare.iter().enumerate() {
            let (net, bit): (NetId, bool) = (net.0, view.0.get(self.inputs() + at));
            match state.get(net.index()).known() {
                Some(other) if other != bit => return None,
                _ => state.set(net.index(), Value::from(bit)),
            }
        }
        Some(state)
    }

    fn recall(&self, key: &Key) -> Option<Known> {
        self.memo.lock().unwrap_or_else(PoisonError::into_inner).known.get(key).cloned()
    }

    fn keep(&self, key: Key, known: Known) {
        self.memo.lock().unwrap_or_else(PoisonError::into_inner).keep(key, known);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::reader;

    /// The oracle of a reference written as in a file, beside a circuit that is the same network.
    fn oracle(inputs: &str, compare: &str, gates: &str, nodes: usize) -> Allowed {
        let inputs: String = inputs.split_whitespace().map(|net| format!("{net} = 0\n")).collect();
        let text = format!(
            "begin = \"random\"\n[inputs]\n{inputs}[gates]\n{gates}\n[reference]\ncompare = [{compare}]\n\
             [reference.gates]\n{gates}\n"
        );
        let scenario =
            reader::read(&text, "reference.toml").unwrap_or_else(|it| panic!("{}", it.render(false))).scenario;
        Allowed::of(scenario.reference.unwrap(), &Control { nodes, ..Control::default() })
    }

    fn view(letters: &str) -> View {
        View(Bits::of(letters.chars().map(|letter| letter == '1').collect::<Vec<_>>().into_iter()))
    }

    fn ask(allowed: &Allowed, before: &str, coming: &Coming, after: &str) -> Answer {
        let (from, to) = (view(before), view(after));
        let before = (!before.is_empty()).then_some(&from);
        allowed.answer(&Passed { before, coming, after: &to })
    }

    fn list(allowed: &Allowed, before: &str, coming: &Coming, after: &str) -> (Vec<String>, bool) {
        let (from, to) = (view(before), view(after));
        let before = (!before.is_empty()).then_some(&from);
        let List { values, open } = allowed.list(&Passed { before, coming, after: &to });
        let text = |values: &Vec<bool>| values.iter().map(|bit| if *bit { '1' } else { '0' }).collect();
        (values.iter().map(text).collect(), open)
    }

    use Answer::{GaveUp as Open, NotAllowed as No};
    use Coming::{Apart, Together};
    const YES: Answer = Answer::Allowed;

    /// Views are `permit key kept`.
    fn memory() -> Allowed {
        oracle("permit key", "\"kept\"", r#"kept = { expr = "key & permit | !key & kept" }"#, 0)
    }

    #[test]
    fn a_memory_keeps_its_bit() {
        let memory = memory();
        // the key is let go: either bit is stable, and only the one that was there may follow
        assert_eq!(ask(&memory, "111", &Together, "101"), YES);
        assert_eq!(ask(&memory, "111", &Together, "100"), No);
        assert_eq!(list(&memory, "111", &Together, "100"), (vec!["1".into()], false));
        // not known from where: both
        assert_eq!(ask(&memory, "", &Together, "100"), YES);
        assert_eq!(list(&memory, "", &Together, "100"), (vec!["0".into(), "1".into()], false));
        // with the key pressed there is one
        assert_eq!(ask(&memory, "", &Together, "110"), No);
        assert_eq!(list(&memory, "", &Together, "110"), (vec!["1".into()], false));
    }

    #[test]
    fn from_where_the_reference_cannot_be_nothing_may_follow() {
        let memory = memory();
        assert_eq!(ask(&memory, "110", &Together, "100"), No, "no stable state shows 110");
        assert_eq!(ask(&memory, "110", &Together, "101"), No);
        assert_eq!(list(&memory, "110", &Together, "101"), (vec![], false));
    }

    #[test]
    fn where_no_input_changes_the_state_stays() {
        let memory = memory();
        assert_eq!((ask(&memory, "100", &Together, "100"), ask(&memory, "100", &Together, "101")), (YES, No));
        assert_eq!((ask(&memory, "100", &Apart, "100"), ask(&memory, "100", &Apart, "101")), (YES, No));
    }

    #[test]
    fn inputs_that_change_apart_leave_more_open() {
        // it remembers that a was seen without b; views are `a b seen`
        let seen = oracle("a b", "\"seen\"", r#"seen = { expr = "a & !b | seen" }"#, 0);
        assert_eq!((ask(&seen, "000", &Together, "110"), ask(&seen, "000", &Together, "111")), (YES, No));
        assert_eq!((ask(&seen, "000", &Apart, "110"), ask(&seen, "000", &Apart, "111")), (YES, YES));
        assert_eq!(list(&seen, "000", &Apart, "110"), (vec!["0".into(), "1".into()], false));
        // a moved to and fro and is where it was; the bound says nothing of `seen`
        let restless = Coming::Restless(vec![NetId(0)]);
        assert_eq!((ask(&seen, "000", &restless, "000"), ask(&seen, "000", &restless, "001")), (Open, Open));
        assert_eq!(ask(&seen, "000", &Together, "001"), No);
        // but b alone cannot make it
        let restless = Coming::Restless(vec![NetId(1)]);
        assert_eq!((ask(&seen, "000", &restless, "000"), ask(&seen, "000", &restless, "001")), (YES, No));
    }

    #[test]
    fn first_come_first_served() {
        let gates = r#"
            upper = { expr = "call_upper & !lower" }
            lower = { expr = "call_lower & !upper" }"#;
        let both = oracle("call_upper call_lower", "\"upper\", \"lower\"", gates, 0);
        assert_eq!(list(&both, "0000", &Together, "1100"), (vec!["01".into(), "10".into()], false));
        assert_eq!(ask(&both, "1010", &Together, "1101"), No, "the one that has it keeps it");
        assert_eq!(ask(&both, "1010", &Together, "1110"), YES);
        // they change over only through neither
        assert_eq!(list(&both, "1010", &Together, "0101"), (vec!["01".into()], false));
    }

    /// A ring of 14 gates that all leave 0 together is more than the exact method follows.
    fn ring() -> Allowed {
        let gates: String =
            (0..14).map(|at| format!("g{at} = {{ nor = [\"stop\", \"g{}\"] }}\n", (at + 1) % 14)).collect();
        oracle("stop", "\"g0\", \"g1\"", &gates, 0)
    }

    #[test]
    fn where_only_a_bound_is_known_nothing_is_claimed() {
        let ring = ring();
        assert_eq!(ask(&ring, "100", &Together, "001"), Open);
        assert_eq!(ask(&ring, "100", &Together, "010"), Open);
        // but no stable state has both
        assert_eq!(ask(&ring, "100", &Together, "011"), No);
        assert_eq!(list(&ring, "100", &Together, "011"), (vec!["01".into(), "10".into()], false));
        // back to one state, which the bound knows
        assert_eq!((ask(&ring, "010", &Together, "100"), ask(&ring, "010", &Together, "110")), (YES, No));
        assert_eq!(ring.offers(&view("100"), &Together, &[view("001"), view("010")]), None);
    }

    #[test]
    fn a_budget_that_runs_out_is_no_answer() {
        let gates: String =
            (0..14).map(|at| format!("g{at} = {{ nor = [\"stop\", \"g{}\"] }}\n", (at + 1) % 14)).collect();
        let all: Vec<String> = (0..1).map(|at| format!("\"g{at}\"")).collect();
        let poor = oracle(
            "stop other",
            &all.join(", "),
            &(gates + "h = { xor = [\"h\", \"other\"] }\nk = { buf = [\"k\"] }"),
            2,
        );
        assert_eq!(ask(&poor, "", &Together, "001"), Open);
        assert_eq!(list(&poor, "", &Together, "001"), (vec![], true));
    }

    #[test]
    fn one_state_offers_what_several_together_do_not() {
        // `mode` is a bit that never changes and that nobody sees; views are `a out`
        let hidden = oracle("a", "\"out\"", "mode = { buf = [\"mode\"] }\nout = { and = [\"a\", \"mode\"] }", 0);
        assert_eq!(list(&hidden, "00", &Together, "10"), (vec!["0".into(), "1".into()], false));
        assert_eq!(hidden.offers(&view("00"), &Together, &[view("10"), view("11")]), Some(false));
        assert_eq!(hidden.offers(&view("00"), &Together, &[view("11")]), Some(true));
        assert_eq!(hidden.offers(&view("11"), &Together, &[view("00")]), Some(true));
    }

    #[test]
    fn answers_do_not_depend_on_what_was_asked_before_nor_on_who_asks() {
        let gates = r#"
            upper = { expr = "call_upper & !lower" }
            lower = { expr = "call_lower & !upper" }"#;
        let letters = |number: u32| (0..4).map(|at| if number >> at & 1 == 1 { '1' } else { '0' }).collect::<String>();
        let fresh = |before: u32, after: u32| {
            let one = oracle("call_upper call_lower", "\"upper\", \"lower\"", gates, 0);
            ask(&one, &letters(before), &Apart, &letters(after))
        };
        let truth: Vec<Answer> = (0..256).map(|it| fresh(it / 16, it % 16)).collect();
        assert!(truth.contains(&YES) && truth.contains(&No));
        let shared = oracle("call_upper call_lower", "\"upper\", \"lower\"", gates, 0);
        std::thread::scope(|scope| {
            for turn in 0..3u32 {
                let (shared, truth) = (&shared, &truth);
                scope.spawn(move || {
                    for it in (0..256).map(|it| (it * 37 + turn * 101) % 256) {
                        let answer = ask(shared, &letters(it / 16), &Apart, &letters(it % 16));
                        assert_eq!(answer, truth[it as usize], "{it}");
                    }
                });
            }
        });
    }
}

//! What may follow what: transitions, coverage, automaton, hazards, reference.

use serde::{Serialize, Serializer};

use super::listed::beginning;
use super::parts::{Level, Lines, Object, OneLine, state, values};
use crate::circuit::{Circuit, NetId};
use crate::flow::{
    Automaton, Beyond, Choice, Compared, Contained, Coverage, Flow, FlowTable, Hazard, Reached, Reading, StateNumber,
    Transition, TransitionRef,
};
use crate::logic::Value;
use crate::output::{flow_words, words};
use crate::scenario::Scenario;
use crate::statics::Change;

type Values<'a> = OneLine<Object<&'a str, Level>>;

/// Writes a list entry by entry, so that a long one is never held as a whole.
pub(super) struct Each<'a, T, F> {
    list: &'a [T],
    entry: F,
}

impl<'a, T, S: Serialize, F: Fn(&'a T) -> S> Serialize for Each<'a, T, F> {
    fn serialize<To: Serializer>(&self, to: To) -> Result<To::Ok, To::Error> {
        to.collect_seq(self.list.iter().map(|it| (self.entry)(it)))
    }
}

fn each<'a, T, S: Serialize, F: Fn(&'a T) -> S>(list: &'a [T], entry: F) -> Each<'a, T, F> {
    Each { list, entry }
}

/// Names of nets, and values of states.
#[derive(Clone, Copy)]
struct Of<'a> {
    scenario: &'a Scenario,
    circuit: &'a Circuit,
    table: &'a FlowTable,
    /// most values of nets that one list holds
    most: usize,
}

/// Which lists of states are cut: these hold more values than one list may.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Cuts {
    pub table: bool,
    pub start: bool,
    pub transitions: bool,
    pub hazards: bool,
}

impl<'a> Of<'a> {
    fn state(self, number: StateNumber) -> Values<'a> {
        let bits = flow_words::values(self.table, number);
        values(self.circuit, self.circuit.nets(), |net| Value::from(bits.get(net.index())))
    }

    fn some(self, nets: impl Iterator<Item = (NetId, bool)>) -> Values<'a> {
        OneLine(Object(nets.map(|(net, bit)| (self.circuit.name(net), Level(Value::from(bit)))).collect()))
    }

    fn set(self, change: &Change) -> Values<'a> {
        self.some(change.set.iter().copied())
    }

    fn states(self, numbers: &'a [StateNumber]) -> impl Serialize + 'a {
        each(self.first(numbers, |_| 1), move |number| self.state(*number))
    }

    /// The first entries of a list of states: as many as it may hold; `states` tells how many states an entry has.
    fn first<T>(self, list: &'a [T], states: impl Fn(&T) -> usize) -> &'a [T] {
        beginning(list, self.most, |entry| states(entry) * self.circuit.net_count())
    }

    /// Is a list longer than it may be?
    fn cuts<T>(self, list: &'a [T], states: impl Fn(&T) -> usize) -> bool {
        self.first(list, states).len() < list.len()
    }

    /// The transitions that are listed: of steps, and of single inputs.
    fn transitions(self) -> (&'a [Transition], &'a [Transition]) {
        let outcomes = |to: &Reached| match to {
            Reached::Exact { states, .. } => states.len(),
            Reached::Bound { .. } => 1,
        };
        let values = |it: &Transition| (1 + outcomes(&it.to)) * self.circuit.net_count();
        let steps = beginning(&self.table.steps, self.most, values);
        let left = self.most.saturating_sub(steps.iter().map(values).sum());
        (steps, if steps.len() < self.table.steps.len() { &[] } else { beginning(&self.table.single, left, values) })
    }

    /// A change of one input that steps do not make, or only perhaps.
    fn gap(self, gap: &(StateNumber, NetId)) -> Gap<'a> {
        let change = Change::of_one(flow_words::values(self.table, gap.0), gap.1);
        Gap { number: flow_words::state(gap.0), state: self.state(gap.0), change: self.set(&change) }
    }
}

#[derive(Serialize)]
struct Gap<'a> {
    number: String,
    state: Values<'a>,
    change: Values<'a>,
}

/// One transition; see the design of the format for the keys.
#[derive(Serialize)]
struct Moves<'a> {
    step: Option<&'a str>,
    from: Values<'a>,
    set: Values<'a>,
    outcomes: Vec<Values<'a>>,
    oscillation: Option<bool>,
    race: Option<&'static str>,
    method: &'static str,
    essential: Option<bool>,
    sure: Option<bool>,
}

impl<'a> Moves<'a> {
    fn of(of: Of<'a>, transition: &Transition) -> Moves<'a> {
        let reached = &transition.to;
        let outcomes = match reached {
            Reached::Exact { states, .. } => states.iter().map(|number| of.state(*number)).collect(),
            Reached::Bound { state: bound, .. } => vec![state(of.circuit, bound)],
        };
        Moves {
            step: words::step(of.scenario, transition.moment),
            from: of.state(transition.from),
            set: of.set(&transition.change),
            outcomes,
            oscillation: flow_words::oscillates(reached),
            race: flow_words::race(reached).map(|race| race.word()),
            method: flow_words::method(reached),
            // known only where the exact method is
            essential: flow_words::race(reached).and(transition.essential),
            sure: transition.moment.map(|_| transition.sure),
        }
    }
}

/// Which lists are cut.
pub(super) fn cuts(scenario: &Scenario, flow: &Flow, most: usize) -> Cuts {
    let of = of(scenario, flow, most);
    let (steps, single) = of.transitions();
    Cuts {
        table: of.cuts(&flow.table.states, |_| 1),
        start: of.cuts(&flow.table.start, |_| 1),
        transitions: steps.len() + single.len() < flow.table.steps.len() + flow.table.single.len(),
        hazards: of.cuts(&flow.hazards, |_| 1),
    }
}

/// The transitions: steps first.
pub(super) fn transitions<'a>(scenario: &'a Scenario, flow: &'a Flow, most: usize) -> impl Serialize + 'a {
    struct Both<'a>(Of<'a>);
    impl Serialize for Both<'_> {
        fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
            let (steps, single) = self.0.transitions();
            to.collect_seq(steps.iter().chain(single).map(|transition| Moves::of(self.0, transition)))
        }
    }
    Both(of(scenario, flow, most))
}

fn of<'a>(scenario: &'a Scenario, flow: &'a Flow, most: usize) -> Of<'a> {
    Of { scenario, circuit: &scenario.circuit, table: &flow.table, most }
}

/// A state of the table with its name in the other files.
#[derive(Serialize)]
struct Numbered<'a> {
    number: String,
    state: Values<'a>,
    reachable: bool,
    explored: bool,
}

/// The states of the table, in its order.
pub(super) fn table<'a>(scenario: &'a Scenario, flow: &'a Flow, most: usize) -> impl Serialize + 'a {
    struct All<'a>(Of<'a>);
    impl Serialize for All<'_> {
        fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
            let of = self.0;
            to.collect_seq((0..).zip(of.first(&of.table.states, |_| 1)).map(|(number, state)| Numbered {
                number: flow_words::state(number),
                state: of.state(number),
                reachable: state.reachable,
                explored: state.explored,
            }))
        }
    }
    All(of(scenario, flow, most))
}

/// The states in which a run may begin.
pub(super) fn start<'a>(scenario: &'a Scenario, flow: &'a Flow, most: usize) -> impl Serialize + 'a {
    of(scenario, flow, most).states(&flow.table.start)
}

/// Which single-input changes the steps make.
pub(super) fn coverage<'a>(scenario: &'a Scenario, flow: &'a Flow, most: usize) -> impl Serialize + 'a {
    #[derive(Serialize)]
    struct Document<P, M> {
        all: u64,
        exercised: u64,
        perhaps: P,
        missing: M,
        truncated: bool,
    }
    let of = of(scenario, flow, most);
    let Coverage { all, exercised, perhaps, missing, truncated } = &flow.coverage;
    Document {
        all: *all,
        exercised: *exercised,
        perhaps: each(of.first(perhaps, |_| 1), move |gap| of.gap(gap)),
        missing: each(of.first(missing, |_| 1), move |gap| of.gap(gap)),
        truncated: *truncated || of.cuts(perhaps, |_| 1) || of.cuts(missing, |_| 1),
    }
}

/// The circuit as an automaton.
pub(super) fn automaton<'a>(scenario: &'a Scenario, flow: &'a Flow, most: usize) -> impl Serialize + 'a {
    #[derive(Serialize)]
    struct Document<'a, U, D, E> {
        reading: &'static str,
        /// Two states that agree in the state variables and differ in an output.
        witness: Option<[Values<'a>; 2]>,
        unreachable: U,
        dead_ends: D,
        equal: E,
        truncated: bool,
    }
    let of = of(scenario, flow, most);
    let Automaton { reading, unreachable, dead_ends, equal, truncated } = &flow.automaton;
    Document {
        reading: match reading {
            Reading::Combinational => "combinational",
            Reading::Moore => "moore",
            Reading::Mealy(..) => "mealy",
        },
        witness: match reading {
            Reading::Mealy(one, other) => Some([of.state(*one), of.state(*other)]),
            Reading::Combinational | Reading::Moore => None,
        },
        unreachable: of.states(unreachable),
        dead_ends: each(of.first(dead_ends, Vec::len), move |group: &Vec<StateNumber>| of.states(group)),
        equal: each(of.first(equal, Vec::len), move |class: &Vec<StateNumber>| of.states(class)),
        truncated: *truncated
            || of.cuts(unreachable, |_| 1)
            || [dead_ends, equal].into_iter().any(|list| {
                let longest = list.first().is_some_and(|group| of.cuts(group, |_| 1));
                longest || of.cuts(list, Vec::len)
            }),
    }
}

/// The ability to glitch.
#[derive(Serialize)]
struct AbleTo<'a> {
    net: &'a str,
    shape: &'static str,
    cause: &'static str,
    built: bool,
    step: Option<&'a str>,
    from: Values<'a>,
    set: Values<'a>,
    states: u64,
    cure: Option<Term<'a>>,
}

#[derive(Serialize)]
struct Term<'a> {
    literals: Values<'a>,
    expression: &'a str,
}

/// Hazards.
pub(super) fn hazards<'a>(scenario: &'a Scenario, flow: &'a Flow, most: usize) -> impl Serialize + 'a {
    let of = of(scenario, flow, most);
    each(of.first(&flow.hazards, |_| 1), move |hazard: &'a Hazard| AbleTo {
        net: words::net(scenario, hazard.net),
        shape: hazard.shape.word(),
        cause: hazard.cause.word(),
        built: hazard.built,
        step: words::step(scenario, hazard.moment),
        from: of.state(hazard.from),
        set: of.set(&hazard.change),
        states: hazard.states,
        cure: hazard
            .cure
            .as_ref()
            .map(|cure| Term { literals: of.some(cure.literals.iter().copied()), expression: &cure.expression }),
    })
}

/// Against the reference; `None` if there is none.
pub(super) fn reference<'a>(scenario: &'a Scenario, flow: &'a Flow, most: usize) -> Option<impl Serialize + 'a> {
    #[derive(Serialize)]
    struct Document<'a, B, C> {
        states: &'static str,
        counterexample: Option<Values<'a>>,
        beyond: B,
        choices: C,
        compared: u64,
        not_compared: u64,
        truncated: bool,
    }
    #[derive(Serialize)]
    struct NotThere<'a> {
        step: Option<&'a str>,
        from: Values<'a>,
        set: Values<'a>,
        reached: Values<'a>,
        allowed: Lines<Object<&'a str, Level>>,
    }
    #[derive(Serialize)]
    struct Offered<'a> {
        step: Option<&'a str>,
        from: Values<'a>,
        set: Values<'a>,
        outcomes: Lines<Object<&'a str, Level>>,
    }
    let of = of(scenario, flow, most);
    let Compared { states, beyond, choices, compared, not_compared } = flow.compared.as_ref()?;
    let nets: Vec<NetId> = scenario.reference.iter().flat_map(|it| it.compare.iter().map(|pair| pair.0)).collect();
    let projections = move |list: &[Vec<bool>]| {
        let object = |bits: &Vec<bool>| {
            let each = nets.iter().zip(bits).map(|(net, bit)| (of.circuit.name(*net), Level(Value::from(*bit))));
            Object(each.collect())
        };
        Lines(list.iter().map(object).collect())
    };
    let again = projections.clone();
    let transition = |number: TransitionRef| match number {
        TransitionRef::Step(number) => &flow.table.steps[number as usize],
        TransitionRef::Single(number) => &flow.table.single[number as usize],
    };
    Some(Document {
        states: match states {
            Contained::Proved => "proved",
            Contained::Not(_) => "not",
            Contained::GaveUp => "gave up",
        },
        counterexample: match states {
            Contained::Not(values) => Some(of.some(values.iter().copied())),
            Contained::Proved | Contained::GaveUp => None,
        },
        beyond: each(of.first(beyond, |it| 2 + it.allowed.len()), move |it: &Beyond| {
            let from = transition(it.transition);
            NotThere {
                step: words::step(scenario, from.moment),
                from: of.state(from.from),
                set: of.set(&from.change),
                reached: of.state(it.reached),
                allowed: projections(&it.allowed),
            }
        }),
        choices: each(of.first(choices, |it| 1 + it.outcomes.len()), move |it: &Choice| {
            let from = transition(it.transition);
            Offered {
                step: words::step(scenario, from.moment),
                from: of.state(from.from),
                set: of.set(&from.change),
                outcomes: again(&it.outcomes),
            }
        }),
        compared: *compared,
        not_compared: *not_compared,
        truncated: of.cuts(beyond, |it| 2 + it.allowed.len()) || of.cuts(choices, |it| 1 + it.outcomes.len()),
    })
}

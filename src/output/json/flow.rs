//! What may follow what: transitions, coverage, automaton, hazards, reference.

use serde::{Serialize, Serializer};

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
        each(numbers, move |number| self.state(*number))
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

/// The transitions: steps first.
pub(super) fn transitions<'a>(scenario: &'a Scenario, flow: &'a Flow) -> impl Serialize + 'a {
    struct Both<'a>(Of<'a>);
    impl Serialize for Both<'_> {
        fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
            let all = self.0.table.steps.iter().chain(&self.0.table.single);
            to.collect_seq(all.map(|transition| Moves::of(self.0, transition)))
        }
    }
    Both(of(scenario, flow))
}

fn of<'a>(scenario: &'a Scenario, flow: &'a Flow) -> Of<'a> {
    Of { scenario, circuit: &scenario.circuit, table: &flow.table }
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
pub(super) fn table<'a>(scenario: &'a Scenario, flow: &'a Flow) -> impl Serialize + 'a {
    struct All<'a>(Of<'a>);
    impl Serialize for All<'_> {
        fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
            let of = self.0;
            to.collect_seq((0..).zip(&of.table.states).map(|(number, state)| Numbered {
                number: flow_words::state(number),
                state: of.state(number),
                reachable: state.reachable,
                explored: state.explored,
            }))
        }
    }
    All(of(scenario, flow))
}

/// The states in which a run may begin.
pub(super) fn start<'a>(scenario: &'a Scenario, flow: &'a Flow) -> impl Serialize + 'a {
    of(scenario, flow).states(&flow.table.start)
}

/// Which single-input changes the steps make.
pub(super) fn coverage<'a>(scenario: &'a Scenario, flow: &'a Flow) -> impl Serialize + 'a {
    #[derive(Serialize)]
    struct Document<P, M> {
        all: u64,
        exercised: u64,
        perhaps: P,
        missing: M,
        truncated: bool,
    }
    let of = of(scenario, flow);
    let Coverage { all, exercised, perhaps, missing, truncated } = &flow.coverage;
    Document {
        all: *all,
        exercised: *exercised,
        perhaps: each(perhaps, move |gap| of.gap(gap)),
        missing: each(missing, move |gap| of.gap(gap)),
        truncated: *truncated,
    }
}

/// The circuit as an automaton.
pub(super) fn automaton<'a>(scenario: &'a Scenario, flow: &'a Flow) -> impl Serialize + 'a {
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
    let of = of(scenario, flow);
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
        dead_ends: each(dead_ends, move |group: &Vec<StateNumber>| of.states(group)),
        equal: each(equal, move |class: &Vec<StateNumber>| of.states(class)),
        truncated: *truncated,
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
pub(super) fn hazards<'a>(scenario: &'a Scenario, flow: &'a Flow) -> impl Serialize + 'a {
    let of = of(scenario, flow);
    each(&flow.hazards, move |hazard: &'a Hazard| AbleTo {
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
pub(super) fn reference<'a>(scenario: &'a Scenario, flow: &'a Flow) -> Option<impl Serialize + 'a> {
    #[derive(Serialize)]
    struct Document<'a, B, C> {
        states: &'static str,
        counterexample: Option<Values<'a>>,
        beyond: B,
        choices: C,
        compared: u64,
        not_compared: u64,
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
    let of = of(scenario, flow);
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
        beyond: each(beyond, move |it: &Beyond| {
            let from = transition(it.transition);
            NotThere {
                step: words::step(scenario, from.moment),
                from: of.state(from.from),
                set: of.set(&from.change),
                reached: of.state(it.reached),
                allowed: projections(&it.allowed),
            }
        }),
        choices: each(choices, move |it: &Choice| {
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
    })
}

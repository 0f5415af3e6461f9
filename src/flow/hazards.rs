//! Hazards of the changes of a flow table, as the textbooks define them.
//!
//! A change of inputs from a stable state meets combinational logic: the circuit with its feedback nets cut, whose sources
//! are the inputs and the feedback nets ([`crate::statics::transients`]). In fundamental mode that logic first goes from
//! (new inputs, old state) on: each output and each next-state function makes the transition (x, y) → (x′, y). That is the
//! transition judged here, of every watched net and of every feedback net, the latter by what is wanted of it before it
//! moves (Huffman 1957; McCluskey 1962; Unger 1969):
//!
//! * *static hazard*: the function has one value before and after, and the net may leave it;
//! * *dynamic hazard*: it changes, and the net may change three times or more;
//! * *function hazard*: the net's function alone, as one gate that sees the inputs change one after the other in some
//!   order, changes that often. Only a change of several inputs can have it, and no choice of gates or delays cures it;
//! * *logic hazard*: the function does not, its gates may.
//!
//! All this is whatever the delays of gates *and wires*. With wires that take no time, and with what is known of delays,
//! a hazard may be unable to show: that is for the other views.
//!
//! What happens once feedback nets move, (x′, y) → (x′, y′), is not judged here: whether they win or lose a race is said
//! of the whole transition, whether an input may be late behind them is the essential hazard. A hazard found here is
//! real all the same when a feedback net moves later in the same transition: delays have no bound, so all of it can happen
//! before. Only what is seen then is this and the rest: a static hazard of a net that goes on to change shows as a dynamic
//! glitch.
//!
//! The delay of a loop is thought to be at its feedback net. Cut elsewhere, the same pulse may appear as the hazard of another
//! net of the loop.

use rustc_hash::FxHashMap;

use super::cures::Cures;
use super::{Cause, FlowError, FlowTable, Hazard, StateNumber, Transition};
use crate::circuit::{Circuit, GateId, NetId};
use crate::control::Control;
use crate::logic::{Bits, Shape};
use crate::statics::built::Built;
use crate::statics::transients::{Exhausted, Open, Transients, Verdict, longest_alternation};

/// Most inputs of a net that may change at once, to tell function from logic: all their orders are looked at.
pub const MAX_CHANGING: usize = 12;

/// Most steps of the search in all: words of gates (a source read, a position of a lattice), values of functions.
pub const MAX_WORK: u64 = 1 << 25;

/// Most different cures of one hazard; states that need another have none.
const CURES_EACH: usize = 8;

/// What was found.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Hazards {
    /// Of the steps first, by moment, then of single-input changes; by net.
    pub list: Vec<Hazard>,
    /// A limit cut the search for hazards or for their cures: there may be more.
    pub truncated: bool,
    /// Nets and changes, once for each state, of which nothing is known: too many inputs change at once, or there are too
    /// many changes to count.
    pub not_judged: u64,
}

/// The hazards of all transitions of a flow table, of these nets and of all feedback nets. Of the table, only the
/// states and the changes are used, not what follows them.
///
/// Only gates that may move are looked at, so the time goes with what moves, not with the circuit; after `MAX_WORK`
/// steps it ends, and the result says so.
///
/// Errors: only [`FlowError::Cancelled`]. Panics if the table is not one of this circuit.
pub fn hazards(
    circuit: &Circuit,
    watched: &[NetId],
    table: &FlowTable,
    control: &Control,
) -> Result<Hazards, FlowError> {
    within(circuit, watched, table, control, MAX_WORK)
}

fn within(
    circuit: &Circuit,
    watched: &[NetId],
    table: &FlowTable,
    control: &Control,
    most: u64,
) -> Result<Hazards, FlowError> {
    let mut judged = vec![false; circuit.net_count()];
    for net in watched.iter().chain(circuit.feedback()) {
        judged[net.index()] = !circuit.is_input(*net);
    }
    let open = Open::of(circuit);
    let built = Built::of(circuit);
    let built_open =
        built.as_ref().map(|built| (built, Open::cut_at(&built.circuit, &built.order, circuit.feedback())));
    let mut search = Search {
        judged,
        plain: View { transients: Transients::new(&open), open: &open },
        built: built_open.as_ref().map(|(built, open)| BuiltView {
            built,
            view: View { transients: Transients::new(open), open },
            state: None,
        }),
        found: Found {
            cures: Cures::new(circuit, &open, built_open.as_ref().map(|(_, open)| open), table),
            by: FxHashMap::default(),
            list: Vec::new(),
        },
        not_judged: 0,
        most,
    };
    let mut truncated = false;
    for transition in table.steps.iter().chain(&table.single) {
        if control.cancelled() {
            return Err(FlowError::Cancelled);
        }
        if search.transition(transition, &table.states[transition.from as usize].values).is_err() {
            truncated = true;
            break;
        }
    }
    let Search { found, not_judged, .. } = search;
    let truncated = truncated || found.cures.exhausted;
    Ok(Hazards { list: found.sorted(), truncated, not_judged })
}

/// The words of one network.
struct View<'a> {
    open: &'a Open<'a>,
    transients: Transients<'a>,
}

/// The same with expressions built of several gates.
struct BuiltView<'a> {
    built: &'a Built,
    view: View<'a>,
    /// The values of its nets in this state of the table.
    state: Option<(StateNumber, Bits)>,
}

struct Search<'a> {
    /// The nets to judge.
    judged: Vec<bool>,
    plain: View<'a>,
    built: Option<BuiltView<'a>>,
    found: Found<'a>,
    not_judged: u64,
    most: u64,
}

impl Search<'_> {
    fn transition(&mut self, transition: &Transition, state: &Bits) -> Result<(), Exhausted> {
        let moving: Vec<NetId> = transition.change.moving(state).map(|(net, _)| net).collect();
        if moving.is_empty() {
            return Ok(());
        }
        let most = self.most;
        let transients = &mut self.plain.transients;
        transients.change(state, &moving, most)?;
        let circuit = self.plain.open.circuit;
        let nets: Vec<NetId> = transients
            .looked_at()
            .iter()
            .map(|gate| circuit.net_of(*gate))
            .filter(|net| self.judged[net.index()])
            .collect();
        // nets that need no second look
        let mut known = Vec::new();
        for net in nets {
            let verdict = self.plain.transients.wanted(state, net).verdict();
            if verdict == Verdict::Clean {
                continue;
            }
            known.push(net);
            let cause = self.plain.cause(net, state, &moving, most)?;
            match (verdict, cause) {
                (Verdict::Hazard(shape), Some(cause)) => {
                    self.found.add(transition, state, &moving, net, shape, cause, false);
                }
                // the function shows by itself what was not counted to the end
                (Verdict::Unknown, Some(Cause::Function)) => {
                    self.found.add(transition, state, &moving, net, Shape::Dynamic, Cause::Function, false);
                }
                _ => self.not_judged += 1,
            }
        }
        if let Some(built) = &mut self.built {
            let full = match &mut built.state {
                Some((number, full)) if *number == transition.from => full,
                other => &mut other.insert((transition.from, built.built.state(state))).1,
            };
            let transients = &mut built.view.transients;
            // one allowance for both
            let spent = self.plain.transients.work();
            transients.change(full, &moving, most.saturating_sub(spent))?;
            for gate in transients.looked_at().to_vec() {
                let net = built.view.open.circuit.net_of(gate);
                if !self.judged.get(net.index()).is_some_and(|judged| *judged) || known.contains(&net) {
                    continue;
                }
                // as one gate each it is clean, so the function is
                match transients.wanted(full, net).verdict() {
                    Verdict::Clean => {}
                    Verdict::Hazard(shape) => {
                        self.found.add(transition, state, &moving, net, shape, Cause::Logic, true);
                    }
                    Verdict::Unknown => self.not_judged += 1,
                }
            }
        }
        Ok(())
    }
}

impl View<'_> {
    /// Does the net's function alone do more than it must? `None` if too many of its inputs change.
    fn cause(&mut self, net: NetId, state: &Bits, moving: &[NetId], most: u64) -> Result<Option<Cause>, Exhausted> {
        if moving.len() == 1 {
            return Ok(Some(Cause::Logic));
        }
        let (gates, inputs) = self.moving_cone(net, state, moving);
        if inputs.len() < 2 {
            return Ok(Some(Cause::Logic));
        }
        if inputs.len() > MAX_CHANGING {
            return Ok(None);
        }
        let circuit = self.open.circuit;
        let sources: u64 = gates.iter().map(|gate| circuit.sources(*gate).len() as u64).sum();
        self.transients.add_work(sources << inputs.len());
        if self.transients.work() > most {
            return Err(Exhausted);
        }
        // values on the way, of the nets that move; a feedback net among them is seen at its old value
        let mut now = state.clone();
        let mut values = Vec::with_capacity(1 << inputs.len());
        for row in 0..1usize << inputs.len() {
            for (i, input) in inputs.iter().enumerate() {
                now.set(input.index(), state.get(input.index()) ^ (row >> i & 1 == 1));
            }
            let mut wanted = false;
            for gate in &gates {
                wanted = circuit.wants(*gate, |source| now.get(source.index()));
                if !self.open.is_source(circuit.net_of(*gate)) {
                    now.set(circuit.net_of(*gate).index(), wanted);
                }
            }
            values.push(wanted);
        }
        let changes = longest_alternation(&vec![2; inputs.len()], &values);
        Ok(Some(if changes > 1 { Cause::Function } else { Cause::Logic }))
    }

    /// The gates of the net's open cone that may move, the net's own last, and the inputs that move them.
    fn moving_cone(&self, net: NetId, state: &Bits, moving: &[NetId]) -> (Vec<GateId>, Vec<NetId>) {
        let circuit = self.open.circuit;
        let own = circuit.driver(net).expect("only nets of gates are judged");
        let (mut gates, mut inputs) = (vec![own], Vec::new());
        let mut seen: rustc_hash::FxHashSet<NetId> = rustc_hash::FxHashSet::default();
        let mut next = 0;
        while let Some(gate) = gates.get(next) {
            next += 1;
            for (source, _) in circuit.sources(*gate) {
                if self.transients.seen(state, *source).changes == 0 || !seen.insert(*source) {
                    continue;
                }
                match circuit.driver(*source) {
                    Some(driver) => gates.push(driver),
                    None => inputs.push(*source),
                }
            }
        }
        gates.sort_unstable_by_key(|gate| self.open.rank(*gate));
        inputs.sort_unstable();
        debug_assert!(inputs.iter().all(|input| moving.contains(input)), "only inputs that change move anything");
        (gates, inputs)
    }
}

/// What hazards of one entry have in common: moment, or for single-input changes the input and its new value.
type Key = (Option<u32>, Option<(NetId, bool)>, NetId, Shape, Cause, bool);

struct Found<'a> {
    cures: Cures<'a>,
    /// Places in `list`.
    by: FxHashMap<Key, Vec<usize>>,
    list: Vec<Hazard>,
}

impl Found<'_> {
    #[allow(clippy::too_many_arguments)] // all of one hazard
    fn add(
        &mut self,
        transition: &Transition,
        state: &Bits,
        moving: &[NetId],
        net: NetId,
        shape: Shape,
        cause: Cause,
        built: bool,
    ) {
        let moment = transition.moment;
        let single = if moment.is_none() { transition.change.moving(state).next() } else { None };
        let entries = self.by.entry((moment, single, net, shape, cause, built)).or_default();
        let curable = cause == Cause::Logic && shape != Shape::Dynamic;
        let mut cure = None;
        if curable {
            let covers = |hazard: &Hazard| {
                let holds = |(net, bit): &(NetId, bool)| state.get(net.index()) == *bit && !moving.contains(net);
                hazard.cure.as_ref().is_some_and(|cure| cure.literals.iter().all(holds))
            };
            if let Some(at) = entries.iter().find(|at| covers(&self.list[**at])) {
                self.list[*at].states += 1;
                return;
            }
            if entries.len() < CURES_EACH {
                cure = self.cures.of(net, built, state, moving, shape);
            }
        }
        if cure.is_none()
            && let Some(at) = entries.iter().find(|at| self.list[**at].cure.is_none())
        {
            self.list[*at].states += 1;
            return;
        }
        entries.push(self.list.len());
        let change = transition.change.clone();
        self.list.push(Hazard { net, shape, cause, built, moment, from: transition.from, change, states: 1, cure });
    }

    fn sorted(self) -> Vec<Hazard> {
        let mut list = self.list;
        list.sort_by(|a, b| {
            let key = |h: &Hazard| (h.moment.is_none(), h.moment, h.net, h.shape, h.cause, h.built);
            key(a).cmp(&key(b)).then_with(|| a.change.cmp(&b.change)).then_with(|| a.from.cmp(&b.from))
        });
        list
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::{Function, GateSpec};
    use crate::flow::{FlowState, Reached};
    use crate::statics::{Change, Race};

    fn gate(name: &str, function: Function, pins: &[u32]) -> GateSpec {
        GateSpec { name: name.into(), function, pins: pins.iter().map(|pin| NetId(*pin)).collect() }
    }

    /// One state, all inputs at 0 and the gates at rest, and changes of these inputs from it.
    fn table(circuit: &Circuit, changes: &[&[u32]]) -> FlowTable {
        let mut values = Bits::zeros(circuit.net_count());
        for gate in circuit.evaluation_order() {
            let value = circuit.wants(*gate, |net| values.get(net.index()));
            values.set(circuit.net_of(*gate).index(), value);
        }
        let steps = changes.iter().map(|nets| Transition {
            moment: Some(0),
            from: 0,
            change: Change { set: nets.iter().map(|net| (NetId(*net), true)).collect(), apart: false },
            to: Reached::Exact { states: vec![0], cycles: 0, race: Race::None },
            essential: None,
            sure: true,
        });
        let steps = steps.collect();
        FlowTable { states: vec![FlowState { values, reachable: true, explored: true }], steps, ..FlowTable::default() }
    }

    #[test]
    fn more_inputs_than_all_their_orders_are_looked_at_for_are_not_judged() {
        let names: Vec<String> = (0..14).map(|i| format!("i{i}")).collect();
        let pins: Vec<u32> = (0..14).collect();
        let gates = vec![gate("odd", Function::Xor, &pins), gate("few", Function::Xor, &pins[..3])];
        let circuit = Circuit::new(&names, gates, vec![]).unwrap();
        let watched: Vec<NetId> = circuit.nets().skip(14).collect();
        let found = hazards(&circuit, &watched, &table(&circuit, &[&pins[..]]), &Control::default()).unwrap();
        assert_eq!(found.not_judged, 1);
        assert!(!found.truncated);
        // only the inputs that the net can see count
        assert_eq!(found.list.iter().map(|h| (h.net, h.cause)).collect::<Vec<_>>(), [(NetId(15), Cause::Function)]);
        let twelve = hazards(&circuit, &watched, &table(&circuit, &[&pins[..12]]), &Control::default()).unwrap();
        assert_eq!((twelve.list.len(), twelve.not_judged), (2, 0));
    }

    #[test]
    fn a_dynamic_word_that_is_not_counted_to_the_end_is_not_judged() {
        // 21 nets of one input each, half of them inverted; 11 at 0 before, 11 at 1 after
        let mut gates: Vec<GateSpec> = (0..21)
            .map(|at| gate(&format!("w{at}"), if at < 10 { Function::Not } else { Function::Buf }, &[0]))
            .collect();
        gates.push(gate("most", Function::Majority, &(1..22).collect::<Vec<_>>()));
        let circuit = Circuit::new(&["a"], gates, vec![]).unwrap();
        let found = hazards(&circuit, &[NetId(22)], &table(&circuit, &[&[0]]), &Control::default()).unwrap();
        assert_eq!((found.list.len(), found.not_judged), (0, 1));
    }

    #[test]
    fn a_limit_that_cuts_is_named_and_a_wish_to_stop_is_heard() {
        let gates = vec![gate("n", Function::Not, &[0]), gate("f", Function::And, &[0, 1])];
        let circuit = Circuit::new(&["a"], gates, vec![]).unwrap();
        let table = table(&circuit, &[&[0], &[0]]);
        let all = within(&circuit, &[NetId(2)], &table, &Control::default(), 1000).unwrap();
        assert_eq!((all.list[0].states, all.truncated), (2, false));
        // the first transition takes two steps for the inverter and three for the AND
        let cut = within(&circuit, &[NetId(2)], &table, &Control::default(), 5).unwrap();
        assert_eq!((cut.list[0].states, cut.truncated), (1, true));
        let control = Control::default();
        control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
        assert_eq!(hazards(&circuit, &[NetId(2)], &table, &control), Err(FlowError::Cancelled));
    }
}

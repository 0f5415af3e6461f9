//! One run: the event loop. One source for two and three values, one and many pending events a node, any queue, any
//! observer.
//!
//! The queue holds nodes: gates and wire ends, at most one entry each. With many pending events a node, all of them wait
//! in the node's own list and the queue holds the earliest. All events of one instant are applied together; then every
//! gate that reads a changed net is evaluated once.

mod hot;
mod inside;
mod node;
mod outside;

use std::collections::VecDeque;
use std::marker::PhantomData;

use self::node::{Event, Node, lines};
use super::agenda::{Agenda, Due};
use super::firing::Firing;
use super::level::Level;
use super::observer::{End, Finish, Hit, Observer, Opening};
use super::plan::{Plan, Rule};
use super::queue::{NEVER, Queue};
use super::recovery::age;
use super::recurrence::{Mark, Recurrence, Rest};
use crate::circuit::NetId;
use crate::control::Control;
use crate::instance::Instance;
use crate::logic::{State, Value};
use crate::time::{Span, Time};

/// How many events may be pending at one node, and whether a gate has a delay of its own for each.
pub trait Pending {
    /// More than one?
    const MANY: bool;
    /// May firings of one gate differ?
    const ANEW: bool = false;
}

/// Inertial gates and no wires: one pending event a gate.
#[derive(Clone, Copy, Debug)]
pub struct One;

/// Gates with other filters, or wires: a list a node.
#[derive(Clone, Copy, Debug)]
pub struct Many;

/// Lists, and a delay for each firing: a gate's delays in its node are those of the event that it scheduled last.
#[derive(Clone, Copy, Debug)]
pub struct Anew;

impl Pending for One {
    const MANY: bool = false;
}

impl Pending for Many {
    const MANY: bool = true;
}

impl Pending for Anew {
    const MANY: bool = true;
    const ANEW: bool = true;
}

/// The event loop for one choice of values, queue and pending events.
pub struct Kernel<L: Level, Q, P, T> {
    nodes: Vec<Node<L, T>>,
    template: Vec<Node<L, T>>,
    inputs: Vec<L>,
    state: State,
    queue: Q,
    later: Vec<VecDeque<Event<L, T>>>,
    /// For each gate the previous change of its output as computed, also if it vanished; empty without involution.
    previous: Vec<Option<i128>>,
    firing: Firing,
    recurrence: Recurrence,
    agenda: Agenda,
    due: Due,
    batch: Vec<u32>,
    /// Gates to evaluate, with the change that they heard of.
    dirty: Vec<(u32, T)>,
    owners: Vec<NetId>,
    now: u64,
    /// Transitions of nets in this window.
    transitions: u64,
    events: u64,
    /// The last event of this window; [`NEVER`] before the first.
    last: u64,
    /// A node that last was at work in a block that had not recurred.
    at_work: u32,
    pending: PhantomData<P>,
}

/// The window that is open.
#[derive(Clone, Copy, Debug)]
struct Open {
    moment: u32,
    start: Time,
    settle_from: Time,
    began_at_rest: bool,
    /// The last instant before the time limit, fs; [`NEVER`] without a limit.
    limit: u64,
}

impl Open {
    #[inline(always)]
    fn new(plan: &Plan, moment: u32, start: Time, settle_from: Time, began_at_rest: bool) -> Open {
        let limit = match plan.limits.time.map(|limit| start + limit) {
            Some(limit) if limit < Time::END => limit.fs(),
            _ => NEVER,
        };
        Open { moment, start, settle_from, began_at_rest, limit }
    }
}

/// Batches between two looks at whether the run is cancelled.
const LOOK: u64 = 1 << 16;
/// Delays that the queue is told of at most.
const DELAYS: usize = 1000;

impl<L: Level, Q: Queue, P: Pending, T: Copy + Default> Kernel<L, Q, P, T> {
    pub(super) fn new(plan: &Plan) -> Self {
        let nodes = plan.nodes();
        let template = (0..nodes as u32).map(|node| Node::new(plan, node)).collect::<Vec<_>>();
        let mut kernel = Kernel {
            nodes: template.clone(),
            template,
            inputs: vec![L::of(Value::Zero); plan.circuit.input_count()],
            state: State::zeros(plan.circuit.net_count()),
            queue: Q::new(nodes),
            later: if P::MANY { vec![VecDeque::new(); nodes] } else { Vec::new() },
            previous: if plan.has_involution() { vec![None; plan.gates as usize] } else { Vec::new() },
            firing: Firing::default(),
            recurrence: Recurrence::new(&plan.circuit),
            agenda: Agenda::default(),
            due: Due::default(),
            batch: Vec::new(),
            dirty: Vec::new(),
            owners: Vec::new(),
            now: 0,
            transitions: 0,
            events: 0,
            last: NEVER,
            at_work: 0,
            pending: PhantomData,
        };
        if let Some(start) = &plan.start {
            kernel.load(plan, start);
            kernel.template.copy_from_slice(&kernel.nodes);
        }
        kernel
    }

    /// Takes over a state: outputs, wire ends and input sums.
    fn load(&mut self, plan: &Plan, state: &State) {
        let inputs = self.inputs.len();
        let gates = plan.circuit.gate_count();
        for (node, it) in self.nodes.iter_mut().enumerate() {
            let net = if node < gates { inputs + node } else { plan.wire_source(node - gates).index() };
            it.out = L::of(state.get(net));
            it.next = it.out;
        }
        for gate in plan.circuit.gates() {
            let mut sum = L::Sum::default();
            for &(net, weight) in plan.circuit.sources(gate) {
                L::add(&mut sum, weight, L::of(state.get(net.index())));
            }
            self.nodes[gate.index()].sum = sum;
        }
    }

    fn reset(&mut self, plan: &Plan, instance: &Instance) {
        self.nodes.copy_from_slice(&self.template);
        match &plan.start {
            Some(start) => self.state.copy_from(start),
            None => {
                let mut start = State::zeros(plan.circuit.net_count());
                plan.open_start(instance, &mut start);
                self.load(plan, &start);
                self.state.copy_from(&start);
            }
        }
        for (input, value) in self.inputs.iter_mut().enumerate() {
            *value = L::of(self.state.get(input));
        }
        let gates = plan.circuit.gate_count();
        for (node, delay) in self.nodes.iter_mut().zip(&instance.delays.gate) {
            node.delay = delay.map(Span::fs);
        }
        for (node, delay) in self.nodes[gates..].iter_mut().zip(&instance.delays.wire) {
            node.delay = delay.map(Span::fs);
        }
        let delays = || {
            let delays = &instance.delays;
            let every = (delays.gate.len() + delays.wire.len()).div_ceil(DELAYS).max(1);
            delays.gate.iter().chain(&delays.wire).step_by(every).flatten().map(|delay| delay.fs()).collect()
        };
        self.queue.clear(delays);
        for list in &mut self.later {
            list.clear();
        }
        self.previous.fill(None);
        if P::ANEW {
            self.firing.reset(instance);
        }
        self.recurrence.reset();
        self.agenda.reset(&plan.stimulus, instance);
        self.now = 0;
        self.events = 0;
        self.transitions = 0;
        self.last = NEVER;
    }

    /// Runs one case to its end. Returns false if the control cancelled it (the observer then hears no `finish`).
    pub(super) fn run<O: Observer<Tag = T>>(
        &mut self,
        plan: &Plan,
        instance: &Instance,
        control: &Control,
        observer: &mut O,
    ) -> bool {
        self.reset(plan, instance);
        observer.start(&self.state);
        let mut open: Option<Open> = None;
        if plan.power_up {
            let opening = Opening {
                at: Time::ZERO,
                moments: &[0],
                at_rest: true,
                inputs: &[],
                settle_from: Time::ZERO,
                pending: &[],
                state: &self.state,
            };
            observer.open(&opening);
            open = Some(Open::new(plan, 0, Time::ZERO, Time::ZERO, true));
            let mut hot = self.hot(plan);
            for gate in 0..plan.circuit.gate_count() as u32 {
                hot.evaluate(gate, 0, T::default(), observer);
            }
            observer.batch(Time::ZERO);
        }

        if self.agenda.is_waiting() {
            self.agenda.look(&plan.stimulus, Time::ZERO, &self.state);
        }
        let fs = |at: Option<Time>| at.map_or(NEVER, Time::fs);
        let mut timed = fs(self.agenda.next(&plan.stimulus, instance, None));
        let mut batches = 0u64;
        let end = loop {
            if batches >= LOOK {
                batches = 0;
                if control.cancelled() {
                    return false;
                }
            }
            let quiet_since = self.queue.is_empty().then_some(Time::from_fs(self.now));
            // what is timed stays as it is from one outside batch to the next; only a step at rest depends on the circuit
            let outside = match timed {
                NEVER if quiet_since.is_some() => fs(self.agenda.next(&plan.stimulus, instance, quiet_since)),
                timed => timed,
            };
            let outside = outside.max(self.now);
            let at = self.top(plan, outside).min(outside);
            if self.agenda.is_waiting()
                && let Some(deadline) = self.deadline(plan, open, at)
            {
                self.now = deadline;
                break self.interrupted(plan);
            }
            if at == NEVER {
                break End::Settled;
            }
            let limit = open.map_or(NEVER, |window| window.limit);
            if at > limit.min(Time::END.fs() - 1) {
                let busy = quiet_since.is_none() || self.agenda.is_moving();
                if busy && at > limit {
                    // nothing happens up to the limit, so this far it has been looked at
                    self.now = limit;
                    break End::Unsettled(Hit::Time);
                }
                if at >= Time::END.fs() {
                    break if busy { End::Unsettled(Hit::Longest) } else { End::Settled };
                }
            }
            if outside == at {
                self.queue.pass(at);
                timed = self.outside(plan, instance, at, quiet_since, &mut open, observer);
                batches += 1;
            } else {
                let until = outside.min(limit.saturating_add(1)).min(Time::END.fs());
                // once a block has recurred, each batch may be the one after which all at work have
                let one = self.agenda.is_waiting() || timed == NEVER && self.recurrence.any();
                batches += self.inside(plan, at, until, one, observer);
            }
            if self.agenda.is_waiting() && self.agenda.look(&plan.stimulus, Time::from_fs(at), &self.state) {
                timed = fs(self.agenda.next(&plan.stimulus, instance, None));
            }
            if self.recurrence.is_touched() {
                self.look_for_recurrence(plan);
            }
            if self.recurrence.any()
                && !self.queue.is_empty()
                && timed == NEVER
                && self.agenda.deadline(&plan.stimulus).is_none()
                && !self.works_on()
                && self.all_recurred(plan)
            {
                break self.oscillating(plan);
            }
            if self.transitions >= plan.limits.transitions && (!self.queue.is_empty() || self.agenda.is_moving()) {
                break End::Unsettled(Hit::Transitions);
            }
        };
        if let Some(window) = open {
            self.find_owners(plan, end == End::Settled);
            self.close(plan, window, Time::from_fs(self.now), end, observer);
        }
        let never_came = self.agenda.waiting_for(&plan.stimulus).filter(|_| !matches!(end, End::Unsettled(_)));
        observer.finish(&Finish {
            at: Time::from_fs(self.now),
            end,
            state: &self.state,
            events: self.events,
            never_came,
        });
        true
    }

    /// When the earliest node is due; [`NEVER`] if none is up to `until`.
    #[inline(always)]
    fn top(&mut self, plan: &Plan, until: u64) -> u64 {
        self.queue.top(until, &lines(&self.nodes, plan))
    }

    /// When the next step stops waiting for its pattern, if that is before everything else: the next batch and the time
    /// limit of the window. What happens at that very instant may still bring it.
    #[cold]
    fn deadline(&self, plan: &Plan, open: Option<Open>, next: u64) -> Option<u64> {
        let deadline = self.agenda.deadline(&plan.stimulus)?.fs();
        let busy = !self.queue.is_empty() || self.agenda.is_moving();
        let limit = plan.limits.time.zip(open).filter(|_| busy).map(|(limit, window)| (window.start + limit).fs());
        (deadline < Time::END.fs() && deadline < next && limit.is_none_or(|at| deadline <= at)).then_some(deadline)
    }

    /// How a window ends that something from outside ends.
    fn interrupted(&mut self, plan: &Plan) -> End {
        let moving = self.agenda.is_moving();
        match self.queue.is_empty() && !moving {
            true => End::Settled,
            false if !moving && self.recurrence.any() && self.all_recurred(plan) => self.oscillating(plan),
            false => End::Cut,
        }
    }

    /// Is the node that last was at work in a block that had not recurred so still?
    fn works_on(&self) -> bool {
        self.nodes.get(self.at_work as usize).is_some_and(|node| node.due != NEVER && !self.recurrence.has(node.block))
    }

    fn all_recurred(&mut self, plan: &Plan) -> bool {
        let mut other = None;
        self.queue.each(&lines(&self.nodes, plan), |node| {
            if !self.recurrence.has(self.nodes[node as usize].block) {
                other = Some(node);
            }
        });
        self.at_work = other.unwrap_or(self.at_work);
        other.is_none()
    }

    fn oscillating(&self, plan: &Plan) -> End {
        match self.first_recurred(plan) {
            Some(found) => End::Oscillating { period: found.period, range: found.range },
            None => End::Cut,
        }
    }

    #[cold]
    fn look_for_recurrence(&mut self, plan: &Plan) {
        let (nodes, later, previous, now) = (&self.nodes, &self.later, &self.previous, self.now);
        let firing = &self.firing;
        let pending = |index: u32, into: &mut Vec<Rest>| {
            let node = &nodes[index as usize];
            if P::MANY && node.kind.is_listed() {
                into.extend(later[index as usize].iter().map(|event| (index, event.due - now, event.value.value())));
                if node.kind.rule == Rule::Involution {
                    // what its age alters are the delays to come
                    let delay = if P::ANEW { firing.ahead(index) } else { node.delay };
                    into.push((index, age(plan.figure(index), &delay, previous[index as usize], now), Value::X));
                }
            } else if node.next != node.out {
                into.push((index, node.due - now, node.next.value()));
            }
        };
        let mark = |index: u32| nodes[index as usize].mark;
        let own = |index: u32| if P::ANEW { firing.own(index) } else { 0 };
        self.recurrence.end_batch(now, &mark, &pending, &own, &|index| NetId(plan.inputs + index));
        let nodes = &mut self.nodes;
        self.recurrence.mark_anew(|index| {
            let node = &mut nodes[index as usize];
            node.mark = Mark::new(node.out);
        });
    }
}

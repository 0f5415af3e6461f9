//! One run: the event loop. One source for two and three values, one and many pending events a node, any queue, any
//! observer.
//!
//! The queue holds nodes: gates and wire ends, at most one entry each. With many pending events a node, all of them wait
//! in the node's own list and the queue holds the earliest. All events of one instant are applied together; then every
//! gate that reads a changed net is evaluated once.

use std::collections::VecDeque;
use std::marker::PhantomData;

use super::agenda::{Agenda, Due};
use super::firing::Firing;
use super::observer::{Cancelled, Closing, End, Finish, Hit, Observer, Opening, Site};
use super::plan::{Kind, Plan, Rule};
use super::queue::Queue;
use super::recovery::{age, recovering};
use super::recurrence::{Recurred, Recurrence, Rest};
use crate::circuit::{GateId, NetId, WireId};
use crate::control::Control;
use crate::instance::Instance;
use crate::logic::{State, Value};
use crate::time::{Span, Time};

use super::level::Level;

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

/// A gate or a wire end. A gate has an event pending if `next != out` (one a node) or its list is not empty (many).
#[derive(Clone, Copy, Debug)]
struct Node<L: Level, T> {
    due: u64,
    sum: L::Sum,
    table: u64,
    delay: [u64; 2],
    fan: (u32, u32),
    out: L,
    /// The value after all pending events.
    next: L,
    kind: Kind,
    tag: T,
}

/// A pending event in a node's list.
#[derive(Clone, Copy, Debug)]
struct Event<L, T> {
    due: u64,
    /// When it was scheduled.
    since: u64,
    value: L,
    tag: T,
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
    changed: Vec<NetId>,
    owners: Vec<NetId>,
    now: u64,
    transitions: u64,
    events: u64,
    last: Option<Time>,
    pending: PhantomData<P>,
}

/// The window that is open.
#[derive(Clone, Copy, Debug)]
struct Open {
    moment: u32,
    start: Time,
    settle_from: Time,
    began_at_rest: bool,
}

impl<L: Level, Q: Queue, P: Pending, T: Copy + Default> Kernel<L, Q, P, T> {
    pub(super) fn new(plan: &Plan) -> Self {
        let nodes = plan.nodes();
        let template = (0..nodes as u32)
            .map(|node| Node {
                due: 0,
                sum: L::Sum::default(),
                table: plan.table(node),
                delay: [1, 1],
                fan: plan.fan_range(node),
                out: L::of(Value::Zero),
                next: L::of(Value::Zero),
                kind: plan.kind(node),
                tag: T::default(),
            })
            .collect::<Vec<_>>();
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
            changed: Vec::new(),
            owners: Vec::new(),
            now: 0,
            transitions: 0,
            events: 0,
            last: None,
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
        for (input, value) in self.inputs.iter_mut().enumerate() {
            *value = L::of(state.get(input));
        }
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
        self.queue.clear();
        for list in &mut self.later {
            list.clear();
        }
        self.previous.fill(None);
        match &plan.start {
            Some(start) => {
                self.nodes.copy_from_slice(&self.template);
                for (input, value) in self.inputs.iter_mut().enumerate() {
                    *value = L::of(start.get(input));
                }
                self.state.copy_from(start);
            }
            None => {
                self.nodes.copy_from_slice(&self.template);
                let mut start = State::zeros(plan.circuit.net_count());
                plan.open_start(instance, &mut start);
                self.load(plan, &start);
                self.state.copy_from(&start);
            }
        }
        let gates = plan.circuit.gate_count();
        for (node, delay) in self.nodes.iter_mut().zip(&instance.delays.gate) {
            node.delay = delay.map(Span::fs);
        }
        for (node, delay) in self.nodes[gates..].iter_mut().zip(&instance.delays.wire) {
            node.delay = delay.map(Span::fs);
        }
        if P::ANEW {
            self.firing.reset(instance);
        }
        self.recurrence.reset();
        self.agenda.reset(&plan.stimulus, instance);
        self.now = 0;
        self.events = 0;
        self.transitions = 0;
        self.last = None;
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
            open = Some(Open { moment: 0, start: Time::ZERO, settle_from: Time::ZERO, began_at_rest: true });
            for gate in 0..plan.circuit.gate_count() as u32 {
                self.evaluate(plan, gate, 0, T::default(), observer);
            }
            observer.batch(Time::ZERO);
        }

        if self.agenda.is_waiting() {
            self.agenda.look(&plan.stimulus, Time::ZERO, &self.state);
        }
        let mut timed = self.agenda.next(&plan.stimulus, instance, None);
        let mut batches = 0u64;
        let end = loop {
            batches += 1;
            if batches & 0xFFFF == 0 && control.cancelled() {
                return false;
            }
            let top = self.queue.top();
            let quiet_since = top.is_none().then_some(Time::from_fs(self.now));
            // what is timed stays as it is from one outside batch to the next; only a step at rest depends on the circuit
            let outside = match (timed, quiet_since) {
                (None, Some(_)) => self.agenda.next(&plan.stimulus, instance, quiet_since),
                (timed, _) => timed,
            };
            let outside = outside.map(|at| at.fs().max(self.now));
            let next = match (top, outside) {
                (Some((at, _)), Some(other)) => Some(at.min(other)),
                (top, outside) => top.map(|top| top.0).or(outside),
            };
            if self.agenda.is_waiting()
                && let Some(deadline) = self.deadline(plan, open, next)
            {
                self.now = deadline;
                break self.interrupted();
            }
            let Some(at) = next else { break End::Settled };
            if let (Some(limit), Some(window)) = (plan.limits.time, open)
                && (top.is_some() || self.agenda.is_moving())
                && at > (window.start + limit).fs()
                && window.start + limit < Time::END
            {
                // nothing happens up to the limit, so this far it has been looked at
                self.now = (window.start + limit).fs();
                break End::Unsettled(Hit::Time);
            }
            if at >= Time::END.fs() {
                break if top.is_some() || self.agenda.is_moving() {
                    End::Unsettled(Hit::Longest)
                } else {
                    End::Settled
                };
            }
            if outside == Some(at) {
                self.outside(plan, instance, at, quiet_since, &mut open, observer);
                timed = self.agenda.next(&plan.stimulus, instance, None);
            } else {
                self.inside(plan, at, observer);
            }
            if self.agenda.is_waiting() && self.agenda.look(&plan.stimulus, Time::from_fs(at), &self.state) {
                timed = self.agenda.next(&plan.stimulus, instance, None);
            }
            if self.recurrence.is_touched() {
                self.look_for_recurrence(plan);
            }
            if self.recurrence.any()
                && !self.queue_is_empty()
                && timed.is_none()
                && self.agenda.deadline(&plan.stimulus).is_none()
                && self.all_recurred()
            {
                break self.oscillating();
            }
            if self.transitions >= plan.limits.transitions && (!self.queue_is_empty() || self.agenda.is_moving()) {
                break End::Unsettled(Hit::Transitions);
            }
        };
        if let Some(window) = open {
            self.find_owners(plan, end == End::Settled);
            self.close(window, Time::from_fs(self.now), end, observer);
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

    /// When the next step stops waiting for its pattern, if that is before everything else: the next batch and the time
    /// limit of the window. What happens at that very instant may still bring it.
    #[cold]
    fn deadline(&self, plan: &Plan, open: Option<Open>, next: Option<u64>) -> Option<u64> {
        let deadline = self.agenda.deadline(&plan.stimulus)?.fs();
        let busy = !self.queue_is_empty() || self.agenda.is_moving();
        let limit = plan.limits.time.zip(open).filter(|_| busy).map(|(limit, window)| (window.start + limit).fs());
        let first = |other: Option<u64>, last: bool| other.is_none_or(|at| deadline < at || last && deadline == at);
        (deadline < Time::END.fs() && first(next, false) && first(limit, true)).then_some(deadline)
    }

    /// How a window ends that something from outside ends.
    fn interrupted(&self) -> End {
        let moving = self.agenda.is_moving();
        match self.queue_is_empty() && !moving {
            true => End::Settled,
            false if !moving && self.recurrence.any() && self.all_recurred() => self.oscillating(),
            false => End::Cut,
        }
    }

    fn queue_is_empty(&self) -> bool {
        self.queue.top().is_none()
    }

    /// A batch inside the circuit.
    #[inline]
    fn inside<O: Observer<Tag = T>>(&mut self, plan: &Plan, at: u64, observer: &mut O) {
        let Some((_, node)) = self.queue.pop() else { return };
        self.now = at;
        if self.queue.top().is_some_and(|next| next.0 == at) {
            self.batch.clear();
            self.batch.push(node);
            self.collect(at);
            self.dirty.clear();
            self.fire_batch(plan, at, observer);
        } else {
            // alone at its instant: each reader is evaluated as soon as it hears of the change
            let (old, new, tag) = self.fire(plan, node, at, observer);
            let (first, last) = self.nodes[node as usize].fan;
            for entry in first..last {
                if let Some(gate) = self.tell(plan, entry, old, new, at, tag, observer) {
                    self.evaluate(plan, gate, at, tag, observer);
                }
            }
        }
        observer.batch(Time::from_fs(at));
    }

    /// Takes all nodes due at `at` out of the queue, in node order.
    fn collect(&mut self, at: u64) {
        while self.queue.top().is_some_and(|next| next.0 == at) {
            if let Some((_, node)) = self.queue.pop() {
                self.batch.push(node);
            }
        }
    }

    /// Fires the batch, then evaluates every gate that heard of a change.
    fn fire_batch<O: Observer<Tag = T>>(&mut self, plan: &Plan, at: u64, observer: &mut O) {
        for i in 0..self.batch.len() {
            let node = self.batch[i];
            let (old, new, tag) = self.fire(plan, node, at, observer);
            let (first, last) = self.nodes[node as usize].fan;
            for entry in first..last {
                if let Some(gate) = self.tell(plan, entry, old, new, at, tag, observer) {
                    self.dirty.push((gate, tag));
                }
            }
        }
        for i in 0..self.dirty.len() {
            let (gate, tag) = self.dirty[i];
            self.evaluate(plan, gate, at, tag, observer);
        }
    }

    /// Applies a node's earliest pending event. Returns old value, new value and the tag of the change.
    #[inline]
    fn fire<O: Observer<Tag = T>>(&mut self, plan: &Plan, index: u32, at: u64, observer: &mut O) -> (L, L, T) {
        let node = &mut self.nodes[index as usize];
        let old = node.out;
        let (new, cause) = if P::MANY && node.kind.is_listed() {
            let list = &mut self.later[index as usize];
            let event = list.pop_front();
            if let Some(next) = list.front() {
                self.queue.insert(index, next.due);
            }
            event.map_or((old, T::default()), |event| (event.value, event.tag))
        } else {
            (node.next, node.tag)
        };
        node.out = new;
        self.events += 1;
        let time = Time::from_fs(at);
        self.last = Some(time);
        if P::MANY && node.kind.rule == Rule::Wire {
            let wire = WireId(index - plan.gates);
            if self.recurrence.watches(index) {
                self.recurrence.moved(index, new.value());
            }
            (old, new, observer.arrival(time, wire, new.value(), cause))
        } else {
            let net = NetId(plan.inputs + index);
            self.transitions += 1;
            new.write(&mut self.state, net.index());
            if self.recurrence.count(index) {
                self.recurrence.moved(index, new.value());
            }
            (old, new, observer.change(time, net, new.value(), cause))
        }
    }

    /// Tells one reader of a change. A gate's number comes back if it must be evaluated; a wire delays the change.
    #[inline]
    #[allow(clippy::too_many_arguments)]
    fn tell<O: Observer<Tag = T>>(
        &mut self,
        plan: &Plan,
        entry: u32,
        old: L,
        new: L,
        at: u64,
        tag: T,
        observer: &mut O,
    ) -> Option<u32> {
        let fan = plan.fan[entry as usize];
        if P::MANY && fan.node >= plan.gates {
            self.schedule(plan, fan.node, new, at, tag, observer);
            return None;
        }
        L::absorb(&mut self.nodes[fan.node as usize].sum, fan.weight, old, new);
        Some(fan.node)
    }

    /// Compares a gate's function with what is pending, and cancels and schedules accordingly.
    #[inline]
    fn evaluate<O: Observer<Tag = T>>(&mut self, plan: &Plan, gate: u32, at: u64, tag: T, observer: &mut O) {
        let node = &mut self.nodes[gate as usize];
        let value = match node.kind.table {
            true => L::look_up(node.table, node.sum),
            false => L::evaluate(plan.circuit.compiled(GateId(gate)), node.sum),
        };
        if value == node.next {
            return;
        }
        if P::MANY && node.kind.is_listed() {
            self.schedule(plan, gate, value, at, tag, observer);
            return;
        }
        if node.next != node.out {
            let delay = node.next.delay(&node.delay);
            let age = at + delay - node.due;
            self.queue.remove(gate, node.due);
            observer.cancel(&Cancelled {
                at: Time::from_fs(at),
                site: Site::Gate(GateId(gate)),
                new: node.next.value(),
                since: Time::from_fs(at - age),
                due: Time::from_fs(node.due),
                cause: node.tag,
                by: tag,
            });
            if 0 < age {
                observer.swallow(Time::from_fs(at), GateId(gate), Span::from_fs(age), Span::from_fs(delay));
            }
        }
        node.next = value;
        if value != node.out {
            if P::ANEW {
                node.delay = self.firing.ask(gate);
            }
            node.due = at + value.delay(&node.delay);
            node.tag = tag;
            self.queue.insert(gate, node.due);
        }
    }

    /// Puts a value behind a node's pending events, by the rule of its kind.
    fn schedule<O: Observer<Tag = T>>(&mut self, plan: &Plan, index: u32, value: L, at: u64, tag: T, observer: &mut O) {
        let node = &mut self.nodes[index as usize];
        let list = &mut self.later[index as usize];
        if P::ANEW && index < plan.gates {
            node.delay = self.firing.ask(index);
        }
        let before = list.front().map(|event| event.due);
        let mut swallow = |gone: Option<Event<L, T>>| {
            if let Some(gone) = gone {
                observer.cancel(&Cancelled {
                    at: Time::from_fs(at),
                    site: plan.site(index),
                    new: gone.value.value(),
                    since: Time::from_fs(gone.since),
                    due: Time::from_fs(gone.due),
                    cause: gone.tag,
                    by: tag,
                });
            }
            if let Some(gone) = gone.filter(|gone| index < plan.gates && gone.since < at) {
                let (age, delay) = (Span::from_fs(at - gone.since), Span::from_fs(gone.due - gone.since));
                observer.swallow(Time::from_fs(at), GateId(index), age, delay);
            }
        };
        let due = match node.kind.rule {
            Rule::Involution => {
                let previous = &mut self.previous[index as usize];
                let last = list.back().map(|event| event.due);
                match recovering(plan.figure(index), value, &node.delay, at, last, previous) {
                    Some(due) => due,
                    None => {
                        // both vanish; of three values the one before may still be another
                        swallow(list.pop_back());
                        list.back().map_or(at, |event| event.due) + 1
                    }
                }
            }
            rule => {
                let due = at + value.delay(&node.delay);
                while list.back().is_some_and(|event| event.due >= due) {
                    swallow(list.pop_back());
                }
                // events are further apart than the limit, so at most one is too near
                if rule == Rule::Reject
                    && list
                        .back()
                        .is_some_and(|event| event.value != value && due - event.due <= plan.figure(index).fs())
                {
                    swallow(list.pop_back());
                }
                due
            }
        };
        if list.back().map_or(node.out, |event| event.value) != value {
            list.push_back(Event { due, since: at, value, tag });
        }
        node.next = value;
        let after = list.front().map(|event| event.due);
        if before != after {
            if let Some(old) = before {
                self.queue.remove(index, old);
            }
            if let Some(new) = after {
                self.queue.insert(index, new);
            }
        }
    }

    /// A batch that holds outside events: it may end a window and begin the next.
    fn outside<O: Observer<Tag = T>>(
        &mut self,
        plan: &Plan,
        instance: &Instance,
        at: u64,
        quiet_since: Option<Time>,
        open: &mut Option<Open>,
        observer: &mut O,
    ) {
        let time = Time::from_fs(at);
        let end = self.interrupted();
        let at_rest = end == End::Settled;
        self.find_owners(plan, at_rest);
        let mut due = std::mem::take(&mut self.due);
        let inputs = &self.inputs;
        let present = |net: NetId| inputs[net.index()].value() == Value::One;
        self.agenda.take(time, &plan.stimulus, instance, quiet_since, present, &mut due);
        if let Some(&moment) = due.moments.first() {
            if let Some(window) = open.take() {
                self.close(window, time, end, observer);
            }
            self.changed.clear();
            last_of_each(&due.becomes, |net, value| {
                if self.inputs[net.index()].value() != Value::from(value) || due.bouncing.contains(&net) {
                    self.changed.push(net);
                }
            });
            observer.open(&Opening {
                at: time,
                moments: &due.moments,
                at_rest,
                inputs: &self.changed,
                settle_from: due.settle_from,
                pending: &self.owners,
                state: &self.state,
            });
            *open = Some(Open { moment, start: time, settle_from: due.settle_from, began_at_rest: at_rest });
            self.transitions = 0;
            self.last = None;
        }

        self.now = at;
        self.batch.clear();
        self.dirty.clear();
        self.collect(at);
        self.changed.clear();
        if due.set.len() > 1 {
            due.set.reverse();
            due.set.sort_by_key(|(net, _)| *net);
            due.set.dedup_by_key(|(net, _)| *net);
        }
        for &(net, value) in &due.set {
            let (old, new) = (self.inputs[net.index()], L::of(Value::from(value)));
            if old == new {
                continue;
            }
            self.inputs[net.index()] = new;
            self.transitions += 1;
            self.events += 1;
            new.write(&mut self.state, net.index());
            self.recurrence.input_changed(net);
            let tag = observer.change(time, net, new.value(), T::default());
            let (first, last) = plan.input_fan[net.index()];
            for entry in first..last {
                if let Some(gate) = self.tell(plan, entry, old, new, at, tag, observer) {
                    self.dirty.push((gate, tag));
                }
            }
        }
        self.due = due;
        self.fire_batch(plan, at, observer);
        observer.batch(time);
    }

    fn close<O: Observer<Tag = T>>(&self, window: Open, at: Time, end: End, observer: &mut O) {
        static NOTHING: &[(NetId, u32)] = &[];
        observer.close(&Closing {
            moment: window.moment,
            start: window.start,
            settle_from: window.settle_from,
            at,
            last: self.last,
            began_at_rest: window.began_at_rest,
            end,
            moving: match end {
                End::Oscillating { .. } => self.first_recurred().map_or(NOTHING, |found| &found.moving),
                _ => NOTHING,
            },
            transitions: self.transitions,
            state: &self.state,
            pending: &self.owners,
        });
    }

    /// The nets that own what is pending, into `owners`.
    fn find_owners(&mut self, plan: &Plan, at_rest: bool) {
        self.owners.clear();
        if !at_rest {
            self.owners.extend(self.queue.nodes().map(|node| plan.owner(node)));
            self.owners.extend(self.agenda.inputs_to_come());
        }
    }

    fn all_recurred(&self) -> bool {
        self.queue.nodes().all(|node| self.recurrence.has(node))
    }

    /// The block at work that recurred first.
    fn first_recurred(&self) -> Option<&Recurred> {
        self.recurrence.first(|| self.queue.nodes())
    }

    fn oscillating(&self) -> End {
        match self.first_recurred() {
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
        let value = |index: u32| nodes[index as usize].out.value();
        let own = |index: u32| if P::ANEW { firing.own(index) } else { 0 };
        self.recurrence.end_batch(now, &value, &pending, &own, &|index| NetId(plan.inputs + index));
    }
}

/// Calls back for each net with the last value it is given.
fn last_of_each(set: &[(NetId, bool)], mut each: impl FnMut(NetId, bool)) {
    for (i, &(net, value)) in set.iter().enumerate() {
        if !set[i + 1..].iter().any(|later| later.0 == net) {
            each(net, value);
        }
    }
}

//! What every event touches, borrowed from the kernel apart, so that it can stay in registers.

use std::collections::VecDeque;
use std::marker::PhantomData;

use super::node::{Event, Lines, Node};
use super::{Kernel, Pending};
use crate::circuit::{GateId, NetId, WireId};
use crate::engine::firing::Firing;
use crate::engine::level::Level;
use crate::engine::observer::{Cancelled, Observer, Site};
use crate::engine::plan::{Fan, Plan, Rule};
use crate::engine::queue::{NEVER, Queue};
use crate::engine::recovery::recovering;
use crate::engine::recurrence::Recurrence;
use crate::logic::State;
use crate::time::{Span, Time};

/// The parts of a kernel that events touch, and what is counted of them.
pub(super) struct Hot<'a, L: Level, Q, P, T> {
    plan: &'a Plan,
    fan: &'a [Fan],
    inputs: u32,
    pub nodes: &'a mut [Node<L, T>],
    queue: &'a mut Q,
    state: &'a mut State,
    pub recurrence: &'a mut Recurrence,
    later: &'a mut [VecDeque<Event<L, T>>],
    previous: &'a mut [Option<i128>],
    firing: &'a mut Firing,
    /// Transitions of nets since it was borrowed.
    pub transitions: u64,
    /// Arrivals at wire ends since it was borrowed.
    arrivals: u64,
    pending: PhantomData<P>,
}

/// What was counted.
pub(super) struct Done {
    transitions: u64,
    arrivals: u64,
}

/// An event that was applied.
pub(super) struct Fired<L, T> {
    pub old: L,
    pub new: L,
    /// The tag of the change.
    pub tag: T,
    /// Is recurrence to be looked for?
    pub watched: bool,
    fan: (u32, u32),
}

impl<L: Level, Q: Queue, P: Pending, T: Copy + Default> Kernel<L, Q, P, T> {
    /// Borrows what events touch.
    #[inline(always)]
    pub(super) fn hot<'a>(&'a mut self, plan: &'a Plan) -> Hot<'a, L, Q, P, T> {
        Hot {
            plan,
            fan: &plan.fan,
            inputs: plan.inputs,
            nodes: &mut self.nodes,
            queue: &mut self.queue,
            state: &mut self.state,
            recurrence: &mut self.recurrence,
            later: &mut self.later,
            previous: &mut self.previous,
            firing: &mut self.firing,
            transitions: 0,
            arrivals: 0,
            pending: PhantomData,
        }
    }

    /// Adds up what was counted.
    #[inline(always)]
    pub(super) fn account(&mut self, done: Done) {
        self.transitions += done.transitions;
        self.events += done.transitions + done.arrivals;
    }
}

impl<'a, L: Level, Q: Queue, P: Pending, T: Copy + Default> Hot<'a, L, Q, P, T> {
    /// What was counted, for [`Kernel::account`].
    #[inline(always)]
    pub fn done(self) -> Done {
        Done { transitions: self.transitions, arrivals: self.arrivals }
    }

    /// When the earliest node is due; [`NEVER`] if none is up to `until`.
    #[inline(always)]
    pub fn top(&mut self, until: u64) -> u64 {
        self.queue.top(until, &Lines { nodes: self.nodes, fan: self.fan })
    }

    /// Takes out a node of the earliest instant, of which [`Hot::top`] has told; it is to be fired at once, or after all of
    /// that instant.
    #[inline(always)]
    pub fn pop(&mut self) -> u32 {
        let node = self.queue.pop();
        if Q::LAZY {
            self.nodes[node as usize].due = NEVER;
        }
        node
    }

    /// Applies the earliest pending event of a node that was taken out of the queue.
    #[inline(always)]
    pub fn fire<O: Observer<Tag = T>>(&mut self, index: u32, at: u64, observer: &mut O) -> Fired<L, T> {
        let node = &mut self.nodes[index as usize];
        node.due = NEVER;
        let (old, block, fan) = (node.out, node.block, node.fan);
        let (new, cause) = if P::MANY && node.kind.is_listed() {
            let list = &mut self.later[index as usize];
            let event = list.pop_front();
            if let Some(next) = list.front() {
                node.due = next.due;
                self.queue.insert(index, next.due);
            }
            event.map_or((old, T::default()), |event| (event.value, event.tag))
        } else {
            (node.next, node.tag)
        };
        node.out = new;
        let time = Time::from_fs(at);
        if P::MANY && node.kind.rule == Rule::Wire {
            self.arrivals += 1;
            let wire = WireId(index - self.plan.gates);
            let watched = self.recurrence.watches(block) && self.recurrence.moved(block, &mut node.mark, new);
            Fired { old, new, tag: observer.arrival(time, wire, new.value(), cause), watched, fan }
        } else {
            let net = NetId(self.inputs + index);
            self.transitions += 1;
            new.write(self.state, net.index());
            let watched = self.recurrence.count(block) && self.recurrence.moved(block, &mut node.mark, new);
            Fired { old, new, tag: observer.change(time, net, new.value(), cause), watched, fan }
        }
    }

    /// The readers of a node that fired.
    #[inline(always)]
    pub fn readers(&self, fired: &Fired<L, T>) -> &'a [Fan] {
        &self.fan[fired.fan.0 as usize..fired.fan.1 as usize]
    }

    /// Tells one reader of a change. A gate's number comes back if it must be evaluated; a wire delays the change.
    #[inline(always)]
    #[allow(clippy::too_many_arguments)]
    pub fn tell<O: Observer<Tag = T>>(
        &mut self,
        fan: &Fan,
        old: L,
        new: L,
        at: u64,
        tag: T,
        observer: &mut O,
    ) -> Option<u32> {
        if P::MANY && fan.node >= self.plan.gates {
            self.schedule(fan.node, new, at, tag, observer);
            return None;
        }
        L::absorb(&mut self.nodes[fan.node as usize].sum, fan.weight, old, new);
        Some(fan.node)
    }

    /// Compares a gate's function with what is pending, and cancels and schedules accordingly.
    #[inline(always)]
    pub fn evaluate<O: Observer<Tag = T>>(&mut self, gate: u32, at: u64, tag: T, observer: &mut O) {
        let node = &mut self.nodes[gate as usize];
        let value = match node.kind.table {
            true => L::look_up(node.table, node.sum),
            false => L::evaluate(self.plan.circuit.compiled(GateId(gate)), node.sum),
        };
        if value == node.next {
            return;
        }
        if P::MANY && node.kind.is_listed() {
            self.schedule(gate, value, at, tag, observer);
            return;
        }
        if node.next != node.out {
            let (due, delay) = (node.due, node.next.delay(&node.delay));
            let age = at + delay - due;
            node.due = NEVER;
            self.queue.remove(gate);
            observer.cancel(&Cancelled {
                at: Time::from_fs(at),
                site: Site::Gate(GateId(gate)),
                new: node.next.value(),
                since: Time::from_fs(at - age),
                due: Time::from_fs(due),
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
    #[inline(never)]
    fn schedule<O: Observer<Tag = T>>(&mut self, index: u32, value: L, at: u64, tag: T, observer: &mut O) {
        let plan = self.plan;
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
            node.due = after.unwrap_or(NEVER);
            if before.is_some() {
                self.queue.remove(index);
            }
            if let Some(new) = after {
                self.queue.insert(index, new);
            }
        }
    }
}

//! Batches that hold outside events: they may end a window and begin the next.

use super::node::lines;
use super::{Kernel, Open, Pending};
use crate::circuit::NetId;
use crate::engine::level::Level;
use crate::engine::observer::{Closing, End, Observer, Opening};
use crate::engine::plan::Plan;
use crate::engine::queue::{NEVER, Queue};
use crate::engine::recurrence::Recurred;
use crate::instance::Instance;
use crate::logic::Value;
use crate::time::Time;

impl<L: Level, Q: Queue, P: Pending, T: Copy + Default> Kernel<L, Q, P, T> {
    /// A batch that holds outside events. Returns when the next timed outside event comes; [`NEVER`] if there is none or it
    /// depends on what the circuit does.
    #[inline(always)]
    pub(super) fn outside<O: Observer<Tag = T>>(
        &mut self,
        plan: &Plan,
        instance: &Instance,
        at: u64,
        quiet_since: Option<Time>,
        open: &mut Option<Open>,
        observer: &mut O,
    ) -> u64 {
        let simple = match quiet_since {
            Some(_) => self.agenda.take_simple(Time::from_fs(at), &plan.steps, instance),
            None => None,
        };
        let next = match simple {
            Some((moment, net, value)) => {
                self.simple(plan, at, moment, net, L::of(Value::from(value)), open, observer);
                self.agenda.next_simple(&plan.steps, instance)
            }
            None => {
                let end = self.interrupted(plan);
                self.several(plan, instance, at, quiet_since, end, open, observer);
                self.agenda.next(&plan.stimulus, instance, None)
            }
        };
        next.map_or(NEVER, Time::fs)
    }

    /// A step that changes one input, at rest.
    #[inline(always)]
    #[allow(clippy::too_many_arguments)]
    fn simple<O: Observer<Tag = T>>(
        &mut self,
        plan: &Plan,
        at: u64,
        moment: u32,
        net: NetId,
        new: L,
        open: &mut Option<Open>,
        observer: &mut O,
    ) {
        self.owners.clear();
        let old = self.inputs[net.index()];
        let inputs = [net];
        let inputs = if old == new { &[][..] } else { &inputs[..] };
        self.turn_over(plan, at, &[moment], inputs, Time::from_fs(at), End::Settled, open, observer);
        self.now = at;
        if old != new {
            let tag = self.change_input(net, new, at, observer);
            let (first, last) = plan.input_fan[net.index()];
            let mut hot = self.hot(plan);
            for fan in &plan.fan[first as usize..last as usize] {
                if let Some(gate) = hot.tell(fan, old, new, at, tag, observer) {
                    hot.evaluate(gate, at, tag, observer);
                }
            }
        }
        observer.batch(Time::from_fs(at));
    }

    /// Any other batch.
    #[inline(never)]
    #[allow(clippy::too_many_arguments)]
    fn several<O: Observer<Tag = T>>(
        &mut self,
        plan: &Plan,
        instance: &Instance,
        at: u64,
        quiet_since: Option<Time>,
        end: End,
        open: &mut Option<Open>,
        observer: &mut O,
    ) {
        let time = Time::from_fs(at);
        let at_rest = end == End::Settled;
        self.find_owners(plan, at_rest);
        let mut due = std::mem::take(&mut self.due);
        self.agenda.take(time, &plan.stimulus, instance, quiet_since, &self.state, &mut due);
        if !due.moments.is_empty() {
            self.turn_over(plan, at, &due.moments, &due.changed, due.settle_from, end, open, observer);
        }

        self.now = at;
        self.batch.clear();
        self.dirty.clear();
        for &(net, value) in &due.set {
            let (old, new) = (self.inputs[net.index()], L::of(Value::from(value)));
            if old == new {
                continue;
            }
            let tag = self.change_input(net, new, at, observer);
            let (first, last) = plan.input_fan[net.index()];
            let mut dirty = std::mem::take(&mut self.dirty);
            let mut hot = self.hot(plan);
            for fan in &plan.fan[first as usize..last as usize] {
                if let Some(gate) = hot.tell(fan, old, new, at, tag, observer) {
                    dirty.push((gate, tag));
                }
            }
            self.dirty = dirty;
        }
        self.due = due;
        self.fire_batch(plan, at, observer);
        observer.batch(time);
    }

    /// An input takes another value. Returns the tag of the change.
    #[inline(always)]
    fn change_input<O: Observer<Tag = T>>(&mut self, net: NetId, new: L, at: u64, observer: &mut O) -> T {
        self.inputs[net.index()] = new;
        self.transitions += 1;
        self.events += 1;
        new.write(&mut self.state, net.index());
        self.recurrence.input_changed(net);
        observer.change(Time::from_fs(at), net, new.value(), T::default())
    }

    /// Ends the window that is open, which ends like this, and begins the next.
    #[inline(always)]
    #[allow(clippy::too_many_arguments)]
    fn turn_over<O: Observer<Tag = T>>(
        &mut self,
        plan: &Plan,
        at: u64,
        moments: &[u32],
        inputs: &[NetId],
        settle_from: Time,
        end: End,
        open: &mut Option<Open>,
        observer: &mut O,
    ) {
        let (time, at_rest) = (Time::from_fs(at), end == End::Settled);
        if let Some(window) = open.take() {
            self.close(plan, window, time, end, observer);
        }
        observer.open(&Opening {
            at: time,
            moments,
            at_rest,
            inputs,
            settle_from,
            pending: &self.owners,
            state: &self.state,
        });
        *open = Some(Open::new(plan, moments[0], time, settle_from, at_rest));
        self.transitions = 0;
        self.last = NEVER;
    }

    #[inline(always)]
    pub(super) fn close<O: Observer<Tag = T>>(&self, plan: &Plan, window: Open, at: Time, end: End, observer: &mut O) {
        static NOTHING: &[(NetId, u32)] = &[];
        observer.close(&Closing {
            moment: window.moment,
            start: window.start,
            settle_from: window.settle_from,
            at,
            last: (self.last != NEVER).then_some(Time::from_fs(self.last)),
            began_at_rest: window.began_at_rest,
            end,
            moving: match end {
                End::Oscillating { .. } => self.first_recurred(plan).map_or(NOTHING, |found| &found.moving),
                _ => NOTHING,
            },
            transitions: self.transitions,
            state: &self.state,
            pending: &self.owners,
        });
    }

    /// The nets that own what is pending, into `owners`.
    pub(super) fn find_owners(&mut self, plan: &Plan, at_rest: bool) {
        self.owners.clear();
        if !at_rest {
            let owners = &mut self.owners;
            self.queue.each(&lines(&self.nodes, plan), |node| owners.push(plan.owner(node)));
            self.owners.extend(self.agenda.inputs_to_come());
        }
    }

    /// The block at work that recurred first.
    pub(super) fn first_recurred(&self, plan: &Plan) -> Option<&Recurred> {
        let mut at_work = Vec::new();
        self.queue.each(&lines(&self.nodes, plan), |node| at_work.push(node));
        self.recurrence.first(&at_work)
    }
}

//! Batches inside the circuit: events fire, gates that hear of them are evaluated and schedule others.

use super::hot::Hot;
use super::{Kernel, LOOK, Pending};
use crate::engine::level::Level;
use crate::engine::observer::Observer;
use crate::engine::plan::Plan;
use crate::engine::queue::Queue;
use crate::time::Time;

impl<L: Level, Q: Queue, P: Pending, T: Copy + Default> Kernel<L, Q, P, T> {
    /// Batches inside the circuit, the first at `at`, the others before `until`, up to where something else is to be
    /// looked at, or no more than `one`. Returns how many.
    pub(super) fn inside<O: Observer<Tag = T>>(
        &mut self,
        plan: &Plan,
        mut at: u64,
        until: u64,
        one: bool,
        observer: &mut O,
    ) -> u64 {
        let mut batches = 0;
        loop {
            // a batch of one event is one transition at most
            let most = if one { 1 } else { plan.limits.transitions.saturating_sub(self.transitions).clamp(1, LOOK) };
            let mut left = most;
            let mut hot = self.hot(plan);
            let several = loop {
                let node = hot.pop();
                if hot.top(at) == at {
                    break Some(node);
                }
                // alone at its instant: each reader is evaluated as soon as it hears of the change
                let fired = hot.fire(node, at, observer);
                for fan in hot.readers(&fired) {
                    if let Some(gate) = hot.tell(fan, fired.old, fired.new, at, fired.tag, observer) {
                        hot.evaluate(gate, at, fired.tag, observer);
                    }
                }
                observer.batch(Time::from_fs(at));
                left -= 1;
                if left == 0 || fired.watched {
                    break None;
                }
                let next = hot.top(until);
                if next >= until {
                    break None;
                }
                at = next;
            };
            let done = hot.done();
            self.account(done);
            self.now = at;
            batches += most - left;
            if most > left {
                self.last = at;
            }
            let Some(node) = several else { return batches };
            self.batch.clear();
            self.batch.push(node);
            self.dirty.clear();
            self.fire_batch(plan, at, observer);
            observer.batch(Time::from_fs(at));
            batches += 1;
            if one || self.recurrence.is_touched() || self.transitions >= plan.limits.transitions || batches >= LOOK {
                return batches;
            }
            at = self.top(plan, until);
            if at >= until {
                return batches;
            }
        }
    }

    /// Takes all other nodes due at `at` out of the queue, fires the batch in node order, then evaluates every gate that
    /// heard of a change.
    #[inline(never)]
    pub(super) fn fire_batch<O: Observer<Tag = T>>(&mut self, plan: &Plan, at: u64, observer: &mut O) {
        let (mut batch, mut dirty) = (std::mem::take(&mut self.batch), std::mem::take(&mut self.dirty));
        let mut hot: Hot<'_, L, Q, P, T> = self.hot(plan);
        while hot.top(at) == at {
            batch.push(hot.pop());
        }
        batch.sort_unstable();
        for &node in &batch {
            let fired = hot.fire(node, at, observer);
            for fan in hot.readers(&fired) {
                if let Some(gate) = hot.tell(fan, fired.old, fired.new, at, fired.tag, observer) {
                    dirty.push((gate, fired.tag));
                }
            }
        }
        for &(gate, tag) in &dirty {
            hot.evaluate(gate, at, tag, observer);
        }
        let done = hot.done();
        self.account(done);
        if !batch.is_empty() {
            self.last = at;
        }
        (self.batch, self.dirty) = (batch, dirty);
    }
}

//! Contacts that bounce: how the inputs of a step that bounces may move, in an exploration.
//!
//! A run draws for each input k pairs of toggles and a span L: after the change at the step, 2k toggles, the last of them
//! exactly L later, the others anywhere before that. Toggles of one instant leave what the last of them leaves. What can be
//! seen of it, for all draws together, is this: at the step the input takes the new value or the other one; then it toggles
//! at instants that follow each other strictly, at most 2k times (one fewer from the other value), until it rests at the new
//! value, at some time within the range of L. Any smaller number can be seen, too, since toggles may fall together; only
//! that nothing bounces at all takes k = 0. So the least number of pairs counts only by whether it is 0.

use super::explore::Explorer;
use super::key::{Agent, Info, Key, KeyMut, Mover, Slot, bit};
use super::passed::Cell;
use super::plant::{Plant, PlantPlace, PlantStep, Ticks};
use super::semantics::Semantics;
use super::watch::Watch;
use super::zone;

/// Inputs of one step that bounce in one cone, at most: each begins in one of three ways.
pub(super) const BOUNCING: usize = 4;

/// How the inputs of a step bounce.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct PlantBounce {
    /// When the last toggle comes, after the step.
    pub lasting: Ticks,
    /// Pairs of toggles: least and greatest number, the latter above 0.
    pub pairs: (u32, u32),
}

/// How the inputs of a step begin that bounces, as the mask of its mover: a bit an entry of its set for those that take the
/// new value at once, and 32 places higher one for those that go on to toggle.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Begins(pub u64);

impl Begins {
    /// Does this entry take its new value at the instant of the step?
    pub fn at_once(self, entry: usize) -> bool {
        self.0 >> entry & 1 == 1
    }

    /// Does this entry toggle later?
    pub fn goes_on(self, entry: usize) -> bool {
        self.0 >> (32 + entry) & 1 == 1
    }

    /// The entries that toggle later, a bit an entry.
    pub fn pending(self) -> u64 {
        self.0 >> 32
    }
}

impl PlantStep {
    /// May inputs of it change later than others?
    pub(super) fn moves_on(&self) -> bool {
        self.skew > 0 || self.bounce.is_some()
    }

    /// How long after it its inputs may still change.
    pub(super) fn moves_for(&self) -> i64 {
        self.bounce.map_or(self.skew, |bounce| bounce.lasting.max)
    }

    /// All ways in which the inputs of a step can begin that bounces.
    pub(super) fn beginnings(&self, bounce: PlantBounce) -> Vec<u64> {
        let mut all = vec![0u64];
        for entry in 0..self.set.len() {
            let (now, on) = (1u64 << entry, 1u64 << (32 + entry));
            let ways: &[u64] = if bounce.pairs.0 == 0 { &[now, now | on, on] } else { &[now | on, on] };
            all = all.iter().flat_map(|mask| ways.iter().map(move |way| mask | way)).collect();
        }
        all
    }
}

/// The entries of the last step that still bounce, each with its net and whether it is at its new value.
fn bouncing<'a>(plant: &'a Plant, key: Key<'a>) -> impl Iterator<Item = (u32, u32, bool)> + 'a {
    let step = key.steps().checked_sub(1).map(|last| &plant.steps[last]).filter(|step| step.bounce.is_some());
    let set = step.into_iter().flat_map(|step| step.set.iter().enumerate());
    set.filter(move |(entry, _)| key.skew() >> entry & 1 == 1)
        .map(move |(entry, (net, value))| (entry as u32, *net, bit(key.values(), *net as usize) == *value))
}

/// Could the last toggle of every input that bounces come next? Only then can the next step come at its instant.
pub(super) fn may_end(plant: &Plant, key: Key<'_>) -> bool {
    bouncing(plant, key).all(|(_, _, at_new)| !at_new)
}

/// Adds how long inputs bounce and what they may do next. `since` is the row of the time since the step.
pub(super) fn toggles(plant: &Plant, key: Key<'_>, bounce: PlantBounce, since: usize, info: &mut Info) {
    // at its new value an input still has to leave it and to come back
    let most = bounce.lasting.max;
    info.limits.push((since, if may_end(plant, key) { zone::at_most(most) } else { zone::below(most) }));
    for (entry, _, at_new) in bouncing(plant, key) {
        let agent =
            |last: bool, min: i64| Agent { mover: Mover::Toggle(entry, last), row: since, min, steps: 0, edges: 0 };
        if !at_new {
            info.agents.push(agent(true, bounce.lasting.min));
        }
        if key.left(entry as usize) >= if at_new { 2 } else { 3 } {
            info.agents.push(agent(false, 0));
        }
    }
}

/// The clocks of the time since toggles, where it may be none.
pub(super) fn clocks(plant: &Plant, key: Key<'_>, info: &mut Info) {
    let kept = (0..plant.bouncing()).filter(|entry| key.toggled(*entry));
    info.slots.extend(kept.map(|entry| Slot::Toggled(entry as u32)));
}

impl Plant {
    /// Inputs of one step that bounce here, at most.
    pub(super) fn bouncing(&self) -> usize {
        let of = |step: &PlantStep| step.bounce.map_or(0, |_| step.set.len());
        self.steps.iter().map(of).max().unwrap_or(0)
    }

    /// May a step come at the instant at which inputs of the one before it still change?
    pub(super) fn may_meet(&self, step: usize) -> bool {
        let before = step.checked_sub(1).map(|before| &self.steps[before]).filter(|before| before.moves_on());
        before.is_some_and(|before| match self.steps[step].place {
            PlantPlace::After(ticks) => ticks.min <= before.moves_for(),
            PlantPlace::At(_) => true,
            PlantPlace::Rest(_) | PlantPlace::When { .. } => false,
        })
    }

    /// The net of an input that the last of so many steps sets.
    pub(super) fn net_set(&self, steps: usize, entry: u32) -> u32 {
        self.steps[steps - 1].set[entry as usize].0
    }

    /// Does an input that is asked about move here later than the step that moves it, the last of so many?
    pub(super) fn moves_late(&self, steps: usize, movers: &[Mover]) -> bool {
        movers.iter().any(|mover| match mover {
            Mover::Late(entry) | Mover::Toggle(entry, _) => self.core[self.net_set(steps, *entry) as usize],
            _ => false,
        })
    }

    /// Has the last of these steps still to move inputs that are asked about?
    pub(super) fn is_moving(&self, steps: usize, pending: u64) -> bool {
        let Some(step) = steps.checked_sub(1).map(|last| &self.steps[last]).filter(|_| pending != 0) else {
            return false;
        };
        let mut set = step.set.iter().enumerate();
        set.any(|(entry, (net, _))| pending >> entry.min(63) & 1 == 1 && self.core[*net as usize])
    }
}

impl<W: Watch, S: Semantics, C: Cell> Explorer<'_, W, S, C> {
    /// The words of a step that bounces and begins so, its values included, into `words`.
    pub(super) fn begin_bounce(&mut self, step: usize, bounce: PlantBounce, begins: Begins) {
        let (plant, layout) = (self.plant, self.layout);
        let most = 2 * self.semantics.pairs(bounce.pairs.1);
        for (entry, (net, value)) in plant.steps[step].set.iter().enumerate() {
            super::key::put(&mut self.words, *net as usize, *value == begins.at_once(entry));
            let left = match (begins.goes_on(entry), begins.at_once(entry)) {
                (false, _) => 0,
                (true, true) => most,
                (true, false) => most.saturating_sub(1),
            };
            KeyMut { words: &mut self.words, layout }.set_toggles(entry, left, false);
        }
        KeyMut { words: &mut self.words, layout }.set_skew(begins.pending());
    }

    /// One toggle of an input, the last of its step or not, into `words`.
    pub(super) fn toggle(&mut self, steps: usize, entry: u32, last: bool) {
        let layout = self.layout;
        let net = self.plant.net_set(steps, entry) as usize;
        let value = !bit(&self.words, net);
        super::key::put(&mut self.words, net, value);
        let key = Key { words: &self.words, layout };
        let (pending, left) = (key.skew(), key.left(entry as usize));
        let mut key = KeyMut { words: &mut self.words, layout };
        match last {
            true => {
                key.set_toggles(entry as usize, 0, false);
                key.set_skew(pending & !(1 << entry));
            }
            false => key.set_toggles(entry as usize, left.saturating_sub(1), true),
        }
    }

    /// Cuts the zone in `work` to where the toggles among these movers can come: after the step, after the toggle before,
    /// the last of them not before its time. False: nothing is left.
    pub(super) fn toggles_are_due(&mut self, key: u32, movers: &[Mover]) -> bool {
        let info = &self.known.infos[key as usize];
        let steps = self.found.key(key).steps();
        let later = self.semantics.later();
        for mover in movers {
            let Mover::Toggle(entry, last) = *mover else { continue };
            let Some(bounce) = self.plant.steps[steps - 1].bounce else { return false };
            let (since, toggled) = (info.row(Slot::Since), info.row(Slot::Toggled(entry)));
            let min = if last { self.semantics.due(bounce.lasting.min) } else { 0 };
            let able = self.work.bound(0, since, later)
                && self.work.at_least(since, min)
                && (toggled == 0 || self.work.bound(0, toggled, later));
            if !able {
                return false;
            }
        }
        true
    }

    /// The time since a toggle is kept as long as it may be none.
    pub(super) fn forget_toggles(&mut self, key: u32, movers: &[Mover]) {
        let layout = self.layout;
        let info = &self.known.infos[key as usize];
        for entry in 0..self.plant.bouncing() {
            let moved = movers.iter().any(|it| matches!(it, Mover::Toggle(other, _) if *other as usize == entry));
            let it = self.found.key(key);
            if it.toggled(entry) && !moved {
                let still = self.work.at(0, info.row(Slot::Toggled(entry as u32))) == zone::AT_MOST_ZERO;
                let it = Key { words: &self.words, layout };
                let (left, pending) = (it.left(entry), it.skew() >> entry & 1 == 1);
                KeyMut { words: &mut self.words, layout }.set_toggles(entry, left, still && pending);
            }
        }
    }
}

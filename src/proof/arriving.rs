//! What is done with a key and zone that were arrived at: they are judged, time passes, and the zone is kept if it is new.

use super::explore::Explorer;
use super::explored::{Ended, Merge, Node, Rest};
use super::key::{KeyMut, Mover, Slot};
use super::outside;
use super::passed::{Cell, Kept};
use super::plant::PlantPlace;
use super::semantics::Semantics;
use super::watch::{Arrival, Watch};
use super::zone;

/// Joins of one zone until what still grows is given up.
const JOINS: u32 = 32;

impl<W: Watch, S: Semantics, C: Cell> Explorer<'_, W, S, C> {
    /// A key was arrived at, with the zone in `entry` and the hits of the block.
    pub fn arrive(&mut self, number: u32, parent: u32, movers: &[Mover]) {
        let info = &self.known.infos[number as usize];
        let key = self.found.key(number);
        let (state, rest, steps, row) = (key.watch(), info.core_rest, key.steps(), info.watch_row);
        let (window, all_rests) = (key.window(), info.rest);
        let place = self.plant.steps.get(steps).map(|step| step.place);
        let waiting = matches!(place, Some(PlantPlace::When { .. })) && !key.came();
        let comes = waiting && key.skew() == 0 && self.plant.shows_pattern(steps, key.values());
        // at rest nothing brings the pattern any more
        let stuck = waiting && !comes && info.rest && key.clocks_over(self.plant);
        let ended = outside::ended(self.plant, key) || stuck;
        let lasting = info.limits.iter().all(|(row, most)| self.entry.allows(*row, self.semantics.lasts(*most)));
        // the start shows even where the first step comes at that very instant
        let shows = lasting || parent == u32::MAX;
        if shows {
            let mut zone = &self.entry;
            if lasting && self.watch.measures() {
                self.lasting.load(self.entry.size, &self.entry.bounds);
                for (row, most) in &info.limits {
                    self.lasting.bound(*row, 0, self.semantics.lasts(*most));
                }
                zone = &self.lasting;
            }
            let arrival = Arrival { plant: self.plant, values: key.values(), rest, window, ended, zone, row };
            let hits = &mut self.hits;
            self.watch.arrive(state, &arrival, &mut |hit| hits.push(hit));
        }
        let rested = (rest && shows).then(|| {
            let (values, origin) = (key.values().to_vec(), key.origin());
            (values, origin)
        });
        let rested = rested.map(|(values, origin)| Rest { steps: window, origin, state: self.state_number(&values) });

        if comes {
            self.pattern_came(number, parent, movers, lasting, rested);
            return;
        }
        // time passes, but for a step that waits for rest
        let mut number = number;
        let waits =
            all_rests && matches!(place, Some(PlantPlace::Rest(_))) && self.found.key(number).clocks_over(self.plant);
        let (mut goes_on, mut missed) = (true, false);
        if !waits {
            let info = &self.known.infos[number as usize];
            self.entry.elapse(&info.limits);
            if let Some((row, most)) = info.gives_up.filter(|_| !stuck) {
                self.entry.bound(row, 0, zone::at_most(most));
            }
            missed = waiting && !self.found.missed.contains_key(&(steps as u32)) && (stuck || self.gives_up(number));
            let hits = &mut self.hits;
            let (new_state, left) = self.watch.elapsed(state, &mut self.entry, row, &mut |hit| hits.push(hit));
            goes_on = left;
            if left && new_state != state {
                number = self.with_watch(number, new_state);
            }
        }
        let node = match goes_on {
            true => self.keep(number, parent, movers),
            false => None,
        };
        self.note(node, number, (parent, movers), rested, missed.then_some(steps as u32));
    }

    /// What was found on arrival is kept with a way to it, even if the zone is not.
    fn note(
        &mut self,
        node: Option<u32>,
        number: u32,
        (parent, movers): (u32, &[Mover]),
        rested: Option<Rest>,
        missed: Option<u32>,
    ) {
        let mut node = node;
        if let Some(listener) = self.listener.take() {
            if rested.is_some() || !self.hits.is_empty() {
                if self.mode.merge == Merge::Branch {
                    node = node.or_else(|| Some(self.push(number, parent, movers, false)));
                }
                if listener.arrived(&self.found, parent, number, node, (&self.hits, rested)) {
                    self.end(Ended::Hit);
                }
            }
            self.listener = Some(listener);
        }
        let first = rested.is_some_and(|rest| !self.found.rests.contains_key(&rest))
            || missed.is_some()
            || self.hits.iter().any(|hit| !self.found.hits.contains_key(hit));
        let node = match node {
            None if first => Some(self.push(number, parent, movers, false)),
            node => node,
        };
        if let Some(node) = node {
            if let Some(step) = missed {
                self.found.missed.entry(step).or_insert(node);
            }
            if let Some(rest) = rested {
                self.found.rests.entry(rest).or_insert(node);
            }
            for hit in self.hits.drain(..) {
                self.found.hits.entry(hit).or_insert(node);
            }
        }
        if self.mode.first_hit && !self.found.hits.is_empty() {
            self.end(Ended::Hit);
        }
    }

    /// Can the time run out in which a pattern must come, in the zone in `entry`? What happens at that very instant may still
    /// bring it.
    fn gives_up(&mut self, number: u32) -> bool {
        let info = &self.known.infos[number as usize];
        let Some((row, most)) = info.gives_up else { return false };
        let (lasting, semantics) = (&mut self.lasting, self.semantics);
        lasting.load(self.entry.size, &self.entry.bounds);
        let mut lasts = info.limits.iter().map(|(row, limit)| lasting.bound(*row, 0, semantics.lasts(*limit)));
        lasts.all(|left| left) && self.lasting.at_least(row, most)
    }

    /// The pattern that the next step waits for shows in `entry`. It has come where the batch ends here; else the batch goes
    /// on at this very instant.
    fn pattern_came(&mut self, number: u32, parent: u32, movers: &[Mover], lasting: bool, rested: Option<Rest>) {
        let begins = parent == u32::MAX;
        // what is due at the start comes together with the step
        let ends = !begins && !self.semantics.peeks();
        let whole = std::mem::take(&mut self.entry);
        let mut node = None;
        if lasting || !ends {
            self.words.copy_from_slice(self.found.key(number).words);
            self.excited.clone_from(&self.known.infos[number as usize].excited);
            KeyMut { words: &mut self.words, layout: self.layout }.set_pattern(true, ends);
            let next = self.intern();
            let (old, new) = (&self.known.infos[number as usize], &self.known.infos[next as usize]);
            self.work.load(whole.size, &whole.bounds);
            if ends {
                for (row, most) in &old.limits {
                    self.work.bound(*row, 0, self.semantics.lasts(*most));
                }
            }
            self.from.clear();
            let mut last = 0;
            for slot in &new.slots {
                let row = if *slot == Slot::Held { 0 } else { old.row_after(*slot, last) };
                last = last.max(row);
                self.from.push(row);
            }
            self.work.gather(&self.from, &mut self.entry);
            self.entry.elapse(&new.limits);
            let (state, row) = (self.found.key(number).watch(), new.watch_row);
            let hits = &mut self.hits;
            let (new_state, goes_on) = self.watch.elapsed(state, &mut self.entry, row, &mut |hit| hits.push(hit));
            let next = if goes_on && new_state != state { self.with_watch(next, new_state) } else { next };
            if goes_on {
                node = self.keep(next, parent, movers);
            }
            self.note(node, next, (parent, movers), rested, None);
        }
        let info = &self.known.infos[number as usize];
        if !begins
            && !self.found.key(number).held()
            && info.agents.iter().any(|agent| whole.may_reach(agent.row, self.semantics.due(agent.min)))
        {
            self.entry = whole;
            let node = self.keep(number, parent, movers);
            self.note(node, number, (parent, movers), None, None);
        }
    }

    /// The key with another state of the watch; `entry` gets its clocks.
    fn with_watch(&mut self, number: u32, state: u32) -> u32 {
        self.words.copy_from_slice(self.found.key(number).words);
        let fired = self.found.key(number).fired();
        KeyMut { words: &mut self.words, layout: self.layout }.set_watch(state, fired);
        self.excited.clone_from(&self.known.infos[number as usize].excited);
        let other = self.intern();
        let (old, new) = (&self.known.infos[number as usize], &self.known.infos[other as usize]);
        self.from.clear();
        self.from.extend(new.slots.iter().map(|slot| old.row(*slot)));
        std::mem::swap(&mut self.work, &mut self.entry);
        self.work.gather(&self.from, &mut self.entry);
        other
    }

    /// Keeps the zone in `entry`, unless it is needless. Returns its node, if it is a new one.
    fn keep(&mut self, number: u32, parent: u32, movers: &[Mover]) -> Option<u32> {
        self.found.met += 1;
        let least = &self.known.infos[number as usize].least;
        if !self.kept.take(&self.entry, least) {
            self.fits = false;
            return None;
        }
        let zones = &mut self.known.zones[number as usize];
        let known = match self.mode.merge {
            Merge::Equality => zones.iter().find(|zone| self.kept.is(zone)).copied(),
            Merge::Inclusion => zones.iter().find(|zone| self.kept.needless(zone)).copied(),
            Merge::Hull => zones.first().copied(),
            Merge::Branch => return self.branch(number, parent, movers),
        };
        if let Some(zone) = known {
            if self.mode.edges && parent != u32::MAX {
                self.found.edges.push((parent, zone.node));
            }
            if self.mode.merge == Merge::Hull {
                self.join(number, zone.node);
            }
            return None;
        }
        let next = self.found.nodes.len() as u32;
        if self.mode.merge == Merge::Inclusion {
            let (kept, found, edges) = (&mut self.kept, &mut self.found, self.mode.edges);
            zones.retain(|zone| {
                if !kept.replaces(zone, least) {
                    return true;
                }
                kept.give_up(zone);
                found.nodes[zone.node as usize].gone = true;
                if edges {
                    // it leads on as the other does, which is the next node
                    found.edges.push((zone.node, next));
                }
                false
            });
        }
        let node = self.push(number, parent, movers, true);
        if self.mode.edges && parent != u32::MAX {
            self.found.edges.push((parent, node));
        }
        self.open.push_back(node);
        self.found.zones += 1;
        if self.found.zones > self.budget.zones {
            self.end(Ended::Zones);
        } else if self.found.bytes > self.budget.bytes {
            self.end(Ended::Bytes);
        }
        Some(node)
    }

    /// A node for the zone that was taken, which is kept as a branch as far as the listener lets it.
    fn branch(&mut self, number: u32, parent: u32, movers: &[Mover]) -> Option<u32> {
        let node = self.push(number, parent, movers, false);
        let kind = self.listener.as_mut().and_then(|listener| listener.branch(&self.found, node));
        let Some(kind) = kind else { return Some(node) };
        let zones = &mut self.known.zones[number as usize];
        if zones.iter().any(|zone| self.kinds[&zone.node] == kind && self.kept.lies_in(zone)) {
            return Some(node);
        }
        let (kept, _) = self.kept.keep(node);
        let it = &mut self.found.nodes[node as usize];
        (it.at, it.gone) = (kept.at, false);
        zones.push(kept);
        self.kinds.insert(node, kind);
        self.open.push_back(node);
        self.found.zones += 1;
        self.found.bytes += (self.entry.bounds.len() * std::mem::size_of::<C>() + std::mem::size_of::<Kept>()) as u64;
        if self.found.zones > self.budget.zones {
            self.end(Ended::Zones);
        } else if self.found.bytes > self.budget.bytes {
            self.end(Ended::Bytes);
        }
        Some(node)
    }

    /// Joins the zone that was taken to the one of a key, which is looked at again if it grows.
    fn join(&mut self, number: u32, node: u32) {
        let zone = &mut self.known.zones[number as usize][0];
        let often = self.joins.get(&node).copied().unwrap_or(0);
        // once bounds were given up zones may not be closed, and nothing is known of twins
        let grows = !if self.widened { self.kept.lies_in(zone) } else { self.kept.needless(zone) };
        if grows {
            self.joins.insert(node, often + 1);
            self.widened |= often >= JOINS;
            self.kept.join(zone, often >= JOINS);
            self.open.push_back(node);
        }
    }

    /// A node of its own for what was arrived at. Its zone is kept only if it has to be expanded.
    fn push(&mut self, key: u32, parent: u32, movers: &[Mover], expanded: bool) -> u32 {
        let node = self.found.nodes.len() as u32;
        let first = self.found.movers.len() as u32;
        self.found.movers.extend_from_slice(movers);
        self.found.bytes += (std::mem::size_of::<Node>() + std::mem::size_of_val(movers)) as u64;
        let mut at = 0;
        if expanded {
            let (kept, more) = self.kept.keep(node);
            at = kept.at;
            self.known.zones[key as usize].push(kept);
            if more {
                let cells = self.entry.bounds.len() * std::mem::size_of::<C>();
                self.found.bytes += (cells + std::mem::size_of::<Kept>()) as u64;
            }
        }
        let fired = (first, self.found.movers.len() as u32);
        self.found.nodes.push(Node { key, at, parent, fired, gone: !expanded });
        node
    }
}

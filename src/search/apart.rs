//! By how much the parts of a pattern miss each other, and how long after rest a step comes.
//!
//! A partial state shows when all its literals hold at once. Let d be the distance in time from an instant to the nearest
//! stretch in which a literal holds; the sum of d over all literals, at the instant where it is least, is the time by which
//! edges must move for the pattern to show. With two literals it is the gap between them.

use crate::circuit::{NetId, WireId};
use crate::engine::{Observer, Opening};
use crate::logic::{State, Value};
use crate::scenario::Alternative;
use crate::time::Time;

/// When each literal of a pattern held.
#[derive(Clone, Debug)]
pub(super) struct Apart {
    pattern: Alternative,
    /// For each literal the stretches in which it holds, `[from, to)`, in order; the last may be open.
    held: Vec<Vec<(u64, u64)>>,
}

impl Apart {
    pub fn new(pattern: Alternative) -> Apart {
        Apart { held: vec![Vec::new(); pattern.len()], pattern }
    }

    fn hears(&mut self, at: u64, i: usize, holds: bool) {
        let held = &mut self.held[i];
        match (held.last_mut(), holds) {
            (Some((_, to)), false) if *to == u64::MAX => *to = at,
            (Some((_, to)), true) if *to == u64::MAX => {}
            (_, true) => held.push((at, u64::MAX)),
            (_, false) => {}
        }
    }

    /// The least sum of distances in fs, 0 if the pattern showed or all but did; `None` if some literal never held.
    pub fn least(&self) -> Option<i64> {
        if self.held.iter().any(Vec::is_empty) {
            return None;
        }
        // a sum of such distances is least where a stretch begins or ends
        let ends = self.held.iter().flatten().flat_map(|(from, to)| [*from, *to]).filter(|at| *at != u64::MAX);
        let sum = |at: u64| self.held.iter().map(|held| distance(held, at)).fold(0u64, u64::saturating_add);
        let least = ends.map(sum).min()?;
        Some(i64::try_from(least).unwrap_or(i64::MAX))
    }
}

/// From an instant to the nearest of some stretches in order.
fn distance(held: &[(u64, u64)], at: u64) -> u64 {
    let after = held.partition_point(|(from, _)| *from <= at);
    let next = held.get(after).map_or(u64::MAX, |(from, _)| from - at);
    let last = after.checked_sub(1).map_or(u64::MAX, |before| at.saturating_sub(held[before].1));
    next.min(last)
}

impl Observer for Apart {
    type Tag = ();

    fn start(&mut self, state: &State) {
        self.held.iter_mut().for_each(Vec::clear);
        for i in 0..self.pattern.len() {
            let (net, wanted) = self.pattern[i];
            self.hears(0, i, state.get(net.index()) == Value::from(wanted));
        }
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, _cause: ()) {
        for i in 0..self.pattern.len() {
            if self.pattern[i].0 == net {
                self.hears(at.fs(), i, new == Value::from(self.pattern[i].1));
            }
        }
    }
}

/// How long after the last event a step comes.
#[derive(Clone, Debug)]
pub(super) struct FromRest {
    moment: u32,
    last: u64,
    /// The least time, in fs; -1 if it came before rest.
    pub least: Option<i64>,
}

impl FromRest {
    pub fn new(moment: u32) -> FromRest {
        FromRest { moment, last: 0, least: None }
    }
}

impl Observer for FromRest {
    type Tag = ();

    fn start(&mut self, _state: &State) {
        (self.last, self.least) = (0, None);
    }

    fn open(&mut self, opening: &Opening<'_>) {
        if opening.moments.contains(&self.moment) {
            let since = i64::try_from(opening.at.fs().saturating_sub(self.last)).unwrap_or(i64::MAX);
            self.least = Some(if opening.at_rest { since } else { -1 });
        }
    }

    fn change(&mut self, at: Time, _net: NetId, _new: Value, _cause: ()) {
        self.last = at.fs();
    }

    fn arrival(&mut self, at: Time, _wire: WireId, _new: Value, _cause: ()) {
        self.last = at.fs();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Two or three literals that hold in these stretches.
    fn least(held: &[&[(u64, u64)]]) -> Option<i64> {
        let pattern: Alternative = (0..held.len() as u32).map(|net| (NetId(net), true)).collect();
        let mut apart = Apart::new(pattern);
        apart.start(&State::zeros(held.len()));
        let mut events: Vec<(u64, u32, bool)> = Vec::new();
        for (net, held) in held.iter().enumerate() {
            for (from, to) in *held {
                events.push((*from, net as u32, true));
                if *to != u64::MAX {
                    events.push((*to, net as u32, false));
                }
            }
        }
        events.sort_unstable();
        for (at, net, value) in events {
            apart.change(Time::from_fs(at), NetId(net), Value::from(value), ());
        }
        apart.least()
    }

    #[test]
    fn gaps_between_two_and_three_literals() {
        let end = u64::MAX;
        assert_eq!(least(&[&[(10, 20)], &[(27, end)]]), Some(7));
        assert_eq!(least(&[&[(27, end)], &[(10, 20)]]), Some(7), "whichever comes first");
        assert_eq!(least(&[&[(10, 20), (40, 50)], &[(27, 38)]]), Some(2), "the nearest of several");
        assert_eq!(least(&[&[(10, 20)], &[(20, 30)]]), Some(0), "one ends when the other begins");
        assert_eq!(least(&[&[(10, 20)], &[(15, 17)]]), Some(0), "it shows");
        assert_eq!(least(&[&[(10, 20)], &[]]), None, "one never holds");
        // at 30: the first ended 10 before, the third comes 5 later
        assert_eq!(least(&[&[(10, 20)], &[(15, 30)], &[(35, end)]]), Some(15));
        assert_eq!(
            least(&[&[(10, 32)], &[(15, 30)], &[(35, end)]]),
            Some(5),
            "2 after the second at 32, and 3 before the third"
        );
    }
}

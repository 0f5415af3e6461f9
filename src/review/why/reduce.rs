//! Putting quantities of a failing case back to typical while it still fails.
//!
//! Sources: delta debugging, A. Zeller, R. Hildebrandt, "Simplifying and isolating failure-inducing input", IEEE Trans.
//! Software Eng. 28 (2002) 183-200 (from memory); the other way, growing a set by the last member that is needed, is that of
//! U. Junker, "QuickXplain", AAAI 2004 (from memory). Neither finds the fewest for sure, since failing is not monotone:
//! both are tried, from the failing case and from one stretched to the ends of the ranges, then single quantities and, if
//! they are few, pairs; the smallest set wins.

use rustc_hash::FxHashMap;

use super::probe::{Budget, Cut, Probe};
use crate::instance::{Instance, Quantity};
use crate::time::Span;

/// Quantities away from typical, by number, ascending, with their values; all others are typical.
pub(super) type Set = Vec<(u32, Span)>;

/// Pairs are tried if there are no more than this.
const PAIRS: usize = 300;
/// Sets of equal size whose way to typical is looked at.
const APPROACHED: usize = 4;
/// 1 of a distance.
const WHOLE: u64 = 1 << 32;

/// A quantity that the failing case has away from typical.
#[derive(Clone, Copy, Debug)]
struct Varied {
    quantity: Quantity,
    typical: Span,
    /// The value of the range nearest to typical: typical itself, but for skews that are never 0.
    nearest: Span,
    /// The end of the range on the side of the failing case.
    end: Span,
    failing: Span,
}

/// The search for the fewest.
pub(super) struct Search<'a> {
    probe: Probe<'a>,
    budget: Budget,
    /// What may be spent on finding a small set; the rest is for moving it.
    share: Budget,
    /// The failing case with every quantity typical.
    base: Instance,
    varied: Vec<Option<Varied>>,
    tried: FxHashMap<Set, bool>,
    /// The best set so far that fails.
    best: Option<(Rank, Set)>,
}

/// What makes a set better, less being better: members, then the distance of the farthest, then all distances.
type Rank = (usize, u64, u128);

/// What was found.
pub(super) struct Found {
    pub set: Set,
    pub minimal: bool,
    pub cut: Option<Cut>,
}

impl<'a> Search<'a> {
    pub fn new(
        probe: Probe<'a>,
        budget: Budget,
        quantities: &[Quantity],
        typical: &Instance,
        failing: &Instance,
    ) -> Search<'a> {
        let mut base = failing.clone();
        let vary = |quantity: &Quantity| {
            let (typical, failing, range) = (typical.get(quantity), failing.get(quantity), quantity.range);
            base.set(quantity, typical);
            let nearest = typical.clamp(range.min.min(failing), range.max.max(failing));
            // what lies beyond its range is its own end
            let end = if failing < typical { range.min.min(failing) } else { range.max.max(failing) };
            (failing != typical).then_some(Varied { quantity: *quantity, typical, nearest, end, failing })
        };
        let varied = quantities.iter().map(vary).collect();
        let share = Budget { runs: budget.runs / 10 * 6, events: budget.events / 10 * 6 };
        Search { probe, budget, share, base, varied, tried: FxHashMap::default(), best: None }
    }

    /// Runs so far.
    pub fn runs(&self) -> u64 {
        self.probe.runs()
    }

    /// Everything that the failing case has away from typical.
    pub fn failing(&self) -> Set {
        self.all(|it| it.failing)
    }

    fn all(&self, value: impl Fn(&Varied) -> Span) -> Set {
        let each = self.varied.iter().enumerate();
        each.filter_map(|(number, it)| it.as_ref().map(|it| (number as u32, value(it)))).collect()
    }

    fn varied(&self, number: u32) -> Varied {
        self.varied[number as usize].expect("sets hold nothing but what the failing case has away from typical")
    }

    /// The case of a set.
    pub fn case(&self, set: &Set) -> Instance {
        let mut case = self.base.clone();
        set.iter().for_each(|(number, value)| case.set(&self.varied(*number).quantity, *value));
        case
    }

    /// How far a value is from typical on the way to the end of its range, in 2^-32.
    pub fn distance(&self, number: u32, value: Span) -> u64 {
        let it = self.varied(number);
        let way = |to: Span| u128::from(to.fs().abs_diff(it.typical.fs()));
        ((way(value) * u128::from(WHOLE)) / way(it.end).max(1)) as u64
    }

    fn rank(&self, set: &Set) -> Rank {
        let each = || set.iter().map(|(number, value)| self.distance(*number, *value));
        (set.len(), each().max().unwrap_or(0), each().map(u128::from).sum())
    }

    /// Does the case of a set show the finding?
    pub fn shows(&mut self, set: &Set) -> Result<bool, Cut> {
        if let Some(known) = self.tried.get(set) {
            return Ok(*known);
        }
        let mut case = std::mem::take(&mut self.base);
        set.iter().for_each(|(number, value)| case.set(&self.varied(*number).quantity, *value));
        let shows = self.probe.shows(&case, self.share);
        set.iter().for_each(|(number, _)| {
            let it = self.varied(*number);
            case.set(&it.quantity, it.typical);
        });
        self.base = case;
        let shows = shows?;
        self.tried.insert(set.clone(), shows);
        if shows {
            let rank = self.rank(set);
            if self.best.as_ref().is_none_or(|best| rank < best.0) {
                self.best = Some((rank, set.clone()));
            }
        }
        Ok(shows)
    }

    /// The smallest set that is found from a failing one, moved toward typical.
    pub fn least(&mut self, failing: Set) -> Found {
        let mut sets = Vec::new();
        let ways = self.ways(&failing, &mut sets).err();
        // the rest of the budget is for what is left to do
        self.share = self.budget;
        let best = self.best.as_ref().map_or_else(|| failing.clone(), |best| best.1.clone());
        if ways == Some(Cut::Interrupted) || best.is_empty() {
            return Found { minimal: best.is_empty(), set: best, cut: ways.filter(|it| *it == Cut::Interrupted) };
        }
        sets.push(best);
        let fewest = sets.iter().map(Vec::len).min().unwrap_or(0);
        let mut seen: Vec<Vec<u32>> = Vec::new();
        sets.retain(|set| {
            let members: Vec<u32> = set.iter().map(|it| it.0).collect();
            let new = set.len() == fewest && !seen.contains(&members);
            seen.extend(new.then_some(members));
            new
        });
        let mut nearest: Option<(Rank, Set)> = None;
        for set in sets.into_iter().take(APPROACHED) {
            match self.approach(set) {
                Ok(set) => {
                    let rank = self.rank(&set);
                    if nearest.as_ref().is_none_or(|best| rank < best.0) {
                        nearest = Some((rank, set));
                    }
                }
                Err(cut) => {
                    // one that was finished is better than one that was not
                    let minimal = nearest.is_some();
                    let set = nearest.or_else(|| self.best.clone()).map_or(failing, |it| it.1);
                    return Found { set, minimal, cut: Some(cut) };
                }
            }
        }
        Found { set: nearest.map_or(failing, |it| it.1), minimal: true, cut: ways }
    }

    /// Small sets by several ways; those that were found before the budget ended.
    fn ways(&mut self, failing: &Set, sets: &mut Vec<Set>) -> Result<(), Cut> {
        if self.shows(&Set::new())? {
            return Ok(());
        }
        for start in [failing.clone(), self.all(|it| it.end)] {
            if !self.shows(&start)? {
                continue;
            }
            let grown = self.grow(start.clone())?;
            sets.push(self.drop_each(grown)?);
            let cut = self.delta(start)?;
            sets.push(self.drop_each(cut)?);
        }
        let fewest = |sets: &[Set]| sets.iter().map(Vec::len).min().unwrap_or(0);
        let stretched = self.all(|it| it.end);
        if fewest(sets) > 1 {
            for it in &stretched {
                let one = vec![*it];
                if self.shows(&one)? {
                    sets.push(one);
                }
            }
        }
        let n = stretched.len();
        if fewest(sets) > 2 && n * (n - 1) / 2 <= PAIRS {
            for (i, a) in stretched.iter().enumerate() {
                for b in &stretched[i + 1..] {
                    let two = vec![*a, *b];
                    if self.shows(&two)? {
                        sets.push(two);
                    }
                }
            }
        }
        Ok(())
    }

    /// Members of a set, the least away first.
    fn by_distance(&self, set: &Set) -> Vec<(u32, Span)> {
        let mut order = set.clone();
        order.sort_by_key(|(number, value)| (self.distance(*number, *value), *number));
        order
    }

    /// The farthest that suffice: the fewest of them, the last of which is then needed, and again with that one given.
    fn grow(&mut self, set: Set) -> Result<Set, Cut> {
        let mut pool = self.by_distance(&set);
        pool.reverse();
        let mut needed = Set::new();
        let with = |needed: &Set, more: &[(u32, Span)]| {
            let mut set: Set = needed.iter().chain(more).copied().collect();
            set.sort_unstable();
            set
        };
        while !self.shows(&with(&needed, &[]))? {
            // needed and the whole pool fail
            let (mut low, mut high) = (0, pool.len());
            while high - low > 1 {
                let middle = low + (high - low) / 2;
                match self.shows(&with(&needed, &pool[..middle]))? {
                    true => high = middle,
                    false => low = middle,
                }
            }
            pool.truncate(high);
            needed.extend(pool.pop());
        }
        Ok(with(&needed, &[]))
    }

    /// Delta debugging: parts and complements of ever finer divisions.
    fn delta(&mut self, mut set: Set) -> Result<Set, Cut> {
        let mut parts = 2;
        'again: while set.len() >= 2 {
            let bounds: Vec<usize> = (0..=parts).map(|part| part * set.len() / parts).collect();
            for part in bounds.windows(2) {
                let part = set[part[0]..part[1]].to_vec();
                if self.shows(&part)? {
                    (set, parts) = (part, 2);
                    continue 'again;
                }
            }
            for part in bounds.windows(2) {
                let rest: Set = [&set[..part[0]], &set[part[1]..]].concat();
                if self.shows(&rest)? {
                    (set, parts) = (rest, (parts - 1).max(2));
                    continue 'again;
                }
            }
            if parts >= set.len() {
                break;
            }
            parts = (2 * parts).min(set.len());
        }
        Ok(set)
    }

    /// Puts back one after the other, the least away first, until none can be spared.
    pub(super) fn drop_each(&mut self, mut set: Set) -> Result<Set, Cut> {
        loop {
            let before = set.len();
            for (number, _) in self.by_distance(&set) {
                let without: Set = set.iter().copied().filter(|it| it.0 != number).collect();
                if self.shows(&without)? {
                    set = without;
                }
            }
            if set.len() == before {
                return Ok(set);
            }
        }
    }

    /// The same members, each at the end of its range.
    pub(super) fn stretched(&self, set: &Set) -> Set {
        set.iter().map(|(number, _)| (*number, self.varied(*number).end)).collect()
    }

    /// The value of the range nearest to typical.
    pub(super) fn nearest(&self, number: u32) -> Span {
        self.varied(number).nearest
    }

    /// The set without values that are typical.
    pub(super) fn proper(&self, set: impl IntoIterator<Item = (u32, Span)>) -> Set {
        set.into_iter().filter(|(number, value)| *value != self.varied(*number).typical).collect()
    }
}

//! The zones that are kept, by key, and when one makes another needless.
//!
//! A gate that has been excited for its least delay may fire, and only its deadline still counts: of two cases that differ
//! in nothing but how much longer than that a gate has been excited, the one with the younger event can do all that the
//! other can, at the same times. So a zone is needless if each of its cases has such a twin in a zone that is kept, even
//! where it does not lie in it (clocks with lower and upper bounds: Behrmann, Bouyer, Larsen and Pelánek 2006, Lower and
//! upper bounds in zone-based abstractions of timed automata; the test in n² steps after Herbreteau, Srivathsan and
//! Walukiewicz 2012, Better abstractions for timed automata). The zones themselves stay as they are: what is kept can be
//! reached, point by point.

use super::zone::{Code, FREE, Matrix};

/// A bound as it is kept: as narrow as the times of the plant allow.
pub(super) trait Cell: Copy + Ord {
    /// No bound.
    const NONE: Self;
    /// The bound; another if it does not fit.
    fn of(code: Code) -> Self;
    /// The bound as it is worked with.
    fn code(self) -> Code;
}

impl Cell for i32 {
    const NONE: i32 = i32::MAX;
    #[inline]
    fn of(code: Code) -> i32 {
        if code == FREE { i32::MAX } else { code as i32 }
    }
    #[inline]
    fn code(self) -> Code {
        if self == i32::MAX { FREE } else { Code::from(self) }
    }
}

impl Cell for i64 {
    const NONE: i64 = FREE;
    #[inline]
    fn of(code: Code) -> i64 {
        code
    }
    #[inline]
    fn code(self) -> Code {
        self
    }
}

/// A clock of which every tick counts, in a list of least delays.
pub(super) const EXACT: Code = Code::MAX;

/// A zone that is kept.
#[derive(Clone, Copy, Debug)]
pub(super) struct Kept {
    /// Its node.
    pub node: u32,
    /// Where its bounds are.
    pub at: usize,
    /// The sum of its bounds: that of no zone inside it is greater.
    sum: i64,
    /// The sum of what [`needs`] asks of a zone that makes it needless: that of no such zone is less.
    needs: i64,
    /// The same by row, roughly.
    rows: u64,
    needs_rows: u64,
}

/// The bounds of zones, one after the other.
#[derive(Debug)]
pub(super) struct Bounds<C> {
    cells: Vec<C>,
    /// Places that are free again, by number of bounds.
    free: Vec<Vec<usize>>,
    /// The zone that is compared with others.
    entry: Vec<C>,
    /// What it needs of a zone that makes it needless.
    needed: Vec<C>,
    sum: i64,
    needs: i64,
    rows: u64,
    needs_rows: u64,
    size: usize,
    /// What clocks are about as great as.
    most: i64,
}

impl<C: Cell> Bounds<C> {
    /// For clocks up to about `most`.
    pub fn new(most: i64) -> Bounds<C> {
        Bounds {
            cells: Vec::new(),
            free: Vec::new(),
            entry: Vec::new(),
            needed: Vec::new(),
            sum: 0,
            needs: 0,
            rows: 0,
            needs_rows: 0,
            size: 0,
            most: most.max(1),
        }
    }

    /// Takes a zone to compare with others and to keep; `least` as for [`needs`]. False: its bounds do not fit.
    pub fn take(&mut self, zone: &Matrix, least: &[Code]) -> bool {
        let size = zone.size;
        self.size = size;
        self.entry.clear();
        self.entry.extend(zone.bounds.iter().map(|code| C::of(*code)));
        let fits = self.entry.iter().zip(&zone.bounds).fold(true, |fits, (cell, code)| fits & (cell.code() == *code));
        self.needed.clear();
        for (row, least) in zone.bounds.chunks_exact(size).zip(least) {
            // no less than the first bound of its column, so they fit if those do
            let needed = row.iter().zip(&zone.bounds).map(|(code, first)| C::of(needs(*code, *first, *least)));
            self.needed.extend(needed);
        }
        let lane = Lane::of(self.most, size);
        (self.sum, self.rows) = sums(&self.entry, size, lane);
        (self.needs, self.needs_rows) = sums(&self.needed, size, lane);
        fits
    }

    /// The zone at a place, of so many rows, to work on.
    pub fn load(&self, at: usize, size: usize, into: &mut Matrix) {
        into.size = size;
        into.bounds.clear();
        into.bounds.extend(self.cells[at..at + size * size].iter().map(|cell| cell.code()));
    }

    /// Keeps the zone that was taken. Also says whether that took more memory.
    pub fn keep(&mut self, node: u32) -> (Kept, bool) {
        let len = self.entry.len();
        let free = self.free.get_mut(self.size).and_then(Vec::pop);
        let at = free.unwrap_or(self.cells.len());
        match free {
            Some(at) => self.cells[at..at + len].copy_from_slice(&self.entry),
            None => self.cells.extend_from_slice(&self.entry),
        }
        let (sum, needs, rows, needs_rows) = (self.sum, self.needs, self.rows, self.needs_rows);
        (Kept { node, at, sum, needs, rows, needs_rows }, free.is_none())
    }

    /// Gives up the place of a zone of as many rows as the one that was taken.
    pub fn give_up(&mut self, kept: &Kept) {
        if self.free.len() <= self.size {
            self.free.resize(self.size + 1, Vec::new());
        }
        self.free[self.size].push(kept.at);
    }

    fn cells(&self, kept: &Kept) -> &[C] {
        &self.cells[kept.at..kept.at + self.entry.len()]
    }

    /// Is it that very zone?
    pub fn is(&self, kept: &Kept) -> bool {
        self.sum == kept.sum && self.cells(kept) == &self.entry[..]
    }

    /// Does it lie in that zone?
    pub fn lies_in(&self, kept: &Kept) -> bool {
        self.sum <= kept.sum && within(&self.entry, self.cells(kept))
    }

    /// Can nothing come of it that does not come of that zone?
    pub fn needless(&self, kept: &Kept) -> bool {
        self.needs <= kept.sum && inside(self.needs_rows, kept.rows) && within(&self.needed, self.cells(kept))
    }

    /// Can nothing come of that zone that does not come of it? `least` as for [`needs`].
    pub fn replaces(&self, kept: &Kept, least: &[Code]) -> bool {
        kept.needs <= self.sum
            && inside(kept.needs_rows, self.rows)
            && covers(&self.entry, self.cells(kept), self.size, least)
    }

    /// Joins it to that zone: to the least zone that holds both or, `widely`, with every bound given up that would have to
    /// give way, so that joining comes to an end (widening; Cousot and Cousot 1977). The bounds may not be closed then: they
    /// hold no less, and perhaps more than they need.
    pub fn join(&mut self, kept: &mut Kept, widely: bool) {
        let cells = &mut self.cells[kept.at..kept.at + self.entry.len()];
        for (cell, other) in cells.iter_mut().zip(&self.entry) {
            if *other > *cell {
                *cell = if widely { C::NONE } else { *other };
            }
        }
        (kept.sum, kept.rows) = sums(cells, self.size, Lane::of(self.most, self.size));
    }
}

/// A bound as part of a sum: a greater one has no lesser part.
#[inline]
fn part(code: Code) -> i64 {
    code.clamp(-(1 << 50), 1 << 50)
}

/// Sums of rows in seven bits, roughly: a greater one is no less there.
#[derive(Clone, Copy)]
struct Lane {
    bias: i64,
    coarse: u32,
}

impl Lane {
    /// For so many bounds of about this size.
    #[inline]
    fn of(most: i64, size: usize) -> Lane {
        let bias = 2 * most * size as i64;
        Lane { bias, coarse: (64 - (2 * bias).leading_zeros()).saturating_sub(7) }
    }

    #[inline]
    fn of_sum(self, sum: i64) -> u64 {
        (sum.saturating_add(self.bias) >> self.coarse).clamp(0, 0x7F) as u64
    }
}

/// The sum of some bounds, and those of the first eight rows, a byte a row.
#[inline]
fn sums<C: Cell>(cells: &[C], size: usize, lane: Lane) -> (i64, u64) {
    let (mut all, mut rows) = (0, 0);
    for (at, row) in cells.chunks_exact(size).enumerate() {
        let sum: i64 = row.iter().map(|cell| part(cell.code())).sum();
        all += sum;
        if at < 8 {
            rows |= lane.of_sum(sum) << (8 * at);
        }
    }
    (all, rows)
}

/// Is no byte of `a` greater than that of `b`? Their highest bits are 0.
#[inline]
fn inside(a: u64, b: u64) -> bool {
    const HIGH: u64 = 0x8080_8080_8080_8080;
    (b | HIGH).wrapping_sub(a) & HIGH == HIGH
}

/// Is no bound greater than the other at its place?
#[inline]
fn within<C: Cell>(a: &[C], b: &[C]) -> bool {
    // eight at a time without a branch
    let mut eights = a.chunks_exact(8).zip(b.chunks_exact(8));
    eights.all(|(a, b)| !a.iter().zip(b).fold(false, |over, (a, b)| over | (a > b))) && {
        let whole = a.len() & !7;
        a[whole..].iter().zip(&b[whole..]).all(|(a, b)| a <= b)
    }
}

/// How great a bound on the difference of two clocks y − x a zone b must have at the least, for each point v of zone a to
/// have a twin in it: one that agrees with v in every clock, but for those that are at their least delay or beyond in both and
/// not older in the twin. `bound` is that of a on y − x, `first` that of a on 0 − x, `least` is 2L + 1 for a least delay L of y,
/// or [`EXACT`] if y must agree. Both zones are closed.
///
/// The twin of v is in the box of those x' with min(L, v) ≤ x' ≤ v. A box and a zone have a point in common unless one
/// difference forbids it: y' − x' ≤ b(y, x) with y' at its least and x' at its greatest. So v has no twin if
/// min(L(y), v(y)) − v(x) exceeds b(y, x) for some x, y, and a holds such a v if b(y, x) is tighter than a's own bound, and
/// L(y) − v(x) exceeds it for the least v(x) in a (upper bounds on v(x) and on x − y end neither in each other, so each may be
/// looked at alone). In codes the latter is b < first + 2L.
#[inline]
fn needs(bound: Code, first: Code, least: Code) -> Code {
    if least == EXACT { bound } else { bound.min(first + least - 1) }
}

/// Does zone `b` have what zone `a` needs?
fn covers<C: Cell>(b: &[C], a: &[C], size: usize, least: &[Code]) -> bool {
    a.chunks(size).zip(b.chunks(size)).zip(least).all(|((of_a, of_b), least)| {
        let has = |x: usize| needs(of_a[x].code(), a[x].code(), *least) <= of_b[x].code();
        within(of_a, of_b) || (0..size).all(has)
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::proof::zone::{self, at_most, below};

    fn pair(bounds: [(usize, usize, Code); 4]) -> Vec<Code> {
        let mut zone = Matrix { size: 3, bounds: vec![FREE; 9] };
        for at in 0..3 {
            zone.bounds[4 * at] = at_most(0);
        }
        zone.bounds[1] = at_most(0);
        zone.bounds[2] = at_most(0);
        for (i, j, code) in bounds {
            assert!(zone.bound(i, j, code));
        }
        zone.bounds
    }

    /// Twins, point by point on a grid of halves, in both directions.
    #[test]
    fn what_is_covered_has_twins() {
        // up to 4 each; zones from all small bounds on x, y and x - y
        let (most, limits) = (4, [3, 2]);
        let mut zones = Vec::new();
        for strict in [false, true] {
            for (lo, hi) in [(0, 4), (1, 2), (2, 4), (3, 4), (0, 2)] {
                for (from, to) in [(-4, 4), (-1, 1), (0, 2), (1, 3), (-2, -1)] {
                    let upper = |c: i64| if strict { below(c) } else { at_most(c) };
                    zones.push(pair([(1, 0, upper(hi)), (0, 1, upper(-lo)), (1, 2, upper(to)), (2, 1, upper(-from))]));
                }
            }
        }
        let mut bounded = Vec::new();
        for zone in zones {
            let mut zone = Matrix { size: 3, bounds: zone };
            if zone.bound(2, 0, at_most(most)) {
                bounded.push(zone.bounds);
            }
        }
        let fine = 6;
        let holds = |zone: &[Code], point: [i64; 2]| {
            let at = [0, point[0], point[1]];
            (0..9).all(|e| {
                let (c, reached) = zone::limit(zone[e]);
                let difference = at[e / 3] - at[e % 3];
                zone[e] == FREE || difference < c * fine || reached && difference == c * fine
            })
        };
        let points: Vec<[i64; 2]> = (0..=most * fine).flat_map(|x| (0..=most * fine).map(move |y| [x, y])).collect();
        let (mut covered, mut more) = (0, 0);
        for exact in [[false, false], [false, true], [true, true]] {
            let of = |k: usize| if exact[k] { EXACT } else { at_most(limits[k]) };
            let least = [EXACT, of(0), of(1)];
            for a in &bounded {
                for b in &bounded {
                    let twin = |v: [i64; 2], w: [i64; 2]| {
                        (0..2).all(|k| w[k] == v[k] || !exact[k] && w[k] <= v[k] && w[k] >= limits[k] * fine)
                    };
                    let want = points
                        .iter()
                        .filter(|v| holds(a, **v))
                        .all(|v| points.iter().any(|w| twin(*v, *w) && holds(b, *w)));
                    let mut bounds = Bounds::<i32>::new(most);
                    assert!(bounds.take(&Matrix { size: 3, bounds: b.clone() }, &least));
                    let of_b = bounds.keep(0).0;
                    assert!(bounds.take(&Matrix { size: 3, bounds: a.clone() }, &least));
                    assert_eq!(bounds.needless(&of_b), want, "{a:?} {b:?} {least:?}");
                    let of_a = bounds.keep(1).0;
                    assert!(bounds.take(&Matrix { size: 3, bounds: b.clone() }, &least));
                    assert_eq!(bounds.replaces(&of_a, &least), want);
                    assert_eq!(covers(b, a, 3, &least), want, "{a:?} {b:?} {least:?}");
                    covered += u32::from(want);
                    more += u32::from(want && !within(a, b));
                }
            }
        }
        assert!(covered > 300 && more > 50, "{covered} {more}");
    }

    #[test]
    fn narrow_bounds_keep_what_they_can() {
        for code in [at_most(-7), below(3), FREE] {
            assert_eq!((<i32 as Cell>::of(code).code(), <i64 as Cell>::of(code).code()), (code, code));
        }
        let mut bounds = Bounds::<i32>::new(1 << 20);
        let mut zone = Matrix::zero(1);
        zone.elapse(&[(1, at_most(1 << 20))]);
        assert!(bounds.take(&zone, &[EXACT; 2]));
        zone = Matrix::zero(1);
        zone.elapse(&[(1, at_most(1 << 40))]);
        assert!(!bounds.take(&zone, &[EXACT; 2]));
        assert!(Bounds::<i64>::new(1 << 40).take(&zone, &[EXACT; 2]));
    }
}

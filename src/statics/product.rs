//! A set of value vectors, kept as a product: relations over groups of variables that have nothing to do with each other.

use num_bigint::BigUint;

use super::GaveUp;
use super::diagram::{Diagram, Edge};

/// Disjoint ternary rows that together are a set of value vectors.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Rows {
    /// The rows, by value with 0 before 1 before `None`, which stands for both.
    pub rows: Vec<Vec<Option<bool>>>,
    /// Was the list cut at the limit? Then the rows are only a part of the set.
    pub truncated: bool,
}

/// One factor: a relation over some levels.
pub(super) struct Part {
    pub root: Edge,
    /// ascending
    pub levels: Vec<u32>,
}

pub(super) struct Product {
    pub diagram: Diagram,
    pub parts: Vec<Part>,
    /// the part of each level; meaningless for hidden levels
    pub part_of: Vec<u32>,
}

impl Product {
    /// The conjunction of some relations over the levels `0..levels`, those that `hidden` names quantified away ("there
    /// is a value").
    pub fn of(
        mut diagram: Diagram,
        levels: usize,
        conjuncts: &[Edge],
        hidden: impl Fn(u32) -> bool,
    ) -> Result<Product, GaveUp> {
        let supports: Vec<Vec<u32>> = conjuncts.iter().map(|root| diagram.support(*root)).collect();
        let mut groups = Groups::new(levels);
        for support in &supports {
            for level in support.iter().skip(1) {
                groups.tie(support[0], *level);
            }
        }
        let touched: Vec<bool> = {
            let mut touched = vec![false; levels];
            for level in supports.iter().flatten() {
                touched[*level as usize] = true;
            }
            touched
        };
        // parts in the order of their topmost level; what nothing touches is one free part
        let mut parts: Vec<Part> = Vec::new();
        let mut part_of_root = vec![u32::MAX; levels + 1];
        let mut part_of = vec![u32::MAX; levels];
        for level in 0..levels as u32 {
            let root = if touched[level as usize] { groups.find(level) as usize } else { levels };
            if part_of_root[root] == u32::MAX {
                part_of_root[root] = parts.len() as u32;
                parts.push(Part { root: Edge::TRUE, levels: Vec::new() });
            }
            part_of[level as usize] = part_of_root[root];
            if !hidden(level) {
                parts[part_of_root[root] as usize].levels.push(level);
            }
        }
        let mut of_part: Vec<Vec<usize>> = vec![Vec::new(); parts.len()];
        let mut impossible = false;
        for (at, support) in supports.iter().enumerate() {
            match support.first() {
                Some(level) => of_part[part_of[*level as usize] as usize].push(at),
                None => impossible |= conjuncts[at] == Edge::FALSE,
            }
        }
        for (part, members) in parts.iter_mut().zip(&mut of_part) {
            // from the bottom of the diagram up: each step works on the top of what is there. Told by the lowest variable,
            // since the topmost may be one that all share
            members.sort_by_key(|at| std::cmp::Reverse((supports[*at].last().copied(), supports[*at][0])));
            part.root = fold(&mut diagram, conjuncts, &supports, members, &hidden)?;
        }
        if impossible {
            parts.push(Part { root: Edge::FALSE, levels: Vec::new() });
        }
        Ok(Product { diagram, parts, part_of })
    }

    /// Number of levels, hidden ones included.
    pub fn levels(&self) -> usize {
        self.part_of.len()
    }

    /// Nothing fixed, for [`Product::count`] and [`Product::first`].
    pub fn unfixed(&self) -> Vec<Option<bool>> {
        vec![None; self.levels()]
    }

    /// How many vectors agree with `fixed`?
    pub fn count(&self, fixed: &[Option<bool>]) -> BigUint {
        let mut count = BigUint::from(1u8);
        for part in &self.parts {
            count *= self.diagram.count(part.root, &part.levels, fixed);
            if count == BigUint::ZERO {
                break;
            }
        }
        count
    }

    /// Is this vector in the set?
    pub fn contains(&self, value: impl Fn(u32) -> bool) -> bool {
        self.parts.iter().all(|part| self.diagram.value(part.root, &value))
    }

    /// Does any vector agree with `fixed`?
    pub fn possible(&self, fixed: &[Option<bool>]) -> bool {
        self.parts.iter().all(|part| self.diagram.possible(part.root, fixed))
    }

    /// The first `limit` vectors that agree with `fixed`, by value of the `search` levels in that order: the values of
    /// these levels. There must be a vector that agrees, as far as parts without searched levels go.
    pub fn first(&self, fixed: &[Option<bool>], search: &[u32], limit: usize) -> Vec<Vec<bool>> {
        let mut found = Vec::new();
        let mut fixed = fixed.to_vec();
        let mut parts: Vec<u32> = search.iter().map(|level| self.part_of[*level as usize]).collect();
        parts.sort_unstable();
        parts.dedup();
        let possible = |part: &u32| self.diagram.possible(self.parts[*part as usize].root, &fixed);
        if limit == 0 || !parts.iter().all(possible) {
            return found;
        }
        let can_be = |fixed: &mut [Option<bool>], level: u32, bit: bool| {
            fixed[level as usize] = Some(bit);
            let part = &self.parts[self.part_of[level as usize] as usize];
            self.diagram.possible(part.root, fixed)
        };
        // values chosen so far; what is chosen always leaves a way to go on
        let mut chosen: Vec<bool> = Vec::with_capacity(search.len());
        loop {
            while let Some(level) = search.get(chosen.len()) {
                let bit = !can_be(&mut fixed, *level, false);
                fixed[*level as usize] = Some(bit);
                chosen.push(bit);
            }
            found.push(chosen.clone());
            if found.len() == limit {
                return found;
            }
            // back to the last 0 that could be 1
            loop {
                let Some(bit) = chosen.pop() else { return found };
                let level = search[chosen.len()];
                if !bit && can_be(&mut fixed, level, true) {
                    chosen.push(true);
                    break;
                }
                fixed[level as usize] = None;
            }
        }
    }

    /// Disjoint rows, with a column for each of these levels: all that are not hidden.
    pub fn rows(&self, columns: &[u32], limit: usize) -> Rows {
        let mut factors = Vec::new();
        for part in &self.parts {
            let cubes: Vec<_> = self.diagram.cubes(part.root).take(limit.saturating_add(1)).collect();
            if cubes.is_empty() {
                return Rows { rows: Vec::new(), truncated: false };
            }
            factors.push(cubes);
        }
        let mut rows = Vec::new();
        let mut at = vec![0; factors.len()];
        let mut column_of = vec![usize::MAX; self.levels()];
        for (column, level) in columns.iter().enumerate() {
            column_of[*level as usize] = column;
        }
        let truncated = loop {
            if rows.len() == limit {
                break true;
            }
            let mut row = vec![None; columns.len()];
            for (cubes, at) in factors.iter().zip(&at) {
                for (level, bit) in &cubes[*at] {
                    row[column_of[*level as usize]] = Some(*bit);
                }
            }
            rows.push(row);
            // the last factor that is not at its end goes on
            let Some(step) = (0..factors.len()).rev().find(|f| at[*f] + 1 < factors[*f].len()) else { break false };
            at[step] += 1;
            at[step + 1..].fill(0);
        };
        rows.sort_by_cached_key(|row| row.iter().map(|v| v.map_or(2, u8::from)).collect::<Vec<u8>>());
        Rows { rows, truncated }
    }
}

/// The conjunction of the members of one part. A hidden variable goes as soon as nothing more depends on it.
fn fold(
    diagram: &mut Diagram,
    conjuncts: &[Edge],
    supports: &[Vec<u32>],
    members: &[usize],
    hidden: &impl Fn(u32) -> bool,
) -> Result<Edge, GaveUp> {
    let mut done_at: Vec<Vec<u32>> = vec![Vec::new(); members.len()];
    let mut met = rustc_hash::FxHashSet::default();
    for (step, at) in members.iter().enumerate().rev() {
        for level in supports[*at].iter().filter(|level| hidden(**level)) {
            if met.insert(*level) {
                done_at[step].push(*level);
            }
        }
    }
    let mut whole = Edge::TRUE;
    for (at, done) in members.iter().zip(&done_at) {
        let cube = diagram.cube(done)?;
        whole = diagram.and_exists(conjuncts[*at], whole, cube)?;
    }
    Ok(whole)
}

/// Levels that belong together (disjoint sets with path halving).
struct Groups(Vec<u32>);

impl Groups {
    fn new(levels: usize) -> Groups {
        Groups((0..levels as u32).collect())
    }

    fn find(&mut self, mut level: u32) -> u32 {
        while self.0[level as usize] != level {
            let above = self.0[self.0[level as usize] as usize];
            self.0[level as usize] = above;
            level = above;
        }
        level
    }

    fn tie(&mut self, a: u32, b: u32) {
        let (a, b) = (self.find(a), self.find(b));
        self.0[a.max(b) as usize] = a.min(b);
    }
}

//! A set of value vectors, kept as a product: relations over groups of variables that have nothing to do with each other.

use num_bigint::BigUint;

use super::GaveUp;
use super::conjunction::conjunction;
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
        // from the top of the diagram down, told by the lowest variable: the topmost may be one that all share
        let mut relations: Vec<Edge> = conjuncts.to_vec();
        relations.sort_by_cached_key(|root| {
            let support = diagram.support(*root);
            (support.last().copied(), support.first().copied())
        });
        let factors = conjunction(&mut diagram, &relations, &hidden)?;
        // in the order of their topmost level; what nothing depends on is one free part
        let mut parts: Vec<Part> = Vec::with_capacity(factors.len() + 1);
        let mut taken: Vec<bool> = (0..levels as u32).map(&hidden).collect();
        for factor in &factors {
            factor.support.iter().for_each(|level| taken[*level as usize] = true);
        }
        let free: Vec<u32> = (0..levels as u32).filter(|level| !taken[*level as usize]).collect();
        if !free.is_empty() {
            parts.push(Part { root: Edge::TRUE, levels: free });
        }
        parts.extend(factors.into_iter().map(|factor| Part { root: factor.root, levels: factor.support }));
        parts.sort_by_key(|part| part.levels.first().copied().unwrap_or(u32::MAX));
        let mut part_of = vec![u32::MAX; levels];
        for (at, part) in parts.iter().enumerate() {
            part.levels.iter().for_each(|level| part_of[*level as usize] = at as u32);
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

//! Is what one circuit can show while it rests within what another can show?
//!
//! The two projections are decision diagrams over variables in different orders. Those of the second are built anew in
//! the order of the first, from the bottom up by if-then-else; then every factor of the second must hold wherever the
//! first does.

use rustc_hash::FxHashMap;

use super::GaveUp;
use super::diagram::{Diagram, Edge};
use super::product::Product;
use super::projection::Projection;
use crate::control::Control;

impl Projection {
    /// Values that this projection has and the other does not, net by net of [`Projection::nets`]: the first in
    /// lexicographic order. `None`: all of them are values of the other as well.
    ///
    /// Net number i of the one stands for net number i of the other.
    ///
    /// Errors: a diagram of both outgrew the budget of `control`, or the caller asked to stop. Panics if the projections
    /// have not the same number of nets.
    pub fn beyond(&self, other: &Projection, control: &Control) -> Result<Option<Vec<bool>>, GaveUp> {
        assert_eq!(self.nets.len(), other.nets.len(), "projections on as many nets");
        // whichever order suits both: first that of the one, which is mostly the larger
        match Both::of(self, other, &ranks(self), control) {
            Err(GaveUp::Budget { .. }) => Both::of(self, other, &ranks(other), control),
            done => done,
        }
        .map(|both| both.first(self.nets.len()))
    }
}

/// The place of each column in the order of the levels of a projection.
fn ranks(projection: &Projection) -> Vec<u32> {
    let mut columns: Vec<u32> = (0..projection.levels.len() as u32).collect();
    columns.sort_by_key(|column| projection.levels[*column as usize]);
    let mut ranks = vec![0; columns.len()];
    for (rank, column) in columns.iter().enumerate() {
        ranks[*column as usize] = rank as u32;
    }
    ranks
}

/// Both projections in one diagram, with a level for each column.
struct Both {
    diagram: Diagram,
    /// the level of each column
    level: Vec<u32>,
    /// factors of the one, with their levels
    ours: Vec<(Edge, Vec<u32>)>,
    /// for each factor of the other that does not always hold: where it fails within the factors of the one that share a
    /// level with it, and these, by number
    broken: Vec<(Edge, Vec<usize>)>,
}

impl Both {
    fn of(ours: &Projection, theirs: &Projection, level: &[u32], control: &Control) -> Result<Both, GaveUp> {
        let mut diagram = Diagram::new(control);
        let mut factors = Vec::new();
        for root in copies(ours, level, &mut diagram)? {
            factors.push((root, diagram.support(root)));
        }
        let mut of_level = vec![usize::MAX; level.len()];
        for (number, (_, support)) in factors.iter().enumerate() {
            for at in support {
                of_level[*at as usize] = number;
            }
        }
        let mut broken = Vec::new();
        for root in copies(theirs, level, &mut diagram)? {
            let mut sharing: Vec<usize> = diagram.support(root).iter().map(|at| of_level[*at as usize]).collect();
            sharing.retain(|factor| *factor != usize::MAX);
            sharing.sort_unstable();
            sharing.dedup();
            let mut fails = !root;
            for factor in &sharing {
                fails = diagram.and(fails, factors[*factor].0)?;
            }
            if fails != Edge::FALSE {
                broken.push((fails, sharing));
            }
        }
        Ok(Both { diagram, level: level.to_vec(), ours: factors, broken })
    }

    /// The first vector of the one, by column, that is none of the other.
    fn first(&self, columns: usize) -> Option<Vec<bool>> {
        let mut fixed: Vec<Option<bool>> = vec![None; columns];
        if !self.possible(&fixed) {
            return None;
        }
        let mut values = Vec::with_capacity(columns);
        for level in &self.level {
            fixed[*level as usize] = Some(false);
            let bit = !self.possible(&fixed);
            fixed[*level as usize] = Some(bit);
            values.push(bit);
        }
        Some(values)
    }

    /// Is there such a vector that agrees with `fixed`?
    fn possible(&self, fixed: &[Option<bool>]) -> bool {
        if self.broken.is_empty() {
            return false;
        }
        let holds: Vec<bool> = self.ours.iter().map(|(root, _)| self.diagram.possible(*root, fixed)).collect();
        let rest = |sharing: &[usize]| (0..holds.len()).all(|factor| holds[factor] || sharing.contains(&factor));
        self.broken.iter().any(|(fails, sharing)| rest(sharing) && self.diagram.possible(*fails, fixed))
    }
}

/// The factors of a projection in another diagram, each column at its new level, in whatever order these are.
fn copies(projection: &Projection, level: &[u32], into: &mut Diagram) -> Result<Vec<Edge>, GaveUp> {
    let product: &Product = &projection.product;
    let mut new_level = vec![u32::MAX; product.levels()];
    for (column, old) in projection.levels.iter().enumerate() {
        new_level[*old as usize] = level[column];
    }
    let mut done: FxHashMap<Edge, Edge> = FxHashMap::default();
    done.insert(Edge::FALSE, Edge::FALSE);
    done.insert(Edge::TRUE, Edge::TRUE);
    let mut roots = Vec::with_capacity(product.parts.len());
    for part in &product.parts {
        for edge in product.diagram.below(part.root) {
            if done.contains_key(&edge) {
                continue;
            }
            let (low, high) = product.diagram.halves(edge);
            let variable = into.variable(new_level[product.diagram.level(edge) as usize])?;
            let copy = into.ite(variable, done[&high], done[&low])?;
            done.insert(edge, copy);
            done.insert(!edge, !copy);
        }
        roots.push(done[&part.root]);
    }
    Ok(roots)
}

//! What chosen nets can show while the circuit rests.

use num_bigint::BigUint;

use super::GaveUp;
use super::diagram::{Diagram, Edge};
use super::functions::Functions;
use super::product::{Product, Rows};
use super::relation::leaves;
use super::state_set::{StateSet, unknown};
use crate::circuit::{Circuit, NetId};

/// The values that some nets take together in the stable states of a circuit.
pub struct Projection {
    pub(super) nets: Vec<NetId>,
    /// of each net
    pub(super) levels: Vec<u32>,
    pub(super) product: Product,
}

impl Projection {
    /// The nets, each once, in the order in which they were asked for.
    pub fn nets(&self) -> &[NetId] {
        &self.nets
    }

    /// Number of different value vectors.
    pub fn count(&self) -> BigUint {
        self.product.count(&self.product.unfixed())
    }

    /// Nodes of its decision diagram, the intermediate ones included: what the budget counts.
    pub fn nodes(&self) -> usize {
        self.product.diagram.len()
    }

    /// The set as disjoint ternary rows over [`Projection::nets`], at most `limit` of them.
    pub fn rows(&self, limit: usize) -> Rows {
        self.product.rows(&self.levels, limit)
    }

    /// Do the nets take these values together in some stable state? One value for each of [`Projection::nets`], else
    /// it panics.
    pub fn contains(&self, values: &[bool]) -> bool {
        assert_eq!(values.len(), self.nets.len(), "one value a net");
        let mut by_level = vec![false; self.product.levels()];
        for (level, bit) in self.levels.iter().zip(values) {
            by_level[*level as usize] = *bit;
        }
        self.product.contains(|level| by_level[level as usize])
    }
}

impl StateSet<'_> {
    /// The values that these nets (inputs and gates; repeats are dropped) take together in all stable states.
    ///
    /// Errors: see [`StateSet::of`]. Panics on a net that does not exist.
    pub fn project(&self, nets: &[NetId]) -> Result<Projection, GaveUp> {
        let mut asked = vec![false; self.circuit.net_count()];
        let nets: Vec<NetId> =
            nets.iter().copied().filter(|net| !std::mem::replace(&mut asked[net.index()], true)).collect();

        // a net that is no variable gets one, right below all that it depends on
        let base = self.relation.order.len();
        let lowest = lowest_levels(self.circuit, self.relation.levels());
        let mut new_below: Vec<Vec<NetId>> = vec![Vec::new(); base + 1];
        for net in nets.iter().filter(|net| self.relation.level(**net).is_none()) {
            new_below[lowest[net.index()].map_or(base, |level| level as usize)].push(*net);
        }
        let mut level_of = vec![u32::MAX; self.circuit.net_count()];
        let mut levels = 0u32;
        let mut place = |net: NetId| {
            level_of[net.index()] = levels;
            levels += 1;
        };
        for (old, new) in new_below.iter().enumerate() {
            self.relation.order.get(old).into_iter().chain(new).copied().for_each(&mut place);
        }

        let mut diagram = Diagram::new(&self.control);
        let variables: Vec<u32> = self
            .circuit
            .nets()
            .map(|net| self.relation.level(net).map_or(u32::MAX, |_| level_of[net.index()]))
            .collect();
        let leaves = leaves(&mut diagram, &unknown(self.circuit), &variables)?;
        let mut functions = Functions::new(self.circuit, leaves);
        let product = &self.relation.product;
        let roots: Vec<_> = product.parts.iter().map(|part| part.root).collect();
        let possible = !roots.contains(&Edge::FALSE);
        if possible {
            functions.prepare(&mut diagram, nets.iter().copied())?;
        }
        let renamed = |old: u32| level_of[self.relation.order[old as usize].index()];
        let mut conjuncts = product.diagram.copy(&roots, &mut diagram, renamed)?;
        for net in new_below.iter().flatten().filter(|_| possible) {
            let shown = diagram.variable(level_of[net.index()])?;
            conjuncts.push(!diagram.xor(shown, functions.of(*net))?);
        }
        let columns: Vec<u32> = nets.iter().map(|net| level_of[net.index()]).collect();
        let mut hidden = vec![true; levels as usize];
        for level in &columns {
            hidden[*level as usize] = false;
        }
        let product = Product::of(diagram, levels as usize, &conjuncts, |level| hidden[level as usize])?;
        Ok(Projection { nets, levels: columns, product })
    }
}

/// The lowest (greatest) level that each net depends on through gates, `None` for constants.
fn lowest_levels(circuit: &Circuit, level: &[u32]) -> Vec<Option<u32>> {
    let mut lowest: Vec<Option<u32>> = level.iter().map(|level| Some(*level).filter(|l| *l != u32::MAX)).collect();
    for gate in circuit.evaluation_order() {
        let net = circuit.net_of(*gate).index();
        if level[net] == u32::MAX {
            lowest[net] = circuit.sources(*gate).iter().filter_map(|source| lowest[source.0.index()]).max();
        }
    }
    lowest
}

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

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use rand::{RngExt, SeedableRng};
    use rand_chacha::ChaCha8Rng;

    use super::*;
    use crate::circuit::{Circuit, Function, GateSpec, NetId};
    use crate::statics::{StateSet, is_stable};

    /// A random network of a few inputs and gates that may read anything.
    fn random(rng: &mut ChaCha8Rng, inputs: usize) -> Circuit {
        let gates = rng.random_range(1..=5usize);
        let any = |rng: &mut ChaCha8Rng| NetId(rng.random_range(0..(inputs + gates) as u32));
        let specs = (0..gates).map(|gate| {
            let functions = [Function::And, Function::Or, Function::Nand, Function::Nor, Function::Xor, Function::Not];
            let function = functions[rng.random_range(0..functions.len())].clone();
            let pins = (0..if function == Function::Not { 1 } else { 2 }).map(|_| any(rng)).collect();
            GateSpec { name: format!("g{gate}"), function, pins }
        });
        let specs = specs.collect();
        let names: Vec<String> = (0..inputs).map(|input| format!("i{input}")).collect();
        let names: Vec<&str> = names.iter().map(String::as_str).collect();
        Circuit::new(&names, specs, vec![]).unwrap()
    }

    /// Some nets, each once, in any order.
    fn some(rng: &mut ChaCha8Rng, circuit: &Circuit, most: usize) -> Vec<NetId> {
        let mut nets: Vec<NetId> = circuit.nets().collect();
        for at in (1..nets.len()).rev() {
            nets.swap(at, rng.random_range(0..=at));
        }
        nets.truncate(most);
        nets
    }

    /// Every stable state as these nets show it, by trying all states.
    fn shown(circuit: &Circuit, nets: &[NetId]) -> BTreeSet<Vec<bool>> {
        let all = 0..1u32 << circuit.net_count();
        let states = all.map(|number| {
            let bits = circuit.nets().map(|net| number >> net.index() & 1 == 1).collect::<Vec<_>>();
            crate::logic::State::known(crate::logic::Bits::of(bits.into_iter()))
        });
        let stable = states.filter(|state| is_stable(circuit, state));
        stable.map(|state| nets.iter().map(|net| state.ones.get(net.index())).collect()).collect()
    }

    #[test]
    fn the_first_value_that_only_one_of_two_networks_shows() {
        let control = Control::default();
        let mut rng = ChaCha8Rng::seed_from_u64(11);
        let (mut within, mut beyond, mut empty) = (0, 0, 0);
        for case in 0..3000 {
            let inputs = rng.random_range(0..=3);
            let (a, b) = (random(&mut rng, inputs), random(&mut rng, inputs));
            let most = a.net_count().min(b.net_count()).min(rng.random_range(1..=5));
            let (of_a, of_b) = (some(&mut rng, &a, most), some(&mut rng, &b, most));
            let project =
                |circuit: &Circuit, nets: &[NetId]| StateSet::of(circuit, &control).unwrap().project(nets).unwrap();
            let (shown_a, shown_b) = (shown(&a, &of_a), shown(&b, &of_b));
            let first = shown_a.difference(&shown_b).next().cloned();
            let found = project(&a, &of_a).beyond(&project(&b, &of_b), &control).unwrap();
            assert_eq!(found, first, "case {case}: {shown_a:?} in {shown_b:?}");
            within += usize::from(first.is_none() && !shown_a.is_empty());
            beyond += usize::from(first.is_some());
            empty += usize::from(shown_a.is_empty());
        }
        assert!(within > 200 && beyond > 500 && empty > 20, "{within} {beyond} {empty}");
    }

    #[test]
    fn a_budget_that_runs_out_is_told() {
        // a row of bits that another row repeats, in the same order or the other way round
        let n = 12u32;
        let pairs = |partner: &dyn Fn(u32) -> u32| {
            let gate = |at: u32| GateSpec {
                name: format!("g{at}"),
                function: Function::Buf,
                pins: vec![NetId(if at < n { at } else { partner(at - n) })],
            };
            let names: Vec<String> = (0..n).map(|input| format!("i{input}")).collect();
            let names: Vec<&str> = names.iter().map(String::as_str).collect();
            Circuit::new(&names, (0..2 * n).map(gate).collect(), vec![]).unwrap()
        };
        let (straight, crossed) = (pairs(&|at| at), pairs(&|at| n - 1 - at));
        let nets: Vec<NetId> = (n..3 * n).map(NetId).collect();
        let wide = Control::default();
        let project = |circuit| StateSet::of(circuit, &wide).unwrap().project(&nets).unwrap();
        let (a, b) = (project(&straight), project(&crossed));
        assert_eq!(a.beyond(&a, &wide), Ok(None));
        // the least row that is not the same both ways
        let found = a.beyond(&b, &wide).unwrap().expect("they differ");
        let row = |from: usize| found[from..from + n as usize].to_vec();
        assert_eq!(row(0), row(n as usize), "straight");
        assert_eq!(row(0).iter().filter(|bit| **bit).count(), 1, "{found:?}");
        let narrow = Control { nodes: 100, ..Control::default() };
        assert_eq!(a.beyond(&b, &narrow), Err(GaveUp::Budget { nodes: 100 }));
    }
}

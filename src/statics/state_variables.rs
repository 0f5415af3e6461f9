//! State variables: the fewest nets that tell the stable states of one input vector apart.

use num_bigint::BigUint;
use rustc_hash::{FxHashMap, FxHashSet};

use super::GaveUp;
use super::diagram::{Diagram, Edge};
use super::fewest::fewest;
use super::multiplicity::Choices;
use super::product::Part;
use super::relation::complete;
use super::state_set::StateSet;
use crate::circuit::{GateId, NetId};
use crate::logic::Bits;

/// Input vectors that are tried for the number of states that must be told apart, where not all can be.
const TRIED_VECTORS: usize = 16;

/// Nets whose values, with the inputs, determine the stable state.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct StateVariables {
    /// The nets, in net order.
    pub nets: Vec<NetId>,
    /// Is it proved that no fewer nets would do?
    pub exact: bool,
}

/// What one part of the circuit, or all of it, needs.
struct Needed {
    nets: Vec<NetId>,
    exact: bool,
    /// some input vector has at least this many stable states
    most: BigUint,
}

/// On which part of the state set a net depends.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Rests {
    OnNothing,
    On(u32),
    OnSeveral,
}

impl StateSet<'_> {
    /// The fewest gate nets whose values tell the stable states of every input vector apart; of equally few the first in
    /// net order. Empty if no input vector has several stable states.
    ///
    /// Exact where at most `limit` stable states need looking at, in the whole circuit or in each of its independent
    /// parts (the effort grows with the square of the limit; some hundreds to a few thousand are sensible). Elsewhere
    /// feedback nets are left out one by one as long as the others still tell the states apart; that is marked as not
    /// exact unless counting shows that fewer cannot do.
    ///
    /// Errors: see [`StateSet::of`].
    pub fn state_variables(&self, limit: usize) -> Result<StateVariables, GaveUp> {
        let count = self.count();
        if count == BigUint::ZERO {
            return Ok(StateVariables { nets: Vec::new(), exact: true });
        }
        // with all variables at 0, the nets that depend on none of them are right
        let mut constants = Bits::zeros(self.circuit.net_count());
        complete(self.circuit, &mut constants);
        if count <= BigUint::from(limit) {
            let needed = self.listed(&self.relation.order, self.circuit.evaluation_order(), &constants, limit);
            return Ok(StateVariables { nets: needed.nets, exact: needed.exact });
        }
        let rests = self.rests_on();
        let product = &self.relation.product;
        let mut gates_of: Vec<Vec<GateId>> = vec![Vec::new(); product.parts.len()];
        let mut tied = false;
        for gate in self.circuit.evaluation_order() {
            match rests[self.circuit.net_of(*gate).index()] {
                Rests::On(part) => gates_of[part as usize].push(*gate),
                Rests::OnSeveral => tied = true,
                Rests::OnNothing => {}
            }
        }
        let mut all = Needed { nets: Vec::new(), exact: true, most: BigUint::from(1u8) };
        let unfixed = product.unfixed();
        for (part, gates) in product.parts.iter().zip(&gates_of) {
            let variables: Vec<NetId> = part.levels.iter().map(|level| self.relation.order[*level as usize]).collect();
            if variables.iter().all(|net| self.circuit.is_input(*net)) {
                continue;
            }
            let count = product.diagram.count(part.root, &part.levels, &unfixed);
            let needed = if count <= BigUint::from(limit) {
                self.listed(&variables, gates, &constants, limit)
            } else {
                self.thinned_out(part, &variables)?
            };
            all.nets.extend(needed.nets);
            all.exact &= needed.exact;
            all.most *= needed.most;
        }
        all.nets.sort_unstable();
        // a net that depends on several parts might do the work of one from each, unless counting rules it out
        let exact = (all.exact && !tied) || all.most > BigUint::from(1u8) << all.nets.len() >> 1;
        Ok(StateVariables { nets: all.nets, exact })
    }

    /// Looks at every stable state of some variables (those of a part, or all) and the gates that depend on them alone,
    /// which are given in evaluation order.
    fn listed(&self, variables: &[NetId], gates: &[GateId], constants: &Bits, limit: usize) -> Needed {
        let (mut searched, feedback): (Vec<NetId>, Vec<NetId>) =
            variables.iter().partition(|net| self.circuit.is_input(**net));
        let inputs = searched.len();
        searched.extend(feedback);
        let mut candidates: Vec<NetId> = gates.iter().map(|gate| self.circuit.net_of(*gate)).collect();
        candidates.sort_unstable();
        let product = &self.relation.product;
        let found = product.first(&product.unfixed(), &self.levels(&searched), limit);
        let mut vectors: Vec<Vec<Bits>> = Vec::new();
        let mut last: Option<&[bool]> = None;
        let mut state = constants.clone();
        for values in &found {
            for (net, bit) in searched.iter().zip(values) {
                state.set(net.index(), *bit);
            }
            for gate in gates {
                // feedback nets come out as they are: the state is stable
                let value = self.circuit.wants(*gate, |source| state.get(source.index()));
                state.set(self.circuit.net_of(*gate).index(), value);
            }
            let shown = Bits::of(candidates.iter().map(|net| state.get(net.index())));
            let vector = &values[..inputs];
            match vectors.last_mut().filter(|_| last == Some(vector)) {
                Some(states) => states.push(shown),
                None => vectors.push(vec![shown]),
            }
            last = Some(vector);
        }
        let most = vectors.iter().map(Vec::len).max().unwrap_or(1);
        let columns = different_columns(&vectors, candidates.len());
        let (chosen, exact) = fewest(differences(&vectors, &columns), columns.len(), digits(most));
        let nets = chosen.into_iter().map(|column| candidates[columns[column]]).collect();
        Needed { nets, exact, most: most.into() }
    }

    /// Starts with all feedback nets of a part and leaves out what is not needed: the last net first, and, should
    /// counting not show that this is the best, once more in another order.
    fn thinned_out(&self, part: &Part, variables: &[NetId]) -> Result<Needed, GaveUp> {
        let mut feedback: Vec<NetId> = variables.iter().copied().filter(|net| !self.circuit.is_input(*net)).collect();
        feedback.sort_unstable_by(|a, b| b.cmp(a));
        let most = self.most_states(part, variables);
        let exact = |nets: &[NetId]| most > BigUint::from(1u8) << nets.len() >> 1;
        let mut nets = self.leave_out(part, variables, &feedback)?;
        if !exact(&nets) {
            // loops that read others before those that they read, so that no net is left out because of what follows it
            let mut place: FxHashMap<u32, u32> = FxHashMap::default();
            let component = |net: NetId| self.circuit.driver(net).map_or(u32::MAX, |gate| self.circuit.component(gate));
            for net in &feedback {
                let first = place.entry(component(*net)).or_insert(u32::MAX);
                *first = self.level(*net).min(*first);
            }
            feedback.sort_unstable_by_key(|net| (std::cmp::Reverse(place[&component(*net)]), *net));
            let others = self.leave_out(part, variables, &feedback)?;
            if others.len() < nets.len() {
                nets = others;
            }
        }
        nets.sort_unstable();
        Ok(Needed { exact: exact(&nets), nets, most })
    }

    /// Of these feedback nets of a part, those that stay when each in turn is left out if the others do without it.
    fn leave_out(&self, part: &Part, variables: &[NetId], feedback: &[NetId]) -> Result<Vec<NetId>, GaveUp> {
        let product = &self.relation.product;
        let mut outer = vec![false; product.levels()];
        for net in variables {
            outer[self.level(*net) as usize] = true;
        }
        let choices = Choices::of(&product.diagram, part.root, &part.levels);
        let mut kept = Vec::new();
        for net in feedback {
            let level = self.level(*net) as usize;
            outer[level] = false;
            let mut diagram = Diagram::new(&self.control);
            let left = choices.multiplicity(|level| outer[level as usize], &mut diagram)?;
            if left.several != Edge::FALSE {
                outer[level] = true;
                kept.push(*net);
            }
        }
        Ok(kept)
    }

    /// The number of stable states of a part for one of some input vectors, at best of all.
    fn most_states(&self, part: &Part, variables: &[NetId]) -> BigUint {
        let product = &self.relation.product;
        let mut most = BigUint::from(1u8);
        for cube in product.diagram.cubes(part.root).take(TRIED_VECTORS) {
            let mut fixed = product.unfixed();
            for net in variables.iter().filter(|net| self.circuit.is_input(**net)) {
                fixed[self.level(*net) as usize] = Some(false);
            }
            for (level, bit) in cube {
                if fixed[level as usize].is_some() {
                    fixed[level as usize] = Some(bit);
                }
            }
            most = most.max(product.diagram.count(part.root, &part.levels, &fixed));
        }
        most
    }

    /// For each net the part that it depends on.
    fn rests_on(&self) -> Vec<Rests> {
        let product = &self.relation.product;
        let mut rests: Vec<Rests> = self
            .circuit
            .nets()
            .map(|net| match self.relation.level(net) {
                Some(level) => Rests::On(product.part_of[level as usize]),
                None => Rests::OnNothing,
            })
            .collect();
        for gate in self.circuit.evaluation_order() {
            let net = self.circuit.net_of(*gate);
            if self.relation.level(net).is_none() {
                rests[net.index()] =
                    self.circuit.sources(*gate).iter().fold(Rests::OnNothing, |so_far, source| {
                        match (so_far, rests[source.0.index()]) {
                            (Rests::OnNothing, other) | (other, Rests::OnNothing) => other,
                            (a, b) if a == b => a,
                            _ => Rests::OnSeveral,
                        }
                    });
            }
        }
        rests
    }
}

/// How many nets it takes to tell so many states apart, at least: k nets tell at most 2^k.
fn digits(states: usize) -> usize {
    states.next_power_of_two().trailing_zeros() as usize
}

/// For every two states of one input vector the columns (by place in `columns`) in which they differ.
fn differences(vectors: &[Vec<Bits>], columns: &[usize]) -> FxHashSet<Bits> {
    let mut differences = FxHashSet::default();
    for states in vectors {
        let states: Vec<Bits> =
            states.iter().map(|state| Bits::of(columns.iter().map(|column| state.get(*column)))).collect();
        for (at, a) in states.iter().enumerate() {
            for b in &states[at + 1..] {
                let mut differ = a.clone();
                differ.words_mut().iter_mut().zip(b.words()).for_each(|(a, b)| *a ^= b);
                differences.insert(differ);
            }
        }
    }
    differences
}

/// The columns that tell anything apart, the first of those that tell the same apart.
fn different_columns(vectors: &[Vec<Bits>], columns: usize) -> Vec<usize> {
    let states: usize = vectors.iter().map(Vec::len).sum();
    let mut known: FxHashSet<Bits> = FxHashSet::default();
    known.insert(Bits::zeros(states));
    let tells = |column: usize| {
        // against the first state of each vector
        let against = |vector: &Vec<Bits>, state: &Bits| state.get(column) != vector[0].get(column);
        let bits: Vec<bool> =
            vectors.iter().flat_map(|vector| vector.iter().map(move |state| against(vector, state))).collect();
        Bits::of(bits.into_iter())
    };
    (0..columns).filter(|column| known.insert(tells(*column))).collect()
}

//! The one stable state in which a circuit starts.

use num_bigint::BigUint;

use super::diagram::Diagram;
use super::functions::Functions;
use super::relation::{Relation, complete, leaves, net_by_net};
use super::ternary::{settle, wanted};
use super::{GaveUp, state_set::unknown};
use crate::circuit::{Circuit, NetId, NetSet};
use crate::control::Control;
use crate::logic::{Bits, State, Value};

/// Most candidates that an answer lists.
const CANDIDATES: usize = 16;

/// Why there is not one stable state to start from.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum NoRest {
    /// The circuit has no stable state with these inputs, whatever is named.
    #[error("the circuit has no stable state with these inputs")]
    None,
    /// No stable state with these inputs has the named values up to and including this net; without it there may be one.
    #[error("no stable state with these inputs has the named values")]
    Contradiction {
        /// The first named net that cannot be so, given those named before it.
        net: NetId,
    },
    /// More than one stable state agrees.
    #[error("{total} stable states agree with what is given")]
    Several {
        /// The first of them by their feedback nets, at most 16, values of all nets in lexicographic order.
        candidates: Vec<Bits>,
        /// How many there are.
        total: BigUint,
        /// The nets that are not the same in all of them, in net order. If that is too much work: the feedback nets of
        /// which this is true, and the nets on which the candidates differ.
        open: Vec<NetId>,
    },
    /// The analysis came to no end: nothing is known.
    #[error(transparent)]
    GaveUp(#[from] GaveUp),
}

/// The one stable state with these inputs (one value each) that agrees with the named nets.
///
/// What follows for certain is found by ternary propagation, in time linear in the circuit. Only the loops that stay
/// open go into a decision diagram, each independent part apart. A named value narrows the choice; that its gate really
/// gives it is always checked.
///
/// ```
/// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
/// use stillgate::control::Control;
/// use stillgate::statics::{NoRest, rest};
/// // a latch of two NORs: inputs r and s, gates q and qn
/// let nor = |name: &str, a, b| GateSpec { name: name.into(), function: Function::Nor, pins: vec![NetId(a), NetId(b)] };
/// let latch = Circuit::new(&["r", "s"], vec![nor("q", 0, 3), nor("qn", 1, 2)], vec![]).unwrap();
/// let start = rest(&latch, &[false, false], &[(NetId(2), true)], &Control::default()).unwrap();
/// assert!(start.get(2) && !start.get(3));
/// let open = rest(&latch, &[false, false], &[], &Control::default());
/// assert!(matches!(open, Err(NoRest::Several { .. })));
/// ```
///
/// Errors: see [`NoRest`]. Panics if `inputs` is not one value an input or a named net does not exist.
pub fn rest(circuit: &Circuit, inputs: &[bool], named: &[(NetId, bool)], control: &Control) -> Result<Bits, NoRest> {
    assert_eq!(inputs.len(), circuit.input_count(), "one value an input");
    match fit(circuit, inputs, named, control)? {
        Fit::One(state) => Ok(state),
        Fit::None => Err(contradiction(circuit, inputs, named, control)),
        Fit::Several(open) => Err(open.describe(circuit, control)?),
    }
}

/// The stable states that agree with inputs and named nets.
pub(super) enum Fit {
    None,
    One(Bits),
    Several(Box<Open>),
}

/// Several stable states: what is known of all of them, and the relation of the rest.
pub(super) struct Open {
    known: State,
    relation: Relation,
    pub total: BigUint,
}

pub(super) fn fit(
    circuit: &Circuit,
    inputs: &[bool],
    named: &[(NetId, bool)],
    control: &Control,
) -> Result<Fit, GaveUp> {
    let mut known = unknown(circuit);
    let given = circuit.inputs().zip(inputs.iter().copied()).chain(named.iter().copied());
    for (net, bit) in given {
        if known.get(net.index()).known().is_some_and(|other| other != bit) {
            return Ok(Fit::None);
        }
        known.set(net.index(), Value::from(bit));
    }
    settle(circuit, &mut known);
    // named nets were taken at their word so far
    let mut held = Vec::new();
    for (net, bit) in named {
        if let Some(gate) = circuit.driver(*net) {
            match wanted(circuit, &known, gate).known() {
                Some(value) if value != *bit => return Ok(Fit::None),
                Some(_) => {}
                None => held.push(*net),
            }
        }
    }
    if !known.has_unknown() {
        return Ok(Fit::One(known.ones));
    }
    let relation = Relation::of(circuit, &known, &held, control)?;
    let total = relation.product.count(&relation.product.unfixed());
    let open = Open { known, relation, total };
    if open.total == BigUint::ZERO {
        Ok(Fit::None)
    } else if open.total == BigUint::from(1u8) {
        Ok(Fit::One(open.states(circuit, 1).pop().expect("there is one")))
    } else {
        Ok(Fit::Several(Box::new(open)))
    }
}

impl Open {
    /// The first stable states by their feedback nets, in lexicographic order.
    pub fn states(&self, circuit: &Circuit, limit: usize) -> Vec<Bits> {
        let product = &self.relation.product;
        let feedback: Vec<NetId> =
            circuit.feedback().iter().copied().filter(|net| self.relation.level(*net).is_some()).collect();
        let search: Vec<u32> = feedback.iter().filter_map(|net| self.relation.level(*net)).collect();
        let mut states: Vec<Bits> = product
            .first(&product.unfixed(), &search, limit)
            .into_iter()
            .map(|values| {
                let mut state = self.known.ones.clone();
                for (net, bit) in feedback.iter().zip(values) {
                    state.set(net.index(), bit);
                }
                complete(circuit, &mut state);
                state
            })
            .collect();
        states.sort_by(net_by_net);
        states
    }

    fn describe(self, circuit: &Circuit, control: &Control) -> Result<NoRest, GaveUp> {
        let candidates = self.states(circuit, CANDIDATES);
        let mut open = NetSet::none(circuit.net_count());
        for state in &candidates {
            for net in circuit.nets().filter(|net| state.get(net.index()) != candidates[0].get(net.index())) {
                open.insert(net);
            }
        }
        match self.varying(circuit, control, &mut open) {
            Ok(()) | Err(GaveUp::Budget { .. }) => {}
            Err(stopped) => return Err(stopped),
        }
        Ok(NoRest::Several { candidates, total: self.total, open: open.iter().collect() })
    }

    /// Adds the nets that have both values in the stable states, feedback nets first.
    fn varying(&self, circuit: &Circuit, control: &Control, open: &mut NetSet) -> Result<(), GaveUp> {
        let product = &self.relation.product;
        let mut fixed = product.unfixed();
        for (level, net) in self.relation.order.iter().enumerate() {
            let part = &product.parts[product.part_of[level] as usize];
            let mut both = true;
            for bit in [false, true] {
                fixed[level] = Some(bit);
                both &= product.diagram.possible(part.root, &fixed);
            }
            fixed[level] = None;
            if both {
                open.insert(*net);
            }
        }
        let mut diagram = Diagram::new(control);
        let roots: Vec<_> = product.parts.iter().map(|part| part.root).collect();
        let roots = product.diagram.copy(&roots, &mut diagram, |level| level)?;
        let leaves = leaves(&mut diagram, &self.known, self.relation.levels())?;
        let mut functions = Functions::new(circuit, leaves);
        let unknown: Vec<NetId> = circuit.nets().filter(|net| self.known.get(net.index()) == Value::X).collect();
        functions.prepare(&mut diagram, unknown.iter().copied())?;
        for net in unknown {
            if open.contains(net) {
                continue;
            }
            let function = functions.of(net);
            let mut parts: Vec<u32> =
                diagram.support(function).into_iter().map(|level| product.part_of[level as usize]).collect();
            parts.sort_unstable();
            parts.dedup();
            let mut both = true;
            for side in [function, !function] {
                let mut possible = side;
                for part in &parts {
                    let cube = diagram.cube(&product.parts[*part as usize].levels)?;
                    possible = diagram.and_exists(roots[*part as usize], possible, cube)?;
                }
                both &= possible == super::diagram::Edge::TRUE;
            }
            if both {
                open.insert(net);
            }
        }
        Ok(())
    }
}

/// Why nothing agrees: no stable state at all, or else the named net that made the difference.
fn contradiction(circuit: &Circuit, inputs: &[bool], named: &[(NetId, bool)], control: &Control) -> NoRest {
    // the more is named the less agrees; where the analysis gives up something may agree
    let (mut may, mut cannot) = (0, named.len());
    let fits = |count: usize| fit(circuit, inputs, &named[..count], control);
    match fits(0) {
        Ok(Fit::None) => return NoRest::None,
        Err(GaveUp::Cancelled) => return GaveUp::Cancelled.into(),
        _ => {}
    }
    while cannot - may > 1 {
        let middle = may + (cannot - may) / 2;
        match fits(middle) {
            Ok(Fit::None) => cannot = middle,
            Err(GaveUp::Cancelled) => return GaveUp::Cancelled.into(),
            _ => may = middle,
        }
    }
    NoRest::Contradiction { net: named[cannot - 1].0 }
}

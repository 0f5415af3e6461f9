//! Random rules for random scenarios.

use std::collections::BTreeSet;
use std::sync::Arc;

use rand::RngExt;
use rand::seq::{IndexedMutRandom, IndexedRandom};
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::{Circuit, Function, GateId, GateSpec, NetId};
use stillgate::scenario::{
    Alternative, Before, EdgeCount, EdgeKind, EdgeSpec, Expectation, GlitchFree, Mark, MinPulse, Never, NeverAtRest,
    Oscillation, Permission, RefNet, Reference, Rules, Scenario, Swallowed, Timing,
};
use stillgate::time::Span;

use super::random_worlds::Lengths;
use super::world::fs;

/// Short times, so that bounds are met, missed by one, and far away.
fn bound(rng: &mut ChaCha8Rng, delays: Lengths) -> Span {
    fs(match delays {
        Lengths::Ties => rng.random_range(1..=12),
        Lengths::Short => rng.random_range(1..=90),
        Lengths::Wide => rng.random_range(1..=250_000),
    })
}

fn pattern(rng: &mut ChaCha8Rng, nets: &[NetId]) -> Alternative {
    let mut chosen: Vec<NetId> = nets.sample(rng, rng.clone().random_range(1..=2)).copied().collect();
    chosen.sort_unstable();
    chosen.into_iter().map(|net| (net, rng.random())).collect()
}

/// Random rules for a scenario, and random clauses for its steps.
pub fn add_rules(scenario: &mut Scenario, rng: &mut ChaCha8Rng, delays: Lengths) {
    let nets: Vec<NetId> = scenario.circuit.nets().collect();
    let gates: Vec<NetId> = scenario.circuit.gates().map(|gate| scenario.circuit.net_of(gate)).collect();
    let mut rules = Rules::default();
    for _ in 0..rng.random_range(0..=2) {
        let longer_than = if rng.random() { fs(0) } else { bound(rng, delays) };
        rules.never.push(Never { name: None, state: pattern(rng, &nets), longer_than, mark: Mark(0) });
    }
    for _ in 0..rng.random_range(0..=2) {
        rules.never_at_rest.push(NeverAtRest { name: None, state: pattern(rng, &nets), mark: Mark(0) });
    }
    for _ in 0..rng.random_range(0..=3) {
        let edge = |rng: &mut ChaCha8Rng| EdgeSpec {
            net: *nets.choose(rng).unwrap(),
            edge: *[EdgeKind::Rise, EdgeKind::Fall, EdgeKind::Any].choose(rng).unwrap(),
        };
        let from = edge(rng);
        let to = match rng.random_range(0..4) {
            0 => from,
            1 => EdgeSpec { net: from.net, ..edge(rng) },
            _ => edge(rng),
        };
        let bounds = [bound(rng, delays), bound(rng, delays)];
        let (min, max) = match rng.random_range(0..3) {
            0 => (Some(bounds[0]), None),
            1 => (None, Some(bounds[0])),
            _ => (Some(bounds[0].min(bounds[1])), Some(bounds[0].max(bounds[1]))),
        };
        rules.timing.push(Timing { name: None, from, to, min, max, mark: Mark(0) });
    }
    for net in nets.sample(rng, rng.clone().random_range(0..=2)) {
        let bounds = [Some(bound(rng, delays)), Some(bound(rng, delays))];
        let [high, low] = *[bounds, [bounds[0], None], [None, bounds[0]]].choose(rng).unwrap();
        rules.min_pulse.push(MinPulse { net: *net, high, low, mark: Mark(0) });
    }
    for net in gates.sample(rng, rng.clone().random_range(0..=2)) {
        let shorter_than = if rng.random() { fs(0) } else { bound(rng, delays) };
        rules.glitch_free.push(GlitchFree { net: *net, shorter_than, mark: Mark(0) });
    }
    rules.settle_within = rng.random_bool(0.6).then(|| bound(rng, delays));
    rules.critical_race = *[Permission::Forbidden, Permission::Allowed].choose(rng).unwrap();
    let words = [Oscillation::Forbidden, Oscillation::Allowed, Oscillation::Required];
    rules.oscillation = *words.choose(rng).unwrap();
    rules.swallowed = match rng.random_range(0..3) {
        0 => Swallowed::Listed,
        1 => Swallowed::Forbidden,
        _ => {
            let mut at: Vec<NetId> = gates.sample(rng, 2).copied().collect();
            at.sort_unstable();
            Swallowed::At(at)
        }
    };
    rules.before_rest = *[Before::Allowed, Before::Forbidden].choose(rng).unwrap();
    scenario.outputs = gates.sample(rng, 2).copied().collect();
    let watched: BTreeSet<NetId> =
        scenario.outputs.iter().copied().chain(rules.glitch_free.iter().map(|rule| rule.net)).collect();
    scenario.watched = watched.into_iter().collect();
    for step in &mut Arc::make_mut(&mut scenario.stimulus).steps {
        if rng.random_bool(0.5) {
            let alternatives = (0..rng.random_range(1..=2)).map(|_| pattern(rng, &nets)).collect();
            step.expect = Some(Expectation { alternatives, mark: Mark(0) });
        }
        if rng.random_bool(0.4) {
            let mut at: Vec<NetId> = scenario.watched.sample(rng, 1).copied().collect();
            at.extend(gates.choose(rng));
            at.sort_unstable();
            at.dedup();
            for net in at {
                let least = rng.random_range(0..=2);
                step.edges.push(EdgeCount { net, least, most: least + rng.random_range(0..=1) });
            }
        }
        step.settle_within = rng.random_bool(0.2).then(|| bound(rng, delays));
        step.oscillation = rng.random_bool(0.3).then(|| *words.choose(rng).unwrap());
    }
    if rng.random_bool(0.3) {
        scenario.reference = Some(Arc::new(reference(scenario, rng, &gates)));
    }
    scenario.rules = Arc::new(rules);
}

/// A reference of a few gates: sometimes the circuit itself, perhaps with another gate in one place; else any network.
fn reference(scenario: &Scenario, rng: &mut ChaCha8Rng, gates: &[NetId]) -> Reference {
    let (circuit, inputs) = (&scenario.circuit, scenario.circuit.input_count());
    let two = [Function::And, Function::Or, Function::Nand, Function::Nor, Function::Xor];
    let compare: Vec<NetId> = gates.sample(rng, rng.clone().random_range(1..=2)).copied().collect();
    if gates.len() <= 5 && rng.random() {
        let spec = |gate: GateId| GateSpec {
            name: circuit.name(circuit.net_of(gate)).into(),
            function: circuit.function(gate).clone(),
            pins: circuit.pins(gate).to_vec(),
        };
        let mut specs: Vec<GateSpec> = circuit.gates().map(spec).collect();
        if let Some(changed) = specs.choose_mut(rng).filter(|it| it.pins.len() == 2) {
            changed.function = two.choose(rng).unwrap().clone();
        }
        let names: Vec<&str> = circuit.inputs().map(|net| circuit.name(net)).collect();
        let compare = compare.into_iter().map(|net| (net, RefNet(net))).collect();
        return Reference { circuit: Circuit::new(&names, specs, vec![]).unwrap(), compare };
    }
    let count = rng.random_range(1..=4);
    let spec = |gate: usize| {
        let function = if rng.random_bool(0.2) { Function::Not } else { two.choose(rng).unwrap().clone() };
        let pins = if function == Function::Not { 1 } else { 2 };
        let pins = (0..pins).map(|_| NetId(rng.random_range(0..(inputs + count) as u32))).collect();
        GateSpec { name: format!("ideal{gate}"), function, pins }
    };
    let specs = (0..count).map(spec).collect();
    let names: Vec<&str> = circuit.inputs().map(|net| circuit.name(net)).collect();
    let ideal = (0..count).map(|gate| RefNet(NetId((inputs + gate) as u32)));
    let compare = compare.into_iter().zip(ideal).collect();
    Reference { circuit: Circuit::new(&names, specs, vec![]).unwrap(), compare }
}

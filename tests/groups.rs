//! Gates of one group vary together as their group says, each alone as without it, and nobody else notices.

use std::sync::Arc;

use stillgate::circuit::{Function, GateId};
use stillgate::delay::{Billionths, DelayRange, Group, Marginal, Together};
use stillgate::instance::{Instance, Which};
use stillgate::reader;
use stillgate::scenario::{Place, Scenario};
use stillgate::time::Span;

use crate::support::spread::{kolmogorov, spearman};
use crate::support::world::{World, fs};

/// Six gates of unlike ranges, a wire and a drawn step; gate 1 has one draw for both edges.
fn six(draw: Marginal) -> Scenario {
    let mut world = World::new();
    world.input("a", false);
    for gate in ["p", "q", "r", "s", "t", "u"] {
        world.gate(gate, Function::Not, &["a"], 1);
    }
    let ranges = [
        (1_000, 4_000, 6_000),
        (100_000, 200_000, 900_000),
        (50_000, 90_000, 91_000),
        (1_000, 4_000, 6_000),
        (7, 7, 7),
        (10_000, 30_000, 50_000),
    ];
    for (gate, (min, typ, max)) in world.gates.iter_mut().zip(ranges) {
        gate.delay = [DelayRange { min: fs(min), typ: fs(typ), max: fs(max) }; 2];
    }
    world.wire("a", "p", 1, 1);
    world.wires[0].2 = [DelayRange::between(fs(100), fs(900_000)); 2];
    world.step(Place::At(DelayRange::between(fs(1_000), fs(50_000))), &[("a", true)]);
    world.plan.draw = draw;
    world.plan.samples = 20_000;
    world.plan.seed = 7;
    let mut scenario = world.scenario();
    Arc::make_mut(&mut scenario.delays).gate_one_draw[1] = true;
    scenario
}

fn grouped(draw: Marginal, gates: &[u32], how: Together) -> Scenario {
    let mut scenario = six(draw);
    Arc::make_mut(&mut scenario.delays).groups =
        vec![Group { gates: gates.iter().map(|gate| GateId(*gate)).collect(), how }];
    scenario
}

fn tracking(rho: f64) -> Together {
    Together::Tracking(Billionths::nearest(rho))
}

fn drawn(scenario: &Scenario, samples: u64) -> Vec<Instance> {
    (0..samples).map(|sample| Instance::of(scenario, &Which::Sample(sample))).collect()
}

/// The part of the probability that lies at or below a drawn delay, from the formula of the distribution; the middle of
/// the step where whole femtoseconds make one.
pub fn below(draw: Marginal, range: DelayRange, span: Span) -> f64 {
    let [min, typ, max, x] = [range.min, range.typ, range.max, span].map(|it| it.fs() as f64);
    let phi = |z: f64| 0.5 * libm::erfc(-z / 2f64.sqrt());
    match draw {
        Marginal::Triangular if x < typ => (x - min).powi(2) / ((max - min) * (typ - min)),
        Marginal::Triangular => 1.0 - (max - x).powi(2) / ((max - min) * (max - typ)),
        Marginal::Normal => {
            let z = 3.0 * if x < typ { (x - typ) / (typ - min) } else { (x - typ) / (max - typ) };
            (phi(z) - phi(-3.0)) / (phi(3.0) - phi(-3.0))
        }
        _ => (x - min + 0.5) / (max - min + 1.0),
    }
}

/// Kolmogorov-Smirnov at 0.1 %: 1.95 / √n [large n; from memory]. Whatever the marginal and the group, each delay alone is
/// spread as its marginal says.
#[test]
fn tracking_leaves_every_marginal_as_it_is() {
    let samples = 10_000;
    let bound = 1.95 / (samples as f64).sqrt();
    for draw in [Marginal::Uniform, Marginal::Triangular, Marginal::Normal] {
        for rho in [0.0, 0.3, 0.9, 1.0] {
            let scenario = grouped(draw, &[0, 1, 2], tracking(rho));
            let instances = drawn(&scenario, samples);
            for gate in 0..3 {
                let range = scenario.delays.gate[gate][1];
                let parts = instances.iter().map(|it| below(draw, range, it.delays.gate[gate][1])).collect();
                let distance = kolmogorov(parts);
                assert!(distance < bound, "{draw:?}, tracking {rho}, gate {gate}: {distance} of {bound}");
            }
        }
        // the test can fail: another marginal is found out
        let other = if draw == Marginal::Uniform { Marginal::Normal } else { Marginal::Uniform };
        let scenario = six(draw);
        let range = scenario.delays.gate[0][1];
        let parts = drawn(&scenario, samples).iter().map(|it| below(other, range, it.delays.gate[0][1])).collect();
        assert!(kolmogorov(parts) > bound, "{draw:?} is not {other:?}");
    }
}

/// Whom tracking joins: any two delays of the group's gates, rise and fall of one gate too; no wire, no other gate.
#[test]
fn tracking_joins_the_delays_of_the_group_and_no_others() {
    let samples = 10_000;
    let scenario = grouped(Marginal::Uniform, &[0, 2], tracking(0.8));
    let instances = drawn(&scenario, samples);
    let pairs = |a: &dyn Fn(&Instance) -> Span, b: &dyn Fn(&Instance) -> Span| {
        spearman(&instances.iter().map(|it| (a(it).fs(), b(it).fs())).collect::<Vec<_>>())
    };
    let gate = |gate: usize, edge: usize| move |it: &Instance| it.delays.gate[gate][edge];
    let wire = |it: &Instance| it.delays.wire[0][1];
    // a rank correlation of independent draws has a standard deviation of 1/√(n−1)
    let five = 5.0 / ((samples - 1) as f64).sqrt();
    for (a, b) in [((0, 1), (2, 1)), ((0, 1), (0, 0)), ((0, 0), (2, 1)), ((2, 0), (2, 1))] {
        assert!(pairs(&gate(a.0, a.1), &gate(b.0, b.1)) > 0.7, "{a:?} and {b:?} track");
    }
    for other in [1, 3, 5] {
        assert!(pairs(&gate(0, 1), &gate(other, 1)).abs() < five, "gate {other} is in no group");
    }
    assert!(pairs(&gate(0, 1), &wire).abs() < five, "a wire is in no group");
}

#[test]
fn without_tracking_the_draws_are_those_without_a_group() {
    for draw in Marginal::ALL {
        let (plain, group) = (six(draw), grouped(draw, &[0, 1, 3], tracking(0.0)));
        assert_eq!(drawn(&plain, 200), drawn(&group, 200), "{draw:?}");
        // and a group moves nobody else's draws
        let group = grouped(draw, &[1, 3], tracking(0.6));
        for (plain, group) in drawn(&plain, 200).iter().zip(drawn(&group, 200)) {
            for gate in [0, 2, 4, 5] {
                assert_eq!(plain.delays.gate[gate], group.delays.gate[gate], "{draw:?}, gate {gate}");
            }
            assert_eq!((&plain.delays.wire, &plain.places), (&group.delays.wire, &group.places), "{draw:?}");
        }
    }
}

#[test]
fn full_tracking_is_in_step() {
    let scenario = grouped(Marginal::Normal, &[0, 3], tracking(1.0));
    for instance in drawn(&scenario, 500) {
        let [a, b] = [0, 3].map(|gate| instance.delays.gate[gate]);
        assert_eq!((a, a[0]), (b, a[1]), "equal ranges, equal delays, both edges");
    }
}

#[test]
fn the_number_of_a_group_stands_in_a_far_region() {
    use rand::{Rng, SeedableRng};
    let mut rng = rand_chacha::ChaCha8Rng::seed_from_u64(7);
    let scenario = grouped(Marginal::Uniform, &[0], tracking(1.0));
    let range = scenario.delays.gate[0][1];
    for sample in [0, 5, 19_999] {
        rng.set_stream(2 * sample);
        rng.set_word_pos(2 << 40);
        let expected = Marginal::Uniform.quantile(range, rng.next_u64());
        assert_eq!(Instance::of(&scenario, &Which::Sample(sample)).delays.gate[0], [expected; 2], "sample {sample}");
    }
}

#[test]
fn scaled_delays_keep_to_their_range_and_close_to_their_group() {
    let mismatch = 0.05;
    let how = Together::Scale {
        least: Billionths::nearest(0.6),
        greatest: Billionths::nearest(1.5),
        mismatch: Billionths::nearest(mismatch),
    };
    for draw in Marginal::ALL {
        let scenario = grouped(draw, &[0, 1, 5], how);
        let (mut low, mut high, mut cut) = (f64::MAX, 0.0f64, 0);
        for instance in drawn(&scenario, 3_000) {
            let factor = |gate: usize, edge: usize| {
                let (range, span) = (scenario.delays.gate[gate][edge], instance.delays.gate[gate][edge]);
                assert!((range.min..=range.max).contains(&span), "{draw:?}, gate {gate}: {span:?}");
                let inside = range.min < span && span < range.max;
                inside.then_some(span.fs() as f64 / range.typ.fs() as f64)
            };
            let factors: Vec<f64> =
                [(0, 0), (0, 1), (1, 0), (5, 0), (5, 1)].iter().filter_map(|it| factor(it.0, it.1)).collect();
            cut += 5 - factors.len();
            let (least, greatest) = factors.iter().fold((f64::MAX, 0.0f64), |(a, b), f| (a.min(*f), b.max(*f)));
            // rounded to whole fs of delays from 1000 fs on
            assert!(
                greatest <= least * (1.0 + mismatch) / (1.0 - mismatch) * 1.002 || factors.is_empty(),
                "{factors:?}"
            );
            (low, high) = (low.min(least), high.max(greatest));
        }
        assert!(low < 0.7 && high > 1.4, "{draw:?}: factors from {low} to {high}");
        assert!(cut > 0, "{draw:?}: 1.5 · 1.05 · 4000 is beyond 6000");
    }
    // a scale that leaves 1 out is told by its nearest end: typically 1.2
    let how = Together::Scale {
        least: Billionths::nearest(1.2),
        greatest: Billionths::nearest(1.6),
        mismatch: Billionths(0),
    };
    let scenario = grouped(Marginal::Normal, &[5], how);
    let mut delays: Vec<u64> = drawn(&scenario, 999).iter().map(|it| it.delays.gate[5][1].fs()).collect();
    delays.sort_unstable();
    assert!(delays[0] == 36_000, "the lower half of the factors lies at 1.2: {}", delays[0]);
    assert!((36_000..36_300).contains(&delays[499]), "{}", delays[499]);
}

#[test]
fn a_file_with_groups_is_understood() {
    let text = r#"
[inputs]
a = 0
[gates]
p = { not = ["a"], delay = [5, 9] }
q = { not = ["a"], delay = [5, 9] }
r = { not = ["a"], delay = [4, 40] }
[[groups]]
gates = ["q", "p"]
tracking = 0.25
[[groups]]
gates = ["r"]
scale = [0.6, 1.5]
mismatch = 0.05
"#;
    let scenario = reader::read(text, "parts.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    assert_eq!(scenario.not_analysed, Vec::<String>::new());
    let expected = [
        Group { gates: vec![GateId(1), GateId(0)], how: Together::Tracking(Billionths(250_000_000)) },
        Group {
            gates: vec![GateId(2)],
            how: Together::Scale {
                least: Billionths(600_000_000),
                greatest: Billionths(1_500_000_000),
                mismatch: Billionths(50_000_000),
            },
        },
    ];
    assert_eq!(scenario.delays.groups, expected);
}

//! With `vary = "per-event"` every firing of a gate draws its delay anew: by its count alone, as its range says, and
//! independently; what a group has in common, wires and clocks stay those of the board.

use std::sync::Arc;

use rand::{Rng, SeedableRng};
use stillgate::circuit::{Function, GateId};
use stillgate::control::Control;
use stillgate::delay::{Billionths, DelayRange, Filter, Group, Marginal, Together};
use stillgate::engine::{End, Program};
use stillgate::findings::{Asked, Kind};
use stillgate::instance::{Firings, Instance, Which};
use stillgate::output::instance::write_instance;
use stillgate::output::json;
use stillgate::output::text::{self, Page};
use stillgate::reader::{self, read_instance};
use stillgate::review;
use stillgate::scenario::{Begin, Clock, Mark, Place, Scenario, Vary};
use stillgate::sweep::{Cause, clopper_pearson, run_samples};

use crate::groups::below;
use crate::support::recorder::Record;
use crate::support::spread::{kolmogorov, spearman};
use crate::support::world::{World, exact, fs, run};

/// Two-sided normal bound of 1 in 10,000. Seeds are fixed, so a test holds always or never; were they not, it would fail
/// that often by chance.
const Z: f64 = 3.89;

/// Inverters of a ring.
const N: u64 = 5;
/// Range of every delay, in femtoseconds: so wide that whole numbers do not matter.
const RANGE: (u64, u64) = (80_000_000, 120_000_000);

/// A ring of one NAND and four inverters that an input starts at 0, and a second input that changes at `until`, so that
/// the run goes on that long. Every gate has one `delay` for both edges, or a rise and a fall.
fn ring(vary: Vary, one_delay: bool, until: u64, limit: u64) -> Scenario {
    let mut world = World::new();
    world.input("start", false).input("stop", false);
    world.gate("g0", Function::Nand, &["start", "g4"], 1);
    for gate in 1..N {
        world.gate(&format!("g{gate}"), Function::Not, &[&format!("g{}", gate - 1)], 1);
    }
    for gate in &mut world.gates {
        gate.delay = [DelayRange::between(fs(RANGE.0), fs(RANGE.1)); 2];
    }
    world.at(0, &[("start", true)]).limit(limit);
    if until > 0 {
        world.at(until, &[("stop", true)]);
    }
    world.plan.vary = vary;
    let mut scenario = world.scenario();
    Arc::make_mut(&mut scenario.delays).gate_one_draw = vec![one_delay; N as usize];
    scenario
}

/// The run of a sample of a scenario that has one stable state to begin in.
fn sample(scenario: &Scenario, number: u64) -> Record {
    let program = Program::new(scenario, &Control::default()).unwrap();
    let rest = program.start().expect("it begins at rest").ones.clone();
    run(scenario, &rest, &Instance::of(scenario, &Which::Sample(number)))
}

/// Times from rise to rise of the last inverter, in femtoseconds.
fn periods(scenario: &Scenario, record: &Record) -> Vec<u64> {
    let net = scenario.circuit.net("g4").unwrap();
    let rises: Vec<u64> = record.of(net).iter().filter(|it| it.1 as u8 == 1).map(|it| it.0).collect();
    rises.windows(2).map(|pair| pair[1] - pair[0]).collect()
}

fn mean_and_variance(values: &[u64]) -> (f64, f64) {
    let n = values.len() as f64;
    let mean = values.iter().map(|it| *it as f64).sum::<f64>() / n;
    (mean, values.iter().map(|it| (*it as f64 - mean).powi(2)).sum::<f64>() / (n - 1.0))
}

/// Mean and variance of values that are each a sum of `draws` independent uniform numbers, each `times` over, lie where
/// they must: mean = draws·times·(a + b)/2 and variance = draws·times²·(b − a)²/12, within `Z` standard deviations of the
/// estimates: √(variance/n), and variance·√((2 − 1.2/draws)/n), as the excess kurtosis of the sum is −1.2/draws.
fn is_sum_of(values: &[u64], draws: u64, times: u64, of: &str) {
    let (a, b, k, c, n) = (RANGE.0 as f64, RANGE.1 as f64, draws as f64, times as f64, values.len() as f64);
    let (mean, variance) = (k * c * (a + b) / 2.0, k * c * c * (b - a).powi(2) / 12.0);
    let (found_mean, found) = mean_and_variance(values);
    assert!((found_mean - mean).abs() < Z * (variance / n).sqrt(), "{of}: mean {found_mean}, not {mean}");
    let bound = Z * ((2.0 - 1.2 / k) / n).sqrt();
    assert!((found / variance - 1.0).abs() < bound, "{of}: variance {found}, not {variance}, bound {bound}");
}

/// In one period each of N inverters rises once and falls once. Drawn anew, a period is the sum of 2N independent delays:
/// variance 2N(b − a)²/12; and periods one after the other, as no draw is in two of them, are independent. Drawn once a
/// part, one number for both edges, it is twice the sum of N: variance 4N(b − a)²/12 from board to board, and none within
/// a run; with a rise and a fall apart 2N(b − a)²/12 again. The mean is N(a + b) each time.
#[test]
fn the_period_of_a_ring_is_the_sum_that_its_draws_make() {
    let until = 4000 * N * (RANGE.0 + RANGE.1);
    for one_delay in [true, false] {
        let scenario = ring(Vary::PerEvent, one_delay, until, u64::MAX);
        let all = periods(&scenario, &sample(&scenario, 3));
        assert!((3900..4100).contains(&all.len()), "{}", all.len());
        is_sum_of(&all, 2 * N, 1, "one run, drawn anew");
        let pairs: Vec<(u64, u64)> = all.windows(2).map(|pair| (pair[0], pair[1])).collect();
        let lag = spearman(&pairs);
        assert!(lag.abs() < Z / ((pairs.len() - 1) as f64).sqrt(), "one period tells of the next: {lag}");

        // the first whole period of each of many samples: as within one run
        let scenario = ring(Vary::PerEvent, one_delay, 0, 40);
        let first: Vec<u64> = (0..2000).map(|i| periods(&scenario, &sample(&scenario, i))[0]).collect();
        is_sum_of(&first, 2 * N, 1, "many samples, drawn anew");

        // parts: each run by itself is exactly periodic
        let scenario = ring(Vary::PerPart, one_delay, 0, 1000);
        let boards = (0..2000).map(|number| {
            let record = sample(&scenario, number);
            let End::Oscillating { period, range: None } = record.windows[0].end else { panic!("{record:?}") };
            assert!(periods(&scenario, &record)[1..].iter().all(|it| *it == period.fs()), "sample {number}");
            period.fs()
        });
        let boards: Vec<u64> = boards.collect();
        let (draws, times) = if one_delay { (N, 2) } else { (2 * N, 1) };
        is_sum_of(&boards, draws, times, "parts");
    }
}

/// Drawn anew, a ring is not exactly periodic, even where values and remaining times come back by chance; with exact
/// delays it is.
#[test]
fn what_comes_back_by_chance_is_no_period() {
    let mut world = World::new();
    world.input("start", false);
    world.gate("a", Function::Nand, &["start", "b"], 1).gate("b", Function::Buf, &["a"], 1);
    let of = |world: &World, range: [u64; 2], draw: Marginal| {
        let mut world = world.clone();
        world.gates[1].delay = [DelayRange::between(fs(range[0]), fs(range[1])); 2];
        world.at(0, &[("start", true)]);
        (world.plan.vary, world.plan.draw) = (Vary::PerEvent, draw);
        let scenario = world.scenario();
        (0..40).map(|number| sample(&scenario, number).windows[0].end).collect::<Vec<End>>()
    };
    for draw in Marginal::ALL {
        for end in of(&world, [1, 2], draw) {
            let End::Oscillating { period, range: Some((least, greatest)) } = end else { panic!("{draw:?}: {end:?}") };
            // two delays of 1 and two of 1 or 2
            assert!(least.fs() == 4 && (5..=6).contains(&greatest.fs()), "{draw:?}: {least:?} to {greatest:?}");
            assert!((4..=6).contains(&period.fs()), "{draw:?}: {period:?}");
        }
        for end in of(&world, [2, 2], draw) {
            assert_eq!(end, End::Oscillating { period: fs(6), range: None }, "{draw:?}");
        }
    }
    // a gate that varies and has no part in the oscillation takes nothing from it
    world.input("off", false).gate("c", Function::And, &["b", "off"], 1);
    world.gates[2].delay = [DelayRange::between(fs(1), fs(50)); 2];
    for end in of(&world, [2, 2], Marginal::Uniform) {
        assert_eq!(end, End::Oscillating { period: fs(6), range: None });
    }
}

/// A clock far slower than two buffers and a wire, which follow it edge by edge.
fn followers(draw: Marginal, edges: u32) -> Scenario {
    let mut world = World::new();
    world.input("tick", false);
    world.gate("p", Function::Buf, &["tick"], 1).gate("q", Function::Buf, &["tick"], 1);
    for (gate, (min, typ, max)) in
        world.gates.iter_mut().zip([(1_000_000, 4_000_000, 6_000_000), (1_000_000, 2_000_000, 9_000_000)])
    {
        gate.delay = [DelayRange { min: fs(min), typ: fs(typ), max: fs(max) }; 2];
    }
    let net = world.net("tick");
    let clock = Clock {
        net,
        first: exact(0),
        period: exact(40_000_000),
        high: exact(20_000_000),
        jitter: fs(0),
        count: edges / 2,
        mark: Mark(0),
    };
    world.clocks.push(("tick".into(), clock));
    (world.plan.vary, world.plan.draw, world.plan.seed) = (Vary::PerEvent, draw, 11);
    world.limit(u64::MAX).scenario()
}

/// The delay of each firing of a gate of [`followers`], as the run shows it.
fn delays(scenario: &Scenario, record: &Record, gate: &str) -> Vec<u64> {
    let changes = record.of(scenario.circuit.net(gate).unwrap());
    changes.iter().enumerate().map(|(edge, change)| change.0 - edge as u64 * 20_000_000).collect()
}

/// Kolmogorov-Smirnov at 0.1 %: 1.95 / √n [large n; from memory]. What a run shows of one gate is spread as its range and
/// the draw say, and no firing tells of the next, of the other edge, of another gate or of another sample.
#[test]
fn firings_are_spread_by_the_draw_and_independent() {
    let (edges, bound) = (8000u32, 1.95 / 8000f64.sqrt());
    for draw in [Marginal::Uniform, Marginal::Triangular, Marginal::Normal, Marginal::Hypercube] {
        let scenario = followers(draw, edges);
        let record = sample(&scenario, 5);
        let (p, q) = (delays(&scenario, &record, "p"), delays(&scenario, &record, "q"));
        let range = scenario.delays.gate[0][0];
        let apart = |draw| kolmogorov(p.iter().map(|span| below(draw, range, fs(*span))).collect());
        assert!(p.len() == 8000 && apart(draw) < bound, "{draw:?}: {} of {bound}", apart(draw));
        // the test can fail: another marginal is found out
        let other = if draw == Marginal::Normal { Marginal::Uniform } else { Marginal::Normal };
        assert!(apart(other) > bound, "{draw:?} is not {other:?}");

        let other = sample(&scenario, 6);
        let five = Z / ((edges - 2) as f64).sqrt();
        for (what, one, two) in [
            ("the next firing", &p[..p.len() - 1], &p[1..]),
            ("the firing after", &p[..p.len() - 2], &p[2..]),
            ("the other gate", &p[..], &q[..]),
            ("the other sample", &p[..], &delays(&scenario, &other, "p")[..]),
        ] {
            let rank = spearman(&one.iter().copied().zip(two.iter().copied()).collect::<Vec<_>>());
            assert!(rank.abs() < five, "{draw:?}: {what} follows: {rank}");
        }
    }
    let scenario = followers(Marginal::Corners, 1000);
    let p = delays(&scenario, &sample(&scenario, 5), "p");
    let long = p.iter().filter(|span| **span == 6_000_000).count();
    assert!(p.iter().all(|span| [1_000_000, 6_000_000].contains(span)) && (440..560).contains(&long), "{long}");
}

/// The written layout: the key of a gate stands at place 2^50 + gate of the sample's stream, and firing k of an edge takes
/// number 2k + edge of SplitMix64. What is drawn beside them does not move.
#[test]
fn firings_follow_the_written_layout() {
    let mut world = World::new();
    world.input("a", false);
    world.gate("p", Function::Nand, &["a", "q"], 1).gate("q", Function::Nand, &["a", "p"], 1);
    for gate in &mut world.gates {
        gate.delay = [DelayRange::between(fs(1_000), fs(9_000)); 2];
    }
    world.wire("a", "p", 1, 1);
    world.wires[0].2 = [DelayRange::between(fs(100), fs(900_000)); 2];
    world.step(Place::At(DelayRange::between(fs(1_000), fs(50_000))), &[("a", true)]);
    world.begin = Begin::Random;
    (world.plan.seed, world.plan.tries) = (42, 4);
    let part = world.scenario();
    world.plan.vary = Vary::PerEvent;
    let mut event = world.scenario();
    Arc::make_mut(&mut event.delays).gate_one_draw[1] = true;
    for number in [0, 1, 7, 1_000_003] {
        let which = Which::Sample(number);
        let (part, drawn) = (Instance::of(&part, &which), Instance::of(&event, &which));
        assert_eq!((&part.delays.wire, &part.places, &part.start), (&drawn.delays.wire, &drawn.places, &drawn.start));
        assert!(part.firings.is_none() && drawn.delays.gate == Instance::of(&event, &Which::Typ).delays.gate);
        let firings = drawn.firings.expect("firings are drawn");
        for gate in 0..2u64 {
            let mut rng = rand_chacha::ChaCha8Rng::seed_from_u64(42);
            rng.set_stream(2 * number + 1);
            rng.set_word_pos(2 * u128::from((1 << 50) + gate));
            let mut state = rng.next_u64();
            for firing in 0..20 {
                let numbers = [0, 1].map(|_| {
                    state = state.wrapping_add(0x9E37_79B9_7F4A_7C15);
                    let z = (state ^ (state >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
                    let z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
                    z ^ (z >> 31)
                });
                // of one draw for both edges both take the number of the fall
                let numbers = if gate == 1 { [numbers[0]; 2] } else { numbers };
                let range = event.delays.gate[0][0];
                let expected = numbers.map(|number| Marginal::Uniform.quantile(range, number));
                let found = firings.delays(GateId(gate as u32), firing, [fs(1); 2]);
                assert_eq!(found, expected, "sample {number}, gate {gate}, firing {firing}");
            }
        }
    }
}

/// Typ, min and max runs know nothing of it.
#[test]
fn only_draws_vary() {
    for which in [Which::Typ, Which::Min, Which::Max] {
        let [part, event] = [Vary::PerPart, Vary::PerEvent].map(|vary| Instance::of(&ring(vary, true, 0, 40), &which));
        assert!(part == event && event.firings.is_none(), "{which:?}");
    }
}

/// A group's number is the board's, the rest of a delay each firing's: with a scale all firings of a board lie within the
/// mismatch of one factor, with tracking two firings are as far in step as two delays of the group without `per-event`.
#[test]
fn a_board_keeps_what_a_group_has_in_common() {
    let grouped = |how, tries| {
        let mut scenario = followers(Marginal::Uniform, 40);
        scenario.plan.tries = tries;
        let gates = vec![GateId(0), GateId(1)];
        Arc::make_mut(&mut scenario.delays).groups = vec![Group { gates, how }];
        scenario
    };
    let seen = |scenario: &Scenario, number| {
        let record = sample(scenario, number);
        ["p", "q"].map(|gate| delays(scenario, &record, gate))
    };
    let [least, greatest, mismatch] = [0.8, 1.2, 0.05].map(Billionths::nearest);
    let scenario = grouped(Together::Scale { least, greatest, mismatch }, 3);
    let mut factors = Vec::new();
    for board in 0..200 {
        let tries: Vec<f64> = (0..3)
            .flat_map(|attempt| {
                let [p, q] = seen(&scenario, 3 * board + attempt);
                let typ = |span: u64, typ: f64| span as f64 / typ;
                p.into_iter().map(move |it| typ(it, 4e6)).chain(q.into_iter().map(move |it| typ(it, 2e6)))
            })
            .collect();
        let (low, high) = tries.iter().fold((f64::MAX, 0f64), |(a, b), it| (a.min(*it), b.max(*it)));
        assert!(high / low < 1.05 / 0.95 + 1e-5 && high / low > 1.08, "board {board}: {low} to {high}");
        factors.push((high + low) / 2.0);
    }
    factors.sort_by(f64::total_cmp);
    assert!(factors[0] < 0.82 && factors[199] > 1.18, "{factors:?}");

    // in step altogether: all firings of a board at the same part of the range
    let scenario = grouped(Together::Tracking(Billionths::ONE), 1);
    for number in 0..50 {
        let [p, q] = seen(&scenario, number);
        assert!(p.iter().all(|it| *it == p[0]) && q.iter().all(|it| *it == q[0]), "{number}: {p:?} {q:?}");
    }
    // not at all: as without a group
    let scenario = grouped(Together::Tracking(Billionths(0)), 1);
    assert_eq!(sample(&scenario, 9), sample(&followers(Marginal::Uniform, 40), 9));
    // rho = (6/π)·asin(ρ/2): Spearman's rank correlation of a Gaussian copula (Kruskal 1958); its deviation is at most
    // 1/√(n − 1), that of independent pairs
    let (boards, rho) = (4000, 0.6f64);
    let scenario = grouped(Together::Tracking(Billionths::nearest(rho)), 1);
    let all: Vec<[Vec<u64>; 2]> = (0..boards).map(|number| seen(&scenario, number)).collect();
    let expected = 6.0 / std::f64::consts::PI * (rho / 2.0).asin();
    let bound = Z / ((boards - 1) as f64).sqrt();
    for (what, one, two) in [("two firings", (0, 0), (0, 7)), ("two gates", (0, 3), (1, 3)), ("both", (0, 4), (1, 31))]
    {
        let of = |at: (usize, usize), it: &[Vec<u64>; 2]| it[at.0][at.1];
        let rank = spearman(&all.iter().map(|it| (of(one, it), of(two, it))).collect::<Vec<_>>());
        assert!((rank - expected).abs() < bound, "{what}: {rank}, not {expected}");
    }
    let range = scenario.delays.gate[0][0];
    let distance = kolmogorov(all.iter().map(|it| below(Marginal::Uniform, range, fs(it[0][12]))).collect());
    assert!(distance < 1.95 / (boards as f64).sqrt(), "one firing over all boards: {distance}");
}

/// A gate of 5 to 10 ns and ten pulses of 9 ns: each is swallowed where the rise takes longer, with probability 1/5. Drawn
/// once, all of them or none: 1/5 of the draws. Drawn anew, any of them: 1 − (4/5)^10 = 0.8926.
fn ten_pulses(vary: &str, sweep: &str) -> Scenario {
    let text = format!(
        r#"
[inputs]
a = 0
[gates]
q = {{ buf = ["a"], rise = [5, 10], fall = 1 }}
[[steps]]
times = 10
steps = [ {{ after = 100, set = {{ a = 1 }} }}, {{ after = 9, set = {{ a = 0 }} }} ]
[rules]
swallowed = "forbidden"
not_judged = "allowed"
glitch_free = []
[sweep]
samples = 3000
vary = "{vary}"
{sweep}
"#
    );
    reader::read(&text, "pulses.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario
}

#[test]
fn a_failure_that_any_firing_may_bring_is_as_likely_as_reckoned() {
    for (vary, share) in [("per-part", 0.2), ("per-event", 1.0 - 0.8f64.powi(10))] {
        let scenario = ten_pulses(vary, "");
        let mut failing = 0;
        for number in 0..3000 {
            failing += u64::from(!sample(&scenario, number).swallowed.is_empty());
        }
        let (low, high) = clopper_pearson(failing, 3000, 0.9999).unwrap();
        assert!(low < share && share < high, "{vary}: {failing} of 3000, {low} to {high}, not {share}");
        // and each pulse alone
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let asked = Asked::of(&scenario);
        let report = review::sweep(&scenario, &program, &asked, 2, &Control::default()).unwrap();
        let found: Vec<_> = report.findings.iter().filter(|it| it.subject.kind == Kind::Swallowed).collect();
        assert_eq!(found.len(), 10, "{vary}");
        for finding in found {
            let (low, high) = clopper_pearson(finding.count, 3000, 0.9999).unwrap();
            assert!(low < 0.2 && 0.2 < high && finding.breaks_rule, "{vary}: {finding:?}");
        }
    }
}

#[test]
fn threads_and_splits_change_nothing() {
    let scenario = ten_pulses("per-event", "draw = \"normal\"\ntries = 7");
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let asked = Asked::of(&scenario);
    let control = Control::default();
    let json = |threads| {
        let report = review::sweep(&scenario, &program, &asked, threads, &control).unwrap();
        json::sweep(&scenario, &asked, &report)
    };
    assert_eq!(json(1), json(3));
    let whole = run_samples(&scenario, &program, &asked, 0..300, 1, &control);
    let mut parts = run_samples(&scenario, &program, &asked, 200..300, 1, &control);
    parts.merge(&run_samples(&scenario, &program, &asked, 0..200, 2, &control));
    assert_eq!(format!("{whole:?}"), format!("{parts:?}"));
}

const EVERY_KIND: &str = r#"
time_unit = "ps"
begin = "random"
[inputs]
a = 0
[gates]
"u.q" = { nand = ["a", "r"], delay = [50, 90] , wires = { a = [3, 9] } }
r = { nand = ["u.q", "s"], rise = [70, 80, 90], fall = 12.345 }
s = { not = ["r"], delay = [50, 60, 95], filter = "transport" }
t = { xor = ["r", "s"], rise = [60, 80], fall = [70, 90], filter = { reject = 30 } }
v = { buf = ["t"], delay = [50, 90], filter = { involution = { tau = 20 } } }
[[groups]]
gates = ["r", "u.q"]
tracking = 0.123456789
[[groups]]
gates = ["t"]
scale = [0.75, 1.5]
mismatch = 0.05
[[steps]]
times = 20
steps = [ { after = [50, 700], set = { a = 1 } }, { after = [50, 700], set = { a = 0 } } ]
[limits]
transitions = 700
[sweep]
vary = "per-event"
"#;

#[test]
fn a_case_with_firings_is_written_and_read_back_as_it_was() {
    let program = |scenario: &Scenario| Program::new(scenario, &Control::default()).unwrap();
    for draw in Marginal::ALL {
        let mut scenario = reader::read(EVERY_KIND, "case.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
        scenario.plan.draw = draw;
        for number in [0, 3, 77] {
            let drawn = Instance::of(&scenario, &Which::Sample(number));
            let list = [((GateId(3), 0), [fs(60_001), fs(70_002)]), ((GateId(0), 17), [fs(1), fs(1 << 61)])];
            let given = Instance { firings: Some(Firings::Given(list.into())), ..drawn.clone() };
            let nothing = Instance { firings: Some(Firings::Given([].into())), ..drawn.clone() };
            for instance in [&drawn, &given, &nothing] {
                let written = write_instance(instance, &scenario);
                let read =
                    read_instance(&written, "case", &scenario).unwrap_or_else(|faults| panic!("{faults}{written}"));
                assert_eq!(&read, instance, "{written}");
            }
            // the file holds all that its firings follow from: neither seed, draw nor `vary` of the scenario matter
            let mut other = scenario.clone();
            (other.plan.seed, other.plan.draw, other.plan.vary) = (99, Marginal::Uniform, Vary::PerPart);
            let read = read_instance(&write_instance(&drawn, &scenario), "case", &other).unwrap();
            let rest = Default::default();
            assert_eq!(program(&scenario).start(), None);
            assert_eq!(run(&other, &rest, &read), run(&scenario, &rest, &drawn), "{draw:?} {number}");
        }
    }
}

#[test]
fn what_the_firings_of_a_case_lack_or_have_too_much_is_reported() {
    let scenario = reader::read(EVERY_KIND, "case.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    let drawn = write_instance(&Instance::of(&scenario, &Which::Sample(3)), &scenario);
    let firings = drawn.find("[firings]").unwrap();
    let line = |gate: &str| {
        let after = &drawn[firings..];
        after.lines().find(|line| line.starts_with(&format!("{gate} = "))).unwrap().to_string()
    };
    let (r, s, t) = (line("r"), line("s"), line("t"));
    let key = s.split_once("key = ").unwrap().1.split_once(',').unwrap().0.to_string();
    let given = |text: &str| {
        format!("{}[firings.given.r]\n{text}\n{}", &drawn[..firings], &drawn[drawn.find("\n[[wires]]").unwrap()..])
    };
    let swap = |old: &str, new: &str| {
        assert!(drawn[firings..].contains(old), "{old}");
        format!("{}{}", &drawn[..firings], drawn[firings..].replacen(old, new, 1))
    };
    let cases = [
        (swap(&s, ""), "`firings.drawn` of the case lacks `s`"),
        (swap(&s, &s.replace("s = ", "sx = ")), "the scenario has no gate `sx`"),
        (swap(&s, &s.replace(&format!("key = {key}, "), "")), "gate `s` lacks `key`"),
        (swap(&s, &s.replace(&key, "-1")), "is below 0"),
        (swap(&s, &s.replace("one_draw = true", "one_draw = 1")), "`one_draw` is true or false"),
        (swap(&s, &s.replace("rise = [50, 60, 95]", "rise = [50, 95]")), "`rise` is three times, not 2"),
        (swap(&s, &s.replace("rise = [50, 60, 95]", "rise = [50, 40, 95]")), "`rise` is not in order"),
        (swap(&s, &s.replace("rise = [50, 60, 95]", "rise = [0, 40, 95]")), "`rise` of 0 is not possible"),
        (swap(&s, &s.replace("one_draw", "onedraw")), "unknown key `onedraw` in gate `s`"),
        (swap(&s, &s.replace(" }", ", common = 5 }")), "gate `s` is in no group"),
        (swap(&r, &r.replace("tracking = 0.123456789", "tracking = 1.1")), "`tracking` of gate `r` is above 1"),
        (swap(&s, &s.replace(" }", ", moved = { rise = -0.001 } }")), "`moved` of gate `s` is not a rise and a fall"),
        (swap(&r, &r.replace("common", "mismatch = 0.1, common")), "does not say how it belongs to its group"),
        (swap(&r, &format!("{} }}", r.split(", common").next().unwrap())), "gate `r` lacks `common`"),
        (swap(&t, &t.replace("[0.75, 1.5]", "[1.75, 1.5]")), "the group of gate `t` is not possible"),
        (swap(&t, &t.replace("[0.75, 1.5]", "[0.75, 1e1]")), "`1e1` is no factor"),
        (swap("draw = \"uniform\"", "draw = \"even\""), "`even` has no meaning here"),
        (swap("draw = \"uniform\"\n", ""), "[firings] lacks `draw`"),
        (swap("draw = \"uniform\"", "drawn_by = \"uniform\""), "unknown key `drawn_by` in [firings]"),
        (swap("[firings.drawn]", "[firings.given]"), "firings that are given are not drawn"),
        (swap("[firings]", "[firings.given]\n[firings]"), "firings are both drawn and given"),
        (format!("{}\n[firings]\n", &given("")[..firings]), "`firings` of the case says nothing"),
        (given("x = { rise = 1, fall = 1 }"), "`x` is no number of a firing"),
        (given("01 = { rise = 1, fall = 1 }"), "`01` is no number of a firing"),
        (given("1 = { rise = 1 }"), "firing 1 of gate `r` lacks `fall`"),
        (given("1 = { rise = 1, fall = 0 }"), "`fall` of 0 is not possible"),
    ];
    assert!(read_instance(&given("1 = { rise = 1, fall = 7 }"), "case", &scenario).is_ok());
    for (wrong, fragment) in cases {
        match read_instance(&wrong, "case", &scenario) {
            Ok(_) => panic!("taken, expected: {fragment}\n{wrong}"),
            Err(found) => {
                assert!(found.items().iter().any(|item| item.message.contains(fragment)), "{fragment}\n{found}");
            }
        }
    }
}

/// Delays that a case gives to single firings, as a case that needs them does: the third edge through a chain is late.
#[test]
fn a_case_may_give_single_firings_their_delays() {
    let mut world = World::new();
    world.input("a", false);
    world.gate("p", Function::Buf, &["a"], 100).gate("q", Function::Buf, &["p"], 10);
    for edge in 0..5 {
        world.at(1000 * (edge + 1), &[("a", edge % 2 == 0)]);
    }
    let scenario = world.scenario();
    let mut instance = world.instance(&scenario);
    instance.firings = Some(Firings::Given([((GateId(0), 2), [fs(999), fs(400)])].into()));
    let record =
        run(&scenario, &Program::new(&scenario, &Control::default()).unwrap().start().unwrap().ones, &instance);
    let times: Vec<u64> = record.of(world.net("q")).iter().map(|change| change.0).collect();
    assert_eq!(times, [1110, 2110, 3410, 4110, 5110]);
}

/// An event that is cancelled has taken its number: the count is of events that are scheduled, for every filter.
#[test]
fn cancelled_events_count() {
    for (filter, changes) in [
        // firing 0 is cancelled at 105, when the function is what the output is: nothing is scheduled then
        (Filter::Inertial, vec![202]),
        // firing 0 is due at 109; firing 1, due at 107, takes it out
        (Filter::Transport, vec![204]),
    ] {
        let mut world = World::new();
        world.input("a", false);
        world.gate("p", Function::Buf, &["a"], 50).filter(filter);
        world.at(100, &[("a", true)]).at(105, &[("a", false)]).at(200, &[("a", true)]);
        let scenario = world.scenario();
        let mut instance = world.instance(&scenario);
        let given = [(0, 9), (1, 2), (2, 4)].map(|(k, delay)| ((GateId(0), k), [fs(delay); 2]));
        instance.firings = Some(Firings::Given(given.into()));
        let start = Program::new(&scenario, &Control::default()).unwrap().start().unwrap().ones.clone();
        let record = run(&scenario, &start, &instance);
        let times: Vec<u64> = record.of(world.net("p")).iter().map(|change| change.0).collect();
        assert_eq!(times, changes, "{filter:?}");
        assert_eq!((record.swallowed[0].age, record.swallowed[0].delay), (5, 9), "{filter:?}");
    }
}

/// The demonstration: drawn a part, few boards strike too soon, and they always; drawn anew, every board now and then.
#[test]
fn a_bell_strikes_too_soon_by_its_parts_or_by_its_firings() {
    let text = include_str!("../scenarios/bell.toml");
    let found = |text: &str| {
        let mut scenario = reader::read(text, "bell.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
        scenario.plan.samples = 1000;
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let asked = Asked::of(&scenario);
        let report = review::sweep(&scenario, &program, &asked, 2, &Control::default()).unwrap();
        let verdict = review::verdict(&scenario, &report);
        let page = text::sweep(&scenario, &asked, &report, &verdict, &Page::default());
        let timing = report.findings.iter().find(|it| it.subject.kind == Kind::Timing).expect("too soon");
        (timing.boards.unwrap(), page.split_whitespace().collect::<Vec<_>>().join(" "))
    };
    let (boards, page) = found(text);
    assert!(boards.cause() == Cause::Moment && boards.failing > 90, "{boards:?}");
    assert!(page.contains("it lies in the moment of the step or in the firings"), "{page}");
    let parts = text.replace("vary = \"per-event\"", "vary = \"per-part\"");
    let (boards, page) = found(&parts);
    assert!(boards.cause() == Cause::Parts && (1..10).contains(&boards.failing), "{boards:?}");
    assert!(boards.worst_share == 1.0 && page.contains("it lies in their parts"), "{page}");
}

#[test]
fn texts_and_json_say_how_delays_vary() {
    let words = "In draws every firing of a gate takes a delay of its own";
    for vary in ["per-part", "per-event"] {
        let scenario = ten_pulses(vary, "draw = \"hypercube\"");
        let anew = vary == "per-event";
        assert_eq!(scenario.not_analysed, Vec::<String>::new());
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let asked = Asked::of(&scenario);
        let report = review::sweep(&scenario, &program, &asked, 1, &Control::default()).unwrap();
        let verdict = review::verdict(&scenario, &report);
        let page = text::check(&scenario, &Page::default());
        assert_eq!(page.contains(words), anew, "{page}");
        let page = text::sweep(&scenario, &asked, &report, &verdict, &Page::default());
        assert_eq!((page.contains(words), page.contains("every firing anew")), (anew, anew), "{page}");
        let one_line = page.split_whitespace().collect::<Vec<_>>().join(" ");
        assert_eq!(one_line.contains("of a hypercube firings are drawn independently"), anew, "{page}");
        let document = json::sweep(&scenario, &asked, &report);
        let document: serde_json::Value = serde_json::from_str(&document).unwrap();
        assert_eq!(document["vary"], vary);
        assert_eq!(json::check(&scenario).contains(words), anew);
        let one = review::run_one(&scenario, &program, &asked, Which::Sample(1), &Control::default()).unwrap();
        let page = text::run(&scenario, &asked, &one, &Page::default());
        assert_eq!(page.contains("drawn anew"), anew, "{page}");
        let document: serde_json::Value = serde_json::from_str(&json::run(&scenario, &asked, &one)).unwrap();
        assert_eq!(document["firings"], if anew { "drawn".into() } else { serde_json::Value::Null });
    }
}

/// Under a condition each firing is the same, slower or faster, to the rounding of ranges.
#[test]
fn a_condition_scales_every_firing() {
    let mut scenario = followers(Marginal::Triangular, 200);
    let mut slow = scenario.clone();
    slow.delays = Arc::new(scenario.delays.scaled(Billionths(1_500_000_000)).unwrap());
    for number in [0, 5] {
        let (one, other) = (sample(&scenario, number), sample(&slow, number));
        for gate in ["p", "q"] {
            for (fast, slow) in delays(&scenario, &one, gate).iter().zip(delays(&slow, &other, gate)) {
                assert!((3 * fast).abs_diff(2 * slow) <= 4, "{gate}: {fast} and {slow}");
            }
        }
    }
    // and another seed is another run
    let one = sample(&scenario, 5);
    scenario.plan.seed += 1;
    assert_ne!(one, sample(&scenario, 5));
}

/// A perturbation moves all firings of a gate and edge together, by what it moves the gate's delay, and a file keeps it.
#[test]
fn a_perturbation_moves_every_firing() {
    let text = EVERY_KIND.replace("time_unit = \"ps\"", "time_unit = \"ns\"");
    let scenario = reader::read(&text, "case.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    let drawn = Instance::of(&scenario, &Which::Sample(8));
    let list = [((GateId(3), 0), [fs(60_000_001), fs(70_000_002)])];
    let given = Instance { firings: Some(Firings::Given(list.into())), ..drawn.clone() };
    for case in [&drawn, &given] {
        for number in 1..=8 {
            let moved = case.perturbed(&scenario, number).unwrap().instance;
            for gate in scenario.circuit.gates() {
                let (old, new) = (case.delays.gate[gate.index()], moved.delays.gate[gate.index()]);
                let by = [0, 1].map(|edge| new[edge].fs() as i64 - old[edge].fs() as i64);
                assert!(by.iter().all(|by| *by != 0));
                for firing in 0..30 {
                    let of = |it: &Instance, plain| it.firings.as_ref().unwrap().delays(gate, firing, plain);
                    let (old, new) = (of(case, old), of(&moved, new));
                    assert_eq!([0, 1].map(|edge| new[edge].fs() as i64 - old[edge].fs() as i64), by, "{firing}");
                }
            }
            let written = write_instance(&moved, &scenario);
            let read = read_instance(&written, "case", &scenario).unwrap_or_else(|faults| panic!("{faults}{written}"));
            assert_eq!(read, moved, "{written}");
        }
    }
    // the least that may be drawn bounds it, not what the case has at typical: a hundredth of 60 fs is none
    let short = text.replace("delay = [50, 60, 95]", "delay = [\"60 fs\", 60, 95]");
    let short = reader::read(&short, "case.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    assert!(Instance::of(&short, &Which::Sample(8)).perturbed(&short, 1).is_err());
}

/// As a user replays it: the number of a sample and the file of its case give one run.
#[test]
fn a_sample_replays_by_its_number_and_by_its_file() {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("kinds.toml"), EVERY_KIND).unwrap();
    let run = |delays: &str| {
        let mut command = std::process::Command::new(env!("CARGO_BIN_EXE_stillgate"));
        let output = command.current_dir(folder.path()).args(["run", "kinds.toml", "--json", "--delays", delays]);
        let output = output.output().unwrap();
        assert!(output.status.success(), "{output:?}");
        serde_json::from_slice::<serde_json::Value>(&output.stdout).unwrap()
    };
    let by_number = run("sample:12");
    let by_file = run("stillgate-out/kinds/case-sample-12.toml");
    assert_eq!((&by_number["delays"], &by_file["delays"]), (&"sample:12".into(), &"file".into()));
    for part in ["firings", "events", "waves", "windows", "facts"] {
        assert_eq!(by_number[part], by_file[part], "{part}");
    }
    assert_eq!(by_number["firings"], "drawn");
    assert_ne!(by_number["waves"], run("sample:13")["waves"]);
}

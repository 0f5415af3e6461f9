//! Published circuits and figures, run by the engine. U is the unit gate delay.

use stillgate::circuit::Function::{self, And, Buf, Nand, Nor, Not, Or};
use stillgate::delay::Filter::{self, Inertial, Transport};
use stillgate::engine::End;
use stillgate::logic::Value::{self, One, Zero};
use stillgate::scenario::{Clock, Mark};

use crate::support::world::{Run, World, exact, fs};

const U: u64 = 1000;
const FILTERS: [Filter; 2] = [Inertial, Transport];

fn end(run: &Run) -> End {
    run.record.windows.last().expect("a window").end
}

/// Settled at the end, with these values of these nets.
fn settles(run: &Run, nets: &[&str], values: &[u8]) -> bool {
    end(run) == End::Settled && nets.iter().zip(values).all(|(net, value)| run.last(net) as u8 == *value)
}

fn exact_period(run: &Run) -> Option<u64> {
    match end(run) {
        End::Oscillating { period, range: None } => Some(period.fs()),
        _ => None,
    }
}

// ---- latch of two NORs

fn nor_latch(filter: Filter, q: (u64, u64), qb: (u64, u64), sr: (bool, bool)) -> World {
    let mut world = World::new();
    world.input("s", sr.0).input("r", sr.1);
    world.gate_edges("q", Nor, &["r", "qb"], q.0, q.1).gate_edges("qb", Nor, &["s", "q"], qb.0, qb.1);
    world.filter(filter);
    world
}

/// Both inputs at 1 force both outputs to 0; released together with equal delays both toggle for ever, every unit
/// [computed]; with rise and fall apart every rise and fall in turn, so the period is rise + fall. That the end state is
/// indeterminate: [PAGE https://curioustab.com/sr-nor-latch-both-inputs-high-invalid-condition-79886].
#[test]
fn nor_latch_released_from_both_set_oscillates_with_rise_and_fall() {
    for filter in FILTERS {
        for (rise, fall) in [(U, U), (2 * U, 3 * U), (7, 2), (1, 1)] {
            let mut world = nor_latch(filter, (rise, fall), (rise, fall), (true, true));
            let run = world.at(0, &[("s", false), ("r", false)]).run();
            assert_eq!(exact_period(&run), Some(rise + fall), "{filter:?} {rise} {fall}");
            assert_eq!(run.of("q"), run.of("qb"), "both toggle together");
            let first = [(rise, 1), (rise + fall, 0), (2 * rise + fall, 1), (2 * rise + 2 * fall, 0)];
            assert_eq!(run.of("q")[..4], first);
            assert_eq!(run.record.windows[0].moving, vec![(run.world.net("q"), 2), (run.world.net("qb"), 2)]);
        }
    }
}

/// Inertial, delays 1 and 1.2: settles in one transition, the faster gate rises [computed].
#[test]
fn nor_latch_settles_on_the_faster_side() {
    for (q, qb) in [(U, 6 * U / 5), (6 * U / 5, U), (U, U + 1), (U + 1, U)] {
        let mut world = nor_latch(Inertial, (q, q), (qb, qb), (true, true));
        let run = world.at(0, &[("s", false), ("r", false)]).run();
        assert!(settles(&run, &["q", "qb"], &[u8::from(q < qb), u8::from(qb < q)]), "{q} {qb}: {:?}", run.record);
        assert_eq!(run.of("q").len() + run.of("qb").len(), 1, "one transition");
    }
}

/// Released one after the other: the last input to release decides
/// [PAGE https://curioustab.com/sr-nor-latch-both-inputs-high-invalid-condition-79886]. Inertial: any skew settles in one
/// transition. Pure delay: a skew below one unit oscillates for ever, from one unit on it settles [computed].
#[test]
fn nor_latch_released_one_after_the_other() {
    for skew in [10, 500, 990, 1000, 1010, 3000] {
        for s_first in [true, false] {
            let order: [&str; 2] = if s_first { ["s", "r"] } else { ["r", "s"] };
            for filter in FILTERS {
                let mut world = nor_latch(filter, (U, U), (U, U), (true, true));
                let run = world.at(0, &[(order[0], false)]).at(skew, &[(order[1], false)]).run();
                let what = format!("{filter:?} skew {skew} {order:?}: {:?}", end(&run));
                if filter == Transport && skew < U {
                    assert_eq!(exact_period(&run), Some(2 * U), "{what}");
                    continue;
                }
                // r, released last, had held q at 0
                assert!(settles(&run, &["q", "qb"], &[u8::from(!s_first), u8::from(s_first)]), "{what}");
                if filter == Inertial {
                    assert_eq!(run.of("q").len() + run.of("qb").len(), 1, "{what}");
                }
            }
        }
    }
}

/// Width of the set pulse. Inertial: works above 1 unit, at 1 unit the tie oscillates, below it is ignored. Pure delay:
/// works from 2 units (the loop delay) on, below that a pulse circulates [computed]. The textbook minimum is the sum of
/// both gate delays [from memory].
#[test]
fn nor_latch_set_pulse() {
    for (filter, width, outcome) in [
        (Inertial, 10, "ignored"),
        (Inertial, 990, "ignored"),
        (Inertial, 1000, "oscillates"),
        (Inertial, 1010, "set"),
        (Inertial, 2000, "set"),
        (Transport, 10, "oscillates"),
        (Transport, 1000, "oscillates"),
        (Transport, 1990, "oscillates"),
        (Transport, 2000, "set"),
        (Transport, 2010, "set"),
    ] {
        let mut world = nor_latch(filter, (U, U), (U, U), (false, false));
        world.initially(&[("q", false)]);
        let run = world.at(0, &[("s", true)]).at(width, &[("s", false)]).run();
        let found = match end(&run) {
            End::Settled if run.last("q") == One => "set",
            End::Settled if run.of("qb").is_empty() => "ignored",
            End::Oscillating { .. } => "oscillates",
            other => panic!("{other:?}"),
        };
        assert_eq!(found, outcome, "{filter:?} {width}");
    }
}

/// Gates of 1.4 ns: after set, QB falls after 1.4 ns and Q rises after 2.8 ns
/// [PAGE https://itecnotes.com/electrical/electrical-how-to-determine-timing-delay-of-sr-latches].
#[test]
fn nor_latch_of_1_4_ns_is_set_in_2_8_ns() {
    let delay = 1_400_000;
    for filter in FILTERS {
        let mut world = nor_latch(filter, (delay, delay), (delay, delay), (false, false));
        let run = world.initially(&[("q", false)]).at(0, &[("s", true)]).run();
        assert_eq!(run.of("qb"), [(delay, 0)]);
        assert_eq!(run.of("q"), [(2 * delay, 1)]);
        assert_eq!(run.record.windows[0].settling, Some(2 * delay));
    }
}

// ---- rings

fn ring(filter: Filter, stages: usize, rise: u64, fall: u64) -> World {
    let mut world = World::new();
    for i in 0..stages {
        let pin = format!("n{}", (i + stages - 1) % stages);
        world.gate_edges(&format!("n{i}"), Not, &[&pin], rise, fall);
    }
    world.filter(filter);
    // one edge on its way: 0 1 0 1 … 0
    world.starts(&(0..stages).map(|i| i % 2 == 1).collect::<Vec<bool>>());
    world
}

/// Period N (rise + fall), frequency 1 / (2 N t) [Weste & Harris; Rabaey, Chandrakasan, Nikolic; from memory]. Values:
/// 3 stages 1/1: 6; 5 stages 2/3: 25; 7 stages 1.5/2.5: 28 [computed]; 3 stages of 500 ns: 333.33 kHz [PAGE
/// https://askfilo.com/user-question-answers-physics/determine-the-fundamental-frequency-of-the-following-ring-3236373839333934];
/// 11 stages of 25 ps: 1.818 GHz [computed].
#[test]
fn ring_of_inverters() {
    for (stages, rise, fall, period) in [
        (3, U, U, 6 * U),
        (5, 2 * U, 3 * U, 25 * U),
        (7, 3 * U / 2, 5 * U / 2, 28 * U),
        (3, 500_000_000, 500_000_000, 3_000_000_000),
        (11, 25_000, 25_000, 550_000),
    ] {
        for filter in FILTERS {
            let run = ring(filter, stages, rise, fall).run();
            assert_eq!(exact_period(&run), Some(period), "{filter:?} {stages} {rise} {fall}");
            for i in 0..stages {
                let rises: Vec<u64> = run.of(&format!("n{i}")).iter().filter(|c| c.1 == 1).map(|c| c.0).collect();
                assert!(rises.len() > 2 && rises.windows(2).all(|pair| pair[1] - pair[0] == period), "n{i}: {rises:?}");
            }
        }
    }
    let kilohertz = 1e12 / 3e9;
    assert!((kilohertz - 333.33f64).abs() < 0.01, "the published figure belongs to the period above");
}

/// All stages at one value and pure delays: every stage toggles at once, period rise + fall: the highest odd harmonic
/// [reasoned from the model].
#[test]
fn ring_keeps_a_harmonic_under_pure_delay() {
    for stages in [3, 5, 7] {
        let mut world = ring(Transport, stages, 2 * U, 3 * U);
        let run = world.starts(&vec![false; stages]).run();
        assert_eq!(exact_period(&run), Some(5 * U), "{stages}");
    }
}

/// A ring gated by a NAND has one lasting cycle of six states, 101 100 110 010 011 001, and no stable state
/// [computed, from the definitions of Brzozowski & Seger]; released at rest it oscillates with the period of the ring.
#[test]
fn gated_ring() {
    for (rise, fall) in [(U, U), (2 * U, 3 * U)] {
        for filter in FILTERS {
            let mut world = World::new();
            world.input("en", false);
            world.gate_edges("n0", Nand, &["en", "n2"], rise, fall).gate_edges("n1", Not, &["n0"], rise, fall);
            world.gate_edges("n2", Not, &["n1"], rise, fall).filter(filter);
            let run = world.at(5 * U, &[("en", true)]).run();
            assert_eq!(exact_period(&run), Some(3 * (rise + fall)));
            let mut state = run.record.start.clone();
            let mut seen = std::collections::BTreeSet::new();
            for (_, net, value) in &run.record.changes {
                state[net.index()] = *value;
                seen.insert(state[1..].iter().map(ToString::to_string).collect::<String>());
            }
            let cycle = ["101", "100", "110", "010", "011", "001"].map(String::from);
            assert_eq!(seen, std::collections::BTreeSet::from(cycle));
        }
    }
    // and it stops when the gate closes
    let mut world = World::new();
    world.input("en", false);
    world.gate("n0", Nand, &["en", "n2"], U).gate("n1", Not, &["n0"], U).gate("n2", Not, &["n1"], U);
    let run = world.at(0, &[("en", true)]).at(100 * U + 1, &[("en", false)]).run();
    assert!(settles(&run, &["n0", "n1", "n2"], &[1, 0, 1]), "{:?}", end(&run));
}

// ---- hazards

/// ab + a'c, b = c = 1, a falls at 0. (inverter, AND, OR): when f falls, when it rises again [computed]; a glitch as
/// long as the inverter delay: [PAGE http://icblogs.blogspot.com/2004/09/static-hazards.html]. a rising: none. With the
/// consensus term bc: none.
#[test]
fn consensus_example() {
    type Glitch = Option<(u64, u64)>;
    let rows: [(u64, u64, u64, Glitch, Glitch); 5] = [
        (1000, 1000, 1000, Some((2000, 3000)), Some((2000, 3000))),
        (2000, 1000, 1000, Some((2000, 4000)), Some((2000, 4000))),
        (1000, 1000, 500, Some((1500, 2500)), Some((1500, 2500))),
        (3000, 2000, 2000, Some((4000, 7000)), Some((4000, 7000))),
        (500, 1000, 1000, None, Some((2000, 2500))),
    ];
    for (inverter, and, or, inertial, pure) in rows {
        for (filter, glitch) in [(Inertial, inertial), (Transport, pure)] {
            for term in [false, true] {
                for a in [true, false] {
                    let mut world = World::new();
                    world.input("a", a).input("b", true).input("c", true);
                    world.gate("an", Not, &["a"], inverter);
                    world.gate("p", And, &["a", "b"], and).gate("q", And, &["an", "c"], and);
                    world.gate("r", And, &["b", "c"], and);
                    world.gate("f", Or, if term { &["p", "q", "r"] } else { &["p", "q"] }, or);
                    let run = world.filter(filter).at(0, &[("a", !a)]).run();
                    let expected: Vec<(u64, u8)> = match glitch {
                        Some((down, up)) if a && !term => vec![(down, 0), (up, 1)],
                        _ => vec![],
                    };
                    assert_eq!(run.of("f"), expected, "{inverter} {and} {or} {filter:?} bc {term} a was {a}");
                    let swallows = filter == Inertial && a && !term && glitch.is_none();
                    let swallowed = run.record.swallowed.iter().filter(|s| s.gate == 4).count();
                    assert_eq!(swallowed, usize::from(swallows), "the gate that absorbs the pulse says so");
                }
            }
        }
    }
}

/// The divide-by-two table with codes 00, 01, 11, 10 and Y1 = x'y2 + x y1 + y1 y2, Y2 = x y1' + x'y2 + y1'y2. Nothing
/// but the delay of x' (`inverter`) and of the direct wires from x (`direct`) differs from one unit.
fn divide_by_two(filter: Filter, inverter: u64, direct: Option<u64>, start: (bool, bool, bool)) -> Run {
    let (x, y1, y2) = start;
    let mut world = World::new();
    world.input("x", x);
    world.gate("xn", Not, &["x"], inverter).gate("y1n", Not, &["y1"], U);
    world.gate("a1", And, &["xn", "y2"], U).gate("a2", And, &["x", "y1"], U).gate("a3", And, &["y1", "y2"], U);
    world.gate("y1", Or, &["a1", "a2", "a3"], U);
    world.gate("b1", And, &["x", "y1n"], U).gate("b2", And, &["xn", "y2"], U).gate("b3", And, &["y1n", "y2"], U);
    world.gate("y2", Or, &["b1", "b2", "b3"], U);
    if let Some(direct) = direct {
        world.wire("x", "a2", direct, direct).wire("x", "b1", direct, direct);
    }
    world.filter(filter).initially(&[("y1", y1), ("y2", y2)]);
    world.at(0, &[("x", !x)]).run()
}

/// Essential hazard (Unger 1959 [from memory]). x rises from row 1: the threshold is AND + OR + AND = 3 units; at exactly
/// 3.0 the tie oscillates. Pure delay: right up to 2.0, a circulating pulse from 2.1 to 3.9, the wrong state from 4.0 on
/// [all computed].
#[test]
fn essential_hazard_of_a_slow_inverter() {
    let row_1 = (false, false, false);
    for inverter in [1, 500, 1000, 2000, 2900, 2999, 3000, 3001, 3100, 4000, 8000] {
        let run = divide_by_two(Inertial, inverter, None, row_1);
        match inverter {
            3000 => assert!(exact_period(&run).is_some(), "{:?}", end(&run)),
            ..3000 => assert!(settles(&run, &["y1", "y2"], &[0, 1]), "{inverter}: {:?}", end(&run)),
            _ => assert!(settles(&run, &["y1", "y2"], &[1, 0]), "{inverter}: {:?}", end(&run)),
        }
    }
    for inverter in (100..=6000).step_by(100) {
        let run = divide_by_two(Transport, inverter, None, row_1);
        match inverter {
            ..=2000 => assert!(settles(&run, &["y1", "y2"], &[0, 1]), "{inverter}: {:?}", end(&run)),
            2001..4000 => assert!(exact_period(&run).is_some(), "{inverter}: {:?}", end(&run)),
            _ => assert!(settles(&run, &["y1", "y2"], &[1, 0]), "{inverter}: {:?}", end(&run)),
        }
    }
}

/// The other three changes are never wrong for a slow inverter (0.1 to 8 units). With a slow direct wire instead
/// (inverter 0.5), x rising from row 3 is right below 3.5, a tie at 3.5 = 0.5 + 3 gates, and wrong above; x falling is
/// never wrong [all computed].
#[test]
fn essential_hazard_of_a_slow_wire() {
    let row_1 = (false, false, false);
    let (row_2, row_3, row_4) = ((true, false, true), (false, true, true), (true, true, false));
    for slow in (100..=8000).step_by(100) {
        for (row, next) in [(row_2, [1, 1]), (row_3, [1, 0]), (row_4, [0, 0])] {
            let run = divide_by_two(Inertial, slow, None, row);
            assert!(settles(&run, &["y1", "y2"], &next), "inverter {slow} from {row:?}: {:?}", end(&run));
        }
        for (row, next) in [(row_2, [1, 1]), (row_4, [0, 0])] {
            let run = divide_by_two(Inertial, U / 2, Some(slow), row);
            assert!(settles(&run, &["y1", "y2"], &next), "wire {slow} from {row:?}: {:?}", end(&run));
        }
        let run = divide_by_two(Inertial, U / 2, Some(slow), row_1);
        assert!(settles(&run, &["y1", "y2"], &[0, 1]), "wire {slow} from row 1: {:?}", end(&run));
        let run = divide_by_two(Inertial, U / 2, Some(slow), row_3);
        match slow {
            3500 => assert!(exact_period(&run).is_some(), "{:?}", end(&run)),
            ..3500 => assert!(settles(&run, &["y1", "y2"], &[1, 0]), "wire {slow}: {:?}", end(&run)),
            _ => assert!(settles(&run, &["y1", "y2"], &[0, 1]), "wire {slow}: {:?}", end(&run)),
        }
    }
}

/// The smallest ISCAS-85 circuit, six NANDs [seen in several public files]. Of 320 (vector, input, output) single changes
/// with unit pure delays exactly 2 glitch: 1 = 2 = 3 = 6 = 1, input 3 falls, output 22 is low from 2 to 3, for either
/// value of input 7; each output is 1 for 18 of 32 vectors [computed].
#[test]
fn c17_glitches_in_two_of_320_cases() {
    let inputs = ["i1", "i2", "i3", "i6", "i7"];
    let (mut glitches, mut ones) = (Vec::new(), [0, 0]);
    for vector in 0..32u32 {
        let bit = |input: usize| vector >> (4 - input) & 1 == 1;
        for changed in 0..5 {
            let mut world = World::new();
            for (i, input) in inputs.iter().enumerate() {
                world.input(input, bit(i));
            }
            world.gate("g10", Nand, &["i1", "i3"], U).gate("g11", Nand, &["i3", "i6"], U);
            world.gate("g16", Nand, &["i2", "g11"], U).gate("g19", Nand, &["g11", "i7"], U);
            world.gate("g22", Nand, &["g10", "g16"], U).gate("g23", Nand, &["g16", "g19"], U);
            let run = world.filter(Transport).at(0, &[(inputs[changed], !bit(changed))]).run();
            for (output, net) in ["g22", "g23"].into_iter().enumerate() {
                let moves = run.of(net);
                if moves.len() > 1 {
                    glitches.push((vector, inputs[changed], net, moves));
                }
                if changed == 0 && run.record.start[run.world.net(net).index()] == One {
                    ones[output] += 1;
                }
            }
        }
    }
    let low = vec![(2 * U, 0), (3 * U, 1)];
    assert_eq!(glitches, vec![(0b11110, "i3", "g22", low.clone()), (0b11111, "i3", "g22", low)]);
    assert_eq!(ones, [18, 18]);
}

// ---- flip-flop of six NANDs

/// N1..N4, Q, QB as in the textbook, positive edge. D is an input or, in the divider, QB itself.
fn flip_flop(filter: Filter, d: &str) -> World {
    let mut world = World::new();
    world.input("c", false);
    if d == "d" {
        world.input("d", false);
    }
    world.gate("n1", Nand, &["n4", "n2"], U).gate("n2", Nand, &["n1", "c"], U);
    world.gate("n3", Nand, &["n2", "c", "n4"], U).gate("n4", Nand, &["n3", d], U);
    world.gate("q", Nand, &["n2", "qb"], U).gate("qb", Nand, &["n3", "q"], U);
    world.filter(filter);
    world
}

/// With D = QB the output has half the frequency of the clock; the first output moves 2 gate delays after the clock, the
/// second 3 [textbook, from memory; figures computed].
#[test]
fn flip_flop_divides_by_two() {
    for filter in FILTERS {
        let mut world = flip_flop(filter, "qb");
        world.initially(&[("q", false)]);
        let (first, period) = (10 * U, 20 * U);
        let clock = Clock {
            net: world.net("c"),
            first: exact(first),
            period: exact(period),
            high: exact(10 * U),
            jitter: fs(0),
            count: 8,
            mark: Mark(0),
        };
        world.clocks.push(("c".into(), clock));
        let run = world.run();
        let edges = |fast: u64, slow: u64| -> Vec<(u64, u8)> {
            (0..8u8)
                .map(|n| (first + u64::from(n) * period + if n % 2 == 0 { fast } else { slow }, 1 - n % 2))
                .collect()
        };
        assert_eq!(run.of("q"), edges(2 * U, 3 * U), "{filter:?}");
        let falls: Vec<(u64, u8)> = edges(3 * U, 2 * U).into_iter().map(|(at, value)| (at, 1 - value)).collect();
        assert_eq!(run.of("qb"), falls, "{filter:?}");
        let rises: Vec<u64> = run.of("q").iter().filter(|edge| edge.1 == 1).map(|edge| edge.0).collect();
        assert!(rises.windows(2).all(|pair| pair[1] - pair[0] == 2 * period));
        assert!(run.record.windows.iter().all(|window| window.end == End::Settled && window.began_at_rest));
        assert_eq!(run.record.windows.len(), 16, "one window a clock edge");
    }
}

/// What the flip-flop holds after D has gone to `new` at `offset` after a rising clock edge (before it if negative).
#[derive(Debug, PartialEq)]
enum Captured {
    /// The new value, and Q moved this long after the clock.
    New(u64),
    Old,
    Never,
}

fn capture(filter: Filter, new: bool, offset: i64) -> Captured {
    let edge = 20 * U;
    let mut world = flip_flop(filter, "d");
    // Q holds the opposite of what is to come, so that both captures differ from keeping still
    world.inputs[1].1 = !new;
    world.initially(&[("q", !new)]);
    let d = edge.checked_add_signed(offset).unwrap();
    let (c, d) = ((edge, [("c", true)]), (d, [("d", new)]));
    for (at, set) in if c.0 <= d.0 { [c, d] } else { [d, c] } {
        world.at(at, &set);
    }
    let run = world.run();
    match end(&run) {
        End::Settled if run.last("q") == Value::from(new) && run.last("qb") == Value::from(!new) => {
            Captured::New(run.of("q").last().unwrap().0 - edge)
        }
        End::Settled if run.last("q") == Value::from(!new) && run.last("qb") == Value::from(new) => Captured::Old,
        End::Oscillating { .. } => Captured::Never,
        other => panic!("{filter:?} {new} {offset}: {other:?}"),
    }
}

/// Textbook: setup 2 gate delays (D to N4 to N1), hold 1 [from memory]. Pure delay [computed]: setup of a 0 is 2.0, of a
/// 1 is 1.0 (2.0 for the nominal delay to Q); hold of a 0 is 1.0, of a 1 is 0.0; in between a pulse circulates for ever.
#[test]
fn flip_flop_setup_and_hold_under_pure_delay() {
    for offset in (-4000..=3000).step_by(50) {
        let zero = capture(Transport, false, offset);
        match offset {
            ..=-2000 => assert!(matches!(zero, Captured::New(_)), "0 at {offset}: {zero:?}"),
            -1999..0 => assert_eq!(zero, Captured::Never, "0 at {offset}"),
            _ => assert_eq!(zero, Captured::Old, "hold of a 1: {offset}"),
        }
        let one = capture(Transport, true, offset);
        match offset {
            ..=-2000 => assert_eq!(one, Captured::New(2 * U), "1 at {offset}"),
            -1999..=-1000 => assert!(matches!(one, Captured::New(delay) if delay > 2 * U), "1 at {offset}: {one:?}"),
            -999..1000 => assert_eq!(one, Captured::Never, "1 at {offset}"),
            _ => assert_eq!(one, Captured::Old, "hold of a 0: {offset}"),
        }
    }
}

/// Inertial delay [computed]: setup of a 0 above 1.0, of a 1 above 0.0, where the delay to Q grows from 2 to 4 - s; hold
/// of a 0 above 0.0, of a 1 above -1.0; oscillation only at the exact ties. The shortest clock high is above 1.0.
#[test]
fn flip_flop_setup_and_hold_under_inertial_delay() {
    for offset in (-4000..=3000).step_by(50) {
        let zero = capture(Inertial, false, offset);
        match offset {
            -1000 => assert_eq!(zero, Captured::Never, "tie"),
            ..-1000 => assert!(matches!(zero, Captured::New(_)), "0 at {offset}: {zero:?}"),
            _ => assert_eq!(zero, Captured::Old, "hold of a 1: {offset}"),
        }
        let one = capture(Inertial, true, offset);
        match offset {
            0 => assert_eq!(one, Captured::Never, "tie"),
            ..=-2000 => assert_eq!(one, Captured::New(2 * U), "1 at {offset}"),
            -1999..0 => assert_eq!(one, Captured::New(4 * U - offset.unsigned_abs()), "1 at {offset}"),
            _ => assert_eq!(one, Captured::Old, "hold of a 0: {offset}"),
        }
    }
    for d in [false, true] {
        for width in (100..=3000).step_by(50) {
            let mut world = flip_flop(Inertial, "d");
            world.inputs[1].1 = d;
            world.initially(&[("q", !d)]);
            let run = world.at(0, &[("c", true)]).at(width, &[("c", false)]).run();
            let (took, kept) = ([u8::from(d), u8::from(!d)], [u8::from(!d), u8::from(d)]);
            match width {
                ..1000 => assert!(settles(&run, &["q", "qb"], &kept), "D {d} width {width}: {:?}", end(&run)),
                1001.. => assert!(settles(&run, &["q", "qb"], &took), "D {d} width {width}: {:?}", end(&run)),
                1000 => {}
            }
        }
    }
}

// ---- C-element

/// y' = ab + (a + b) y [PAGE https://en.wikipedia.org/wiki/C-element]: both inputs alike set the output, else it stays.
/// As one gate and as three ANDs and an OR, for every single change and for both together.
#[test]
fn c_element_transition_table() {
    for gates in [false, true] {
        for filter in FILTERS {
            for state in 0..8u8 {
                let (a, b, c) = (state & 4 != 0, state & 2 != 0, state & 1 != 0);
                if a == b && c != a {
                    continue; // no stable state
                }
                for next in 0..4u8 {
                    let (na, nb) = (next & 2 != 0, next & 1 != 0);
                    let crossing = a != b && na != a && nb != b;
                    if gates && crossing {
                        continue; // a and b pass each other: a hazard of the function, no promise of the table
                    }
                    let mut world = World::new();
                    world.input("a", a).input("b", b);
                    if gates {
                        world.gate("p", And, &["a", "b"], U).gate("q", And, &["a", "c"], U);
                        world.gate("r", And, &["b", "c"], U).gate("c", Or, &["p", "q", "r"], U);
                    } else {
                        world.expr("c", "a & b | (a | b) & c", U);
                    }
                    world.filter(filter).initially(&[("c", c)]);
                    let run = world.at(0, &[("a", na), ("b", nb)]).run();
                    let expected = if na == nb { na } else { c };
                    assert!(settles(&run, &["c"], &[u8::from(expected)]), "{gates} {a}{b}{c} to {na}{nb}");
                    let delay = if gates { 2 * U } else { U };
                    let moves = if expected == c { vec![] } else { vec![(delay, u8::from(expected))] };
                    assert_eq!(run.of("c"), moves, "no glitch on c");
                }
            }
        }
    }
}

// ---- IEEE 1364

/// The functions of IEEE 1364's gate primitives [PAGE https://www.doczj.com/doc/a27680282.html]: and, nand, or, nor, xor,
/// xnor (of several inputs: the complement of the parity), buf, not.
#[test]
fn gate_primitives() {
    type Rule = fn(usize, usize) -> bool;
    let table: [(Function, usize, Rule); 8] = [
        (And, 3, |ones, all| ones == all),
        (Nand, 3, |ones, all| ones != all),
        (Or, 3, |ones, _| ones > 0),
        (Nor, 3, |ones, _| ones == 0),
        (Function::Xor, 3, |ones, _| ones % 2 == 1),
        (Function::Xnor, 3, |ones, _| ones % 2 == 0),
        (Buf, 1, |ones, _| ones == 1),
        (Not, 1, |ones, _| ones == 0),
    ];
    for (function, pins, rule) in table {
        for vector in 0..1u32 << pins {
            let names = ["a", "b", "c"];
            let mut world = World::new();
            for (i, name) in names.iter().take(pins).enumerate() {
                world.input(name, vector >> i & 1 == 1);
            }
            world.gate("y", function.clone(), &names[..pins], U);
            let run = world.starts(&[false]).run();
            let expected = rule(vector.count_ones() as usize, pins);
            assert_eq!(run.last("y"), if expected { One } else { Zero }, "{function:?} {vector:b}");
        }
    }
}

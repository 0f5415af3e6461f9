//! What gates do with short pulses: the rules of IEEE 1076, and published figures of the involution delay model.

use std::f64::consts::LN_2;

use stillgate::circuit::Function::Buf;
use stillgate::delay::Filter::{self, Inertial, Transport};

use crate::support::world::{Run, World, fs};

// ---- IEEE 1076

fn through_a_buffer(filter: Filter, rise: u64, fall: u64, input: &[u64]) -> Run {
    let mut world = World::new();
    world.input("a", false).gate_edges("y", Buf, &["a"], rise, fall).filter(filter);
    for (n, at) in input.iter().enumerate() {
        world.at(*at, &[("a", n % 2 == 0)]);
    }
    world.run()
}

/// IEEE 1076: inertial is the default and rejects pulses shorter than the delay, `transport` keeps all pulses [PAGE
/// https://electronics.stackexchange.com/questions/136948/vhdl-delay-mechanism]. A pulse as long as the delay has matured
/// and passes [reasoned from the rule].
#[test]
fn ieee_1076_inertial_and_transport() {
    for width in [1, 9, 10, 11, 100] {
        let run = through_a_buffer(Inertial, 10, 10, &[0, width]);
        let passes = if width >= 10 { vec![(10, 1), (10 + width, 0)] } else { vec![] };
        assert_eq!(run.of("y"), passes, "inertial, width {width}");
        let swallowed: Vec<(u64, u64)> = run.record.swallowed.iter().map(|s| (s.age, s.delay)).collect();
        assert_eq!(swallowed, if width < 10 { vec![(width, 10)] } else { vec![] });
        let run = through_a_buffer(Transport, 10, 10, &[0, width]);
        assert_eq!(run.of("y"), [(10, 1), (10 + width, 0)], "transport, width {width}");
        assert_eq!(run.record.swallowed, []);
    }
    // a low pulse within a high; and a train: the low from 32 to 40 is too short, the high ends at 41
    assert_eq!(through_a_buffer(Inertial, 10, 10, &[0, 50, 59]).of("y"), [(10, 1)]);
    assert_eq!(through_a_buffer(Inertial, 10, 10, &[0, 50, 60]).of("y"), [(10, 1), (60, 0), (70, 1)]);
    let train = [0, 3, 20, 32, 40, 41];
    assert_eq!(through_a_buffer(Inertial, 10, 10, &train).of("y"), [(30, 1), (51, 0)]);
    let all: Vec<(u64, u8)> = train.iter().enumerate().map(|(n, at)| (at + 10, 1 - (n % 2) as u8)).collect();
    assert_eq!(through_a_buffer(Transport, 10, 10, &train).of("y"), all);
}

/// IEEE 1076: a new assignment deletes all transactions at or after its own time [PAGE
/// https://th4.ilovetranslation.com/XTmGUst1U4p9QESyW-HC5B==d]. Rise 10, fall 3: a fall scheduled at or before the rise
/// takes it out, one that comes later leaves a pulse of what is left.
#[test]
fn ieee_1076_deletes_what_is_scheduled_for_the_same_time_or_later() {
    for width in 1..=12 {
        let run = through_a_buffer(Transport, 10, 3, &[0, width]);
        let passes = if width + 3 > 10 { vec![(10, 1), (width + 3, 0)] } else { vec![] };
        assert_eq!(run.of("y"), passes, "width {width}");
        // the longer way down stretches the pulse
        assert_eq!(through_a_buffer(Transport, 3, 10, &[0, width]).of("y"), [(3, 1), (width + 10, 0)]);
    }
    // two pulses on the way; the second fall deletes only the second rise, not what lies before
    let run = through_a_buffer(Transport, 10, 3, &[0, 8, 9, 11]);
    assert_eq!(run.of("y"), [(10, 1), (11, 0)]);
}

/// The driver of IEEE 1076 with `reject`, as its clause on signal assignment updates the projected waveform [recalled]: a
/// new transaction deletes old ones at or after its time; then marked are the new one, old ones earlier than its time
/// less the limit, and old ones of the same value right before a marked one; unmarked ones are deleted. Returns the
/// changes of the signal.
fn ieee_1076_driver(limit: u64, rise: u64, fall: u64, assigned: &[(u64, bool)]) -> Vec<(u64, u8)> {
    let mut projected: Vec<(u64, bool)> = Vec::new();
    let mut signal = vec![(0, false)];
    let advance = |projected: &mut Vec<(u64, bool)>, signal: &mut Vec<(u64, bool)>, now: u64| {
        while projected.first().is_some_and(|first| first.0 <= now) {
            signal.push(projected.remove(0));
        }
    };
    for &(now, value) in assigned {
        advance(&mut projected, &mut signal, now);
        let new = (now + if value { rise } else { fall }, value);
        projected.retain(|old| old.0 < new.0);
        let mut marked: Vec<bool> = projected.iter().map(|old| old.0 + limit < new.0).collect();
        marked.push(true);
        projected.push(new);
        for i in (0..projected.len() - 1).rev() {
            marked[i] |= marked[i + 1] && projected[i].1 == projected[i + 1].1;
        }
        let mut kept = marked.into_iter();
        projected.retain(|_| kept.next().unwrap());
    }
    advance(&mut projected, &mut signal, u64::MAX);
    signal.dedup_by_key(|change| change.1);
    signal.iter().skip(1).map(|(at, value)| (*at, u8::from(*value))).collect()
}

/// IEEE 1076 `reject`: a pulse longer than the limit passes unchanged, one exactly as long is swallowed
/// [rule of the language, recalled].
#[test]
fn ieee_1076_reject_and_its_edge() {
    let reject = Filter::Reject(fs(4));
    for width in 1..=30 {
        let run = through_a_buffer(reject, 10, 10, &[0, width]);
        let passes = if width > 4 { vec![(10, 1), (10 + width, 0)] } else { vec![] };
        assert_eq!(run.of("y"), passes, "width {width}");
        let swallowed: Vec<(u64, u64)> = run.record.swallowed.iter().map(|s| (s.age, s.delay)).collect();
        assert_eq!(swallowed, if width <= 4 { vec![(width, 10)] } else { vec![] });
    }
    // what counts is the pulse at the output: rise 10, fall 7 take 3 from a high, rise 7, fall 10 add 3
    for width in 1..=30 {
        let run = through_a_buffer(reject, 10, 7, &[0, width]);
        assert_eq!(run.of("y"), if width > 7 { vec![(10, 1), (7 + width, 0)] } else { vec![] }, "width {width}");
        let run = through_a_buffer(reject, 7, 10, &[0, width]);
        assert_eq!(run.of("y"), if width > 1 { vec![(7, 1), (10 + width, 0)] } else { vec![] }, "width {width}");
    }
    // a low that is too short joins two highs, however short each of them is on the way
    assert_eq!(through_a_buffer(reject, 10, 10, &[0, 5, 9, 14]).of("y"), [(10, 1), (24, 0)]);
    assert_eq!(through_a_buffer(reject, 10, 10, &[0, 5, 10, 15]).of("y").len(), 4);
}

#[test]
fn reject_is_the_driver_of_ieee_1076() {
    let mut seen = [0; 2];
    for (limit, rise, fall) in [(1, 2, 2), (2, 3, 3), (3, 4, 4), (2, 4, 3), (2, 3, 6), (1, 5, 2), (4, 9, 5)] {
        // every train of six changes with gaps from 1 to 6
        for train in 0..6u64.pow(5) {
            let gaps = (0..5).map(|place| 1 + train / 6u64.pow(place) % 6);
            let times: Vec<u64> = std::iter::once(0)
                .chain(gaps)
                .scan(0, |at, gap| {
                    Some({
                        *at += gap;
                        *at
                    })
                })
                .collect();
            // one in seven: enough of each limit
            if train % 7 != limit {
                continue;
            }
            let assigned: Vec<(u64, bool)> = times.iter().enumerate().map(|(n, at)| (*at, n % 2 == 0)).collect();
            let wanted = ieee_1076_driver(limit, rise, fall, &assigned);
            seen[usize::from(wanted.len() < 6)] += 1;
            let run = through_a_buffer(Filter::Reject(fs(limit)), rise, fall, &times);
            assert_eq!(run.of("y"), wanted, "limit {limit}, rise {rise}, fall {fall}, {times:?}");
        }
    }
    assert!(seen.iter().all(|count| *count > 500), "{seen:?}");
}

// ---- involution delay model

/// The unit of the involution figures: they have nine decimals.
const NANO: f64 = 1e9;

/// tau, rise, fall: an RC stage with pure delay Tp and threshold V has rise = Tp − τ·ln(1 − V), fall = Tp − τ·ln V.
/// A: τ 1, Tp 0.5, V 0.5. B: τ 3, Tp 1, V 0.6. C: τ 10, Tp 5, V 0.4 [computed].
const INVOLUTIONS: [[f64; 3]; 3] =
    [[1.0, 1.193147181, 1.193147181], [3.0, 3.748872196, 2.532476871], [10.0, 10.108256238, 14.162907319]];

fn nano(value: f64) -> u64 {
    (value * NANO).round() as u64
}

/// Some stages of one kind behind an input that shows one pulse of a width, high or low, after a long rest: the widths of
/// the pulses behind each stage, `None` where none is left, and the first transition behind the first.
fn pulse_through(
    [tau, rise, fall]: [f64; 3],
    high: bool,
    width: f64,
    stages: usize,
) -> (Vec<Option<f64>>, Option<f64>) {
    let mut world = World::new();
    world.input("s0", !high);
    for stage in 1..=stages {
        world.gate_edges(&format!("s{stage}"), Buf, &[&format!("s{}", stage - 1)], nano(rise), nano(fall));
    }
    world.filter(Filter::Involution(fs(nano(tau)))).at(0, &[("s0", high)]).at(nano(width), &[("s0", !high)]);
    let run = world.run();
    let widths = (1..=stages).map(|stage| match run.of(&format!("s{stage}"))[..] {
        [] => None,
        [(from, _), (to, _)] => Some((to - from) as f64 / NANO),
        ref other => panic!("{other:?}"),
    });
    let first = run.of("s1").first().map(|change| change.0 as f64 / NANO);
    (widths.collect(), first)
}

/// The first transition takes the full delay. A pulse not wider than d∞ − Tp = −τ·ln(1 − V) (high) or −τ·ln V (low) is
/// gone, a wider one becomes w + δ(w − d∞) − d∞: shrunk, or stretched where the way back is the longer one [computed].
#[test]
fn involution_widths_behind_one_stage() {
    let [a, b, c] = INVOLUTIONS;
    for (set, high, critical) in [
        (a, true, LN_2),
        (a, false, LN_2),
        (b, true, 2.748872196),
        (b, false, 1.532476871),
        (c, true, 5.108256238),
        (c, false, 9.162907319),
    ] {
        for (part, passes) in [(0.1, false), (0.9, false), (1.0 - 1e-8, false), (1.0 + 1e-8, true), (1.1, true)] {
            let (widths, first) = pulse_through(set, high, critical * part, 1);
            assert_eq!(widths[0].is_some(), passes, "{set:?} {high} {part}");
            assert!(first.is_none_or(|at| (at - set[if high { 1 } else { 2 }]).abs() < 2e-9));
        }
    }
    for (set, width, wanted) in [
        (a, 0.866434, 0.320933772),
        (a, 1.039721, 0.603456457),
        (a, 1.386294, 1.098611807),
        (a, 2.772589, 2.708050497),
        (b, 4.123308, 2.031913728),
        (b, 10.995489, 9.701293535),
        (c, 10.216512, 9.808291787),
        (c, 20.433025, 23.099652060),
    ] {
        let (widths, _) = pulse_through(set, true, width, 1);
        let found = widths[0].expect("it passes");
        assert!((found - wanted).abs() < 2e-6, "{set:?} {width}: {found} and not {wanted}");
    }
}

/// A chain of equal stages: the pulse shrinks from stage to stage and dies out [computed].
#[test]
fn involution_pulse_dies_out_in_a_chain() {
    let (widths, _) = pulse_through(INVOLUTIONS[0], true, 1.109035489, 4);
    for (found, wanted) in widths.iter().zip([Some(0.708742), Some(0.030949), None, None]) {
        match (found, wanted) {
            (Some(found), Some(wanted)) => assert!((found - wanted).abs() < 2e-6, "{widths:?}"),
            (found, wanted) => assert_eq!((*found, wanted), (None, None), "{widths:?}"),
        }
    }
}

/// Delay against age: a second pulse that begins T after the end of the first takes δ↑(T). Given full delays of 2 and 1.5
/// with τ 1: δ↑(0) = 1.747517541, δ↓(0) = 1.354586542 [computed].
#[test]
fn involution_delay_of_a_change_right_after_one_of_the_output() {
    let set = [1.0, 2.0, 1.5];
    for (high, first, second) in [(true, 2.0, 1.354586542), (false, 1.5, 1.747517541)] {
        let mut world = World::new();
        world.input("a", !high).gate_edges("y", Buf, &["a"], nano(set[1]), nano(set[2]));
        world.filter(Filter::Involution(fs(nano(set[0])))).at(0, &[("a", high)]).at(nano(first), &[("a", !high)]);
        let run = world.run();
        let times: Vec<u64> = run.of("y").iter().map(|change| change.0).collect();
        assert_eq!(times[0], nano(first));
        assert!((times[1] as f64 / NANO - first - second).abs() < 3e-9, "{times:?}");
    }
}

//! Growth of the proof: `cargo bench --bench proof`.
//!
//! Every exploration asserts its answer, and is done in a process of its own, so that the peak memory is its own, too.

#![allow(clippy::print_stdout)] // figures are for a person

mod growing;

use std::process::Command;
use std::time::Instant;

use growing::Family;
use stillgate::control::Control;
use stillgate::proof::{Budget, Ended, Explored, Merge, Mode, Nothing, Plant, RestVerdict, comes_to_rest, explore};

/// Tells a process what to explore.
const ASKED: &str = "STILLGATE_EXPLORED";
/// Short work is repeated until it has taken this long, seconds.
const AT_LEAST: f64 = 0.3;
/// The bound of the exploration that is to run out of memory, bytes.
const SMALL: u64 = 32 << 20;

/// How a circuit is explored.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Way {
    /// Exactly.
    Exact,
    /// Exactly, but without what takes exactly equal times.
    Apart,
    /// One zone for each key, which holds all that can happen.
    Hull,
    /// Exactly, with little memory.
    Small,
    /// Does it come to rest?
    Cycles,
}

impl Way {
    const ALL: [Way; 5] = [Way::Exact, Way::Apart, Way::Hull, Way::Small, Way::Cycles];

    fn word(self) -> &'static str {
        match self {
            Way::Exact => "exact",
            Way::Apart => "without ties",
            Way::Hull => "hull",
            Way::Small => "32 MiB",
            Way::Cycles => "cycles",
        }
    }

    fn mode(self) -> Mode {
        match self {
            Way::Apart => Mode { joint: false, ..Mode::default() },
            Way::Hull => Mode { merge: Merge::Hull, ..Mode::default() },
            _ => Mode::default(),
        }
    }
}

fn main() {
    if let Ok(asked) = std::env::var(ASKED) {
        answer(&asked);
        return;
    }
    println!("circuit               way            zones kept       met   seconds  zones/s    met/s   peak MB");
    let mut all: Vec<(Family, usize, Way)> = Vec::new();
    let mut add = |family, sizes: &[usize], ways: &[Way]| {
        all.extend(sizes.iter().flat_map(|size| ways.iter().map(move |way| (family, *size, *way))));
    };
    add(Family::Apart, &[4, 8, 16, 32, 64], &[Way::Exact]);
    add(Family::Setting, &[4, 16, 64], &[Way::Exact]);
    add(Family::Joined, &[3, 4, 5, 6, 7], &[Way::Exact, Way::Hull]);
    add(Family::Chained, &[2, 3, 4], &[Way::Exact, Way::Apart, Way::Hull]);
    add(Family::Chained, &[5], &[Way::Exact, Way::Small]);
    add(Family::Dividers, &[1, 2, 3, 4, 5, 6], &[Way::Exact]);
    add(Family::Ring, &[3, 6, 9, 12], &[Way::Exact, Way::Cycles]);
    for (family, size, way) in all {
        measure(family, size, way);
    }
}

/// Has a process of its own explore, and prints what it says.
fn measure(family: Family, size: usize, way: Way) {
    let program = std::env::current_exe().expect("a program that runs has a file");
    let asked = format!("{}/{size}/{}", family.word(), way.word());
    let output = Command::new(program).env(ASKED, asked).output().expect("it can be started again");
    let text = String::from_utf8_lossy(&output.stdout);
    assert!(output.status.success(), "{family:?} {size} {way:?}: {}", String::from_utf8_lossy(&output.stderr));
    print!("{:21} {:13} {text}", format!("{} {size}", family.word()), way.word());
}

/// Explores what was asked for, asserts the answer and prints the cost.
fn answer(asked: &str) {
    let parts: Vec<&str> = asked.split('/').collect();
    let family = Family::ALL.into_iter().find(|family| family.word() == parts[0]).expect("the parent knows them");
    let size = parts[1].parse().expect("the parent sends a number");
    let way = Way::ALL.into_iter().find(|way| way.word() == parts[2]).expect("the parent knows them");
    let plants = family.plants(size);
    let bytes = if way == Way::Small { SMALL } else { 4 << 30 };
    let budget = Budget { zones: 10_000_000, bytes, until: None, control: Control::default() };
    // the fastest of several: others use the machine, too
    let (mut spent, mut fastest) = (0.0, f64::INFINITY);
    let (mut zones, mut met) = (0, 0);
    while spent < AT_LEAST {
        let began = Instant::now();
        let found: Vec<Explored> = match way {
            Way::Cycles => {
                for (plant, start) in &plants {
                    runs_for_ever(plant, start, &budget);
                }
                Vec::new()
            }
            _ => {
                let one = |(plant, start): &(Plant, Vec<bool>)| {
                    explore(plant, std::slice::from_ref(start), &Nothing, way.mode(), &budget)
                };
                plants.iter().map(one).collect()
            }
        };
        let seconds = began.elapsed().as_secs_f64();
        (spent, fastest) = (spent + seconds, fastest.min(seconds));
        zones = found.iter().map(|found| found.zones).sum();
        met = found.iter().map(|found| found.met).sum();
        for ((plant, _), found) in plants.iter().zip(&found) {
            check(family, size, way, plant, found);
        }
    }
    let peak = peak();
    if way == Way::Small {
        // scenario, program and the answer come on top
        assert!(peak.is_none_or(|peak| peak < 2.0 * SMALL as f64 / 1e6), "{peak:?}");
    }
    let rate = |number: u64| format!("{:.2} M", number as f64 / fastest / 1e6);
    let peak = peak.map_or("not told".to_string(), |peak| format!("{peak:.1}"));
    if way == Way::Cycles {
        println!("{:>11} {:>9} {fastest:>9.4} {:>8} {:>8} {peak:>9}", "", "", "", "");
        return;
    }
    println!("{zones:>11} {met:>9} {fastest:>9.4} {:>8} {:>8} {peak:>9}", rate(zones), rate(met));
}

/// The ring never rests once it was let go, and needs no exact ties for that.
fn runs_for_ever(plant: &Plant, start: &[bool], budget: &Budget) {
    let verdict = comes_to_rest(plant, std::slice::from_ref(&start.to_vec()), budget);
    let RestVerdict::Cycles(cycles) = verdict else { panic!("{verdict:?}") };
    assert_eq!(cycles.iter().map(|cycle| (cycle.steps, cycle.needs_ties)).collect::<Vec<_>>(), [(1, Some(false))]);
}

/// Is it what theory says?
fn check(family: Family, size: usize, way: Way, plant: &Plant, found: &Explored) {
    if way == Way::Small {
        assert_eq!(found.ended, Ended::Bytes);
        return;
    }
    assert_eq!(found.ended, Ended::Complete);
    let after = |steps: u32| -> Vec<&[u64]> {
        let rests = found.rests.keys().filter(|rest| rest.steps == steps);
        let mut states: Vec<&[u64]> = rests.map(|rest| &*found.states[rest.state as usize]).collect();
        states.sort();
        states.dedup();
        states
    };
    let gate = |state: &[u64], gate: usize| {
        let net = plant.inputs + gate;
        state[net / 64] >> (net % 64) & 1 == 1
    };
    match family {
        // either of the two gates may win
        Family::Apart => {
            let states = after(1);
            assert_eq!(states.len(), 2);
            assert!(states.iter().all(|state| gate(state, 0) != gate(state, 1)));
        }
        // all latches are set, by the one before or at once
        Family::Setting | Family::Joined => {
            let states = after(1);
            assert_eq!(states.len(), 1);
            assert!((0..size).all(|latch| gate(states[0], 2 * latch) && !gate(states[0], 2 * latch + 1)));
        }
        // the 1 is through all of them
        Family::Chained => {
            let states = after(1);
            assert_eq!(states.len(), 1);
            assert!((0..size).all(|latch| gate(states[0], 4 * latch + 2)));
        }
        // a counter: each stage toggles with each rising edge of the one before
        Family::Dividers => {
            for edge in 1..=64 {
                let states = after(edge);
                assert_eq!(states.len(), 1);
                let mut rising = edge.div_ceil(2);
                for stage in 0..size {
                    assert_eq!(gate(states[0], 6 * stage + 4), rising % 2 == 1, "edge {edge}, stage {stage}");
                    rising = rising.div_ceil(2);
                }
            }
        }
        Family::Ring => assert!(after(1).is_empty()),
    }
}

/// Most memory that this process has had, megabytes.
fn peak() -> Option<f64> {
    let text = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = text.lines().find_map(|line| line.strip_prefix("VmHWM:"))?;
    Some(line.trim().strip_suffix("kB")?.trim().parse::<f64>().ok()? * 1.024e-3)
}

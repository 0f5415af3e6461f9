//! Measuring in a process of its own, so that the memory is its own, too: the parent names the work in the environment,
//! the child answers with numbers on one line.

use std::process::Command;
use std::time::Instant;

use peak_alloc::PeakAlloc;

use crate::{gates, measure, samples, trace};

const ASKED: &str = "STILLGATE_GROWTH";
/// Short work is repeated until it has taken this long, seconds.
const AT_LEAST: f64 = 0.2;

#[global_allocator]
static HELD: PeakAlloc = PeakAlloc;

/// Measures what the parent asked for, if it did, and ends the process.
pub fn answer_if_asked() {
    let Ok(text) = std::env::var(ASKED) else { return };
    let words: Vec<&str> = text.split(' ').collect();
    let [kind, model, size] = words[..] else { panic!("the parent names kind, model and size: {text}") };
    let size = size.parse().expect("the parent knows the size");
    let numbers = match kind {
        "gates" => gates::measured(model, size),
        "samples" => samples::measured(model, size),
        "trace" => trace::measured(model, size),
        _ => panic!("the parent knows the kinds: {kind}"),
    };
    println!("{}", numbers.iter().map(f64::to_string).collect::<Vec<_>>().join(" "));
    std::process::exit(0);
}

/// Has a process of its own measure a model of this size.
pub fn ask(kind: &str, model: &str, size: u64) -> Vec<f64> {
    let program = std::env::current_exe().expect("a program that runs has a file");
    let output =
        Command::new(program).env(ASKED, format!("{kind} {model} {size}")).output().expect("it can be started again");
    let text = String::from_utf8_lossy(&output.stdout);
    let numbers: Result<Vec<f64>, _> = text.split_whitespace().map(str::parse).collect();
    match numbers {
        Ok(numbers) if output.status.success() => numbers,
        _ => panic!("{kind} {model} {size}: {text} {}", String::from_utf8_lossy(&output.stderr)),
    }
}

/// Processor time of a piece of work, seconds; wall time where the system does not tell.
pub fn timed<T>(work: impl FnOnce() -> T) -> (f64, T) {
    let (clock, began) = (Instant::now(), measure::processor());
    let result = work();
    let spent = match (began, measure::processor()) {
        (Some(began), Some(now)) => now - began,
        _ => clock.elapsed().as_secs_f64(),
    };
    (spent, result)
}

/// Processor time of one piece of work that is done again and again until it can be measured, seconds, and its last result.
pub fn timed_again<T>(mut work: impl FnMut() -> T) -> (f64, T) {
    let (mut spent, mut times) = (0.0, 0.0);
    loop {
        let (seconds, result) = timed(&mut work);
        (spent, times) = (spent + seconds, times + 1.0);
        if spent >= AT_LEAST {
            return (spent / times, result);
        }
    }
}

/// The fastest of several.
pub fn fastest(times: usize, mut work: impl FnMut() -> f64) -> f64 {
    (0..times).map(|_| work()).fold(f64::INFINITY, f64::min)
}

/// Memory that is allocated now, bytes.
pub fn allocated() -> f64 {
    HELD.current_usage() as f64
}

//! Measuring in a process of its own, so that the memory is its own, too: the parent names the work in the environment,
//! the child answers with numbers on one line.

use std::process::Command;
use std::time::Instant;

use crate::{gates, measure, samples, trace};

const ASKED: &str = "STILLGATE_GROWTH";

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
    let mut command = Command::new(program);
    // what is freed goes back to the system, so that resident memory is memory in use
    command.env("MALLOC_MMAP_THRESHOLD_", "16384").env("MALLOC_TRIM_THRESHOLD_", "16384");
    let output = command.env(ASKED, format!("{kind} {model} {size}")).output().expect("it can be started again");
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

/// The fastest of several.
pub fn fastest(times: usize, mut work: impl FnMut() -> f64) -> f64 {
    (0..times).map(|_| work()).fold(f64::INFINITY, f64::min)
}

/// Memory that this process holds now, bytes; 0 where the system does not tell.
pub fn resident() -> f64 {
    let text = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let line = text.lines().find_map(|line| line.strip_prefix("VmRSS:"));
    line.and_then(|line| line.trim().strip_suffix("kB")?.trim().parse::<f64>().ok()).map_or(0.0, |kb| kb * 1024.0)
}

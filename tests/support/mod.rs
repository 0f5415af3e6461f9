//! What several tests need: a slow engine written from the semantics alone, a short way to write a scenario down, and
//! a record of all that an engine tells.

pub mod explorer;
pub mod grid;
pub mod heard;
pub mod random_rules;
pub mod random_worlds;
pub mod recorder;
pub mod slow_engine;
pub mod slow_judge;
pub mod slow_recurrence;
pub mod slow_sweep;
pub mod small_nets;
pub mod spread;
pub mod world;
pub mod written;

/// So many cases, or `STILLGATE_CASES` percent of that.
pub fn share(count: u64) -> u64 {
    let percent = std::env::var("STILLGATE_CASES").ok().and_then(|text| text.parse().ok()).unwrap_or(100);
    count * percent / 100
}

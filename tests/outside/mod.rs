//! Checks against what others found: published tables, or programs that share no code with ours. Every test names its
//! source. `[computed]` marks a value from an independent throw-away program, "from memory" a source that was not at
//! hand, "common practice" what needs none.

#![allow(clippy::unwrap_used)] // a test may panic, its helpers too

mod large_networks;
mod networks;
mod random_networks;
mod small_networks;
mod stable_states;

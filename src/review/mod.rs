//! The views put together: runs, states and sweep of one scenario, and the verdict.
//!
//! Plain data; nothing is drawn here.

mod report;

pub use report::{Call, Review, RunReport, StatesReport, Verdict};

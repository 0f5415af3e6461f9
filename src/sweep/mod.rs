//! Many runs: drawing, running, tallying, statistics. Texts say "Monte Carlo, N draws".

mod conclude;
mod report;
mod run;
mod seen;
mod spread;
mod stats;
mod tally;

pub use conclude::conclude;
pub use report::{Boards, Finding, Outcome, RuleReport, Settling, SweepReport, Tie, WindowReport, Worst};
pub use run::run_samples;
pub use stats::clopper_pearson;
pub use tally::{Passage, Tally};

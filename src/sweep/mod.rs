//! Many runs: drawing, running, tallying, statistics. Texts say "Monte Carlo, N draws".

mod conclude;
mod report;
mod run;
mod seen;
mod spread;
mod stats;
mod tally;
mod unseen;

pub use conclude::{conclude, race_breaks, worst_first};
pub use report::{
    AtMost, Boards, Cause, ConditionReport, Finding, Outcome, RuleReport, Settling, SweepReport, Tie, TiesSought,
    Unmoved, WindowReport, Worst,
};
pub use run::run_samples;
pub use stats::{clopper_pearson, none_in};
pub use tally::{Passage, Tally};
pub use unseen::{UnseenMass, unseen_mass};

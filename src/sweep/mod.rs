//! Many runs: drawing, running, tallying, statistics. Texts say "Monte Carlo, N draws".

mod report;

pub use report::{Boards, Finding, Outcome, RuleReport, Settling, SweepReport, Tie, WindowReport, Worst};

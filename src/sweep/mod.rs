//! Many runs: drawing, running, tallying, statistics. Texts say "Monte Carlo, N draws".

mod bars;
mod cases;
mod conclude;
mod envelope;
mod fits;
mod looks;
mod lowest;
mod margins;
mod pairs;
mod part;
mod part_file;
mod ranges;
mod report;
mod run;
mod seen;
mod spread;
mod stats;
mod tally;
mod unseen;
mod waiting;

pub use cases::{Case, Cases};
pub use conclude::{conclude, conclude_after, race_breaks, worst_first};
pub use envelope::{EdgeSpan, Envelope, MOST_EDGES};
pub use looks::{Curve, Point, Until, UntilError, looks};
pub use lowest::KEPT as FAILING;
pub use margins::Margins;
pub use part::{Foreign, Overrides, Part, Parts, Refusal};
pub use part_file::{Damage, FORMAT};
pub use ranges::Ranges;
pub use report::{
    AtMost, Boards, Cause, ConditionReport, Finding, Fork, Outcome, RuleReport, Settling, Stopped, SweepReport, Tie,
    TiesSought, Unmoved, WindowReport, Worst,
};
pub use run::{run_samples, run_samples_with_envelope};
pub use stats::{clopper_pearson, none_in};
pub use tally::{Passage, Tally};
pub use unseen::{UnseenMass, unseen_mass};

//! What can be found in a run, what is asked of it, and the judges that answer.
//!
//! The words here are shared by sweep and proof. Judges are observers of a fixed number of words: what they need is
//! known from the scenario, whatever the length of a run.

mod asked;
mod causes;
mod departure;
mod judge;
mod paths;
mod pulses;
mod race;
mod words;

pub use crate::logic::Shape;
pub use asked::{Asked, Pattern, Question, RuleKey};
pub use departure::{Against, Departed, Departure};
pub use judge::{Answers, Judge, Match, Routine, Seen, Sink, matches, matches_any};
pub use paths::{Leg, Path, RacePair};
pub use race::{Races, race_pair};
pub use words::{Fact, Kind, Measure, Reason, Subject};

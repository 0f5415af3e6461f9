//! What the judges say of one case, as far as a search needs it.

use crate::engine::End;
use crate::findings::{Fact, Reason, Seen, Sink};
use crate::logic::State;

/// The answers about one run.
#[derive(Clone, Debug)]
pub(super) struct Heard {
    /// The question that is searched.
    pub question: u32,
    /// Of a critical race: the moment whose windows are compared.
    pub race: Option<u32>,
    /// Was it broken in this run?
    pub broken: bool,
    /// The worst slack.
    pub slack: Option<i64>,
    /// How bad the breach is: greater is worse.
    pub rank: Option<u64>,
    /// From which state the moment of the race led to which.
    pub passage: Option<(State, State)>,
    /// Other questions that this run breaks.
    pub others: Vec<u32>,
}

impl Heard {
    pub fn new(question: u32, race: Option<u32>) -> Heard {
        Heard { question, race, broken: false, slack: None, rank: None, passage: None, others: Vec::new() }
    }

    /// Another run begins.
    pub fn clear(&mut self) {
        (self.broken, self.slack, self.rank, self.passage) = (false, None, None, None);
        self.others.clear();
    }
}

impl Sink for Heard {
    fn judged(&mut self, question: u32, broken: bool, slack: Option<i64>) {
        if question == self.question {
            self.broken |= broken;
            self.slack = match (self.slack, slack) {
                (Some(a), Some(b)) => Some(a.min(b)),
                (a, b) => a.or(b),
            };
        } else if broken {
            self.others.push(question);
        }
    }

    fn not_judged(&mut self, _question: u32, _reason: Reason) {}

    fn fact(&mut self, fact: Fact) {
        if fact.breaks_rule && fact.subject.question == Some(self.question) {
            self.broken = true;
            self.rank = self.rank.max(fact.measure.map(|measure| measure.rank));
        }
    }

    fn reached(&mut self, _moment: u32, _named: bool) {}

    fn window(&mut self, window: &Seen<'_>) {
        if self.race != Some(window.moment) || window.end != End::Settled || window.state.has_unknown() {
            return;
        }
        self.passage = window.before.map(|before| (before.clone(), window.state.clone()));
    }
}

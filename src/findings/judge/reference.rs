//! The judge of settled states against the reference network, over whole windows.

use std::hash::{Hash, Hasher};
use std::sync::Arc;

use rustc_hash::FxHasher;

use super::nets::{ByMoment, NONE};
use super::sink::Sink;
use super::span::reason_of;
use crate::engine::{Closing, End};
use crate::findings::{Asked, Departed, Fact, Kind, Reason, RuleKey, Subject};
use crate::flow::{Allowed, Answer, Coming, Passed, View};
use crate::logic::State;
use crate::scenario::{MomentKind, Scenario};

/// Answers that a judge remembers by itself: most samples do what others did, and then need no lock.
const SLOTS: usize = 256;

/// `[reference]`
#[derive(Clone, Debug)]
pub(super) struct AgainstReference {
    allowed: Arc<Allowed>,
    questions: ByMoment,
    /// How the inputs of each moment change.
    coming: Vec<Coming>,
    power_up: Option<u32>,
    /// How those of the window that is open changed.
    now: Coming,
    before: View,
    after: View,
    slots: Vec<Option<Slot>>,
}

/// An answer that is remembered.
#[derive(Clone, Debug)]
struct Slot {
    before: Option<View>,
    coming: Coming,
    after: View,
    answer: Answer,
}

impl AgainstReference {
    /// `None` where there is no reference.
    pub(super) fn of(scenario: &Scenario, asked: &Asked) -> Option<AgainstReference> {
        let allowed = asked.allowed.clone()?;
        let stimulus = &scenario.stimulus;
        let coming = stimulus.moments.iter().map(|moment| match stimulus.step_of(moment) {
            Some(step) if step.bounce.is_some() => Coming::Bouncing,
            Some(step) if step.skew.is_some_and(|skew| skew.max.fs() > 0) => Coming::Apart,
            _ => Coming::Together,
        });
        let question = |moment| asked.find(RuleKey::Reference, 0, None, Some(moment)).unwrap_or(NONE);
        Some(AgainstReference {
            questions: (0..stimulus.moments.len() as u32).map(question).collect(),
            coming: coming.collect(),
            power_up: stimulus.moments.first().filter(|it| it.kind == MomentKind::PowerUp).map(|_| 0),
            now: Coming::Together,
            before: allowed.blank(),
            after: allowed.blank(),
            slots: vec![None; SLOTS],
            allowed,
        })
    }

    /// A window begins with these moments: of steps of one instant the one that leaves most open counts.
    pub(super) fn open(&mut self, moments: &[u32]) {
        let each = moments.iter().map(|moment| self.coming[*moment as usize]);
        self.now = each.max().unwrap_or(Coming::Together);
    }

    /// A whole window ends. `before`: the state before it, if it began at rest and without X.
    pub(super) fn close(&mut self, closing: &Closing<'_>, before: Option<&State>, sink: &mut impl Sink) {
        let question = self.questions[closing.moment as usize];
        if question == NONE {
            return;
        }
        match closing.end {
            End::Settled if closing.state.has_unknown() => return sink.not_judged(question, Reason::Unresolved),
            End::Settled => {}
            end => return sink.not_judged(question, reason_of(end)),
        }
        // power-up comes from no state of rest
        let at_rest = closing.began_at_rest && self.power_up != Some(closing.moment);
        let before = before.filter(|_| at_rest);
        let answer = self.ask(before, closing.state);
        match answer {
            Answer::NotAllowed => {
                sink.judged(question, true, None);
                let (moment, coming) = (closing.moment, self.now);
                sink.departed(&Departed { moment, before, coming, reached: closing.state });
                let kind = Kind::NotInReference;
                let subject = Subject { kind, shape: None, question: Some(question), net: None, moment: Some(moment) };
                sink.fact(Fact { subject, breaks_rule: true, measure: None, place: None });
            }
            // what an X before hides could have been another state
            _ if at_rest && before.is_none() => sink.not_judged(question, Reason::Unresolved),
            Answer::Allowed => sink.judged(question, false, None),
            Answer::GaveUp => sink.not_judged(question, Reason::GaveUp),
        }
    }

    fn ask(&mut self, before: Option<&State>, after: &State) -> Answer {
        if let Some(before) = before {
            self.allowed.look(&before.ones, &mut self.before);
        }
        self.allowed.look(&after.ones, &mut self.after);
        let seen = before.map(|_| &self.before);
        let mut hasher = FxHasher::default();
        (seen, self.now, &self.after).hash(&mut hasher);
        let slot = &mut self.slots[(hasher.finish() >> 32) as usize % SLOTS];
        match slot {
            Some(it) if it.coming == self.now && it.after == self.after && it.before.as_ref() == seen => it.answer,
            _ => {
                let answer = self.allowed.answer(&Passed { before: seen, coming: self.now, after: &self.after });
                *slot = Some(Slot { before: seen.cloned(), coming: self.now, after: self.after.clone(), answer });
                answer
            }
        }
    }
}

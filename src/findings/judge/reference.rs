//! The judge of settled states against the reference network, over whole windows.

use std::hash::{Hash, Hasher};
use std::sync::Arc;

use rustc_hash::FxHasher;

use super::nets::{ByMoment, NONE};
use super::sink::Sink;
use super::span::reason_of;
use crate::circuit::NetId;
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
    /// How the inputs of each moment change, and for listed steps which.
    ways: Vec<Way>,
    sets: Vec<Vec<NetId>>,
    power_up: Option<u32>,
    /// How those of the window that is open changed.
    now: Coming,
    before: View,
    after: View,
    slots: Vec<Option<Slot>>,
}

/// How a moment changes its inputs.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Way {
    /// All at one instant.
    Together,
    /// With skew.
    Skewed,
    /// With bounce.
    Bounced,
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
        let ways = stimulus.moments.iter().map(|moment| match stimulus.step_of(moment) {
            Some(step) if step.bounce.as_ref().is_some_and(|bounce| bounce.pulses.1 > 0) => Way::Bounced,
            // offsets that are all the same keep the changes together
            Some(step) if step.skew.is_some_and(|skew| !skew.is_exact()) => Way::Skewed,
            _ => Way::Together,
        });
        let sets = stimulus.moments.iter().map(|moment| match stimulus.step_of(moment) {
            Some(_) => stimulus.inputs_of(moment),
            None => Vec::new(),
        });
        let question = |moment| asked.find(RuleKey::Reference, 0, None, Some(moment)).unwrap_or(NONE);
        Some(AgainstReference {
            questions: (0..stimulus.moments.len() as u32).map(question).collect(),
            ways: ways.collect(),
            sets: sets.collect(),
            power_up: stimulus.moments.first().filter(|it| it.kind == MomentKind::PowerUp).map(|_| 0),
            now: Coming::Together,
            before: allowed.blank(),
            after: allowed.blank(),
            slots: vec![None; SLOTS],
            allowed,
        })
    }

    /// A window begins with these moments.
    pub(super) fn open(&mut self, moments: &[u32]) {
        let ways = moments.iter().map(|moment| self.ways[*moment as usize]);
        let (bounced, skewed) = (ways.clone().any(|it| it == Way::Bounced), ways.clone().any(|it| it == Way::Skewed));
        self.now = match skewed {
            _ if bounced || (skewed && self.sets_twice(moments)) => {
                let all = moments.iter().flat_map(|moment| &self.sets[*moment as usize]);
                Coming::Restless(all.copied().collect())
            }
            true => Coming::Apart,
            false => Coming::Together,
        };
    }

    /// Does an input belong to two listed steps of these? With skew either may come last.
    fn sets_twice(&self, moments: &[u32]) -> bool {
        let mut all: Vec<NetId> = moments.iter().flat_map(|moment| &self.sets[*moment as usize]).copied().collect();
        all.sort_unstable();
        all.windows(2).any(|pair| pair[0] == pair[1])
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
                let moment = closing.moment;
                sink.departed(&Departed { moment, before, coming: &self.now, reached: closing.state });
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
        (seen, &self.now, &self.after).hash(&mut hasher);
        let slot = &mut self.slots[(hasher.finish() >> 32) as usize % SLOTS];
        match slot {
            Some(it) if it.coming == self.now && it.after == self.after && it.before.as_ref() == seen => it.answer,
            _ => {
                let answer = self.allowed.answer(&Passed { before: seen, coming: &self.now, after: &self.after });
                *slot =
                    Some(Slot { before: seen.cloned(), coming: self.now.clone(), after: self.after.clone(), answer });
                answer
            }
        }
    }
}

//! A sink that keeps what the judges say of one run.

use stillgate::engine::End;
use stillgate::findings::{Fact, Reason, Seen, Sink};
use stillgate::logic::State;

use super::slow_judge::{Answer, Found, Said};

/// Takes what the judges say of one run, and sees that each thing is said once.
#[derive(Debug, Default)]
pub struct Heard {
    pub said: Said,
    pub reached: Vec<(u32, bool)>,
    pub windows: Vec<HeardWindow>,
}

/// One window.
#[derive(Clone, Debug)]
pub struct HeardWindow {
    pub moment: u32,
    pub before: Option<State>,
    pub began_at_rest: bool,
    pub end: End,
    pub state: State,
    pub time: u64,
    pub order: u64,
}

impl Heard {
    fn answer(&mut self, question: u32, answer: Answer) {
        let before = self.said.answers.insert(question, answer);
        assert_eq!(before, None, "question {question} answered twice");
    }
}

impl Sink for Heard {
    fn judged(&mut self, question: u32, broken: bool, slack: Option<i64>) {
        self.answer(question, Answer::Judged { broken, slack });
    }

    fn not_judged(&mut self, question: u32, reason: Reason) {
        self.answer(question, Answer::Not(reason));
    }

    fn fact(&mut self, fact: Fact) {
        let found = Found { breaks_rule: fact.breaks_rule, worst: fact.measure.into_iter().collect() };
        let before = self.said.facts.insert(fact.subject, found);
        assert_eq!(before, None, "{:?} found twice", fact.subject);
    }

    fn reached(&mut self, moment: u32, named: bool) {
        self.reached.push((moment, named));
    }

    fn window(&mut self, window: &Seen<'_>) {
        self.windows.push(HeardWindow {
            moment: window.moment,
            before: window.before.cloned(),
            began_at_rest: window.began_at_rest,
            end: window.end,
            state: window.state.clone(),
            time: window.time.fs(),
            order: window.order,
        });
    }
}

//! What is asked of the whole run, and what is listed without being asked.

use stillgate::circuit::GateId;
use stillgate::engine::End;
use stillgate::findings::{Kind, Measure, Pattern, Question, Reason, RuleKey};
use stillgate::logic::Value;
use stillgate::scenario::{EdgeSpec, Oscillation, Swallowed};
use stillgate::time::Span;

use super::{Answer, Move, Slow, short, shows};

impl Slow<'_> {
    /// Why a run that broke nothing leaves a question of the whole run open.
    pub(super) fn open(&self) -> Option<Reason> {
        match self.end() {
            End::Unsettled(_) => Some(Reason::Unsettled),
            _ => self.stopped().then_some(Reason::NotReached),
        }
    }

    pub(super) fn never(&mut self, number: u32, question: &Question) {
        let Some(Pattern::State(pattern)) = &question.pattern else { panic!("{question:?}") };
        let bound = question.bound.expect("a bound").fs();
        let mut values = self.start().to_vec();
        // (time, window, shown) at the start and after every batch
        let mut states = vec![(0, self.scenario.begin_window().map(|_| 0), shows(&values, pattern))];
        for batch in &self.log.batches {
            batch.changes.iter().for_each(|(net, new)| values[net.index()] = *new);
            states.push((batch.at, Some(batch.window), shows(&values, pattern)));
        }
        let stretches = |fits: &dyn Fn(Option<bool>) -> bool| {
            // (from, window, to); `to` none: to the end
            let mut all: Vec<(u64, Option<usize>, Option<u64>)> = Vec::new();
            let mut open = false;
            for (at, window, shown) in &states {
                match (open, fits(*shown)) {
                    (false, true) => all.push((*at, *window, None)),
                    (true, false) => all.last_mut().expect("open").2 = Some(*at),
                    _ => {}
                }
                open = fits(*shown);
            }
            all
        };
        let end = self.log.recorder.record.end;
        let forever = self.end() == End::Settled && !self.stopped();
        let length = |(from, _, to): &(u64, Option<usize>, Option<u64>)| to.unwrap_or(end) - from;
        // one that lasts for ever is too long however short the rest of the run was
        let bad =
            |it: &(u64, Option<usize>, Option<u64>)| length(it) > bound || bound == 0 || (it.2.is_none() && forever);
        let sure = stretches(&|shown| shown == Some(true));
        let mut slack = None;
        for stretch in &sure {
            let this = bound as i64 - length(stretch) as i64;
            if bound > 0 {
                let this = if bad(stretch) { this.min(-1) } else { this };
                slack = Some(slack.map_or(this, |slack: i64| slack.min(this)));
            }
            if bad(stretch) {
                let moment = stretch.1.map(|window| self.windows[window].moment);
                let endless = stretch.2.is_none() && forever;
                let lasted = Measure::long(Span::from_fs(length(stretch)));
                let measure = Some(if endless { Measure::ENDLESS } else { lasted });
                self.fact(Self::subject(Kind::Never, Some(number), None, moment), true, measure);
            }
        }
        let broken = sure.iter().any(bad);
        let answer = match self.open() {
            _ if broken => Answer::Judged { broken, slack },
            Some(reason) => Answer::Not(reason),
            // it may go on for ever
            None if self.end() != End::Settled && sure.last().is_some_and(|it| it.2.is_none()) => {
                Answer::Not(Reason::Oscillating)
            }
            None if states.iter().any(|it| it.2.is_none()) => Answer::Not(Reason::Unresolved),
            None => Answer::Judged { broken, slack },
        };
        self.answer(number, answer);
    }

    pub(super) fn oscillation_somewhere(&mut self, number: u32) {
        let found = self.windows.iter().any(|window| matches!(window.end, End::Oscillating { .. }));
        let answer = match self.open() {
            Some(reason) if !found => Answer::Not(reason),
            // it may have been on its way to recur
            None if !found && self.windows.iter().any(|window| window.end == End::Cut) => Answer::Not(Reason::Cut),
            _ => Answer::Judged { broken: !found, slack: None },
        };
        if answer == (Answer::Judged { broken: true, slack: None }) {
            self.fact(Self::subject(Kind::Oscillation, Some(number), None, None), true, None);
        }
        self.answer(number, answer);
    }

    pub(super) fn edges_of(&self, spec: EdgeSpec) -> Vec<Move> {
        let moves = self.moves(spec.net, 0, self.windows.len());
        moves.into_iter().filter(|it| it.new.known().is_some_and(|bit| spec.edge.is(bit))).collect()
    }

    pub(super) fn moment_of_batch(&self, batch: usize) -> Option<u32> {
        Some(self.windows[self.log.batches[batch].window].moment)
    }

    pub(super) fn timing(&mut self, number: u32, question: &Question) {
        let rule = &self.scenario.rules.timing[question.index as usize];
        let (from, to) = (self.edges_of(rule.from), self.edges_of(rule.to));
        let same = |a: &Move, b: &Move| rule.from.net == rule.to.net && a.batch == b.batch;
        let end = self.log.recorder.record.end;
        // (distance, slack, moment) of each pair
        let mut seen: Vec<(u64, i64, Option<u32>)> = Vec::new();
        let (mut spoken_of, mut left) = (false, None);
        if let Some(min) = rule.min {
            for edge in &to {
                spoken_of = true;
                let before = from.iter().filter(|it| it.batch <= edge.batch && !same(it, edge)).map(|it| it.at).max();
                if let Some(before) = before {
                    let distance = edge.at - before;
                    seen.push((distance, short(min, distance), self.moment_of_batch(edge.batch)));
                }
            }
        }
        if let Some(max) = rule.max {
            for edge in &from {
                let next = to.iter().filter(|it| it.batch >= edge.batch && !same(it, edge)).map(|it| it.at).min();
                let waited = end - edge.at;
                let ended =
                    self.end() == End::Settled && !self.stopped() && !self.scenario.circuit.is_input(rule.to.net);
                let (distance, slack) = match next {
                    Some(next) => (next - edge.at, -short(max, next - edge.at)),
                    // it never comes
                    None if ended => (u64::MAX, (-short(max, waited)).min(-1)),
                    None if waited > max.fs() => (waited, (-short(max, waited)).min(-1)),
                    None => {
                        if !self.scenario.circuit.is_input(rule.to.net) {
                            left = Some(match self.end() {
                                End::Oscillating { .. } => Reason::Oscillating,
                                End::Unsettled(_) => Reason::Unsettled,
                                End::Cut => Reason::Cut,
                                End::Settled => Reason::NotReached,
                            });
                        }
                        continue;
                    }
                };
                spoken_of = true;
                seen.push((distance, slack, self.moment_of_batch(edge.batch)));
            }
        }
        for (distance, slack, moment) in &seen {
            if *slack < 0 {
                let measure = Measure { rank: slack.unsigned_abs(), value: *distance };
                let measure = if *distance == u64::MAX { Measure::ENDLESS } else { measure };
                self.fact(Self::subject(Kind::Timing, Some(number), None, *moment), true, Some(measure));
            }
        }
        let slack = seen.iter().map(|it| it.1).min();
        let broken = slack.is_some_and(|slack| slack < 0);
        if broken {
            self.answer(number, Answer::Judged { broken, slack });
        } else if let Some(reason) = self.open().or(left) {
            self.answer(number, Answer::Not(reason));
        } else if spoken_of {
            self.answer(number, Answer::Judged { broken, slack });
        }
    }

    pub(super) fn min_pulse(&mut self, number_of: u32, question: &Question) {
        let rule = &self.scenario.rules.min_pulse[question.index as usize];
        let moves = self.moves(rule.net, 0, self.windows.len());
        let (mut slack, mut unresolved) = (None, false);
        for (number, pair) in moves.windows(2).enumerate() {
            let bound = match pair[0].new {
                Value::One => rule.high,
                Value::Zero => rule.low,
                Value::X => {
                    unresolved = true;
                    None
                }
            };
            let (Some(bound), width) = (bound, pair[1].at - pair[0].at) else { continue };
            let before = match number {
                0 => self.start()[rule.net.index()],
                number => moves[number - 1].new,
            };
            let this = short(bound, width);
            // beside an X a pulse may be longer than it looks
            if this < 0 && [before, pair[1].new].contains(&Value::X) {
                unresolved = true;
                continue;
            }
            slack = Some(slack.map_or(this, |slack: i64| slack.min(this)));
            if this < 0 {
                let moment = self.moment_of_batch(pair[1].batch);
                let measure = Measure { rank: this.unsigned_abs(), value: width };
                self.fact(Self::subject(Kind::MinPulse, Some(number_of), Some(rule.net), moment), true, Some(measure));
            }
        }
        let broken = slack.is_some_and(|slack| slack < 0);
        let open = self.open().or(unresolved.then_some(Reason::Unresolved));
        match open {
            Some(reason) if !broken => self.answer(number_of, Answer::Not(reason)),
            _ if slack.is_none() => {}
            _ => self.answer(number_of, Answer::Judged { broken, slack }),
        }
    }

    pub(super) fn swallowed_rule(&mut self, number: u32, question: &Question) {
        let circuit = &self.scenario.circuit;
        let net_of = |gate: usize| circuit.net_of(GateId(gate as u32));
        let mut swallowed = self.log.recorder.record.swallowed.iter();
        let broken = swallowed.any(|it| question.net.is_none_or(|net| net == net_of(it.gate)));
        match self.open() {
            Some(reason) if !broken => self.answer(number, Answer::Not(reason)),
            _ => self.answer(number, Answer::Judged { broken, slack: None }),
        }
    }

    /// The pattern that a step waits for came, or never did, or nobody waited for it yet.
    pub(super) fn when(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("the step that waits");
        let never = self.log.recorder.record.never_came == Some(moment);
        match self.window_of(moment) {
            None if !never => self.answer(number, Answer::Not(Reason::NotReached)),
            window => {
                assert!(window.is_none() || !never, "it came and never came");
                self.answer(number, Answer::Judged { broken: never, slack: None });
            }
        }
        if never {
            self.fact(Self::subject(Kind::NeverCame, Some(number), None, Some(moment)), true, None);
        }
    }

    pub(super) fn listed(&mut self) {
        for window in self.windows {
            let moment = Some(window.moment);
            match window.end {
                End::Oscillating { period, .. } => {
                    // where it breaks something, and else once
                    let says = self.say_of_oscillation(window);
                    let mut at: Vec<u32> = says.clone();
                    at.retain(|moment| self.permission(*moment) == Oscillation::Forbidden);
                    if !at.contains(&says[0]) {
                        at.push(says[0]);
                    }
                    for moment in at {
                        let question = self.asked.find(RuleKey::Oscillation, 0, None, Some(moment));
                        let breaks = self.permission(moment) == Oscillation::Forbidden;
                        let question = question.filter(|_| breaks);
                        let subject = Self::subject(Kind::Oscillation, question, None, Some(moment));
                        self.fact(subject, breaks, Some(Measure::long(period)));
                    }
                }
                End::Unsettled(_) => self.fact(Self::subject(Kind::Unsettled, None, None, moment), false, None),
                End::Settled if window.state.contains(&Value::X) => {
                    self.fact(Self::subject(Kind::Unresolved, None, None, moment), false, None);
                }
                _ => {}
            }
        }
        for it in &self.log.recorder.record.swallowed {
            let net = self.scenario.circuit.net_of(GateId(it.gate as u32));
            let question = match &self.scenario.rules.swallowed {
                Swallowed::Listed => None,
                Swallowed::Forbidden => self.asked.find(RuleKey::Swallowed, 0, None, None),
                Swallowed::At(_) => self.asked.find(RuleKey::Swallowed, 0, Some(net), None),
            };
            let subject = Self::subject(Kind::Swallowed, question, Some(net), Some(self.windows[it.window].moment));
            let share = Measure::share(Span::from_fs(it.age), Span::from_fs(it.delay));
            self.fact(subject, question.is_some(), Some(share));
        }
    }
}

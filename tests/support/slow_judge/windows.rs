//! What is asked of windows.

use stillgate::circuit::NetId;
use stillgate::engine::End;
use stillgate::findings::{Kind, Measure, Pattern, Question, Reason, RuleKey, Shape, Subject};
use stillgate::logic::Value;
use stillgate::scenario::Oscillation;
use stillgate::time::Span;

use super::{Answer, Move, Slow, short, shows};

impl Slow<'_> {
    pub(super) fn not_reached(&mut self) {
        for (number, question) in self.asked.questions.iter().enumerate() {
            // whether a pattern came is judged apart
            let waits = question.rule == RuleKey::When;
            if !waits && question.moment.is_some_and(|moment| self.window_of(moment).is_none()) {
                self.answer(number as u32, Answer::Not(Reason::NotReached));
            }
        }
    }

    pub(super) fn never_at_rest(&mut self) {
        for (index, rule) in self.scenario.rules.never_at_rest.iter().enumerate() {
            let nets: Vec<NetId> = rule.state.iter().map(|(net, _)| *net).collect();
            let cone = self.scenario.circuit.cone(&nets);
            for window in self.net_windows(&cone) {
                let Some(number) = self.name(&window, RuleKey::NeverAtRest, index as u32, None) else { continue };
                if window.from.is_some() && self.spares(&window) {
                    continue;
                }
                // the start is a state of rest, whatever comes
                let (reason, state) = match window.from {
                    Some(_) => (self.invalid(&window), &window.state[..]),
                    None => (None, self.start()),
                };
                let answer = match (reason, shows(state, &rule.state)) {
                    (Some(reason), _) => Answer::Not(reason),
                    (None, None) => Answer::Not(Reason::Unresolved),
                    (None, Some(broken)) => Answer::Judged { broken, slack: None },
                };
                if matches!(answer, Answer::Judged { broken: true, .. }) {
                    let moment = self.asked.questions[number as usize].moment;
                    self.fact(Self::subject(Kind::NeverAtRest, Some(number), None, moment), true, None);
                }
                self.answer(number, answer);
            }
        }
    }

    pub(super) fn expect(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a step");
        let Some(Pattern::OneOf(expected)) = &question.pattern else { panic!("{question:?}") };
        let Some(window) = self.window_of(moment) else { return };
        let nets: Vec<NetId> = expected.alternatives.iter().flatten().map(|(net, _)| *net).collect();
        let window = self.window_from(Some(window), &self.scenario.circuit.cone(&nets));
        let fits: Vec<Option<bool>> = expected.alternatives.iter().map(|it| shows(&window.state, it)).collect();
        let answer = match self.invalid(&window) {
            Some(reason) => Answer::Not(reason),
            None if fits.contains(&Some(true)) => Answer::Judged { broken: false, slack: None },
            None if fits.contains(&None) => Answer::Not(Reason::Unresolved),
            None => Answer::Judged { broken: true, slack: None },
        };
        if matches!(answer, Answer::Judged { broken: true, .. }) {
            self.fact(Self::subject(Kind::Expect, Some(number), None, Some(moment)), true, None);
        }
        self.answer(number, answer);
    }

    pub(super) fn edges(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a step");
        let Some(Pattern::Count(count)) = &question.pattern else { panic!("{question:?}") };
        let Some(from) = self.window_of(moment) else { return };
        let window = self.window_from(Some(from), &self.scenario.circuit.cone(&[count.net]));
        let moves = self.moves_in(count.net, &window);
        let before = self.windows[from].opening.state[count.net.index()];
        let answer = if let Some(reason) = self.invalid(&window) {
            Answer::Not(reason)
        } else if before == Value::X || moves.iter().any(|it| it.new == Value::X) {
            Answer::Not(Reason::Unresolved)
        } else {
            let broken = !(count.least as usize..=count.most as usize).contains(&moves.len());
            Answer::Judged { broken, slack: None }
        };
        if matches!(answer, Answer::Judged { broken: true, .. }) {
            self.fact(Self::subject(Kind::Edges, Some(number), Some(count.net), Some(moment)), true, None);
        }
        self.answer(number, answer);
    }

    pub(super) fn glitches(&mut self) {
        for net in &self.scenario.watched {
            let rule = self.scenario.rules.glitch_free.iter().position(|rule| rule.net == *net);
            let bound = rule.map_or(Span::ZERO, |rule| self.scenario.rules.glitch_free[rule].shorter_than);
            let cone = self.scenario.circuit.cone(&[*net]);
            for window in self.net_windows(&cone) {
                let Some(from) = window.from.filter(|from| Some(*from as u32) != self.scenario.begin_window()) else {
                    continue;
                };
                if self.spares(&window) || self.counts_edges(from, *net) {
                    continue;
                }
                let question = rule.and_then(|rule| self.name(&window, RuleKey::GlitchFree, rule as u32, Some(*net)));
                let moment = match question {
                    Some(number) => self.asked.questions[number as usize].moment,
                    None => Some(self.windows[from].moment),
                };
                let before = self.windows[from].opening.state[net.index()];
                let moves = self.moves_in(*net, &window);
                let whole = moves.last().map_or(0, |it| it.at) - moves.first().map_or(0, |it| it.at);
                let mut unknown = before == Value::X || moves.iter().any(|it| it.new == Value::X);
                // whatever an X hides, if all of it is shorter than the bound, it is struck out
                let hidden = unknown
                    && before != Value::X
                    && moves.last().is_some_and(|it| it.new != Value::X)
                    && whole < bound.fs();
                unknown &= !hidden;
                let reason = self.invalid(&window).or(unknown.then_some(Reason::Unresolved));
                if let Some(reason) = reason {
                    if let Some(number) = question {
                        self.answer(number, Answer::Not(reason));
                    }
                    continue;
                }
                let (left, widest) = match hidden {
                    true => (Vec::new(), Some(whole)),
                    false => strike_out(before, &moves, bound.fs()),
                };
                let broken = is_glitch(before, &left);
                let slack = widest.filter(|_| bound.fs() > 0).map(|widest| -short(bound, widest));
                let slack = slack.map(|slack| if broken { slack.min(-1) } else { slack });
                if let Some(number) = question {
                    self.answer(number, Answer::Judged { broken, slack });
                }
                if broken {
                    let shape = match (left.len() % 2 == 0, before) {
                        (true, Value::Zero) => Shape::Static0,
                        (true, _) => Shape::Static1,
                        (false, _) => Shape::Dynamic,
                    };
                    let narrowest = left.windows(2).map(|pair| pair[1].at - pair[0].at).min().expect("a pulse");
                    let subject = Self::subject(Kind::Glitch, question, Some(*net), moment);
                    let measure = Measure { rank: narrowest, value: narrowest };
                    self.fact(Subject { shape: Some(shape), ..subject }, question.is_some(), Some(measure));
                }
            }
        }
    }

    /// A step at a window's beginning says how often this net must move: that replaces the glitch test.
    pub(super) fn counts_edges(&self, window: usize, net: NetId) -> bool {
        let mut steps = self.windows[window].opening.moments.iter().filter_map(|moment| self.step_of(*moment));
        steps.any(|step| step.edges.iter().any(|count| count.net == net))
    }

    pub(super) fn settle_within(&mut self) {
        for net in &self.scenario.watched {
            let cone = self.scenario.circuit.cone(&[*net]);
            for window in self.net_windows(&cone) {
                let Some(from) = window.from.filter(|_| !self.spares(&window)) else { continue };
                // every step of that instant that has a bound of its own, and the first that has the rule's
                let moments = self.windows[from].opening.moments.iter();
                let asks = |it: &u32| self.asked.find(RuleKey::SettleWithin, 0, Some(*net), Some(*it));
                let own = |it: &&u32| self.step_of(**it).is_some_and(|step| step.settle_within.is_some());
                let mut numbers: Vec<u32> = moments.clone().filter(own).filter_map(asks).collect();
                numbers.extend(moments.filter(|it| !own(it)).find_map(asks));
                let last = self.moves_in(*net, &window).last().map_or(0, |it| it.at);
                let time = last.saturating_sub(self.windows[from].settle_from);
                for number in numbers {
                    let question = &self.asked.questions[number as usize];
                    let bound = question.bound.expect("a bound");
                    let broken = time > bound.fs();
                    let answer = match self.invalid(&window) {
                        Some(Reason::BeganBeforeRest) => Answer::Not(Reason::BeganBeforeRest),
                        Some(reason) if !broken => Answer::Not(reason),
                        _ => Answer::Judged { broken, slack: Some(-short(bound, time)) },
                    };
                    if matches!(answer, Answer::Judged { broken: true, .. }) {
                        let subject = Self::subject(Kind::SettleWithin, Some(number), Some(*net), question.moment);
                        self.fact(subject, true, Some(Measure::long(Span::from_fs(time))));
                    }
                    self.answer(number, answer);
                }
            }
        }
    }

    /// One run alone can only say that it went from rest to rest.
    pub(super) fn critical_race(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a moment");
        let Some(window) = self.window_of(moment).map(|window| &self.windows[window]) else { return };
        if window.moment != moment {
            return;
        }
        let power_up = self.scenario.begin_window() == Some(moment);
        let answer = if !window.began_at_rest && !power_up {
            Answer::Not(Reason::BeganBeforeRest)
        } else if window.end != End::Settled {
            if self.spared(window) {
                return;
            }
            Answer::Not(self.why(window))
        } else if window.state.contains(&Value::X) {
            Answer::Not(Reason::Unresolved)
        } else {
            Answer::Judged { broken: false, slack: None }
        };
        self.answer(number, answer);
    }

    pub(super) fn oscillation(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a moment");
        let Some(window) = self.window_of(moment).map(|window| &self.windows[window]) else { return };
        if !self.say_of_oscillation(window).contains(&moment) {
            return;
        }
        let required = self.permission(moment) == Oscillation::Required;
        let power_up = self.scenario.begin_window() == Some(moment);
        let answer = match window.end {
            End::Oscillating { .. } => Answer::Judged { broken: !required, slack: None },
            _ if !window.began_at_rest && !power_up => Answer::Not(Reason::BeganBeforeRest),
            End::Settled => Answer::Judged { broken: required, slack: None },
            _ => Answer::Not(self.why(window)),
        };
        if required && matches!(answer, Answer::Judged { broken: true, .. }) {
            self.fact(Self::subject(Kind::Oscillation, Some(number), None, Some(moment)), true, None);
        }
        self.answer(number, answer);
    }

    pub(super) fn before_rest(&mut self, number: u32, question: &Question) {
        let moment = question.moment.expect("a moment");
        let Some(window) = self.window_of(moment).map(|window| &self.windows[window]) else { return };
        let broken = !window.began_at_rest;
        if broken {
            self.fact(Self::subject(Kind::BeforeRest, Some(number), None, Some(moment)), true, None);
        }
        self.answer(number, Answer::Judged { broken, slack: None });
    }
}

/// More than the one change, or none, that is wanted.
fn is_glitch(before: Value, moves: &[Move]) -> bool {
    let after = moves.last().map_or(before, |it| it.new);
    moves.len() > usize::from(after != before)
}

/// What is left of some transitions when pulses shorter than the bound are struck out, narrowest first, at equal width
/// the earlier; and the widest pulse that must go before it is no glitch.
fn strike_out(before: Value, moves: &[Move], bound: u64) -> (Vec<Move>, Option<u64>) {
    let mut left = moves.to_vec();
    let (mut kept, mut widest) = (None, None);
    while is_glitch(before, &left) {
        let width = |it: usize| left[it].at - left[it - 1].at;
        let narrowest = (1..left.len()).min_by_key(|it| (width(*it), *it)).expect("a glitch has a pulse");
        if width(narrowest) >= bound && kept.is_none() {
            kept = Some(left.clone());
        }
        widest = Some(width(narrowest));
        left.drain(narrowest - 1..=narrowest);
    }
    (kept.unwrap_or(left), widest)
}

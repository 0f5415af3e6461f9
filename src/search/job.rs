//! The search of one question: where to start, what to follow, when to stop.

use rand::Rng;
use rand::RngExt;

use super::bench::{BLIND, Bench, Guide, Score, Shared, Shown, breach, samples};
use super::firm::{Firm, MOVED};
use super::meetings::Meeting;
use super::report::{Ended, Guidance, Searched};
use super::{LEAST, Stray};
use crate::findings::RuleKey;
use crate::instance::Numbers;
use crate::time::Span;

/// Starts that are drawn.
const DRAWN: usize = 4;
/// Cases drawn where nothing guides.
const CHANCE: u64 = 64;
/// Starts from which a question's own number is followed.
const FOLLOWED: usize = 3;
/// Meetings that are followed.
const MEETINGS: usize = 8;

/// The worst case met.
struct Worst {
    numbers: Numbers,
    shown: Shown,
}

/// The search of one question.
pub(super) struct Job<'a> {
    pub bench: Bench<'a>,
    /// The worst breach that was told from a tie, and the worst of all.
    firm: Option<Worst>,
    broken: Option<Worst>,
    /// The least slack of cases that did not break it.
    slack: Option<Worst>,
    apart: Option<i64>,
    from_rest: Option<i64>,
    ties: u64,
    /// Nothing worse can be told apart.
    pub done: bool,
}

/// Searches one question; with it, what was met on the way that breaks others.
pub(super) fn search_one(shared: &Shared<'_>, question: u32) -> (Searched, Vec<Stray>) {
    let rule = &shared.sweep.rules[question as usize];
    let mut searched = Searched::unsearched(question, rule);
    let mut job = Job {
        bench: Bench::new(shared, question),
        firm: None,
        broken: None,
        slack: None,
        apart: None,
        from_rest: None,
        ties: 0,
        done: false,
    };
    // room for the last breach, and for one that another question's search meets
    let kept = (2 * (MOVED + 1)).min(shared.budget);
    job.bench.stop = shared.budget - kept;
    searched.guidance = job.work();
    let short = job.bench.left() == 0;
    job.bench.stop = shared.budget - (MOVED + 1).min(shared.budget);
    job.settle();
    searched.ended = match searched.guidance {
        _ if shared.control.cancelled() => Ended::Interrupted,
        _ if job.done => Ended::Found,
        _ if short => Ended::Budget,
        Guidance::Nothing => Ended::NoGuide,
        _ => Ended::NoMove,
    };
    searched.ties = job.ties;
    searched.runs = job.bench.runs;
    let worst = job.firm.take().or(job.slack.take());
    if let Some(Worst { numbers, shown }) = worst {
        job.tell(&mut searched, &numbers, &shown);
    }
    (searched, job.bench.strays)
}

/// Gives a question a breach that another question's search met, if it is more than a tie.
pub(super) fn adopt(shared: &Shared<'_>, searched: &mut Searched, numbers: &Numbers) {
    let mut job = Job {
        bench: Bench::new(shared, searched.question),
        firm: None,
        broken: None,
        slack: None,
        apart: None,
        from_rest: None,
        ties: 0,
        done: false,
    };
    job.bench.runs = searched.runs;
    let Some(shown) = job.bench.try_numbers(numbers) else { return };
    job.note(numbers, shown);
    searched.ties += job.ties;
    searched.runs = job.bench.runs;
    if let Some(Worst { numbers, shown }) = job.firm.take() {
        searched.ended = if searched.ended == Ended::NoBudget { Ended::Found } else { searched.ended };
        job.tell(searched, &numbers, &shown);
    }
}

impl<'a> Job<'a> {
    /// Tries all starts, then descends from the best of them. The result says what guided it.
    fn work(&mut self) -> Guidance {
        let mut tried: Vec<(Numbers, Shown)> = Vec::new();
        let mut meetings: Vec<(Meeting, usize)> = Vec::new();
        for numbers in self.starts() {
            if tried.iter().any(|(other, _)| *other == numbers) {
                continue;
            }
            let Some(shown) = self.bench.try_numbers(&numbers) else { break };
            let near = self.bench.meetings();
            let at = tried.len();
            meetings.extend(near.into_iter().map(|meeting| (meeting, at)));
            self.note(&numbers, shown);
            tried.push((numbers, shown));
        }
        let guide = match self.bench.question.rule {
            RuleKey::Never => Guide::Apart,
            RuleKey::BeforeRest => Guide::FromRest,
            _ => Guide::Margin,
        };
        let mut own: Vec<(Score, usize)> = Vec::new();
        for (at, (_, shown)) in tried.iter().enumerate() {
            let score = self.bench.score(shown, &guide);
            if score != BLIND {
                own.push((score, at));
            }
        }
        own.sort_unstable();
        own.truncate(FOLLOWED);
        // of each gate and direction the nearest
        meetings.sort_unstable();
        let mut followed: Vec<(Meeting, usize)> = Vec::new();
        for (meeting, at) in meetings {
            if followed.len() < MEETINGS && !followed.iter().any(|(other, _)| other.same(&meeting)) {
                followed.push((meeting, at));
            }
        }
        let guidance = match (own.is_empty(), followed.is_empty()) {
            (true, true) => {
                for _ in 0..CHANCE {
                    let numbers = self.drawn();
                    let Some(shown) = self.bench.try_numbers(&numbers) else { break };
                    self.note(&numbers, shown);
                }
                return Guidance::Nothing;
            }
            (true, false) => Guidance::Meetings,
            _ => Guidance::Margin,
        };
        let end = self.bench.stop;
        let mut descents: Vec<(Guide, usize)> = own.iter().map(|(_, at)| (guide, *at)).collect();
        descents.extend(followed.into_iter().map(|(meeting, at)| (Guide::Meeting(meeting), at)));
        for (number, (guide, at)) in descents.iter().enumerate() {
            // what is left is shared by those to come; a question's own number takes half
            let left = end.saturating_sub(self.bench.runs);
            let share = match guide {
                Guide::Meeting(_) => left.div_ceil((descents.len() - number) as u64),
                _ => left / 2,
            };
            self.bench.stop = self.bench.runs + share;
            let (numbers, shown) = &tried[*at];
            self.descend(numbers.clone(), shown, *guide);
        }
        self.bench.stop = end;
        match (guidance, guide) {
            (Guidance::Margin, Guide::Apart) => Guidance::Apart(self.apart.unwrap_or(0)),
            (Guidance::Margin, Guide::FromRest) => Guidance::Rest(self.from_rest.unwrap_or(0)),
            _ => guidance,
        }
    }

    /// Where it begins: the extremes of the sweep, typical, all least, all greatest, and some draws of its own.
    fn starts(&mut self) -> Vec<Numbers> {
        let (shared, question, number) = (self.bench.shared, self.bench.question, self.bench.number);
        let mut starts = Vec::new();
        for sample in samples(shared, question, number) {
            starts.push(self.bench.sample(sample));
        }
        starts.push(self.bench.cases.typical());
        starts.extend([0, u64::MAX].map(|number| self.bench.cases.all(number)));
        starts.extend((0..DRAWN).map(|_| self.drawn()));
        starts
    }

    /// A case drawn independently.
    fn drawn(&mut self) -> Numbers {
        let mut numbers = self.bench.cases.all(0);
        for i in 0..numbers.count() {
            numbers.set(i, self.bench.rng.next_u64());
        }
        numbers.rest_of = self.any_sample();
        numbers
    }

    /// The number of a sample, drawn.
    pub(super) fn any_sample(&mut self) -> u64 {
        self.bench.rng.random_range(0..1 << 62)
    }

    /// Tries a case: how near it is by a guide. `None` if no run is left.
    pub(super) fn tried(&mut self, numbers: &Numbers, guide: &Guide) -> Option<Score> {
        let shown = self.bench.try_numbers(numbers)?;
        let score = self.bench.score(&shown, guide);
        // a tie is no way on
        Some(if self.note(numbers, shown) { score } else { BLIND })
    }

    /// Is there nothing left to do?
    pub(super) fn is_over(&self) -> bool {
        self.done || self.bench.left() == 0
    }

    /// Takes note of what a case showed; false if it is only a tie.
    fn note(&mut self, numbers: &Numbers, shown: Shown) -> bool {
        if !shown.broken {
            let least = |ours: &mut Option<i64>, new: Option<i64>| {
                *ours = match (*ours, new) {
                    (Some(a), Some(b)) => Some(a.min(b)),
                    (a, b) => a.or(b),
                }
            };
            least(&mut self.apart, shown.apart);
            least(&mut self.from_rest, shown.from_rest);
            if shown.slack.is_some() && self.slack.as_ref().is_none_or(|it| shown.slack < it.shown.slack) {
                self.slack = Some(Worst { numbers: numbers.clone(), shown });
            }
            return true;
        }
        // the first breach is looked at closely at once, the worst in the end
        if self.firm.is_none() {
            match self.bench.confirm(numbers, shown) {
                Firm::Stands(numbers, shown) => {
                    self.done = shown.rank.is_none();
                    self.firm = Some(Worst { numbers, shown });
                }
                Firm::Tie => {
                    self.ties += 1;
                    return false;
                }
                Firm::Untold => {}
            }
        }
        if self.broken.as_ref().is_none_or(|it| shown.rank > it.shown.rank) {
            self.broken = Some(Worst { numbers: numbers.clone(), shown });
        }
        true
    }

    /// The worst breach takes the place of the first that stood, if it stands as well.
    fn settle(&mut self) {
        let Some(broken) = self.broken.take() else { return };
        if self.firm.as_ref().is_some_and(|firm| firm.shown.rank >= broken.shown.rank) {
            return;
        }
        match self.bench.confirm(&broken.numbers, broken.shown) {
            Firm::Stands(numbers, shown) => {
                if self.firm.as_ref().is_none_or(|firm| firm.shown.rank < shown.rank) {
                    self.firm = Some(Worst { numbers, shown });
                }
            }
            Firm::Tie => self.ties += 1,
            Firm::Untold => {}
        }
    }

    /// Writes the worst case into the result, with its breach if it is one.
    fn tell(&mut self, searched: &mut Searched, numbers: &Numbers, shown: &Shown) {
        let bound = self.bench.question.bound;
        let has_number = bound.is_none_or(|bound| bound > Span::ZERO);
        searched.margin = shown.slack.map(i128::from).filter(|_| has_number);
        let worse = match (searched.margin, searched.start_margin) {
            (Some(ours), Some(draws)) => ours < draws,
            (ours, draws) => ours.is_some() && draws.is_none(),
        };
        if !shown.broken && !worse {
            return;
        }
        let instance = self.bench.case(numbers);
        if shown.broken {
            searched.breach = breach(self.bench.shared, searched.question, &instance);
        }
        searched.case = Some(Box::new(instance));
    }
}

// a question of fewer runs could not try its starts and confirm what it finds
const _: () = assert!(LEAST > 4 * (MOVED + 1));

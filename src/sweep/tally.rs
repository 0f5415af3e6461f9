//! The tally of many runs: integers only, mergeable in any split and order.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use super::envelope::Envelope;
use super::lowest::Lowest;
use super::margins::Margins;
use super::seen::{Key, Seen, mix};
use super::spread::Spread;
use super::waiting::{Waiting, note};
use crate::engine::{End, Hit};
use crate::findings::{Asked, Departed, Departure, Fact, Measure, Reason, Routine, Seen as SeenWindow, Sink, Subject};
use crate::logic::State;
use crate::scenario::Scenario;

/// From which state to which: the state before a step, and the settled one.
#[derive(Clone, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Passage {
    /// Before.
    pub before: Option<State>,
    /// Settled.
    pub after: State,
}

fn hash_state(hash: u64, state: &State) -> u64 {
    state.ones.words().iter().chain(state.unknown.words()).fold(hash, |hash, word| mix(hash, *word))
}

/// What is kept of too many passages is decided by the state before alone: of each, all outcomes are kept or none.
impl Key for Passage {
    fn hash(&self) -> u64 {
        self.before.as_ref().map_or(1, |before| hash_state(2, before))
    }
}

impl Passage {
    /// A hash of both states.
    pub(super) fn mark(&self) -> u64 {
        hash_state(self.hash(), &self.after)
    }
}

impl Key for State {
    fn hash(&self) -> u64 {
        hash_state(3, self)
    }
}

/// An order of loop nets in one passage. Of each passage all orders are kept or none.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Order {
    /// [`Passage::mark`].
    pub passage: u64,
    /// A hash of the order.
    pub order: u64,
}

impl Key for Order {
    fn hash(&self) -> u64 {
        mix(0, self.passage)
    }
}

/// What happened in the windows of one moment.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct WindowTally {
    /// Samples in which the moment came.
    pub reached: u64,
    /// Samples in which it named the window.
    pub named: u64,
    /// Windows by how they ended.
    pub settled: u64,
    /// A limit ended them.
    pub unsettled: u64,
    /// By which limit, in the order of [`Hit::ALL`].
    pub hits: [u64; Hit::ALL.len()],
    /// They recurred.
    pub oscillating: u64,
    /// The next step ended them.
    pub cut: u64,
    /// Windows that began with events pending.
    pub began_before_rest: u64,
    /// Settled states.
    pub outcomes: Seen<State>,
    /// Settled states of windows that began at rest, by the state before.
    pub passages: Seen<Passage>,
    /// Orders of loop nets in them.
    pub orders: Seen<Order>,
    /// Of these, states that the reference does not allow, as the samples came to them.
    pub astray: Seen<State>,
    /// The lowest sample that came to one, and how.
    pub departed: Option<(u64, Departure)>,
    /// Settling times of settled windows.
    pub settling: Spread,
    /// Lengths of cut windows.
    pub cut_after: Spread,
}

/// Answers to one question.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct RowTally {
    /// Samples judged.
    pub judged: u64,
    /// Samples that broke it.
    pub broken: u64,
    /// Samples not judged, by [`Reason::ALL`].
    pub not_judged: [u64; Reason::ALL.len()],
    /// The worst slack, and the lowest sample with it.
    pub margin: Option<(i64, u64)>,
    /// The worst slack of each sample that has one.
    pub margins: Margins,
}

/// How often something was found.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct FactTally {
    /// Does it break a rule?
    pub breaks_rule: bool,
    /// Samples that show it.
    pub count: u64,
    /// The lowest of them.
    pub first: u64,
    /// The lowest of them, where it breaks a rule: those that are compared with samples that do not show it.
    pub lowest: Lowest,
    /// The worst measure, and the lowest sample with it.
    pub worst: Option<(Measure, u64)>,
    /// Boards that ever show it; only complete boards, and only with several tries a board.
    pub boards_failing: u64,
    /// Samples that show it on the worst board, and the tries of that board.
    pub worst_board: (u64, u64),
    /// Samples that show it on all complete boards, and the tries of the boards that ever show it.
    pub on_boards: (u64, u64),
}

/// A board of which not all tries are in yet.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct PartBoard {
    samples: u64,
    #[serde(with = "super::pairs")]
    facts: BTreeMap<Subject, u64>,
}

/// The tally of some samples of a sweep.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Tally {
    /// Samples in it.
    pub samples: u64,
    /// Samples that broke a rule by themselves; a race is a difference between samples and counts in none.
    pub failing: u64,
    /// One a moment.
    pub windows: Vec<WindowTally>,
    /// One a question.
    pub rows: Vec<RowTally>,
    /// What was found.
    #[serde(with = "super::pairs")]
    pub facts: BTreeMap<Subject, FactTally>,
    /// Complete boards in it, with several tries a board.
    pub boards: u64,
    /// Between which times each edge came; `None` if that was not asked for.
    pub envelope: Option<Envelope>,
    pub(super) planned: u64,
    pub(super) tries: u64,
    #[serde(with = "super::pairs")]
    pub(super) part_boards: BTreeMap<u64, PartBoard>,
    #[serde(skip)]
    sample: u64,
    #[serde(skip)]
    has_failed: bool,
    #[serde(skip)]
    board: Option<u64>,
    #[serde(skip)]
    waiting: Waiting,
}

fn merge_worst<T: Ord + Copy>(ours: &mut Option<(T, u64)>, theirs: Option<(T, u64)>, worse: fn(&T, &T) -> bool) {
    let Some(new) = theirs else { return };
    match ours {
        Some(old) if !(worse(&new.0, &old.0) || (new.0 == old.0 && new.1 < old.1)) => {}
        _ => *ours = Some(new),
    }
}

impl WindowTally {
    fn new() -> WindowTally {
        WindowTally {
            reached: 0,
            named: 0,
            settled: 0,
            unsettled: 0,
            hits: [0; Hit::ALL.len()],
            oscillating: 0,
            cut: 0,
            began_before_rest: 0,
            outcomes: Seen::default(),
            passages: Seen::default(),
            orders: Seen::default(),
            astray: Seen::default(),
            departed: None,
            settling: Spread::new(),
            cut_after: Spread::new(),
        }
    }

    /// Windows that settled.
    fn passed(&mut self, passage: &Passage, order: u64, count: u64, first: u64) {
        self.outcomes.add(&passage.after, count, first);
        if passage.before.is_none() {
            return;
        }
        self.passages.add(passage, count, first);
        self.orders.add(&Order { passage: passage.mark(), order }, count, first);
    }

    fn merge(&mut self, other: &WindowTally) {
        self.reached += other.reached;
        self.named += other.named;
        self.settled += other.settled;
        self.unsettled += other.unsettled;
        for (ours, theirs) in self.hits.iter_mut().zip(other.hits) {
            *ours += theirs;
        }
        self.oscillating += other.oscillating;
        self.cut += other.cut;
        self.began_before_rest += other.began_before_rest;
        self.outcomes.merge(&other.outcomes);
        self.passages.merge(&other.passages);
        self.orders.merge(&other.orders);
        self.astray.merge(&other.astray);
        if let Some((sample, departure)) = &other.departed
            && self.departed.as_ref().is_none_or(|ours| *sample < ours.0)
        {
            self.departed = Some((*sample, departure.clone()));
        }
        self.settling.merge(&other.settling);
        self.cut_after.merge(&other.cut_after);
    }
}

impl FactTally {
    fn new(breaks_rule: bool) -> FactTally {
        let worst_board = (0, 1);
        FactTally {
            breaks_rule,
            count: 0,
            first: u64::MAX,
            lowest: Lowest::default(),
            worst: None,
            boards_failing: 0,
            worst_board,
            on_boards: (0, 0),
        }
    }

    fn board(&mut self, failing: u64, tries: u64) {
        self.boards_failing += 1;
        self.on_boards = (self.on_boards.0 + failing, self.on_boards.1 + tries);
        self.worse_board(failing, tries);
    }

    fn worse_board(&mut self, failing: u64, tries: u64) {
        let (worst, of) = self.worst_board;
        // of equal shares the longer board, so that the order of a merge cannot show
        let share = u128::from(failing) * u128::from(of);
        if (share, failing) > (u128::from(worst) * u128::from(tries), worst) {
            self.worst_board = (failing, tries);
        }
    }

    fn merge(&mut self, other: &FactTally) {
        self.count += other.count;
        self.first = self.first.min(other.first);
        self.lowest.merge(&other.lowest);
        merge_worst(&mut self.worst, other.worst, |new, old| new > old);
        self.boards_failing += other.boards_failing;
        self.on_boards = (self.on_boards.0 + other.on_boards.0, self.on_boards.1 + other.on_boards.1);
        if other.boards_failing > 0 {
            self.worse_board(other.worst_board.0, other.worst_board.1);
        }
    }
}

impl Tally {
    /// An empty tally for a scenario and what it asks.
    pub fn new(scenario: &Scenario, asked: &Asked) -> Tally {
        Tally {
            samples: 0,
            failing: 0,
            windows: scenario.stimulus.moments.iter().map(|_| WindowTally::new()).collect(),
            rows: vec![RowTally::default(); asked.questions.len()],
            facts: BTreeMap::new(),
            boards: 0,
            envelope: None,
            planned: scenario.plan.samples,
            tries: scenario.plan.tries,
            part_boards: BTreeMap::new(),
            sample: 0,
            has_failed: false,
            board: None,
            waiting: Waiting::new(scenario.circuit.net_count(), scenario.stimulus.moments.len(), asked.questions.len()),
        }
    }

    /// The same, which also keeps between which times each edge came.
    pub fn with_envelope(scenario: &Scenario, asked: &Asked) -> Tally {
        Tally { envelope: Some(Envelope::new(scenario)), ..Tally::new(scenario, asked) }
    }

    /// The next answers are those of this sample. Samples of one tally come in rising order.
    pub fn begin(&mut self, sample: u64) {
        self.sample = sample;
        self.has_failed = false;
        self.samples += 1;
        if self.tries > 1 {
            let board = sample / self.tries;
            if self.board != Some(board) {
                self.end_board();
                self.board = Some(board);
            }
            self.part_boards.entry(board).or_default().samples += 1;
        }
    }

    /// All samples are in: what waits is added.
    pub fn finish(&mut self) {
        self.end_board();
        (self.sample, self.has_failed) = (0, false);
        for moment in 0..self.waiting.moments.len() {
            self.add_streak(moment);
            self.add_settling(moment);
            self.add_cut_after(moment);
            let routine = std::mem::take(&mut self.waiting.moments[moment].routine);
            let window = &mut self.windows[moment];
            window.reached += routine;
            window.named += routine;
            window.settled += routine;
            for question in &self.waiting.questions[moment] {
                self.waiting.kept[*question as usize] += routine;
            }
        }
        for (row, kept) in self.rows.iter_mut().zip(&mut self.waiting.kept) {
            row.judged += std::mem::take(kept);
        }
    }

    /// A window that settled with no X, and with none before where that state is known.
    #[inline]
    fn passed(&mut self, moment: usize, before: Option<&State>, after: &State, order: u64) {
        if !self.waiting.goes_on(moment, before, after, order) {
            self.add_streak(moment);
            self.waiting.begin(moment, before, after, order, self.sample);
        }
    }

    fn add_streak(&mut self, moment: usize) {
        if let Some((passage, order, count, first)) = self.waiting.take(moment) {
            self.windows[moment].passed(passage, order, count, first);
        }
    }

    #[cold]
    fn add_settling(&mut self, moment: usize) {
        self.windows[moment].settling.add_all(&mut self.waiting.moments[moment].settling);
    }

    #[cold]
    fn add_cut_after(&mut self, moment: usize) {
        self.windows[moment].cut_after.add_all(&mut self.waiting.cut_after[moment]);
    }

    fn end_board(&mut self) {
        if let Some(board) = self.board.take() {
            self.fold_board(board);
        }
    }

    /// Counts a board of which all tries are in.
    fn fold_board(&mut self, board: u64) {
        let tries = self.tries.min(self.planned.saturating_sub(board * self.tries));
        if self.part_boards.get(&board).is_none_or(|part| part.samples < tries) {
            return;
        }
        let Some(part) = self.part_boards.remove(&board) else { return };
        self.boards += 1;
        for (subject, count) in part.facts {
            if let Some(fact) = self.facts.get_mut(&subject) {
                fact.board(count, part.samples);
            }
        }
    }

    /// Adds the finished tally of other samples of the same sweep, which is taken as it is where there is none yet.
    pub(super) fn absorb(&mut self, other: Tally) {
        match self.samples {
            0 => *self = Tally { waiting: Waiting::default(), ..other },
            _ => self.merge(&other),
        }
    }

    /// Adds the finished tally of other samples of the same sweep. Where one of the two has no envelope there is none: it
    /// would be one of some samples only.
    pub fn merge(&mut self, other: &Tally) {
        match (&mut self.envelope, &other.envelope) {
            (Some(ours), Some(theirs)) => ours.merge(theirs),
            _ => self.envelope = None,
        }
        self.samples += other.samples;
        self.failing += other.failing;
        for (ours, theirs) in self.windows.iter_mut().zip(&other.windows) {
            ours.merge(theirs);
        }
        for (ours, theirs) in self.rows.iter_mut().zip(&other.rows) {
            ours.judged += theirs.judged;
            ours.broken += theirs.broken;
            for (ours, theirs) in ours.not_judged.iter_mut().zip(&theirs.not_judged) {
                *ours += theirs;
            }
            merge_worst(&mut ours.margin, theirs.margin, |new, old| new < old);
            ours.margins.merge(&theirs.margins);
        }
        for (subject, theirs) in &other.facts {
            self.facts.entry(*subject).or_insert_with(|| FactTally::new(theirs.breaks_rule)).merge(theirs);
        }
        self.boards += other.boards;
        for (board, theirs) in &other.part_boards {
            let ours = self.part_boards.entry(*board).or_default();
            ours.samples += theirs.samples;
            for (subject, count) in &theirs.facts {
                *ours.facts.entry(*subject).or_insert(0) += count;
            }
            self.fold_board(*board);
        }
    }
}

impl Sink for Tally {
    fn judged(&mut self, question: u32, broken: bool, slack: Option<i64>) {
        let row = &mut self.rows[question as usize];
        row.judged += 1;
        row.broken += u64::from(broken);
        if let Some(slack) = slack {
            merge_worst(&mut row.margin, Some((slack, self.sample)), |new, old| new < old);
            row.margins.add(slack);
        }
    }

    fn not_judged(&mut self, question: u32, reason: Reason) {
        self.rows[question as usize].not_judged[reason as usize] += 1;
    }

    fn fact(&mut self, fact: Fact) {
        if fact.breaks_rule && !std::mem::replace(&mut self.has_failed, true) {
            self.failing += 1;
        }
        let tally = self.facts.entry(fact.subject).or_insert_with(|| FactTally::new(fact.breaks_rule));
        tally.count += 1;
        tally.first = tally.first.min(self.sample);
        if fact.breaks_rule {
            tally.lowest.add(self.sample);
        }
        merge_worst(&mut tally.worst, fact.measure.map(|measure| (measure, self.sample)), |new, old| new > old);
        if let Some(board) = self.board {
            *self.part_boards.entry(board).or_default().facts.entry(fact.subject).or_insert(0) += 1;
        }
    }

    fn departed(&mut self, departed: &Departed<'_>) {
        let window = &mut self.windows[departed.moment as usize];
        window.astray.add(departed.reached, 1, self.sample);
        if window.departed.as_ref().is_none_or(|first| self.sample < first.0) {
            window.departed = Some((self.sample, departed.kept()));
        }
    }

    fn reached(&mut self, moment: u32, named: bool) {
        let window = &mut self.windows[moment as usize];
        window.reached += 1;
        window.named += u64::from(named);
    }

    fn window(&mut self, seen: &SeenWindow<'_>) {
        let (moment, sample) = (seen.moment as usize, self.sample);
        let window = &mut self.windows[moment];
        window.began_before_rest += u64::from(!seen.began_at_rest);
        match seen.end {
            End::Settled => {
                window.settled += 1;
                if seen.state.has_unknown() || seen.before.is_some_and(State::has_unknown) {
                    let passage = Passage { before: seen.before.cloned(), after: seen.state.clone() };
                    window.passed(&passage, seen.order, 1, sample);
                } else {
                    self.passed(moment, seen.before, seen.state, seen.order);
                }
                if note(&mut self.waiting.moments[moment].settling, seen.time.fs()) {
                    self.add_settling(moment);
                }
            }
            End::Oscillating { .. } => window.oscillating += 1,
            End::Unsettled(hit) => {
                window.unsettled += 1;
                window.hits[hit as usize] += 1;
            }
            End::Cut => {
                window.cut += 1;
                if note(&mut self.waiting.cut_after[moment], seen.time.fs()) {
                    self.add_cut_after(moment);
                }
            }
        }
    }

    #[inline]
    fn kept(&mut self, question: u32) {
        self.waiting.kept[question as usize] += 1;
    }

    #[inline]
    fn routine(&mut self, it: &Routine<'_>) {
        let moment = it.moment as usize;
        let waiting = &mut self.waiting.moments[moment];
        if waiting.routine == 0 {
            self.waiting.questions[moment] = it.questions.to_vec();
        }
        waiting.routine += 1;
        if note(&mut waiting.settling, it.time.fs()) {
            self.add_settling(moment);
        }
        self.passed(moment, Some(it.before), it.state, it.order);
    }
}

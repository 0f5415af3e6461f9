//! What a tally has heard and not yet added: most samples do what the last one did, so most of a tally is counting how
//! often the same came again.
//!
//! What is touched window by window is small and lies together: the tally itself would not stay in the nearest cache of a
//! processor if every window of a long scenario touched its maps.

use super::tally::Passage;
use crate::logic::{Bits, State};

/// Times that wait for a spread, up to which they are only written down; well above the number of different values that
/// a spread keeps exactly, so that times that all differ never pass through that form.
const TIMES: usize = 2048;

/// What waits to be added to a tally.
#[derive(Clone, Debug, Default)]
pub(super) struct Waiting {
    /// For each question how often it was kept, where there is no number.
    pub kept: Vec<u64>,
    /// For each moment.
    pub moments: Vec<Moment>,
    /// For each moment the questions that its routine windows keep.
    pub questions: Vec<Vec<u32>>,
    /// Lengths of cut windows of each moment.
    pub cut_after: Vec<Vec<u64>>,
    /// For each moment the nets at 1 before and after its streak; no net is X.
    states: Vec<u64>,
    /// Words of a state.
    words: usize,
    /// Passages to look up: without a state before, and with one.
    passages: [Passage; 2],
}

/// Nothing that waits is part of what a tally says.
impl PartialEq for Waiting {
    fn eq(&self, _: &Waiting) -> bool {
        true
    }
}

/// What waits of the windows of one moment.
#[derive(Clone, Debug, Default)]
pub(super) struct Moment {
    /// Windows that were routine.
    pub routine: u64,
    /// The streak: windows that led from the same state to the same state in the same order, one after the other.
    pub count: u64,
    /// The first sample of the streak, its lowest.
    pub first: u64,
    pub order: u64,
    /// Is the state before known?
    pub has_before: bool,
    /// Settling times.
    pub settling: Vec<u64>,
}

/// Are states equal? For the one word of a small circuit a call would cost more than it compares.
#[inline]
fn same(a: &[u64], b: &[u64]) -> bool {
    match (a, b) {
        ([a], [b]) => a == b,
        _ => a == b,
    }
}

impl Waiting {
    /// Nothing waits.
    pub fn new(nets: usize, moments: usize, questions: usize) -> Waiting {
        let words = Bits::zeros(nets).words().len();
        Waiting {
            kept: vec![0; questions],
            moments: vec![Moment::default(); moments],
            questions: vec![Vec::new(); moments],
            cut_after: vec![Vec::new(); moments],
            states: vec![0; 2 * words * moments],
            words,
            passages: [None, Some(State::zeros(nets))].map(|before| Passage { before, after: State::zeros(nets) }),
        }
    }

    /// A window with no X after, and none before where that state is known; is it one more of the moment's streak?
    #[inline]
    pub fn goes_on(&mut self, moment: usize, before: Option<&State>, after: &State, order: u64) -> bool {
        let (from, words) = (2 * self.words * moment, self.words);
        let (was, is) = self.states[from..from + 2 * words].split_at(words);
        let streak = &mut self.moments[moment];
        let goes_on = streak.count > 0
            && streak.order == order
            && streak.has_before == before.is_some()
            && before.is_none_or(|before| same(was, before.ones.words()))
            && same(is, after.ones.words());
        streak.count += u64::from(goes_on);
        goes_on
    }

    /// Another streak begins with this window; what waited of the last one was taken.
    pub fn begin(&mut self, moment: usize, before: Option<&State>, after: &State, order: u64, sample: u64) {
        let from = 2 * self.words * moment;
        let (was, is) = self.states[from..from + 2 * self.words].split_at_mut(self.words);
        if let Some(before) = before {
            was.copy_from_slice(before.ones.words());
        }
        is.copy_from_slice(after.ones.words());
        let streak = &mut self.moments[moment];
        (streak.count, streak.first, streak.order, streak.has_before) = (1, sample, order, before.is_some());
    }

    /// Takes the streak of a moment: its passage, and the order, number and lowest sample of its windows.
    pub fn take(&mut self, moment: usize) -> Option<(&Passage, u64, u64, u64)> {
        let streak = &mut self.moments[moment];
        let count = std::mem::take(&mut streak.count);
        if count == 0 {
            return None;
        }
        let from = 2 * self.words * moment;
        let (was, is) = self.states[from..from + 2 * self.words].split_at(self.words);
        let passage = &mut self.passages[usize::from(streak.has_before)];
        if let Some(before) = &mut passage.before {
            before.ones.words_mut().copy_from_slice(was);
        }
        passage.after.ones.words_mut().copy_from_slice(is);
        Some((passage, streak.order, count, streak.first))
    }
}

/// Writes down a time; is it time to add them up?
#[inline]
pub(super) fn note(times: &mut Vec<u64>, fs: u64) -> bool {
    times.push(fs);
    times.len() == TIMES
}

//! What is wrong with a scenario, and what would be right.

use std::fmt;
use std::ops::Range;

use crate::scenario::Mark;
use crate::time::TimeError;

/// Most faults that one list holds; what is beyond is only counted.
pub const MAX_FAULTS: usize = 1000;

/// One thing that is wrong, with its remedy.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fault {
    /// Where it was said.
    pub mark: Mark,
    /// What is wrong: one sentence without a full stop.
    pub message: String,
    /// What would be right: one sentence without a full stop.
    pub help: String,
    /// Other places that play a part, each with what is to be seen there.
    pub related: Vec<(Mark, String)>,
    /// The wrong part of the text at `mark` (bytes of that text), where it is only a part: of an expression, for one.
    pub at: Option<Range<usize>>,
}

impl Fault {
    /// A fault with its remedy.
    pub fn new(mark: Mark, message: impl Into<String>, help: impl Into<String>) -> Fault {
        Fault { mark, message: message.into(), help: help.into(), related: Vec::new(), at: None }
    }

    /// The fault of a text that is no time.
    pub fn time(mark: Mark, error: &TimeError) -> Fault {
        let text = error.to_string();
        match text.split_once("; ") {
            Some((message, help)) => Fault::new(mark, message, help),
            None => Fault::new(mark, text, "round it to whole femtoseconds"),
        }
    }

    /// Adds another place and what is to be seen there.
    pub fn related(mut self, mark: Mark, label: impl Into<String>) -> Fault {
        self.related.push((mark, label.into()));
        self
    }

    /// Narrows the fault to these bytes of the text at its mark.
    pub fn within(mut self, at: Range<usize>) -> Fault {
        self.at = Some(at);
        self
    }
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}; {}", self.message, self.help)
    }
}

impl std::error::Error for Fault {}

/// A list of faults that stops growing at [`MAX_FAULTS`], so that no file can make it a burden.
#[derive(Clone, Debug, Default)]
pub struct Faults {
    list: Vec<Fault>,
    dropped: usize,
}

impl Faults {
    /// Adds a fault.
    pub fn push(&mut self, fault: Fault) {
        if self.list.len() < MAX_FAULTS {
            self.list.push(fault);
        } else {
            self.dropped += 1;
        }
    }

    /// Adds a fault made of its parts.
    pub fn add(&mut self, mark: Mark, message: impl Into<String>, help: impl Into<String>) {
        self.push(Fault::new(mark, message, help));
    }

    /// Adds all faults of another list.
    pub fn append(&mut self, other: Faults) {
        self.dropped += other.dropped;
        other.list.into_iter().for_each(|fault| self.push(fault));
    }

    /// No fault?
    pub fn is_empty(&self) -> bool {
        self.list.is_empty()
    }

    /// The faults; the last one tells of those that were only counted.
    pub fn into_vec(mut self) -> Vec<Fault> {
        if self.dropped > 0 {
            let mark = self.list.last().map_or(Mark::default(), |last| last.mark);
            let message = format!("{} more faults are not listed", self.dropped);
            self.list.push(Fault::new(mark, message, "correct those above first"));
        }
        self.list
    }
}

/// The candidate that is most like a word, if one is like enough: at most a third of the letters
/// differ (one letter of short words).
pub fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    const LONGEST: usize = 64;
    let word: Vec<char> = word.chars().take(LONGEST + 1).collect();
    if word.len() > LONGEST {
        return None;
    }
    let allowed = (word.len() / 3).max(1);
    let mut best: Option<(usize, &str)> = None;
    for candidate in candidates {
        let limit = best.map_or(allowed, |(distance, _)| distance.saturating_sub(1));
        if candidate.len() > 4 * LONGEST {
            continue;
        }
        if let Some(distance) = distance_within(&word, candidate, limit)
            && distance < word.len().max(candidate.len())
        {
            best = Some((distance, candidate));
            if distance == 0 {
                break;
            }
        }
    }
    best.map(|(_, candidate)| candidate)
}

/// Names that may still be compared in search of likely ones: a text full of wrong names must not take quadratic time.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Comparisons(usize);

impl Default for Comparisons {
    fn default() -> Comparisons {
        Comparisons(2_000_000)
    }
}

impl Comparisons {
    /// The [`nearest`] of some names, as long as so many names may still be compared.
    pub fn nearest<'a>(&mut self, word: &str, names: impl ExactSizeIterator<Item = &'a str>) -> Option<&'a str> {
        self.0 = self.0.checked_sub(names.len())?;
        nearest(word, names)
    }
}

/// The number of letters to insert, delete, replace or swap with their neighbour (each letter once), if it is at most
/// `limit`. Case does not count.
fn distance_within(word: &[char], other: &str, limit: usize) -> Option<usize> {
    let same = |a: char, b: char| a.eq_ignore_ascii_case(&b);
    let other: Vec<char> = other.chars().collect();
    if word.len().abs_diff(other.len()) > limit {
        return None;
    }
    let mut before: Vec<usize> = Vec::new();
    let mut last: Vec<usize> = (0..=other.len()).collect();
    for (i, &a) in word.iter().enumerate() {
        let mut row = vec![i + 1];
        for (j, &b) in other.iter().enumerate() {
            let mut least = (last[j] + usize::from(!same(a, b))).min(last[j + 1] + 1).min(row[j] + 1);
            if i > 0 && j > 0 && same(a, other[j - 1]) && same(word[i - 1], b) {
                least = least.min(before[j - 1] + 1);
            }
            row.push(least);
        }
        if row.iter().all(|cost| *cost > limit) {
            return None;
        }
        before = std::mem::replace(&mut last, row);
    }
    last.last().copied().filter(|distance| *distance <= limit)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_nearest_name_is_found() {
        let names = ["hold_upper", "hold_lower", "open_upper", "q", "qn"];
        assert_eq!(nearest("hold_uper", names), Some("hold_upper"));
        assert_eq!(nearest("hodl_lower", names), Some("hold_lower"));
        assert_eq!(nearest("Q", names), Some("q"));
        assert_eq!(nearest("qnn", names), Some("qn"));
        assert_eq!(nearest("horn", names), None);
        assert_eq!(nearest("bq", ["b", "c"]), Some("b"));
        assert_eq!(nearest("b", ["c", "d"]), None, "one letter for another is no likeness");
        assert_eq!(nearest("", ["q"]), None);
        assert_eq!(nearest(&"x".repeat(100_000), names), None);
    }

    #[test]
    fn a_list_of_faults_stays_small() {
        let mut faults = Faults::default();
        (0..5000).for_each(|i| faults.add(Mark(i), "wrong", "make it right"));
        let list = faults.into_vec();
        assert_eq!(list.len(), MAX_FAULTS + 1);
        assert_eq!(list[MAX_FAULTS].message, "4000 more faults are not listed");
    }
}

//! Which runs of a review get a picture, and how: for the files and for the page alike.

use std::collections::BTreeSet;

use super::bundle::unique;
use super::causes;
use super::waves::{Nets, Picture};
use crate::findings::Subject;
use crate::review::{Review, RunReport};
use crate::scenario::Scenario;
use crate::time::Time;

/// Most findings that get a picture of their failing case.
pub const MOST_PICTURES: usize = 12;
/// Of runs with more windows than this only what is around the finding is shown.
const WHOLE_RUN: usize = 8;
/// The stem of the files of the typical run.
pub(super) const TYPICAL: &str = "waves-typical";

/// The failing case of a finding, with its picture.
pub(super) struct Shown<'a> {
    /// The finding, by number in the sweep.
    pub finding: usize,
    /// Its worst case, run.
    pub run: &'a RunReport,
    /// The stem of its files; begins the ids in the picture, too.
    pub stem: String,
    pub picture: Picture<'a>,
}

/// The typical run, with may-change bands.
pub(super) fn typical<'a>(scenario: &'a Scenario, review: &'a Review) -> Option<(&'a RunReport, Picture<'a>)> {
    let run = review.typical.as_ref()?;
    Some((run, Picture::of_run(scenario, &review.asked, run, TYPICAL).with_bands(&review.sweep)))
}

/// The failing cases that were run, each with the typical run laid on it, those of the worst findings first, at most [`MOST_PICTURES`].
pub(super) fn shown<'a>(scenario: &'a Scenario, review: &'a Review) -> Vec<Shown<'a>> {
    let mut stems = BTreeSet::from([TYPICAL.to_string()]);
    let mut shown: Vec<&(usize, RunReport)> =
        review.shown.iter().filter(|(finding, _)| *finding < review.sweep.findings.len()).collect();
    shown.sort_by_key(|it| it.0);
    shown.truncate(MOST_PICTURES);
    let one = |(finding, run): &'a (usize, RunReport)| {
        let subject = &review.sweep.findings[*finding].subject;
        let stem = unique(causes::stem(scenario, &review.asked, subject, "waves"), &mut stems);
        let why = review.why.get(*finding).and_then(Option::as_ref);
        let mut picture = Picture::of_run(scenario, &review.asked, run, &stem);
        picture.race = why.and_then(|why| why.race.clone());
        if picture.nets == Nets::All {
            picture.nets = Nets::Telling;
        }
        picture.range = picture.range.or_else(|| around(subject, run));
        if let Some(typical) = review.typical.as_ref().filter(|typical| typical.which != run.which) {
            picture = picture.against(typical);
        }
        Shown { finding: *finding, run, stem, picture }
    };
    shown.into_iter().map(one).collect()
}

/// The stretch of a long run in which a finding lies; `None` for a short run.
fn around(subject: &Subject, run: &RunReport) -> Option<(Time, Time)> {
    let windows = &run.trace.windows;
    if windows.len() <= WHOLE_RUN {
        return None;
    }
    let window = windows.iter().find(|window| Some(window.moment) == subject.moment)?;
    let place = run.facts.iter().find(|fact| fact.subject == *subject).and_then(|fact| fact.place);
    let (from, to) = place.unwrap_or((window.start, window.stop));
    let (from, to) = (from.min(window.start), to.max(window.stop));
    // something of before and after, so that edges at both ends can be seen
    let length = to.since(from).fs();
    let before = Time::from_fs(from.fs().saturating_sub(length / 3));
    Some((before, Time::from_fs(to.fs() + length / 12).min(run.trace.end.max(to))))
}

//! Which runs of a review get a picture, and how: for the files and for the page alike.

use std::collections::{BTreeMap, BTreeSet};

use super::bundle::unique;
use super::causes;
use super::waves::{Nets, Picture};
use crate::circuit::NetId;
use crate::findings::Subject;
use crate::review::{Review, RunReport};
use crate::scenario::Scenario;
use crate::time::Time;

/// Most findings that get a picture of their failing case.
pub const MOST_PICTURES: usize = 12;
/// Of runs with more windows than this only what is around the finding is shown.
const WHOLE_RUN: usize = 8;
/// Transitions of one net above which a picture shows only what is around the finding.
const DENSE: usize = 60;
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
    let place = run.facts.iter().find(|fact| fact.subject == *subject).and_then(|fact| fact.place);
    let window = windows.iter().find(|window| Some(window.moment) == subject.moment);
    let window = window.filter(|_| windows.len() > WHOLE_RUN).map(|window| {
        let (from, to) = place.unwrap_or((window.start, window.stop));
        (from.min(window.start), to.max(window.stop))
    });
    // something of before and after, so that edges at both ends can be seen
    let widened = |(from, to): (Time, Time), before: u64, after: (u64, u64)| {
        let length = to.since(from).fs();
        let end = Time::from_fs(to.fs().saturating_add((length / after.1).saturating_mul(after.0)));
        let from = Time::from_fs(from.fs().saturating_sub(length.saturating_mul(before) / 3));
        (from, end.min(run.trace.end.max(to)))
    };
    let range = window.map(|window| widened(window, 1, (1, 12)));
    let all = range.unwrap_or((Time::ZERO, run.trace.end));
    let range = match place {
        Some(place) if is_dense(run, all) => {
            let close = widened(place, 6, (1, 1));
            let much = all.1.since(all.0).fs() / 4;
            if place.1 > place.0 && close.1.since(close.0).fs() < much { Some(close) } else { range }
        }
        _ => range,
    };
    range.map(|(from, to)| round_outwards(from, to, run.trace.end))
}

/// A span of time with round ends, at most a tenth longer at each; what reaches the end stays there.
fn round_outwards(from: Time, to: Time, end: Time) -> (Time, Time) {
    let step = 10u64.pow(to.since(from).fs().checked_ilog10().unwrap_or(0).saturating_sub(1));
    let rounded = to.fs().checked_next_multiple_of(step).map_or(end, Time::from_fs);
    (Time::from_fs(from.fs() / step * step), if to >= end { to } else { rounded.min(end) })
}

/// Does some net change so often between these times that a reader cannot tell its transitions apart?
fn is_dense(run: &RunReport, (from, to): (Time, Time)) -> bool {
    let mut changes: BTreeMap<NetId, usize> = BTreeMap::new();
    let inside = run.trace.changes.iter().filter(|change| (from..=to).contains(&change.at));
    inside.for_each(|change| *changes.entry(change.net).or_default() += 1);
    changes.into_values().any(|count| count > DENSE)
}

//! What a sheet says beside the drawing: title, description, notes, key of steps.

use super::axis::Axis;
use super::behind::Behind;
use super::frame::{Lane, MARGIN, WIDTH};
use super::marks::{Spot, Step};
use super::{Nets, Picture};
use crate::circuit::NetId;
use crate::output::ink::SMALL;
use crate::output::measure::cut_end;
use crate::output::{races, words};
use crate::time::Time;

/// Most steps that the key lists.
const KEY: usize = 60;
/// Letters of a note that tells a path, about.
const PATH: usize = 150;
/// Most names that a note lists.
const NAMED: usize = 8;
/// Most entries of a list in the description.
const LISTED: usize = 20;

/// What the notes speak of.
pub(super) struct Seen<'a> {
    pub nets: &'a [NetId],
    pub left_out: &'a [NetId],
    pub sheet: (usize, usize),
    pub solid: bool,
    pub missing: bool,
    pub steps: &'a [Step],
    pub spots: &'a [Spot],
    /// Findings that lie outside the time that is drawn.
    pub outside: usize,
    /// What is drawn, if it is not all; and the end of all.
    pub part: Option<(Time, Time)>,
    pub end: Time,
    pub behind: &'a Behind<'a>,
    pub axis: &'a Axis,
}

/// What a reader must know of a sheet that is not drawn.
pub(super) fn notes(picture: &Picture<'_>, seen: &Seen<'_>) -> Vec<String> {
    let scenario = picture.scenario;
    let mut notes = Vec::new();
    if let Some(pair) = &picture.race {
        notes.extend(races::lines(scenario, pair, PATH));
    }
    if seen.nets.is_empty() {
        notes.push("There is no net to show.".to_string());
    }
    if let ((number, many @ 2..), Some(first), Some(last)) = (seen.sheet, seen.nets.first(), seen.nets.last()) {
        let (first, last) = (words::net(scenario, *first), words::net(scenario, *last));
        notes.push(format!("Sheet {} of {many}: {first} to {last}.", number + 1));
    }
    if let Some((from, to)) = seen.part {
        let time = |at: Time| at.from_start().decimal(scenario.unit);
        // four digits tell how much is left out
        let all = seen.end.fs();
        let step = 10u64.pow(all.checked_ilog10().unwrap_or(0).saturating_sub(3));
        let all = Time::from_fs(all.saturating_add(step / 2) / step * step);
        let (from, to, all) = (time(from), time(to), time(all));
        notes.push(format!("A part of the run: from {from} to {to} of {all} {}.", scenario.unit));
    }
    if picture.range.is_some_and(|(from, _)| from >= seen.end) {
        notes.push("The run ends before this span of time: nothing happens in it.".to_string());
    }
    if seen.outside > 0 {
        let findings = words::many(seen.outside as u64, "finding");
        notes.push(format!("Not drawn: {findings} of this run outside this span of time."));
    }
    if let (Nets::These(chosen), Some(run)) = (&picture.nets, picture.front()) {
        let mut hidden: Vec<_> = run.facts.iter().filter_map(|fact| fact.subject.net).collect();
        hidden.retain(|net| !chosen.contains(net));
        hidden.sort_unstable();
        hidden.dedup();
        if !hidden.is_empty() {
            let names = words::some_names(&words::nets(scenario, &hidden), NAMED);
            notes.push(format!("Not drawn: findings at {names}, which are not among the nets chosen."));
        }
    }
    let later: u64 = picture.runs().filter_map(|run| run.trace.cut).map(|cut| cut.transitions).sum();
    if later > 0 {
        let later = words::many(later, "transition");
        notes.push(format!("{later} came after what was kept for pictures; the table of changes of `run` has them."));
    }
    if !seen.left_out.is_empty() {
        let names = words::some_names(&words::nets(scenario, seen.left_out), NAMED);
        notes.push(format!("Left out: {} ({names}).", words::many(seen.left_out.len() as u64, "net")));
        notes.push("Ask for nets by name with run --nets A,B,…; the CSV beside this picture has all of them.".into());
    }
    if seen.solid {
        notes.push("Solid blocks: edges closer than one pixel; the CSV has each of them.".to_string());
    }
    if seen.axis.cuts().next().is_some() {
        notes.push("Zigzag: time without any change is left out; tick labels stay true.".to_string());
    }
    if seen.steps.iter().any(|step| step.is_tick) {
        notes.push("Dotted lines: clock edges.".to_string());
    }
    if seen.spots.iter().any(|spot| !spot.breaks_rule) {
        notes.push("Dashed brackets: listed, breaks no rule.".to_string());
    }
    if picture.runs().count() > 1 {
        notes.push("Thin dashed lines: further runs, at their own times.".to_string());
    }
    notes.extend(seen.behind.notes().cloned());
    if seen.missing {
        notes.push("Marks without a label had no room for it; tooltips and tables have the text.".to_string());
    }
    let stopped = picture.front().and_then(|run| words::step(scenario, run.trace.never_came));
    if let Some(step) = stopped {
        notes.push(format!("The run ends before step {step}: what it waits for never came."));
    }
    notes.iter().map(|note| cut_end(note, SMALL, WIDTH - 2.0 * MARGIN).unwrap_or_else(|| note.clone())).collect()
}

/// The key of numbered steps.
pub(super) fn key(picture: &Picture<'_>, steps: &[Step]) -> Vec<String> {
    let named: Vec<&Step> = steps.iter().filter(|step| !step.is_tick).collect();
    let mut key: Vec<String> = named
        .iter()
        .take(KEY)
        .enumerate()
        .map(|(i, step)| {
            let unit = picture.scenario.unit;
            let at = step.at.from_start().decimal(unit);
            let sets = if step.sets.is_empty() { String::new() } else { format!(": {}", step.sets) };
            let text = format!("{} at {at} {unit}, {}{sets}", i + 1, step.label);
            cut_end(&text, SMALL, WIDTH / 2.0 - MARGIN - 12.0).unwrap_or(text)
        })
        .collect();
    if named.len() > KEY {
        key.push(format!("… and {} more steps", words::count((named.len() - KEY) as u64)));
    }
    key
}

/// Scenario, which delays, and which sheet.
pub(super) fn title(picture: &Picture<'_>, sheet: (usize, usize)) -> String {
    let mut runs: Vec<String> = picture.runs().map(|run| words::delays(&run.which)).collect();
    runs.extend(picture.laid().map(|run| words::delays(&run.which)));
    if let [front, others @ ..] = runs.as_mut_slice()
        && !others.is_empty()
    {
        front.push_str(" (solid)");
        others.iter_mut().for_each(|run| run.push_str(" (dashed)"));
    }
    let sheet = if sheet.1 > 1 { format!(" (sheet {} of {})", sheet.0 + 1, sheet.1) } else { String::new() };
    let runs = if runs.is_empty() { String::new() } else { format!(": {}", runs.join(", ")) };
    format!("{}{runs}{sheet}", picture.scenario.title)
}

/// The picture in words.
pub(super) fn describe(
    picture: &Picture<'_>,
    behind: &Behind<'_>,
    lanes: &[Lane],
    steps: &[Step],
    spots: &[Spot],
    range: (Time, Time),
) -> String {
    let scenario = picture.scenario;
    let time = |at: Time| at.from_start().decimal(scenario.unit);
    let mut text = format!(
        "Waveforms of {} from {} to {} {}.",
        words::many(lanes.len() as u64, "net"),
        time(range.0),
        time(range.1),
        scenario.unit
    );
    for note in behind.notes() {
        text += &format!(" {note}");
    }
    let list = |label: &str, entries: &mut dyn Iterator<Item = String>| {
        let all: Vec<String> = entries.collect();
        let more = if all.len() > LISTED { format!("; and {} more", all.len() - LISTED) } else { String::new() };
        let head = all[..all.len().min(LISTED)].join("; ");
        if all.is_empty() { String::new() } else { format!(" {label}: {head}{more}.") }
    };
    text += &list("Steps", &mut steps.iter().filter(|step| !step.is_tick).map(|step| step.words(scenario)));
    text += &list("Findings", &mut spots.iter().map(|spot| spot.title.clone()));
    text += &list("Values at the end", &mut lanes.iter().map(|lane| format!("{} {}", lane.full_name, lane.value)));
    text
}

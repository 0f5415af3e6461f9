//! What the lines and signs of a map mean: an entry for each that occurs.

use super::Map;
use super::arrows::Place;
use super::choose::Chosen;
use super::frame::{LINE, MARGIN};
use super::grid::Grid;
use crate::output::ink::SMALL;
use crate::output::measure::width;

/// What an entry shows.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Sample {
    Start,
    Unreachable,
    Step,
    Unsure,
    Single,
    Race,
    Loop,
    Unknown,
}

/// An entry in its place: the left end of its sample and its base line.
pub(super) struct Entry {
    pub sample: Sample,
    pub text: &'static str,
    pub x: f64,
    pub y: f64,
}

/// All entries.
pub(super) struct Legend {
    pub entries: Vec<Entry>,
    pub bottom: f64,
}

/// Width of a sample.
pub(super) const SAMPLE: f64 = 34.0;
/// From a sample to its text, and from a text to the next sample.
pub(super) const SPACE: f64 = 7.0;
const GAP: f64 = 22.0;
/// Height of a line.
const PITCH: f64 = LINE + 5.0;

/// The entries, in lines from this height on.
pub(super) fn legend(map: &Map<'_>, chosen: &Chosen, grid: &Grid, top: f64, room: f64) -> Legend {
    let table = &map.flow.table;
    let state = |number: u32| &table.states[number as usize];
    let sign = |sign: Place| grid.nodes.iter().any(|node| node.place == sign);
    let arrows = || chosen.steps.iter().chain(&chosen.single);
    let all = [
        (Sample::Start, "a run may begin here", chosen.states.iter().any(|number| table.start.contains(number))),
        (Sample::Unreachable, "cannot be reached from the start", chosen.states.iter().any(|it| !state(*it).reachable)),
        (Sample::Step, "a step of the scenario", chosen.steps.iter().any(|arrow| arrow.sure)),
        (Sample::Unsure, "a step, if it meets this state", chosen.steps.iter().any(|arrow| !arrow.sure)),
        (Sample::Single, "one input changes, and no step does that (a gap in coverage)", !chosen.single.is_empty()),
        (
            Sample::Race,
            "critical race: the delays decide which of these follows",
            arrows().any(|arrow| arrow.is_race()),
        ),
        (Sample::Loop, "may oscillate for ever", sign(Place::Loop)),
        (Sample::Unknown, "what follows is known only by a bound (ternary)", sign(Place::Unknown)),
    ];
    let (mut x, mut y) = (MARGIN, top + LINE);
    let mut entries = Vec::new();
    for (sample, text, _) in all.into_iter().filter(|entry| entry.2) {
        let wide = SAMPLE + SPACE + width(text, SMALL);
        if x > MARGIN && x + wide > room - MARGIN {
            (x, y) = (MARGIN, y + PITCH);
        }
        entries.push(Entry { sample, text, x, y });
        x += wide + GAP;
    }
    let bottom = if entries.is_empty() { top } else { y + 6.0 };
    Legend { entries, bottom }
}

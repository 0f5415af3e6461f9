//! The geometry of one sheet: where every lane, mark and label goes. Nothing is written here.

use super::axis::Axis;
use super::flags::{self, Flags};
use super::lane::Wave;
use super::marks::{self, Ending, Spot, Step};
use super::{MOST_EDGES, Picture};
use crate::circuit::NetId;
use crate::engine::End;
use crate::output::ink::{BODY, SMALL};
use crate::output::measure::{Rows, cut_end, cut_middle, width};
use crate::output::words;
use crate::time::{Span, Time};

/// Width of every sheet.
pub(super) const WIDTH: f64 = 1000.0;
/// White around everything.
pub(super) const MARGIN: f64 = 12.0;
/// From the last instant to the end of the lanes, so that final levels can be seen.
const TAIL: f64 = 26.0;
/// Room for values at rest, right of the lanes.
const VALUES: f64 = 40.0;
/// Widest column of names.
const NAMES: f64 = 190.0;
/// From one lane to the next.
const PITCH: f64 = 27.0;
/// Height of a wave.
pub(super) const SWING: f64 = 16.0;
/// One line of small text.
pub(super) const LINE: f64 = 15.0;
/// Rows of labels below one lane, and below the axis.
const LABEL_ROWS: usize = 3;
/// Most steps that the key lists.
const KEY: usize = 60;
/// Most names that a note lists.
const NAMED: usize = 8;

/// One lane.
pub(super) struct Lane {
    pub net: NetId,
    pub name: String,
    pub full_name: String,
    /// Height of 1 and of 0.
    pub top: f64,
    pub bottom: f64,
    /// One wave a run, the front one first.
    pub waves: Vec<Wave>,
    /// What stands at the right end.
    pub value: String,
    /// The run ends while this net may still move.
    pub is_open: bool,
    pub brackets: Vec<Bracket>,
}

/// A bracket under a stretch, with its label.
pub(super) struct Bracket {
    pub left: f64,
    pub right: f64,
    pub y: f64,
    /// Text, its left end and its base line; `None` if there is no room.
    pub label: Option<(String, f64, f64)>,
    pub title: String,
    pub breaks_rule: bool,
}

/// How a window ended, below the axis.
pub(super) struct Rest {
    pub x: f64,
    pub is_rest: bool,
    /// Text, its middle and its base line; `None` if there is no room.
    pub label: Option<(String, f64, f64)>,
    pub title: String,
}

/// Everything about one sheet.
pub(super) struct Frame {
    pub title: String,
    pub full_title: String,
    pub description: String,
    pub left: f64,
    pub right: f64,
    pub axis: Axis,
    pub steps: Vec<Step>,
    pub flags: Flags,
    /// Top of the lanes.
    pub lanes_top: f64,
    pub lanes: Vec<Lane>,
    /// Height of the hairline between inputs and gates.
    pub hairline: Option<f64>,
    /// Brackets of findings that are about no single net, and the base line of their caption.
    pub whole: Vec<Bracket>,
    pub whole_caption: Option<f64>,
    /// What the values at the right end are.
    pub values_caption: &'static str,
    pub axis_y: f64,
    pub rests: Vec<Rest>,
    /// Base line of the first row of notes.
    pub notes_y: f64,
    pub notes: Vec<String>,
    /// Base line of the first row of the key.
    pub key_y: f64,
    pub key: Vec<String>,
    pub height: f64,
    pub solid: bool,
}

impl Frame {
    /// Lays out sheet `sheet.0` of `sheet.1`.
    pub fn new(picture: &Picture<'_>, nets: &[NetId], left_out: &[NetId], sheet: (usize, usize)) -> Frame {
        let scenario = picture.scenario;
        let circuit = &scenario.circuit;
        let runs: Vec<_> = picture.runs().collect();
        let front = picture.front();
        let range = picture.range.unwrap_or_else(|| (Time::ZERO, whole_run(picture)));
        let range = (range.0, range.1.max(range.0 + Span::TICK));
        let shown = |at: Time| range.0 <= at && at <= range.1;

        let names = nets.iter().map(|net| width(words::net(scenario, *net), BODY)).fold(88.0, f64::max);
        let left = MARGIN + names.min(NAMES) + 8.0;
        let right = WIDTH - MARGIN - VALUES;
        let steps: Vec<Step> = front.map_or_else(Vec::new, |run| marks::steps(scenario, run));
        let steps: Vec<Step> = steps.into_iter().filter(|step| shown(step.at)).collect();
        let endings: Vec<Ending> = front.map_or_else(Vec::new, |run| marks::endings(scenario, run));
        let mut busy: Vec<Time> = runs.iter().flat_map(|run| run.trace.changes.iter().map(|it| it.at)).collect();
        busy.extend(steps.iter().map(|step| step.at));
        busy.extend(endings.iter().map(|ending| ending.at));
        busy.sort_unstable();
        let axis = Axis::new(range, &busy, left, right - TAIL, scenario.unit);

        let at: Vec<(f64, &Step)> = steps.iter().map(|step| (axis.x(step.at), step)).collect();
        let flags = flags::place(&at, WIDTH - MARGIN);
        let row = if flags.two_lines { 2.0 * LINE - 2.0 } else { LINE };
        let lanes_top = 34.0 + flags.rows as f64 * row + 8.0;

        let mut notes = Vec::new();
        let mut missing = false;
        let spots = front.map_or_else(Vec::new, |run| marks::spots(scenario, picture.asked, run));
        let spots: Vec<Spot> = spots.into_iter().filter(|spot| shown(spot.from) || shown(spot.to)).collect();
        let changes: Vec<_> = runs.iter().map(|run| run.trace.by_net(circuit.net_count())).collect();
        let (last, values_caption) = last_window(front, range.1);
        let mut y = lanes_top;
        let mut hairline = None;
        let mut lanes = Vec::with_capacity(nets.len());
        for (i, net) in nets.iter().enumerate() {
            if i > 0 && !circuit.is_input(*net) && circuit.is_input(nets[i - 1]) {
                hairline = Some(y + 4.0);
                y += 8.0;
            }
            let full_name = words::net(scenario, *net).to_string();
            let waves: Vec<Wave> = runs
                .iter()
                .zip(&changes)
                .map(|(run, changes)| {
                    let start = run.trace.start.get(net.index());
                    Wave::of(start, &changes[net.index()], range, range.0 == Time::ZERO)
                })
                .collect();
            let end = waves.first().map(|wave| wave.edges.last().map_or(wave.before, |edge| edge.1));
            let is_open = last.is_some_and(|(window, _)| {
                let moves = changes[0][net.index()].iter().filter(|change| change.0 >= window.start).count();
                moves >= 3 || window.moving.iter().any(|(it, _)| it == net)
            });
            let value = match (is_open, last, end) {
                (true, Some((_, sign)), _) => sign.to_string(),
                (_, _, end) => end.map_or_else(String::new, |value| value.to_string()),
            };
            let (top, bottom) = (y + 5.0, y + 5.0 + SWING);
            let own: Vec<&Spot> = spots.iter().filter(|spot| spot.net == Some(*net)).collect();
            let (brackets, rows) = brackets(&own, &axis, left, bottom + 4.0, &mut missing);
            y += PITCH + if rows > 0 { rows as f64 * LINE - 2.0 } else { 0.0 };
            let name = cut_middle(&full_name, BODY, left - 8.0 - MARGIN).unwrap_or_else(|| full_name.clone());
            lanes.push(Lane { net: *net, name, full_name, top, bottom, waves, value, is_open, brackets });
        }
        if nets.is_empty() {
            notes.push("There is no net to show.".to_string());
        }

        let others: Vec<&Spot> = spots.iter().filter(|spot| spot.net.is_none()).collect();
        let (whole, rows) = brackets(&others, &axis, left, y + 5.0, &mut missing);
        let whole_caption = (!others.is_empty()).then_some(y + 18.0);
        if !others.is_empty() {
            y += 10.0 + rows.max(1) as f64 * LINE;
        }
        let axis_y = y + 12.0;
        let shown_endings: Vec<&Ending> = endings.iter().filter(|ending| shown(ending.at)).collect();
        let (rests, rows) = rests(&shown_endings, &axis, axis_y, &mut missing);
        let mut y = axis_y + 20.0 + rows as f64 * LINE;

        let edges: usize = lanes.iter().flat_map(|lane| &lane.waves).map(|wave| wave.edges.len()).sum();
        let solid = edges > MOST_EDGES;
        notes.extend(remarks(picture, &Seen { nets, left_out, sheet, solid, missing, steps: &steps, axis: &axis }));
        if spots.iter().any(|spot| !spot.breaks_rule) {
            notes.push("Dashed brackets: listed, breaks no rule.".to_string());
        }
        let (mut notes_y, mut key_y) = (y, y);
        if !notes.is_empty() {
            notes_y = y + 8.0 + LINE;
            y = notes_y + (notes.len() - 1) as f64 * LINE;
            key_y = y;
        }
        let key = if flags.numbered { key(picture, &steps) } else { Vec::new() };
        if !key.is_empty() {
            key_y = y + 10.0 + LINE;
            y = key_y + (key.len().div_ceil(2) - 1) as f64 * LINE;
        }

        let full_title = title(picture, sheet);
        let cut = cut_end(&full_title, 14.0, WIDTH - 2.0 * MARGIN);
        let description = describe(picture, &lanes, &steps, &spots, range);
        Frame {
            title: cut.unwrap_or_else(|| full_title.clone()),
            full_title,
            description,
            left,
            right,
            axis,
            steps,
            flags,
            lanes_top,
            lanes,
            hairline,
            whole,
            whole_caption,
            values_caption,
            axis_y,
            rests,
            notes_y,
            notes,
            key_y,
            key,
            height: (y + MARGIN).ceil(),
            solid,
        }
    }
}

/// The last instant of all runs, and at least one unit.
fn whole_run(picture: &Picture<'_>) -> Time {
    let mut end = Time::ZERO;
    for run in picture.runs() {
        end = end.max(run.trace.end);
        end = run.trace.windows.iter().fold(end, |end, window| end.max(window.stop));
        end = run.trace.changes.last().map_or(end, |change| end.max(change.at));
    }
    if end == Time::ZERO { Time::from_fs(picture.scenario.unit.femtoseconds()) } else { end }
}

/// The window that is still open where the picture ends, with the sign for nets that may move on; and what the values
/// at the right end are.
fn last_window(
    front: Option<&crate::review::RunReport>,
    to: Time,
) -> (Option<(&crate::engine::Window, &'static str)>, &'static str) {
    let Some(window) = front.and_then(|run| run.trace.windows.iter().rfind(|window| window.start <= to)) else {
        return (None, "at rest");
    };
    match window.end {
        End::Settled if (window.settle_from + window.settling.unwrap_or_default()) <= to => (None, "at rest"),
        End::Oscillating { .. } if window.stop <= to => (Some((window, "osc.")), "at end"),
        End::Unsettled(_) => (Some((window, "?")), "at end"),
        _ => (None, "at end"),
    }
}

/// Places brackets under a lane: their top at `y`, labels on as many rows as needed. Gives back the rows.
fn brackets(spots: &[&Spot], axis: &Axis, left: f64, y: f64, missing: &mut bool) -> (Vec<Bracket>, usize) {
    let mut rows = Rows::new(LABEL_ROWS);
    let mut all = Vec::with_capacity(spots.len());
    for spot in spots {
        let (from, to) = (axis.x(spot.from), axis.x(spot.to));
        let grow = ((7.0 - (to - from)) / 2.0).max(0.0);
        let room = WIDTH - MARGIN - left;
        let text = cut_end(&spot.label, SMALL, room).unwrap_or_else(|| spot.label.clone());
        let wide = width(&text, SMALL);
        let start = (f64::midpoint(from, to) - wide / 2.0).clamp(left, WIDTH - MARGIN - wide);
        let row = rows.place(start, start + wide + 10.0);
        *missing |= row.is_none();
        all.push(Bracket {
            left: from - grow,
            right: to + grow,
            y,
            label: row.map(|row| (text, start, y + 14.0 + row as f64 * LINE)),
            title: spot.title.clone(),
            breaks_rule: spot.breaks_rule,
        });
    }
    (all, rows.len())
}

/// Places the ends of windows below the axis. Gives back the rows.
fn rests(endings: &[&Ending], axis: &Axis, axis_y: f64, missing: &mut bool) -> (Vec<Rest>, usize) {
    let mut rows = Rows::new(LABEL_ROWS);
    let mut all = Vec::with_capacity(endings.len());
    for ending in endings {
        let x = axis.x(ending.at);
        let half = width(&ending.label, SMALL) / 2.0;
        let middle = x.min(WIDTH - MARGIN - half).max(MARGIN + half);
        let row = rows.place(middle - half - 4.0, middle + half + 4.0);
        *missing |= row.is_none();
        all.push(Rest {
            x,
            is_rest: ending.is_rest,
            label: row.map(|row| (ending.label.clone(), middle, axis_y + 32.0 + row as f64 * LINE)),
            title: ending.title.clone(),
        });
    }
    (all, rows.len())
}

/// What the notes speak of.
struct Seen<'a> {
    nets: &'a [NetId],
    left_out: &'a [NetId],
    sheet: (usize, usize),
    solid: bool,
    missing: bool,
    steps: &'a [Step],
    axis: &'a Axis,
}

/// What a reader must know of a sheet that is not drawn.
fn remarks(picture: &Picture<'_>, seen: &Seen<'_>) -> Vec<String> {
    let scenario = picture.scenario;
    let mut notes = Vec::new();
    if let ((number, many @ 2..), Some(first), Some(last)) = (seen.sheet, seen.nets.first(), seen.nets.last()) {
        let (first, last) = (words::net(scenario, *first), words::net(scenario, *last));
        notes.push(format!("Sheet {} of {many}: {first} to {last}.", number + 1));
    }
    if let Some((from, to)) = picture.range {
        let time = |at: Time| at.from_start().decimal(scenario.unit);
        let (from, to, all) = (time(from), time(to), time(whole_run(picture)));
        notes.push(format!("A part of the run: from {from} to {to} of {all} {}.", scenario.unit));
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
    if picture.layers.len() > 1 {
        notes.push("Dashed waves: further runs.".to_string());
    }
    if seen.missing {
        notes.push("Marks without a label had no room for it; tooltips and tables have the text.".to_string());
    }
    let stopped = picture.front().and_then(|run| words::step(scenario, run.trace.stopped_before));
    if let Some(step) = stopped {
        notes.push(format!("The run stops before step {step}, which is not analysed yet."));
    }
    notes.iter().map(|note| cut_end(note, SMALL, WIDTH - 2.0 * MARGIN).unwrap_or_else(|| note.clone())).collect()
}

/// The key of numbered steps.
fn key(picture: &Picture<'_>, steps: &[Step]) -> Vec<String> {
    let named: Vec<&Step> = steps.iter().filter(|step| !step.is_tick).collect();
    let mut key: Vec<String> = named
        .iter()
        .take(KEY)
        .enumerate()
        .map(|(i, step)| {
            let text = format!("{} {}", i + 1, step.words(picture.scenario));
            cut_end(&text, SMALL, WIDTH / 2.0 - MARGIN - 12.0).unwrap_or(text)
        })
        .collect();
    if named.len() > KEY {
        key.push(format!("… and {} more steps", words::count((named.len() - KEY) as u64)));
    }
    key
}

fn title(picture: &Picture<'_>, sheet: (usize, usize)) -> String {
    let runs: Vec<String> = picture.runs().map(|run| words::delays(&run.which)).collect();
    let sheet = if sheet.1 > 1 { format!(" (sheet {} of {})", sheet.0 + 1, sheet.1) } else { String::new() };
    let runs = if runs.is_empty() { String::new() } else { format!(": {}", runs.join(" and ")) };
    format!("{}{runs}{sheet}", picture.scenario.title)
}

/// The picture in words.
fn describe(picture: &Picture<'_>, lanes: &[Lane], steps: &[Step], spots: &[Spot], range: (Time, Time)) -> String {
    let scenario = picture.scenario;
    let time = |at: Time| at.from_start().decimal(scenario.unit);
    let mut text = format!(
        "Waveforms of {} from {} to {} {}.",
        words::many(lanes.len() as u64, "net"),
        time(range.0),
        time(range.1),
        scenario.unit
    );
    let list = |label: &str, entries: &mut dyn Iterator<Item = String>| {
        let all: Vec<String> = entries.collect();
        let more = if all.len() > 20 { format!("; and {} more", all.len() - 20) } else { String::new() };
        let head = all[..all.len().min(20)].join("; ");
        if all.is_empty() { String::new() } else { format!(" {label}: {head}{more}.") }
    };
    text += &list("Steps", &mut steps.iter().filter(|step| !step.is_tick).map(|step| step.words(scenario)));
    text += &list("Findings", &mut spots.iter().map(|spot| spot.title.clone()));
    text += &list("Values at the end", &mut lanes.iter().map(|lane| format!("{} {}", lane.full_name, lane.value)));
    text
}

//! What a map says beside the drawing: title, description, notes, key.

use super::Map;
use super::arrows::{Arrow, Place};
use super::boxes::{Nets, Texts};
use super::choose::{Chosen, Extent};
use super::grid::Grid;
use super::labels::{Style, letter, names_are_letters, steps};
use crate::circuit::NetId;
use crate::output::ink::SMALL;
use crate::output::measure::{cut_end, cut_middle, width};
use crate::output::{flow_words, words};

/// Most names of a list in a note.
const LISTED: usize = 40;
/// Widest name of a list in a note, pixels.
const NAME: f64 = 160.0;
/// Most steps that the key lists.
const KEY: usize = 60;
/// Most states and arrows that the description tells of.
const TOLD: usize = 40;

/// What the picture is called, and what it shows in words.
pub(super) struct Titles {
    pub title: String,
    pub full_title: String,
    pub description: String,
}

impl Titles {
    pub fn new(map: &Map<'_>, chosen: &Chosen, grid: &Grid, room: f64) -> Titles {
        let full_title = words::clean(&format!("{}: flow map", map.scenario.title));
        // bold letters are wider than the estimate
        let title = cut_end(&full_title, 14.0, room / 1.15).unwrap_or_else(|| full_title.clone());
        Titles { title, full_title, description: describe(map, chosen, grid) }
    }
}

/// Steps by number, and letters of inputs.
#[derive(Default)]
pub(super) struct Key {
    /// In columns, top to bottom.
    pub entries: Vec<String>,
    pub rows: usize,
    /// Width of a column.
    pub pitch: f64,
}

impl Key {
    pub fn is_empty(&self) -> bool {
        self.entries.is_empty()
    }
}

/// What an arrow stands for, in one sentence.
pub(super) fn arrow(map: &Map<'_>, arrow: &Arrow) -> String {
    let table = &map.flow.table;
    let step = match arrow.moments.is_empty() {
        true => String::new(),
        false => format!("{}: ", steps(map.scenario, arrow)),
    };
    let to: Vec<String> = arrow
        .to
        .iter()
        .map(|place| match place {
            Place::State(number) => flow_words::state(*number),
            Place::Loop => "oscillates".to_string(),
            Place::Unknown => "known only by a bound".to_string(),
        })
        .collect();
    let race = if arrow.is_race() { " (critical race)" } else { "" };
    let from = flow_words::from(map.scenario, table, arrow.from, &arrow.change);
    format!("{step}{from}: {}{race}", to.join(" or "))
}

/// The key of a map whose labels are signs.
pub(super) fn key(map: &Map<'_>, chosen: &Chosen, style: Style, room: f64) -> Key {
    if style == Style::Words || chosen.steps.is_empty() {
        return Key::default();
    }
    let columns = (room / 420.0).floor().max(1.0);
    let pitch = (room / columns).floor();
    let entries: Vec<String> = chosen
        .steps
        .iter()
        .take(KEY)
        .enumerate()
        .map(|(i, it)| {
            let text = words::clean(&format!("{}  {}", i + 1, arrow(map, it)));
            cut_end(&text, SMALL, pitch - 12.0).unwrap_or(text)
        })
        .collect();
    let rows = entries.len().div_ceil(columns as usize);
    Key { rows, pitch, entries }
}

/// What a reader must know beside the drawing, in lines no wider than the room.
pub(super) fn notes(
    map: &Map<'_>,
    chosen: &Chosen,
    grid: &Grid,
    texts: &Texts,
    style: Style,
    room: f64,
) -> Vec<String> {
    let (table, scenario) = (&map.flow.table, map.scenario);
    let mut notes = vec![extent(map, chosen, grid)];
    let constant: Vec<NetId> = scenario.circuit.inputs().filter(|net| !grid.varying.contains(net)).collect();
    if let (Some(first), false) = (grid.columns.first(), constant.is_empty()) {
        let value = |net: &NetId| format!("{}={}", short(map, *net), u8::from(first.get(net.index())));
        let all: Vec<String> = constant.iter().map(value).collect();
        let all: Vec<&str> = all.iter().map(String::as_str).collect();
        notes.push(format!("In every column: {}.", words::some_names(&all, LISTED)));
    }
    let digits = |what: &str, nets: &Nets| {
        nets.digits.then(|| {
            let cut = if nets.cut { ", the first of" } else { "" };
            let names: Vec<String> = nets.nets.iter().take(LISTED + 1).map(|net| short(map, *net)).collect();
            let mut names: Vec<&str> = names.iter().map(String::as_str).collect();
            names.resize(nets.nets.len(), "");
            format!("Digits, {what}{cut}: {}.", words::some_names(&names, LISTED))
        })
    };
    notes.extend(digits("at the head of a column", &texts.heading));
    notes.extend(digits("bold", &texts.variables));
    notes.extend(digits("below", &texts.outputs));
    if style == Style::Signs {
        let mut inputs: Vec<NetId> =
            chosen.single.iter().flat_map(|arrow| arrow.change.set.iter().map(|(net, _)| *net)).collect();
        inputs.sort_unstable();
        inputs.dedup();
        let all: Vec<String> =
            inputs.iter().map(|net| format!("{} {}", letter(map.scenario, *net), short(map, *net))).collect();
        let all: Vec<&str> = all.iter().map(String::as_str).collect();
        if !all.is_empty() && names_are_letters(map.scenario) {
            notes.push("Inputs: ↑ 0→1, ↓ 1→0.".to_string());
        } else if !all.is_empty() {
            notes.push(format!("Letters: {}; ↑ 0→1, ↓ 1→0.", words::some_names(&all, LISTED)));
        }
    }
    if chosen.single_left_out > 0 {
        let many = words::many(chosen.single_left_out as u64, "change");
        notes.push(format!("Not drawn: {many} of a single input that no step makes (see transitions.csv)."));
    }
    if style == Style::Words && chosen.steps.iter().any(|arrow| arrow.moments.len() > 1) {
        notes.push("A number after a plus: so many further steps make the same change.".to_string());
    }
    if style == Style::Signs && chosen.steps.len() > KEY {
        let left = words::many((chosen.steps.len() - KEY) as u64, "arrow");
        notes.push(format!("The list of steps leaves out {left}; transitions.csv has them."));
    }
    if chosen.idle > 0 {
        notes.push(format!(
            "Not drawn: {} that change nothing where they come.",
            words::many(chosen.idle as u64, "step")
        ));
    }
    if table.states_truncated {
        notes.push(
            "A limit cut the flow table: there are more stable states, or changes that were not looked at.".into(),
        );
    }
    if table.steps_truncated {
        notes.push("A limit cut the list of steps.".into());
    }
    notes.extend(table.notes.iter().map(|note| words::sentence(note)));
    notes.iter().flat_map(|note| wrap(&words::clean(note), room)).collect()
}

/// The name of a net in a note.
fn short(map: &Map<'_>, net: NetId) -> String {
    let name = words::net(map.scenario, net);
    cut_middle(name, SMALL, NAME).unwrap_or_else(|| name.to_string())
}

/// How much of the table is drawn.
fn extent(map: &Map<'_>, chosen: &Chosen, grid: &Grid) -> String {
    let table = &map.flow.table;
    let (shown, all) = (chosen.states.len(), table.states.len());
    let columns = words::many(grid.columns.len() as u64, "input vector");
    let steps = match chosen.steps_left_out {
        0 => String::new(),
        left => format!(" There is no room for {} of steps.", words::many(left as u64, "arrow")),
    };
    let (few, many) = (words::count(shown as u64), words::many(all as u64, "stable state"));
    match chosen.extent {
        Extent::Whole if shown == 0 => "There is no stable state.".to_string(),
        Extent::Whole => format!("Drawn: {} and {columns}.", words::many(shown as u64, "stable state")),
        Extent::Steps => format!(
            "Drawn is only what the steps touch: {few} of {many}, {columns}; the others are in states.csv.{steps}"
        ),
        Extent::First => format!(
            "There is no step, and the table is large: drawn are the first states that fit, {few} of {many}, {columns}; the \
             others are in states.csv."
        ),
    }
}

/// The picture in words.
fn describe(map: &Map<'_>, chosen: &Chosen, grid: &Grid) -> String {
    let table = &map.flow.table;
    let mut text = extent(map, chosen, grid);
    let list = |entries: Vec<String>| {
        let more = match entries.len().saturating_sub(TOLD) {
            0 => String::new(),
            left => format!("; and {} more", words::count(left as u64)),
        };
        entries[..entries.len().min(TOLD)].join("; ") + &more
    };
    if !table.start.is_empty() {
        text += &format!(" Start: {}.", flow_words::some_states(&table.start, TOLD));
    }
    let arrows = |arrows: &[Arrow]| list(arrows.iter().map(|it| arrow(map, it)).collect());
    if !chosen.steps.is_empty() {
        text += &format!(" Steps: {}.", arrows(&chosen.steps));
    }
    if !chosen.single.is_empty() {
        text += &format!(" Made by no step: {}.", arrows(&chosen.single));
    }
    text
}

/// A text in lines no wider than this; words that are wider are cut.
fn wrap(text: &str, room: f64) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    let mut line = String::new();
    for word in text.split_whitespace() {
        let word = cut_end(word, SMALL, room).unwrap_or_else(|| word.to_string());
        let next = if line.is_empty() { word.clone() } else { format!("{line} {word}") };
        if width(&next, SMALL) > room {
            lines.push(std::mem::replace(&mut line, word));
        } else {
            line = next;
        }
    }
    if !line.is_empty() {
        lines.push(line);
    }
    lines
}

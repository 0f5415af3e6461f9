//! A map as an SVG element.

use maud::{Markup, html};

use super::Map;
use super::arrows::Place;
use super::boxes::Line;
use super::frame::{BOX_LINE, Block, Frame, LINE, MARGIN, PAD, RACE, Way};
use super::labels::{BELOW, DISC};
use super::legend::{Entry, SAMPLE, SPACE, Sample};
use crate::output::flow_words;
use crate::output::ink::{BODY, FINDING, INK, QUIET, SMALL};
use crate::output::words::clean;

/// Radius of the corners of boxes and of arrows.
const ROUND: f64 = 8.0;
const BEND: f64 = 5.0;
/// Dashes of what cannot be reached, and of steps that may not come there.
const UNREACHABLE: &str = "4 3";
const UNSURE: &str = "7 3";

/// A coordinate with at most one decimal.
fn number(pixel: f64) -> String {
    let text = format!("{pixel:.1}");
    let text = text.strip_suffix(".0").unwrap_or(&text);
    if text == "-0" { "0".to_string() } else { text.to_string() }
}

/// The map as text.
pub(super) fn svg(map: &Map<'_>, frame: &Frame) -> String {
    let id = map.id;
    let (width, height) = (number(frame.width), number(frame.height));
    let labels = format!("{id}-title {id}-desc");
    let markup = html! {
        svg xmlns="http://www.w3.org/2000/svg" viewBox=(format!("0 0 {width} {height}")) width=(width) height=(height)
            role="img" aria-labelledby=(labels) font-family="sans-serif" font-size=(number(SMALL)) fill=(INK) {
            "\n" title id=(format!("{id}-title")) { (frame.titles.full_title) }
            "\n" desc id=(format!("{id}-desc")) { (clean(&frame.titles.description)) }
            "\n" rect width=(width) height=(height) fill="#fff" {}
            "\n" text x=(number(MARGIN)) y="22" font-size="14" font-weight="bold" { (frame.titles.title) }
            @for (x, lines) in &frame.headings { "\n" (heading(frame, *x, lines)) }
            // quiet arrows first: steps lie on top
            @for way in frame.ways.iter().filter(|way| !way.is_step) { "\n" (arrow(way)) }
            @for way in frame.ways.iter().filter(|way| way.is_step) { "\n" (arrow(way)) }
            @for block in &frame.blocks { "\n" (draw_block(frame, block)) }
            @for entry in &frame.legend.entries { "\n" (entry_of_legend(entry)) }
            (key(frame))
            @for (i, note) in frame.notes.iter().enumerate() {
                "\n" text x=(number(MARGIN)) y=(number(frame.notes_y + i as f64 * LINE)) { (note) }
            }
            "\n"
        }
        "\n"
    };
    markup.into_string()
}

/// The inputs of a column above a thin line.
fn heading(frame: &Frame, x: f64, lines: &[Line]) -> Markup {
    let rule = format!("M{} {}h{}", number(x), number(frame.rule_y), number(frame.wide));
    html! {
        g {
            (values(frame, x, frame.headings_y, lines))
            path d=(rule) stroke=(QUIET) stroke-width="1" {}
        }
    }
}

/// Names at the left, values at the right.
fn values(frame: &Frame, x: f64, y: f64, lines: &[Line]) -> Markup {
    html! {
        @for (i, line) in lines.iter().enumerate() {
            @let y = number(y + i as f64 * BOX_LINE);
            text x=(number(x + PAD)) y=(y) { (line.name) }
            @if !line.value.is_empty() {
                text x=(number(x + frame.wide - PAD)) y=(y) text-anchor="end" { (line.value) }
            }
        }
    }
}

fn draw_block(frame: &Frame, block: &Block) -> Markup {
    let number_of_state = match block.place {
        Place::State(state) => flow_words::state(state),
        Place::Loop => return sign(frame, block, loop_sign, "oscillates"),
        Place::Unknown => return sign(frame, block, open_sign, "only a bound"),
    };
    let dashes = (!block.is_reachable).then_some(UNREACHABLE);
    let thick = if block.is_start { "2.4" } else { "1.2" };
    let lines = 1 + block.variables.len() + block.outputs.len();
    // the text stands in the middle of a tall box
    let first = block.y + ((block.height - lines as f64 * BOX_LINE) / 2.0).floor() + 11.0;
    html! {
        g {
            rect x=(number(block.x)) y=(number(block.y)) width=(number(frame.wide)) height=(number(block.height))
                rx=(number(ROUND)) fill="#fff" stroke=(INK) stroke-width=(thick) stroke-dasharray=[dashes] {}
            text x=(number(block.x + PAD)) y=(number(first)) font-size=(number(BODY)) { (number_of_state) }
            @if block.is_start {
                text x=(number(block.x + frame.wide - PAD)) y=(number(first)) text-anchor="end" { "start" }
            }
            g font-size=(number(BODY)) font-weight="bold" {
                (values(frame, block.x, first + BOX_LINE, &block.variables))
            }
            (values(frame, block.x, first + (1 + block.variables.len()) as f64 * BOX_LINE, &block.outputs))
        }
    }
}

/// A place that is no state: a dotted outline, a sign and a word.
fn sign(frame: &Frame, block: &Block, sign: fn(f64, f64) -> Markup, word: &str) -> Markup {
    let (x, y) = (block.x + frame.wide / 2.0, block.y + (block.height / 2.0).floor());
    html! {
        g {
            rect x=(number(block.x)) y=(number(block.y)) width=(number(frame.wide)) height=(number(block.height))
                rx=(number(ROUND)) fill="#fff" stroke=(INK) stroke-width="1.2" stroke-dasharray="1 3" {}
            (sign(x, y - 8.0))
            text x=(number(x)) y=(number(y + 17.0)) text-anchor="middle" { (word) }
        }
    }
}

/// A circle that runs into itself.
fn loop_sign(x: f64, y: f64) -> Markup {
    let circle = format!("M{} {}a7 7 0 1 1 -5 -5", number(x + 7.0), number(y));
    let head = format!("M{} {}l-1.5 -5.5l6.5 3.5z", number(x + 1.0), number(y - 5.5));
    html! {
        path d=(circle) fill="none" stroke=(INK) stroke-width="1.6" {}
        path d=(head) {}
    }
}

/// An open question mark.
fn open_sign(x: f64, y: f64) -> Markup {
    html! {
        text x=(number(x)) y=(number(y + 7.0)) text-anchor="middle" font-size="20" font-weight="bold" fill="#fff"
            stroke=(INK) stroke-width="1" { "?" }
    }
}

/// A line through corners, rounded.
fn path(corners: &[(f64, f64)]) -> String {
    let mut data = String::new();
    for (i, (x, y)) in corners.iter().enumerate() {
        if i == 0 {
            data += &format!("M{} {}", number(*x), number(*y));
            continue;
        }
        let Some(next) = corners.get(i + 1) else {
            data += &format!("L{} {}", number(*x), number(*y));
            continue;
        };
        let before = corners[i - 1];
        let towards = |other: (f64, f64)| {
            let (dx, dy) = (other.0 - x, other.1 - y);
            let length = dx.abs().max(dy.abs());
            let bend = BEND.min(length / 2.0);
            (x + dx.signum() * bend * f64::from(dx != 0.0), y + dy.signum() * bend * f64::from(dy != 0.0))
        };
        let (a, b) = (towards(before), towards(*next));
        let [ax, ay, x, y, bx, by] = [a.0, a.1, *x, *y, b.0, b.1].map(number);
        data += &format!("L{ax} {ay}Q{x} {y} {bx} {by}");
    }
    data
}

fn arrow(way: &Way) -> Markup {
    let (ink, thick) = if way.is_step { (INK, "1.8") } else { (QUIET, "1") };
    let dashes = (way.is_step && !way.sure).then_some(UNSURE);
    let (long, half) = if way.is_step { (9.0, 4.0) } else { (7.0, 3.0) };
    let back = if way.rightwards { -long } else { long };
    let begin = way.branches.first().and_then(|branch| branch.first()).copied().unwrap_or_default();
    let ends = || way.branches.iter().filter_map(|branch| branch.last());
    html! {
        g {
            title { (clean(&way.title)) }
            @for branch in &way.branches {
                path d=(path(&shortened(branch, back))) fill="none" stroke=(ink) stroke-width=(thick)
                    stroke-dasharray=[dashes] {}
            }
            @for (x, y) in ends() {
                @let (x, y, back, half, wide) = (number(*x), number(*y), number(back), number(half), number(-2.0 * half));
                path d=(format!("M{x} {y}l{back} {half}v{wide}z")) fill=(ink) {}
            }
            @if let Some((x, y)) = way.fork {
                path d=(format!("M{} {}l4.5 4.5l-4.5 4.5l-4.5 -4.5z", number(x), number(y - 4.5))) fill=(FINDING) {}
                @for (x, y) in ends() {
                    @let (x, anchor) = if way.rightwards { (x - 12.0, "end") } else { (x + 12.0, "start") };
                    text x=(number(x)) y=(number(y - 3.0)) text-anchor=(anchor) fill=(FINDING) font-style="italic" { (RACE) }
                }
            }
            (label(way, begin))
        }
    }
}

/// The line ends inside its head.
fn shortened(branch: &[(f64, f64)], back: f64) -> Vec<(f64, f64)> {
    let mut branch = branch.to_vec();
    if let Some(last) = branch.last_mut() {
        last.0 += back / 2.0;
    }
    branch
}

fn label(way: &Way, begin: (f64, f64)) -> Markup {
    let (x, anchor) = if way.rightwards { (begin.0 + 6.0, "start") } else { (begin.0 - 6.0, "end") };
    let label = &way.label;
    html! {
        @if !label.above.is_empty() {
            text x=(number(x)) y=(number(begin.1 - 4.0)) text-anchor=(anchor) font-weight=[label.bold.then_some("bold")] {
                (label.above)
            }
        }
        @for (i, line) in label.below.iter().enumerate() {
            text x=(number(x)) y=(number(begin.1 + BELOW * (i + 1) as f64)) text-anchor=(anchor) { (line) }
        }
        @if let Some(step) = label.number {
            (disc(step, if way.rightwards { begin.0 + 4.0 + DISC } else { begin.0 - 4.0 - DISC }, begin.1))
        }
    }
}

/// The number of a step on its line.
fn disc(step: usize, x: f64, y: f64) -> Markup {
    let size = if step > 99 { "8" } else { "10" };
    html! {
        circle cx=(number(x)) cy=(number(y)) r=(number(DISC)) fill=(INK) {}
        text x=(number(x)) y=(number(y + 3.5)) text-anchor="middle" font-size=(size) font-weight="bold" fill="#fff" { (step) }
    }
}

fn entry_of_legend(entry: &Entry) -> Markup {
    let (x, y) = (entry.x, entry.y - 4.0);
    let line = format!("M{} {}h{}", number(x), number(y), number(SAMPLE - 5.0));
    let head = |ink: &str| html! { path d=(format!("M{} {}l-8 4v-8z", number(x + SAMPLE), number(y))) fill=(ink) {} };
    let outline = |thick: &str, dashes: Option<&str>| {
        html! {
            rect x=(number(x + 3.0)) y=(number(y - 7.0)) width=(number(SAMPLE - 6.0)) height="14" rx="5" fill="#fff"
                stroke=(INK) stroke-width=(thick) stroke-dasharray=[dashes] {}
        }
    };
    let sample = match entry.sample {
        Sample::Start => outline("2.4", None),
        Sample::Unreachable => outline("1.2", Some(UNREACHABLE)),
        Sample::Step => html! { path d=(line) stroke=(INK) stroke-width="1.8" {} (head(INK)) },
        Sample::Unsure => {
            html! { path d=(line) stroke=(INK) stroke-width="1.8" stroke-dasharray=(UNSURE) {} (head(INK)) }
        }
        Sample::Single => html! { path d=(line) stroke=(QUIET) stroke-width="1" {} (head(QUIET)) },
        Sample::Race => {
            let middle = x + SAMPLE / 2.0;
            html! {
                path d=(format!("M{} {}h{}", number(x), number(y), number(SAMPLE))) stroke=(INK) stroke-width="1" {}
                path d=(format!("M{} {}l4.5 4.5l-4.5 4.5l-4.5 -4.5z", number(middle), number(y - 4.5))) fill=(FINDING) {}
            }
        }
        Sample::Loop => loop_sign(x + SAMPLE / 2.0, y),
        Sample::Unknown => open_sign(x + SAMPLE / 2.0, y),
    };
    html! {
        g {
            (sample)
            text x=(number(x + SAMPLE + SPACE)) y=(number(entry.y)) { (entry.text) }
        }
    }
}

/// Numbered steps in columns.
fn key(frame: &Frame) -> Markup {
    let key = &frame.key;
    html! {
        @for (i, entry) in key.entries.iter().enumerate() {
            @let (column, row) = (i / key.rows.max(1), i % key.rows.max(1));
            @let (x, y) = (MARGIN + column as f64 * key.pitch, frame.key_y + row as f64 * LINE);
            "\n" text x=(number(x)) y=(number(y)) { (entry) }
        }
    }
}

//! A sheet as an SVG element.

use maud::{Markup, html};

use super::Picture;
use super::arrows;
use super::bands::Drawn;
use super::flags::OFFSET;
use super::frame::{Frame, LINE, Lane, MARGIN, SPACE, SWING, WIDTH};
use super::lane::{Line, line, number};
use super::places::Bracket;
use crate::output::ink::{BAND, BODY, FINDING, INK, QUIET, REST, SMALL};
use crate::output::words::clean;

/// White behind text that lines pass through.
const HALO: &str = "paint-order:stroke;stroke:#fff;stroke-width:3px;stroke-linejoin:round";

/// The sheet as text.
pub(super) fn svg(picture: &Picture<'_>, frame: &Frame) -> String {
    let id = &picture.id;
    let (width, height) = (number(WIDTH), number(frame.height));
    let labels = format!("{id}-title {id}-desc");
    let markup = html! {
        svg xmlns="http://www.w3.org/2000/svg" viewBox=(format!("0 0 {width} {height}")) width=(width) height=(height)
            role="img" aria-labelledby=(labels) font-family="sans-serif" font-size=(number(SMALL)) fill=(INK) {
            "\n" title id=(format!("{id}-title")) { (clean(&frame.full_title)) }
            "\n" desc id=(format!("{id}-desc")) { (clean(&frame.description)) }
            "\n" defs { (hatch(id)) }
            "\n" rect width=(width) height=(height) fill="#fff" {}
            "\n" text x=(number(MARGIN)) y="22" font-size="14" font-weight="bold" { (clean(&frame.title)) }
            "\n" (grid(frame))
            "\n" (steps(picture, frame))
            @for lane in &frame.lanes { "\n" (draw_lane(id, lane, frame)) }
            @if let Some(y) = frame.hairline {
                "\n" path d=(format!("M{} {}H{}", number(MARGIN), number(y), number(WIDTH - MARGIN)))
                    stroke=(QUIET) stroke-width="0.6" {}
            }
            @if let Some(y) = frame.whole_caption {
                "\n" text x=(number(frame.left - SPACE)) y=(number(y)) text-anchor="end" { "whole circuit" }
                @for bracket in &frame.whole { "\n" (draw_bracket(bracket)) }
            }
            "\n" (axis(frame))
            "\n" (cuts(frame))
            (arrows::draw(&frame.chains))
            "\n" (rests(frame))
            "\n" (labels_of_steps(picture, frame))
            @for (i, note) in frame.notes.iter().enumerate() {
                "\n" text x=(number(MARGIN)) y=(number(frame.notes_y + i as f64 * LINE)) { (clean(note)) }
            }
            (key(frame))
            "\n"
        }
        "\n"
    };
    markup.into_string()
}

fn hatch(id: &str) -> Markup {
    html! {
        pattern id=(format!("{id}-x")) width="5" height="5" patternUnits="userSpaceOnUse" patternTransform="rotate(45)" {
            rect width="5" height="5" fill="#fff" {}
            path d="M0 0V5" stroke=(INK) stroke-width="1.6" {}
        }
    }
}

/// Thin lines at the ticks, behind everything.
fn grid(frame: &Frame) -> Markup {
    let lines: String = frame
        .axis
        .ticks()
        .iter()
        .filter(|tick| tick.label.is_some())
        .map(|tick| format!("M{} {}V{}", number(tick.x), number(frame.lanes_top), number(frame.axis_y)))
        .collect();
    html! { path d=(lines) stroke=(QUIET) stroke-width="0.5" stroke-opacity="0.35" {} }
}

/// A dashed line a step, a dotted one a clock edge.
fn steps(picture: &Picture<'_>, frame: &Frame) -> Markup {
    html! {
        g stroke=(INK) fill="none" {
            @for (flag, step) in frame.flags.flags.iter().zip(&frame.steps).filter(|(flag, _)| flag.is_drawn) {
                @let top = if flag.label.is_empty() { frame.lanes_top } else { flag_base(frame, flag.row) - 9.0 };
                @let data = format!("M{} {}V{}", number(flag.x), number(top), number(frame.axis_y));
                "\n" path d=(data) stroke-width=(if flag.is_tick { "0.7" } else { "1" })
                    stroke-dasharray=(if flag.is_tick { "1 3" } else { "5 3" }) {
                    title { (clean(&step.words(picture.scenario))) }
                }
            }
        }
    }
}

/// The base line of the first line of labels in a row.
fn flag_base(frame: &Frame, row: usize) -> f64 {
    frame.lanes_top - 8.0 - (row + 1) as f64 * frame.flags.pitch() + 11.0
}

fn labels_of_steps(picture: &Picture<'_>, frame: &Frame) -> Markup {
    html! {
        g font-size=(number(SMALL)) {
            @for (flag, step) in frame.flags.flags.iter().zip(&frame.steps) {
                @if !flag.label.is_empty() {
                    @let y = flag_base(frame, flag.row);
                    @let x = number(if flag.leftwards { flag.x - OFFSET } else { flag.x + OFFSET });
                    "\n" g text-anchor=(if flag.leftwards { "end" } else { "start" }) {
                        title { (clean(&step.words(picture.scenario))) }
                        text x=(x) y=(number(y)) style=(HALO) { (clean(&flag.label)) }
                        @if !flag.sets.is_empty() {
                            text x=(x) y=(number(y + LINE - 2.0)) style=(HALO) { (clean(&flag.sets)) }
                        }
                    }
                }
            }
        }
    }
}

fn draw_lane(id: &str, lane: &Lane, frame: &Frame) -> Markup {
    let middle = lane.bottom - SWING / 2.0 + 4.0;
    let end = if lane.is_open { frame.right - 20.0 } else { frame.right };
    let last = lane.waves.len();
    html! {
        g id=(format!("{id}-net-{}", lane.net.0)) {
            title { (format!("{}: {}", lane.full_name, lane.value)) }
            text x=(number(frame.left - SPACE)) y=(number(middle)) text-anchor="end" font-size=(number(BODY)) {
                (lane.name)
            }
            // bands and further runs first: the front one lies on top
            @for band in &lane.bands { (draw_band(band, lane)) }
            @for stretch in lane.laid.iter().flatten() {
                @let from = if stretch.from == frame.from { frame.left } else { frame.axis.x(stretch.from) };
                @let to = stretch.to.map_or(end, |to| frame.axis.x(to));
                (draw_wave(id, &line(&stretch.wave, &frame.axis, (from, to), lane.top, lane.bottom, frame.solid), lane, true))
            }
            @for (i, wave) in lane.waves.iter().enumerate().rev() {
                (draw_wave(id, &line(wave, &frame.axis, (frame.left, end), lane.top, lane.bottom, frame.solid), lane, i > 0))
            }
            @if lane.is_open && last > 0 {
                path d=(format!("M{} {}h18", number(end + 3.0), number(lane.bottom - SWING / 2.0)))
                    stroke=(INK) stroke-width="1.6" stroke-dasharray="2 3" {}
            }
            text x=(number(frame.right + SPACE)) y=(number(middle)) font-size=(number(BODY)) { (lane.value) }
            @for bracket in &lane.brackets { (draw_bracket(bracket)) }
        }
    }
}

/// A band with slanted ends, under the lines.
fn draw_band(band: &Drawn, lane: &Lane) -> Markup {
    let corners = band.corners(lane.top, lane.bottom);
    let points: Vec<String> = corners.iter().map(|(x, y)| format!("{},{}", number(*x), number(*y))).collect();
    html! {
        polygon points=(points.join(" ")) fill=(BAND) stroke=(QUIET) stroke-width="0.6" {
            title { (clean(&format!("{} {}", lane.full_name, band.title))) }
        }
    }
}

fn draw_wave(id: &str, line: &Line, lane: &Lane, further: bool) -> Markup {
    let (top, height) = (number(lane.top), number(lane.bottom - lane.top));
    html! {
        @for (from, to) in &line.unknown {
            rect x=(number(*from)) y=(top) width=(number(to - from)) height=(height) fill=(format!("url(#{id}-x)"))
                stroke=(INK) stroke-width="1" {}
        }
        @for (from, to) in &line.blocks {
            rect x=(number(from - 0.8)) y=(top) width=(number(to - from + 1.6)) height=(height)
                fill=(if further { QUIET } else { INK }) {}
        }
        @if !line.path.is_empty() {
            @if further {
                path d=(line.path) fill="none" stroke=(QUIET) stroke-width="1.1" stroke-dasharray="3 2" {}
            } @else {
                path d=(line.path) fill="none" stroke=(INK) stroke-width="1.6" {}
            }
        }
    }
}

fn draw_bracket(bracket: &Bracket) -> Markup {
    let ink = if bracket.breaks_rule { FINDING } else { INK };
    let data = format!("M{} {}v4H{}v-4", number(bracket.left), number(bracket.y), number(bracket.right));
    html! {
        g {
            title { (clean(&bracket.title)) }
            @if bracket.breaks_rule {
                path d=(data) fill="none" stroke=(ink) stroke-width="1.6" {}
            } @else {
                path d=(data) fill="none" stroke=(ink) stroke-width="1.2" stroke-dasharray="3 1.5" {}
            }
            @if let Some((text, x, y)) = &bracket.label {
                text x=(number(*x)) y=(number(*y)) fill=(ink) style=(HALO) { (clean(text)) }
            }
        }
    }
}

fn axis(frame: &Frame) -> Markup {
    let y = frame.axis_y;
    let ticks = frame.axis.ticks();
    let marks: String = ticks.iter().map(|tick| format!("M{} {}v5", number(tick.x), number(y))).collect();
    html! {
        path d=(format!("M{} {}H{}{marks}", number(frame.left), number(y), number(frame.right)))
            fill="none" stroke=(INK) stroke-width="1" {}
        "\n" g text-anchor="middle" style="font-variant-numeric:tabular-nums" {
            @for tick in &ticks {
                @if let Some(label) = &tick.label {
                    text x=(number(tick.x)) y=(number(y + 17.0)) { (label) }
                }
            }
        }
        "\n" text x=(number(MARGIN)) y=(number(y + 17.0)) { (format!("time [{}]", frame.axis.unit)) }
        "\n" text x=(number(frame.right + SPACE)) y=(number(y + 17.0)) { (frame.values_caption) }
    }
}

/// Zigzags where time is left out.
fn cuts(frame: &Frame) -> Markup {
    let (top, bottom) = (frame.lanes_top, frame.axis_y + 4.0);
    let zigzag = |x: f64| {
        let mut data = format!("M{} {}", number(x), number(top));
        let (mut y, mut side) = (top, 2.5);
        while y < bottom {
            y = (y + 6.0).min(bottom);
            data += &format!("L{} {}", number(x + side), number(y));
            side = -side;
        }
        data
    };
    html! {
        @for cut in frame.axis.cuts() {
            @let (left, right) = (cut.left + 3.0, cut.right - 3.0);
            g {
                title { (format!("{} without any change, left out", cut.to.since(cut.from).rounded())) }
                rect x=(number(left)) y=(number(top)) width=(number(right - left)) height=(number(bottom - top)) fill="#fff" {}
                path d=(zigzag(left) + &zigzag(right)) fill="none" stroke=(QUIET) stroke-width="1" {}
            }
        }
    }
}

/// Triangles where the circuit comes to rest, bars where a window ends otherwise.
fn rests(frame: &Frame) -> Markup {
    let y = frame.axis_y;
    html! {
        g text-anchor="middle" {
            @for rest in &frame.rests {
                @let ink = if rest.is_rest { REST } else { INK };
                "\n" g {
                    title { (clean(&rest.title)) }
                    @if rest.is_rest {
                        path d=(format!("M{} {}l4.5 -8h-9z", number(rest.x), number(y))) fill=(ink) {}
                    } @else {
                        path d=(format!("M{} {}v-10", number(rest.x), number(y))) stroke=(ink) stroke-width="3" {}
                    }
                    @if let Some((text, x, y)) = &rest.label {
                        text x=(number(*x)) y=(number(*y)) fill=(ink) { (clean(text)) }
                    }
                }
            }
        }
        @if frame.rests.iter().any(|rest| rest.is_rest) {
            "\n" text x=(number(MARGIN)) y=(number(y + 32.0)) fill=(REST) { "settling time" }
        }
    }
}

/// Numbered steps in two columns.
fn key(frame: &Frame) -> Markup {
    let rows = frame.key.len().div_ceil(2);
    html! {
        @for (i, entry) in frame.key.iter().enumerate() {
            @let x = if i < rows { MARGIN } else { WIDTH / 2.0 + 6.0 };
            "\n" text x=(number(x)) y=(number(frame.key_y + (i % rows.max(1)) as f64 * LINE)) { (clean(entry)) }
        }
    }
}

//! The two paths that race, drawn from edge to edge.

use maud::{Markup, html};

use super::Picture;
use super::axis::Axis;
use super::frame::{LINE, Lane, SWING};
use super::lane::number;
use crate::circuit::NetId;
use crate::findings::Path;
use crate::output::ink::{FIRST, SECOND};
use crate::output::races;
use crate::time::Time;

/// How far path B lies below A, so that what both have in common shows both.
const APART: f64 = 3.0;
/// Most arrows of a path: of a longer one, as through an oscillation, its end is drawn.
pub(super) const MOST: usize = 24;
/// Length and half width of an arrow's head.
const HEAD: (f64, f64) = (6.0, 2.4);

/// One path on the sheet.
pub(super) struct Chain {
    /// `A` or `B`.
    pub letter: &'static str,
    /// The path in words.
    pub title: String,
    /// From edge to edge.
    pub arrows: Vec<Arrow>,
    /// Is there more of it before?
    pub goes_back: bool,
}

/// From one edge to the next.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Arrow {
    pub from: (f64, f64),
    pub to: (f64, f64),
    /// False for an event that was cancelled.
    pub came: bool,
}

/// The paths of a picture that have one, as far as they lie on this sheet.
pub(super) fn chains(picture: &Picture<'_>, lanes: &[Lane], axis: &Axis, range: (Time, Time)) -> Vec<Chain> {
    let Some(pair) = &picture.race else { return Vec::new() };
    let titles = races::lines(picture.scenario, pair, usize::MAX);
    let paths = std::iter::once(("A", 0.0, &pair.first)).chain(pair.second.as_ref().map(|it| ("B", APART, it)));
    paths
        .zip(titles)
        .map(|((letter, down, path), title)| {
            let mut arrows = arrows(path, lanes, axis, range, down);
            let earlier = arrows.len().saturating_sub(MOST);
            arrows.drain(..earlier);
            Chain { letter, title, arrows, goes_back: earlier > 0 }
        })
        .collect()
}

fn arrows(path: &Path, lanes: &[Lane], axis: &Axis, range: (Time, Time), down: f64) -> Vec<Arrow> {
    let spot = |net: NetId, at: Time| {
        let lane = lanes.iter().find(|lane| lane.net == net).filter(|_| range.0 <= at && at <= range.1)?;
        Some((axis.x(at), lane.bottom - SWING / 2.0 + down))
    };
    let mut from = path.from.and_then(|(net, _)| spot(net, path.at));
    let mut arrows = Vec::new();
    // a wire has no lane: its delay lies within the arrow to the gate at its end
    for leg in path.legs.iter().filter(|leg| leg.wire.is_none()) {
        let to = spot(leg.net, leg.at);
        arrows.extend(from.zip(to).map(|(from, to)| Arrow { from, to, came: leg.came }));
        from = to;
    }
    arrows
}

/// All paths, those of B below those of A.
pub(super) fn draw(chains: &[Chain]) -> Markup {
    html! {
        @for chain in chains.iter().rev() {
            @let first = chain.letter == "A";
            @let ink = if first { FIRST } else { SECOND };
            "\n" g stroke=(ink) fill="none" stroke-width="1.1" {
                title { (crate::output::words::clean(&chain.title)) }
                @for arrow in &chain.arrows {
                    @let shaft = format!("M{} {}L{} {}", number(arrow.from.0), number(arrow.from.1),
                        number(arrow.to.0), number(arrow.to.1));
                    @if first {
                        path d=(shaft) {}
                    } @else {
                        path d=(shaft) stroke-dasharray="4 2.5" {}
                    }
                    @if arrow.came {
                        path d=(head(arrow)) fill=(ink) stroke="none" {}
                    } @else {
                        path d=(cross(arrow)) stroke-width="1.6" {}
                    }
                }
                @if let Some(last) = chain.arrows.last() {
                    @let (x, y) = beside(last, first);
                    text x=(number(x)) y=(number(y)) fill=(ink) stroke="none" font-weight="bold"
                        style="paint-order:stroke;stroke:#fff;stroke-width:3px" { (chain.letter) }
                }
            }
        }
    }
}

/// A slim triangle at the end.
fn head(arrow: &Arrow) -> String {
    let ((x, y), (dx, dy)) = (arrow.to, direction(arrow));
    let (length, half) = HEAD;
    let (back_x, back_y) = (x - length * dx, y - length * dy);
    format!(
        "M{} {}L{} {}L{} {}z",
        number(x),
        number(y),
        number(back_x - half * dy),
        number(back_y + half * dx),
        number(back_x + half * dy),
        number(back_y - half * dx)
    )
}

/// A cross where an event would have come.
fn cross(arrow: &Arrow) -> String {
    let (x, y) = arrow.to;
    format!("M{} {}l7 7m0 -7l-7 7", number(x - 3.5), number(y - 3.5))
}

fn direction(arrow: &Arrow) -> (f64, f64) {
    let (dx, dy) = (arrow.to.0 - arrow.from.0, arrow.to.1 - arrow.from.1);
    let length = dx.hypot(dy);
    if length > 0.0 { (dx / length, dy / length) } else { (1.0, 0.0) }
}

/// Where the letter stands: before the end of the last arrow, A left of it, B right.
fn beside(arrow: &Arrow, first: bool) -> (f64, f64) {
    let middle = (f64::midpoint(arrow.from.0, arrow.to.0), f64::midpoint(arrow.from.1, arrow.to.1));
    let aside = if first { -LINE * 0.8 } else { LINE * 0.35 };
    (middle.0 + aside, middle.1 + 4.0)
}

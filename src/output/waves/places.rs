//! Where the labels of findings and of settling times go.

use super::axis::Axis;
use super::frame::{LINE, MARGIN, WIDTH};
use super::marks::{Ending, Spot};
use crate::output::ink::SMALL;
use crate::output::measure::{Rows, cut_end, width};

/// A bracket and its label.
pub(super) const BRACKET: f64 = 18.0;
/// Rows of labels below one lane, and below the axis.
const LABEL_ROWS: usize = 3;
/// Marks without a label that are closer than this to the one before are not drawn.
const CLOSE: f64 = 1.5;

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

/// Places brackets under a lane: their top at `y`, labels on as many rows as needed. Gives back the rows.
pub(super) fn brackets(spots: &[&Spot], axis: &Axis, left: f64, y: f64, missing: &mut bool) -> (Vec<Bracket>, usize) {
    let mut rows = Rows::new(LABEL_ROWS);
    let mut all = Vec::with_capacity(spots.len());
    for spot in spots {
        let (from, to) = (axis.x(spot.from), axis.x(spot.to));
        let grow = ((7.0 - (to - from)) / 2.0).max(0.0);
        let room = WIDTH - MARGIN - left;
        let text = cut_end(&spot.label, SMALL, room).unwrap_or_else(|| spot.label.clone());
        let wide = width(&text, SMALL);
        let start = (f64::midpoint(from, to) - wide / 2.0).clamp(left, WIDTH - MARGIN - wide);
        let (left, right) = (from - grow, to + grow);
        let row = rows.place(start.min(left), (start + wide).max(right) + 10.0);
        *missing |= row.is_none();
        if row.is_none() && all.last().is_some_and(|last: &Bracket| right - last.right < CLOSE) {
            continue;
        }
        let y = y + row.unwrap_or(0) as f64 * BRACKET;
        let label = row.map(|_| (text, start, y + 14.0));
        all.push(Bracket { left, right, y, label, title: spot.title.clone(), breaks_rule: spot.breaks_rule });
    }
    (all, rows.len())
}

/// Places the ends of windows below the axis. Gives back the rows.
pub(super) fn rests(endings: &[Ending], axis: &Axis, left: f64, axis_y: f64, missing: &mut bool) -> (Vec<Rest>, usize) {
    let mut rows = Rows::new(LABEL_ROWS);
    let mut all = Vec::with_capacity(endings.len());
    for ending in endings {
        let x = axis.x(ending.at);
        let half = width(&ending.label, SMALL) / 2.0;
        let middle = x.min(WIDTH - MARGIN - half).max(left - 8.0 + half);
        let row = rows.place(middle - half - 4.0, middle + half + 4.0);
        *missing |= row.is_none();
        if row.is_none() && all.last().is_some_and(|last: &Rest| x - last.x < CLOSE) {
            continue;
        }
        all.push(Rest {
            x,
            is_rest: ending.is_rest,
            label: row.map(|row| (ending.label.clone(), middle, axis_y + 32.0 + row as f64 * LINE)),
            title: ending.title.clone(),
        });
    }
    (all, rows.len())
}

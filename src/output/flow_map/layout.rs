//! Places from left to right: columns, the tracks between them, and the corners of every arrow.

use super::frame::{RACE, TRACK};
use super::slots::{Heights, Links};
use super::tracks::{Piece, tracks};
use crate::output::ink::SMALL;
use crate::output::measure::width;

/// Beside the tracks of a gap.
const CLEAR: f64 = 9.0;
/// Room for an arrow's head and a bit of line.
const STUB: f64 = 14.0;

/// A point.
type Point = (f64, f64);

/// The gap and number of a vertical piece.
type PieceId = (usize, usize);

/// Where columns and vertical pieces stand.
pub(super) struct Places {
    /// Left edge of every column.
    pub columns: Vec<f64>,
    /// Width of every column.
    pub wide: f64,
    /// Right end of the last column.
    pub right: f64,
    /// Every piece of every gap.
    pieces: Vec<Vec<f64>>,
    /// The pieces of every link: none if it is straight, two if it passes columns.
    of_link: Vec<Vec<PieceId>>,
}

impl Places {
    /// Lays out columns of this width from this place to the right.
    pub fn new(links: &Links<'_>, heights: &Heights, wide: f64, left: f64) -> Places {
        let many = links.grid.columns.len();
        let mut pieces: Vec<Vec<Piece>> = vec![Vec::new(); many.saturating_sub(1)];
        let mut of_link: Vec<Vec<PieceId>> = vec![Vec::new(); links.grid.links.len()];
        for (i, link) in links.grid.links.iter().enumerate() {
            let gaps = links.gaps[i];
            let begin = vec![links.y(heights, i, None)];
            let ends: Vec<f64> = (0..link.to.len()).map(|k| links.y(heights, i, Some(k))).collect();
            let mut add = |gap: usize, before: Vec<f64>, after: Vec<f64>| {
                let piece = if gaps.rightwards { Piece::new(before, after) } else { Piece::new(after, before) };
                of_link[i].push((gap, pieces[gap].len()));
                pieces[gap].push(piece);
            };
            match links.lane_y(heights, i) {
                Some(y) => {
                    add(gaps.from, begin, vec![y]);
                    add(gaps.to, vec![y], ends);
                }
                None if ends == begin => {}
                None => add(gaps.from, begin, ends),
            }
        }
        let mut x = left;
        let (mut columns, mut of_gap) = (Vec::new(), Vec::new());
        for (gap, pieces) in pieces.iter().enumerate() {
            columns.push(x);
            x += wide;
            let (track, many) = tracks(pieces);
            let (before, after) = sides(links, gap);
            of_gap.push(track.iter().map(|track| x + before + CLEAR + TRACK * *track as f64).collect());
            x += before + after + 2.0 * CLEAR + TRACK * many.saturating_sub(1) as f64;
        }
        columns.push(x);
        Places { columns, wide, right: x + wide, pieces: of_gap, of_link }
    }

    /// The corners of every branch of a link, and where it forks.
    pub fn corners(&self, links: &Links<'_>, heights: &Heights, number: usize) -> (Vec<Vec<Point>>, Option<Point>) {
        let link = &links.grid.links[number];
        let side = |node: usize, out: bool| {
            let x = self.columns[links.grid.nodes[node].column];
            if links.gaps[number].rightwards == out { x + self.wide } else { x }
        };
        let begin = (side(link.from, true), links.y(heights, number, None));
        let pieces: Vec<f64> = self.of_link[number].iter().map(|(gap, piece)| self.pieces[*gap][*piece]).collect();
        let lane = links.lane_y(heights, number);
        let branch = |k: usize| {
            let end = (side(link.to[k], false), links.y(heights, number, Some(k)));
            let mut corners = vec![begin];
            match (&pieces[..], lane) {
                ([one, two], Some(y)) => corners.extend([(*one, begin.1), (*one, y), (*two, y), (*two, end.1)]),
                ([x], _) => corners.extend([(*x, begin.1), (*x, end.1)]),
                _ => {}
            }
            corners.push(end);
            corners.dedup();
            corners
        };
        let fork = pieces.last().map(|x| (*x, lane.unwrap_or(begin.1)));
        ((0..link.to.len()).map(branch).collect(), fork.filter(|_| links.arrows[number].is_race()))
    }
}

/// Room for labels at the left and the right side of a gap.
fn sides(links: &Links<'_>, gap: usize) -> (f64, f64) {
    let (mut left, mut right) = (STUB, STUB);
    let race = width(RACE, SMALL) + 18.0;
    for (i, gaps) in links.gaps.iter().enumerate() {
        let label = links.labels[i].width() + 10.0;
        let (begin, end) = if gaps.rightwards { (&mut left, &mut right) } else { (&mut right, &mut left) };
        if gaps.from == gap {
            *begin = begin.max(label);
        }
        if gaps.to == gap && links.arrows[i].is_race() {
            *end = end.max(race);
        }
    }
    (left.ceil(), right.ceil())
}

//! Heights: every end of an arrow gets one of its own beside its row, and with them rows and lanes get theirs.

use super::arrows::Arrow;
use super::frame::{RACE_HEIGHTS, TRACK};
use super::grid::Grid;
use super::labels::Label;
use super::lanes::{Gaps, Lane, lanes};

/// From a row or a lane to the next.
const BETWEEN: f64 = 12.0;
/// In a row, above and below all ends together.
const AROUND: f64 = 10.0;
/// From the top of a lane to its first track.
const LANE: f64 = 4.0;
/// Room above and below an end that has no label.
const BARE: (f64, f64) = (6.0, 5.0);

/// Arrows with the way that each takes, before there are any coordinates.
pub(super) struct Links<'a> {
    pub grid: &'a Grid,
    pub arrows: Vec<&'a Arrow>,
    pub labels: Vec<Label>,
    pub gaps: Vec<Gaps>,
    lanes: Vec<Option<Lane>>,
    lane_tracks: Vec<usize>,
}

/// One end of a link, in a gap beside a row.
struct Slot {
    link: usize,
    /// The target, by number in the link; `None` for its beginning.
    target: Option<usize>,
    /// A straight arrow: beginning and this target at one height.
    straight: bool,
    /// Where it goes from here: rows have odd, lanes even numbers.
    other: usize,
    above: f64,
    below: f64,
    y: f64,
}

/// The slots of the gap right of a column, beside a row.
type Slots = Vec<Vec<Vec<Slot>>>;

/// All heights.
pub(super) struct Heights {
    slots: Slots,
    /// Top and height of every row.
    pub rows: Vec<(f64, f64)>,
    lanes: Vec<f64>,
    pub bottom: f64,
}

impl<'a> Links<'a> {
    pub fn new(grid: &'a Grid, arrows: Vec<&'a Arrow>, labels: Vec<Label>) -> Links<'a> {
        let gaps = grid.links.iter().map(|link| Gaps::of(grid, link)).collect();
        let (lanes, lane_tracks) = lanes(grid);
        Links { grid, arrows, labels, gaps, lanes, lane_tracks }
    }

    /// Lays out rows from this height down, each at least `least` high.
    pub fn heights(&self, least: f64, top: f64) -> Heights {
        let mut slots = self.slots();
        let (mut tops, mut lanes) = (Vec::new(), Vec::new());
        let mut y = top;
        let taken = |slots: &Vec<Slot>| slots.iter().map(|slot| slot.above + slot.below).sum::<f64>();
        for row in 0..=self.grid.rows {
            y += BETWEEN;
            lanes.push(y + LANE);
            y += self.lane_tracks[row] as f64 * TRACK + if self.lane_tracks[row] > 0 { LANE } else { 0.0 };
            if row == self.grid.rows {
                break;
            }
            let height = slots.iter().map(|rows| taken(&rows[row]) + AROUND).fold(least, f64::max).ceil();
            for rows in &mut slots {
                let mut at = (y + (height - taken(&rows[row])) / 2.0).floor();
                for slot in &mut rows[row] {
                    slot.y = at + slot.above;
                    at += slot.above + slot.below;
                }
            }
            tops.push((y, height));
            y += height;
        }
        Heights { slots, rows: tops, lanes, bottom: y }
    }

    /// The height of one end of a link: of its beginning, or of a target.
    pub fn y(&self, heights: &Heights, link: usize, target: Option<usize>) -> f64 {
        let (gaps, ends) = (self.gaps[link], &self.grid.links[link]);
        let node = target.map_or(ends.from, |k| ends.to[k]);
        let gap = if target.is_some() { gaps.to } else { gaps.from };
        let slots = &heights.slots[gap][self.grid.nodes[node].row];
        let is_it = |slot: &&Slot| slot.link == link && (slot.target == target || slot.straight && target.is_none());
        slots.iter().find(is_it).expect("every end has a slot").y
    }

    /// The height at which a link passes columns; `None` if it passes none.
    pub fn lane_y(&self, heights: &Heights, link: usize) -> Option<f64> {
        self.lanes[link].map(|lane| heights.lanes[lane.lane] + TRACK * lane.track as f64)
    }

    /// The ends of all links by gap and row, in their order from top to bottom: those that go up first.
    fn slots(&self) -> Slots {
        let mut slots: Slots = Vec::new();
        slots.resize_with(self.grid.columns.len().saturating_sub(1), || {
            let mut rows = Vec::new();
            rows.resize_with(self.grid.rows, Vec::new);
            rows
        });
        for link in 0..self.grid.links.len() {
            self.slots_of(link, &mut slots);
        }
        for rows in &mut slots {
            for (row, slots) in rows.iter_mut().enumerate() {
                slots.sort_by_key(|slot| (slot.other.cmp(&(2 * row + 1)), slot.other, slot.link));
            }
        }
        slots
    }

    fn slots_of(&self, number: usize, slots: &mut Slots) {
        let link = &self.grid.links[number];
        let gaps = self.gaps[number];
        let row = |node: usize| self.grid.nodes[node].row;
        let own = row(link.from);
        let lane = self.lanes[number].map(|lane| 2 * lane.lane);
        let straight = if lane.is_some() { None } else { link.to.iter().position(|to| row(*to) == own) };
        let end = if self.arrows[number].is_race() { RACE_HEIGHTS } else { BARE };
        let begin = self.labels[number].heights();
        let (above, below) = match straight {
            Some(_) => (begin.0.max(end.0), begin.1.max(end.1)),
            None => begin,
        };
        // without a lane it goes to the middle of its targets
        let middle = || link.to.first().into_iter().chain(link.to.last()).map(|to| row(*to)).sum::<usize>() + 1;
        let other = if straight.is_some() && link.to.len() == 1 { 2 * own + 1 } else { lane.unwrap_or_else(middle) };
        let is_straight = straight.is_some();
        let slot = Slot { link: number, target: straight, straight: is_straight, other, above, below, y: 0.0 };
        slots[gaps.from][own].push(slot);
        for (k, to) in link.to.iter().enumerate().filter(|it| Some(it.0) != straight) {
            let (above, below) = end;
            let other = lane.unwrap_or(2 * own + 1);
            let slot = Slot { link: number, target: Some(k), straight: false, other, above, below, y: 0.0 };
            slots[gaps.to][row(*to)].push(slot);
        }
    }
}

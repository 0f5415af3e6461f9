//! The geometry of a map: where every box, arrow and label goes. Nothing is written here.

use super::Map;
use super::arrows::{Arrow, Place};
use super::boxes::{Line, Texts};
use super::captions;
use super::choose::Chosen;
use super::grid::{Grid, Link};
use super::labels::{Label, Style};
use super::lanes::{Gaps, Lane, lanes};
use super::legend::{Legend, legend};
use super::tracks::{Piece, tracks};
use crate::output::ink::SMALL;
use crate::output::measure::width;

/// White around everything.
pub(super) const MARGIN: f64 = 12.0;
/// Height of one line of small text.
pub(super) const LINE: f64 = 15.0;
/// Height of a line in a box.
pub(super) const BOX_LINE: f64 = 14.0;
/// Inside of a box, to its outline.
pub(super) const PAD: f64 = 8.0;
/// Height of the title.
const TITLE: f64 = 34.0;
/// From one track to the next, vertical or horizontal.
const TRACK: f64 = 8.0;
/// Beside the tracks of a gap.
const CLEAR: f64 = 9.0;
/// Room for an arrow's head and a bit of line.
const STUB: f64 = 14.0;
/// Widest picture whose labels are words; else they are signs.
const WIDEST: f64 = 1300.0;
/// Narrowest picture.
const NARROWEST: f64 = 720.0;
/// The word at the branches of a race.
pub(super) const RACE: &str = "race";

/// A box or a sign.
pub(super) struct Block {
    pub place: Place,
    pub x: f64,
    pub y: f64,
    pub height: f64,
    pub variables: Vec<Line>,
    pub outputs: Vec<Line>,
    pub is_start: bool,
    pub is_reachable: bool,
}

/// One arrow, laid out.
pub(super) struct Way {
    /// The corners of every branch, from the box where it begins to where it ends.
    pub branches: Vec<Vec<(f64, f64)>>,
    pub rightwards: bool,
    pub label: Label,
    /// Where the fork of a race is.
    pub fork: Option<(f64, f64)>,
    pub is_step: bool,
    pub sure: bool,
    pub title: String,
}

/// Everything about a map.
pub(super) struct Frame {
    pub width: f64,
    pub height: f64,
    /// Width of every box.
    pub wide: f64,
    pub titles: captions::Titles,
    /// Left edge, lines and top of every column.
    pub headings: Vec<(f64, Vec<Line>)>,
    pub headings_y: f64,
    pub rule_y: f64,
    pub blocks: Vec<Block>,
    pub ways: Vec<Way>,
    pub notes_y: f64,
    pub notes: Vec<String>,
    pub key_y: f64,
    pub key: captions::Key,
    pub legend: Legend,
}

/// One end of a link in a gap beside a row.
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

/// All slots of the gap right of a column, beside a row.
type Slots = Vec<Vec<Vec<Slot>>>;

/// Links with everything that is known before there are any heights.
struct Layout<'a> {
    grid: &'a Grid,
    arrows: Vec<&'a Arrow>,
    labels: Vec<Label>,
    gaps: Vec<Gaps>,
    lanes: Vec<Option<Lane>>,
    lane_tracks: Vec<usize>,
}

impl Frame {
    pub fn new(map: &Map<'_>) -> Frame {
        let chosen = Chosen::of(map);
        let grid = Grid::new(map, &chosen);
        let spacious = Frame::with(map, &chosen, &grid, Style::Words);
        if spacious.width <= WIDEST { spacious } else { Frame::with(map, &chosen, &grid, Style::Signs) }
    }

    fn with(map: &Map<'_>, chosen: &Chosen, grid: &Grid, style: Style) -> Frame {
        let texts = Texts::new(map, &grid.varying, style == Style::Signs && !chosen.single.is_empty());
        let layout = Layout::new(map, chosen, grid, style);
        let mut slots = layout.slots();
        let wide = texts.inside + 2.0 * PAD;
        let lines = 1 + texts.variables.lines + texts.outputs.lines;
        let least = lines as f64 * BOX_LINE + 12.0;

        let headings_y = TITLE + LINE;
        let rule_y = headings_y + texts.heading.lines.max(1) as f64 * BOX_LINE - 6.0;
        let (tops, heights, lane_tops, bottom) = layout.heights(&mut slots, least, rule_y + 4.0);
        let (lefts, right, middles, pieces) = layout.widths(&slots, &lane_tops, wide);
        let width = (right + MARGIN).max(NARROWEST).ceil();
        // a narrow map stands in the middle
        let shift = ((width - right - MARGIN) / 2.0).floor();
        let column = |column: usize| lefts[column] + shift;

        let table = &map.flow.table;
        let blocks = grid.nodes.iter().map(|node| {
            let (mut variables, mut outputs) = (Vec::new(), Vec::new());
            let (mut is_start, mut is_reachable) = (false, true);
            if let Place::State(number) = node.place {
                let state = &table.states[number as usize];
                (variables, outputs) = texts.of_state(&state.values);
                is_start = table.start.contains(&number);
                is_reachable = state.reachable;
            }
            let (x, y, height) = (column(node.column), tops[node.row], heights[node.row]);
            Block { place: node.place, x, y, height, variables, outputs, is_start, is_reachable }
        });
        let blocks: Vec<Block> = blocks.collect();
        let ways = (0..grid.links.len())
            .map(|i| {
                let x = |track: (usize, usize)| middles[track.0] + shift + TRACK * track.1 as f64;
                layout.way(map, i, &slots, &pieces[i], &lane_tops, &x, &|node| column(node), wide)
            })
            .collect();
        let headings = grid.columns.iter().enumerate().map(|(i, inputs)| {
            let lines = texts.heading.lines(|net| inputs.get(net.index()));
            (column(i), lines)
        });
        let headings = headings.collect();
        let notes = captions::notes(map, chosen, grid, &texts, style, width - 2.0 * MARGIN);
        let key = captions::key(map, chosen, style, width - 2.0 * MARGIN);
        let mut y = bottom + 8.0;
        let legend = legend(map, chosen, grid, y, width);
        y = legend.bottom;
        let key_y = y + LINE;
        y += if key.is_empty() { 0.0 } else { key.rows as f64 * LINE + 6.0 };
        let notes_y = y + LINE;
        y += notes.len() as f64 * LINE;
        Frame {
            width,
            height: (y + MARGIN).ceil(),
            wide,
            titles: captions::Titles::new(map, chosen, grid, width - 2.0 * MARGIN),
            headings,
            headings_y,
            rule_y,
            blocks,
            ways,
            notes_y,
            notes,
            key_y,
            key,
            legend,
        }
    }
}

/// The vertical pieces of a link: their gap and track, and for one that passes columns a second.
type Pieces = (Option<(usize, usize)>, Option<(usize, usize)>);

impl<'a> Layout<'a> {
    fn new(map: &Map<'_>, chosen: &'a Chosen, grid: &'a Grid, style: Style) -> Layout<'a> {
        let arrows: Vec<&Arrow> = chosen.steps.iter().chain(&chosen.single).collect();
        let from = |arrow: &Arrow| &map.flow.table.states[arrow.from as usize].values;
        let labels = arrows
            .iter()
            .enumerate()
            .map(|(i, arrow)| Label::of(map.scenario, arrow, from(arrow), style, i + 1))
            .collect();
        let gaps = grid.links.iter().map(|link| Gaps::of(grid, link)).collect();
        let (lanes, lane_tracks) = lanes(grid);
        Layout { grid, arrows, labels, gaps, lanes, lane_tracks }
    }

    /// The ends of all links by gap and row, in their order from top to bottom, without heights.
    fn slots(&self) -> Slots {
        let mut slots: Slots = Vec::new();
        slots.resize_with(self.grid.columns.len().saturating_sub(1), || {
            let mut rows = Vec::new();
            rows.resize_with(self.grid.rows, Vec::new);
            rows
        });
        for (i, link) in self.grid.links.iter().enumerate() {
            let gaps = self.gaps[i];
            let row = |node: usize| self.grid.nodes[node].row;
            let (above, below) = self.labels[i].heights();
            let race: (f64, f64) = if self.arrows[i].is_race() { (13.0, 4.0) } else { (6.0, 5.0) };
            let own = row(link.from);
            let mut straight = None;
            let other = match self.lanes[i] {
                Some(lane) => 2 * lane.lane,
                None => {
                    straight = link.to.iter().position(|to| row(*to) == own);
                    let ends = link.to.first().into_iter().chain(link.to.last());
                    ends.map(|to| row(*to)).sum::<usize>() + 1
                }
            };
            let (above, below) = match straight {
                Some(_) => (above.max(race.0), below.max(race.1)),
                None => (above, below),
            };
            slots[gaps.from][own].push(Slot {
                link: i,
                target: straight,
                straight: straight.is_some(),
                other: if straight.is_some() && link.to.len() == 1 { 2 * own + 1 } else { other },
                above,
                below,
                y: 0.0,
            });
            for (k, to) in link.to.iter().enumerate().filter(|it| Some(it.0) != straight) {
                let other = self.lanes[i].map_or(2 * own + 1, |lane| 2 * lane.lane);
                let (above, below) = race;
                slots[gaps.to][row(*to)].push(Slot {
                    link: i,
                    target: Some(k),
                    straight: false,
                    other,
                    above,
                    below,
                    y: 0.0,
                });
            }
        }
        for rows in &mut slots {
            for (row, slots) in rows.iter_mut().enumerate() {
                slots.sort_by_key(|slot| (slot.other.cmp(&(2 * row + 1)), slot.other, slot.link));
            }
        }
        slots
    }

    /// Gives every slot its height. Tops and heights of the rows, tops of the lanes, and the bottom.
    fn heights(&self, slots: &mut Slots, least: f64, top: f64) -> (Vec<f64>, Vec<f64>, Vec<f64>, f64) {
        let (mut tops, mut heights, mut lane_tops) = (Vec::new(), Vec::new(), Vec::new());
        let mut y = top;
        for row in 0..=self.grid.rows {
            y += 12.0;
            lane_tops.push(y);
            y += self.lane_tracks[row] as f64 * TRACK + if self.lane_tracks[row] > 0 { 4.0 } else { 0.0 };
            if row == self.grid.rows {
                break;
            }
            let taken = |slots: &Vec<Slot>| slots.iter().map(|slot| slot.above + slot.below).sum::<f64>();
            let height = slots.iter().map(|rows| taken(&rows[row]) + 10.0).fold(least, f64::max).ceil();
            for rows in slots.iter_mut() {
                let mut at = (y + (height - taken(&rows[row])) / 2.0).floor();
                for slot in &mut rows[row] {
                    slot.y = at + slot.above;
                    at += slot.above + slot.below;
                }
            }
            tops.push(y);
            heights.push(height);
            y += height;
        }
        (tops, heights, lane_tops, y)
    }

    /// The height of one end of a link.
    fn y(&self, slots: &Slots, link: usize, target: Option<usize>) -> f64 {
        let gaps = self.gaps[link];
        let ends = &self.grid.links[link];
        let node = target.map_or(ends.from, |k| ends.to[k]);
        let gap = if target.is_some() { gaps.to } else { gaps.from };
        let slots = &slots[gap][self.grid.nodes[node].row];
        let is_it = |slot: &&Slot| slot.link == link && (slot.target == target || slot.straight && target.is_none());
        slots.iter().find(is_it).map_or(0.0, |slot| slot.y)
    }

    fn lane_y(&self, link: usize, lane_tops: &[f64]) -> Option<f64> {
        self.lanes[link].map(|lane| lane_tops[lane.lane] + 4.0 + TRACK * lane.track as f64)
    }

    /// Left edges of the columns, the right end, the first track of every gap, and the tracks of every link.
    fn widths(&self, slots: &Slots, lane_tops: &[f64], wide: f64) -> (Vec<f64>, f64, Vec<f64>, Vec<Pieces>) {
        let many = self.grid.columns.len();
        let mut pieces: Vec<Vec<Piece>> = Vec::new();
        pieces.resize_with(many.saturating_sub(1), Vec::new);
        let mut places: Vec<(Option<(usize, usize)>, Option<(usize, usize)>)> =
            vec![(None, None); self.grid.links.len()];
        for (i, link) in self.grid.links.iter().enumerate() {
            let gaps = self.gaps[i];
            let begin = vec![self.y(slots, i, None)];
            let ends: Vec<f64> = (0..link.to.len()).map(|k| self.y(slots, i, Some(k))).collect();
            let mut add = |gap: usize, before: Vec<f64>, after: Vec<f64>| {
                let piece = if gaps.rightwards { Piece::new(before, after) } else { Piece::new(after, before) };
                pieces[gap].push(piece);
                Some((gap, pieces[gap].len() - 1))
            };
            match self.lane_y(i, lane_tops) {
                Some(y) => places[i] = (add(gaps.from, begin, vec![y]), add(gaps.to, vec![y], ends)),
                // a straight arrow has none
                None if ends == begin => {}
                None => places[i] = (add(gaps.from, begin, ends), None),
            }
        }
        let mut x = MARGIN;
        let (mut lefts, mut middles) = (Vec::new(), Vec::new());
        let mut of_gap = Vec::new();
        for (gap, pieces) in pieces.iter().enumerate() {
            lefts.push(x);
            x += wide;
            let (track, tracks) = tracks(pieces);
            let (left, right) = self.sides(gap);
            middles.push(x + left + CLEAR);
            x += left + right + 2.0 * CLEAR + TRACK * tracks.saturating_sub(1) as f64;
            of_gap.push(track);
        }
        lefts.push(x);
        let place = |place: Option<(usize, usize)>| place.map(|(gap, piece)| (gap, of_gap[gap][piece]));
        let ways = places.into_iter().map(|(one, two)| (place(one), place(two))).collect();
        (lefts, x + wide, middles, ways)
    }

    /// Room for labels at the left and the right side of a gap.
    fn sides(&self, gap: usize) -> (f64, f64) {
        let (mut left, mut right) = (STUB, STUB);
        let race = width(RACE, SMALL) + 18.0;
        for (i, gaps) in self.gaps.iter().enumerate() {
            let label = self.labels[i].width() + 10.0;
            let (begin, end) = if gaps.rightwards { (&mut left, &mut right) } else { (&mut right, &mut left) };
            if gaps.from == gap {
                *begin = begin.max(label);
            }
            if gaps.to == gap && self.arrows[i].is_race() {
                *end = end.max(race);
            }
        }
        (left.ceil(), right.ceil())
    }

    #[allow(clippy::too_many_arguments)] // the parts of one layout
    fn way(
        &self,
        map: &Map<'_>,
        i: usize,
        slots: &Slots,
        pieces: &Pieces,
        lane_tops: &[f64],
        track: &dyn Fn((usize, usize)) -> f64,
        column: &dyn Fn(usize) -> f64,
        wide: f64,
    ) -> Way {
        let link: &Link = &self.grid.links[i];
        let rightwards = self.gaps[i].rightwards;
        let side = |node: usize, out: bool| {
            let x = column(self.grid.nodes[node].column);
            if rightwards == out { x + wide } else { x }
        };
        let begin = (side(link.from, true), self.y(slots, i, None));
        let mut fork = None;
        let branches = (0..link.to.len())
            .map(|k| {
                let end = (side(link.to[k], false), self.y(slots, i, Some(k)));
                let mut corners = vec![begin];
                match (pieces, self.lane_y(i, lane_tops)) {
                    ((Some(one), Some(two)), Some(y)) => {
                        let (one, two) = (track(*one), track(*two));
                        corners.extend([(one, begin.1), (one, y), (two, y), (two, end.1)]);
                        fork = Some((two, y));
                    }
                    ((Some(one), _), _) => {
                        let x = track(*one);
                        corners.extend([(x, begin.1), (x, end.1)]);
                        fork = Some((x, begin.1));
                    }
                    _ => {}
                }
                corners.push(end);
                corners.dedup();
                corners
            })
            .collect();
        let arrow = self.arrows[i];
        Way {
            branches,
            rightwards,
            label: self.labels[i].clone(),
            fork: fork.filter(|_| arrow.is_race()),
            is_step: !arrow.moments.is_empty(),
            sure: arrow.sure,
            title: captions::arrow(map, arrow),
        }
    }
}

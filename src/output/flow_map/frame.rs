//! The geometry of a map: where every box, arrow and label goes. Nothing is written here.

use super::Map;
use super::arrows::{Arrow, Place};
use super::boxes::{Line, Texts};
use super::captions;
use super::choose::Chosen;
use super::grid::{Grid, Node};
use super::labels::{Label, Style};
use super::layout::Places;
use super::legend::{Legend, legend};
use super::slots::{Heights, Links};

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
pub(super) const TRACK: f64 = 8.0;
/// Widest picture whose labels are words; else they are signs.
const WIDEST: f64 = 1300.0;
/// Narrowest picture.
const NARROWEST: f64 = 720.0;
/// The word at the branches of a race.
pub(super) const RACE: &str = "race";
/// Room that this word takes above its line, and below.
pub(super) const RACE_HEIGHTS: (f64, f64) = (13.0, 4.0);

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

impl Frame {
    pub fn new(map: &Map<'_>) -> Frame {
        let chosen = Chosen::of(map);
        let grid = Grid::new(map, &chosen);
        let spacious = Frame::with(map, &chosen, &grid, Style::Words);
        if spacious.width <= WIDEST { spacious } else { Frame::with(map, &chosen, &grid, Style::Signs) }
    }

    fn with(map: &Map<'_>, chosen: &Chosen, grid: &Grid, style: Style) -> Frame {
        let texts = Texts::new(map, &grid.varying, style == Style::Signs && !chosen.single.is_empty());
        let links = links(map, chosen, grid, style);
        let lines = 1 + texts.variables.lines + texts.outputs.lines;
        let headings_y = TITLE + LINE;
        let rule_y = headings_y + texts.heading.lines.max(1) as f64 * BOX_LINE - 6.0;
        let heights = links.heights(lines as f64 * BOX_LINE + 12.0, rule_y + 4.0);
        let wide = texts.inside + 2.0 * PAD;
        let mut places = Places::new(&links, &heights, wide, MARGIN);
        let width = (places.right + MARGIN).max(NARROWEST).ceil();
        // a narrow map stands in the middle
        let shift = ((width - places.right - MARGIN) / 2.0).floor();
        if shift > 0.0 {
            places = Places::new(&links, &heights, wide, MARGIN + shift);
        }
        let blocks = blocks(map, grid, &texts, &heights, &places);
        let ways = ways(map, &links, &heights, &places);
        let column = |column: usize| places.columns[column];
        let headings = grid.columns.iter().enumerate().map(|(i, inputs)| {
            let lines = texts.heading.lines(|net| inputs.get(net.index()));
            (column(i), lines)
        });
        let headings = headings.collect();
        let notes = captions::notes(map, chosen, grid, &texts, style, width - 2.0 * MARGIN);
        let key = captions::key(map, chosen, style, width - 2.0 * MARGIN);
        let mut y = heights.bottom + 8.0;
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

/// Arrows with their labels, those of steps first.
fn links<'a>(map: &Map<'_>, chosen: &'a Chosen, grid: &'a Grid, style: Style) -> Links<'a> {
    let arrows: Vec<&Arrow> = chosen.steps.iter().chain(&chosen.single).collect();
    let from = |arrow: &Arrow| &map.flow.table.states[arrow.from as usize].values;
    let label = |(i, arrow): (usize, &&Arrow)| Label::of(map.scenario, arrow, from(arrow), style, i + 1);
    let labels = arrows.iter().enumerate().map(label).collect();
    Links::new(grid, arrows, labels)
}

fn blocks(map: &Map<'_>, grid: &Grid, texts: &Texts, heights: &Heights, places: &Places) -> Vec<Block> {
    let table = &map.flow.table;
    let block = |node: &Node| {
        let (mut variables, mut outputs) = (Vec::new(), Vec::new());
        let (mut is_start, mut is_reachable) = (false, true);
        if let Place::State(number) = node.place {
            let state = &table.states[number as usize];
            (variables, outputs) = texts.of_state(&state.values);
            is_start = table.start.contains(&number);
            is_reachable = state.reachable;
        }
        let (y, height) = heights.rows[node.row];
        let x = places.columns[node.column];
        Block { place: node.place, x, y, height, variables, outputs, is_start, is_reachable }
    };
    grid.nodes.iter().map(block).collect()
}

fn ways(map: &Map<'_>, links: &Links<'_>, heights: &Heights, places: &Places) -> Vec<Way> {
    let way = |(i, arrow): (usize, &&Arrow)| {
        let (branches, fork) = places.corners(links, heights, i);
        Way {
            branches,
            rightwards: links.gaps[i].rightwards,
            label: links.labels[i].clone(),
            fork,
            is_step: !arrow.moments.is_empty(),
            sure: arrow.sure,
            title: captions::arrow(map, arrow),
        }
    };
    links.arrows.iter().enumerate().map(way).collect()
}

//! The flow map: a flow table drawn as a state graph.
//!
//! One column an input vector, in the order of a Karnaugh map that begins at the start; one box a stable state; one arrow a
//! change. Arrows run between columns and in lanes between rows, never through a box: every box of a row
//! has the same height, and each end of an arrow has a height of its own, so that no two arrows lie on each other.

mod arrows;
mod boxes;
mod captions;
mod choose;
mod draw;
mod frame;
mod grid;
mod labels;
mod lanes;
mod layout;
mod legend;
mod slots;
#[cfg(test)]
mod tests;
mod tracks;

use crate::circuit::NetId;
use crate::flow::{Flow, StateNumber};
use crate::scenario::Scenario;

/// Most columns of a whole map; above, only what the steps touch is drawn.
pub const MOST_COLUMNS: usize = 12;
/// Most boxes of a whole map; above, only what the steps touch is drawn.
pub const MOST_BOXES: usize = 60;
/// Most arrows for steps, and most arrows for changes that no step makes; of more of the latter none is drawn.
pub const MOST_ARROWS: usize = 120;

/// What is drawn.
#[derive(Clone, Copy, Debug)]
pub struct Map<'a> {
    /// Names and title.
    pub scenario: &'a Scenario,
    /// The flow table.
    pub flow: &'a Flow,
    /// The nets that tell stable states of one input vector apart: bold in the boxes.
    pub state_variables: &'a [NetId],
    /// Begins every XML id in the picture, so that several pictures can stand in one page: letters, digits, `-`.
    pub id: &'a str,
}

/// The map as a complete SVG element with a text alternative. The same input gives the same bytes.
///
/// A table that is too large is cut to what the steps touch, and to the first that fit; the caption says so.
pub fn svg(map: &Map<'_>) -> String {
    draw::svg(map, &frame::Frame::new(map))
}

/// Where something is on a map, pixels.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Area {
    /// Left edge.
    pub x: f64,
    /// Top.
    pub y: f64,
    /// Width.
    pub width: f64,
    /// Height.
    pub height: f64,
}

/// The map, its width and height, and where the box of each state is that it shows, so that something can be drawn over it.
pub fn with_boxes(map: &Map<'_>) -> (String, (f64, f64), Vec<(StateNumber, Area)>) {
    let frame = frame::Frame::new(map);
    let boxes = frame.blocks.iter().filter_map(|block| match block.place {
        arrows::Place::State(number) => {
            Some((number, Area { x: block.x, y: block.y, width: frame.wide, height: block.height }))
        }
        _ => None,
    });
    let boxes = boxes.collect();
    (draw::svg(map, &frame), (frame.width, frame.height), boxes)
}

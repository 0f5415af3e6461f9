//! The line of one net: levels and vertical edges, hatched where the value is unknown, solid where edges are closer than
//! a pixel.

use crate::logic::Value;
use crate::output::waves::axis::Axis;
use crate::time::Time;

/// Edges closer than this, in pixels, may become a block.
const COLUMN: f64 = 1.0;
/// Fewer edges are never made a block: a lone glitch stays a line of its own.
const FEWEST: usize = 4;

/// A net's transitions in the time of a picture.
pub(super) struct Wave {
    pub before: Value,
    pub edges: Vec<(Time, Value)>,
}

impl Wave {
    /// The transitions of a net from `range.0` (not included: they are `before`) to `range.1`.
    pub fn of(start: Value, changes: &[(Time, Value)], range: (Time, Time), from_start: bool) -> Wave {
        let inside = |at: Time| (at > range.0 || from_start) && at <= range.1;
        let earlier = changes.iter().rev().find(|change| change.0 <= range.0 && !from_start);
        Wave {
            before: earlier.map_or(start, |change| change.1),
            edges: changes.iter().copied().filter(|change| inside(change.0)).collect(),
        }
    }
}

/// What is drawn of one wave.
#[derive(Debug, Default, PartialEq)]
pub(super) struct Line {
    /// SVG path data of levels and edges.
    pub path: String,
    /// Stretches of X: from, to.
    pub unknown: Vec<(f64, f64)>,
    /// Solid blocks: from, to.
    pub blocks: Vec<(f64, f64)>,
}

/// Draws a wave between two pixels; `top` is the height of 1 and `bottom` of 0. Where `solid`, close edges become blocks.
pub(super) fn line(wave: &Wave, axis: &Axis, ends: (f64, f64), top: f64, bottom: f64, solid: bool) -> Line {
    let mut line = Line::default();
    let mut pen = Pen { line: &mut line, top, bottom, at: None };
    let (mut x, mut value) = (ends.0, wave.before);
    let edges: Vec<(f64, Value)> = wave.edges.iter().map(|(at, value)| (axis.x(*at), *value)).collect();
    let mut i = 0;
    while i < edges.len() {
        let mut last = i;
        while solid && last + 1 < edges.len() && edges[last + 1].0 - edges[last].0 < COLUMN {
            last += 1;
        }
        if last + 1 - i >= FEWEST {
            pen.level(x, edges[i].0, value);
            pen.block(edges[i].0, edges[last].0);
            (x, value) = edges[last];
            i = last + 1;
        } else {
            pen.level(x, edges[i].0, value);
            (x, value) = edges[i];
            i += 1;
        }
    }
    pen.level(x, ends.1, value);
    line
}

struct Pen<'a> {
    line: &'a mut Line,
    top: f64,
    bottom: f64,
    /// Where the pen stands, if it is down.
    at: Option<(f64, f64)>,
}

impl Pen<'_> {
    fn level(&mut self, from: f64, to: f64, value: Value) {
        let y = match value {
            Value::Zero => self.bottom,
            Value::One => self.top,
            Value::X => {
                self.at = None;
                self.line.unknown.push((from, to));
                return;
            }
        };
        let (x, target) = (number(from), number(y));
        match self.at {
            Some((_, before)) if before == y => {}
            Some(_) => self.line.path += &format!("V{target}"),
            None => self.line.path += &format!("M{x} {target}"),
        }
        self.line.path += &format!("H{}", number(to));
        self.at = Some((to, y));
    }

    fn block(&mut self, from: f64, to: f64) {
        self.line.blocks.push((from, to));
        self.at = None;
    }
}

/// A pixel with at most two decimals.
pub(super) fn number(pixel: f64) -> String {
    let text = format!("{pixel:.2}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" { "0".to_string() } else { text.to_string() }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::time::Unit;

    fn wave(before: Value, edges: &[(u64, Value)]) -> Wave {
        Wave { before, edges: edges.iter().map(|(ns, value)| (Time::from_fs(ns * 1_000_000), *value)).collect() }
    }

    fn axis(ns: u64) -> Axis {
        Axis::new((Time::ZERO, Time::from_fs(ns * 1_000_000)), &[], &[], (0.0, 100.0), Unit::Ns)
    }

    #[test]
    fn levels_and_edges() {
        let wave = wave(Value::Zero, &[(10, Value::One), (20, Value::Zero)]);
        let line = line(&wave, &axis(100), (0.0, 100.0), 5.0, 20.0, false);
        assert_eq!(line.path, "M0 20H10V5H20V20H100");
    }

    #[test]
    fn the_shortest_glitch_keeps_its_edges() {
        let fs = Time::from_fs(50_000_000);
        let wave = Wave { before: Value::One, edges: vec![(fs, Value::Zero), (Time::from_fs(50_000_001), Value::One)] };
        let line = line(&wave, &axis(100), (0.0, 100.0), 5.0, 20.0, true);
        assert_eq!(line.path, "M0 5H50V20H50V5H100");
        assert!(line.blocks.is_empty());
    }

    #[test]
    fn close_edges_become_one_block() {
        let edges: Vec<(u64, Value)> = (0..200).map(|i| (4000 + i, Value::from(i % 2 == 0))).collect();
        let line = line(&wave(Value::Zero, &edges), &axis(10_000), (0.0, 100.0), 5.0, 20.0, true);
        assert_eq!(line.path, "M0 20H40M41.99 20H100");
        assert_eq!(line.blocks.len(), 1);
    }

    #[test]
    fn unknown_values_lift_the_pen() {
        let wave = wave(Value::X, &[(10, Value::One), (30, Value::X), (60, Value::Zero)]);
        let line = line(&wave, &axis(100), (0.0, 100.0), 5.0, 20.0, false);
        assert_eq!(line.path, "M10 5H30M60 20H100");
        assert_eq!(line.unknown, vec![(0.0, 10.0), (30.0, 60.0)]);
    }

    #[test]
    fn a_part_of_a_run_begins_with_the_value_it_has_there() {
        let time = |ns: u64| Time::from_fs(ns);
        let all = [(time(5), Value::One), (time(10), Value::Zero), (time(15), Value::One)];
        let part = Wave::of(Value::Zero, &all, (time(5), time(12)), false);
        assert_eq!((part.before, part.edges), (Value::One, vec![(time(10), Value::Zero)]));
        let at_once = Wave::of(Value::X, &[(time(0), Value::One)], (time(0), time(12)), true);
        assert_eq!((at_once.before, at_once.edges.len()), (Value::X, 1));
    }
}

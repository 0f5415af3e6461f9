//! Where the labels of steps go: in full on up to three rows, or as numbers with a key below the picture.

use super::frame::LINE;
use super::marks::Step;
use crate::output::ink::SMALL;
use crate::output::measure::{Rows, cut_end, width};

/// Rows of full labels, each of two lines.
const ROWS: usize = 3;
/// From the line to its label.
pub(super) const OFFSET: f64 = 3.0;
/// From a label to the next line.
const GAP: f64 = 5.0;
/// Widest label that is shown in full.
const WIDEST: f64 = 300.0;
/// Lines closer than this are drawn once.
const CLOSE: f64 = 1.5;
/// Most steps whose labels may stand in full.
const MOST_FULL: usize = 60;

/// The labels of all steps.
#[derive(Debug, Default)]
pub(super) struct Flags {
    pub flags: Vec<Flag>,
    /// Rows in use; row 0 is the lowest.
    pub rows: usize,
    /// Do labels have a second line (what the step sets)?
    pub two_lines: bool,
    /// Steps are numbered, and a key must say which is which.
    pub numbered: bool,
}

impl Flags {
    /// From one row of labels to the next.
    pub fn pitch(&self) -> f64 {
        if self.two_lines { 2.0 * LINE - 2.0 } else { LINE }
    }
}

/// The label of one step, as shown. Either text may be empty.
#[derive(Debug, PartialEq)]
pub(super) struct Flag {
    pub x: f64,
    pub row: usize,
    pub label: String,
    pub sets: String,
    pub is_tick: bool,
    /// The label ends at the line instead of beginning there.
    pub leftwards: bool,
    /// Its line is drawn: lines closer than two pixels become one.
    pub is_drawn: bool,
}

/// Places the labels of steps at these pixels, in order, between two ends.
pub(super) fn place(steps: &[(f64, &Step)], ends: (f64, f64)) -> Flags {
    let named: Vec<usize> = (0..steps.len()).filter(|i| !steps[*i].1.is_tick).collect();
    let mut flags: Vec<Flag> = steps
        .iter()
        .map(|(x, step)| Flag {
            x: *x,
            row: 0,
            label: String::new(),
            sets: String::new(),
            is_tick: step.is_tick,
            leftwards: false,
            is_drawn: true,
        })
        .collect();
    let mut last = f64::MIN;
    for flag in &mut flags {
        flag.is_drawn = flag.x - last >= CLOSE;
        last = if flag.is_drawn { flag.x } else { last };
    }
    if let Some(rows) = in_full(steps, &named, ends) {
        for (i, row) in named.iter().zip(&rows) {
            let step = steps[*i].1;
            flags[*i].row = row.0;
            flags[*i].leftwards = row.1;
            flags[*i].label.clone_from(&step.label);
            flags[*i].sets.clone_from(&step.sets);
        }
        let two_lines = named.iter().any(|i| !steps[*i].1.sets.is_empty());
        return Flags { flags, rows: rows.iter().map(|row| row.0 + 1).max().unwrap_or(0), two_lines, numbered: false };
    }
    by_number(steps, &named, ends.1, &mut flags);
    Flags { flags, rows: 1, two_lines: false, numbered: true }
}

/// Rows for full labels, and which of them stand left of their line. `None` if that takes too many rows.
///
/// A label lies above every line that passes below its text; of two labels that overlap otherwise the earlier lies above.
fn in_full(steps: &[(f64, &Step)], named: &[usize], ends: (f64, f64)) -> Option<Vec<(usize, bool)>> {
    if named.len() > MOST_FULL {
        return None;
    }
    let mut boxes = Vec::with_capacity(named.len());
    for (x, step) in named.iter().map(|i| steps[*i]) {
        let wide = OFFSET + width(&step.label, SMALL).max(width(&step.sets, SMALL));
        let leftwards = x + wide > ends.1;
        if wide > WIDEST || (leftwards && x - wide < ends.0) {
            return None;
        }
        let (from, to) = if leftwards { (x - wide, x) } else { (x, x + wide) };
        boxes.push((x, from, to, leftwards));
    }
    let mut above = Vec::new();
    for (k, &(x, from, to, _)) in boxes.iter().enumerate() {
        for (l, &(line, start, end, leftwards)) in boxes.iter().enumerate() {
            let passes = from - GAP < line && line < to + GAP && (line != x || k < l);
            let below = start - GAP < x && x < end + GAP;
            let hidden = leftwards && k < l && !below && from < end + GAP && start < to + GAP;
            if k != l && (passes || hidden) {
                above.push((k, l));
            }
        }
    }
    let mut rows = vec![0usize; boxes.len()];
    let mut settled = false;
    while !settled {
        settled = true;
        for &(high, low) in &above {
            if rows[high] <= rows[low] {
                rows[high] = rows[low] + 1;
                settled = false;
                if rows[high] >= ROWS {
                    return None;
                }
            }
        }
    }
    Some(rows.into_iter().zip(boxes.iter().map(|it| it.3)).collect())
}

/// Numbers, with as much of the label as fits before the next line; a number without room is left to the key.
fn by_number(steps: &[(f64, &Step)], named: &[usize], right: f64, flags: &mut [Flag]) {
    let mut room = Rows::new(1);
    for (k, i) in named.iter().enumerate() {
        let (x, step) = steps[*i];
        let next = named.get(k + 1).map_or(right, |next| steps[*next].0);
        let number = (k + 1).to_string();
        let full = format!("{number} {}", step.label);
        let text = match cut_end(&full, SMALL, next - x - OFFSET - GAP) {
            None => full,
            Some(cut) if cut.chars().count() > number.len() + 4 => cut,
            Some(_) => number,
        };
        if room.place(x, x + OFFSET + width(&text, SMALL) + 1.0).is_some() {
            flags[*i].label = text;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::time::Time;

    fn step(label: &str) -> Step {
        Step { at: Time::ZERO, label: label.into(), sets: "a 0→1".into(), is_tick: false }
    }

    #[test]
    fn a_label_lies_above_the_lines_that_pass_it() {
        let steps = [step("both let go, then both call"), step("together"), step("apart")];
        let at: Vec<(f64, &Step)> = [100.0, 180.0, 500.0].into_iter().zip(&steps).collect();
        let flags = place(&at, (0.0, 900.0));
        assert!(!flags.numbered);
        assert_eq!(flags.flags.iter().map(|flag| flag.row).collect::<Vec<_>>(), [1, 0, 0]);
    }

    #[test]
    fn a_label_without_room_at_the_right_stands_left_of_its_line() {
        let steps = [step("lower lets go"), step("both call together")];
        let at: Vec<(f64, &Step)> = [700.0, 850.0].into_iter().zip(&steps).collect();
        let flags = place(&at, (0.0, 900.0));
        assert!(flags.flags[1].leftwards && !flags.flags[0].leftwards);
        assert_ne!(flags.flags[0].row, flags.flags[1].row, "their texts overlap");
    }

    #[test]
    fn steps_of_one_instant_stand_above_each_other() {
        let steps = [step("one"), step("two")];
        let at: Vec<(f64, &Step)> = [100.0, 100.0].into_iter().zip(&steps).collect();
        let flags = place(&at, (0.0, 900.0));
        assert_eq!(flags.flags.iter().map(|flag| flag.row).collect::<Vec<_>>(), [1, 0]);
    }

    #[test]
    fn many_steps_get_numbers_that_do_not_overlap() {
        let steps: Vec<Step> = (0..40).map(|i| step(&format!("step {i}"))).collect();
        let at: Vec<(f64, &Step)> = steps.iter().enumerate().map(|(i, step)| (100.0 + 20.0 * i as f64, step)).collect();
        let flags = place(&at, (0.0, 950.0));
        assert!(flags.numbered);
        for pair in flags.flags.windows(2) {
            assert!(pair[0].x + OFFSET + width(&pair[0].label, SMALL) < pair[1].x, "{pair:?}");
        }
    }
}

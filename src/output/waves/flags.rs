//! Where the labels of steps go: in full on up to three rows, or as numbers with a key below the picture.

use super::marks::Step;
use crate::output::ink::SMALL;
use crate::output::measure::{Rows, cut_end, width};

/// Rows of full labels, each of two lines.
const ROWS: usize = 3;
/// From the line to its label.
pub(super) const OFFSET: f64 = 3.0;
/// From a label to the next line.
const GAP: f64 = 8.0;

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

/// The label of one step, as shown. Either text may be empty.
#[derive(Debug, PartialEq)]
pub(super) struct Flag {
    pub x: f64,
    pub row: usize,
    pub label: String,
    pub sets: String,
    pub is_tick: bool,
}

/// Places the labels of steps at these pixels, in order; nothing may pass `right`.
pub(super) fn place(steps: &[(f64, &Step)], right: f64) -> Flags {
    let named: Vec<usize> = (0..steps.len()).filter(|i| !steps[*i].1.is_tick).collect();
    let mut flags: Vec<Flag> = steps
        .iter()
        .map(|(x, step)| Flag { x: *x, row: 0, label: String::new(), sets: String::new(), is_tick: step.is_tick })
        .collect();
    if let Some(rows) = in_full(steps, &named, right) {
        for (i, row) in named.iter().zip(&rows) {
            let step = steps[*i].1;
            flags[*i].row = *row;
            flags[*i].label.clone_from(&step.label);
            flags[*i].sets.clone_from(&step.sets);
        }
        let two_lines = named.iter().any(|i| !steps[*i].1.sets.is_empty());
        return Flags { flags, rows: rows.iter().max().map_or(0, |most| most + 1), two_lines, numbered: false };
    }
    by_number(steps, &named, right, &mut flags);
    Flags { flags, rows: 1, two_lines: false, numbered: true }
}

/// Rows for full labels: a label lies above every line that passes below its text. `None` if that takes too many.
fn in_full(steps: &[(f64, &Step)], named: &[usize], right: f64) -> Option<Vec<usize>> {
    let mut rows = vec![0usize; named.len()];
    for (k, i) in named.iter().enumerate().rev() {
        let (x, step) = steps[*i];
        let end = x + OFFSET + width(&step.label, SMALL).max(width(&step.sets, SMALL));
        if end > right {
            return None;
        }
        let below = (k + 1..named.len()).filter(|later| steps[named[*later]].0 < end + GAP).map(|later| rows[later]);
        rows[k] = below.max().map_or(0, |row| row + 1);
        if rows[k] >= ROWS {
            return None;
        }
    }
    Some(rows)
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
        let flags = place(&at, 900.0);
        assert!(!flags.numbered);
        assert_eq!(flags.flags.iter().map(|flag| flag.row).collect::<Vec<_>>(), [1, 0, 0]);
    }

    #[test]
    fn many_steps_get_numbers_that_do_not_overlap() {
        let steps: Vec<Step> = (0..40).map(|i| step(&format!("step {i}"))).collect();
        let at: Vec<(f64, &Step)> = steps.iter().enumerate().map(|(i, step)| (100.0 + 20.0 * i as f64, step)).collect();
        let flags = place(&at, 950.0);
        assert!(flags.numbered);
        for pair in flags.flags.windows(2) {
            assert!(pair[0].x + OFFSET + width(&pair[0].label, SMALL) < pair[1].x, "{pair:?}");
        }
    }
}

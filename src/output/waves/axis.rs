//! The time axis: from exact times to pixels, with long quiet stretches cut out, and round ticks.

use crate::output::ink::SMALL;
use crate::output::measure::{Rows, width};
use crate::time::{Time, Unit};

/// Most stretches that are cut out of one picture.
const MOST_CUTS: usize = 24;
/// Quiet stretches are cut only where the longest stretch of activity would be narrower than this, in pixels.
const CRAMMED: f64 = 25.0;

/// A linear piece of the axis.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Piece {
    from: u64,
    to: u64,
    left: f64,
    right: f64,
}

/// A stretch that was cut out, between two pieces.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Cut {
    pub left: f64,
    pub right: f64,
    pub from: Time,
    pub to: Time,
}

/// One tick. A tick without room for its label has none.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Tick {
    pub x: f64,
    pub label: Option<String>,
}

/// The time axis of one picture.
#[derive(Clone, Debug)]
pub(super) struct Axis {
    pieces: Vec<Piece>,
    /// The unit of tick labels.
    pub unit: Unit,
}

impl Axis {
    /// An axis from `from` to `to` between two pixels; `busy` are the instants, in order, at which something happens; nothing
    /// is cut out of the stretches `whole`, which begin and end at such instants, in order and apart from each other.
    pub fn new(range: (Time, Time), busy: &[Time], whole: &[(Time, Time)], ends: (f64, f64), unit: Unit) -> Axis {
        let (left, right) = ends;
        let (from, to) = (range.0.fs(), range.1.fs().max(range.0.fs() + 1));
        let mut points = vec![from];
        points.extend(busy.iter().map(|at| at.fs()).filter(|at| from < *at && *at < to));
        points.push(to);
        points.dedup();
        let cuts = quiet(&points, whole, right - left);
        let gap = if cuts.is_empty() { 0.0 } else { (360.0 / cuts.len() as f64).clamp(9.0, 26.0) };
        let shown = (to - from - cuts.iter().map(|cut| cut.1 - cut.0).sum::<u64>()) as f64;
        let scale = (right - left - gap * cuts.len() as f64) / shown;
        let mut pieces = Vec::with_capacity(cuts.len() + 1);
        let (mut start, mut x) = (from, left);
        for end in cuts.iter().map(|cut| cut.0).chain([to]) {
            let wide = (end - start) as f64 * scale;
            pieces.push(Piece { from: start, to: end, left: x, right: x + wide });
            x += wide + gap;
            start = cuts.get(pieces.len() - 1).map_or(to, |cut| cut.1);
        }
        Axis { pieces, unit: fitting(unit, to, shown) }
    }

    /// The pixel of an instant; instants outside come at the ends.
    pub fn x(&self, at: Time) -> f64 {
        let at = at.fs();
        let after = self.pieces.partition_point(|piece| piece.to < at);
        let Some(piece) = self.pieces.get(after) else { return self.right() };
        let between = |a: u64, b: u64, left: f64, right: f64| left + (at - a) as f64 / (b - a) as f64 * (right - left);
        match after.checked_sub(1).map(|before| self.pieces[before]) {
            _ if at >= piece.from => between(piece.from, piece.to, piece.left, piece.right),
            Some(before) => between(before.to, piece.from, before.right, piece.left),
            None => piece.left,
        }
    }

    fn right(&self) -> f64 {
        self.pieces.last().map_or(0.0, |piece| piece.right)
    }

    /// The straight pieces: from, to, and the pixels of both.
    pub fn pieces(&self) -> Vec<(Time, Time, f64, f64)> {
        let piece = |it: &Piece| (Time::from_fs(it.from), Time::from_fs(it.to), it.left, it.right);
        self.pieces.iter().map(piece).collect()
    }

    /// The stretches that were cut out.
    pub fn cuts(&self) -> impl Iterator<Item = Cut> + '_ {
        self.pieces.windows(2).map(|pair| Cut {
            left: pair[0].right,
            right: pair[1].left,
            from: Time::from_fs(pair[0].to),
            to: Time::from_fs(pair[1].from),
        })
    }

    /// Round ticks, in order. Every piece between cuts has at least one with a label, where there is room.
    pub fn ticks(&self) -> Vec<Tick> {
        let shown: u64 = self.pieces.iter().map(|piece| piece.to - piece.from).sum();
        let step = round_above(shown / 9);
        let mut ticks = Vec::new();
        for piece in &self.pieces {
            // a piece between cuts needs two labels to show its scale, where it has room for them
            let wanted = if piece.right - piece.left > 110.0 { 2 } else { 1 };
            let mut fine = step;
            while fine > 1 && piece.from.next_multiple_of(fine) + (wanted - 1) * fine > piece.to {
                fine = round_below(fine);
            }
            let mut first = true;
            let mut at = piece.from.next_multiple_of(fine);
            while at <= piece.to {
                ticks.push((Time::from_fs(at), first));
                first = false;
                at += fine;
            }
        }
        let mut room = Rows::new(1);
        let mut labels: Vec<Option<String>> = vec![None; ticks.len()];
        // the first of each piece comes first, so that no piece stays without a label while there is room
        for wanted in [true, false] {
            for (label, (at, first)) in labels.iter_mut().zip(&ticks) {
                let text = at.from_start().decimal(self.unit).to_string();
                let (x, half) = (self.x(*at), width(&text, SMALL) / 2.0 + 5.0);
                if *first == wanted && room.place(x - half, x + half).is_some() {
                    *label = Some(text);
                }
            }
        }
        ticks.iter().zip(labels).map(|((at, _), label)| Tick { x: self.x(*at), label }).collect()
    }
}

/// The stretches to cut out: long ones without a change, as long as they leave no room for the rest.
///
/// In each round the longest stretches left (those not much shorter than the longest) are cut if together they are a good
/// part of the picture and everything between them would be crammed without that.
fn quiet(points: &[u64], whole: &[(Time, Time)], pixels: f64) -> Vec<(u64, u64)> {
    let (first, last) = (points[0], points[points.len() - 1]);
    let is_whole = |gap: &(u64, u64)| {
        let behind = whole.partition_point(|stretch| stretch.1.fs() <= gap.0);
        whole.get(behind).is_some_and(|stretch| stretch.0.fs() < gap.1)
    };
    let mut gaps: Vec<(u64, u64)> =
        points.windows(2).map(|pair| (pair[0], pair[1])).filter(|gap| !is_whole(gap)).collect();
    let length = |gap: &(u64, u64)| gap.1 - gap.0;
    gaps.sort_by_key(|gap| (std::cmp::Reverse(length(gap)), gap.0));
    let mut left = last - first;
    let mut many = 0;
    while let Some(longest) = gaps.get(many) {
        let alike = |gap: &&(u64, u64)| length(gap) as f64 >= 0.4 * length(longest) as f64;
        let next = many + gaps[many..].iter().take_while(alike).count();
        let sum: u64 = gaps[many..next].iter().map(length).sum();
        let crammed = longest_activity(first, last, &gaps[..next]) as f64 / left as f64 * pixels < CRAMMED;
        if next > MOST_CUTS || next == points.len() - 1 || (sum as f64) < 0.4 * left as f64 || !crammed {
            break;
        }
        (many, left) = (next, left - sum);
    }
    let Some(least) = many.checked_sub(1).map(|shortest| length(&gaps[shortest])) else { return Vec::new() };
    gaps.truncate(many);
    gaps.sort_unstable();
    // both sides of a cut keep a little quiet, so that levels before and after can be seen
    let keep = (least / 4).min(left / (4 * many as u64)).max(1);
    gaps.into_iter().map(|(from, to)| (from + keep, to - keep)).filter(|(from, to)| from < to).collect()
}

/// The longest stretch between two of these gaps.
fn longest_activity(first: u64, last: u64, gaps: &[(u64, u64)]) -> u64 {
    let mut gaps = gaps.to_vec();
    gaps.sort_unstable();
    let begins = std::iter::once(first).chain(gaps.iter().map(|gap| gap.1));
    let ends = gaps.iter().map(|gap| gap.0).chain([last]);
    begins.zip(ends).map(|(from, to)| to - from).max().unwrap_or(0)
}

/// The unit for labels: the scenario's, or another where its numbers would be very long.
fn fitting(unit: Unit, to: u64, shown: f64) -> Unit {
    let mut at = Unit::ALL.iter().position(|it| *it == unit).unwrap_or_default();
    while at + 1 < Unit::ALL.len() && to / Unit::ALL[at].femtoseconds() >= 200_000 {
        at += 1;
    }
    while at > 0 && shown / (Unit::ALL[at].femtoseconds() as f64) < 0.02 {
        at -= 1;
    }
    Unit::ALL[at]
}

/// The least number of the form 1, 2, 5 times a power of ten that is greater than `least`.
fn round_above(least: u64) -> u64 {
    let mut power = 1u64;
    loop {
        for digit in [1, 2, 5] {
            if digit * power > least {
                return digit * power;
            }
        }
        power *= 10;
    }
}

/// The round number below a round number greater than 1.
fn round_below(round: u64) -> u64 {
    let leading = round.to_string().starts_with('5');
    if leading { round / 5 * 2 } else { round / 2 }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ns(values: &[u64]) -> Vec<Time> {
        values.iter().map(|ns| Time::from_fs(ns * 1_000_000)).collect()
    }

    fn axis(to: u64, busy: &[u64]) -> Axis {
        Axis::new((Time::ZERO, ns(&[to])[0]), &ns(busy), &[], (100.0, 900.0), Unit::Ns)
    }

    #[test]
    fn without_cuts_the_axis_is_linear() {
        let axis = axis(100, &[10, 20, 30, 70]);
        assert_eq!(axis.cuts().count(), 0);
        assert_eq!(axis.x(ns(&[25])[0]), 300.0);
        assert_eq!(axis.x(ns(&[500])[0]), 900.0);
    }

    #[test]
    fn one_long_quiet_stretch_is_cut_and_labels_stay_true() {
        let axis = axis(10_010, &[1, 2, 3, 10_001, 10_002, 10_004]);
        let cuts: Vec<Cut> = axis.cuts().collect();
        assert_eq!(cuts.len(), 1, "{axis:?}");
        assert!(cuts[0].from > ns(&[3])[0] && cuts[0].to < ns(&[10_001])[0]);
        assert!(axis.x(ns(&[3])[0]) > 200.0, "what happens has room");
        assert!(axis.x(ns(&[10_001])[0]) > axis.x(ns(&[3])[0]));
        let labels: Vec<String> = axis.ticks().into_iter().filter_map(|tick| tick.label).collect();
        assert!(labels.iter().any(|label| label == "5") && labels.iter().any(|label| label.starts_with("1000")));
    }

    #[test]
    fn a_stretch_in_which_something_may_happen_is_never_cut() {
        let busy = ns(&[1, 2, 3, 5_000, 10_001, 10_002, 10_004]);
        let whole = [(busy[3], busy[4])];
        let end = ns(&[10_010])[0];
        let cut = |whole: &[(Time, Time)]| -> Vec<Cut> {
            Axis::new((Time::ZERO, end), &busy, whole, (100.0, 900.0), Unit::Ns).cuts().collect()
        };
        assert!(cut(&[]).iter().any(|it| busy[3] < it.from && it.to < busy[4]), "it is cut without that");
        assert!(cut(&whole).iter().all(|it| it.to <= busy[3] || busy[4] <= it.from), "{:?}", cut(&whole));
    }

    #[test]
    fn equal_quiet_stretches_are_all_cut() {
        let busy: Vec<u64> = (1..6).flat_map(|k| [k * 1000, k * 1000 + 7, k * 1000 + 9]).collect();
        assert_eq!(axis(5100, &busy).cuts().count(), 5);
    }

    #[test]
    fn readable_pictures_are_left_alone() {
        assert_eq!(axis(700, &[100, 110, 130, 250, 262, 280, 480, 490, 505]).cuts().count(), 0);
        let uneven = [100, 103, 104, 115, 130, 131, 180, 183, 190, 195, 206, 230, 235, 290];
        assert_eq!(axis(300, &uneven).cuts().count(), 0, "gaps of all lengths");
        assert_eq!(axis(1000, &[1000]).cuts().count(), 0, "a single event needs no room");
        assert_eq!(axis(1000, &[]).cuts().count(), 0);
    }

    #[test]
    fn five_to_ten_round_ticks() {
        for to in [1u64, 3, 7, 10, 44, 99, 100, 101, 520, 999, 12_345] {
            let ticks = axis(to, &[]).ticks();
            assert!((5..=10).contains(&ticks.len()), "{to} ns: {} ticks", ticks.len());
            assert!(ticks.iter().all(|tick| tick.label.is_some()), "{to} ns");
        }
    }

    #[test]
    fn order_is_kept_everywhere() {
        let axis = axis(10_010, &[1, 2, 3, 10_001, 10_002, 10_004]);
        let xs: Vec<f64> = (0..1001).map(|k| axis.x(ns(&[k * 10])[0])).collect();
        assert!(xs.is_sorted());
    }

    #[test]
    fn the_longest_run_has_an_axis() {
        let end = Time::from_fs((1 << 63) - 1);
        let axis = Axis::new((Time::ZERO, end), &[Time::from_fs(1 << 62)], &[], (0.0, 800.0), Unit::Fs);
        assert!((5..=10).contains(&axis.ticks().len()));
        assert_eq!(axis.unit, Unit::S);
    }
}

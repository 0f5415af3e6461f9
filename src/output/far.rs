//! What lies far behind the rest of a histogram: a break of the axis, and behind it what comes later, in its order.

use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use crate::output::charts::{Area, Drawn, Mark, rgb, small};
use crate::output::{ink, words};
use crate::sweep::Settling;
use crate::time::Span;

/// A line is far where it is so many times as far from the earliest window as the last bar of the common width.
const FAR: u128 = 8;
/// Room for the break and for what is said of it, pixels.
const BREAK: u32 = 44;
/// Room for each line behind it, pixels.
const SLOT: u32 = 36;

/// From, up to but not including, count.
type Bar = (Span, Span, u64);

/// What stands behind the break, in order; nothing: there is no break.
pub(super) struct Far {
    slots: Vec<Span>,
    /// The latest of the windows that settle far later.
    latest: Option<Span>,
}

impl Far {
    /// What of a histogram and its lines is far. Adds the line of the windows that settle far later, if any do.
    pub fn of(settling: &Settling, marks: &mut Vec<Mark>) -> Far {
        let (bars, far) = split(settling);
        let latest = far.map(|bar| Span::from_fs(bar.1.fs().saturating_sub(1)));
        let end = bars.last().map_or(Span::ZERO, |bar| bar.1);
        // a line among the far windows stands in their bar, so that all that is behind the break is in order
        let from = match (latest, bars.first()) {
            (Some(_), _) => Some(end),
            (None, Some(first)) if bars.len() > 1 => {
                let reach = u128::from(first.0.fs()) + FAR * u128::from((end - first.0).fs());
                u64::try_from(reach).ok().map(Span::from_fs)
            }
            (None, _) => None,
        };
        if let (Some(latest), Some(bar)) = (latest, far) {
            let many = words::many(bar.2, "draw");
            let label = format!("later than {}: {many}, up to {}", end.rounded(), latest.rounded());
            marks.push(Mark { at: latest, label, ink: ink::INK });
        }
        let mut slots: Vec<Span> =
            marks.iter().map(|mark| mark.at).filter(|at| from.is_some_and(|it| *at > it)).collect();
        slots.sort_unstable();
        slots.dedup();
        Far { slots, latest }
    }

    /// The bars of the common width.
    pub fn common<'a>(&self, settling: &'a Settling) -> &'a [Bar] {
        split(settling).0
    }

    /// Is it behind the break?
    pub fn has(&self, at: Span) -> bool {
        self.slots.binary_search(&at).is_ok()
    }

    /// How much room it takes at the right of the axis.
    pub fn width(&self) -> u32 {
        if self.slots.is_empty() { 0 } else { BREAK + SLOT * self.slots.len() as u32 }
    }

    /// Where a line behind the break stands, from the pixel at which the axis to scale ends.
    pub fn place(&self, at: Span, edge: i32) -> Option<i32> {
        let slot = self.slots.binary_search(&at).ok()?;
        Some(edge + (BREAK + SLOT * slot as u32 + SLOT / 2) as i32)
    }

    /// The break, the axis behind it, and the bar of what comes later: from the break to its latest, at least three pixels
    /// high.
    pub fn draw(&self, area: &Area<'_>, edge: i32, bottom: i32, height: i32) -> Drawn {
        if self.slots.is_empty() {
            return Ok(());
        }
        let quiet = rgb(ink::QUIET).stroke_width(1);
        let end = edge + self.width() as i32;
        area.draw(&PathElement::new(vec![(edge + 12, bottom), (end, bottom)], quiet))?;
        for x in [edge + 4, edge + 12] {
            area.draw(&PathElement::new(
                vec![(x - 4, bottom + 6), (x + 4, bottom - 6)],
                rgb(ink::INK).stroke_width(1),
            ))?;
        }
        let below = small().pos(Pos::new(HPos::Center, VPos::Top));
        area.draw(&Text::new("not to scale", ((edge + 18 + end) / 2, bottom + 8), below))?;
        if let Some(to) = self.latest.and_then(|latest| self.place(latest, edge)) {
            let bar = [(edge + 22, bottom - height.max(3)), (to, bottom)];
            area.draw(&Rectangle::new(bar, rgb(ink::BAND).filled()))?;
            area.draw(&Rectangle::new(bar, rgb(ink::INK).stroke_width(1)))?;
        }
        Ok(())
    }
}

/// The bars of the common width, and the one of what settles far later.
fn split(settling: &Settling) -> (&[Bar], Option<&Bar>) {
    match settling.bars.split_last() {
        Some((last, rest)) if settling.far && !rest.is_empty() => (rest, Some(last)),
        _ => (&settling.bars, None),
    }
}

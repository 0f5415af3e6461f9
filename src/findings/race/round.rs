//! An oscillation: the loop once round.

use crate::engine::{End, Link};
use crate::findings::causes::Causes;
use crate::findings::paths::{Path, RacePair};

/// The path from a change of a net that moves back to the same change of the same net: where the oscillation is exact and a
/// single change runs round the loop, its sum is the period.
pub(super) fn once_round(run: &Causes<'_>, moment: u32) -> Option<RacePair> {
    let (at, batches) = run.window(moment)?;
    let window = &run.trace.windows[at];
    let End::Oscillating { period, .. } = window.end else { return None };
    let moving = window.moving.iter().map(|it| it.0);
    let ends = moving.filter_map(|net| run.changes(net, &batches).last().copied());
    let end = Link::Change(
        ends.reduce(|best, it| if run.batch(Link::Change(it)) > run.batch(Link::Change(best)) { it } else { best })?,
    );
    let mut path = run.path(end);
    let (net, value, last) = (run.net(end)?, run.value(end)?, run.time(end));
    // its own earlier changes to the same value on the way back, nearest first
    let same = |leg: &crate::findings::paths::Leg| leg.wire.is_none() && (leg.net, leg.new) == (net, value);
    let before = path.legs.len().checked_sub(1)?;
    let all = || (0..before).rev().filter(|i| same(&path.legs[*i]));
    let from = all().find(|i| last.since(path.legs[*i].at) == period).or_else(|| all().next())?;
    let begins = path.legs[from];
    path = Path {
        from: Some((begins.net, begins.new)),
        moment: None,
        at: begins.at,
        legs: path.legs.split_off(from + 1),
        left_out: 0,
    };
    Some(RacePair::single(path))
}

//! When an involution gate, which recovers from its previous change, makes the next one.

use super::level::Level;
use crate::delay::{involution, recovered};
use crate::logic::Value;
use crate::time::Span;

/// When an involution gate's output changes to `value`, for a change of its function at `at`; `None` if that would not
/// come after its previous change, which is still pending: then both vanish. `last`: when the last of its pending changes
/// is due. `previous` is renewed.
#[inline(never)]
pub(super) fn recovering<L: Level>(
    tau: Span,
    value: L,
    delay: &[u64; 2],
    at: u64,
    last: Option<u64>,
    previous: &mut Option<i128>,
) -> Option<u64> {
    let now = i128::from(at);
    let full = value.delay(delay);
    // the other edge's: of X both are the shorter one
    let other = if value.value() == Value::X { full } else { delay[usize::from(value.value() == Value::Zero)] };
    let since = previous.map(|previous| now - previous);
    let due = involution(tau, Span::from_fs(full), Span::from_fs(other), since).map(|delay| now + delay);
    let pending = last.filter(|last| *previous == Some(i128::from(*last)));
    *previous = due;
    if let Some(last) = pending
        && due.is_none_or(|due| due <= i128::from(last))
    {
        return None;
    }
    // what does not vanish comes after everything that is pending and after now
    let earliest = last.unwrap_or(at) + 1;
    let due = due.map_or(earliest, |due| due.max(i128::from(earliest)) as u64);
    *previous = Some(i128::from(due));
    Some(due)
}

/// The age of an involution gate's previous change, for comparison; all ages that make no difference any more are alike.
pub(super) fn age(tau: Span, delay: &[u64; 2], previous: Option<i128>, now: u64) -> u64 {
    let age = previous.map(|previous| i128::from(now) - previous);
    match age.filter(|age| !recovered(tau, delay.map(Span::from_fs), *age)) {
        // below zero if it vanished ahead; no age reaches 2^63
        Some(age) => age as i64 as u64,
        None => i64::MIN as u64,
    }
}

//! The rules of an exploration, so that tests can break one at a time.

use super::zone;

/// The rules on which an exploration rests. [`Exact`] has them as they must be; others are of use to show that tests would
/// notice if one of them were wrong.
pub trait Semantics {
    /// From when on something with this least delay may fire.
    fn due(&self, min: i64) -> i64 {
        min
    }
    /// From what age on it no longer counts how much older an event with this least delay is.
    fn old(&self, min: i64) -> i64 {
        min
    }
    /// How old the event of a gate with this greatest delay may be when it is cancelled: at its deadline it would have
    /// fired in this very batch.
    fn cancelled(&self, max: i64) -> zone::Code {
        zone::below(max)
    }
    /// The bound under which a state lasts whose clock may run up to this one.
    fn lasts(&self, limit: zone::Code) -> zone::Code {
        zone::strictly(limit)
    }
    /// The bound on the constant less a clock that must have run for a while: a step after what fired before it, an
    /// arrival after the one before it, a late input after its step, what fires after a batch that brought a pattern.
    fn later(&self) -> zone::Code {
        zone::BELOW_ZERO
    }
    /// How many pairs of toggles an input can make that bounces, where its step says so many at most.
    fn pairs(&self, most: u32) -> u32 {
        most
    }
    /// May a step come at the instant at which its pattern came, in a batch of its own?
    fn follows(&self) -> bool {
        true
    }
    /// Is a pattern looked for between the parts of a batch, too?
    fn peeks(&self) -> bool {
        false
    }
    /// Must a gate that was disabled stay so for a while, if what could excite it again could have come together with
    /// what disabled it?
    fn cools(&self) -> bool {
        true
    }
}

/// The semantics of the engine.
#[derive(Clone, Copy, Debug, Default)]
pub struct Exact;

impl Semantics for Exact {}

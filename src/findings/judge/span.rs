//! The window of a few nets: from a step that touches one of them to the next that does, or the end.

use crate::circuit::{Circuit, NetId, NetSet};
use crate::engine::{End, Opening};
use crate::findings::Reason;
use crate::time::Time;

/// The cone of the nets that a test is about.
#[derive(Clone, Debug)]
pub(super) struct Cone(NetSet);

impl Cone {
    pub(super) fn of(circuit: &Circuit, nets: &[NetId]) -> Cone {
        Cone(circuit.cone(nets))
    }

    fn holds_any(&self, nets: &[NetId]) -> bool {
        nets.iter().any(|net| self.0.contains(*net))
    }

    /// Does a step that changes these inputs touch the nets?
    pub(super) fn is_touched(&self, opening: &Opening<'_>) -> bool {
        self.holds_any(opening.inputs)
    }
}

/// A window of nets that is open.
#[derive(Clone, Copy, Debug)]
pub(super) struct NetWindow {
    /// The moment that names it.
    pub moment: u32,
    /// The last input change of its step.
    pub settle_from: Time,
    /// Was nothing pending in the cone when it began?
    clean: bool,
}

/// How things stand when windows of nets end.
#[derive(Clone, Copy, Debug)]
pub(super) struct Shut<'a> {
    pub end: End,
    pub pending: &'a [NetId],
}

impl NetWindow {
    pub(super) fn open(moment: u32, cone: &Cone, opening: &Opening<'_>) -> NetWindow {
        NetWindow { moment, settle_from: opening.settle_from, clean: !cone.holds_any(opening.pending) }
    }

    /// Why nothing can be said of the nets at its end; `None` if it can.
    pub(super) fn obstacle(&self, cone: &Cone, shut: &Shut<'_>) -> Option<Reason> {
        if !self.clean {
            return Some(Reason::BeganBeforeRest);
        }
        if !cone.holds_any(shut.pending) {
            return None;
        }
        Some(reason_of(shut.end))
    }
}

/// The reason for not judging that the end of a window with events pending gives.
pub(super) fn reason_of(end: End) -> Reason {
    match end {
        End::Oscillating { .. } => Reason::Oscillating,
        End::Unsettled(_) => Reason::Unsettled,
        End::Settled | End::Cut => Reason::Cut,
    }
}

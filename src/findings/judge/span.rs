//! The window of a few nets: from a step that touches one of them to the next that does, or the end.

use crate::circuit::{Circuit, NetId};
use crate::engine::{End, Opening};
use crate::findings::Reason;
use crate::time::Time;

/// The cones of the nets that tests are about, by number. Tests about the same nets share one.
///
/// What a step touches is looked up by input: one bit a cone.
#[derive(Clone, Debug)]
pub(super) struct Cones {
    /// The nets of each cone, without their sources.
    nets: Vec<Vec<NetId>>,
    /// Words a net, at least one.
    words: usize,
    /// For each net the cones that hold it.
    holding: Vec<u64>,
}

/// Some of the cones.
#[derive(Clone, Debug, Default)]
pub(super) struct ConeSet(Vec<u64>);

impl Cones {
    pub(super) fn new() -> Cones {
        Cones { nets: Vec::new(), words: 1, holding: Vec::new() }
    }

    /// The number of the cone of these nets.
    pub(super) fn of(&mut self, nets: &[NetId]) -> u32 {
        let number = self.nets.iter().position(|known| known == nets).unwrap_or_else(|| {
            self.nets.push(nets.to_vec());
            self.nets.len() - 1
        });
        number as u32
    }

    /// All cones are numbered: finds out what they hold.
    pub(super) fn finish(&mut self, circuit: &Circuit) {
        self.words = self.nets.len().div_ceil(64).max(1);
        self.holding = vec![0; self.words * circuit.net_count()];
        for (number, nets) in self.nets.iter().enumerate() {
            for net in circuit.cone(nets).iter() {
                self.holding[net.index() * self.words + number / 64] |= 1 << (number % 64);
            }
        }
    }

    /// The cones that hold any of these nets, into `set`.
    #[inline]
    pub(super) fn holding(&self, nets: &[NetId], set: &mut ConeSet) {
        match &mut *set.0 {
            [word] => *word = nets.iter().fold(0, |word, net| word | self.holding[net.index()]),
            all => self.holding_many(nets, all),
        }
    }

    fn holding_many(&self, nets: &[NetId], set: &mut [u64]) {
        set.fill(0);
        for net in nets {
            let from = net.index() * self.words;
            set.iter_mut().zip(&self.holding[from..from + self.words]).for_each(|(word, more)| *word |= more);
        }
    }
}

impl ConeSet {
    /// The empty set.
    pub(super) fn none(cones: &Cones) -> ConeSet {
        ConeSet(vec![0; cones.words])
    }

    /// All cones.
    pub(super) fn fill(&mut self) {
        self.0.fill(u64::MAX);
    }

    #[inline]
    pub(super) fn has(&self, cone: u32) -> bool {
        self.0[cone as usize / 64] >> (cone % 64) & 1 == 1
    }
}

/// A window of nets that is open.
#[derive(Clone, Copy, Debug)]
pub(super) struct NetWindow {
    /// The moment that names it.
    pub moment: u32,
    /// Was nothing pending in the cone when it began?
    clean: bool,
    /// The last input change of its step.
    pub settle_from: Time,
}

/// How things stand when windows of nets end.
#[derive(Clone, Copy, Debug)]
pub(super) struct Shut<'a> {
    pub end: End,
    /// The cones in which something is pending.
    pub pending: &'a ConeSet,
}

impl NetWindow {
    /// `pending`: the cones in which something is.
    #[inline]
    pub(super) fn open(moment: u32, cone: u32, opening: &Opening<'_>, pending: &ConeSet) -> NetWindow {
        NetWindow { moment, settle_from: opening.settle_from, clean: !pending.has(cone) }
    }

    /// Why nothing can be said of the nets at its end; `None` if it can.
    #[inline]
    pub(super) fn obstacle(&self, cone: u32, shut: &Shut<'_>) -> Option<Reason> {
        if !self.clean {
            return Some(Reason::BeganBeforeRest);
        }
        if !shut.pending.has(cone) {
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

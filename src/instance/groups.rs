//! The numbers that gates of one group have in common.

use rand::Rng;
use rand_chacha::ChaCha8Rng;

use super::strata::Strata;
use crate::delay::{DelayModel, DelayRange, Marginal, Together};
use crate::time::Span;

/// Where in the stream of a board the numbers of groups begin: far behind all that a circuit can need.
pub(super) const FAR: u64 = 1 << 40;

/// The groups of a scenario, and their numbers on the present board.
#[derive(Clone, Debug, Default)]
pub(super) struct Groups {
    how: Vec<Together>,
    /// For each quantity of the board's plan its group; empty where there is no group at all.
    of: Vec<Option<u32>>,
    commons: Vec<u64>,
}

/// For each gate its group.
pub(super) fn groups_of(delays: &DelayModel) -> Vec<Option<u32>> {
    let mut group_of = vec![None; delays.gate.len()];
    for (number, group) in delays.groups.iter().enumerate() {
        group.gates.iter().for_each(|gate| group_of[gate.index()] = Some(number as u32));
    }
    group_of
}

impl Groups {
    /// `gates` are those that the quantities of the board's plan belong to, `None` for what is no gate delay.
    pub fn new(delays: &DelayModel, gates: impl Iterator<Item = Option<u32>>) -> Groups {
        if delays.groups.is_empty() {
            return Groups::default();
        }
        let group_of = groups_of(delays);
        Groups {
            how: delays.groups.iter().map(|group| group.how).collect(),
            of: gates.map(|gate| group_of[gate? as usize]).collect(),
            commons: vec![0; delays.groups.len()],
        }
    }

    /// Places of the numbers in the board's stream.
    pub fn places(&self) -> impl Iterator<Item = u64> {
        (0..self.how.len() as u64).map(|group| FAR + group)
    }

    /// Draws the numbers of a board from its stream, which the generator stands in.
    pub fn begin(&mut self, rng: &mut ChaCha8Rng, strata: Option<&Strata>, board: u64) {
        if self.how.is_empty() {
            return;
        }
        rng.set_word_pos(2 * u128::from(FAR));
        for (group, common) in self.commons.iter_mut().enumerate() {
            let u = rng.next_u64();
            *common = strata.map_or(u, |strata| strata.number(board, group, u));
        }
    }

    /// The number of a group on the present board.
    pub fn common(&self, group: u32) -> u64 {
        self.commons[group as usize]
    }

    /// The delay of a quantity of the plan at its own number.
    pub fn span(&self, marginal: Marginal, quantity: usize, range: DelayRange, own: u64) -> Span {
        self.span_with(marginal, quantity, range, own, &self.commons)
    }

    /// The same with these numbers of groups.
    pub fn span_with(&self, marginal: Marginal, quantity: usize, range: DelayRange, own: u64, commons: &[u64]) -> Span {
        match self.group_of(quantity) {
            Some(group) => self.how[group].draw(marginal, range, own, commons[group]),
            None => marginal.quantile(range, own),
        }
    }

    /// The group of a quantity of the plan.
    pub fn group_of(&self, quantity: usize) -> Option<usize> {
        self.of.get(quantity).copied().flatten().map(|group| group as usize)
    }

    /// How the delays of each group belong together.
    pub fn how(&self) -> &[Together] {
        &self.how
    }

    /// The numbers of the present board.
    pub fn commons(&self) -> &[u64] {
        &self.commons
    }
}

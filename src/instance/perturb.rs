//! The same case with every time moved by a few femtoseconds, so that no two times are equal any more.
//!
//! Quantities are numbered in the order of the file: both edges (fall, rise) of each gate, both edges of each wire, then
//! every change of an input by a step (a step that sets nothing counts as one), then every edge of each clock. Each is
//! moved by a whole number of femtoseconds from 1 to the *reach*, up or down. The eight perturbations are four pairs:
//! number p + 4 moves everything the other way than number p, so whatever difference of two sums of delays one of them
//! splits, the other splits the other way round. In perturbation 2 the sizes are those of 1 in reverse, in 4 those of 3,
//! so that also what can only be moved up comes in both orders.
//!
//! Where firings of a gate differ, all of them move together, each edge by its move.
//!
//! Of quantity k with reach R, let a = k mod R and r = ⌊k / R⌋. Its size in pair 0 is one more than the place of a in a
//! fixed permutation of 0 .. R, in pair 2 that of (a + r) mod R in another. Its sign in pair j is bit j of r, turned by a
//! fixed random bit of a and j. So up to R quantities all sizes differ; and of the first R² (at least 16·R) any two are
//! moved differently in some pair, even where R is 1.

use super::strata::{half_of, mix, walk};
use super::{Firings, Instance};
use crate::circuit::GateId;
use crate::delay::{Filter, is_causal};
use crate::scenario::{Place, Scenario};
use crate::time::Span;

/// Number of perturbations.
pub const PERTURBATIONS: u8 = 8;

/// Furthest that anything is moved, in fs.
const FURTHEST: u64 = 1000;
/// Nothing is moved further than this part of the least delay.
const PART: u64 = 100;
/// Delays and waits stay below.
const LONGEST: u64 = 1 << 62;

/// Why a case cannot be perturbed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Unmovable {
    /// A hundredth of the least delay is below 1 fs.
    #[error("a hundredth of the least delay ({} fs) is below 1 fs", .0.fs())]
    ShortDelay(Span),
    /// A reject limit or time constant leaves no room to move a delay.
    #[error("a reject limit or a time constant leaves no femtosecond of room below a delay")]
    TightFilter,
    /// Input changes that follow each other leave no room.
    #[error("input changes follow each other within 2 fs")]
    CloseInputs,
}

/// A perturbed case.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Perturbed {
    /// The case.
    pub instance: Instance,
    /// The furthest that anything was moved, at least 1 fs.
    pub reach: Span,
    /// All that everything was moved, added up.
    pub total: Span,
}

impl Instance {
    /// This case of the scenario with every time moved by single femtoseconds, in the way of this number, from 1 to
    /// [`PERTURBATIONS`].
    ///
    /// Everything is moved by at most the reach: 1,000 fs or a hundredth of the least delay, less where a reject limit, the
    /// causality of an involution gate or the order of input changes demands it. Delays stay at least 1 fs and may leave
    /// the scenario's ranges. Of a step by time its instant is moved, of a step at rest or after a pattern its wait; inputs
    /// that one step changes at one instant are split; what cannot come earlier (a wait or instant below the reach) only
    /// comes later. Listed steps of one instant stay together, since they share a window; toggles of a contact move along
    /// with its change.
    ///
    /// Errors: the reach is below 1 fs.
    ///
    /// Panics if the case belongs to another scenario, or there is no perturbation of this number.
    pub fn perturbed(&self, scenario: &Scenario, number: u8) -> Result<Perturbed, Unmovable> {
        assert!((1..=PERTURBATIONS).contains(&number), "perturbations are numbered from 1 to {PERTURBATIONS}");
        let mut moves =
            Moves { reach: self.reach(scenario)?, pair: (number - 1) % 4, back: number > 4, next: 0, total: 0 };
        let mut instance = self.clone();
        let mut moved = |edges: &mut [Span; 2]| {
            edges.each_mut().map(|edge| {
                let by = moves.either();
                *edge = shifted(*edge, by);
                by
            })
        };
        let by: Vec<[i64; 2]> = instance.delays.gate.iter_mut().map(&mut moved).collect();
        instance.delays.wire.iter_mut().for_each(|edges| {
            moved(edges);
        });
        if let Some(firings) = &mut instance.firings {
            firings.move_all(&by);
        }
        self.move_steps(scenario, &mut moves, &mut instance);
        for ((clock, case), moved) in scenario.stimulus.clocks.iter().zip(&self.clocks).zip(&mut instance.clocks) {
            let initial = scenario.stimulus.initial[clock.net.index()];
            moved.jitter.clear();
            let still = moved.clone();
            moved.jitter.extend((0..2 * clock.count).map(|edge| {
                let at = case.edge(initial, edge);
                (at.saturating_add_signed(moves.from(at))).wrapping_sub(still.edge(initial, edge)) as i64
            }));
        }
        let (reach, total) = (Span::from_fs(moves.reach), Span::from_fs(moves.total));
        Ok(Perturbed { instance, reach, total })
    }

    /// The least delay that this case may show at any gate, firing or wire; `None` without any.
    pub fn least_delay(&self) -> Option<Span> {
        let gates = (0..self.delays.gate.len()).flat_map(|gate| self.least_of(gate));
        gates.chain(self.delays.wire.iter().flatten().copied()).min()
    }

    /// The least `[fall, rise]` of a gate, over all its firings.
    fn least_of(&self, gate: usize) -> [Span; 2] {
        let plain = self.delays.gate[gate];
        match &self.firings {
            None => plain,
            Some(Firings::Drawn(drawn)) => drawn.gates[gate].least(),
            Some(given) => {
                let own = given.least(GateId(gate as u32)).unwrap_or(plain);
                [plain[0].min(own[0]), plain[1].min(own[1])]
            }
        }
    }

    /// The furthest that times of this case may be moved.
    fn reach(&self, scenario: &Scenario) -> Result<u64, Unmovable> {
        let least = self.least_delay().unwrap_or(Span::from_fs(LONGEST));
        let mut reach = (least.fs() / PART).min(FURTHEST);
        if reach == 0 {
            return Err(Unmovable::ShortDelay(least));
        }
        for (gate, filter) in scenario.delays.filter.iter().enumerate() {
            let edges = self.least_of(gate);
            let shortest = edges[0].min(edges[1]);
            match filter {
                Filter::Inertial | Filter::Transport => {}
                Filter::Reject(limit) => reach = reach.min(shortest.fs().saturating_sub(limit.fs() + 1)),
                Filter::Involution(tau) => {
                    let fits = |less: u64| {
                        let [fall, rise] = edges.map(|edge| Span::from_fs(edge.fs().saturating_sub(less)));
                        is_causal(*tau, rise, fall)
                    };
                    // causal for every lesser move, too
                    let (mut good, mut bad) = (0, reach + 1);
                    while bad - good > 1 {
                        let middle = good + (bad - good) / 2;
                        if fits(middle) { good = middle } else { bad = middle }
                    }
                    reach = good;
                }
            }
        }
        if reach == 0 {
            return Err(Unmovable::TightFilter);
        }
        let between = |gap: u64| gap.saturating_sub(1) / 2;
        for gap in self.placed(scenario).iter().filter_map(|step| step.gap).filter(|gap| *gap > 0) {
            reach = reach.min(between(gap));
        }
        for (clock, case) in scenario.stimulus.clocks.iter().zip(&self.clocks) {
            let initial = scenario.stimulus.initial[clock.net.index()];
            for edge in 1..2 * clock.count {
                reach = reach.min(between(case.edge(initial, edge).saturating_sub(case.edge(initial, edge - 1))));
            }
        }
        if reach == 0 { Err(Unmovable::CloseInputs) } else { Ok(reach) }
    }

    /// Where the steps of this case are, from the start or from the step's own rest or pattern.
    fn placed(&self, scenario: &Scenario) -> Vec<Placed> {
        let mut all: Vec<Placed> = Vec::with_capacity(scenario.stimulus.steps.len());
        for (s, step) in scenario.stimulus.steps.iter().enumerate() {
            let before = all.last();
            let place = self.places[s].fs();
            let (at, gap) = match (&step.place, before) {
                (Place::At(_), Some(before)) => (place, Some(place.saturating_sub(before.latest))),
                (Place::After(_), Some(before)) => {
                    let at = before.at.saturating_add(place);
                    (at, Some(at.saturating_sub(before.latest)))
                }
                _ => (place, None),
            };
            let first = self.skews[s].iter().min().copied().unwrap_or_default();
            let later: Vec<u64> = match self.skews[s].len() {
                0 => vec![0; step.set.len().max(1)],
                _ => self.skews[s].iter().map(|skew| (*skew - first).fs()).collect(),
            };
            let toggled = |input: usize| self.bounces[s].get(input).and_then(|all| all.last()).map_or(0, |it| it.fs());
            let latest = later.iter().enumerate().map(|(input, later)| later.saturating_add(toggled(input))).max();
            all.push(Placed { at, latest: at.saturating_add(latest.unwrap_or(0)), gap, later });
        }
        all
    }

    fn move_steps(&self, scenario: &Scenario, moves: &mut Moves, instance: &mut Instance) {
        let placed = self.placed(scenario);
        let mut before = 0;
        let mut from = 0;
        while from < placed.len() {
            // steps that follow the one before without any time between stay with it
            let to = (from + 1..placed.len()).find(|s| placed[*s].gap != Some(0)).unwrap_or(placed.len());
            for step in &placed[from..to - 1] {
                moves.next += step.later.len() as u64;
            }
            let last = &placed[to - 1];
            let moved = |later: &u64, moves: &mut Moves| {
                i128::from(*later) + i128::from(moves.from(placed[from].at.saturating_add(*later)))
            };
            let changes: Vec<i128> = last.later.iter().map(|later| moved(later, moves)).collect();
            let shift = changes.iter().min().copied().unwrap_or(0) as i64;
            for s in from..to {
                let by = match scenario.stimulus.steps[s].place {
                    Place::After(_) if s > 0 => shift - before,
                    _ => shift,
                };
                instance.places[s] = Span::from_fs(self.places[s].fs().saturating_add_signed(by).min(LONGEST - 1));
                before = shift;
            }
            if changes.len() > 1 {
                let later = changes.iter().map(|change| Span::from_fs((*change - i128::from(shift)) as u64));
                instance.skews[to - 1] = later.collect();
            }
            from = to;
        }
    }
}

/// Where one step of a case is.
struct Placed {
    /// Its instant, from the start or from what the chain of steps that it belongs to waits for.
    at: u64,
    /// The last change or toggle of its inputs.
    latest: u64,
    /// From the last change of the step before to this one, if it does not wait for anything.
    gap: Option<u64>,
    /// How much later each of its inputs changes.
    later: Vec<u64>,
}

/// The moves of one perturbation, one quantity after the other.
struct Moves {
    reach: u64,
    pair: u8,
    back: bool,
    next: u64,
    total: u64,
}

impl Moves {
    /// The move of the next quantity, up or down.
    fn either(&mut self) -> i64 {
        /// Keys of the two permutations, and of the signs.
        const KEYS: [u64; 2] = [1, 2];
        const SIGNS: u64 = 3;
        let (a, r) = (self.next % self.reach, self.next / self.reach);
        self.next += 1;
        let later = self.pair >= 2;
        let index = if later { (a + r) % self.reach } else { a };
        let index = walk(self.reach, half_of(self.reach), index, KEYS[usize::from(later)]);
        let size = if self.pair % 2 == 1 { self.reach - index } else { index + 1 };
        self.total = self.total.saturating_add(size);
        let turned = mix(mix(SIGNS ^ a) ^ u64::from(self.pair)) >> 63;
        let down = (((r >> self.pair) & 1) ^ turned == 1) ^ self.back;
        if down { -(size as i64) } else { size as i64 }
    }

    /// The move of an instant or wait that is this long: only up where there is no room below.
    fn from(&mut self, at: u64) -> i64 {
        let by = self.either();
        if at < self.reach { by.abs() } else { by }
    }
}

/// A delay moved, within what a delay may be.
pub(super) fn shifted(span: Span, by: i64) -> Span {
    Span::from_fs(span.fs().saturating_add_signed(by).clamp(1, LONGEST - 1))
}

//! Delays that differ from firing to firing of one gate.
//!
//! Firings are counted by the events that a gate schedules: from 0 in each run, each time its function asks for an event,
//! also if that event is cancelled later. An inertial gate asks where its function differs from its output and nothing is
//! pending; every other gate at each change of its function. A delay then follows from the gate, the edge and that count
//! alone, so that no order of events inside an instant can change it.

use std::collections::BTreeMap;

use super::perturb::shifted;
use super::strata::mix;
use crate::circuit::GateId;
use crate::delay::{DelayRange, Marginal, Together};
use crate::time::Span;

/// The delays of a case in which not every firing of a gate takes the same.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Firings {
    /// Every firing of every gate is drawn anew.
    Drawn(Drawn),
    /// `[fall, rise]` of these firings, each by its gate and its count; all others take the delays of the case.
    Given(BTreeMap<(GateId, u64), [Span; 2]>),
}

/// Firings that are drawn, each from its gate, its edge and its count alone.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Drawn {
    /// How delays spread over their ranges. Of a hypercube firings are drawn independently, uniform.
    pub draw: Marginal,
    /// One a gate.
    pub gates: Vec<Anew>,
}

/// What the firings of one gate are drawn from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Anew {
    /// What all its random numbers follow from.
    pub key: u64,
    /// The ranges of `[fall, rise]`.
    pub ranges: [DelayRange; 2],
    /// Do both edges of one firing take one number?
    pub one_draw: bool,
    /// How it belongs to its group, and the number that the group has on this board.
    pub group: Option<(Together, u64)>,
    /// By how many femtoseconds every delay of `[fall, rise]` is moved after it was drawn; it stays from 1 fs to below 2^62 fs.
    pub moved: [i64; 2],
}

impl Anew {
    /// The random number of firing `firing` of an edge (0 fall, 1 rise): number 2·firing + edge, counted from 0, of the
    /// generator SplitMix64 that starts at the key. Where both edges take one number, it is that of the fall.
    ///
    /// Source: G. L. Steele, D. Lea, C. H. Flood, "Fast splittable pseudorandom number generators", OOPSLA 2014 (from
    /// memory).
    pub fn number(&self, edge: usize, firing: u64) -> u64 {
        const GAMMA: u64 = 0x9E37_79B9_7F4A_7C15;
        let index = firing.wrapping_mul(2).wrapping_add(if self.one_draw { 0 } else { edge as u64 });
        mix(self.key.wrapping_add(index.wrapping_mul(GAMMA)))
    }

    /// `[fall, rise]` of a firing. Of a group the board keeps the common number, each firing has an own one; see
    /// [`Together::draw`].
    pub fn delays(&self, draw: Marginal, firing: u64) -> [Span; 2] {
        let delay = |edge: usize| {
            let range = self.ranges[edge];
            if range.is_exact() {
                return range.min;
            }
            let own = self.number(edge, firing);
            self.group.map_or_else(|| draw.quantile(range, own), |(how, common)| how.draw(draw, range, own, common))
        };
        self.move_by([delay(0), delay(1)])
    }

    /// The least `[fall, rise]` of any firing.
    pub fn least(&self) -> [Span; 2] {
        self.move_by(self.ranges.map(|range| range.min))
    }

    fn move_by(&self, [fall, rise]: [Span; 2]) -> [Span; 2] {
        [shifted(fall, self.moved[0]), shifted(rise, self.moved[1])]
    }
}

impl Firings {
    /// `[fall, rise]` of firing `firing` of a gate, counted from 0. `plain` are its delays in the case, for firings that are
    /// not given.
    ///
    /// ```
    /// use stillgate::circuit::GateId;
    /// use stillgate::instance::Firings;
    /// use stillgate::time::Span;
    /// let [two, nine] = [2, 9].map(Span::from_fs);
    /// let firings = Firings::Given([((GateId(0), 3), [nine, nine])].into());
    /// assert_eq!(firings.delays(GateId(0), 2, [two, two]), [two, two]);
    /// assert_eq!(firings.delays(GateId(0), 3, [two, two]), [nine, nine]);
    /// ```
    pub fn delays(&self, gate: GateId, firing: u64, plain: [Span; 2]) -> [Span; 2] {
        match self {
            Firings::Drawn(drawn) => drawn.gates[gate.index()].delays(drawn.draw, firing),
            Firings::Given(given) => given.get(&(gate, firing)).copied().unwrap_or(plain),
        }
    }

    /// The least `[fall, rise]` of a gate's firings that do not take its delays in the case; `None` if all do.
    pub fn least(&self, gate: GateId) -> Option<[Span; 2]> {
        match self {
            Firings::Drawn(drawn) => Some(drawn.gates[gate.index()].least()),
            Firings::Given(given) => {
                let all = given.range((gate, 0)..=(gate, u64::MAX)).map(|(_, edges)| *edges);
                all.reduce(|a, b| [a[0].min(b[0]), a[1].min(b[1])])
            }
        }
    }

    /// Moves every firing of each gate by so many femtoseconds of `[fall, rise]`.
    pub(super) fn move_all(&mut self, by: &[[i64; 2]]) {
        match self {
            Firings::Drawn(drawn) => {
                for (gate, by) in drawn.gates.iter_mut().zip(by) {
                    gate.moved = [0, 1].map(|edge| gate.moved[edge].saturating_add(by[edge]));
                }
            }
            Firings::Given(given) => {
                for ((gate, _), edges) in given {
                    let by = by[gate.index()];
                    *edges = [shifted(edges[0], by[0]), shifted(edges[1], by[1])];
                }
            }
        }
    }

    /// From which firing of a gate on they all take the same delays: 0 where no firing differs, the greatest number where
    /// they never cease to.
    pub fn until(&self, gate: GateId) -> u64 {
        match self {
            Firings::Drawn(drawn) if drawn.gates[gate.index()].ranges.iter().all(|range| range.is_exact()) => 0,
            Firings::Drawn(_) => u64::MAX,
            Firings::Given(given) => {
                let last = given.range((gate, 0)..=(gate, u64::MAX)).next_back();
                last.map_or(0, |((_, firing), _)| firing.saturating_add(1))
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn anew(key: u64, one_draw: bool) -> Anew {
        let range = |min, max| DelayRange::between(Span::from_fs(min), Span::from_fs(max));
        Anew { key, ranges: [range(0, u64::MAX >> 2), range(0, u64::MAX >> 2)], one_draw, group: None, moved: [0; 2] }
    }

    /// The first numbers of SplitMix64 from seed 1234567, as they are found in many places (from memory).
    #[test]
    fn numbers_are_those_of_the_published_generator() {
        let gate = anew(1_234_567, false);
        let numbers = [
            6_457_827_717_110_365_317,
            3_203_168_211_198_807_973,
            9_817_491_932_198_370_423,
            4_593_380_528_125_082_431,
            16_408_922_859_458_223_821,
        ];
        for (n, number) in numbers.into_iter().enumerate() {
            assert_eq!(gate.number(n % 2, n as u64 / 2), number, "number {n}");
        }
    }

    #[test]
    fn edges_of_one_draw_share_the_number_of_a_firing() {
        let (one, two) = (anew(99, true), anew(99, false));
        for firing in [0, 1, 77, u64::MAX] {
            let [fall, rise] = one.delays(Marginal::Uniform, firing);
            assert_eq!(fall, rise, "{firing}");
            assert_eq!(two.delays(Marginal::Uniform, firing)[0], fall, "{firing}");
            assert_ne!(two.delays(Marginal::Uniform, firing)[1], rise, "{firing}");
        }
        assert_ne!(one.delays(Marginal::Uniform, 5), one.delays(Marginal::Uniform, 6));
    }

    #[test]
    fn firings_move_by_whole_femtoseconds_and_stay_delays() {
        let gates = vec![anew(3, false), Anew { ranges: [DelayRange::exact(Span::from_fs(5)); 2], ..anew(3, true) }];
        let before = Firings::Drawn(Drawn { draw: Marginal::Normal, gates });
        let mut after = before.clone();
        after.move_all(&[[7, -9], [-5, 2]]);
        for firing in 0..50 {
            let [old, new] = [&before, &after].map(|it| it.delays(GateId(0), firing, [Span::TICK; 2]).map(Span::fs));
            assert_eq!([old[0] + 7, old[1] - 9], new);
            assert_eq!(after.delays(GateId(1), firing, [Span::TICK; 2]).map(Span::fs), [1, 7]);
        }
        let mut given = Firings::Given([((GateId(1), 4), [Span::TICK; 2])].into());
        given.move_all(&[[0, 0], [3, -3]]);
        assert_eq!(given.delays(GateId(1), 4, [Span::TICK; 2]).map(Span::fs), [4, 1]);
    }

    #[test]
    fn a_gate_varies_until_its_last_firing_of_its_own() {
        let given = Firings::Given([((GateId(1), 4), [Span::TICK; 2]), ((GateId(1), 2), [Span::TICK; 2])].into());
        assert_eq!([0, 1, 2].map(|gate| given.until(GateId(gate))), [0, 5, 0]);
        let exact = Anew { ranges: [DelayRange::exact(Span::TICK); 2], ..anew(1, true) };
        let drawn = Firings::Drawn(Drawn { draw: Marginal::Normal, gates: vec![exact, anew(1, true)] });
        assert_eq!([0, 1].map(|gate| drawn.until(GateId(gate))), [0, u64::MAX]);
    }
}

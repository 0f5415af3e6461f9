//! Drawing the case of a sample from its number and the seed alone.
//!
//! ChaCha8 seeded by the seed. Sample i is try (i mod tries) of board (i div tries). Board b draws delays and clock
//! periods from stream 2b, sample i draws places, skew, phases, jitter and start bits from stream 2i + 1. Every quantity
//! has a fixed place in its stream, counted in u64s, and takes one u64 whether it is needed or not, so that no draw
//! shifts another:
//!
//! | stream | place | quantity |
//! |---|---|---|
//! | board | 2·gate + edge (0 fall, 1 rise) | gate delay; one draw for both edges takes place 2·gate |
//! | board | 2·gates + 2·wire + edge | wire delay, likewise |
//! | board | 2·(gates + wires) + 2·clock, and + 1 | clock period, time high |
//! | board | 2^40 + group | what the delays of a group have in common |
//! | sample | for each step: 1 + number of inputs it sets | place; skew of each input it sets |
//! | sample | then for each clock: 1 + 2·count | first edge; jitter of each edge |
//! | sample | then for each gate: 1 | start bit (the top bit) |
//! | sample | 2^40, then for each input of a step that bounces: 2 + 2·(most pairs) | number of pairs; span; place of each toggle but the last |
//! | sample | 2^50 + gate | key of the firings of a gate, for `per-event`; see [`Anew::number`](super::Anew::number) |
//! | 2^64 − 1 | place in the board's stream | key of a quantity's strata, for `hypercube` |
//! | 2^64 − 2 | place in the sample's stream | likewise |
//! | 2^64 − 3 | 2^41·question | what a directed search takes by lot |
//!
//! What a group does with its number and each delay's own is told at [`Together`](crate::delay::Together), how a number
//! finds its stratum in `strata.rs`: `hypercube` cuts the range of what a board draws into as many parts as there are
//! boards in the plan, and of what a sample draws into as many as there are samples. Start bits, bounces and firings are
//! drawn independently.
//!
//! With `per-event` the delays of gates take none of the numbers of the board; they stand at typical, and every firing is
//! drawn by [`Firings`].

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

use super::Instance;
use super::bounces::Bounces;
use super::firings::{Anew, Drawn, Firings};
use super::groups::{Groups, groups_of};
use super::quantity::{Quantities, Quantity, Target};
use super::strata::{BOARD_KEYS, SAMPLE_KEYS, Strata};
use super::stream::Stream;
use crate::delay::Marginal;
use crate::logic::Bits;
use crate::scenario::{Begin, Scenario, Vary};

/// The number of the layout above; a result of another layout cannot be merged or replayed.
pub const LAYOUT: u32 = 1;

/// The first place of the keys of firings in a sample's stream, behind every bounce.
const KEYS: u64 = 1 << 50;

/// Draws the cases of one scenario, one after the other, without allocating.
#[derive(Clone, Debug)]
pub struct Sampler {
    rng: ChaCha8Rng,
    draw: Marginal,
    tries: u64,
    board_plan: Vec<Quantity>,
    sample_plan: Vec<Quantity>,
    board_stream: Stream,
    sample_stream: Stream,
    groups: Groups,
    /// What firings are drawn from, with the group of each gate; only for `per-event`.
    anew: Option<(Drawn, Vec<Option<u32>>)>,
    /// Strata of the quantities of the plans, and of the groups; only for `hypercube`.
    strata: Option<Stratified>,
    bounces: Bounces,
    start_place: u64,
    gates: usize,
    random_start: bool,
    board: Option<u64>,
}

#[derive(Clone, Debug)]
struct Stratified {
    board: Strata,
    groups: Strata,
    sample: Strata,
}

impl Sampler {
    /// A sampler for the draws of a scenario.
    pub fn new(scenario: &Scenario) -> Sampler {
        let Quantities { board: mut board_plan, sample: sample_plan, start_place } = Quantities::of(scenario);
        let gate_of = |quantity: &Quantity| match quantity.target {
            Target::Gate { gate, .. } | Target::GateBoth(gate) => Some(gate),
            _ => None,
        };
        let anew = (scenario.plan.vary == Vary::PerEvent).then(|| firings(scenario));
        if anew.is_some() {
            board_plan.retain(|quantity| gate_of(quantity).is_none());
        }
        let groups = Groups::new(&scenario.delays, board_plan.iter().map(gate_of));
        let mut rng = ChaCha8Rng::seed_from_u64(scenario.plan.seed);
        let plan = scenario.plan;
        let strata = (plan.draw == Marginal::Hypercube).then(|| {
            let places = |plan: &[Quantity]| plan.iter().map(|it| it.place).collect::<Vec<u64>>().into_iter();
            let boards = plan.samples.div_ceil(plan.tries.max(1));
            Stratified {
                board: Strata::new(&mut rng, BOARD_KEYS, places(&board_plan), boards),
                groups: Strata::new(&mut rng, BOARD_KEYS, groups.places(), boards),
                sample: Strata::new(&mut rng, SAMPLE_KEYS, places(&sample_plan), plan.samples),
            }
        });
        let stream = |odd: bool, plan: &[Quantity]| Stream::new(&rng, odd, plan.iter().map(|quantity| quantity.place));
        Sampler {
            board_stream: stream(false, &board_plan),
            sample_stream: stream(true, &sample_plan),
            rng,
            draw: plan.draw,
            tries: plan.tries,
            board_plan,
            sample_plan,
            groups,
            anew,
            strata,
            bounces: Bounces::new(&scenario.stimulus),
            start_place,
            gates: scenario.circuit.gate_count(),
            random_start: scenario.begin == Begin::Random,
            board: None,
        }
    }

    /// The board of a sample.
    pub fn board_of(&self, sample: u64) -> u64 {
        // a division takes as long as much of a short run
        if self.tries == 1 { sample } else { sample / self.tries }
    }

    /// Draws sample `sample` into an instance of this scenario (made by [`Instance::of`]).
    ///
    /// Quantities that are exact are left as they are, so always refill the same instance, or a typical one.
    pub fn fill(&mut self, sample: u64, into: &mut Instance) {
        let draw = self.draw;
        let board = self.board_of(sample);
        if self.board != Some(board) {
            self.board = Some(board);
            self.draw_board(board, &mut |groups, number, quantity, u| {
                into.set(quantity, groups.span(draw, number, quantity.range, u));
            });
        }
        self.draw_sample(sample, &mut |_, quantity, u| into.set(quantity, draw.quantile(quantity.range, u)));
        self.fill_rest(sample, into);
    }

    /// The random numbers that sample `sample` takes for its quantities, those of the board first, and for its groups.
    pub(super) fn numbers(&mut self, sample: u64) -> (Vec<u64>, Vec<u64>) {
        let mut own = Vec::with_capacity(self.board_plan.len() + self.sample_plan.len());
        // the board in an instance is that of the last sample filled
        self.board = None;
        self.draw_board(self.board_of(sample), &mut |_, _, _, u| own.push(u));
        self.draw_sample(sample, &mut |_, _, u| own.push(u));
        (own, self.groups.commons().to_vec())
    }

    /// Does a sample draw this? Delays of gates whose firings are drawn anew have no draw of their own.
    pub(super) fn draws(&self, quantity: &Quantity) -> bool {
        self.anew.is_none() || !matches!(quantity.target, Target::Gate { .. } | Target::GateBoth(_))
    }

    /// What has no quantity: bounces, and start bits.
    pub(super) fn fill_rest(&mut self, sample: u64, into: &mut Instance) {
        self.bounces.draw(&mut self.rng, 2 * sample + 1, self.draw, &mut into.bounces);
        self.fill_firings(sample, &mut into.firings);
        if self.random_start {
            self.fill_start(sample, &mut into.start);
        }
    }

    /// Draws the keys of a sample's firings; the board's groups are drawn.
    fn fill_firings(&mut self, sample: u64, into: &mut Option<Firings>) {
        let Some((template, group_of)) = &self.anew else { return };
        if !matches!(into, Some(Firings::Drawn(_))) {
            *into = Some(Firings::Drawn(Drawn::default()));
        }
        let Some(Firings::Drawn(drawn)) = into else { return };
        drawn.draw = template.draw;
        drawn.gates.clone_from(&template.gates);
        self.rng.set_stream(2 * sample + 1);
        self.rng.set_word_pos(2 * u128::from(KEYS));
        for (gate, group) in drawn.gates.iter_mut().zip(group_of) {
            gate.key = self.rng.next_u64();
            if let (Some((_, common)), Some(group)) = (&mut gate.group, group) {
                *common = self.groups.common(*group);
            }
        }
    }

    /// The groups of the scenario.
    pub(super) fn groups(&self) -> &Groups {
        &self.groups
    }

    fn draw_board(&mut self, board: u64, each: &mut impl FnMut(&Groups, usize, &Quantity, u64)) {
        let strata = self.strata.as_ref();
        if !self.groups.how().is_empty() {
            self.rng.set_stream(2 * board);
            self.groups.begin(&mut self.rng, strata.map(|it| &it.groups), board);
        }
        let numbers = self.board_stream.numbers(board).zip(&self.board_plan).enumerate();
        for (number, (u, quantity)) in numbers {
            let u = strata.map_or(u, |it| it.board.number(board, number, u));
            each(&self.groups, number, quantity, u);
        }
    }

    fn draw_sample(&mut self, sample: u64, each: &mut impl FnMut(usize, &Quantity, u64)) {
        let numbers = self.sample_stream.numbers(sample).zip(&self.sample_plan).enumerate();
        for (number, (u, quantity)) in numbers {
            let u = self.strata.as_ref().map_or(u, |it| it.sample.number(sample, number, u));
            each(number, quantity, u);
        }
    }

    /// Draws the start bits of a sample.
    pub(super) fn fill_start(&mut self, sample: u64, start: &mut Bits) {
        self.rng.set_stream(2 * sample + 1);
        self.rng.set_word_pos(2 * u128::from(self.start_place));
        for gate in 0..self.gates {
            start.set(gate, self.rng.next_u64() >> 63 == 1);
        }
    }
}

/// What the firings of a scenario are drawn from, still without keys and numbers of groups, and the group of each gate.
fn firings(scenario: &Scenario) -> (Drawn, Vec<Option<u32>>) {
    let delays = &scenario.delays;
    let group_of = groups_of(delays);
    let gate = |g: usize| Anew {
        key: 0,
        ranges: delays.gate[g],
        one_draw: delays.gate_one_draw[g],
        group: group_of[g].map(|group| (delays.groups[group as usize].how, 0)),
        moved: [0; 2],
    };
    let gates = (0..delays.gate.len()).map(gate).collect();
    (Drawn { draw: scenario.plan.draw, gates }, group_of)
}

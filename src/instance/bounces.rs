//! Contact bounce of one case: when each input toggles after its change.

use rand::Rng;
use rand_chacha::ChaCha8Rng;

use crate::delay::{DelayRange, Marginal};
use crate::scenario::{Bounce, Step, Stimulus};
use crate::time::Span;

/// The first place of bounces in a sample's stream, far behind everything else.
const REGION: u64 = 1 << 40;

/// Number of pairs as a range, so that it is chosen like any other quantity.
fn pairs_of(bounce: &Bounce) -> DelayRange {
    let [least, most] = [bounce.pulses.0, bounce.pulses.1].map(|count| Span::from_fs(u64::from(count)));
    DelayRange::between(least, most)
}

/// The toggles of every input of a step that are evenly spread over a span, for runs without draws: toggle j of 2k comes
/// ⌊j·L/2k⌋ after the change.
pub(super) fn even(step: &Step, pick: impl Fn(DelayRange) -> Span) -> Vec<Vec<Span>> {
    let Some(bounce) = &step.bounce else { return Vec::new() };
    let (toggles, span) = (2 * pick(pairs_of(bounce)).fs(), pick(bounce.lasting));
    let place = |j: u64| Span::from_fs((u128::from(j) * u128::from(span.fs()) / u128::from(toggles)) as u64);
    vec![(1..=toggles).map(place).collect(); step.set.len()]
}

/// Draws the bounces of the samples of one scenario.
#[derive(Clone, Debug)]
pub(super) struct Bounces(Vec<Drawn>);

/// One input that bounces: where its block in the stream begins, and what it is drawn from.
#[derive(Clone, Copy, Debug)]
struct Drawn {
    step: u32,
    entry: u32,
    place: u64,
    pairs: DelayRange,
    lasting: DelayRange,
}

impl Bounces {
    pub(super) fn new(stimulus: &Stimulus) -> Bounces {
        let mut drawn = Vec::new();
        let mut place = REGION;
        for (s, step) in stimulus.steps.iter().enumerate() {
            let Some(bounce) = &step.bounce else { continue };
            for entry in 0..step.set.len() as u32 {
                let (pairs, lasting) = (pairs_of(bounce), bounce.lasting);
                drawn.push(Drawn { step: s as u32, entry, place, pairs, lasting });
                place += 2 + 2 * pairs.max.fs();
            }
        }
        Bounces(drawn)
    }

    /// Draws all bounces of the sample with this stream. Numbers of pairs and spans follow the sweep's draw; toggles are
    /// uniform, the last comes at the end of the span.
    pub(super) fn draw(&self, rng: &mut ChaCha8Rng, stream: u64, draw: Marginal, into: &mut [Vec<Vec<Span>>]) {
        if self.0.is_empty() {
            return;
        }
        rng.set_stream(stream);
        for it in &self.0 {
            rng.set_word_pos(2 * u128::from(it.place));
            let pairs = draw.quantile(it.pairs, rng.next_u64()).fs();
            let span = draw.quantile(it.lasting, rng.next_u64());
            let toggles = &mut into[it.step as usize][it.entry as usize];
            toggles.clear();
            if pairs > 0 {
                let before = |u: u64| Span::from_fs(((u128::from(u) * u128::from(span.fs())) >> 64) as u64);
                toggles.extend((1..2 * pairs).map(|_| before(rng.next_u64())));
                toggles.sort_unstable();
                toggles.push(span);
            }
        }
    }
}

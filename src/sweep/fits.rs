//! Could a tally that was read from a file be one of this scenario? What merging, concluding and writing take for granted
//! is checked here, so that no file can make them fail.

use super::tally::{FactTally, RowTally, Tally, WindowTally};
use crate::findings::{Asked, Departure, Subject};
use crate::flow::Coming;
use crate::logic::{Bits, State};
use crate::scenario::Scenario;

/// What a tally is held against.
struct Shape<'a> {
    scenario: &'a Scenario,
    samples: u64,
    planned: u64,
    tries: u64,
    boards: u64,
}

impl Tally {
    /// Could this be a tally of some samples of this scenario, whole boards of them?
    ///
    /// Errors: what cannot be.
    pub(super) fn fits(&self, scenario: &Scenario, asked: &Asked) -> Result<(), &'static str> {
        let plan = &scenario.plan;
        let (moments, questions) = (scenario.stimulus.moments.len(), asked.questions.len());
        let shape =
            Shape { scenario, samples: self.samples, planned: plan.samples, tries: plan.tries, boards: self.boards };
        let boards = if plan.tries > 1 { self.samples.div_ceil(plan.tries) } else { 0 };
        let checks = [
            (self.samples <= plan.samples, "more samples than the sweep has"),
            ((self.planned, self.tries) == (plan.samples, plan.tries), "a tally of another plan"),
            (self.failing <= self.samples, "more failing samples than there are"),
            (self.part_boards.is_empty(), "boards that are cut short"),
            (self.boards == boards, "a wrong number of boards"),
            (self.windows.len() == moments, "a wrong number of steps"),
            (self.rows.len() == questions, "a wrong number of questions"),
            (self.windows.iter().all(|it| shape.window(it)), "figures of a step that cannot be"),
            (self.envelope.as_ref().is_none_or(|it| it.fits(scenario, &self.windows)), "times of edges that cannot be"),
            (self.rows.iter().all(|it| shape.row(it)), "answers to a question that cannot be"),
            (self.facts.keys().all(|it| known(it, scenario, asked)), "a finding about something that is not there"),
            (self.facts.values().all(|it| shape.fact(it)), "figures of a finding that cannot be"),
        ];
        checks.into_iter().find(|(holds, _)| !holds).map_or(Ok(()), |(_, what)| Err(what))
    }
}

/// Is what a finding is about there?
pub(super) fn known(subject: &Subject, scenario: &Scenario, asked: &Asked) -> bool {
    subject.net.is_none_or(|net| net.index() < scenario.circuit.net_count())
        && subject.moment.is_none_or(|moment| (moment as usize) < scenario.stimulus.moments.len())
        && subject.question.is_none_or(|question| (question as usize) < asked.questions.len())
}

impl Shape<'_> {
    fn moment(&self, moment: u32) -> bool {
        (moment as usize) < self.scenario.stimulus.moments.len()
    }

    fn bits(&self, bits: &Bits) -> bool {
        let nets = self.scenario.circuit.net_count();
        let (words, over) = (bits.words(), nets % 64);
        words.len() == nets.div_ceil(64) && (over == 0 || words.last().is_none_or(|last| last >> over == 0))
    }

    fn state(&self, state: &State) -> bool {
        let (ones, unknown) = (&state.ones, &state.unknown);
        let apart = |(a, b): (&u64, &u64)| a & b == 0;
        self.bits(ones) && self.bits(unknown) && ones.words().iter().zip(unknown.words()).all(apart)
    }

    fn departure(&self, departure: &Departure) -> bool {
        let input = |net: &crate::circuit::NetId| net.index() < self.scenario.circuit.input_count();
        let coming = match &departure.coming {
            Coming::Together | Coming::Apart => true,
            Coming::Restless(nets) => nets.iter().all(input),
        };
        let before = departure.before.as_ref().is_none_or(|state| self.state(state));
        self.moment(departure.moment) && before && self.state(&departure.reached) && coming
    }

    fn window(&self, window: &WindowTally) -> bool {
        let ends = [window.settled, window.unsettled, window.oscillating, window.cut];
        let ends = ends.into_iter().try_fold(0u64, u64::checked_add);
        let hits = window.hits.into_iter().try_fold(0u64, u64::checked_add);
        let (samples, planned) = (self.samples, self.planned);
        ends.is_some_and(|ends| ends <= window.named)
            && window.named <= window.reached
            && window.reached <= samples
            && window.began_before_rest <= window.named
            && hits == Some(window.unsettled)
            && window.outcomes.fits(samples, planned, |state| self.state(state))
            && window.passages.fits(samples, planned, |it| {
                it.before.as_ref().is_none_or(|before| self.state(before)) && self.state(&it.after)
            })
            && window.orders.fits(samples, planned, |_| true)
            && window.astray.fits(samples, planned, |state| self.state(state))
            && window.departed.as_ref().is_none_or(|(sample, it)| *sample < planned && self.departure(it))
            && window.settling.fits(window.settled)
            && window.cut_after.fits(window.cut)
    }

    fn row(&self, row: &RowTally) -> bool {
        let not_judged = row.not_judged.into_iter().try_fold(row.judged, u64::checked_add);
        not_judged.is_some_and(|all| all <= self.samples)
            && row.broken <= row.judged
            && row.margin.is_none_or(|(_, sample)| sample < self.planned)
            && row.margins.fits(row.judged, row.broken, row.margin.map(|it| it.0))
    }

    fn fact(&self, fact: &FactTally) -> bool {
        let (failing, tries) = fact.worst_board;
        let (on_boards, of) = fact.on_boards;
        (1..=self.samples).contains(&fact.count)
            && fact.first < self.planned
            && fact.lowest.fits(if fact.breaks_rule { fact.count } else { 0 }, self.planned)
            && fact.worst.is_none_or(|(_, sample)| sample < self.planned)
            && fact.boards_failing <= self.boards
            && failing <= tries
            && (1..=self.tries).contains(&tries)
            && on_boards <= of
            && of <= self.samples
    }
}

//! Which quantities decide: where their values in failing samples lie among all drawn ones.
//!
//! Samples are functions of their numbers, so the lowest that fail and the lowest that do not are drawn again and compared
//! quantity by quantity, by ranks ([`mann_whitney`](super::mann_whitney)). What a board draws is compared between boards:
//! one that fails in any of its tries with one that never fails. Only what chance would hardly do is told: with n quantities
//! one is told if chance gets as far in less than 1 of 1000·n cases (C. E. Bonferroni 1936; from memory), so that in a
//! finding that no quantity decides something is told at most once in a thousand. Ranks see a quantity that must be long, or
//! short; one that must be in the middle they do not see. Members of a group have what they share in common.

use super::ranks::mann_whitney;
use super::strays::Strays;
use crate::findings::Kind;
use crate::instance::{Instance, Quantities, Quantity, Sampler, Which};
use crate::scenario::Scenario;
use crate::sweep::{FAILING, Finding, SweepReport};

/// Samples that do not fail, at most.
const PASSING: usize = 1024;
/// Fewest of either kind that are compared.
const FEWEST: usize = 10;
/// Values drawn for one finding, at most: long circuits take fewer samples.
const VALUES: usize = 1 << 21;
/// How rarely chance tells anything of a finding.
const CHANCE: f64 = 0.001;
/// Quantities told, at most.
const TOLD: usize = 8;

/// How much a quantity has to do with a finding.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pull {
    /// Which.
    pub quantity: Quantity,
    /// From -1 (it fails where this is short) to 1 (where this is long): of all pairs of a failing and a passing sample, the
    /// share in which the failing one has the greater value less the share in which it has the lesser.
    pub strength: f64,
    /// Failing samples compared; of what a board draws, boards.
    pub failing: u64,
    /// Samples (boards) that do not fail.
    pub passing: u64,
}

/// The quantities that decide.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Pulls {
    /// The most decisive first; empty if none stands out from chance.
    pub told: Vec<Pull>,
    /// How many more stand out.
    pub more: u64,
    /// Samples compared, those that fail and those that do not.
    pub samples: (u64, u64),
    /// Why nothing was compared; `None`: it was.
    pub untold: Option<Untold>,
}

/// Why values were not compared.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Untold {
    /// Fewer than ten samples fail.
    FewFail,
    /// Of the samples looked at fewer than ten do not fail.
    FewPass,
    /// Nothing is drawn.
    NothingDrawn,
    /// There are too many quantities.
    TooMany,
    /// The sweep was interrupted or lacks parts: which samples do not fail is not known.
    Interrupted,
}

impl Untold {
    /// The reason in words.
    pub const fn words(self) -> &'static str {
        match self {
            Untold::FewFail => "fewer than 10 failing draws to compare",
            Untold::FewPass => "fewer than 10 passing draws to compare",
            Untold::NothingDrawn => "nothing is drawn",
            Untold::TooMany => "too many quantities to compare",
            Untold::Interrupted => "some draws are missing",
        }
    }
}

/// Failing and passing samples to compare, ascending.
struct Known<'a> {
    failing: &'a [u64],
    passing: Vec<u64>,
    /// All failing samples below `until`; of the others below it is known that they do not fail.
    all: &'a [u64],
    until: u64,
}

/// What decides a finding.
pub(super) fn of(scenario: &Scenario, sweep: &SweepReport, finding: &Finding, strays: &Strays) -> Pulls {
    let none = |untold| Pulls { untold: Some(untold), ..Pulls::default() };
    let quantities = Quantities::of(scenario);
    let count = quantities.iter().count();
    if count == 0 {
        return none(Untold::NothingDrawn);
    }
    if !sweep.missing.is_empty() {
        return none(Untold::Interrupted);
    }
    let most = (VALUES / count).min(FAILING + PASSING);
    if most < 2 * FEWEST {
        return none(Untold::TooMany);
    }
    let known = known(sweep, finding, strays, most);
    if known.failing.len() < FEWEST {
        return none(Untold::FewFail);
    }
    if known.passing.len() < FEWEST {
        return none(Untold::FewPass);
    }
    let mut pulls = Pulls { samples: (known.failing.len() as u64, known.passing.len() as u64), ..Pulls::default() };
    let chance = CHANCE / count as f64;
    let mut drawn = Drawn::new(scenario);
    let mut compare = |quantities: &[Quantity], failing: &[u64], passing: &[u64]| {
        if failing.len() < FEWEST || passing.len() < FEWEST {
            return;
        }
        let (ours, others) = (drawn.values(quantities, failing), drawn.values(quantities, passing));
        for (number, quantity) in quantities.iter().enumerate() {
            let Some(ranks) = mann_whitney(&ours[number], &others[number]) else { continue };
            if ranks.chance() < chance {
                let (failing, passing) = (failing.len() as u64, passing.len() as u64);
                pulls.told.push(Pull { quantity: *quantity, strength: ranks.strength, failing, passing });
            }
        }
    };
    compare(&quantities.sample, known.failing, &known.passing);
    let (failing, passing) = known.boards(scenario.plan.tries.max(1));
    compare(&quantities.board, &failing, &passing);
    pulls.told.sort_by(|a, b| {
        b.strength.abs().total_cmp(&a.strength.abs()).then_with(|| a.quantity.target.cmp(&b.quantity.target))
    });
    pulls.more = pulls.told.len().saturating_sub(TOLD) as u64;
    pulls.told.truncate(TOLD);
    pulls
}

/// The samples to compare, of both kinds together at most this many.
fn known<'a>(sweep: &'a SweepReport, finding: &Finding, strays: &'a Strays, most: usize) -> Known<'a> {
    let (all, until) = match (finding.subject.kind, finding.subject.moment) {
        (Kind::CriticalRace, Some(moment)) => (strays.of.get(&moment).map_or(&[][..], Vec::as_slice), strays.looked_at),
        _ => {
            let numbers = sweep.failing.get(&finding.subject).map_or(&[][..], Vec::as_slice);
            // where not all that fail are kept nothing is known beyond the last that is
            let whole = numbers.len() as u64 == finding.count;
            let last = numbers.last().map_or(0, |last| last + 1);
            (numbers, if whole { sweep.samples } else { last })
        }
    };
    let passing = (0..until).filter(|sample| all.binary_search(sample).is_err());
    let passing = passing.take(PASSING.min(most / 2)).collect();
    Known { failing: &all[..all.len().min(FAILING).min(most - most / 2)], passing, all, until }
}

impl Known<'_> {
    /// The first sample of every board that fails, and of every board that never does.
    fn boards(&self, tries: u64) -> (Vec<u64>, Vec<u64>) {
        let of = |samples: &[u64]| {
            let mut boards: Vec<u64> = samples.iter().map(|sample| sample / tries).collect();
            boards.dedup();
            boards
        };
        let fails = of(self.all);
        // a board of which not all tries are known may fail in one of them
        let whole = |board: &u64| (board + 1) * tries <= self.until;
        let passing = of(&self.passing).into_iter().filter(|it| whole(it) && fails.binary_search(it).is_err());
        let first = |boards: Vec<u64>| boards.into_iter().map(|board| board * tries).collect();
        (first(of(self.failing)), passing.map(|board| board * tries).collect())
    }
}

/// Draws samples again.
struct Drawn {
    sampler: Sampler,
    instance: Instance,
}

impl Drawn {
    fn new(scenario: &Scenario) -> Drawn {
        Drawn { sampler: Sampler::new(scenario), instance: Instance::of(scenario, &Which::Typ) }
    }

    /// For each quantity its values in these samples.
    fn values(&mut self, quantities: &[Quantity], samples: &[u64]) -> Vec<Vec<u64>> {
        let mut values = vec![Vec::with_capacity(samples.len()); quantities.len()];
        for sample in samples {
            self.sampler.fill(*sample, &mut self.instance);
            for (quantity, values) in quantities.iter().zip(&mut values) {
                values.push(self.instance.get(quantity).fs());
            }
        }
        values
    }
}

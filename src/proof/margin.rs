//! How far the ranges of all delays may be stretched about typical with a claim still proved: by cutting planes.
//!
//! Each exploration that does not prove the claim gives traces, and an exact linear program the least factor at which
//! each of them is possible; just below the least of these the claim is tried again. A wider range holds every case of a
//! narrower one, so what is proved under a factor is proved under each smaller one.

use std::sync::Arc;

use super::claim::{Call, Claim};
use super::evidence::{Evidence, Least};
use super::prove::Prover;
use super::race::Race;
use super::ratio::Ratio;
use crate::delay::DelayRange;
use crate::scenario::Scenario;
use crate::time::Span;

/// The greatest factor that is tried.
const LIMIT: u32 = 8;
/// Factors tried for one claim, at most.
const ROUNDS: usize = 24;

/// Where a margin ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum MarginEnd {
    /// Just beyond it delays break the claim.
    Refuted,
    /// Just beyond it the claim is not proved, and no case was found that breaks it.
    Undecided,
    /// It was not tried farther; or no delay has a range to stretch.
    Limit,
    /// The budget or the rounds ran out: it may be larger.
    Budget,
}

/// The least factor under which something is possible, and the least change of it that matters, where there is one.
type Cut = (Ratio, Option<Ratio>);

impl MarginEnd {
    /// The word used in files.
    pub const fn word(self) -> &'static str {
        match self {
            MarginEnd::Refuted => "refuted",
            MarginEnd::Undecided => "undecided",
            MarginEnd::Limit => "limit",
            MarginEnd::Budget => "budget",
        }
    }
}

/// How far all ranges may be stretched about their typical values with one claim still proved.
///
/// Under a factor f the range of a delay is from typ − f·(typ − min) to typ + f·(max − typ), in whole femtoseconds
/// within that, its least value not below 1 fs. Places, skews and lengths of the stimulus are not stretched.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Margin {
    /// The claim is proved under every factor below this one; 0: not even typical delays by themselves are known to keep it.
    pub factor: Ratio,
    /// What is there.
    pub end: MarginEnd,
    /// The race that breaks first there.
    pub first: Option<Race>,
}

/// The ranges of all delays stretched by a factor. `None`: a delay would be too long.
pub(super) fn stretched(scenario: &Scenario, factor: Ratio) -> Option<Scenario> {
    let stretch = |range: &mut DelayRange| -> Option<()> {
        let typ = i128::from(range.typ.fs());
        // rounded inwards
        let least = typ - factor.of(i128::from((range.typ - range.min).fs()))?;
        let most = typ + factor.of(i128::from((range.max - range.typ).fs()))?;
        range.min = Span::from_fs(least.max(1) as u64);
        range.max = Span::from_fs(u64::try_from(most).ok()?);
        (range.max < Span::LIMIT).then_some(())
    };
    let mut delays = scenario.delays.as_ref().clone();
    delays.gate.iter_mut().chain(&mut delays.wire).flatten().try_for_each(stretch)?;
    Some(Scenario { delays: Arc::new(delays), ..scenario.clone() })
}

impl Prover<'_> {
    /// The claim of a question under a factor, with what speaks against it.
    fn under(&mut self, question: u32, factor: Ratio) -> Option<(Claim, Vec<Evidence>)> {
        let scenario = stretched(self.scenario, factor)?;
        let mut other = Prover::new(&scenario, self.program, self.asked, self.budget.clone());
        other.collects = true;
        other.questions(&|number| number == question);
        self.proof.zones += other.proof.zones;
        Some((other.proof.claims.pop()?, other.evidence))
    }

    /// The margins of all claims that the method speaks of.
    pub(super) fn margins(&mut self) {
        let claims = self.proof.claims.clone();
        let total = claims.len() as u64;
        for (number, claim) in claims.into_iter().enumerate() {
            self.budget.control.report(number as u64, total);
            let evidence = self.evidence.iter().filter(|it| it.question == claim.question).cloned().collect();
            let margin = self.margin(&claim, evidence);
            self.proof.claims[number].margin = margin;
        }
    }

    /// The least factor under which something that speaks against a claim is possible, and a change of it that matters.
    fn cut(&self, evidence: &[Evidence]) -> Option<Cut> {
        let of = |evidence: &Evidence| -> Option<Cut> {
            let mut most: Option<Cut> = None;
            for trail in &evidence.trails {
                let Least::At { factor, step, .. } = trail.least(self.scenario) else { return None };
                if most.is_none_or(|it| it.0 < factor) {
                    most = Some((factor, step));
                }
            }
            most
        };
        evidence.iter().filter_map(of).min_by(|a, b| a.0.cmp(&b.0))
    }

    fn margin(&mut self, claim: &Claim, evidence: Vec<Evidence>) -> Option<Margin> {
        let question = claim.question;
        let mut good = Ratio::ZERO;
        // what is not proved: under which factor, what its claim is, and the least factor of its traces
        let mut bad: Option<(Ratio, Claim, Option<Cut>)> = None;
        match claim.call {
            Call::NotCovered => return None,
            Call::Proved => good = Ratio::ONE,
            Call::Refuted | Call::Undecided => bad = Some((Ratio::ONE, claim.clone(), self.cut(&evidence))),
        }
        for _ in 0..ROUNDS {
            if self.budget.control.cancelled() {
                break;
            }
            let Some((from, claim, cut)) = &bad else {
                // nothing is known to break it yet
                if good >= Ratio::whole(LIMIT) {
                    return Some(Margin { factor: good, end: MarginEnd::Limit, first: None });
                }
                let next = good.plus(good)?.min(Ratio::whole(LIMIT));
                match self.under(question, next) {
                    Some((claim, _)) if claim.call == Call::Proved => good = next,
                    Some((claim, evidence)) => bad = Some((next, claim, self.cut(&evidence))),
                    None => return Some(Margin { factor: good, end: MarginEnd::Limit, first: None }),
                }
                continue;
            };
            let middle = || Ratio::new(1, 2)?.times(good.plus(*from)?);
            let usable = cut.filter(|(factor, _)| *factor >= good && factor <= from);
            let Some((factor, step)) = usable else {
                // no trace tells how far to go
                if cut.is_none() && good > Ratio::ZERO && from.minus(good)? < Ratio::new(1, 64)? {
                    break;
                }
                let next = middle()?;
                match self.under(question, next)? {
                    (claim, _) if claim.call == Call::Proved => good = next,
                    (claim, evidence) => bad = Some((next, claim, self.cut(&evidence))),
                }
                continue;
            };
            let end = |claim: &Claim| match claim.call {
                Call::Refuted => MarginEnd::Refuted,
                _ => MarginEnd::Undecided,
            };
            if factor == Ratio::ZERO {
                return Some(Margin { factor, end: end(claim), first: claim.race.clone() });
            }
            let step = step.or(Ratio::new(1, 1 << 20))?;
            let below = factor.minus(step).unwrap_or(Ratio::ZERO);
            if below > good {
                let (claim, evidence) = self.under(question, below)?;
                if claim.call != Call::Proved {
                    // the same again tells nothing new
                    let cut = self.cut(&evidence).filter(|it| it.0 < factor);
                    bad = Some((below, claim, cut));
                    continue;
                }
            }
            // just beyond it the claim must be gone
            let above = factor.plus(step)?;
            if above >= *from {
                return Some(Margin { factor, end: end(claim), first: claim.race.clone() });
            }
            match self.under(question, above)? {
                (claim, _) if claim.call == Call::Proved => {
                    good = above;
                    if let Some((.., cut)) = &mut bad {
                        *cut = None;
                    }
                }
                (claim, _) => return Some(Margin { factor, end: end(&claim), first: claim.race }),
            }
        }
        Some(Margin { factor: good, end: MarginEnd::Budget, first: None })
    }
}

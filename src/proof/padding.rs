//! The least delay to add so that what is refuted becomes proved.
//!
//! Each trace that breaks a claim is a set of conditions on sums of delays; it is gone when one of its conditions, or a sum
//! of them, cannot hold anywhere in the ranges. Delay added to a gate or wire shifts its whole range, so each such choice
//! is a linear condition on the delays added. The least total over the choices (branch and bound, an exact linear program
//! each) is proved again with the ranges shifted; traces that are left or new join the others.

use std::collections::BTreeMap;
use std::sync::Arc;

use super::claim::{Call, Claim};
use super::evidence::{Evidence, Least, Trail};
use super::prove::Prover;
use super::race::Quantity;
use super::ratio::common;
use super::simplex::{Program, Solved};
use crate::delay::DelayRange;
use crate::scenario::{Padded, Scenario};
use crate::time::Span;

/// Proofs with delays added, at most.
const ROUNDS: u32 = 32;
/// Programs solved in one round, at most.
const NODES: usize = 4000;

/// How a search for delays to add ended.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum PaddingEnd {
    /// Nothing is refuted.
    NotNeeded,
    /// With the delays added every claim that was refuted is proved, and every one that was proved still is.
    Found,
    /// No delays that are allowed help, and why.
    Impossible(String),
    /// None were found, and why.
    Undecided(String),
}

impl PaddingEnd {
    /// The word used in files.
    pub const fn word(&self) -> &'static str {
        match self {
            PaddingEnd::NotNeeded => "not-needed",
            PaddingEnd::Found => "found",
            PaddingEnd::Impossible(_) => "impossible",
            PaddingEnd::Undecided(_) => "undecided",
        }
    }
}

/// Delays to add.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Padding {
    /// How the search ended.
    pub end: PaddingEnd,
    /// The delays to add to both edges, least, typical and greatest alike, in order; where the search ended without, those
    /// that were tried last.
    pub pads: Vec<(Padded, Span)>,
    /// Was the least total not surely found among the conditions, for want of programs?
    pub cut: bool,
    /// Proofs with delays added.
    pub rounds: u32,
}

/// `sum of factors · pads ≥ need`, in femtoseconds; factors by number of what may be padded.
#[derive(Clone, Debug, PartialEq, Eq)]
struct Choice {
    factors: Vec<(usize, i128)>,
    need: i128,
}

impl Choice {
    fn kept(&self, pads: &[i128]) -> bool {
        self.factors.iter().map(|(at, factor)| factor * pads[*at]).sum::<i128>() >= self.need
    }

    fn helps(&self) -> bool {
        self.need <= 0 || self.factors.iter().any(|(_, factor)| *factor > 0)
    }
}

/// The scenario with delays added.
pub(super) fn padded(scenario: &Scenario, pads: &[(Padded, Span)]) -> Option<Scenario> {
    let mut delays = scenario.delays.as_ref().clone();
    for (place, pad) in pads {
        let edges = match place {
            Padded::Gate(gate) => &mut delays.gate[gate.index()],
            Padded::Wire(wire) => &mut delays.wire[wire.index()],
        };
        for range in edges {
            *range = DelayRange { min: range.min + *pad, typ: range.typ + *pad, max: range.max + *pad };
            if range.max >= Span::LIMIT {
                return None;
            }
        }
    }
    Some(Scenario { delays: Arc::new(delays), ..scenario.clone() })
}

impl Prover<'_> {
    /// Looks for delays to add.
    pub(super) fn padding(&mut self) {
        let wanted: Vec<u32> = self
            .proof
            .claims
            .iter()
            .filter(|claim| matches!(claim.call, Call::Refuted | Call::Proved))
            .map(|claim| claim.question)
            .collect();
        let refuted = |claim: &&Claim| claim.call == Call::Refuted;
        let mut padding = Padding { end: PaddingEnd::NotNeeded, pads: Vec::new(), cut: false, rounds: 0 };
        if self.proof.claims.iter().any(|claim| claim.call == Call::Refuted) {
            let places = self.scenario.paddable();
            let broken: Vec<u32> = self.proof.claims.iter().filter(refuted).map(|claim| claim.question).collect();
            padding.end = self.search(&places, &wanted, &broken, &mut padding);
        }
        self.proof.padding = Some(padding);
    }

    fn search(&mut self, places: &[Padded], wanted: &[u32], broken: &[u32], padding: &mut Padding) -> PaddingEnd {
        let mut traces: Vec<(u32, Vec<Choice>)> = Vec::new();
        let mut evidence: Vec<Evidence> = std::mem::take(&mut self.evidence);
        let mut open: Vec<u32> = broken.to_vec();
        let mut pads = vec![0i128; places.len()];
        loop {
            let mut news = false;
            for question in &open {
                let of = evidence.iter().filter(|it| it.question == *question);
                let mut any = false;
                for it in of {
                    any = true;
                    let mut choices = self.choices(it, places);
                    if padding.rounds > 0 && choices.iter().any(|choice| choice.kept(&pads)) {
                        // it is left at exact equality: 1 fs more, then
                        choices.iter_mut().for_each(|choice| choice.need += 1);
                        if choices.iter().any(|choice| choice.kept(&pads)) {
                            continue;
                        }
                    }
                    if !choices.iter().any(Choice::helps) {
                        return PaddingEnd::Impossible(
                            "no delay that may be added enters a race with the helping sign".to_string(),
                        );
                    }
                    if !traces.iter().any(|(_, known)| *known == choices) {
                        traces.push((*question, choices));
                        news = true;
                    }
                }
                if !any {
                    return PaddingEnd::Undecided("what breaks a claim gives no condition on delays".to_string());
                }
            }
            if !news {
                return PaddingEnd::Undecided(
                    "the conditions hold with the delays added, yet a claim is not proved".into(),
                );
            }
            if padding.rounds >= ROUNDS {
                return PaddingEnd::Undecided(format!("{ROUNDS} proofs with delays added did not suffice"));
            }
            let mut tree = Tree { traces: &traces, places: places.len(), best: None, nodes: 0, too_large: false };
            tree.go(&mut Vec::new());
            padding.cut = tree.nodes >= NODES || tree.too_large;
            let Some((_, found)) = tree.best else {
                return match padding.cut {
                    true => {
                        PaddingEnd::Undecided("the linear programs for delays to add grew too many or too large".into())
                    }
                    false => PaddingEnd::Impossible(
                        "the conditions on the delays that may be added contradict each other".to_string(),
                    ),
                };
            };
            pads = found;
            let all = places.iter().zip(&pads).filter(|(_, pad)| **pad > 0);
            padding.pads = all.map(|(place, pad)| (*place, Span::from_fs(*pad as u64))).collect();
            padding.rounds += 1;
            let Some(scenario) = padded(self.scenario, &padding.pads) else {
                return PaddingEnd::Undecided("a delay would be 2^62 fs (about 77 minutes) or longer".to_string());
            };
            let mut other = Prover::new(&scenario, self.program, self.asked, self.budget.clone());
            other.collects = true;
            other.questions(&|question| wanted.contains(&question));
            self.proof.zones += other.proof.zones;
            let calls: BTreeMap<u32, Call> =
                other.proof.claims.iter().map(|claim| (claim.question, claim.call)).collect();
            open = wanted.iter().copied().filter(|it| calls.get(it) != Some(&Call::Proved)).collect();
            if open.is_empty() {
                return PaddingEnd::Found;
            }
            if self.budget.control.cancelled() {
                return PaddingEnd::Undecided("interrupted".to_string());
            }
            let stuck = other.proof.claims.iter().find(|claim| {
                claim.call != Call::Proved && !other.evidence.iter().any(|it| it.question == claim.question)
            });
            if let Some(claim) = stuck {
                let why = claim.reason.clone().unwrap_or_else(|| "a claim stays refuted".to_string());
                return PaddingEnd::Undecided(format!("with delays added a claim is not proved: {why}"));
            }
            evidence = other.evidence;
        }
    }

    /// The conditions on delays to add any of which makes evidence impossible.
    fn choices(&self, evidence: &Evidence, places: &[Padded]) -> Vec<Choice> {
        let mut all: Vec<Choice> = Vec::new();
        for trail in &evidence.trails {
            let mut demands = trail.demands();
            demands.extend(trail.closest(self.scenario));
            if let Least::At { decides, .. } = trail.least(self.scenario) {
                demands.push(decides);
            }
            // that something comes only after a step before which it came is no cure
            let late = |(unknown, factor): &(usize, i128)| {
                // a delay beyond a bounce is one
                let quantity = trail.quantities[*unknown];
                *factor < 0 && !quantity.is_delay() && !matches!(quantity, Quantity::Toggle { .. })
            };
            for demand in demands.iter().filter(|demand| !demand.terms.is_empty() && !demand.terms.iter().any(late)) {
                let need = i128::from(!demand.strict) - demand.least(&trail.quantities, self.scenario);
                let choice = Choice { factors: factors(trail, &demand.terms, places), need };
                if choice.helps() && !all.contains(&choice) {
                    all.push(choice);
                }
            }
        }
        all
    }
}

/// How often each place enters a sum.
fn factors(trail: &Trail, terms: &[(usize, i128)], places: &[Padded]) -> Vec<(usize, i128)> {
    let mut sums: BTreeMap<usize, i128> = BTreeMap::new();
    for (unknown, factor) in terms {
        let place = match trail.quantities[*unknown] {
            Quantity::Gate(gate, _) => Padded::Gate(gate),
            Quantity::Wire(wire, _) => Padded::Wire(wire),
            Quantity::Place(_)
            | Quantity::Late(..)
            | Quantity::Toggle { .. }
            | Quantity::First(_)
            | Quantity::Period(_)
            | Quantity::High(_)
            | Quantity::Jitter(..) => continue,
        };
        if let Ok(at) = places.binary_search(&place) {
            *sums.entry(at).or_default() += factor;
        }
    }
    sums.into_iter().filter(|(_, factor)| *factor != 0).collect()
}

/// Choices of one condition for each trace.
struct Tree<'a> {
    traces: &'a [(u32, Vec<Choice>)],
    places: usize,
    best: Option<(i128, Vec<i128>)>,
    nodes: usize,
    too_large: bool,
}

impl Tree<'_> {
    fn go(&mut self, chosen: &mut Vec<Choice>) {
        if self.nodes >= NODES {
            return;
        }
        self.nodes += 1;
        let pads = match least(chosen, self.places) {
            Pads::Some(pads) => pads,
            Pads::None => return,
            Pads::GaveUp => {
                self.too_large = true;
                return;
            }
        };
        let total: i128 = pads.iter().sum();
        if self.best.as_ref().is_some_and(|best| best.0 <= total) {
            return;
        }
        let open = self.traces.iter().find(|(_, choices)| !choices.iter().any(|choice| choice.kept(&pads)));
        let Some((_, choices)) = open else {
            self.best = Some((total, pads));
            return;
        };
        for choice in choices {
            // rounding up can break one that was chosen: not this way, then
            if chosen.contains(choice) {
                continue;
            }
            chosen.push(choice.clone());
            self.go(chosen);
            chosen.pop();
        }
    }
}

enum Pads {
    Some(Vec<i128>),
    None,
    GaveUp,
}

/// The least total of pads that keep all conditions, rounded up to whole femtoseconds each.
fn least(chosen: &[Choice], places: usize) -> Pads {
    let unit = chosen.iter().fold(0, |unit, choice| common(unit, choice.need)).max(1);
    let small = |value: i128| i64::try_from(value).ok();
    let row = |choice: &Choice| {
        let terms = choice.factors.iter().map(|(at, factor)| Some((*at, small(-factor)?)));
        Some((terms.collect::<Option<Vec<_>>>()?, small(-choice.need / unit)?))
    };
    let Some(rows) = chosen.iter().map(row).collect::<Option<Vec<_>>>() else { return Pads::GaveUp };
    let program = Program { variables: places, rows, objective: (0..places).map(|at| (at, -1)).collect() };
    match program.solve() {
        Solved::Best(best) => {
            let up = |value: &i128| {
                (value * unit).div_euclid(best.denominator)
                    + i128::from((value * unit).rem_euclid(best.denominator) > 0)
            };
            Pads::Some(best.values.iter().map(up).collect())
        }
        Solved::Infeasible => Pads::None,
        Solved::Unbounded | Solved::GaveUp => Pads::GaveUp,
    }
}

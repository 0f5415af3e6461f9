//! A part of a sweep: what some of its samples showed, with everything that is needed to know whose samples they are;
//! and how parts are put together again.

use serde::{Deserialize, Serialize};

use super::cases::{Case, Cases};
use super::looks::Curve;
use super::ranges::Ranges;
use crate::delay::Marginal;
use crate::findings::Asked;
use crate::scenario::{Condition, Plan, Scenario};

/// Draws that were asked for in place of the scenario's own.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Overrides {
    /// Number of samples.
    pub samples: Option<u64>,
    /// Seed.
    pub seed: Option<u64>,
    /// How delays spread.
    pub draw: Option<Marginal>,
}

impl Overrides {
    /// The plan with these in place of its own.
    pub fn apply(&self, plan: &mut Plan) {
        plan.samples = self.samples.unwrap_or(plan.samples);
        plan.seed = self.seed.unwrap_or(plan.seed);
        plan.draw = self.draw.unwrap_or(plan.draw);
    }
}

/// A part of a sweep.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Part {
    /// File name of the scenario, without any folder.
    pub name: String,
    /// The scenario as the user named it, for commands that replay a case; `None` for the demonstration.
    pub called: Option<String>,
    /// Its title.
    pub title: String,
    /// Its whole text.
    pub text: String,
    /// What the user asked for in place of the scenario's draws.
    pub overrides: Overrides,
    /// What is drawn, with these in place.
    pub plan: Plan,
    /// The samples that it is to have: from, and up to but not including.
    pub wanted: (u64, u64),
    /// Is it to stay a part once it has them? Else it is the beginning of a whole sweep.
    pub piece: bool,
    /// Is the sweep to stop when its shares are sure? Then how far they are.
    pub curve: Option<Curve>,
    /// What is done.
    pub cases: Cases,
}

impl Part {
    /// Could what it holds be of this scenario, made of its text and its overrides?
    ///
    /// Errors: what cannot be.
    pub fn fits(&self, scenario: &Scenario, asked: &Asked) -> Result<(), &'static str> {
        let (from, to) = self.wanted;
        if scenario.plan != self.plan || scenario.title != self.title {
            return Err("settings that do not follow from its scenario");
        }
        if from >= to || to > self.plan.samples {
            return Err("samples that the sweep does not have");
        }
        self.cases.fit(scenario, asked)?;
        let point = |it: &super::looks::Point| {
            (it.case as usize) < self.cases.0.len()
                && it.samples <= self.plan.samples
                && it.count <= it.of
                && it.of <= it.samples
                && super::fits::known(&it.subject, scenario, asked)
        };
        match &self.curve {
            Some(curve) if !(curve.looked <= self.plan.samples && curve.points.iter().all(point)) => {
                Err("a convergence curve that cannot be")
            }
            _ => Ok(()),
        }
    }

    /// How its sweep differs from that of another part.
    fn differs(&self, other: &Part) -> Vec<&'static str> {
        let conditions = |part: &Part| part.cases.0.iter().map(|case| case.condition.clone()).collect::<Vec<_>>();
        let envelopes = |part: &Part| part.cases.0.iter().map(|it| it.tally.envelope.is_some()).collect::<Vec<_>>();
        let (a, b) = (&self.plan, &other.plan);
        let different = [
            (self.text != other.text, "scenario text"),
            (self.title != other.title, "title"),
            (a.samples != b.samples, "number of samples"),
            (a.seed != b.seed, "seed"),
            (a.draw != b.draw, "draw"),
            (a.tries != b.tries, "tries"),
            (a != b, "plan"),
            (conditions(self) != conditions(other), "conditions"),
            (envelopes(self) != envelopes(other), "asking for times of edges"),
        ];
        let mut all: Vec<&str> = different.into_iter().filter(|(differs, _)| *differs).map(|(_, what)| what).collect();
        // of the plan only what the rows above do not say
        if all.len() > 1 {
            all.retain(|what| *what != "plan");
        }
        all
    }
}

/// In what the sweep of a part differs from that of another.
pub type Foreign = Vec<&'static str>;

/// Why parts cannot be put together.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Refusal {
    /// A file is no part, or not as it was written.
    #[error("{file}: {what}; {help}")]
    Damaged {
        /// The file.
        file: String,
        /// What is wrong.
        what: String,
        /// What would help.
        help: String,
    },
    /// A part of another sweep.
    #[error("{file} and {other} are of different sweeps: not the same {}; leave one out", differs.join(", "))]
    Foreign {
        /// The file.
        file: String,
        /// One that came before it.
        other: String,
        /// What differs.
        differs: Foreign,
    },
    /// A part that decides for itself when it ends.
    #[error("{0} is of a sweep with --until, which stops at a number of its own; finish it with --continue")]
    Until(String),
    /// Samples that two parts have.
    #[error("{file} and {other} both have {}; leave one out", samples_of(samples, condition))]
    Overlap {
        /// The file.
        file: String,
        /// One that came before it.
        other: String,
        /// The condition.
        condition: String,
        /// Samples in both.
        samples: Ranges,
    },
    /// Samples that no part has.
    #[error("no part has {}; {}", samples_of(samples, condition), remedy(samples))]
    Gap {
        /// The condition.
        condition: String,
        /// The samples.
        samples: Ranges,
    },
}

/// Most ranges that a message names.
const NAMED: usize = 8;

/// `samples 0 to 99 and 200 to 299 (200)`.
fn samples_of(samples: &Ranges, condition: &str) -> String {
    let under = if condition == Condition::NOMINAL { String::new() } else { format!(" under condition {condition}") };
    format!("{}{under}", samples.words())
}

impl Ranges {
    /// As people read them, ends included: `samples 0 to 99, 120, and 200 to 299 (201 samples)`.
    pub fn words(&self) -> String {
        if self.is_empty() {
            return "no sample".to_string();
        }
        let each = self.iter().take(NAMED).map(|it| match it.end - it.start {
            1 => it.start.to_string(),
            _ => format!("{} to {}", it.start, it.end - 1),
        });
        let mut each: Vec<String> = each.collect();
        match self.iter().count().saturating_sub(NAMED) {
            0 => {}
            more => each.push(format!("{more} more ranges")),
        }
        let list = match each.split_last() {
            Some((last, rest)) if !rest.is_empty() => format!("{} and {last}", rest.join(", ")),
            _ => each.concat(),
        };
        match self.count() {
            1 => format!("sample {list}"),
            many => format!("samples {list} ({many} samples)"),
        }
    }
}

/// How the first gap is filled.
fn remedy(samples: &Ranges) -> String {
    let first = samples.iter().next().unwrap_or_default();
    format!(
        "sweep them with --samples-from {} --count {}, or finish an unfinished part with --continue, or accept the gap \
         with --allow-gaps",
        first.start,
        first.end - first.start
    )
}

/// Parts of one sweep, put together one after the other in any order.
#[derive(Clone, Debug, Default)]
pub struct Parts {
    whole: Option<Part>,
    /// The first sample of the part whose names are taken, and what it calls the scenario.
    named: (u64, Option<String>),
    /// Files, and what each has under each condition.
    files: Vec<(String, Vec<Ranges>)>,
    refusals: Vec<Refusal>,
}

impl Parts {
    /// The first part, against which all others are held.
    pub fn first(&self) -> Option<&Part> {
        self.whole.as_ref()
    }

    /// A file that gave no part.
    pub fn refuse(&mut self, refusal: Refusal) {
        self.refusals.push(refusal);
    }

    /// Adds the part of a file. What speaks against it is told at the end, with all else.
    pub fn add(&mut self, file: &str, part: Part, scenario: &Scenario, asked: &Asked) {
        let file = file.to_string();
        if part.curve.is_some() {
            return self.refuse(Refusal::Until(file));
        }
        if let Some(whole) = &self.whole {
            let differs = whole.differs(&part);
            if !differs.is_empty() {
                let other = self.files.first().map_or_else(String::new, |it| it.0.clone());
                return self.refuse(Refusal::Foreign { file, other, differs });
            }
        }
        if let Err(what) = part.fits(scenario, asked) {
            let help = "this program has not written it; make it again".to_string();
            return self.refuse(Refusal::Damaged { file, what: format!("damaged: it holds {what}"), help });
        }
        let done: Vec<Ranges> = part.cases.0.iter().map(|case| case.done.clone()).collect();
        let mut overlaps = false;
        for (other, theirs) in &self.files {
            let both = done.iter().zip(theirs).zip(&part.cases.0).find_map(|((a, b), case)| {
                Some(a.common(b)).filter(|both| !both.is_empty()).map(|both| (case.condition.clone(), both))
            });
            if let Some((condition, samples)) = both {
                let (file, other) = (file.clone(), other.clone());
                self.refusals.push(Refusal::Overlap { file, other, condition, samples });
                overlaps = true;
            }
        }
        // of the part with the lowest sample, so that the order of the files cannot show
        let lowest = done.iter().filter_map(Ranges::hull).map(|it| it.start).min().unwrap_or(part.wanted.0);
        let named = (lowest, part.called.clone());
        self.files.push((file, done));
        match &mut self.whole {
            None => (self.whole, self.named) = (Some(part), named),
            Some(_) if overlaps => {}
            Some(whole) => {
                whole.wanted = (whole.wanted.0.min(part.wanted.0), whole.wanted.1.max(part.wanted.1));
                whole.cases.merge(&part.cases);
                if named < self.named {
                    (whole.name, whole.called, whole.overrides) = (part.name, part.called, part.overrides);
                    self.named = named;
                }
            }
        }
    }

    /// All of them together. With `whole` every sample of the plan must be there under every condition; else gaps may
    /// stay.
    ///
    /// Errors: everything that speaks against it.
    pub fn finish(self, whole: bool) -> Result<Part, Vec<Refusal>> {
        let mut refusals = self.refusals;
        let Some(part) = self.whole else { return Err(refusals) };
        // what was refused may be what is missing
        if whole && refusals.is_empty() {
            let missing = |case: &Case| case.done.missing(0..part.plan.samples);
            let nominal = part.cases.0.first().map(missing).unwrap_or_default();
            for (number, case) in part.cases.0.iter().enumerate() {
                let samples = missing(case);
                // what all lack alike is told once
                if !samples.is_empty() && (number == 0 || samples != nominal) {
                    refusals.push(Refusal::Gap { condition: case.condition.clone(), samples });
                }
            }
        }
        if refusals.is_empty() { Ok(Part { piece: true, ..part }) } else { Err(refusals) }
    }
}

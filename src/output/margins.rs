//! Margins of rules over the draws: which rules have them, the table, and in words what no bar can show.

use crate::findings::{Reason, RuleKey};
use crate::output::tables::{name, write};
use crate::output::text::about_rule;
use crate::output::words::{self, many};
use crate::scenario::Scenario;
use crate::sweep::{Margins, RuleReport, SweepReport};
use crate::time::{Decimal, Span, rounded};

/// Bars from the least to the greatest margin, about.
pub(super) const BARS: u64 = 60;

/// Does a rule measure times? Then a run that judges it and finds something to measure has a margin.
fn measures(rule: &RuleReport) -> bool {
    match rule.question.rule {
        RuleKey::Timing | RuleKey::MinPulse | RuleKey::SettleWithin => true,
        RuleKey::GlitchFree | RuleKey::Never => rule.question.bound.is_some_and(|bound| bound > Span::ZERO),
        _ => false,
    }
}

/// Draws without a margin, by why.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
struct Without {
    /// Judged, but with nothing to measure.
    unmeasured: u64,
    /// Not judged, by reason.
    not_judged: Vec<(Reason, u64)>,
    /// Never put to the test: what the rule waits for did not come.
    unasked: u64,
}

impl Without {
    fn of(rule: &RuleReport, samples: u64) -> Without {
        let left: u64 = rule.not_judged.iter().map(|it| it.1).sum();
        Without {
            unmeasured: rule.judged.saturating_sub(rule.margins.len()),
            not_judged: rule.not_judged.clone(),
            unasked: samples.saturating_sub(rule.judged + left),
        }
    }

    fn add(&mut self, other: Without) {
        self.unmeasured += other.unmeasured;
        self.unasked += other.unasked;
        for (reason, count) in other.not_judged {
            match self.not_judged.iter_mut().find(|it| it.0 == reason) {
                Some(it) => it.1 += count,
                None => self.not_judged.push((reason, count)),
            }
        }
    }

    /// Each with the word of the table.
    fn each(&self) -> impl Iterator<Item = (String, u64)> + '_ {
        let judged = self.not_judged.iter().map(|(reason, count)| (format!("not judged: {}", reason.words()), *count));
        let unmeasured = (UNMEASURED.to_string(), self.unmeasured);
        let all = std::iter::once(unmeasured).chain(judged).chain(std::iter::once((UNASKED.to_string(), self.unasked)));
        all.filter(|(_, count)| *count > 0)
    }
}

/// Judged, but there was nothing to measure.
const UNMEASURED: &str = "nothing to measure";
/// What the rule waits for did not come.
const UNASKED: &str = "not put to the test";

/// One rule with its margins, those of its steps together.
pub(super) struct OfRule<'a> {
    first: &'a RuleReport,
    steps: usize,
    pub margins: Margins,
    /// The least, with the step and the sample.
    pub least: Option<(i128, &'a RuleReport)>,
    without: Without,
}

impl<'a> OfRule<'a> {
    /// The rule, as tables call it.
    pub fn title(&self, scenario: &Scenario) -> String {
        about_rule(scenario, &self.first.question, false)
    }

    /// `3 of 400 margins below 0; least -1.2 ns (sample 8, step upper calls)`, or that there is none.
    pub fn figures(&self, scenario: &Scenario) -> String {
        let Some((least, rule)) = self.least else { return "no margin in any draw".to_string() };
        let mut at: Vec<String> = rule.margin_sample.iter().map(|sample| format!("sample {sample}")).collect();
        if self.steps > 1 {
            at.extend(words::step(scenario, rule.question.moment).map(words::the_step));
        }
        let at = if at.is_empty() { String::new() } else { format!(" ({})", at.join(", ")) };
        let (broken, all) = (words::count(self.margins.broken()), many(self.margins.len(), "margin"));
        format!("{broken} of {all} below 0; least {}{at}", rounded(least))
    }

    /// How many steps are counted together, and draws without a margin; empty for one step and none such.
    pub fn without(&self) -> String {
        let steps = (self.steps > 1).then(|| format!("{} together", many(self.steps as u64, "step")));
        let each = self.without.each().map(|(what, count)| format!("{what} in {}", many(count, "draw")));
        steps.into_iter().chain(each).collect::<Vec<_>>().join("; ")
    }
}

/// Rules that measure times, those with the least margin first, those without any last; else in the order of the rules.
pub(super) fn of_rules(report: &SweepReport) -> Vec<OfRule<'_>> {
    let mut all: Vec<OfRule<'_>> = Vec::new();
    for rule in report.rules.iter().filter(|rule| measures(rule)) {
        let key = |it: &RuleReport| (it.question.rule, it.question.index, it.question.net);
        let without = Without::of(rule, report.samples);
        let least = rule.margin.map(|margin| (margin, rule));
        // steps of a rule stand together
        match all.last_mut().filter(|it| key(it.first) == key(rule)) {
            Some(it) => {
                it.steps += 1;
                it.margins.merge(&rule.margins);
                it.without.add(without);
                if let Some(least) = least.filter(|new| it.least.is_none_or(|old| new.0 < old.0)) {
                    it.least = Some(least);
                }
            }
            None => all.push(OfRule { first: rule, steps: 1, margins: rule.margins.clone(), least, without }),
        }
    }
    all.sort_by_key(|it| (it.least.is_none(), it.least.map(|it| it.0)));
    all
}

/// Does any rule measure times? If not there is nothing to draw.
pub(super) fn any(report: &SweepReport) -> bool {
    report.rules.iter().any(measures)
}

/// How the margins of each rule spread over the draws, with the scenario's own delays: one row a bar that is not empty,
/// `from` up to but not including `to`, below 0 where the rule is broken; then draws without a margin, by why.
///
/// Columns: rule, name, net, pattern, step, what (`margin`, `nothing to measure`, `not judged: ` and the reason, `not put to
/// the test`), from, to, count. Counts of all rows of a rule and step add up to the draws. A margin is that of one draw: the
/// worst slack of all that it measured.
pub fn csv(scenario: &Scenario, report: &SweepReport) -> String {
    let unit = scenario.unit;
    write(|to| {
        let [from, below] = ["from", "to"].map(|it| format!("{it} [{unit}]"));
        to.write_record(["rule", "name", "net", "pattern", "step", "what", &from, &below, "count"])?;
        for rule in report.rules.iter().filter(|rule| measures(rule)) {
            let question = &rule.question;
            let pattern = question.pattern.as_ref().map(|pattern| pattern.words(&scenario.circuit));
            let about = [
                question.rule.word().to_string(),
                name(question.name.as_deref()),
                name(question.net.map(|net| words::net(scenario, net))),
                pattern.unwrap_or_default(),
                name(words::step(scenario, question.moment)),
            ];
            let mut row = |what: String, ends: [String; 2], count: u64| {
                let rest = [vec![what], ends.to_vec(), vec![count.to_string()]].concat();
                to.write_record(about.iter().chain(&rest))
            };
            for (from, below, count) in rule.margins.bars(BARS).1 {
                row("margin".to_string(), [from, below].map(|fs| Decimal::new(fs, unit).to_string()), count)?;
            }
            for (what, count) in Without::of(rule, report.samples).each() {
                row(what, Default::default(), count)?;
            }
        }
        Ok(())
    })
}

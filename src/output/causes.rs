//! Why findings happen, as files: one table of all quantities, and a case to replay for each finding.

use std::collections::BTreeSet;

use super::bundle::{safe, unique};
use super::tables::{name, write, yes_no};
use super::words::{self, six};
use crate::findings::{Asked, Subject};
use crate::instance::Quantity;
use crate::review::{Away, Needs, Pull, Review, Why};
use crate::scenario::Scenario;
use crate::time::Decimal;

/// For each finding the name of the file of its reduced case; `None` where there is none.
pub(super) fn case_files(scenario: &Scenario, review: &Review) -> Vec<Option<String>> {
    let mut taken = BTreeSet::new();
    let each = review.sweep.findings.iter().zip(&review.why);
    each.map(|(finding, why)| {
        why.as_ref()?.needs.as_ref()?;
        let stem = stem(scenario, &review.asked, &finding.subject, "case");
        Some(format!("{}.toml", unique(stem, &mut taken)))
    })
    .collect()
}

/// `<first>-<kind>-<net or pattern>-<step>`, of letters, digits and dashes.
pub(super) fn stem(scenario: &Scenario, asked: &Asked, subject: &Subject, first: &str) -> String {
    let named = words::subject(scenario, asked, subject);
    let mut parts = vec![first.to_string(), safe(named.kind)];
    parts.extend(named.net.map(safe).or_else(|| named.pattern.as_deref().map(safe)));
    parts.extend(named.step.map(safe));
    parts.retain(|part| !part.is_empty());
    parts.join("-")
}

/// What is to be said of a reduced case beside its quantities: whole clauses.
pub(super) fn remarks(needs: &Needs) -> Vec<String> {
    let mut all = Vec::new();
    let kept = kept(needs).join(", ");
    match (needs.typical_shows_it(), kept.is_empty()) {
        (true, true) => all.push("typical delays show it".to_string()),
        (true, false) => all.push(format!("it takes {kept} as in the failing case, else typical")),
        (false, true) => {}
        (false, false) => all.push(format!("{kept} as in the failing case")),
    }
    if let Some(cut) = needs.cut {
        let so_far = if needs.minimal { "fewer may do" } else { "not reduced to the end" };
        all.push(format!("{so_far}: {}", words::cut(cut)));
    }
    all
}

/// What of the failing case was kept that typical has otherwise.
pub(super) fn kept(needs: &Needs) -> Vec<&'static str> {
    let kept = needs.kept;
    let all = [
        (kept.start, "start bits"),
        (kept.bounces, "bounces"),
        (kept.firings, "delays of firings"),
        (kept.exact, "delays without a range"),
    ];
    all.into_iter().filter(|it| it.0).map(|it| it.1).collect()
}

/// One row a finding and quantity: first what must leave typical, the farthest first, then what decides, the most decisive
/// first; a quantity that does both has one row. A finding without any quantity has one row, too. `None` if no finding was
/// looked into.
///
/// Columns: number of the finding in `findings.csv` (from 1), kind, shape, rule_name, pattern, net, step; quantity, value,
/// min, typ, max, place (-1 at the least, 0 typical, 1 at the greatest), minimal, runs, case (file), remarks; strength
/// (-1 to 1), failing, passing, remarks on it. What moves by jitter has signed times.
pub(super) fn table(scenario: &Scenario, review: &Review) -> Option<String> {
    let unit = scenario.unit;
    let files = case_files(scenario, review);
    let looked_into = |why: &Option<Why>| why.as_ref().is_some_and(|why| why.pull.is_some());
    review.why.iter().any(looked_into).then(|| {
        write(|to| {
            let head = ["finding", "kind", "shape", "rule_name", "pattern", "net", "step", "quantity"];
            let times = ["value", "min", "typ", "max"].map(|it| format!("{it} [{unit}]"));
            let more = ["place", "minimal", "runs", "case", "remarks", "strength", "failing", "passing"];
            let last = ["strength: remarks"];
            let head = head.into_iter().map(String::from).chain(times);
            to.write_record(head.chain(more.into_iter().chain(last).map(String::from)))?;
            for (number, why) in review.why.iter().enumerate() {
                let Some(why) = why.as_ref().filter(|why| why.pull.is_some()) else { continue };
                let named = words::subject(scenario, &review.asked, &review.sweep.findings[number].subject);
                let finding = [
                    (number + 1).to_string(),
                    named.kind.to_string(),
                    name(named.shape),
                    name(named.rule_name),
                    named.pattern.unwrap_or_default(),
                    name(named.net),
                    name(named.step),
                ];
                let file = name(files[number].as_deref());
                for (away, pull) in rows(why) {
                    let mut row = finding.to_vec();
                    row.extend(quantity(scenario, away, pull));
                    row.extend(match &why.needs {
                        Some(needs) => {
                            let remarks = remarks(needs).join("; ");
                            [yes_no(needs.minimal), needs.runs.to_string(), file.clone(), remarks]
                        }
                        None => {
                            [String::new(), String::new(), String::new(), "no case could be put together".to_string()]
                        }
                    });
                    row.extend(match pull {
                        Some(it) => [six(it.strength).to_string(), it.failing.to_string(), it.passing.to_string()],
                        None => Default::default(),
                    });
                    row.push(pull_remark(why).unwrap_or_default());
                    to.write_record(&row)?;
                }
            }
            Ok(())
        })
    })
}

/// Why no quantity is said to decide, or how many more do; `None` where all is said.
pub(super) fn pull_remark(why: &Why) -> Option<String> {
    let pull = why.pull.as_ref()?;
    match pull.untold {
        Some(untold) => Some(untold.words().to_string()),
        None if pull.told.is_empty() => Some("none stands out".to_string()),
        None => (pull.more > 0).then(|| format!("and {} more", words::count(pull.more))),
    }
}

/// Each quantity once, with what is said of it.
fn rows(why: &Why) -> Vec<(Option<&Away>, Option<&Pull>)> {
    let away = why.needs.iter().flat_map(|needs| &needs.away);
    let pulls = || why.pull.iter().flat_map(|pull| &pull.told);
    let mut rows: Vec<_> =
        away.map(|away| (Some(away), pulls().find(|pull| pull.quantity.target == away.quantity.target))).collect();
    let named = |pull: &&Pull| rows.iter().all(|(_, other)| other.is_none_or(|other| other != *pull));
    let others: Vec<_> = pulls().filter(named).map(|pull| (None, Some(pull))).collect();
    rows.extend(others);
    if rows.is_empty() {
        rows.push((None, None));
    }
    rows
}

/// Name, value, least, typical, greatest, place.
fn quantity(scenario: &Scenario, away: Option<&Away>, pull: Option<&Pull>) -> [String; 6] {
    let Some(quantity) = away.map(|it| it.quantity).or(pull.map(|it| it.quantity)) else { return Default::default() };
    let time = |span| Decimal::new(words::value(&quantity, span), scenario.unit).to_string();
    let Quantity { range, target, .. } = quantity;
    [
        words::quantity(scenario, target),
        away.map_or_else(String::new, |it| time(it.value)),
        time(range.min),
        time(away.map_or(range.typ, |it| it.typical)),
        time(range.max),
        away.map_or_else(String::new, |it| six(it.place()).to_string()),
    ]
}

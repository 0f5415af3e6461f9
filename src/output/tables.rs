//! Results as CSV. Units stand in the headers; what is missing is an empty field, never 0; the order is fixed.

use crate::findings::{Asked, Reason};
use crate::logic::Value;
use crate::output::charts;
use crate::output::words::{self, six};
use crate::proof::Proof;
use crate::review::{Cell, Compared, compare, departure_words};
use crate::scenario::{Condition, Scenario};
use crate::search::SearchReport;
use crate::sweep::{Envelope, SweepReport, Worst};
use crate::time::{Decimal, Span};

/// Writes a table into memory, where only rows of unequal length could fail; the tables here have none.
pub(super) fn write(rows: impl FnOnce(&mut csv::Writer<Vec<u8>>) -> csv::Result<()>) -> String {
    let mut to = csv::Writer::from_writer(Vec::new());
    rows(&mut to).expect("rows of equal length go into memory");
    let bytes = to.into_inner().expect("memory takes every byte");
    String::from_utf8(bytes).expect("all fields are text")
}

/// A field that may be missing.
fn or_empty(field: Option<impl ToString>) -> String {
    field.map_or_else(String::new, |it| it.to_string())
}

/// A name that may be missing.
pub(super) fn name(field: Option<&str>) -> String {
    field.unwrap_or_default().to_string()
}

pub(super) fn yes_no(yes: bool) -> String {
    if yes { "yes" } else { "no" }.to_string()
}

/// Where the circuit came to rest after each step: one row an outcome, commonest first within a step.
///
/// Columns: step, count, named (samples in which the step named its window), first_sample, breaks_rule, then one column a
/// net with its value at rest, in net order.
pub fn outcomes(scenario: &Scenario, report: &SweepReport) -> String {
    let circuit = &scenario.circuit;
    write(|to| {
        let fixed = ["step", "count", "named", "first_sample", "breaks_rule"];
        to.write_record(fixed.into_iter().chain(circuit.nets().map(|net| circuit.name(net))))?;
        for window in &report.windows {
            for outcome in &window.outcomes {
                let mut row = vec![
                    name(words::step(scenario, Some(window.moment))),
                    outcome.count.to_string(),
                    window.named.to_string(),
                    outcome.first.to_string(),
                    yes_no(outcome.breaks_rule),
                ];
                row.extend(circuit.nets().map(|net| outcome.state.get(net.index()).to_string()));
                to.write_record(&row)?;
            }
        }
        Ok(())
    })
}

/// Between which times each edge came, over all samples, with the scenario's own delays: by step, then net, then number of
/// the edge in the step's window.
///
/// Columns: step, net, edge (from 1), direction (`rise`, `fall`, `X`), earliest and latest from the start of the window,
/// samples that had this edge, of (samples in which the step named the window). A row `more than 64` (or fewer, where there
/// are many nets and steps) counts samples with edges that are not told apart.
pub fn envelope(scenario: &Scenario, report: &SweepReport, envelope: &Envelope) -> String {
    let (circuit, unit) = (&scenario.circuit, scenario.unit);
    let [earliest, latest] = ["earliest", "latest"].map(|it| format!("{it} [{unit}]"));
    write(|to| {
        to.write_record(["step", "net", "edge", "direction", &earliest, &latest, "samples", "of"])?;
        for window in &report.windows {
            let step = name(words::step(scenario, Some(window.moment)));
            for net in circuit.nets() {
                let mut row = |edge: String, way: &str, times: [String; 2], samples: u64| {
                    let [earliest, latest] = &times;
                    let (samples, of) = (samples.to_string(), window.named.to_string());
                    to.write_record([&step, circuit.name(net), &edge, way, earliest, latest, &samples, &of])
                };
                for edge in envelope.of(window.moment, net) {
                    let way = match edge.to {
                        Value::Zero => "fall",
                        Value::One => "rise",
                        Value::X => "X",
                    };
                    let times = [edge.earliest, edge.latest].map(|it| it.decimal(unit).to_string());
                    row((edge.number + 1).to_string(), way, times, edge.samples)?;
                }
                let more = envelope.more(window.moment, net);
                if more > 0 {
                    row(format!("more than {}", envelope.edges()), "", Default::default(), more)?;
                }
            }
        }
        Ok(())
    })
}

/// Findings, worst first, those of each condition after those of the file's own delays, with the keys of the JSON as
/// columns. `worst` has two columns, one for times and one for shares of a delay. What departed from the reference has the
/// states of its first sample, all nets, and the compared nets that the reference allows.
pub fn findings(scenario: &Scenario, asked: &Asked, report: &SweepReport) -> String {
    let unit = scenario.unit;
    write(|to| {
        to.write_record([
            "condition",
            "kind",
            "shape",
            "rule",
            "rule_name",
            "pattern",
            "net",
            "step",
            "count",
            "of",
            "share",
            "interval_low",
            "interval_high",
            "boards_of",
            "boards_failing",
            "boards_interval_low",
            "boards_interval_high",
            "boards_mean_share",
            "boards_worst_share",
            &format!("worst [{unit}]"),
            "worst [share of the delay]",
            "tie",
            "sample",
            "worst_sample",
            "case",
            "reference: before",
            "reference: reached",
            "reference: allowed",
        ])?;
        let nominal = report.findings.iter().map(|it| (Condition::NOMINAL, it));
        let others = report.conditions.iter();
        let others = others.flat_map(|it| it.sweep.findings.iter().map(|found| (it.condition.name.as_str(), found)));
        for (condition, finding) in nominal.chain(others) {
            let named = words::subject(scenario, asked, &finding.subject);
            let (time, share) = match finding.worst {
                Some(Worst::Time(span)) => (span.decimal(unit).to_string(), String::new()),
                Some(Worst::Endless) => ("endless".to_string(), String::new()),
                Some(Worst::Share(share)) => (String::new(), six(share).to_string()),
                None => (String::new(), String::new()),
            };
            let against = finding.against.as_ref().map(|it| departure_words(scenario, it, true));
            let (before, reached, allowed) =
                against.map_or_else(Default::default, |it| (it.before.unwrap_or_default(), it.reached, it.allowed));
            to.write_record([
                condition.to_string(),
                named.kind.to_string(),
                name(named.shape),
                yes_no(finding.breaks_rule),
                name(named.rule_name),
                named.pattern.unwrap_or_default(),
                name(named.net),
                name(named.step),
                finding.count.to_string(),
                finding.of.to_string(),
                or_empty(finding.share.map(six)),
                or_empty(finding.interval.map(|it| six(it.0))),
                or_empty(finding.interval.map(|it| six(it.1))),
                or_empty(finding.boards.map(|it| it.of)),
                or_empty(finding.boards.map(|it| it.failing)),
                or_empty(finding.boards.and_then(|it| it.interval).map(|it| six(it.0))),
                or_empty(finding.boards.and_then(|it| it.interval).map(|it| six(it.1))),
                or_empty(finding.boards.map(|it| six(it.mean_share))),
                or_empty(finding.boards.map(|it| six(it.worst_share))),
                time,
                share,
                name(finding.tie.map(words::tie)),
                or_empty(finding.sample),
                or_empty(finding.worst_sample),
                or_empty(finding.case.as_ref().map(|case| case.key())),
                before,
                reached,
                allowed,
            ])?;
        }
        Ok(())
    })
}

/// Rules: how often each was judged, broken, not judged and why, and its margin; with a directed search, in more columns,
/// the worst margin that it met, its runs and why it ended.
pub fn rules(scenario: &Scenario, report: &SweepReport, search: Option<&SearchReport>) -> String {
    let unit = scenario.unit;
    write(|to| {
        let mut header: Vec<String> =
            ["rule", "name", "net", "pattern", "step"].into_iter().map(String::from).collect();
        header.push(format!("bound [{unit}]"));
        header.extend(["judged".to_string(), "broken".to_string()]);
        header.extend(Reason::ALL.iter().map(|reason| format!("not judged: {}", reason.words())));
        header.extend([format!("margin [{unit}]"), "margin_sample".to_string(), "at_most".to_string()]);
        if search.is_some() {
            header.extend([format!("searched margin [{unit}]"), "search runs".to_string(), "search ended".to_string()]);
        }
        to.write_record(&header)?;
        for (number, rule) in report.rules.iter().enumerate() {
            let question = &rule.question;
            let mut row = vec![
                question.rule.word().to_string(),
                name(question.name.as_deref()),
                name(question.net.map(|net| words::net(scenario, net))),
                or_empty(question.pattern.as_ref().map(|pattern| pattern.words(&scenario.circuit))),
                name(words::step(scenario, question.moment)),
                or_empty(question.bound.map(|bound| bound.decimal(unit))),
                rule.judged.to_string(),
                rule.broken.to_string(),
            ];
            // a reason that did not occur was counted, and its count is 0
            row.extend(Reason::ALL.iter().map(|reason| {
                let count = rule.not_judged.iter().find(|(why, _)| why == reason);
                count.map_or(0, |(_, n)| *n).to_string()
            }));
            row.push(or_empty(rule.margin.map(|fs| Decimal::new(fs, unit))));
            row.push(or_empty(rule.margin_sample));
            row.push(or_empty(rule.at_most.map(|it| six(it.share))));
            if let Some(it) = search.and_then(|search| search.searched.get(number)) {
                row.push(or_empty(it.margin.map(|fs| Decimal::new(fs, unit))));
                row.extend([it.runs.to_string(), it.ended.words().to_string()]);
            }
            to.write_record(&row)?;
        }
        Ok(())
    })
}

/// The conditions side by side, one column each, the file's own delays first; `None` if there are none.
///
/// Columns: figure, what it is of (as in findings and rules), then one a condition. A share is that of the draws judged; a
/// settling time that a cut window could make longer has `>=` before it.
pub fn conditions(scenario: &Scenario, asked: &Asked, report: &SweepReport) -> Option<String> {
    let unit = scenario.unit;
    let comparison = compare(scenario, report)?;
    let cell = |cell: &Option<Cell>| match cell {
        None => String::new(),
        Some(Cell::Call(call)) => call.words().to_string(),
        Some(Cell::Count(_, 0)) => String::new(),
        Some(Cell::Count(count, of)) => six(*count as f64 / *of as f64).to_string(),
        Some(Cell::Margin(fs)) => Decimal::new(*fs, unit).to_string(),
        Some(Cell::Time(time, at_least)) => format!("{}{}", if *at_least { ">=" } else { "" }, time.decimal(unit)),
    };
    Some(write(|to| {
        let fixed = ["figure", "kind", "shape", "name", "pattern", "net", "step"].into_iter().map(String::from);
        let names = comparison.columns.iter().map(|(name, scale)| format!("{name} (x {scale})"));
        to.write_record(fixed.chain(names))?;
        for (what, cells) in &comparison.rows {
            let step = |moment: u32| name(words::step(scenario, Some(moment)));
            let mut row = vec![String::new(); 7];
            match what {
                Compared::Verdict => row[0] = "verdict".to_string(),
                Compared::Share(subject) => {
                    let named = words::subject(scenario, asked, subject);
                    row = vec![
                        "share".to_string(),
                        named.kind.to_string(),
                        name(named.shape),
                        name(named.rule_name),
                        named.pattern.unwrap_or_default(),
                        name(named.net),
                        name(named.step),
                    ];
                }
                Compared::Margin(number) => {
                    row[0] = format!("margin [{unit}]");
                    if let Some(question) = report.rules.get(*number as usize).map(|rule| &rule.question) {
                        row[1] = question.rule.word().to_string();
                        row[3] = name(question.name.as_deref());
                        row[4] = or_empty(question.pattern.as_ref().map(|it| it.words(&scenario.circuit)));
                        row[5] = name(question.net.map(|net| words::net(scenario, net)));
                    }
                }
                Compared::Median(moment) => (row[0], row[6]) = (format!("settling median [{unit}]"), step(*moment)),
                Compared::Longest(moment) => (row[0], row[6]) = (format!("settling longest [{unit}]"), step(*moment)),
            }
            row.extend(cells.iter().map(cell));
            to.write_record(&row)?;
        }
        Ok(())
    }))
}

/// Settling-time histogram of every step: settled windows by class, `from` up to but not including `to`. `far` is `yes` for
/// the one bar of the few windows that settle far later than all others (see [`Settling::far`](crate::sweep::Settling)).
pub fn settling(scenario: &Scenario, report: &SweepReport) -> String {
    let unit = scenario.unit;
    write(|to| {
        to.write_record(["step", &format!("from [{unit}]"), &format!("to [{unit}]"), "count", "far"])?;
        for window in &report.windows {
            let Some(settling) = &window.settling else { continue };
            for (number, (from, below, count)) in settling.bars.iter().enumerate() {
                to.write_record([
                    name(words::step(scenario, Some(window.moment))),
                    from.decimal(unit).to_string(),
                    below.decimal(unit).to_string(),
                    count.to_string(),
                    yes_no(settling.far && number + 1 == settling.bars.len()),
                ])?;
            }
        }
        Ok(())
    })
}

/// The figures of every step's settling time, one row a step: what the lines of the chart stand at, and the ends.
///
/// Columns: step, settled (windows), least, median, p99, worst, each with what a window that was cut could make of it
/// (`..._at_least`: `yes` if it could be longer), limit (of the rules), proved_bound (over all delays in the ranges; all
/// settle earlier where `proved_below` is `yes`, and later only by exactly equal times where `but_for_ties` is). What is not
/// known, or not asked, is empty.
pub fn settling_figures(scenario: &Scenario, report: &SweepReport, proof: Option<&Proof>) -> String {
    let unit = scenario.unit;
    let time = |it: Option<Span>| it.map_or_else(String::new, |it| it.decimal(unit).to_string());
    write(|to| {
        let timed = |name: &str| format!("{name} [{unit}]");
        to.write_record([
            "step",
            "settled",
            &timed("least"),
            &timed("median"),
            "median_at_least",
            &timed("p99"),
            "p99_at_least",
            &timed("worst"),
            "worst_at_least",
            &timed("limit"),
            &timed("proved_bound"),
            "proved_below",
            "but_for_ties",
        ])?;
        for window in &report.windows {
            let mut row = vec![name(words::step(scenario, Some(window.moment))), window.settled.to_string()];
            row.extend(match &window.settling {
                None => vec![String::new(); 7],
                Some(it) => vec![
                    time(it.min),
                    time(Some(it.median)),
                    yes_no(it.median_at_least),
                    time(Some(it.p99)),
                    yes_no(it.p99_at_least),
                    time(Some(it.max)),
                    yes_no(it.max_at_least),
                ],
            });
            row.push(time(charts::limit(scenario, window.moment)));
            let proved = proof.and_then(|it| it.windows.iter().find(|it| it.moment == window.moment));
            row.extend(match proved.and_then(|it| it.settling.map(|(_, most)| (most, it))) {
                None => [String::new(), String::new(), String::new()],
                Some((most, it)) => [time(Some(most)), yes_no(it.settling_below), yes_no(it.settling_but_for_ties)],
            });
            to.write_record(&row)?;
        }
        Ok(())
    })
}

//! Findings, worst first: what, how often, how bad, which paths race, the case that shows it, how to replay it.

use maud::{Markup, html};

use super::parts::{Cell, Table, command, cut, figure};
use super::{Told, about, anchor, parts, waveforms};
use crate::instance::{Instance, Quantities, Quantity, Which};
use crate::output::search::{CaseFile, case_files, rare_claim};
use crate::output::text::{self, Tone, for_page};
use crate::output::words::{self, clean, many, sentence};
use crate::output::{causes, deciding, races, sensitivity, shares};
use crate::review::{Needs, Why};
use crate::scenario::Vary;
use crate::sweep::Finding;
use crate::time::{Decimal, Span};

/// Most findings told in full; more are rows of a table.
const FULL: usize = 24;
/// Most rows of that table.
const ROWS: usize = 200;
/// Most quantities of one failing case.
const QUANTITIES: usize = 24;
/// Letters of one path at most.
const PATH: usize = 1_200;

/// Names of files that commands take.
struct Files<'a> {
    searched: Vec<CaseFile<'a>>,
    reduced: Vec<Option<String>>,
}

pub(super) fn section(told: &Told<'_>) -> Markup {
    let findings = &told.review.sweep.findings;
    let files = Files { searched: case_files(told.review), reduced: causes::case_files(told.scenario, told.review) };
    let full = findings.len().min(FULL);
    html! {
        @if findings.is_empty() {
            p { "Nothing was found: no rule was broken, and nothing else was seen that a review should know of." }
        } @else {
            p { "Worst first: what breaks a rule comes before what breaks none. Numbers are those of " code { "findings.csv" }
                "; shares are of the draws that were judged." }
        }
        (how_often(told))
        @for (number, finding) in findings.iter().enumerate().take(full) { (article(told, &files, number, finding)) }
        (rest(told, &files, full))
        (what_decides(told))
        (parts::blocks("conditions", "Conditions", &for_page::by_condition(told.page, told.scenario, told.review)))
    }
}

/// All shares side by side, if there is any.
fn how_often(told: &Told<'_>) -> Markup {
    let (scenario, asked, sweep) = (told.scenario, &told.review.asked, &told.review.sweep);
    if !shares::has_rows(sweep) {
        return html! {};
    }
    figure(
        "shares",
        &shares::svg(scenario, asked, sweep),
        &html! {
            "How often each finding comes, and how sure that is. Files: " code { "shares.svg" } ", " code { "shares.csv" } "."
        },
    )
}

/// The delays that decide, finding by finding, if any finding was looked into.
fn what_decides(told: &Told<'_>) -> Markup {
    let Some(picture) = sensitivity::svg(told.scenario, told.review) else { return html! {} };
    html! {
        h3 { "Which delays decide" }
        p.leads { "Over all draws that were compared, not in one case: of all pairs of a failing and a passing draw, the share in \
            which the failing one has the greater value less the share in which it has the lesser. What must be neither long \
            nor short but in the middle does not show." }
        (figure("sensitivity", &picture, &html! {
            "Which delays decide. Files: " code { "sensitivity.svg" } ", " code { "sensitivity.csv" } "; with the case of each \
            finding: " code { "causes.csv" } "."
        }))
    }
}

fn article(told: &Told<'_>, files: &Files<'_>, number: usize, finding: &Finding) -> Markup {
    let scenario = told.scenario;
    let why = told.review.why.get(number).and_then(Option::as_ref);
    let id = anchor(number);
    let run = told.drawn.iter().find(|run| run.finding == Some(number));
    html! {
        article id=(id) aria-labelledby=(format!("{id}-title")) {
            h3 id=(format!("{id}-title")) { (number + 1) ". " (clean(&sentence_less(&about(told, number)))) }
            p {
                @if finding.breaks_rule { strong.bad { "Breaks a rule." } } @else { strong { "Breaks no rule." } }
                " " (clean(&sentence(&text::figures(scenario, finding))))
            }
            @if let Some(against) = &finding.against {
                p { (if finding.count > 1 { "The first: " } else { "" }) (clean(&text::departure(scenario, against))) "." }
            }
            (paths(told, finding, why))
            @if let Some(run) = run { (waveforms::draw(scenario, run)) }
            (reasons(told, files, number, why))
            @if finding.breaks_rule { (case(told, number, run.map(|run| &run.run.instance), why)) }
            @match text::replay(told.page, told.review, &files.searched, finding) {
                Some(replay) => { p.leads { "Replays the failing case:" } (command(&replay)) }
                None => { p.unsure { "No single case shows it, so there is none to replay." } }
            }
        }
    }
}

/// The heading of a finding begins with a capital and has no full stop.
fn sentence_less(text: &str) -> String {
    sentence(text).trim_end_matches('.').to_string()
}

/// The two paths that race, and the inequality that decides.
fn paths(told: &Told<'_>, finding: &Finding, why: Option<&Why>) -> Markup {
    let pair = why.and_then(|why| why.race.as_ref());
    let decides = rare_claim(told.review, finding).and_then(|claim| claim.race.as_ref());
    html! {
        @if let Some(pair) = pair {
            p { (if pair.second.is_some() { "The paths that race:" } else { "The path that led to it:" }) }
            ul.paths { @for line in races::lines(told.scenario, pair, PATH) { li { (clean(&line)) } } }
        }
        @if let Some(race) = decides { p { "What decides it: " (clean(&deciding::race(told.scenario, race))) "." } }
    }
}

/// What it takes, what decides over all draws, and the case with nothing else.
fn reasons(told: &Told<'_>, files: &Files<'_>, number: usize, why: Option<&Why>) -> Markup {
    let Some(why) = why else { return html! {} };
    let said = [text::needs(told.scenario, why), text::pull(told.scenario, why)].into_iter().flatten();
    let said = said.collect::<Vec<_>>().join("; ");
    let remark = why.pull.as_ref().and_then(|pull| pull.untold);
    let file = files.reduced.get(number).and_then(Option::as_deref);
    html! {
        @if !said.is_empty() { p { (clean(&sentence(&said))) } }
        @if let Some(untold) = remark { p.note { "Which delays decide was not compared: " (untold.words()) "." } }
        @if let Some(file) = file {
            p.leads { "Replays the reduced case, with nothing else away from typical:" }
            (command(&told.page.replay_file(file)))
        }
    }
}

/// The failing case and the reduced case as a table of delays: what must leave typical first, then what decides, then the
/// rest in the order of the file.
fn case(told: &Told<'_>, number: usize, failing: Option<&Instance>, why: Option<&Why>) -> Markup {
    let scenario = told.scenario;
    let needs = why.and_then(|why| why.needs.as_ref());
    if failing.is_none() && needs.is_none() {
        return html! {};
    }
    let mut rows: Vec<(Quantity, bool)> = needs.iter().flat_map(|it| &it.away).map(|it| (it.quantity, true)).collect();
    let mut add = |quantity: Quantity| {
        if rows.iter().all(|(it, _)| it.target != quantity.target) {
            rows.push((quantity, false));
        }
    };
    let pulls = || why.and_then(|why| why.pull.as_ref()).into_iter().flat_map(|pull| &pull.told);
    pulls().for_each(|pull| add(pull.quantity));
    let all = Quantities::of(scenario);
    // a whole list of a large circuit need not be looked through
    // what the reduced case has at typical tells nothing
    if failing.is_some() {
        all.iter().take(4 * QUANTITIES).for_each(|quantity| add(*quantity));
    }
    let typical = Instance::of(scenario, &Which::Typ);
    let many_of_them = if failing.is_some() { all.board.len() + all.sample.len() } else { rows.len() };
    let time = |quantity: &Quantity, span: Span| Decimal::new(words::value(quantity, span), scenario.unit).to_string();
    let row = |(quantity, needed): &(Quantity, bool)| {
        let number = |it: &Instance| Cell::Number(time(quantity, it.get(quantity)));
        let strength = pulls().find(|pull| pull.quantity.target == quantity.target);
        let mut row = vec![Cell::Text(words::quantity(scenario, quantity.target))];
        row.extend(failing.map(number));
        row.extend(needs.map(|needs| reduced(needs, quantity, *needed, &time)));
        let spans = [quantity.range.min, typical.get(quantity), quantity.range.max];
        row.extend(spans.map(|it| Cell::Number(time(quantity, it))));
        row.push(match strength {
            Some(pull) => {
                let side = if pull.strength > 0.0 { "long" } else { "short" };
                Cell::Text(format!("fails where {side} ({:.2})", pull.strength.abs()))
            }
            None => Cell::Empty,
        });
        row
    };
    if rows.is_empty() && failing.is_none() {
        return html! {};
    }
    if rows.is_empty() {
        return html! { p.note { "No delay, step or clock of this scenario has a range: there is one case only." } };
    }
    let unit = scenario.unit;
    let mut head = vec![(format!("quantity [{unit}]"), false)];
    head.extend(failing.map(|_| ("failing case".to_string(), true)));
    head.extend(needs.map(|_| ("reduced case".to_string(), true)));
    head.extend(["least", "typical", "greatest"].map(|it| (it.to_string(), true)));
    head.push(("over all failing draws".to_string(), false));
    let table_id = format!("{}-case", anchor(number));
    let more = needs.filter(|needs| !needs.typical_shows_it()).map_or("", |_| ": what must leave typical first");
    let table = Table {
        id: &table_id,
        // regions are told apart by their names
        caption: &format!("The case that shows finding {}{more}", number + 1),
        head: head.iter().map(|(title, number)| (title.as_str(), *number)).collect(),
        rows: rows.iter().take(QUANTITIES).map(row).collect(),
    };
    let shown = rows.len().min(QUANTITIES);
    html! {
        (table.draw())
        @if failing.is_some_and(|it| it.firings.is_some()) && scenario.plan.vary == Vary::PerEvent {
            p.note { "Every firing of a gate takes a delay of its own: delays of gates stand at typical here." }
        }
        (cut(many_of_them.saturating_sub(shown), "quantities", "the file that the command below writes or takes"))
    }
}

/// The value in the reduced case, marked where it must leave typical.
fn reduced(needs: &Needs, quantity: &Quantity, needed: bool, time: &dyn Fn(&Quantity, Span) -> String) -> Cell {
    let value = time(quantity, needs.case.get(quantity));
    if needed { Cell::Number(format!("{value} ←")) } else { Cell::Number(value) }
}

/// Further findings, a row each.
fn rest(told: &Told<'_>, files: &Files<'_>, full: usize) -> Markup {
    let findings = &told.review.sweep.findings;
    if findings.len() <= full {
        return html! {};
    }
    let row = |(number, finding): (usize, &Finding)| {
        let breaks = if finding.breaks_rule { (Tone::Bad, "yes") } else { (Tone::Plain, "no") };
        let replay = text::replay(told.page, told.review, &files.searched, finding);
        vec![
            Cell::Text((number + 1).to_string()),
            Cell::Text(about(told, number)),
            Cell::Marked(breaks.0, breaks.1.to_string()),
            Cell::Text(text::figures(told.scenario, finding)),
            replay.map_or(Cell::Empty, Cell::Code),
        ]
    };
    let table = Table {
        id: "further-findings",
        caption: "Further findings",
        head: vec![
            ("number", false),
            ("finding", false),
            ("breaks a rule", false),
            ("how often, how bad", false),
            ("replay", false),
        ],
        rows: findings.iter().enumerate().skip(full).take(ROWS).map(row).collect(),
    };
    html! {
        h3 { "Further findings: " (many((findings.len() - full) as u64, "row")) }
        (table.draw())
        (cut(findings.len().saturating_sub(full + ROWS), "findings", "findings.csv"))
    }
}

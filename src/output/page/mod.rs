//! The report page: one HTML file for a review meeting, with all pictures in it, that needs no network and no script.
//!
//! Sections come in the order in which a meeting asks: verdict, what was checked, findings, rules, assumptions, steps,
//! coverage, proof, states, what was not covered, cautions. Sentences are those of the terminal texts and tables those of
//! the CSV files; lists that are cut say what is left out and where it is. A small script adds a section in which one steps
//! through the runs that were drawn; without scripts nothing else is missing.

mod assumptions;
mod checked;
mod findings;
mod not_covered;
mod parts;
mod proof;
mod rules;
mod slider;
mod states;
mod steps;
mod waveforms;

use maud::{DOCTYPE, Markup, PreEscaped, html};

use self::waveforms::Drawn;
use super::cautions;
use super::text::{self, Block, Page, for_page};
use super::words::{self, clean};
use crate::review::{Call, Review};
use crate::scenario::Scenario;

/// How the page looks: light, dark, on paper.
const STYLE: &str = include_str!("style.css");
/// What the page does: stepping through runs.
const SCRIPT: &str = include_str!("script.js");

/// Everything that sections are made from.
struct Told<'a> {
    scenario: &'a Scenario,
    review: &'a Review,
    /// How commands name the scenario and its files.
    page: &'a Page<'a>,
    /// The runs that were drawn.
    drawn: Vec<Drawn<'a>>,
}

/// A part of the page: its id, its title, what is in it.
struct Section {
    id: &'static str,
    title: &'static str,
    content: Markup,
    /// Only scripts make it useful.
    scripted: bool,
}

impl Section {
    fn new(id: &'static str, title: &'static str, content: Markup) -> Section {
        Section { id, title, content, scripted: false }
    }
}

/// The page of a review. Commands name the scenario as `page` does; its style and width do not matter.
///
/// The same review gives the same bytes, whatever number of threads it took. What it says of the program is its version and
/// those of its formats; there is no date.
pub fn report(scenario: &Scenario, review: &Review, page: &Page<'_>) -> String {
    let told = Told { scenario, review, page, drawn: waveforms::drawn(scenario, review) };
    let sections = [
        Section::new("verdict", "Verdict", verdict(&told)),
        Section::new("checked", "What was checked", checked::section(&told)),
        Section::new("findings", "Findings", findings::section(&told)),
        Section { scripted: true, ..Section::new("stepping", "Step through a run", slider::section(&told)) },
        Section::new("rules", "Rules and margins", rules::section(&told)),
        Section::new("assumptions", "Assumptions", assumptions::section(&told)),
        Section::new("steps", "Steps, outcomes, settling times", steps::section(&told)),
        Section::new("coverage", "Coverage", states::coverage(&told)),
        Section::new("proof", "Proof over all delays", proof::section(&told)),
        Section::new("states", "Stable states and flow map", states::section(&told)),
        Section::new("not-covered", "What was not covered, and what is not modelled", not_covered::section(&told)),
        Section::new("cautions", "Cautions", html! { ul { @for text in cautions::ALL { li { (text) } } } }),
    ];
    let title = clean(&scenario.title);
    let markup = html! {
        (DOCTYPE)
        html lang="en" {
            head {
                meta charset="utf-8";
                meta name="viewport" content="width=device-width, initial-scale=1";
                meta name="color-scheme" content="light dark";
                title { (title) ": review" }
                style { (PreEscaped(STYLE)) }
            }
            body {
                a.skip href="#content" { "Skip to the verdict" }
                header {
                    h1 { (title) }
                    p { "Review by Stillgate " (env!("CARGO_PKG_VERSION")) ", for " (words::steps(scenario)) " and "
                        (words::many(review.sweep.samples, "draw")) " of the delays" }
                }
                nav aria-labelledby="contents" {
                    h2 #contents { "Contents" }
                    ol {
                        @for section in &sections {
                            li hidden[section.scripted] data-scripted[section.scripted] {
                                a href=(format!("#{}", section.id)) { (section.title) }
                            }
                        }
                    }
                }
                main #content {
                    @for section in &sections {
                        section id=(section.id) aria-labelledby=(format!("{}-title", section.id))
                            hidden[section.scripted] data-scripted[section.scripted] {
                            h2 id=(format!("{}-title", section.id)) { (section.title) }
                            (section.content)
                        }
                    }
                }
                script #runs type="application/json" { (PreEscaped(slider::data(&told))) }
                script { (PreEscaped(SCRIPT)) }
            }
        }
    };
    markup.into_string()
}

/// The verdict in one sentence, its reasons, and what to read first.
fn verdict(told: &Told<'_>) -> Markup {
    let review = told.review;
    let class = match review.verdict.call {
        Call::Broken => "bad",
        Call::Undecided => "unsure",
        Call::Proved | Call::NoFailureFound => "strong",
    };
    let blocks = for_page::verdict(review);
    let (sentence, reasons) = match blocks.split_first() {
        Some((Block::Text(_, sentence), reasons)) => (sentence.as_str(), reasons),
        _ => (review.verdict.sentence.as_str(), &blocks[..]),
    };
    let broken = review.sweep.findings.iter().filter(|finding| finding.breaks_rule).count() as u64;
    html! {
        p class=(format!("call {class}")) { (clean(sentence)) }
        (parts::blocks("verdict-table", "Reasons", reasons))
        @if broken > 0 {
            p { a href="#findings" { (words::many(broken, "finding")) " that " (if broken == 1 { "breaks" } else { "break" })
                " a rule" } ", worst first, with the case that shows each." }
        }
        (parts::blocks("verdict-missing", "Missing", &for_page::missing(review)))
    }
}

/// Without a heading that says what the title of the section says.
fn unheaded(blocks: Vec<Block>) -> Vec<Block> {
    match blocks.first() {
        Some(Block::Heading(_)) => blocks.into_iter().skip(1).collect(),
        _ => blocks,
    }
}

/// A finding as the page names it in links.
fn anchor(finding: usize) -> String {
    format!("finding-{}", finding + 1)
}

/// What a finding is about.
fn about(told: &Told<'_>, finding: usize) -> String {
    text::about(told.scenario, &told.review.asked, &told.review.sweep.findings[finding].subject)
}

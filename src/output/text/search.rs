//! What a directed search met beyond the draws.

use super::Page;
use super::paper::{Paper, Tone};
use crate::output::search::CaseFile;
use crate::output::words;
use crate::search::SearchReport;

/// A search with the files of its cases.
#[derive(Clone, Copy)]
pub(super) struct Searching<'a> {
    pub report: &'a SearchReport,
    pub files: &'a [CaseFile<'a>],
}

impl Searching<'_> {
    /// The worst margin that the search met of some questions, in fs.
    pub fn margin(&self, questions: impl Fn(u32) -> bool) -> Option<i128> {
        self.report.searched.iter().filter(|it| questions(it.question)).filter_map(|it| it.margin).min()
    }

    /// Did it break one of them?
    pub fn broke(&self, questions: impl Fn(u32) -> bool) -> bool {
        self.report.searched.iter().any(|it| questions(it.question) && it.breach.is_some())
    }
}

/// How much was searched, and what the search says not.
pub(super) fn search(paper: &mut Paper, page: &Page<'_>, searching: Searching<'_>) {
    let report = searching.report;
    let (runs, questions) = (words::many(report.runs, "run"), words::many(report.count(), "question"));
    let mut text = format!("Directed search: {runs} for {questions}; worst met, no bound");
    if report.left_out() > 0 {
        text += &format!("; no runs left for {}", words::many(report.left_out(), "question"));
    }
    if report.interrupted {
        text += "; interrupted";
    }
    let tone = if report.interrupted || report.left_out() > 0 { Tone::Unsure } else { Tone::Plain };
    paper.say(0, tone, &format!("{text}."));
    // of a case that breaks a rule the finding has the command
    let less = searching.files.iter().find(|file| !searching.broke(|question| question == file.question));
    if let Some(file) = less {
        paper.say(0, Tone::Plain, "The smallest margin that only the search met:");
        paper.whole(4, &page.replay_file(&file.name));
    }
}

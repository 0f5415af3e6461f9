//! What a terminal shows: one text a command, 60 to 100 columns wide, about one screen long.
//!
//! Lists are shortened, and say by how much and which file has the rest. Colour, where the caller wants it, is only added
//! to words that say the same. A text about a sweep never says more than "no failure found".

mod blocks;
mod challenge;
mod check;
mod conditions;
mod findings;
mod flow;
pub(super) mod for_page;
mod limit;
mod notes;
mod paper;
mod part;
mod prove;
mod prove_more;
mod review;
mod rules;
mod run;
mod search;
mod states;
mod steps;
mod sure;
mod sweep;
mod ties;
mod why;

pub(super) use blocks::Block;
pub use check::check;
pub(super) use check::{place, range, sets};
pub(super) use findings::{about, departure, figures, replay};
pub(super) use flow::covered;
pub use limit::{limit, limit_map};
pub use paper::Style;
pub(super) use paper::Tone;
pub use part::part;
pub use prove::prove;
pub(super) use review::draws;
pub use review::review;
pub(super) use rules::about as about_rule;
pub use run::run;
pub use states::states;
pub use sweep::sweep;
pub(super) use why::{needs, pull};

use crate::instance::Which;

/// How and for whom a text is written.
#[derive(Clone, Copy, Debug)]
pub struct Page<'a> {
    /// With or without colour.
    pub style: Style,
    /// Columns of the terminal; texts take 60 to 100.
    pub width: usize,
    /// The scenario as the user named it, for commands that replay a case; `None` for the demonstration.
    pub scenario: Option<&'a str>,
    /// Options of the draws that the user gave, for the same commands: ` --seed 7`; else empty.
    pub options: &'a str,
    /// The folder of the files of this review, for the same commands; empty if files are named alone.
    pub folder: &'a str,
}

impl Default for Page<'_> {
    fn default() -> Self {
        Page { style: Style::Plain, width: 100, scenario: None, options: "", folder: "" }
    }
}

impl Page<'_> {
    fn paper(&self) -> paper::Paper {
        paper::Paper::new(self.style, self.width)
    }

    /// The command that replays a case, under a condition if one is named.
    pub(super) fn replay(&self, case: &Which, condition: Option<&str>) -> String {
        let scenario = self.scenario.map_or_else(String::new, |name| format!(" {}", in_a_shell(name)));
        let condition = condition.map_or_else(String::new, |name| format!(" --condition {}", in_a_shell(name)));
        format!("stillgate run{scenario}{}{condition} --delays {}", self.options, case.key())
    }
}

impl Page<'_> {
    /// The command that runs the case in a file of this review.
    pub(super) fn replay_file(&self, file: &str) -> String {
        let scenario = self.scenario.map_or_else(String::new, |name| format!(" {}", in_a_shell(name)));
        let path = std::path::Path::new(self.folder).join(file);
        format!("stillgate run{scenario} --delays {}", in_a_shell(&path.display().to_string()))
    }
}

/// A word as it is written on a command line.
fn in_a_shell(word: &str) -> String {
    match word.chars().any(|letter| letter.is_whitespace() || matches!(letter, '\'' | '"' | '&' | '$')) {
        true => format!("'{}'", word.replace('\'', "'\\''")),
        false => word.to_string(),
    }
}

/// The list was cut: how much more there is, and where.
fn more(paper: &mut paper::Paper, left: usize, place: &str) {
    if left > 0 {
        let left = crate::output::words::count(left as u64);
        paper.say(2, paper::Tone::Plain, &format!("... and {left} more (see {place})"));
    }
}

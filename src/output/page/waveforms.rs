//! The waveforms of the page: each run that gets a picture, on one sheet.

use maud::{Markup, html};

use super::parts::figure;
use crate::output::waves::{self, Nets, Picture, Sheet};
use crate::output::{bundle, pictures, words};
use crate::review::{Review, RunReport};
use crate::scenario::Scenario;

/// A run and its picture.
pub(super) struct Drawn<'a> {
    /// The id of the picture: `run-0` is typical where there is a typical run.
    pub id: String,
    /// The finding whose worst case it is; `None`: the typical run.
    pub finding: Option<usize>,
    pub run: &'a RunReport,
    /// The stem of its files.
    stem: String,
    pub sheet: Sheet,
    /// Nets that this sheet does not show.
    left_out: u64,
    /// Does it have may-change bands?
    bands: bool,
}

/// The typical run, then the failing cases that were run, worst first. Each is one sheet here; its files have all.
pub(super) fn drawn<'a>(scenario: &'a Scenario, review: &'a Review) -> Vec<Drawn<'a>> {
    let typical = pictures::typical(scenario, review);
    let typical = typical.map(|(run, picture)| (None, run, pictures::TYPICAL.to_string(), picture));
    let shown = pictures::shown(scenario, review);
    let shown = shown.into_iter().map(|it| (Some(it.finding), it.run, it.stem, it.picture));
    let draw = |(n, (finding, run, stem, picture)): (usize, (Option<usize>, &'a RunReport, String, Picture<'a>))| {
        let id = format!("run-{n}");
        let picture = Picture { nets: one_sheet(&picture), id: id.clone(), ..picture };
        let mut sheets = waves::sheets(&picture).into_iter();
        let sheet = sheets.next()?;
        let further = sheets.map(|sheet| sheet.nets.len()).sum::<usize>();
        let left_out = (sheet.left_out.len() + further) as u64;
        let bands = finding.is_none() && review.sweep.envelope.is_some();
        Some(Drawn { id, finding, run, stem, sheet, left_out, bands })
    };
    typical.into_iter().chain(shown).enumerate().filter_map(draw).collect()
}

/// All nets if they fit one sheet, else those that tell most.
fn one_sheet(picture: &Picture<'_>) -> Nets {
    match &picture.nets {
        Nets::All => Nets::Telling,
        nets => nets.clone(),
    }
}

/// Which run it is, for people.
pub(super) fn called(run: &Drawn<'_>) -> String {
    words::delays(&run.run.which)
}

/// The picture with what its files are called, and a button that only a script shows.
pub(super) fn draw(scenario: &Scenario, run: &Drawn<'_>) -> Markup {
    let left_out = run.left_out;
    let table = bundle::table_fits(scenario, run.run).is_ok();
    let caption = html! {
        "Waveforms, " (words::clean(&called(run))) ". Files: " code { (run.stem) ".svg" }
        @if table { ", " code { (run.stem) ".csv" } }
        "."
        @if run.bands { " Times of the may-change bands: " code { "envelope.csv" } "." }
        @if left_out > 0 {
            " Left out here: " (words::many(left_out, "net")) "; "
            @if table { code { (run.stem) ".csv" } " has all." } @else { code { "stillgate run --nets A,B,…" } " draws them." }
        }
        @if let Some(cut) = run.run.trace.cut {
            " It ends at " (cut.after.from_start().rounded()) ": " (words::many(cut.transitions, "later transition"))
            " left out."
        }
        " "
        button type="button" hidden data-step-through=(run.id) { "Step through this run" }
    };
    figure(&run.id, &run.sheet.svg, &caption)
}

//! The files of a command: made in memory first, then written together.

use std::collections::BTreeSet;
use std::fs;
use std::io;
use std::path::{Path, PathBuf};

use crate::circuit::NetId;
use crate::findings::{Asked, Kind};
use crate::output::flow_map::{self, Map};
use crate::output::instance::write_instance;
pub use crate::output::pictures::MOST_PICTURES;
use crate::output::search::case_files;
use crate::output::text::Page;
use crate::output::waves::{self, Nets, Picture};
use crate::output::{
    causes, charts, convergence, dump, flow_tables, json, margin_charts, margins, page, pictures, sensitivity, shares,
    tables, words,
};
use crate::proof::Proof;
use crate::review::{Review, RunReport, StatesReport};
use crate::scenario::Scenario;
use crate::search::SearchReport;
use crate::sweep::SweepReport;

/// Most cells of a waveform table.
const MOST_CELLS: u64 = 20_000_000;
/// Longest part of a file name.
const PART: usize = 40;

/// A file that is ready to be written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct File {
    /// Its name, without any folder.
    pub name: String,
    /// What is in it.
    pub bytes: Vec<u8>,
}

/// Files, and what a user should know of them.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Bundle {
    /// In a fixed order; names are unique, also where upper and lower case are one.
    pub files: Vec<File>,
    /// Whole sentences: what has no picture, which nets are left out.
    pub notes: Vec<String>,
}

/// Why files could not be written.
#[derive(Debug, thiserror::Error)]
pub enum WriteError {
    /// The folder cannot be made.
    #[error("cannot make the folder {}: {source}; choose another with --out", folder.display())]
    Folder {
        /// The folder.
        folder: PathBuf,
        /// What the system says.
        source: io::Error,
    },
    /// A file cannot be written.
    #[error("cannot write {}: {source}", file.display())]
    File {
        /// The file.
        file: PathBuf,
        /// What the system says.
        source: io::Error,
    },
}

impl Bundle {
    /// Adds a file of text.
    pub fn add(&mut self, name: &str, text: String) {
        self.files.push(File { name: name.to_string(), bytes: text.into_bytes() });
    }

    /// The witnesses of refuted claims, as `refuted-<n>.toml`.
    pub fn add_witnesses(&mut self, scenario: &Scenario, proof: &Proof) {
        for (claim, file) in proof.claims.iter().zip(proof.witness_files()) {
            if let (Some(witness), Some(file)) = (&claim.witness, file) {
                self.add(&file, write_instance(witness, scenario));
            }
        }
    }

    /// Sheets as `stem.svg`, `stem-2.svg`, …, the table of all nets as `stem.csv`, and their dump as `stem.vcd`, if the run
    /// was kept whole.
    fn add_waves(&mut self, stem: &str, picture: &Picture<'_>, run: &RunReport) {
        self.add_sheets(stem, picture);
        if let Some(cut) = run.trace.cut {
            let until = cut.after.from_start().rounded();
            let later = words::many(cut.transitions, "later transition");
            self.notes.push(format!("{stem}.svg ends at {until}: {later} left out."));
        }
        if let Err(cells) = table_fits(picture.scenario, run) {
            self.notes.push(format!("{stem}.csv is left out: it would have {} cells.", words::count(cells)));
        } else {
            self.add(&format!("{stem}.csv"), waves::csv(picture.scenario, &run.trace));
        }
        if run.trace.cut.is_none() {
            self.add(&format!("{stem}.vcd"), dump::vcd(picture.scenario, &run.which.words(), &run.trace));
        }
    }
}

impl Bundle {
    /// Says so where a run was too long for its dump.
    fn note_dump(&mut self, stem: &str, run: &RunReport) {
        if run.trace.cut.is_some() {
            let case = run.which.key();
            self.notes.push(format!(
                "{stem}.vcd is left out: the run is too long to be kept; run --delays {case} writes it."
            ));
        }
    }

    /// Sheets as `stem.svg`, `stem-2.svg`, …
    fn add_sheets(&mut self, stem: &str, picture: &Picture<'_>) {
        let sheets = waves::sheets(picture);
        if let Some(left_out) = sheets.first().map(|sheet| sheet.left_out.len()).filter(|n| *n > 0) {
            let nets = words::many(left_out as u64, "net");
            self.notes.push(format!("{stem}.svg leaves out {nets}; the table of the run has all of them."));
        }
        for (i, sheet) in sheets.into_iter().enumerate() {
            let number = if i == 0 { String::new() } else { format!("-{}", i + 1) };
            self.add(&format!("{stem}{number}.svg"), sheet.svg);
        }
    }
}

/// Is a table with a column for every net small enough? Else the number of its cells; then [`waves::Changes`] is the table
/// to write.
pub fn table_fits(scenario: &Scenario, run: &RunReport) -> Result<(), u64> {
    let later = run.trace.cut.map_or(0, |cut| cut.transitions);
    let transitions = run.trace.changes.len() as u64 + later;
    let cells = (scenario.circuit.net_count() as u64).saturating_mul(transitions);
    if cells > MOST_CELLS || run.trace.cut.is_some() { Err(cells) } else { Ok(()) }
}

/// The files of one run: `waves-<case>.svg`, one a sheet, `waves-<case>.csv` and `waves-<case>.vcd`; with another run also
/// `waves-<case>-against-<other>.svg`, in which that lies behind. `nets` chooses lanes and their order in place of the
/// scenario.
pub fn of_run(
    scenario: &Scenario,
    asked: &Asked,
    run: &RunReport,
    against: Option<&RunReport>,
    nets: Option<Vec<NetId>>,
) -> Bundle {
    let stem = format!("waves-{}", safe(&run.which.words()));
    let mut bundle = Bundle::default();
    // the paths of the worst finding, if it breaks a rule
    let worst = run.facts.first().filter(|fact| fact.breaks_rule);
    let race = worst.and_then(|fact| run.race(scenario, asked, fact));
    let mut picture = Picture { race, ..Picture::of_run(scenario, asked, run, &stem) };
    picture.nets = nets.map_or(picture.nets, Nets::These);
    bundle.add_waves(&stem, &picture, run);
    if let Some(other) = against {
        let beside = format!("{stem}-against-{}", safe(&other.which.words()));
        let picture = Picture { id: beside.clone(), ..picture }.against(other);
        bundle.add_sheets(&beside, &picture);
    }
    bundle
}

/// The files of a sweep: settling times, shares, outcomes, findings, rules, conditions if there are any.
pub fn of_sweep(scenario: &Scenario, asked: &Asked, report: &SweepReport) -> Bundle {
    of_searched(scenario, asked, report, None, None)
}

/// The files of a sweep, with what a directed search met and what is proved.
fn of_searched(
    scenario: &Scenario,
    asked: &Asked,
    report: &SweepReport,
    search: Option<&SearchReport>,
    proof: Option<&Proof>,
) -> Bundle {
    let mut bundle = Bundle::default();
    bundle.add("settling.svg", charts::settling_with(scenario, report, proof));
    bundle.add("settling.csv", tables::settling(scenario, report));
    bundle.add("settling-figures.csv", tables::settling_figures(scenario, report, proof));
    bundle.add("shares.svg", shares::svg(scenario, asked, report));
    bundle.add("shares.csv", shares::csv(scenario, asked, report));
    bundle.add("outcomes.csv", tables::outcomes(scenario, report));
    bundle.add("findings.csv", tables::findings(scenario, asked, report));
    bundle.add("rules.csv", tables::rules(scenario, report, search));
    bundle.add("margins.svg", margin_charts::svg(scenario, report));
    bundle.add("margins.csv", margins::csv(scenario, report));
    if let Some(envelope) = &report.envelope {
        bundle.add("envelope.csv", tables::envelope(scenario, report, envelope));
        let (some, all) = (envelope.moments(), scenario.stimulus.moments.len());
        if some < all {
            bundle.notes.push(format!("envelope.csv has the first {some} of {all} steps and clock edges."));
        }
    }
    if report.stopped.is_some() {
        bundle.add("convergence.svg", convergence::svg(scenario, asked, report));
        bundle.add("convergence.csv", convergence::csv(scenario, asked, report));
    }
    if let Some(table) = tables::conditions(scenario, asked, report) {
        bundle.add("conditions.csv", table);
    }
    bundle
}

/// The files of a review: `result.json`, `report.html` (see [`page`]), `waves-typical`, a `waves-<kind>-<net or pattern>-<step>` for each of the worst
/// findings whose failing case was run (at most [`MOST_PICTURES`]), `causes.csv`, `sensitivity.svg` and `.csv`, and a `case-<kind>-<net or
/// pattern>-<step>.toml` for each finding that was looked into, `worst-<n>.toml` for the cases that only the directed
/// search met, `refuted-<n>.toml` for those that refute a claim of the proof, the files of the sweep and of the flow table.
/// Commands that replay a case are those of `told`.
pub fn of_review(scenario: &Scenario, review: &Review, told: &Page<'_>) -> Bundle {
    let mut bundle = Bundle::default();
    bundle.add("result.json", json::review(scenario, review));
    bundle.add("report.html", page::report(scenario, review, told));
    if let Some((run, picture)) = pictures::typical(scenario, review) {
        bundle.add_waves(pictures::TYPICAL, &picture, run);
        bundle.note_dump(pictures::TYPICAL, run);
    }
    let shown = pictures::shown(scenario, review);
    for it in &shown {
        bundle.add_waves(&it.stem, &it.picture, it.run);
        bundle.note_dump(&it.stem, it.run);
    }
    let all = review.sweep.findings.len();
    if shown.len() < all {
        let (some, all) = (words::count(shown.len() as u64), words::many(all as u64, "finding"));
        bundle
            .notes
            .push(format!("{some} of {all} have a picture; run --delays sample:N draws any other (see findings.csv)."));
    }
    if let Some(table) = causes::table(scenario, review) {
        bundle.add("causes.csv", table);
    }
    if let (Some(picture), Some(table)) = (sensitivity::svg(scenario, review), sensitivity::csv(scenario, review)) {
        bundle.add("sensitivity.svg", picture);
        bundle.add("sensitivity.csv", table);
    }
    for (file, why) in causes::case_files(scenario, review).into_iter().zip(&review.why) {
        if let (Some(file), Some(needs)) = (file, why.as_ref().and_then(|why| why.needs.as_ref())) {
            bundle.add(&file, write_instance(&needs.case, scenario));
        }
    }
    let broken = review.sweep.findings.iter().zip(&review.why).filter(|(finding, _)| finding.breaks_rule);
    let left = broken.filter(|(_, why)| why.as_ref().is_none_or(|why| why.pull.is_none())).count() as u64;
    if left > 0 {
        let left = words::many(left, "finding");
        bundle.notes.push(format!("{left} that break a rule were not looked into for what they need; the worst were."));
    }
    for file in case_files(review) {
        bundle.add(&file.name, write_instance(file.case, scenario));
    }
    if let Some(proof) = &review.proof {
        bundle.add_witnesses(scenario, proof);
    }
    let sweep = of_searched(scenario, &review.asked, &review.sweep, review.search.as_ref(), review.proof.as_ref());
    bundle.files.extend(sweep.files);
    bundle.notes.extend(sweep.notes);
    bundle.files.extend(of_states(scenario, &review.states).files);
    bundle
}

/// The files of a flow table: `states.svg`, `states.csv`, `transitions.csv`.
pub fn of_states(scenario: &Scenario, report: &StatesReport) -> Bundle {
    let mut bundle = Bundle::default();
    let map = Map { scenario, flow: &report.flow, state_variables: &report.state_variables, id: "states" };
    bundle.add("states.svg", flow_map::svg(&map));
    bundle.add("states.csv", flow_tables::states(scenario, report));
    bundle.add("transitions.csv", flow_tables::transitions(scenario, report));
    bundle
}

/// Letters, digits and single dashes; everything else becomes a dash.
pub fn safe(text: &str) -> String {
    let mut name = String::new();
    for letter in text.chars() {
        if letter.is_ascii_alphanumeric() {
            name.push(letter);
        } else if !name.is_empty() && !name.ends_with('-') {
            name.push('-');
        }
        if name.len() >= PART {
            break;
        }
    }
    name.trim_end_matches('-').to_string()
}

/// The stem, or the stem with a number: no two are equal, also where upper and lower case are one.
pub(super) fn unique(stem: String, taken: &mut BTreeSet<String>) -> String {
    let mut name = stem.clone();
    let mut number = 2;
    while !taken.insert(name.to_lowercase()) {
        name = format!("{stem}-{number}");
        number += 1;
    }
    name
}

/// Makes the folder, so that a bad place is known before the work is done.
///
/// Errors: it cannot be made, or is no folder.
pub fn prepare(folder: &Path) -> Result<(), WriteError> {
    fs::create_dir_all(folder).map_err(|source| WriteError::Folder { folder: folder.to_path_buf(), source })
}

/// Takes pictures, cases of findings and worst cases out of a folder that an earlier review left there and this one does not
/// have: they would be
/// taken for findings of this one.
pub fn clear_pictures(folder: &Path, bundle: &Bundle) {
    let ours: BTreeSet<&str> = bundle.files.iter().map(|file| file.name.as_str()).collect();
    let of_a_finding = |name: &str| {
        let kind = name.strip_prefix("waves-").or_else(|| name.strip_prefix("case-"));
        kind.is_some_and(|rest| Kind::ALL.iter().any(|kind| rest.starts_with(&format!("{}-", safe(kind.word())))))
    };
    let of_a_search = |name: &str| {
        let number = name.strip_prefix("worst-").and_then(|rest| rest.strip_suffix(".toml"));
        number.is_some_and(|number| number.parse::<u32>().is_ok())
    };
    for entry in fs::read_dir(folder).into_iter().flatten().flatten() {
        let name = entry.file_name();
        let old = |name: &&str| (of_a_finding(name) || of_a_search(name)) && !ours.contains(name);
        if let Some(name) = name.to_str().filter(old) {
            // what cannot be removed is only an old file
            let _ = fs::remove_file(folder.join(name));
        }
    }
}

/// Writes files into a folder, which is made if need be. Each file is complete under its name or not there: it is written
/// beside its place and then moved. Files of the same names are replaced, others left alone.
///
/// Errors: the folder or a file cannot be written; then no file has been moved into place, unless moving itself failed.
pub fn write(folder: &Path, files: &[File]) -> Result<(), WriteError> {
    prepare(folder)?;
    let beside = |file: &File| beside(&folder.join(&file.name));
    let done = files.iter().try_for_each(|file| {
        fs::write(beside(file), &file.bytes)
            .map_err(|source| WriteError::File { file: folder.join(&file.name), source })
    });
    let done = done.and_then(|()| {
        files.iter().try_for_each(|file| {
            let place = folder.join(&file.name);
            fs::rename(beside(file), &place).map_err(|source| WriteError::File { file: place, source })
        })
    });
    if done.is_err() {
        for file in files {
            // what is left over of an attempt that failed; the first error is the one to report
            let _ = fs::remove_file(beside(file));
        }
    }
    done
}

/// Puts a file in place such that, whatever happens, either the old one or the whole new one is there: it is written beside
/// its place, brought to the disk, and then moved.
///
/// Errors: the file cannot be written.
pub fn replace(path: &Path, bytes: &[u8]) -> Result<(), WriteError> {
    let error = |source| WriteError::File { file: path.to_path_buf(), source };
    let beside = beside(path);
    let written = fs::File::create(&beside).and_then(|mut file| {
        io::Write::write_all(&mut file, bytes)?;
        file.sync_all()
    });
    let moved = written.and_then(|()| fs::rename(&beside, path));
    if let Err(source) = moved {
        // what is left over of an attempt that failed; the first error is the one to report
        let _ = fs::remove_file(&beside);
        return Err(error(source));
    }
    // that the move itself is on the disk is more than every system can do for a folder
    let folder = path.parent().filter(|it| !it.as_os_str().is_empty()).unwrap_or(Path::new("."));
    if let Ok(folder) = fs::File::open(folder) {
        let _ = folder.sync_all();
    }
    Ok(())
}

/// Takes a file away that [`replace`] put in place, and what a killed program may have left beside it.
pub fn remove(path: &Path) {
    let _ = fs::remove_file(path);
    let _ = fs::remove_file(beside(path));
}

/// Where a file is written before it is moved into place.
pub(super) fn beside(path: &Path) -> PathBuf {
    let name = path.file_name().unwrap_or_default().to_string_lossy();
    path.with_file_name(format!(".{name}.part"))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn file(name: &str, text: &str) -> File {
        File { name: name.into(), bytes: text.into() }
    }

    #[test]
    fn names_are_safe_and_unique() {
        assert_eq!(safe("both let go, then <call> \"x\""), "both-let-go-then-call-x");
        assert_eq!(safe("../../etc"), "etc");
        assert_eq!(safe("ärger[3]"), "rger-3");
        assert_eq!(safe(&"x_".repeat(100)).len(), 39);
        let mut taken = BTreeSet::new();
        let names: Vec<String> = ["a", "A", "a"].map(|stem| unique(stem.into(), &mut taken)).into();
        assert_eq!(names, ["a", "A-2", "a-3"]);
    }

    #[test]
    fn files_are_written_and_replaced() {
        let folder = tempfile::tempdir().unwrap();
        let inner = folder.path().join("new/deep");
        write(&inner, &[file("a.txt", "old"), file("b.txt", "b")]).unwrap();
        write(&inner, &[file("a.txt", "new")]).unwrap();
        assert_eq!(fs::read_to_string(inner.join("a.txt")).unwrap(), "new");
        assert_eq!(fs::read_dir(&inner).unwrap().count(), 2, "nothing is left over");
    }

    #[test]
    fn an_error_names_the_path_and_leaves_nothing() {
        let folder = tempfile::tempdir().unwrap();
        fs::write(folder.path().join("taken"), "a file").unwrap();
        let error = write(&folder.path().join("taken"), &[file("a.txt", "")]).unwrap_err();
        assert!(error.to_string().contains("taken") && error.to_string().contains("--out"), "{error}");

        let inner = folder.path().join("inner");
        let error = write(&inner, &[file("a.txt", "a"), file("no/such/folder.txt", "b")]).unwrap_err();
        assert!(error.to_string().contains("folder.txt"), "{error}");
        assert_eq!(fs::read_dir(&inner).unwrap().count(), 0, "neither the first file nor a part of it");
    }
}

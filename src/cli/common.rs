//! What all commands share: reading the scenario, progress, interrupts, errors and their exit codes.

use std::io::{IsTerminal, Write};
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::Duration;

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use super::args::{Draws, Folder, Input};
use crate::circuit::NetId;
use crate::control::Control;
use crate::delay::Marginal;
use crate::engine::{Observer, Program};
use crate::limit::LimitError;
use crate::logic::Value;
use crate::output::bundle::{self, Bundle};
use crate::output::text::{Page, Style};
use crate::reader::{self, Diagnostics, Loaded, ReadError};
use crate::review::{Call, ReviewError};
use crate::scenario::Scenario;
use crate::statics::NoRest;
use crate::sweep::{Overrides, Refusal};
use crate::time::Time;

/// The built-in demonstration.
const DEMONSTRATION: &str = include_str!("../../scenarios/interlock.toml");
/// What diagnostics and folders call it.
const DEMONSTRATION_NAME: &str = "interlock.toml";

/// Why a command failed.
#[derive(Debug, thiserror::Error)]
pub enum Failure {
    /// Faults of an input file.
    #[error("{0}")]
    Faults(Box<Diagnostics>),
    /// The input or the command line is bad.
    #[error("{0}")]
    Bad(String),
    /// Parts cannot be put together.
    #[error("{}", refused(.0))]
    Parts(Vec<Refusal>),
    /// The program contradicts itself.
    #[error("the program contradicts itself: {0}; please report this, with the scenario file")]
    Contradiction(String),
    /// The user interrupted it before anything could be said.
    #[error("interrupted; nothing was written")]
    Interrupted,
}

impl Failure {
    /// The exit code.
    pub fn code(&self) -> u8 {
        match self {
            Failure::Faults(_) | Failure::Bad(_) | Failure::Parts(_) => 2,
            Failure::Contradiction(_) => 3,
            Failure::Interrupted => INTERRUPTED,
        }
    }
}

/// Most refusals that are told one by one.
const REFUSALS: usize = 20;

fn refused(refusals: &[Refusal]) -> String {
    if let [only] = refusals {
        return only.to_string();
    }
    let mut text = "these parts cannot be put together; nothing was written".to_string();
    for refusal in refusals.iter().take(REFUSALS) {
        text += &format!("\n  {refusal}");
    }
    if refusals.len() > REFUSALS {
        text += &format!("\n  ... and {} more", refusals.len() - REFUSALS);
    }
    text
}

/// Exit code of an interrupted command.
pub const INTERRUPTED: u8 = 130;

impl From<ReadError> for Failure {
    fn from(error: ReadError) -> Failure {
        match error {
            ReadError::Faults(faults) => Failure::Faults(Box::new(faults)),
            other => Failure::Bad(other.to_string()),
        }
    }
}

impl From<ReviewError> for Failure {
    fn from(error: ReviewError) -> Failure {
        match error {
            ReviewError::Contradiction(what) => Failure::Contradiction(what),
            ReviewError::Cancelled => Failure::Interrupted,
        }
    }
}

impl From<LimitError> for Failure {
    fn from(error: LimitError) -> Failure {
        match error {
            LimitError::Bad(what) => Failure::Bad(what),
            LimitError::Contradiction(what) => Failure::Contradiction(what),
            LimitError::Cancelled => Failure::Interrupted,
        }
    }
}

impl From<bundle::WriteError> for Failure {
    fn from(error: bundle::WriteError) -> Failure {
        Failure::Bad(error.to_string())
    }
}

impl From<Refusal> for Failure {
    fn from(refusal: Refusal) -> Failure {
        Failure::Parts(vec![refusal])
    }
}

/// Tells what went wrong, on standard error.
pub fn complain(failure: &Failure) {
    let text = match failure {
        Failure::Faults(faults) => faults.render(colour(&std::io::stderr())),
        other => format!("error: {other}\n"),
    };
    say_aside(&text);
}

/// Is colour wanted on this stream?
fn colour(stream: &impl IsTerminal) -> bool {
    stream.is_terminal() && std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty())
}

/// How texts on standard output look: colour and width of the terminal, and how the user calls the scenario and its draws.
pub fn page<'a>(called: Option<&'a str>, options: &'a str) -> Page<'a> {
    let terminal = std::io::stdout();
    Page {
        style: if colour(&terminal) { Style::Ansi } else { Style::Plain },
        width: terminal_width(),
        scenario: called,
        options,
        folder: "",
    }
}

/// Columns where there is no terminal, so that files are the same on every machine; and the most on one.
const WIDTH: usize = 100;

/// Columns of a text on standard output.
pub fn terminal_width() -> usize {
    let terminal = console::Term::stdout().size_checked().map(|(_, columns)| usize::from(columns));
    width(std::io::stdout().is_terminal(), std::env::var("COLUMNS").ok().as_deref(), terminal)
}

/// What the user says of the width of a terminal counts more than what the terminal says.
fn width(is_terminal: bool, said: Option<&str>, terminal: Option<usize>) -> usize {
    if !is_terminal {
        return WIDTH;
    }
    let said = said.and_then(|columns| columns.trim().parse::<usize>().ok()).filter(|columns| *columns > 0);
    said.or(terminal).unwrap_or(WIDTH).min(WIDTH)
}

/// Writes to standard error. Nobody may be listening; that is no reason to fail.
pub fn say_aside(text: &str) {
    let _ = std::io::stderr().lock().write_all(text.as_bytes());
}

/// Writes a result to standard output. A reader that has had enough is no failure.
pub fn say(text: &str) -> Result<(), Failure> {
    let mut out = std::io::stdout().lock();
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Err(error) if error.kind() != std::io::ErrorKind::BrokenPipe => {
            Err(Failure::Bad(format!("standard output cannot be written: {error}")))
        }
        _ => Ok(()),
    }
}

/// Reads the scenario that the user named, or the built-in demonstration.
pub fn load(input: &Input) -> Result<Loaded, Failure> {
    match &input.scenario {
        Some(path) => Ok(reader::load(path)?),
        None => reader::read(DEMONSTRATION, DEMONSTRATION_NAME).map_err(|faults| Failure::Faults(Box::new(faults))),
    }
}

/// The draws that the command line asks for.
pub fn overrides(draws: &Draws) -> Overrides {
    let draw = draws.draw.as_deref().and_then(Marginal::from_name);
    Overrides { samples: draws.samples, seed: draws.seed, draw }
}

/// The scenario with the draws that the command line asks for.
pub fn with_draws(loaded: Loaded, draws: &Draws) -> Scenario {
    let mut scenario = loaded.scenario;
    overrides(draws).apply(&mut scenario.plan);
    scenario
}

/// The options of the draws as they were given, to be given again: ` --samples 50 --seed 7`.
pub fn options(draws: &Overrides) -> String {
    let mut text = String::new();
    if let Some(samples) = draws.samples {
        text += &format!(" --samples {samples}");
    }
    if let Some(seed) = draws.seed {
        text += &format!(" --seed {seed}");
    }
    if let Some(draw) = draws.draw {
        text += &format!(" --draw {}", draw.name());
    }
    text
}

/// The program of a scenario whose start the reader has checked.
pub fn program(scenario: &Scenario, control: &Control) -> Result<Program, Failure> {
    Program::new(scenario, control).map_err(|error: NoRest| Failure::Bad(error.to_string()))
}

/// How the user calls this scenario on the command line.
pub fn called(input: &Input) -> Option<String> {
    input.scenario.as_ref().map(|path| path.display().to_string())
}

/// The folder for the files of a command, made: a bad place is told before the work is done.
pub fn folder(input: &Input, folder: &Folder) -> Result<PathBuf, Failure> {
    folder_of(input.scenario.as_deref(), folder)
}

/// As [`folder`], for a scenario of this name; `None` for the demonstration.
pub fn folder_of(scenario: Option<&Path>, folder: &Folder) -> Result<PathBuf, Failure> {
    let folder = folder.out.clone().unwrap_or_else(|| {
        let name = scenario.unwrap_or(Path::new(DEMONSTRATION_NAME));
        let stem = name.file_stem().map_or_else(|| "scenario".into(), |stem| stem.to_os_string());
        Path::new("stillgate-out").join(stem)
    });
    bundle::prepare(&folder)?;
    Ok(folder)
}

/// Writes files into a folder and says so on standard error.
pub fn write(bundle: &Bundle, into: &Path, quiet: bool) -> Result<(), Failure> {
    bundle::write(into, &bundle.files)?;
    if !quiet {
        for note in &bundle.notes {
            say_aside(&format!("{note}\n"));
        }
        say_aside(&format!("{} files in {}\n", bundle.files.len(), into.display()));
    }
    Ok(())
}

/// The exit code of a finished command with a verdict.
pub fn code(call: Call, strict: bool) -> ExitCode {
    let bad = matches!(call, Call::Broken | Call::Undecided);
    ExitCode::from(u8::from(strict && bad))
}

/// A control that Ctrl-C cancels and that shows progress on a terminal.
pub fn control(quiet: bool, what: &'static str) -> (Control, Option<ProgressBar>) {
    let mut control = Control::default();
    let cancel = control.cancel.clone();
    // a second handler cannot be set; then Ctrl-C simply ends the process
    let _ = ctrlc::set_handler(move || {
        if cancel.swap(true, Ordering::Relaxed) {
            std::process::exit(i32::from(INTERRUPTED));
        }
    });
    if quiet {
        return (control, None);
    }
    // how much there is to do is known once the work reports it; until then, and after, the time that it takes is shown
    let bar = ProgressBar::with_draw_target(None, ProgressDrawTarget::stderr_with_hz(10));
    bar.set_style(style(WAITING));
    bar.set_message(what);
    bar.enable_steady_tick(Duration::from_millis(250));
    let shown = bar.clone();
    let counting = AtomicBool::new(false);
    control.progress = Some(Arc::new(move |done, total| {
        let counts = done < total;
        if counting.swap(counts, Ordering::Relaxed) != counts {
            shown.set_style(style(if counts { COUNTING } else { WAITING }));
        }
        shown.set_length(total);
        shown.set_position(shown.position().max(done));
    }));
    (control, Some(bar))
}

/// Progress while nobody knows how much is left.
const WAITING: &str = "{msg} {elapsed}";
/// Progress with rate and time left.
const COUNTING: &str = "{msg} {wide_bar} {human_pos}/{human_len} {per_sec} {eta} left";
/// Progress of a run: how many transitions it takes is known at its end.
const METERED: &str = "{msg} {elapsed} {human_pos} transitions {per_sec}";

fn style(template: &str) -> ProgressStyle {
    ProgressStyle::with_template(template).unwrap_or_else(|_| ProgressStyle::default_bar())
}

/// Counts the transitions of a run and shows them from time to time.
pub struct Meter<'a> {
    bar: Option<&'a ProgressBar>,
    count: u64,
}

impl<'a> Meter<'a> {
    /// Shows them on this bar, if there is one.
    pub fn new(bar: Option<&'a ProgressBar>) -> Meter<'a> {
        Meter { bar, count: 0 }
    }
}

impl Observer for Meter<'_> {
    type Tag = ();

    fn change(&mut self, _at: Time, _net: NetId, _new: Value, _cause: ()) {
        const STEP: u64 = 1 << 16;
        self.count += 1;
        if let (Some(bar), 0) = (self.bar, self.count % STEP) {
            if self.count == STEP {
                bar.set_style(style(METERED));
            }
            bar.set_position(self.count);
        }
    }
}

/// Takes the progress bar away.
pub fn finish(bar: Option<ProgressBar>) {
    if let Some(bar) = bar {
        bar.finish_and_clear();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_width_is_that_of_the_terminal_and_of_a_file_always_the_same() {
        assert_eq!(width(false, Some("60"), None), 100);
        assert_eq!(width(true, None, Some(72)), 72);
        assert_eq!(width(true, Some("60"), Some(72)), 60);
        assert_eq!(width(true, Some("wide"), Some(72)), 72);
        assert_eq!(width(true, Some("0"), None), 100);
        assert_eq!(width(true, None, Some(250)), 100);
    }

    #[test]
    fn progress_shows_rate_and_time_left_in_every_style() {
        for template in [WAITING, COUNTING, METERED] {
            assert!(ProgressStyle::with_template(template).is_ok(), "{template}");
        }
        assert!(COUNTING.contains("{per_sec}") && COUNTING.contains("{eta}") && METERED.contains("{per_sec}"));
    }

    #[test]
    fn a_contradiction_of_views_ends_with_code_3_and_asks_for_a_report() {
        let failure = Failure::from(ReviewError::Contradiction("settles where the proof says nothing can".into()));
        assert_eq!(failure.code(), 3);
        let text = failure.to_string();
        assert!(text.contains("the proof says") && text.contains("please report"), "{text}");
    }
}

//! What all commands share: reading the scenario, progress, interrupts, errors and their exit codes.

use std::io::{IsTerminal, Write};
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::Arc;
use std::sync::atomic::Ordering;

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use super::args::{Draws, Folder, Input};
use crate::control::Control;
use crate::delay::Marginal;
use crate::engine::Program;
use crate::limit::LimitError;
use crate::output::bundle::{self, Bundle};
use crate::output::text::{Page, Style};
use crate::reader::{self, Diagnostics, Loaded, ReadError};
use crate::review::{Call, ReviewError};
use crate::scenario::Scenario;
use crate::statics::NoRest;
use crate::sweep::{Overrides, Refusal};

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
        width: console::Term::stdout().size_checked().map_or(WIDTH, |(_, columns)| usize::from(columns)),
        scenario: called,
        options,
        folder: "",
    }
}

/// Columns where there is no terminal.
const WIDTH: usize = 100;

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
    let bar = ProgressBar::with_draw_target(Some(0), ProgressDrawTarget::stderr_with_hz(10));
    if let Ok(style) = ProgressStyle::with_template("{msg} {wide_bar} {human_pos}/{human_len} {per_sec} eta {eta}") {
        bar.set_style(style);
    }
    bar.set_message(what);
    let shown = bar.clone();
    control.progress = Some(Arc::new(move |done, total| {
        shown.set_length(total);
        shown.set_position(shown.position().max(done));
    }));
    (control, Some(bar))
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
    fn a_contradiction_of_views_ends_with_code_3_and_asks_for_a_report() {
        let failure = Failure::from(ReviewError::Contradiction("settles where the proof says nothing can".into()));
        assert_eq!(failure.code(), 3);
        let text = failure.to_string();
        assert!(text.contains("the proof says") && text.contains("please report"), "{text}");
    }
}

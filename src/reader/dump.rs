//! A value change dump (IEEE 1364-2001, clause 18, four-state) as the stimulus of a scenario.
//!
//! It is read as it comes: memory grows with its declarations and with the changes of inputs, not with the dump. Times are
//! whole ticks of its timescale and stay exact.

mod body;
mod header;
mod signals;
mod tokens;

use std::fs::File;
use std::io::{self, BufRead, BufReader, Read, Seek, SeekFrom};
use std::path::{Path, PathBuf};

use body::{Changes, Part};
use header::Kind;
use signals::{Found, Signals};
use tokens::{Place, Tokens, Trouble};

use super::diagnostics::Diagnostics;
use crate::scenario::Comparisons;

/// Where a dump is.
#[derive(Clone, Debug)]
pub(super) enum Source {
    /// In a file.
    File(PathBuf),
    /// In the scenario itself, whose name is this.
    Text(String, String),
}

/// An input that a dump may drive.
#[derive(Clone, Debug)]
pub(super) struct Wanted {
    /// Its name.
    pub name: String,
    /// What the dump calls it, where the scenario says so.
    pub called: Option<String>,
    /// Its value where the dump says none.
    pub assumed: bool,
}

/// What is asked of a dump.
#[derive(Clone, Debug)]
pub(super) struct Request {
    pub inputs: Vec<Wanted>,
    /// Its time 0 and its last time, in fs of the dump.
    pub from: Option<u64>,
    pub to: Option<u64>,
    /// Does an input that becomes unknown hold its value?
    pub hold: bool,
}

/// What a dump says of the inputs.
#[derive(Clone, Debug)]
pub(super) struct Recording {
    /// For each input: is it in the dump?
    pub found: Vec<bool>,
    pub changes: Changes,
    /// Variables that hold real numbers.
    pub reals: usize,
}

/// Why a dump gave nothing.
#[derive(Debug)]
pub(super) enum DumpError {
    /// It cannot be read: what the system says.
    Unreadable(String),
    /// It is malformed.
    Malformed(Box<Diagnostics>),
    /// Inputs that cannot be told apart or are no bits; by number, what is wrong, what would be right. None: no input is in
    /// the dump.
    Unmatched(Vec<(Option<usize>, String, String)>),
}

/// Reads a dump.
pub(super) fn read(source: &Source, request: &Request) -> Result<Recording, DumpError> {
    match source {
        Source::File(path) => {
            if path.is_dir() {
                return Err(DumpError::Unreadable("it is a folder".into()));
            }
            let file = File::open(path).map_err(|error| DumpError::Unreadable(said(&error)))?;
            let name = path.display().to_string();
            recorded(BufReader::with_capacity(1 << 16, file), request)
                .map_err(|error| error.placed(&name, || File::open(path).map(BufReader::new)))
        }
        Source::Text(text, name) => {
            let name = format!("{name} (dump_text)");
            recorded(text.as_bytes(), request)
                .map_err(|error| error.placed(&name, || Ok(io::Cursor::new(text.as_bytes()))))
        }
    }
}

fn said(error: &io::Error) -> String {
    match error.kind() {
        io::ErrorKind::NotFound => "there is no such file".to_string(),
        io::ErrorKind::PermissionDenied => "it may not be read".to_string(),
        _ => error.to_string(),
    }
}

/// An error that has no text of its place yet.
enum Early {
    Trouble(Trouble),
    Unmatched(Vec<(Option<usize>, String, String)>),
}

impl From<Trouble> for Early {
    fn from(trouble: Trouble) -> Early {
        Early::Trouble(trouble)
    }
}

impl Early {
    fn placed<R: BufRead + Seek>(self, name: &str, again: impl Fn() -> io::Result<R>) -> DumpError {
        match self {
            Early::Unmatched(all) => DumpError::Unmatched(all),
            Early::Trouble(Trouble::Device(error)) => DumpError::Unreadable(said(&error)),
            Early::Trouble(Trouble::Fault(fault)) => {
                let (before, word, after) = again().and_then(|from| around(from, fault.place)).unwrap_or_default();
                let span = before.len()..before.len() + word.len();
                let text = before + &word + &after;
                let found = Diagnostics::in_line(name, fault.place.line, &text, span, fault.message, fault.help);
                DumpError::Malformed(Box::new(found))
            }
        }
    }
}

/// Most bytes of a line before the word that is shown, and behind it.
const MOST: (u64, u64) = (1 << 24, 200);

/// The line of a word, in three pieces.
fn around<R: BufRead + Seek>(mut from: R, place: Place) -> io::Result<(String, String, String)> {
    let line_at = place.line_at.max(place.at.saturating_sub(MOST.0));
    from.seek(SeekFrom::Start(line_at))?;
    let mut bytes = Vec::new();
    let length = place.at - line_at + place.len as u64;
    from.take(length + MOST.1).read_to_end(&mut bytes)?;
    let text = |bytes: &[u8]| String::from_utf8_lossy(bytes).into_owned();
    let at = (place.at - line_at).min(bytes.len() as u64) as usize;
    let end = (at + place.len).min(bytes.len());
    let rest = bytes[end..].split(|byte| matches!(byte, b'\n' | b'\r')).next().unwrap_or_default();
    // a place behind the last word is shown where that ended
    let before = &bytes[..at];
    Ok((text(before), text(&bytes[at..end]), text(rest)))
}

fn recorded<R: BufRead>(from: R, request: &Request) -> Result<Recording, Early> {
    let mut tokens = Tokens::new(from);
    let mut header = header::header(&mut tokens)?;
    let reals = header.variables.iter().filter(|variable| variable.kind == Kind::Real).count();
    let signals = {
        let signals = Signals::new(&header);
        let mut comparisons = Comparisons::default();
        let mut unmatched = Vec::new();
        let mut all = Vec::with_capacity(request.inputs.len());
        for (i, input) in request.inputs.iter().enumerate() {
            let name = input.called.as_ref().unwrap_or(&input.name);
            let found = signals.find(name);
            let is_missing = matches!(found, Found::None | Found::NoBits(_)) && input.called.is_none();
            all.push(match found {
                Found::One(signal) => Some(signal),
                _ if is_missing => None,
                other => {
                    let names: Vec<&str> = signals.names().collect();
                    let likely = comparisons.nearest(name, names.into_iter());
                    let (message, help) = unmatched_words(&input.name, name, other, likely);
                    unmatched.push((Some(i), message, help));
                    None
                }
            });
        }
        if unmatched.is_empty() && all.iter().all(Option::is_none) {
            let names: Vec<&str> = signals.names().take(6).collect();
            let help = match names.len() {
                0 => "it declares no variable at all; record the inputs".to_string(),
                _ => format!(
                    "it has {}; say which are the inputs, as in `map = {{ a = \"{}\" }}`",
                    names.join(", "),
                    names[0]
                ),
            };
            unmatched.push((None, "the dump names none of the inputs".to_string(), help));
        }
        if !unmatched.is_empty() {
            return Err(Early::Unmatched(unmatched));
        }
        all
    };
    let part = Part { from: request.from, to: request.to, hold: request.hold };
    let assumed: Vec<bool> = request.inputs.iter().map(|input| input.assumed).collect();
    let names: Vec<String> = request.inputs.iter().map(|input| input.name.clone()).collect();
    let changes = body::changes(&mut tokens, &mut header, &signals, &assumed, &names, &part)?;
    let found = signals.iter().map(Option::is_some).collect();
    Ok(Recording { found, changes, reals })
}

fn unmatched_words(input: &str, name: &str, found: Found, likely: Option<&str>) -> (String, String) {
    match found {
        Found::Several(names) => {
            let some = names.iter().take(6).cloned().collect::<Vec<_>>().join(", ");
            let message = format!("`{name}` is several signals of the dump: {some}");
            (message, format!("say which one, as in `map = {{ \"{input}\" = \"{}\" }}`", names[0]))
        }
        Found::Wide(written, size) => {
            let base = written.rsplit_once('[').map_or(written.as_str(), |(base, _)| base);
            let message = format!("`{written}` has {size} bits in the dump; an input is one");
            (message, format!("say which bit, as in `map = {{ \"{input}\" = \"{base}[0]\" }}`"))
        }
        Found::NoBits(written) => {
            (format!("`{written}` holds no bits in the dump"), "map a variable of one bit".to_string())
        }
        Found::None | Found::One(_) => {
            let help = likely
                .map_or_else(|| "name a variable with its scopes".to_string(), |it| format!("did you mean `{it}`?"));
            (format!("the dump has no variable `{name}`"), help)
        }
    }
}

/// The path of a dump: beside the scenario unless it says otherwise.
pub(super) fn beside(scenario: &Path, dump: &str) -> PathBuf {
    scenario.parent().unwrap_or(Path::new("")).join(dump)
}

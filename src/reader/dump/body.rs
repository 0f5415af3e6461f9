//! The changes of a dump: those of inputs become steps.

use std::io::BufRead;

use rustc_hash::FxHashMap;

use super::header::{Header, Kind, skip};
use super::signals::Signal;
use super::tokens::{Place, Tokens, Trouble, shown};
use crate::scenario::{MAX_MOMENTS, nearest};
use crate::time::Span;

/// What is asked of a dump's changes.
#[derive(Clone, Debug)]
pub(super) struct Part {
    /// Its time 0, in fs of the dump; none: that of the dump.
    pub from: Option<u64>,
    /// The last time that counts, in fs of the dump.
    pub to: Option<u64>,
    /// Does an input that becomes unknown hold its value?
    pub hold: bool,
}

/// What a dump says of the inputs.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub(in crate::reader) struct Changes {
    /// The value of each input before the first step; none where the dump does not say.
    pub initial: Vec<Option<bool>>,
    /// Instants in fs from time 0, each with the inputs that change and their new values.
    pub steps: Vec<(u64, Vec<(usize, bool)>)>,
    /// Changes that another of the same input at the same instant took back or overtook.
    pub overtaken: u64,
    /// Values of inputs that were x or z while they held what they had.
    pub held: u64,
    /// Stretches in which the recording was off.
    pub gaps: u64,
    /// The same changes in one way of writing, behind a copy of the declarations.
    pub copy: String,
}

/// A value in a dump.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Level {
    Known(bool),
    Unknown(u8),
}

fn level(letter: u8) -> Option<Level> {
    match letter {
        b'0' => Some(Level::Known(false)),
        b'1' => Some(Level::Known(true)),
        b'x' | b'X' | b'z' | b'Z' => Some(Level::Unknown(letter.to_ascii_lowercase())),
        _ => None,
    }
}

const SECTIONS: [&str; 4] = ["$dumpvars", "$dumpall", "$dumpoff", "$dumpon"];

/// Variables by their letters, with what of them is used.
struct Slot {
    kind: Kind,
    size: u32,
    /// Inputs and the digits that they are.
    uses: Vec<(usize, u32)>,
}

/// One input while the dump is read.
#[derive(Clone, Copy, Debug, Default)]
struct Line {
    /// Its value before time 0.
    before: Option<bool>,
    initial: Option<bool>,
    /// Its value now, once it has changed or its first value is known.
    now: Option<bool>,
    /// Its value at this instant, if it was given one.
    next: Option<bool>,
}

struct Recorder<'a> {
    part: &'a Part,
    /// What each input is taken to be where the dump does not say.
    assumed: &'a [bool],
    names: &'a [String],
    lines: Vec<Line>,
    touched: Vec<usize>,
    /// The instant of the dump in ticks and in fs, and where it stands.
    time: Option<(u64, u64)>,
    /// Time 0 of the run, in fs of the dump, from when steps are made.
    zero: u64,
    /// The instant at which first values are initial values.
    first: Option<u64>,
    off: bool,
    done: Changes,
    /// The instant that the copy has written.
    copied: Option<u64>,
}

/// Reads the changes; `signals` are those of the inputs, `assumed` their values where the dump says none.
pub(super) fn changes<R: BufRead>(
    tokens: &mut Tokens<R>,
    header: &mut Header,
    signals: &[Option<Signal>],
    assumed: &[bool],
    names: &[String],
    part: &Part,
) -> Result<Changes, Trouble> {
    let empty = |(id, (kind, size)): (Box<[u8]>, (Kind, u32))| (id, Slot { kind, size, uses: Vec::new() });
    let mut slots: FxHashMap<Box<[u8]>, Slot> = std::mem::take(&mut header.ids).into_iter().map(empty).collect();
    for (input, signal) in signals.iter().enumerate() {
        if let Some(slot) = signal.as_ref().and_then(|signal| slots.get_mut(&signal.id)) {
            slot.uses.push((input, signal.as_ref().map_or(0, |it| it.bit)));
        }
    }
    let mut recorder = Recorder {
        part,
        assumed,
        names,
        lines: vec![Line::default(); signals.len()],
        touched: Vec::new(),
        time: None,
        zero: part.from.unwrap_or(0),
        first: None,
        off: false,
        done: Changes { copy: std::mem::take(&mut header.copy), ..Changes::default() },
        copied: None,
    };
    let mut open: Option<(String, Place)> = None;
    while tokens.next()? {
        let place = tokens.place;
        match tokens.word[0] {
            b'#' => {
                if let Some((section, at)) = &open {
                    let message = format!("`{section}` is not closed before the next time");
                    return Err(Trouble::at(*at, message, "end the section with `$end`"));
                }
                let ticks = time(&tokens.word[1..], place)?;
                recorder.moment(ticks, header.tick, place)?;
            }
            b'$' => section(tokens, &mut open, &mut recorder)?,
            letter if level(letter).is_some() => {
                let id = &tokens.word[1..];
                if id.is_empty() {
                    let message =
                        format!("the value `{}` has no letters behind it that say whose it is", letter as char);
                    return Err(Trouble::at(place, message, "write both as one word, as in `1!`"));
                }
                let slot = slot(&slots, id, place)?;
                // a moment has no lasting value
                if slot.kind == Kind::Other {
                    continue;
                }
                if slot.kind != Kind::Bits || slot.size != 1 {
                    let message = format!("`{}` is no single bit", shown(id));
                    return Err(Trouble::at(
                        place,
                        message,
                        "write a vector as in `b0101 !`, a real number as in `r0.5 !`",
                    ));
                }
                recorder.value(&[letter], id, slot, place)?;
            }
            kind @ (b'b' | b'B' | b'r' | b'R' | b's') => {
                let value = std::mem::take(&mut tokens.word);
                if !tokens.next()? || tokens.word[0] == b'$' {
                    let message =
                        format!("the value `{}` has no letters behind it that say whose it is", shown(&value));
                    return Err(Trouble::at(place, message, "write them as a word of their own, as in `b0101 !`"));
                }
                let slot = slot(&slots, &tokens.word, tokens.place)?;
                let digits = &value[1..];
                match kind.to_ascii_lowercase() {
                    b'b' => {
                        vector(digits, slot, &tokens.word, place)?;
                        recorder.value(digits, &tokens.word, slot, place)?;
                    }
                    b'r' => {
                        let number = std::str::from_utf8(digits).ok().and_then(|it| it.parse::<f64>().ok());
                        if slot.kind != Kind::Real || number.is_none() {
                            let message = if number.is_none() {
                                format!("`{}` is no real number", shown(digits))
                            } else {
                                format!("`{}` is no real variable", shown(&tokens.word))
                            };
                            return Err(Trouble::at(
                                place,
                                message,
                                "write `0` or `1` and the letters of a bit as one word, as in `1!`",
                            ));
                        }
                    }
                    _ if slot.kind == Kind::Other => {}
                    _ => {
                        let message = format!("`{}` holds no text", shown(&tokens.word));
                        return Err(Trouble::at(
                            place,
                            message,
                            "write `0` or `1` and the letters of a bit as one word, as in `1!`",
                        ));
                    }
                }
            }
            b'p' => {
                let message = "this dump has values of ports with strengths, which are not read";
                return Err(Trouble::at(place, message, "record the nets as four-state variables, as in `1!`"));
            }
            _ => {
                let message = format!("`{}` is no change of a value", tokens.shown());
                return Err(Trouble::at(
                    place,
                    message,
                    "a change is a value and the letters of its variable, as in `1!` or `b01 !`",
                ));
            }
        }
    }
    if let Some((section, at)) = open {
        return Err(Trouble::at(at, format!("`{section}` has no `$end`"), "end the section with `$end`"));
    }
    if recorder.time.is_none() {
        let help = "a dump has times such as `#0`, each followed by what changes then";
        return Err(Trouble::at(tokens.place, "the dump ends before its first time", help));
    }
    recorder.end(tokens.place)?;
    Ok(recorder.done)
}

/// Opens or closes a section.
fn section<R: BufRead>(
    tokens: &mut Tokens<R>,
    open: &mut Option<(String, Place)>,
    recorder: &mut Recorder<'_>,
) -> Result<(), Trouble> {
    let (word, place) = (tokens.shown(), tokens.place);
    match word.as_str() {
        "$comment" => skip(tokens, &word, place),
        "$end" => {
            if open.take().is_none() {
                return Err(Trouble::at(place, "there is no section to end here", "remove this `$end`"));
            }
            recorder.close();
            Ok(())
        }
        name if SECTIONS.contains(&name) => {
            if let Some((other, _)) = open {
                let message = format!("`{word}` stands within `{other}`");
                return Err(Trouble::at(place, message, format!("end `{other}` with `$end` first")));
            }
            recorder.open(&word);
            *open = Some((word, place));
            Ok(())
        }
        "$var" | "$scope" | "$upscope" | "$timescale" | "$enddefinitions" => {
            let message = format!("`{word}` stands behind the end of the declarations");
            Err(Trouble::at(place, message, "put all declarations before `$enddefinitions`"))
        }
        _ => {
            let help = match nearest(&word, SECTIONS.into_iter().chain(["$comment", "$end"])) {
                Some(likely) => format!("did you mean `{likely}`?"),
                None => "remove it, up to its `$end`".to_string(),
            };
            Err(Trouble::at(place, format!("there is no section `{word}` among the changes"), help))
        }
    }
}

fn slot<'s>(slots: &'s FxHashMap<Box<[u8]>, Slot>, id: &[u8], place: Place) -> Result<&'s Slot, Trouble> {
    slots.get(id).ok_or_else(|| {
        let message = format!("no variable has the letters `{}`", shown(id));
        Trouble::at(place, message, "declare it by `$var` before `$enddefinitions`")
    })
}

/// Are these the digits of this variable?
fn vector(digits: &[u8], slot: &Slot, id: &[u8], place: Place) -> Result<(), Trouble> {
    if slot.kind != Kind::Bits {
        let message = format!("`{}` has no bits", shown(id));
        return Err(Trouble::at(place, message, "write a real number as in `r0.5 !`"));
    }
    if let Some(odd) = digits.iter().find(|digit| level(**digit).is_none()) {
        let message = format!("`{}` is no digit of a vector", shown(&[*odd]));
        return Err(Trouble::at(place, message, "its digits are 0, 1, x and z"));
    }
    if digits.is_empty() || digits.len() > slot.size as usize {
        let message = format!("a value of {} digits for the {} bits of `{}`", digits.len(), slot.size, shown(id));
        return Err(Trouble::at(place, message, "write at least one digit and at most one for each bit"));
    }
    Ok(())
}

fn time(digits: &[u8], place: Place) -> Result<u64, Trouble> {
    let text = std::str::from_utf8(digits).ok().filter(|it| !it.is_empty() && it.bytes().all(|b| b.is_ascii_digit()));
    let Some(text) = text else {
        let message = format!("`#{}` is no time", shown(digits));
        return Err(Trouble::at(place, message, "write a whole number of ticks from 0 on, as in `#120`"));
    };
    text.parse().map_err(|_| too_late(place))
}

fn too_late(place: Place) -> Trouble {
    let message = "this time is 2^62 fs (about 77 minutes) or more after the beginning";
    Trouble::at(place, message, "cut out a stretch by `from` and `to`")
}

impl Recorder<'_> {
    /// A new instant.
    fn moment(&mut self, ticks: u64, tick: u64, place: Place) -> Result<(), Trouble> {
        if let Some((before, _)) = self.time {
            if ticks < before {
                let message = format!("time goes back from #{before} to #{ticks}");
                return Err(Trouble::at(place, message, "times never become smaller; sort the changes by time"));
            }
            if ticks == before {
                return Ok(());
            }
        }
        self.flush(place)?;
        let fs = u128::from(ticks) * u128::from(tick);
        let to = self.part.to.map_or(u128::MAX, u128::from);
        // beyond the part that counts any time will do, as long as it is beyond
        let fs = if fs > to {
            self.part.to.unwrap_or(u64::MAX).saturating_add(1)
        } else {
            u64::try_from(fs).map_err(|_| too_late(place))?
        };
        if self.inside(fs) && fs.saturating_sub(self.zero) >= Span::LIMIT.fs() {
            return Err(too_late(place));
        }
        self.time = Some((ticks, fs));
        if self.first.is_none() && fs >= self.zero {
            self.begin(fs);
            // first values are told from changes by this instant
            self.copy_time();
        }
        Ok(())
    }

    fn inside(&self, fs: u64) -> bool {
        self.part.to.is_none_or(|to| fs <= to)
    }

    /// Time 0 is here or was passed: what came before is what the inputs begin with.
    fn begin(&mut self, fs: u64) {
        self.first = Some(fs);
        for line in &mut self.lines {
            line.initial = line.before;
            line.now = line.before;
        }
    }

    fn open(&mut self, section: &str) {
        if section == "$dumpoff" {
            self.off = true;
            if self.counts() {
                self.done.gaps += 1;
            }
        }
        self.copy_time();
        self.done.copy += section;
        self.done.copy.push('\n');
    }

    fn close(&mut self) {
        self.off = false;
        self.done.copy += "$end\n";
    }

    /// Is what comes now within the part that counts, and not before it?
    fn counts(&self) -> bool {
        self.time.is_some_and(|(_, fs)| fs >= self.zero && self.inside(fs))
    }

    fn copy_time(&mut self) {
        if let Some((ticks, _)) = self.time
            && self.copied != Some(ticks)
        {
            self.copied = Some(ticks);
            self.done.copy += &format!("#{ticks}\n");
        }
    }

    /// A value of a variable.
    fn value(&mut self, digits: &[u8], id: &[u8], slot: &Slot, place: Place) -> Result<(), Trouble> {
        let after = self.time.is_some_and(|(_, fs)| !self.inside(fs));
        if slot.uses.is_empty() || after {
            return Ok(());
        }
        self.copy_time();
        let gap = if slot.size > 1 { " " } else { "" };
        let kind = if slot.size > 1 { "b" } else { "" };
        let text = (String::from_utf8_lossy(digits), String::from_utf8_lossy(id));
        self.done.copy += &format!("{kind}{}{gap}{}\n", text.0, text.1);
        for (input, bit) in &slot.uses {
            // a short value is filled up from the left: by 0, or by the x or z that it begins with
            let missing = slot.size as usize - digits.len();
            let letter = match (*bit as usize).checked_sub(missing) {
                Some(at) => digits[at],
                None if digits[0] == b'1' => b'0',
                None => digits[0],
            };
            let level = level(letter).unwrap_or(Level::Unknown(letter));
            self.input(*input, level, place)?;
        }
        Ok(())
    }

    fn input(&mut self, input: usize, level: Level, place: Place) -> Result<(), Trouble> {
        let began = self.time.is_some_and(|(_, fs)| fs >= self.zero);
        let line = &mut self.lines[input];
        if !began {
            match level {
                Level::Known(value) => line.before = Some(value),
                // nobody knows what it had since
                Level::Unknown(_) if !self.off => line.before = None,
                Level::Unknown(_) => {}
            }
            return Ok(());
        }
        match level {
            Level::Known(value) => {
                if line.now.is_none() && self.first == self.time.map(|(_, fs)| fs) {
                    line.initial = Some(value);
                    line.now = Some(value);
                    return Ok(());
                }
                match line.next {
                    Some(other) if other != value => self.done.overtaken += 1,
                    Some(_) => {}
                    None => self.touched.push(input),
                }
                self.lines[input].next = Some(value);
            }
            // not recorded: it holds what it has
            Level::Unknown(_) if self.off => {}
            // it had no value yet
            Level::Unknown(_) if line.now.is_none() && line.next.is_none() => {}
            Level::Unknown(_) if self.part.hold => self.done.held += 1,
            Level::Unknown(letter) => {
                let message =
                    format!("the input `{}` becomes {} here: an input is 0 or 1", self.names[input], letter as char);
                let help = "cut out a stretch by `from` and `to`, map another variable, or write `unknown = \"hold\"`";
                return Err(Trouble::at(place, message, help));
            }
        }
        Ok(())
    }

    /// The instant is over: its changes are a step.
    fn flush(&mut self, place: Place) -> Result<(), Trouble> {
        let Some((_, fs)) = self.time else { return Ok(()) };
        let mut set = Vec::new();
        self.touched.sort_unstable();
        for input in self.touched.drain(..) {
            let line = &mut self.lines[input];
            let now = line.now.unwrap_or(self.assumed[input]);
            if let Some(value) = line.next.take() {
                line.now = Some(value);
                if value != now {
                    set.push((input, value));
                }
            }
        }
        if !set.is_empty() {
            if self.done.steps.len() == MAX_MOMENTS {
                let message = format!("up to here the inputs change at {MAX_MOMENTS} moments, which is the limit");
                return Err(Trouble::at(place, message, "cut out a stretch by `from` and `to`"));
            }
            self.done.steps.push((fs - self.zero, set));
        }
        Ok(())
    }

    fn end(&mut self, place: Place) -> Result<(), Trouble> {
        self.flush(place)?;
        if self.first.is_none() {
            // all of it came before time 0
            self.begin(self.zero);
        }
        if self.copied.is_none() {
            self.copy_time();
        }
        self.done.initial = self.lines.iter().map(|line| line.initial).collect();
        Ok(())
    }
}

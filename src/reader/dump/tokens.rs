//! A dump as words between white space, each with its place, read as it comes.

use std::io::{self, BufRead};

/// Longest word, in bytes; a vector of more bits is none that a block has.
const LONGEST: usize = 1 << 20;

/// Where a word stands.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) struct Place {
    /// Its line, from 1.
    pub line: usize,
    /// The first byte of that line, from the beginning of the dump.
    pub line_at: u64,
    /// Its own first byte.
    pub at: u64,
    /// Its length in bytes.
    pub len: usize,
}

/// What is wrong with a dump, and where.
#[derive(Clone, Debug)]
pub(super) struct Fault {
    pub place: Place,
    pub message: String,
    pub help: String,
}

/// Why a dump was not read to its end.
#[derive(Debug)]
pub(super) enum Trouble {
    /// The device failed.
    Device(io::Error),
    /// The dump is malformed.
    Fault(Fault),
}

impl From<io::Error> for Trouble {
    fn from(error: io::Error) -> Trouble {
        Trouble::Device(error)
    }
}

impl Trouble {
    pub fn at(place: Place, message: impl Into<String>, help: impl Into<String>) -> Trouble {
        Trouble::Fault(Fault { place, message: message.into(), help: help.into() })
    }
}

/// The words of a dump. White space is any of blank, tab, line feed, carriage return, form feed, vertical tab.
pub(super) struct Tokens<R> {
    from: R,
    /// Bytes taken so far.
    at: u64,
    line: usize,
    line_at: u64,
    /// The word that was read last, and its place.
    pub word: Vec<u8>,
    pub place: Place,
}

fn is_white(byte: u8) -> bool {
    byte.is_ascii_whitespace() || byte == 0x0b
}

impl<R: BufRead> Tokens<R> {
    pub fn new(from: R) -> Tokens<R> {
        Tokens { from, at: 0, line: 1, line_at: 0, word: Vec::new(), place: Place::default() }
    }

    /// Reads the next word into `word`; false at the end of the dump.
    pub fn next(&mut self) -> Result<bool, Trouble> {
        self.word.clear();
        self.skip_white()?;
        self.place = Place { line: self.line, line_at: self.line_at, at: self.at, len: 0 };
        loop {
            let buffer = filled(&mut self.from)?;
            let end = buffer.iter().position(|byte| is_white(*byte));
            let taken = end.unwrap_or(buffer.len());
            self.word.extend_from_slice(&buffer[..taken]);
            let over = end.is_some() || buffer.is_empty();
            self.from.consume(taken);
            self.at += taken as u64;
            self.place.len = self.word.len();
            if self.word.len() > LONGEST {
                let message = format!("this word is longer than {LONGEST} bytes");
                return Err(Trouble::at(self.place, message, "check that the file is a value change dump"));
            }
            if over {
                return Ok(!self.word.is_empty());
            }
        }
    }

    /// The word as text, for messages: no more of it than a line shows.
    pub fn shown(&self) -> String {
        shown(&self.word)
    }

    fn skip_white(&mut self) -> Result<(), Trouble> {
        loop {
            let buffer = filled(&mut self.from)?;
            let end = buffer.iter().position(|byte| !is_white(*byte));
            let taken = end.unwrap_or(buffer.len());
            for (i, byte) in buffer[..taken].iter().enumerate() {
                if *byte == b'\n' {
                    self.line += 1;
                    self.line_at = self.at + i as u64 + 1;
                }
            }
            let over = end.is_some() || buffer.is_empty();
            self.from.consume(taken);
            self.at += taken as u64;
            if over {
                return Ok(());
            }
        }
    }
}

/// What the device has next; interrupted calls are made again.
fn filled<R: BufRead>(from: &mut R) -> Result<&[u8], Trouble> {
    loop {
        match from.fill_buf() {
            Ok(_) => break,
            Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
            Err(error) => return Err(error.into()),
        }
    }
    // the buffer is filled: this does not read again
    Ok(from.fill_buf()?)
}

/// Bytes as text for messages, shortened.
pub(super) fn shown(word: &[u8]) -> String {
    const MOST: usize = 40;
    let text = String::from_utf8_lossy(&word[..word.len().min(4 * MOST)]);
    let mut short: String = text.chars().take(MOST).map(|c| if c.is_control() { '\u{fffd}' } else { c }).collect();
    if word.len() > short.len() {
        short.push('…');
    }
    short
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_have_their_lines_whatever_stands_between_them() {
        let text = b"\n a\tbb \r\n\x0c\x0bccc\n\n#1";
        for buffer in 1..8 {
            let mut tokens = Tokens::new(io::BufReader::with_capacity(buffer, &text[..]));
            let mut all = Vec::new();
            while tokens.next().unwrap() {
                let Place { line, line_at, at, len } = tokens.place;
                assert_eq!(&text[at as usize..at as usize + len], tokens.word);
                all.push((tokens.shown(), line, at - line_at));
            }
            let expected = [("a", 2, 1), ("bb", 2, 3), ("ccc", 3, 2), ("#1", 5, 0)];
            assert_eq!(all, expected.map(|(word, line, column)| (word.to_string(), line, column)));
        }
    }
}

//! Text into a TOML tree, or the faults of its syntax in plain words.

use std::ops::Range;

use toml::Spanned;
use toml::de::DeTable;

use super::file::MAX_BYTES;
use super::walk::Walk;

/// The tree of a text. `None`: the text is no TOML, which was reported. A key that comes twice is reported, too, but
/// leaves a tree that can be checked further.
pub(super) fn parse<'i>(walk: &mut Walk, text: &'i str) -> Option<Spanned<DeTable<'i>>> {
    if text.len() > MAX_BYTES {
        walk.fault(0..0, "this text is larger than 16 MiB", "build larger circuits in code, with the library");
        return None;
    }
    let content = text.strip_prefix('\u{feff}').unwrap_or(text);
    if content.trim().is_empty() {
        walk.fault(0..0, "this text is empty", "write at least one gate under `[gates]`");
        return None;
    }
    let (table, errors) = DeTable::parse_recoverable(text);
    let errors = errors.iter().map(|error| (error.span().unwrap_or(0..0), error.message()));
    let (repeats, mut errors): (Vec<_>, Vec<_>) = errors.partition(|(_, message)| *message == "duplicate key");
    if errors.is_empty() {
        let places: Vec<_> = repeats.into_iter().map(|(span, _)| span).collect();
        repeated(walk, text, &places);
        return Some(table);
    }
    errors.sort_by_key(|(span, _)| span.start);
    report(walk, text, &errors);
    None
}

/// Keys that come twice; in `[gates]` and `[inputs]` they are nets.
fn repeated(walk: &mut Walk, text: &str, repeats: &[Range<usize>]) {
    let mut headers: Vec<(usize, &str)> = Vec::new();
    if !repeats.is_empty() {
        let mut start = 0;
        for line in text.split_inclusive('\n') {
            if line.trim_start().starts_with('[') {
                headers.push((start, line.trim()));
            }
            start += line.len();
        }
    }
    for span in repeats {
        let key = text.get(span.clone()).unwrap_or_default();
        let before = text.get(..span.start).unwrap_or_default();
        let begins_line = before.trim_end_matches([' ', '\t']).ends_with('\n');
        let header = headers[..headers.partition_point(|(start, _)| *start < span.start)].last();
        if begins_line && matches!(header, Some((_, "[gates]" | "[inputs]"))) {
            let name = key.trim_matches(['"', '\'']);
            walk.fault(span.clone(), format!("net `{name}` is driven twice"), "give one of them another name");
        } else {
            walk.fault(span.clone(), format!("`{key}` comes twice in one table"), "keep one of them");
        }
    }
}

/// Reports errors of syntax, sorted by place. What follows from an earlier one is left out: all errors up to the end of
/// what a missing bracket leaves open, and all but the first of a line.
fn report(walk: &mut Walk, text: &str, errors: &[(Range<usize>, &str)]) {
    let lost_until = errors.iter().rev().find(|(_, message)| message.starts_with("unclosed")).map(|(span, _)| span.end);
    let mut rest = errors;
    if let (Some(end), Some(((first, message), others))) = (lost_until, errors.split_first()) {
        match open_bracket(text, first.start) {
            Some((at, open)) if !message.contains("string") => {
                let close = if open == '[' { ']' } else { '}' };
                walk.fault(at..at + 1, format!("this `{open}` is never closed"), format!("add its `{close}`"));
            }
            _ => explain(walk, text, first, message),
        }
        rest = &others[others.partition_point(|(span, _)| span.start <= end)..];
    }
    let mut line_end = 0;
    for (span, message) in rest {
        if span.start >= line_end {
            explain(walk, text, span, message);
            line_end =
                text.get(span.start..).and_then(|rest| rest.find('\n')).map_or(text.len(), |at| span.start + at + 1);
        }
    }
}

/// The innermost bracket that is open at this place, in a text that is sound up to there.
fn open_bracket(text: &str, until: usize) -> Option<(usize, char)> {
    let mut open = Vec::new();
    let mut at = 0;
    while at < until {
        let rest = text.get(at..)?;
        let letter = rest.chars().next()?;
        at += match letter {
            '#' => rest.find('\n').unwrap_or(rest.len()),
            '"' | '\'' => string_length(rest, letter),
            '[' | '{' => {
                open.push((at, letter));
                1
            }
            ']' | '}' => {
                open.pop();
                1
            }
            other => other.len_utf8(),
        };
    }
    open.pop()
}

/// The bytes of the string that a text begins with, quotes included.
fn string_length(text: &str, quote: char) -> usize {
    let triple = [quote, quote, quote].iter().collect::<String>();
    let close = if text.starts_with(&triple) { triple } else { quote.to_string() };
    let mut at = close.len();
    while let Some(rest) = text.get(at..).filter(|rest| !rest.is_empty()) {
        if rest.starts_with(&close) {
            return at + close.len();
        }
        let letter = rest.chars().next().map_or(1, char::len_utf8);
        let escaped = quote == '"' && rest.starts_with('\\');
        at += if escaped { 1 + rest[1..].chars().next().map_or(0, char::len_utf8) } else { letter };
    }
    text.len()
}

/// Reports one error of syntax in plain words.
fn explain(walk: &mut Walk, text: &str, span: &Range<usize>, message: &str) {
    let before = text.get(..span.start).unwrap_or_default();
    let line = before.rfind('\n').map_or(0, |at| at + 1);
    let bracket_in_key = text[line..].lines().next().is_some_and(|line| {
        let key = line.split('=').next().unwrap_or_default().trim();
        line.contains('=') && key.contains('[') && !key.starts_with(['[', '"', '\''])
    });
    let word = text.get(span.clone()).unwrap_or_default();
    let unquoted = message.starts_with("string values must be quoted");
    let (message, help) = if bracket_in_key {
        ("this is no key".to_string(), "a name with a bracket is quoted, as in `\"a[0]\" = …`")
    } else if unquoted && word.trim().is_empty() {
        ("a value is missing here".to_string(), "write `key = value`, one a line")
    } else if unquoted {
        (format!("`{word}` is no value"), "text stands in double quotes, as in `title = \"Canal lock\"`")
    } else if message.contains("recurs") {
        ("this is nested too deeply".to_string(), "no scenario needs more than a few levels")
    } else if message.contains("comma") {
        (message.to_string(), "put one comma between two entries")
    } else if message.contains("opening") || message.contains("unclosed") {
        (message.to_string(), "give every bracket and brace its partner")
    } else if message.contains("string") || message.contains("quot") || message.contains("escape") {
        (message.to_string(), "write text in double quotes on one line, as in \"tick rise\"")
    } else if message.contains("key") || message.contains('=') || message.contains("value") {
        (message.to_string(), "write `key = value`, one a line, and text in double quotes")
    } else {
        (message.to_string(), "a scenario is TOML: tables such as `[gates]`, and lines such as `key = value`")
    };
    walk.fault(span.clone(), message, help);
}

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
    let mut sound = true;
    for error in errors {
        let span = error.span().unwrap_or(0..0);
        let message = error.message();
        if message == "duplicate key" {
            repeated(walk, text, span);
        } else {
            sound = false;
            let help = help(text, &span, message);
            walk.fault(span, message, help);
        }
    }
    sound.then_some(table)
}

/// A key that comes twice; in `[gates]` and `[inputs]` it is a net.
fn repeated(walk: &mut Walk, text: &str, span: Range<usize>) {
    let key = text.get(span.clone()).unwrap_or_default();
    let before = text.get(..span.start).unwrap_or_default();
    let line_start = before.rfind('\n').map_or(0, |at| at + 1);
    let header = before.lines().rev().map(str::trim).find(|line| line.starts_with('['));
    let is_net = before[line_start..].trim().is_empty() && matches!(header, Some("[gates]" | "[inputs]"));
    if is_net {
        let name = key.trim_matches(['"', '\'']);
        walk.fault(span, format!("net `{name}` is driven twice"), "give one of them another name");
    } else {
        walk.fault(span, format!("`{key}` comes twice in one table"), "keep one of them");
    }
}

/// What to do about an error of syntax.
fn help(text: &str, span: &Range<usize>, message: &str) -> String {
    let before = text.get(..span.start).unwrap_or_default();
    let line = before.rfind('\n').map_or(0, |at| at + 1);
    let bracket_in_key = text[line..].lines().next().is_some_and(|line| {
        let key = line.split('=').next().unwrap_or_default().trim();
        key.contains('[') && !key.starts_with(['[', '"', '\''])
    });
    let help = if bracket_in_key {
        "a name with a bracket is quoted, as in `\"a[0]\" = …`"
    } else if message.contains("recursion") {
        "nest less deeply: no scenario needs more than a few levels"
    } else if message.contains("comma") {
        "put one comma between two entries"
    } else if message.contains("unclosed") || message.contains("opening") {
        "give every bracket, brace and quote its partner"
    } else if message.contains("string") || message.contains("quot") || message.contains("escape") {
        "write text in double quotes on one line, as in \"tick rise\""
    } else if message.contains("key") || message.contains('=') || message.contains("value") {
        "write `key = value`, one a line, and text in double quotes"
    } else {
        "see the format of scenarios; it is TOML"
    };
    help.to_string()
}

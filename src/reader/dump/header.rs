//! The declarations of a dump: its timescale and its variables in their scopes.

use std::io::BufRead;

use rustc_hash::FxHashMap;

use super::tokens::{Place, Tokens, Trouble, shown};
use crate::scenario::nearest;
use crate::time::Unit;

/// Keywords of the declarations.
const SECTIONS: [&str; 7] = ["$comment", "$date", "$enddefinitions", "$scope", "$timescale", "$upscope", "$version"];
/// Deepest scopes.
const DEEPEST: usize = 1000;

/// What a variable holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Kind {
    /// Bits.
    Bits,
    /// A real number.
    Real,
    /// A moment or a text.
    Other,
}

/// A variable as it was declared.
#[derive(Clone, Debug)]
pub(super) struct Variable {
    /// Scopes and name, with dots; without the range of a vector.
    pub name: String,
    /// `[5]` or `[3:0]` behind the name.
    pub range: Option<(i64, i64)>,
    pub kind: Kind,
    /// Bits.
    pub size: u32,
    /// The letters that stand for it.
    pub id: Box<[u8]>,
}

impl Variable {
    /// Its name with its range, as the dump has it.
    pub fn written(&self) -> String {
        match self.range {
            None => self.name.clone(),
            Some((a, b)) if a == b && self.size == 1 => format!("{}[{a}]", self.name),
            Some((a, b)) => format!("{}[{a}:{b}]", self.name),
        }
    }

    /// The place of the bit of this number among the digits, from the left.
    pub fn bit(&self, number: i64) -> Option<u32> {
        let (left, right) = self.range.unwrap_or((i64::from(self.size) - 1, 0));
        let within = (left.min(right)..=left.max(right)).contains(&number);
        within.then(|| number.abs_diff(left) as u32)
    }
}

/// All declarations.
#[derive(Debug, Default)]
pub(super) struct Header {
    /// Femtoseconds of one tick.
    pub tick: u64,
    pub variables: Vec<Variable>,
    /// What each of the letters stands for.
    pub ids: FxHashMap<Box<[u8]>, (Kind, u32)>,
    /// The sections that matter, in one way of writing.
    pub copy: String,
}

/// Reads the declarations, up to and with `$enddefinitions $end`.
pub(super) fn header<R: BufRead>(tokens: &mut Tokens<R>) -> Result<Header, Trouble> {
    let mut header = Header::default();
    let mut scopes: Vec<String> = Vec::new();
    let mut opened: Vec<Place> = Vec::new();
    let mut scaled = None;
    loop {
        if !tokens.next()? {
            let message = "the dump ends within its declarations";
            return Err(Trouble::at(
                tokens.place,
                message,
                "end them with `$enddefinitions $end`, before the first time",
            ));
        }
        let (keyword, place) = (tokens.shown(), tokens.place);
        if keyword == "$var" {
            let words = section(tokens, &keyword, place)?;
            let one = variable(&words, place, &scopes)?;
            let alias = header.ids.entry(one.id.clone()).or_insert((one.kind, one.size));
            if *alias != (one.kind, one.size) {
                let message = format!("`{}` stands for a variable of another size or type already", shown(&one.id));
                let help = "let variables share letters only where they are one signal";
                return Err(Trouble::at(words[2].1, message, help));
            }
            header.variables.push(one);
            copy(&mut header.copy, &keyword, &words);
            continue;
        }
        match keyword.as_str() {
            "$comment" | "$date" | "$version" => skip(tokens, &keyword, place)?,
            "$timescale" => {
                let words = section(tokens, &keyword, place)?;
                if scaled.replace(place).is_some() {
                    let message = "the dump has a second `$timescale`";
                    return Err(Trouble::at(place, message, "keep the one that its times are counted in"));
                }
                header.tick = timescale(&words, place)?;
                copy(&mut header.copy, &keyword, &words);
            }
            "$scope" => {
                let words = section(tokens, &keyword, place)?;
                let [_, (name, at)] = &words[..] else {
                    let message = "a scope has a type and a name";
                    return Err(Trouble::at(place, message, "write it as in `$scope module lock $end`"));
                };
                if scopes.len() == DEEPEST {
                    return Err(Trouble::at(*at, "so many scopes stand within each other", "close some by `$upscope`"));
                }
                scopes.push(plain(name));
                opened.push(place);
                copy(&mut header.copy, &keyword, &words);
            }
            "$upscope" => {
                let words = section(tokens, &keyword, place)?;
                if let Some((_, at)) = words.first() {
                    return Err(Trouble::at(*at, "`$upscope` holds nothing", "write `$upscope $end`"));
                }
                if scopes.pop().and(opened.pop()).is_none() {
                    return Err(Trouble::at(place, "there is no scope to leave", "remove this `$upscope`"));
                }
                copy(&mut header.copy, &keyword, &words);
            }
            "$enddefinitions" => {
                let words = section(tokens, &keyword, place)?;
                if let Some((_, at)) = words.first() {
                    return Err(Trouble::at(*at, "`$enddefinitions` holds nothing", "write `$enddefinitions $end`"));
                }
                if let Some(open) = opened.last() {
                    let message = "this scope is not closed before the declarations end";
                    return Err(Trouble::at(*open, message, "close it by `$upscope $end`"));
                }
                if scaled.is_none() {
                    let help = "add `$timescale 1 ns $end`, with what one tick of its times is";
                    return Err(Trouble::at(place, "the dump does not say how long a tick is", help));
                }
                copy(&mut header.copy, &keyword, &words);
                return Ok(header);
            }
            _ => return Err(stranger(&tokens.word, &keyword, place)),
        }
    }
}

/// A word that is no declaration.
fn stranger(word: &[u8], keyword: &str, place: Place) -> Trouble {
    if word.first() == Some(&b'$') {
        let help = match nearest(keyword, SECTIONS.into_iter().chain(["$var"])) {
            Some(likely) => format!("did you mean `{likely}`?"),
            None => "remove it, up to its `$end`".to_string(),
        };
        return Trouble::at(place, format!("there is no section `{keyword}` among the declarations"), help);
    }
    let message = format!("`{keyword}` stands where a declaration is expected");
    Trouble::at(
        place,
        message,
        "a dump begins with sections such as `$timescale 1 ns $end`; end them with `$enddefinitions $end`",
    )
}

/// A section in one way of writing.
fn copy(to: &mut String, keyword: &str, words: &[(Vec<u8>, Place)]) {
    *to += keyword;
    for (word, _) in words {
        to.push(' ');
        *to += &String::from_utf8_lossy(word);
    }
    *to += " $end\n";
}

/// Most words of a section other than a comment.
const MOST_WORDS: usize = 64;

/// The words of a section up to its `$end`.
fn section<R: BufRead>(tokens: &mut Tokens<R>, keyword: &str, place: Place) -> Result<Vec<(Vec<u8>, Place)>, Trouble> {
    let mut words = Vec::new();
    while tokens.next()? {
        if tokens.word == b"$end" {
            return Ok(words);
        }
        // a name may begin with `$`, a keyword within a section means that its end is missing
        let is_keyword = SECTIONS.iter().any(|it| it.as_bytes() == tokens.word) || tokens.word == b"$var";
        if is_keyword || words.len() == MOST_WORDS {
            break;
        }
        words.push((tokens.word.clone(), tokens.place));
    }
    Err(unclosed(keyword, place))
}

fn unclosed(keyword: &str, place: Place) -> Trouble {
    Trouble::at(place, format!("`{keyword}` has no `$end`"), "end the section with `$end`, with white space before it")
}

/// Passes over a section.
pub(super) fn skip<R: BufRead>(tokens: &mut Tokens<R>, keyword: &str, place: Place) -> Result<(), Trouble> {
    while tokens.next()? {
        if tokens.word == b"$end" {
            return Ok(());
        }
    }
    Err(unclosed(keyword, place))
}

fn timescale(words: &[(Vec<u8>, Place)], place: Place) -> Result<u64, Trouble> {
    const HELP: &str = "write 1, 10 or 100 and one of s, ms, us, ns, ps, fs, as in `$timescale 10 ps $end`";
    let text: String = words.iter().map(|(word, _)| String::from_utf8_lossy(word)).collect();
    let place = words.first().map_or(place, |(_, at)| *at);
    let digits = text.bytes().take_while(u8::is_ascii_digit).count();
    let (number, unit) = text.split_at(digits);
    let factor = match number {
        "1" => 1,
        "10" => 10,
        "100" => 100,
        _ => return Err(Trouble::at(place, format!("`{}` is no timescale", shown(text.as_bytes())), HELP)),
    };
    match Unit::ALL.into_iter().find(|it| it.name().eq_ignore_ascii_case(unit)) {
        Some(unit) => Ok(factor * unit.femtoseconds()),
        None => {
            let message = format!("`{}` is no unit of a timescale", shown(unit.as_bytes()));
            Err(Trouble::at(place, message, HELP))
        }
    }
}

fn variable(words: &[(Vec<u8>, Place)], place: Place, scopes: &[String]) -> Result<Variable, Trouble> {
    let [(kind, _), (size, size_at), (id, id_at), name @ ..] = words else {
        let message = "a variable has a type, a size, letters that stand for it, and a name";
        return Err(Trouble::at(place, message, "write it as in `$var wire 1 ! call_upper $end`"));
    };
    let Some((_, name_at)) = name.first() else {
        let message = "this variable has no name";
        return Err(Trouble::at(place, message, "write its name before `$end`, as in `$var wire 1 ! call_upper $end`"));
    };
    let kind = match kind.as_slice() {
        b"real" | b"realtime" => Kind::Real,
        b"event" | b"string" => Kind::Other,
        _ => Kind::Bits,
    };
    let bits = std::str::from_utf8(size).ok().and_then(|it| it.parse::<u32>().ok());
    // texts and moments may be said to have no bits
    let Some(bits) = bits.filter(|bits| *bits > 0 || kind == Kind::Other) else {
        let message = format!("`{}` is no size", shown(size));
        return Err(Trouble::at(*size_at, message, "write the number of its bits, 1 or more"));
    };
    if let Some(odd) = id.iter().find(|byte| !(b'!'..=b'~').contains(*byte)) {
        let message = format!("the letters that stand for a variable are printable ASCII; byte {odd:#04x} is not");
        return Err(Trouble::at(*id_at, message, "use letters from `!` to `~`"));
    }
    let whole: String = name.iter().map(|(word, _)| String::from_utf8_lossy(word)).collect();
    let (name, range) = split(&whole);
    if let Some((left, right)) = range
        && kind == Kind::Bits
        && left.abs_diff(right).checked_add(1) != Some(u64::from(bits))
    {
        let message = format!("`{}` does not have {bits} bits", shown(whole.as_bytes()));
        return Err(Trouble::at(
            *name_at,
            message,
            "correct its size or its range, as in `$var wire 4 ! d [3:0] $end`",
        ));
    }
    let mut full = String::new();
    for scope in scopes {
        full += scope;
        full.push('.');
    }
    full += &plain(name.as_bytes());
    Ok(Variable { name: full, range, kind, size: bits, id: id.clone().into_boxed_slice() })
}

/// A name without the mark of an escaped one.
fn plain(name: &[u8]) -> String {
    let text = String::from_utf8_lossy(name);
    text.strip_prefix('\\').unwrap_or(&text).to_string()
}

/// A name and the range behind it.
pub(super) fn split(whole: &str) -> (&str, Option<(i64, i64)>) {
    let inner = whole.strip_suffix(']').and_then(|rest| rest.rsplit_once('['));
    let Some((name, inner)) = inner.filter(|(name, _)| !name.is_empty()) else { return (whole, None) };
    let number = |text: &str| text.parse::<i32>().ok().map(i64::from);
    let range = match inner.split_once(':') {
        None => number(inner).map(|bit| (bit, bit)),
        Some((left, right)) => number(left).zip(number(right)),
    };
    range.map_or((whole, None), |range| (name, Some(range)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_and_ranges_are_told_apart() {
        assert_eq!(split("d[3:0]"), ("d", Some((3, 0))));
        assert_eq!(split("d[-1]"), ("d", Some((-1, -1))));
        assert_eq!(split("d[1][2]"), ("d[1]", Some((2, 2))));
        for whole in ["d", "[3]", "d[x]", "d[3", "d[1:2:3]", "d[99999999999]"] {
            assert_eq!(split(whole), (whole, None));
        }
    }

    #[test]
    fn bits_are_counted_from_the_left() {
        let of = |range, size| Variable { name: "d".into(), range, kind: Kind::Bits, size, id: Box::from(*b"!") };
        assert_eq!(of(Some((3, 0)), 4).bit(2), Some(1));
        assert_eq!(of(Some((0, 3)), 4).bit(2), Some(2));
        assert_eq!(of(None, 4).bit(0), Some(3));
        assert_eq!(of(Some((7, 4)), 4).bit(3), None);
    }
}

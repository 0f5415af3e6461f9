//! Which signal of a dump an input is.

use rustc_hash::FxHashMap;

use super::header::{Header, Kind, Variable, split};

/// A bit of a variable.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Signal {
    /// The letters that stand for the variable.
    pub id: Box<[u8]>,
    /// The digit that counts, from the left.
    pub bit: u32,
}

/// What a name means in a dump.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Found {
    /// This signal.
    One(Signal),
    /// No variable.
    None,
    /// Several, of these names.
    Several(Vec<String>),
    /// A variable of so many bits.
    Wide(String, u32),
    /// A variable that holds no bits.
    NoBits(String),
}

/// Variables by the last part of their names.
pub(super) struct Signals<'a> {
    header: &'a Header,
    by_last: FxHashMap<&'a str, Vec<usize>>,
}

fn last_of(name: &str) -> &str {
    name.rsplit_once('.').map_or(name, |(_, last)| last)
}

impl<'a> Signals<'a> {
    pub fn new(header: &'a Header) -> Signals<'a> {
        let mut by_last: FxHashMap<&str, Vec<usize>> = FxHashMap::default();
        for (i, variable) in header.variables.iter().enumerate() {
            by_last.entry(last_of(&variable.name)).or_default().push(i);
        }
        Signals { header, by_last }
    }

    /// All names, for a likely one.
    pub fn names(&self) -> impl Iterator<Item = &'a str> {
        self.header.variables.iter().map(|variable| variable.name.as_str())
    }

    /// The signal of this name: the one whose scopes and name are these, else the one whose name ends with these parts.
    pub fn find(&self, name: &str) -> Found {
        let (base, range) = split(name);
        let variables = &self.header.variables;
        let like = self.by_last.get(last_of(base)).map_or(&[][..], Vec::as_slice);
        let ends = |variable: &Variable| {
            variable.name.strip_suffix(base).is_some_and(|rest| rest.is_empty() || rest.ends_with('.'))
        };
        let fitting = |exact: bool| {
            let named = like.iter().map(|i| &variables[*i]).filter(|it| if exact { it.name == base } else { ends(it) });
            named.filter_map(|it| meaning(it, range).map(|meaning| (it.written(), meaning))).collect::<Vec<_>>()
        };
        let mut found = fitting(true);
        if found.is_empty() {
            found = fitting(false);
        }
        // aliases are one signal
        let Some((_, first)) = found.first() else { return Found::None };
        match found.iter().all(|(_, it)| it == first) {
            true => found.swap_remove(0).1,
            false => {
                let mut names: Vec<String> = found.into_iter().map(|(name, _)| name).collect();
                names.dedup();
                Found::Several(names)
            }
        }
    }
}

/// What a variable means to someone who names it with this range.
fn meaning(variable: &Variable, range: Option<(i64, i64)>) -> Option<Found> {
    if variable.kind != Kind::Bits {
        return range.is_none().then(|| Found::NoBits(variable.written()));
    }
    let one = |bit| Found::One(Signal { id: variable.id.clone(), bit });
    match range {
        None if variable.size == 1 => Some(one(0)),
        None => Some(Found::Wide(variable.written(), variable.size)),
        Some((bit, other)) if bit == other => {
            let known = variable.range.is_some() || variable.size > 1;
            variable.bit(bit).filter(|_| known).map(one)
        }
        Some(_) if range == variable.range => Some(Found::Wide(variable.written(), variable.size)),
        Some(_) => None,
    }
}

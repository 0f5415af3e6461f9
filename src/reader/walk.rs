//! From TOML values to names, amounts, words and states, each with its mark; wrong types are faults.

use std::borrow::Cow;
use std::ops::Range;

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use crate::scenario::{Amount, Comparisons, Fault, Faults, Mark, NewDelay, NewRange, NewState, Said, nearest};

pub(super) type Value<'i> = Spanned<DeValue<'i>>;
pub(super) type Key<'i> = Spanned<Cow<'i, str>>;

/// Places handed out as marks, and the faults found on the way.
pub(super) struct Walk {
    pub spans: Vec<Range<usize>>,
    pub faults: Faults,
    comparisons: Comparisons,
}

impl Walk {
    /// Mark 0 is the start of the text.
    pub fn new() -> Walk {
        let start = 0..0;
        Walk { spans: vec![start], faults: Faults::default(), comparisons: Comparisons::default() }
    }

    /// A new mark for a place.
    pub fn mark(&mut self, span: Range<usize>) -> Mark {
        self.spans.push(span);
        Mark(u32::try_from(self.spans.len() - 1).expect("a text of at most 16 MiB has fewer places"))
    }

    pub fn fault(&mut self, span: Range<usize>, message: impl Into<String>, help: impl Into<String>) {
        let mark = self.mark(span);
        self.faults.add(mark, message, help);
    }

    /// A name with its place.
    pub fn said_key(&mut self, key: &Key<'_>) -> Said<String> {
        let mark = self.mark(key.span());
        Said::at(key.get_ref().to_string(), mark)
    }

    /// The name that is most like a word, as long as names may still be compared.
    pub fn likely<'a>(&mut self, word: &str, names: impl ExactSizeIterator<Item = &'a str>) -> Option<&'a str> {
        self.comparisons.nearest(word, names)
    }

    fn wrong(&mut self, value: &Value<'_>, expected: &str, help: &str) {
        let found = match value.get_ref() {
            DeValue::String(_) => "text",
            DeValue::Integer(_) => "a whole number",
            DeValue::Float(_) => "a number with a point",
            DeValue::Boolean(_) => "true or false",
            DeValue::Datetime(_) => "a date",
            DeValue::Array(_) => "a list",
            DeValue::Table(_) => "a table",
        };
        self.fault(value.span(), format!("expected {expected}, found {found}"), help);
    }

    /// A key that has no meaning at this place.
    pub fn unknown_key(&mut self, key: &Key<'_>, known: &[&str], place: &str) {
        let name = key.get_ref();
        let help = match nearest(name, known.iter().copied()) {
            Some(likely) => format!("did you mean `{likely}`?"),
            None => format!("the keys here are {}", known.join(", ")),
        };
        self.fault(key.span(), format!("unknown key `{name}` in {place}"), help);
    }

    /// A key that must be there and is not.
    pub fn missing(&mut self, table: Range<usize>, key: &str, place: &str, example: &str) {
        self.fault(table, format!("{place} lacks `{key}`"), format!("add it, as in `{key} = {example}`"));
    }

    pub fn table<'v, 'i>(&mut self, value: &'v Value<'i>, help: &str) -> Option<&'v DeTable<'i>> {
        let table = value.get_ref().as_table();
        if table.is_none() {
            self.wrong(value, "a table", help);
        }
        table
    }

    pub fn list<'v, 'i>(&mut self, value: &'v Value<'i>, expected: &str, help: &str) -> Option<&'v [Value<'i>]> {
        match value.get_ref() {
            DeValue::Array(list) => Some(list),
            _ => {
                self.wrong(value, expected, help);
                None
            }
        }
    }

    /// The tables of `[[name]]`.
    pub fn tables<'v, 'i>(&mut self, value: &'v Value<'i>, name: &str) -> Vec<(Range<usize>, &'v DeTable<'i>)> {
        let help = format!("write `[[{name}]]` before each of them");
        let list = self.list(value, "a list of tables", &help).unwrap_or_default();
        list.iter().filter_map(|item| Some((item.span(), self.table(item, &help)?))).collect()
    }

    pub fn text(&mut self, value: &Value<'_>, example: &str) -> Option<Said<String>> {
        match value.get_ref() {
            DeValue::String(text) => Some(Said::at(text.to_string(), self.mark(value.span()))),
            _ => {
                self.wrong(value, "text", &format!("write it in quotes, as in {example}"));
                None
            }
        }
    }

    /// A list of net names; what is no name is left out.
    pub fn names(&mut self, value: &Value<'_>) -> Option<Vec<Said<String>>> {
        const EXAMPLE: &str = "[\"a\", \"b\"]";
        let list = self.list(value, "a list of net names", &format!("write a list, as in {EXAMPLE}"))?;
        let names = list.iter().map(|item| match item.get_ref() {
            DeValue::String(text) => Some(Said::at(text.to_string(), self.mark(item.span()))),
            _ => {
                self.wrong(item, "a net name", &format!("write names in quotes, as in {EXAMPLE}"));
                None
            }
        });
        let names: Vec<_> = names.collect();
        let all = names.len();
        let known: Vec<_> = names.into_iter().flatten().collect();
        (known.len() == all).then_some(known)
    }

    /// `0` or `1`.
    pub fn bit(&mut self, value: &Value<'_>) -> Option<bool> {
        match value.get_ref() {
            DeValue::Integer(number) if number.radix() == 10 && matches!(number.as_str(), "0" | "1") => {
                Some(number.as_str() == "1")
            }
            DeValue::Integer(number) => {
                self.fault(value.span(), format!("expected 0 or 1, found {number}"), "a net is 0 or 1");
                None
            }
            DeValue::Table(_) => {
                self.wrong(value, "0 or 1", "a name with a dot or a bracket is quoted, as in `\"a.b\" = 1`");
                None
            }
            _ => {
                self.wrong(value, "0 or 1", "write 0 or 1 without quotes");
                None
            }
        }
    }

    /// Nets and their values, and whether all of them could be read.
    pub fn state(&mut self, value: &Value<'_>) -> Option<(Said<NewState>, bool)> {
        let mark = self.mark(value.span());
        let table = self.table(value, "write nets with their values, as in `{ q = 1 }`")?;
        let (state, complete) = self.values(table);
        Some((Said::at(state, mark), complete))
    }

    /// The same of a table.
    pub fn values(&mut self, table: &DeTable<'_>) -> (NewState, bool) {
        let mut state = Vec::with_capacity(table.len());
        for (key, value) in table.iter() {
            let name = self.said_key(key);
            if let Some(bit) = self.bit(value) {
                state.push((name, bit));
            }
        }
        let complete = state.len() == table.len();
        (state, complete)
    }

    pub fn integer(&mut self, value: &Value<'_>) -> Option<Said<u64>> {
        const HELP: &str = "write a whole number from 0 on";
        match value.get_ref() {
            DeValue::Integer(number) => match u64::from_str_radix(number.as_str(), number.radix()) {
                Ok(whole) => Some(Said::at(whole, self.mark(value.span()))),
                Err(_) => {
                    let what = if number.as_str().starts_with('-') { "is below 0" } else { "is too large" };
                    self.fault(value.span(), format!("{number} {what}"), format!("{HELP} to 2^64 - 1"));
                    None
                }
            },
            _ => {
                self.wrong(value, "a whole number", HELP);
                None
            }
        }
    }

    /// A count, or `[least, greatest]`.
    pub fn counts(&mut self, value: &Value<'_>) -> Option<Said<(u64, u64)>> {
        let mark = self.mark(value.span());
        match value.get_ref() {
            DeValue::Array(list) => match list.as_ref() {
                [least, most] => {
                    let (least, most) = (self.integer(least), self.integer(most));
                    Some(Said::at((least?.what, most?.what), mark))
                }
                _ => {
                    let message = format!("expected a number or `[least, greatest]`, found a list of {}", list.len());
                    self.fault(value.span(), message, "write two whole numbers, as in [0, 6]");
                    None
                }
            },
            _ => {
                let count = self.integer(value)?.what;
                Some(Said::at((count, count), mark))
            }
        }
    }

    /// A fraction or factor that is no time.
    pub fn number(&mut self, value: &Value<'_>) -> Option<Said<f64>> {
        let text = self.decimal(value)?;
        match text.what.parse::<f64>() {
            Ok(number) => Some(Said::at(number, text.mark)),
            Err(_) => {
                self.wrong(value, "a number", "write a number, as in 0.9");
                None
            }
        }
    }

    /// The digits of a number as they were written.
    pub fn decimal(&mut self, value: &Value<'_>) -> Option<Said<String>> {
        let text = match value.get_ref() {
            DeValue::Integer(number) if number.radix() == 10 => number.as_str().to_string(),
            DeValue::Float(number) => number.as_str().to_string(),
            _ => {
                self.wrong(value, "a number", "write a decimal number, as in 0.25");
                return None;
            }
        };
        Some(Said::at(text, self.mark(value.span())))
    }

    /// A time: a number, or text with a unit.
    pub fn amount(&mut self, value: &Value<'_>) -> Option<Said<Amount>> {
        const HELP: &str = "write a number such as 6 or 2.5, or text with a unit such as \"2.5 us\"";
        let text = match value.get_ref() {
            DeValue::Integer(number) if number.radix() == 10 => number.as_str().to_string(),
            DeValue::Integer(number) => match u128::from_str_radix(number.as_str(), number.radix()) {
                Ok(whole) => whole.to_string(),
                Err(_) => {
                    self.fault(value.span(), format!("{number} is too large"), HELP);
                    return None;
                }
            },
            DeValue::Float(number) if number.as_str().contains("inf") || number.as_str().contains("nan") => {
                self.fault(value.span(), format!("{number} is no time"), HELP);
                return None;
            }
            DeValue::Float(number) => number.as_str().to_string(),
            DeValue::String(text) => text.to_string(),
            _ => {
                self.wrong(value, "a time", HELP);
                return None;
            }
        };
        Some(Said::at(Amount::Text(text), self.mark(value.span())))
    }

    /// A range of times: a number, `[lo, hi]`, `[min, typ, max]` or `{ typ, max }`.
    pub fn range(&mut self, value: &Value<'_>) -> Option<Said<NewRange>> {
        let mark = self.mark(value.span());
        let range = match value.get_ref() {
            DeValue::Array(list) => match list.as_ref() {
                [min, max] => {
                    let ends = [self.amount(min), self.amount(max)];
                    let [Some(min), Some(max)] = ends else { return None };
                    NewRange::Between([min, max])
                }
                [min, typ, max] => {
                    let three = [self.amount(min), self.amount(typ), self.amount(max)];
                    let [Some(min), Some(typ), Some(max)] = three else { return None };
                    NewRange::Three([min, typ, max])
                }
                _ => {
                    let message = format!("expected `[min, max]` or `[min, typ, max]`, found a list of {}", list.len());
                    self.fault(value.span(), message, "write two or three times, as in [6, 9, 14]");
                    return None;
                }
            },
            DeValue::Table(table) => {
                let (mut typ, mut max, mut known) = (None, None, true);
                for (key, item) in table.iter() {
                    match key.get_ref().as_ref() {
                        "typ" => typ = Some(self.amount(item)),
                        "max" => max = Some(self.amount(item)),
                        _ => {
                            self.unknown_key(key, &["typ", "max"], "a delay");
                            known = false;
                        }
                    }
                }
                for (key, missing) in [("typ", typ.is_none()), ("max", max.is_none())] {
                    if missing && known {
                        self.missing(value.span(), key, "this delay", "9");
                    }
                }
                NewRange::TypMax([typ.flatten()?, max.flatten()?])
            }
            _ => NewRange::Exact(self.amount(value)?),
        };
        Some(Said::at(range, mark))
    }

    /// Takes a key of a delay entry into it; false if the key is another.
    pub fn delay_key(&mut self, key: &str, value: &Value<'_>, into: &mut NewDelay) -> bool {
        let slot = match key {
            "delay" => &mut into.delay,
            "rise" => &mut into.rise,
            "fall" => &mut into.fall,
            _ => return false,
        };
        *slot = self.range(value);
        true
    }

    /// One of some words.
    pub fn word<T: Copy>(&mut self, value: &Value<'_>, words: &[(&str, T)]) -> Option<T> {
        let help = || {
            let list = words.iter().map(|(word, _)| format!("\"{word}\"")).collect::<Vec<_>>().join(", ");
            if words.len() == 1 { format!("write {list}") } else { format!("write one of {list}") }
        };
        let DeValue::String(text) = value.get_ref() else {
            self.wrong(value, "a word in quotes", &help());
            return None;
        };
        let found = words.iter().find(|(word, _)| word == text);
        if found.is_none() {
            let help = match nearest(text, words.iter().map(|(word, _)| *word)) {
                Some(likely) => format!("did you mean \"{likely}\"?"),
                None => help(),
            };
            self.fault(value.span(), format!("`{text}` has no meaning here"), help);
        }
        found.map(|(_, meaning)| *meaning)
    }

    /// Adds a fault with another place.
    pub fn fault_beside(&mut self, span: Range<usize>, message: String, help: &str, other: Range<usize>, label: &str) {
        let (mark, other) = (self.mark(span), self.mark(other));
        self.faults.push(Fault::new(mark, message, help).related(other, label));
    }
}

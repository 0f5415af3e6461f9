//! What every check needs: the nets by name, the unit, and the lists to add to.

use rustc_hash::{FxHashMap, FxHashSet};

use super::said::{Amount, NewRange, NewState, Said};
use crate::circuit::NetId;
use crate::delay::DelayRange;
use crate::scenario::{Alternative, Comparisons, Fault, Faults, Mark};
use crate::time::{Span, TimeError, Unit};

/// All names that one network knows, by number: inputs first, then gates.
#[derive(Default)]
pub(super) struct Nets<'a> {
    pub ids: FxHashMap<&'a str, NetId>,
    pub names: Vec<&'a str>,
    pub marks: Vec<Mark>,
    pub inputs: usize,
}

pub(super) struct Context<'a> {
    pub nets: Nets<'a>,
    pub unit: Unit,
    pub faults: Faults,
    pub notes: Vec<Said<String>>,
    pub not_analysed: Vec<Said<String>>,
    comparisons: Comparisons,
}

/// The least value that a range may take.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum Least {
    Zero,
    /// 1 fs; the words name the thing in the fault.
    Tick(&'static str),
}

impl<'a> Context<'a> {
    pub fn new(nets: Nets<'a>, unit: Unit, faults: Faults) -> Context<'a> {
        Context { nets, unit, faults, notes: Vec::new(), not_analysed: Vec::new(), comparisons: Comparisons::default() }
    }

    pub fn note(&mut self, mark: Mark, note: impl Into<String>) {
        self.notes.push(Said::at(note.into(), mark));
    }

    /// A span in the scenario's unit, for a fault.
    pub fn show(&self, span: Span) -> String {
        format!("{} {}", span.decimal(self.unit), self.unit)
    }

    /// The net whose name is most like this one, as long as names may still be compared.
    pub fn likely(&mut self, name: &str) -> Option<&'a str> {
        self.comparisons.nearest(name, self.nets.names.iter().copied())
    }

    /// What to do about a name that is no net.
    pub fn name_help(&mut self, name: &str) -> String {
        match self.likely(name) {
            Some(likely) => format!("did you mean `{likely}`?"),
            None => "name an input or a gate, or add it under `[inputs]` or `[gates]`".into(),
        }
    }

    /// The net of a name.
    pub fn net(&mut self, said: &Said<String>) -> Option<NetId> {
        let found = self.nets.ids.get(said.what.as_str()).copied();
        if found.is_none() {
            let help = self.name_help(&said.what);
            self.faults.add(said.mark, format!("there is no net `{}`", said.what), help);
        }
        found
    }

    pub fn is_input(&self, net: NetId) -> bool {
        net.index() < self.nets.inputs
    }

    pub fn mark_of(&self, net: NetId) -> Mark {
        self.nets.marks[net.index()]
    }

    /// The net of a name that must be a gate's; `help` says what to do about an input.
    pub fn gate(&mut self, said: &Said<String>, help: &str) -> Option<NetId> {
        let net = self.net(said)?;
        if self.is_input(net) {
            let fault = Fault::new(said.mark, format!("`{}` is an input, not a gate", said.what), help);
            self.faults.push(fault.related(self.mark_of(net), "an input"));
            return None;
        }
        Some(net)
    }

    /// The net of a name that must be an input; `help` says what to do about a gate.
    pub fn input(&mut self, said: &Said<String>, help: &str) -> Option<NetId> {
        let net = self.net(said)?;
        if !self.is_input(net) {
            let fault = Fault::new(said.mark, format!("`{}` is driven by a gate; it is no input", said.what), help);
            self.faults.push(fault.related(self.mark_of(net), "this gate drives it"));
            return None;
        }
        Some(net)
    }

    /// The nets of a list and where they were named, in its order; a net named twice is a fault.
    pub fn list(&mut self, names: &[Said<String>]) -> Vec<(NetId, Mark)> {
        let mut seen = FxHashSet::default();
        let mut nets = Vec::with_capacity(names.len());
        for said in names {
            match self.net(said) {
                Some(net) if seen.insert(net) => nets.push((net, said.mark)),
                Some(_) => self.named_twice(said),
                None => {}
            }
        }
        nets
    }

    pub fn named_twice(&mut self, said: &Said<String>) {
        self.faults.add(said.mark, format!("`{}` is named twice", said.what), "name it once");
    }

    /// A partial state in net order.
    pub fn state(&mut self, said: &NewState) -> Alternative {
        let mut seen = FxHashSet::default();
        let mut state = Vec::with_capacity(said.len());
        for (name, value) in said {
            match self.net(name) {
                Some(net) if seen.insert(net) => state.push((net, *value)),
                Some(_) => self.named_twice(name),
                None => {}
            }
        }
        state.sort_unstable();
        state
    }

    /// A partial state that names at least one net.
    pub fn some_state(&mut self, said: &NewState, mark: Mark, incomplete: bool) -> Alternative {
        if said.is_empty() && !incomplete {
            self.faults.add(mark, "this state names no net", "name at least one net with its value, as in `{ q = 1 }`");
        }
        self.state(said)
    }

    /// An amount as a span.
    pub fn span(&mut self, said: &Said<Amount>) -> Option<Span> {
        let parsed = match &said.what {
            Amount::Text(text) => Span::parse(text, self.unit),
            Amount::Exact(span) if *span < Span::LIMIT => Ok(*span),
            Amount::Exact(span) => Err(TimeError::TooLarge(span.decimal(self.unit).to_string())),
        };
        match parsed {
            Ok(span) => Some(span),
            Err(error) => {
                self.faults.push(Fault::time(said.mark, &error));
                None
            }
        }
    }

    /// A range without an assumed minimum.
    pub fn range(&mut self, said: &Said<NewRange>, least: Least) -> Option<DelayRange> {
        if let NewRange::TypMax(_) = said.what {
            self.faults.add(said.mark, "`{ typ, max }` is for delays only", "write a number or `[lo, hi]`");
            return None;
        }
        self.range_with(said, least, None).map(|(range, _)| range)
    }

    /// A range, and whether its minimum was assumed as this fraction of typical.
    pub fn range_with(
        &mut self,
        said: &Said<NewRange>,
        least: Least,
        assume: Option<Fraction>,
    ) -> Option<(DelayRange, bool)> {
        let spans = |context: &mut Context<'_>, amounts: &[Said<Amount>]| -> Option<Vec<Span>> {
            let all: Vec<_> = amounts.iter().map(|amount| context.above(amount, least)).collect();
            all.into_iter().collect()
        };
        let (range, assumed) = match &said.what {
            NewRange::Exact(amount) => (DelayRange::exact(self.above(amount, least)?), false),
            NewRange::Between(ends) => {
                let all = spans(self, ends)?;
                self.ordered(ends, &all, ["min", "max"])?;
                (DelayRange::between(all[0], all[1]), false)
            }
            NewRange::Three(three) => {
                let all = spans(self, three)?;
                let first = self.ordered(&three[..2], &all[..2], ["min", "typ"]);
                let second = self.ordered(&three[1..], &all[1..], ["typ", "max"]);
                first.and(second)?;
                (DelayRange { min: all[0], typ: all[1], max: all[2] }, false)
            }
            NewRange::TypMax(two) => {
                let all = spans(self, two)?;
                self.ordered(two, &all, ["typ", "max"])?;
                let min = assume.unwrap_or_default().of(all[0]);
                (DelayRange { min, typ: all[0], max: all[1] }, true)
            }
        };
        Some((range, assumed))
    }

    fn above(&mut self, said: &Said<Amount>, least: Least) -> Option<Span> {
        let span = self.span(said)?;
        match least {
            Least::Tick(thing) if span == Span::ZERO => {
                let help = format!("write at least 1 fs, as in `{}`", self.tick());
                self.faults.add(said.mark, format!("{thing} of 0 is not possible"), help);
                None
            }
            _ => Some(span),
        }
    }

    /// How a file says 1 fs.
    fn tick(&self) -> &'static str {
        if self.unit == Unit::Fs { "1" } else { "\"1 fs\"" }
    }

    fn ordered(&mut self, said: &[Said<Amount>], spans: &[Span], names: [&str; 2]) -> Option<()> {
        if spans[0] <= spans[1] {
            return Some(());
        }
        let (low, high) = (self.show(spans[0]), self.show(spans[1]));
        let message = format!("{} is greater than {}: {low} > {high}", names[0], names[1]);
        let help = if names[0] == "typ" || names[1] == "typ" {
            "write them in the order min, typ, max"
        } else {
            "write the smaller one first"
        };
        self.faults
            .push(Fault::new(said[0].mark, message, help).related(said[1].mark, format!("{} is here", names[1])));
        None
    }
}

/// An exact decimal fraction, above 0 up to 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Fraction {
    /// In units of 10^-18.
    parts: u64,
}

impl Default for Fraction {
    fn default() -> Fraction {
        Fraction { parts: Fraction::ONE / 4 }
    }
}

impl Fraction {
    const ONE: u64 = 10u64.pow(18);

    /// Reads a plain decimal such as `0.25`, with up to 18 digits after the point.
    pub fn parse(text: &str) -> Option<Fraction> {
        let (whole, part) = text.split_once('.').unwrap_or((text, ""));
        let digits = |s: &str| s.bytes().all(|b| b.is_ascii_digit());
        if whole.is_empty() || part.len() > 18 || !digits(whole) || !digits(part) {
            return None;
        }
        let parts = format!("{whole}{part:0<18}").parse::<u64>().ok()?;
        (1..=Fraction::ONE).contains(&parts).then_some(Fraction { parts })
    }

    /// This fraction of a span, rounded down, at least 1 fs.
    pub fn of(self, span: Span) -> Span {
        let fs = u128::from(span.fs()) * u128::from(self.parts) / u128::from(Fraction::ONE);
        Span::from_fs(u64::try_from(fs).expect("not more than the span")).max(Span::TICK)
    }
}

/// Names for a sentence: the first few, then how many more.
pub(super) fn name_list<'n>(names: impl ExactSizeIterator<Item = &'n str>) -> String {
    const SHOWN: usize = 8;
    let count = names.len();
    let mut text: String = names.take(SHOWN).map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ");
    if count > SHOWN {
        text += &format!(" and {} more", count - SHOWN);
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fractions_are_exact() {
        let of = |text, fs| Fraction::parse(text).map(|f| f.of(Span::from_fs(fs)).fs());
        assert_eq!(of("0.25", 1_000_003), Some(250_000));
        assert_eq!(of("0.25", 3), Some(1), "at least 1 fs");
        assert_eq!(of("1", (1 << 62) - 1), Some((1 << 62) - 1));
        assert_eq!(of("0.3", 10), Some(3), "0.3 as a float is less");
        for bad in ["0", "1.1", "-0.5", "nan", "1e-1", "0.0000000000000000001", "", "."] {
            assert_eq!(Fraction::parse(bad), None, "{bad}");
        }
    }
}

//! Values that several documents share: exact times, states, names of subjects.

use serde::ser::{SerializeMap, SerializeSeq};
use serde::{Serialize, Serializer};
use serde_json::value::RawValue;

use crate::circuit::{Circuit, NetId};
use crate::delay::Billionths;
use crate::findings::Against;
use crate::logic::{State, Value};
use crate::scenario::Scenario;
use crate::sweep::Worst;
use crate::time::{Decimal, Span, Time, Unit};

/// An exact decimal number, as it is written.
pub(super) struct Exact(String);

impl Exact {
    pub fn span(span: Span, unit: Unit) -> Exact {
        Exact(span.decimal(unit).to_string())
    }

    pub fn time(time: Time, unit: Unit) -> Exact {
        Exact::span(time.from_start(), unit)
    }

    pub fn factor(factor: Billionths) -> Exact {
        Exact(factor.to_string())
    }

    pub fn signed(fs: i128, unit: Unit) -> Exact {
        Exact(Decimal::new(fs, unit).to_string())
    }
}

impl Serialize for Exact {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        let digits = RawValue::from_string(self.0.clone()).map_err(serde::ser::Error::custom)?;
        digits.serialize(to)
    }
}

/// A measured value: a time in the unit, or a share.
#[derive(Serialize)]
#[serde(untagged)]
pub(super) enum Measured {
    Time(Exact),
    Share(f64),
    Endless(Option<()>),
}

impl Measured {
    pub fn of(worst: Worst, unit: Unit) -> Measured {
        match worst {
            Worst::Time(span) => Measured::Time(Exact::span(span, unit)),
            Worst::Endless => Measured::Endless(None),
            Worst::Share(share) => Measured::Share(crate::output::words::six(share)),
        }
    }
}

/// A logic value: 0, 1 or "X".
pub(super) struct Level(pub Value);

impl Serialize for Level {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        match self.0 {
            Value::Zero => to.serialize_u8(0),
            Value::One => to.serialize_u8(1),
            Value::X => to.serialize_str("X"),
        }
    }
}

/// Something written on one line inside a document of many lines, so that a state or a wave reads as one thing.
pub(super) struct OneLine<T>(pub T);

impl<T: Serialize> Serialize for OneLine<T> {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        let fail = serde::ser::Error::custom;
        let mut bytes = Vec::new();
        self.0.serialize(&mut serde_json::Serializer::with_formatter(&mut bytes, Spaced)).map_err(fail)?;
        let text = String::from_utf8(bytes).map_err(serde::ser::Error::custom)?;
        RawValue::from_string(text).map_err(serde::ser::Error::custom)?.serialize(to)
    }
}

/// One line, with a space after each comma and colon.
struct Spaced;

impl serde_json::ser::Formatter for Spaced {
    fn begin_array_value<W: ?Sized + std::io::Write>(&mut self, to: &mut W, first: bool) -> std::io::Result<()> {
        if first { Ok(()) } else { to.write_all(b", ") }
    }

    fn begin_object_key<W: ?Sized + std::io::Write>(&mut self, to: &mut W, first: bool) -> std::io::Result<()> {
        if first { Ok(()) } else { to.write_all(b", ") }
    }

    fn begin_object_value<W: ?Sized + std::io::Write>(&mut self, to: &mut W) -> std::io::Result<()> {
        to.write_all(b": ")
    }
}

/// Names and values, in order, as an object.
pub(super) struct Object<K, V>(pub Vec<(K, V)>);

impl<K: Serialize, V: Serialize> Serialize for Object<K, V> {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        let mut map = to.serialize_map(Some(self.0.len()))?;
        for (key, value) in &self.0 {
            map.serialize_entry(key, value)?;
        }
        map.end()
    }
}

/// The values of all nets as an object, in net order, on one line.
pub(super) fn state<'a>(circuit: &'a Circuit, state: &State) -> OneLine<Object<&'a str, Level>> {
    values(circuit, circuit.nets(), |net| state.get(net.index()))
}

/// The values of some nets as an object, on one line.
pub(super) fn values(
    circuit: &Circuit,
    nets: impl Iterator<Item = NetId>,
    value: impl Fn(NetId) -> Value,
) -> OneLine<Object<&str, Level>> {
    OneLine(Object(nets.map(|net| (circuit.name(net), Level(value(net)))).collect()))
}

/// How a window departed from the reference: values of all nets before (null if the step did not come at rest) and
/// reached, and of the compared nets what is allowed; `allowed_truncated` if there may be more of that.
#[derive(Serialize)]
pub(super) struct Departed<'a> {
    before: Option<OneLine<Object<&'a str, Level>>>,
    reached: OneLine<Object<&'a str, Level>>,
    allowed: Lines<Object<&'a str, Level>>,
    allowed_truncated: bool,
}

impl<'a> Departed<'a> {
    pub fn of(scenario: &'a Scenario, against: &Against) -> Departed<'a> {
        let circuit = &*scenario.circuit;
        let compared = scenario.reference.iter().flat_map(|reference| &reference.compare);
        let names: Vec<&str> = compared.map(|(net, _)| circuit.name(*net)).collect();
        let allowed = |values: &Vec<bool>| {
            Object(names.iter().copied().zip(values.iter().map(|bit| Level(Value::from(*bit)))).collect())
        };
        Departed {
            before: against.departure.before.as_ref().map(|it| state(circuit, it)),
            reached: state(circuit, &against.departure.reached),
            allowed: Lines(against.allowed.values.iter().map(allowed).collect()),
            allowed_truncated: against.allowed.open,
        }
    }
}

/// A list whose entries stand on one line each.
pub(super) struct Lines<T>(pub Vec<T>);

impl<T: Serialize> Serialize for Lines<T> {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        let mut list = to.serialize_seq(Some(self.0.len()))?;
        for entry in &self.0 {
            list.serialize_element(&OneLine(entry))?;
        }
        list.end()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn times_keep_every_digit() {
        let text = serde_json::to_string(&Exact::span(Span::from_fs(u64::MAX), Unit::Ns)).unwrap();
        assert_eq!(text, "18446744073709.551615");
        assert_eq!(serde_json::to_string(&Exact::signed(-1, Unit::S)).unwrap(), "-0.000000000000001");
    }

    #[test]
    fn one_line_inside_a_pretty_document() {
        let inner = OneLine(Object(vec![("a", Level(Value::One)), ("b", Level(Value::X))]));
        let text = serde_json::to_string_pretty(&Object(vec![("state", inner)])).unwrap();
        assert_eq!(text, "{\n  \"state\": {\"a\": 1, \"b\": \"X\"}\n}");
    }
}

//! Maps as lists of pairs in rising order: keys need not be text, and one map has one form.

use std::collections::BTreeMap;
use std::fmt;
use std::marker::PhantomData;

use serde::de::{Error, SeqAccess, Visitor};
use serde::{Deserialize, Deserializer, Serialize, Serializer};

/// Writes a map.
pub(super) fn serialize<K: Serialize, V: Serialize, S: Serializer>(
    map: &BTreeMap<K, V>,
    to: S,
) -> Result<S::Ok, S::Error> {
    to.collect_seq(map)
}

/// Reads a map. Errors: keys that do not rise.
pub(super) fn deserialize<'de, K, V, D>(from: D) -> Result<BTreeMap<K, V>, D::Error>
where
    K: Deserialize<'de> + Ord,
    V: Deserialize<'de>,
    D: Deserializer<'de>,
{
    from.deserialize_seq(Pairs(PhantomData))
}

struct Pairs<K, V>(PhantomData<(K, V)>);

impl<'de, K: Deserialize<'de> + Ord, V: Deserialize<'de>> Visitor<'de> for Pairs<K, V> {
    type Value = BTreeMap<K, V>;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a list of pairs in rising order")
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut list: A) -> Result<BTreeMap<K, V>, A::Error> {
        let mut map = BTreeMap::new();
        while let Some((key, value)) = list.next_element::<(K, V)>()? {
            if map.last_key_value().is_some_and(|(last, _)| *last >= key) {
                return Err(A::Error::custom("pairs that do not rise"));
            }
            map.insert(key, value);
        }
        Ok(map)
    }
}

/// A map that may not be there.
pub(super) mod optional {
    use std::collections::BTreeMap;

    use serde::{Deserialize, Deserializer, Serialize, Serializer};

    /// A map, read as pairs.
    #[derive(Deserialize)]
    #[serde(bound(deserialize = "K: Deserialize<'de>, V: Deserialize<'de>"))]
    struct Map<K: Ord, V>(#[serde(deserialize_with = "super::deserialize")] BTreeMap<K, V>);

    /// Writes it.
    pub(in super::super) fn serialize<K, V, S>(map: &Option<BTreeMap<K, V>>, to: S) -> Result<S::Ok, S::Error>
    where
        K: Serialize + Ord,
        V: Serialize,
        S: Serializer,
    {
        map.as_ref().map(|map| map.iter().collect::<Vec<_>>()).serialize(to)
    }

    /// Reads it. Errors: keys that do not rise.
    pub(in super::super) fn deserialize<'de, K, V, D>(from: D) -> Result<Option<BTreeMap<K, V>>, D::Error>
    where
        K: Deserialize<'de> + Ord,
        V: Deserialize<'de>,
        D: Deserializer<'de>,
    {
        Ok(Option::<Map<K, V>>::deserialize(from)?.map(|map| map.0))
    }
}

//! The line and column of any node, with serde_yaml alone.
//!
//! It is walked to once more and made to fail there on purpose; serde_yaml stamps its mark on the error. So the checked
//! types carry no places, and no second parser can disagree with the first. Cold path: once a complaint.

use super::complaint::Segment;
use serde::de::{self, DeserializeSeed, Deserializer, IgnoredAny, MapAccess, SeqAccess, Visitor};
use std::fmt;

/// 1-based line and column of the node at the end of `steps`, or `None` if there is none.
pub fn locate(text: &str, steps: &[Segment]) -> Option<(usize, usize)> {
    let error = Walk(steps)
        .deserialize(serde_yaml::Deserializer::from_str(text))
        .err()?;
    if !error.to_string().contains(HERE) {
        return None;
    }
    error.location().map(|place| (place.line(), place.column()))
}

const HERE: &str = "\u{1}here";

struct Walk<'s>(&'s [Segment]);

impl<'de> DeserializeSeed<'de> for Walk<'_> {
    type Value = ();
    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<(), D::Error> {
        deserializer.deserialize_any(self)
    }
}

/// Compares a key; fails on it where the key itself is what is looked for.
struct KeySeed<'k> {
    key: &'k str,
    stop: bool,
}

impl<'de> DeserializeSeed<'de> for KeySeed<'_> {
    type Value = bool;
    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<bool, D::Error> {
        deserializer.deserialize_str(self)
    }
}

impl Visitor<'_> for KeySeed<'_> {
    type Value = bool;
    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a key")
    }
    fn visit_str<E: de::Error>(self, text: &str) -> Result<bool, E> {
        if text == self.key && self.stop {
            Err(E::custom(HERE))
        } else {
            Ok(text == self.key)
        }
    }
}

impl<'de> Visitor<'de> for Walk<'_> {
    type Value = ();

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a node")
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<(), A::Error> {
        let (key, rest) = match self.0 {
            [] => return Err(de::Error::custom(HERE)),
            [Segment::Key(key), rest @ ..] => (key, Some(rest)),
            [Segment::Name(key), ..] => (key, None),
            [Segment::Item(_), ..] => return Ok(()),
        };
        while let Some(hit) = map.next_key_seed(KeySeed {
            key,
            stop: rest.is_none(),
        })? {
            match rest {
                Some(rest) if hit => return map.next_value_seed(Walk(rest)),
                _ => map.next_value::<IgnoredAny>()?,
            };
        }
        Ok(())
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut list: A) -> Result<(), A::Error> {
        match self.0 {
            [] => return Err(de::Error::custom(HERE)),
            [Segment::Item(index), rest @ ..] => {
                for _ in 0..*index {
                    list.next_element::<IgnoredAny>()?;
                }
                list.next_element_seed(Walk(rest))?;
            }
            _ => while list.next_element::<IgnoredAny>()?.is_some() {},
        }
        Ok(())
    }

    fn visit_bool<E: de::Error>(self, _: bool) -> Result<(), E> {
        Err(E::custom(HERE))
    }
    fn visit_i64<E: de::Error>(self, _: i64) -> Result<(), E> {
        Err(E::custom(HERE))
    }
    fn visit_u64<E: de::Error>(self, _: u64) -> Result<(), E> {
        Err(E::custom(HERE))
    }
    fn visit_f64<E: de::Error>(self, _: f64) -> Result<(), E> {
        Err(E::custom(HERE))
    }
    fn visit_str<E: de::Error>(self, _: &str) -> Result<(), E> {
        Err(E::custom(HERE))
    }
    fn visit_unit<E: de::Error>(self) -> Result<(), E> {
        Err(E::custom(HERE))
    }
}

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
            [Segment::Name(key) | Segment::Again(key), ..] => (key, None),
            [Segment::Item(_), ..] => return Ok(()),
        };
        // How often the key is passed before it is the one.
        let mut passed = usize::from(matches!(self.0, [Segment::Again(_), ..]));
        while let Some(hit) = map.next_key_seed(KeySeed {
            key,
            stop: rest.is_none() && passed == 0,
        })? {
            passed = passed.saturating_sub(usize::from(hit));
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

#[cfg(test)]
mod tests {
    use super::*;

    const TEXT: &str = "# top
ports:
  input: \"USB\"   # c
  output: wharf
channels: [2, 3,
  99]
tuning:
  C: 0
  'F#': -13.7
  1812: &d 3
rules:
  - {kind: fixed, cents: 1}
  - kind: ratio
    num: 5
    kind: pure
last: no newline";

    fn at(steps: &[Segment]) -> Option<(usize, usize)> {
        locate(TEXT, steps)
    }

    fn key(name: &str) -> Segment {
        Segment::Key(name.to_string())
    }

    fn name(name: &str) -> Segment {
        Segment::Name(name.to_string())
    }

    #[test]
    fn values_are_found() {
        assert_eq!(at(&[key("ports"), key("input")]), Some((3, 10)));
        assert_eq!(at(&[key("ports"), key("output")]), Some((4, 11)));
        assert_eq!(at(&[key("tuning"), key("F#")]), Some((9, 9)));
        assert_eq!(at(&[key("tuning"), key("1812")]), Some((10, 9)));
        assert_eq!(at(&[]), Some((2, 1)));
    }

    #[test]
    fn keys_are_found() {
        assert_eq!(at(&[name("tuning")]), Some((7, 1)));
        assert_eq!(at(&[key("tuning"), name("F#")]), Some((9, 3)));
        assert_eq!(at(&[key("tuning"), name("1812")]), Some((10, 3)));
        assert_eq!(at(&[key("tuning"), name("G")]), None);
    }

    #[test]
    fn items_are_found_in_flow_style_over_lines_too() {
        let items = |index| at(&[key("channels"), Segment::Item(index)]);
        assert_eq!(items(0), Some((5, 12)));
        assert_eq!(items(2), Some((6, 3)));
        assert_eq!(items(3), None);
        let rule = |index, step| at(&[key("rules"), Segment::Item(index), step]);
        assert_eq!(rule(0, key("cents")), Some((12, 26)));
        assert_eq!(rule(0, name("cents")), Some((12, 19)));
        assert_eq!(rule(1, key("num")), Some((14, 10)));
    }

    #[test]
    fn a_key_is_found_where_it_stands_again() {
        let rule = [key("rules"), Segment::Item(1)];
        let with = |step| at(&[rule[0].clone(), rule[1].clone(), step]);
        assert_eq!(with(name("kind")), Some((13, 5)));
        assert_eq!(with(Segment::Again("kind".to_string())), Some((15, 5)));
        assert_eq!(with(Segment::Again("num".to_string())), None);
    }

    #[test]
    fn the_last_line_counts_without_an_end_too() {
        assert_eq!(at(&[key("last")]), Some((16, 7)));
        assert_eq!(at(&[key("nowhere"), key("else")]), None);
    }
}

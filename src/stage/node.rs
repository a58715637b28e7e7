//! A YAML text as a tree that keeps everything, duplicates too, so that checking can go on after the first mistake.
//!
//! Deliberately not derived structs: those stop at the first error, and players want all complaints at once.

use super::complaint::{Complaints, Segment, Trail};
use serde::de::{Deserialize, Deserializer, MapAccess, SeqAccess, Visitor};
use std::fmt;

/// A YAML value. Plain numbers keep the shortest spelling of their value.
#[derive(Clone, Debug, PartialEq)]
pub enum Node {
    Nothing,
    Flag(bool),
    Number(String),
    Text(String),
    List(Vec<Node>),
    Map(Vec<(String, Node)>),
}

impl Node {
    /// For complaints: what stands here, as typed where it is short.
    pub fn shown(&self) -> String {
        match self {
            Node::Nothing => String::from("nothing"),
            Node::Flag(flag) => format!("`{flag}`"),
            Node::Number(text) | Node::Text(text) => format!("`{text}`"),
            Node::List(_) => String::from("a list"),
            Node::Map(_) => String::from("a map"),
        }
    }
}

/// A node and the way to it: what checking code passes around.
#[derive(Clone, Debug)]
pub struct At<'n> {
    pub node: &'n Node,
    pub trail: Trail,
}

impl<'n> At<'n> {
    pub fn new(node: &'n Node, trail: Trail) -> At<'n> {
        At { node, trail }
    }

    /// Whether nothing is written here (`keys:` with nothing behind it).
    pub fn is_nothing(&self) -> bool {
        *self.node == Node::Nothing
    }

    /// Text or number, as typed. Complains (`wanted`: "a tuning name") about anything else.
    pub fn text(&self, wanted: &str, complaints: &mut Complaints) -> Option<String> {
        match self.node {
            Node::Text(text) | Node::Number(text) => Some(text.clone()),
            Node::Flag(flag) => Some(flag.to_string()),
            other => {
                complaints.add(
                    &self.trail,
                    format!("{} stands here", other.shown()),
                    format!("write {wanted}"),
                );
                None
            }
        }
    }

    /// A whole number within bounds.
    pub fn whole(
        &self,
        wanted: &str,
        range: std::ops::RangeInclusive<i64>,
        complaints: &mut Complaints,
    ) -> Option<i64> {
        let number = match self.node {
            Node::Number(text) => text.parse::<i64>().ok(),
            _ => None,
        };
        match number {
            Some(number) if range.contains(&number) => Some(number),
            _ => {
                let shown = self.node.shown();
                let bounds = format!("a whole number from {} to {}", range.start(), range.end());
                let (wrong, right) = match self.node {
                    Node::Text(text) if is_padded(text) => (
                        format!("{shown} begins with a nought, so it is no number to YAML"),
                        format!("write {}", text.trim_start_matches('0')),
                    ),
                    _ => (
                        format!("{shown} does not fit here"),
                        format!("write {wanted}: {bounds}"),
                    ),
                };
                complaints.add(&self.trail, wrong, right);
                None
            }
        }
    }

    /// `true`, `false`, `yes` or `no`.
    pub fn flag(&self, complaints: &mut Complaints) -> Option<bool> {
        match self.node {
            Node::Flag(flag) => Some(*flag),
            Node::Text(text) if text == "yes" => Some(true),
            Node::Text(text) if text == "no" => Some(false),
            other => {
                complaints.add(
                    &self.trail,
                    format!("{} stands here", other.shown()),
                    "write yes or no",
                );
                None
            }
        }
    }

    /// The items of a list; a single value counts as a list of one.
    pub fn items(&self) -> Vec<At<'n>> {
        match self.node {
            Node::List(items) => items
                .iter()
                .enumerate()
                .map(|(index, node)| At::new(node, self.trail.then(Segment::Item(index))))
                .collect(),
            Node::Nothing => Vec::new(),
            _ => vec![self.clone()],
        }
    }

    /// The fields of a map, to be taken one by one. Complains about anything else, and about keys written twice.
    pub fn fields(&self, wanted: &str, complaints: &mut Complaints) -> Option<Fields<'n>> {
        let Node::Map(entries) = self.node else {
            complaints.add(
                &self.trail,
                format!("{} stands here", self.node.shown()),
                format!("write {wanted}"),
            );
            return None;
        };
        let mut left: Vec<(&'n str, &'n Node)> = Vec::with_capacity(entries.len());
        for (name, node) in entries {
            if left.iter().any(|(earlier, _)| *earlier == name) {
                let trail = self.trail.then(Segment::Again(name.clone()));
                complaints.add(
                    &trail,
                    format!("`{name}` is written twice"),
                    "keep one of the two",
                );
            } else {
                left.push((name, node));
            }
        }
        Some(Fields {
            trail: self.trail.clone(),
            left,
            asked: Vec::new(),
        })
    }
}

/// The fields of one map. `take` each known one, then `finish`, which complains about the rest.
pub struct Fields<'n> {
    pub trail: Trail,
    left: Vec<(&'n str, &'n Node)>,
    asked: Vec<&'static str>,
}

impl<'n> Fields<'n> {
    /// No fields at all: what stands for a song that says nothing.
    pub fn none(trail: Trail) -> Fields<'n> {
        Fields {
            trail,
            left: Vec::new(),
            asked: Vec::new(),
        }
    }

    /// Whether nothing is left.
    pub fn is_empty(&self) -> bool {
        self.left.is_empty()
    }

    /// The field of that name, if written. A field with nothing behind it counts as not written.
    pub fn take(&mut self, name: &'static str) -> Option<At<'n>> {
        self.asked.push(name);
        let place = self.left.iter().position(|(written, _)| *written == name)?;
        let (written, node) = self.left.remove(place);
        if *node == Node::Nothing {
            return None;
        }
        Some(At::new(
            node,
            self.trail.then(Segment::Key(written.to_string())),
        ))
    }

    /// Whether a field of that name is left.
    pub fn has(&self, name: &str) -> bool {
        self.left.iter().any(|(written, _)| *written == name)
    }

    /// Everything left, with names of the player's own choosing.
    pub fn take_all(&mut self) -> Vec<(String, At<'n>)> {
        self.left
            .drain(..)
            .map(|(name, node)| {
                (
                    name.to_string(),
                    At::new(node, self.trail.then(Segment::Key(name.to_string()))),
                )
            })
            .collect()
    }

    /// Complains about every field that was not taken, with the nearest known name.
    pub fn finish(self, complaints: &mut Complaints) {
        for (name, node) in &self.left {
            let trail = self.trail.then(Segment::Name(name.to_string()));
            if let Some((wrong, right)) = super::slips::unknown_key(name, node, &self.asked) {
                complaints.add(&trail, wrong, right);
                continue;
            }
            let right = match nearest(name, &self.asked) {
                Some(known) => format!("did you mean `{known}`?"),
                None => format!("known here: {}", self.asked.join(", ")),
            };
            complaints.add(&trail, format!("`{name}` is not known here"), right);
        }
    }
}

/// `08`: digits with a nought before them.
fn is_padded(text: &str) -> bool {
    let digits = text.bytes().all(|b| b.is_ascii_digit());
    digits && text.starts_with('0') && !text.trim_start_matches('0').is_empty()
}

/// The known word most like `word`, if it is like any: at most a third of its letters differ.
pub fn nearest<'w>(word: &str, known: &[&'w str]) -> Option<&'w str> {
    known
        .iter()
        .map(|candidate| (edits(word, candidate), *candidate))
        .filter(|(edits, candidate)| *edits * 3 <= candidate.len().max(3))
        .min_by_key(|(edits, _)| *edits)
        .map(|(_, candidate)| candidate)
}

/// Insertions, deletions and changes that turn one word into another.
fn edits(from: &str, to: &str) -> usize {
    let to: Vec<char> = to.chars().collect();
    let mut row: Vec<usize> = (0..=to.len()).collect();
    for (i, a) in from.chars().enumerate() {
        let mut corner = row[0];
        row[0] = i + 1;
        for (j, b) in to.iter().enumerate() {
            let change = corner + (a != *b) as usize;
            corner = row[j + 1];
            row[j + 1] = change.min(row[j] + 1).min(corner + 1);
        }
    }
    row[to.len()]
}

impl<'de> Deserialize<'de> for Node {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Node, D::Error> {
        deserializer.deserialize_any(Tree)
    }
}

struct Tree;

impl<'de> Visitor<'de> for Tree {
    type Value = Node;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a YAML value")
    }

    fn visit_bool<E>(self, flag: bool) -> Result<Node, E> {
        Ok(Node::Flag(flag))
    }

    fn visit_i64<E>(self, number: i64) -> Result<Node, E> {
        Ok(Node::Number(number.to_string()))
    }

    fn visit_u64<E>(self, number: u64) -> Result<Node, E> {
        Ok(Node::Number(number.to_string()))
    }

    fn visit_f64<E>(self, number: f64) -> Result<Node, E> {
        Ok(Node::Number(number.to_string()))
    }

    fn visit_str<E>(self, text: &str) -> Result<Node, E> {
        Ok(Node::Text(text.to_string()))
    }

    fn visit_unit<E>(self) -> Result<Node, E> {
        Ok(Node::Nothing)
    }

    fn visit_none<E>(self) -> Result<Node, E> {
        Ok(Node::Nothing)
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<Node, A::Error> {
        let mut list = Vec::new();
        while let Some(item) = items.next_element()? {
            list.push(item);
        }
        Ok(Node::List(list))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut entries: A) -> Result<Node, A::Error> {
        let mut map = Vec::new();
        while let Some(entry) = entries.next_entry::<Scalar, Node>()? {
            map.push((entry.0.0, entry.1));
        }
        Ok(Node::Map(map))
    }
}

/// A map key as typed: `1812` and `no` are as good a title as any.
struct Scalar(String);

impl<'de> Deserialize<'de> for Scalar {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Scalar, D::Error> {
        String::deserialize(deserializer).map(Scalar)
    }
}

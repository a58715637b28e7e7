//! Common slips, each in words of its own: where YAML itself stumbles, and where it reads something nobody meant.

use super::complaint::{Complaints, Segment, Trail};
use super::cuts::cuts;
use super::node::Node;
use super::yaml_errors;

/// Reads a text into a tree. Complains and gives `None` if there is none; complains and mends where it is plain what
/// was meant, so that checking can go on.
pub fn read_tree(file: usize, text: &str, complaints: &mut Complaints) -> Option<Node> {
    let cuts = cuts(text);
    for cut in &cuts {
        let (wrong, right) = match cut.note {
            true => (
                format!(
                    "the space before # cuts this note: only `{}` is read",
                    cut.read
                ),
                format!("write `{}` without the space", cut.meant),
            ),
            false => (
                format!("a space and # begin a comment: only `{}` is read", cut.read),
                format!("put it in quotes: \"{}\"", cut.meant),
            ),
        };
        complaints.add_place(file, (cut.line, cut.column), wrong, right);
        complaints.settle(file, cut.line);
    }
    match serde_yaml::from_str::<Node>(text) {
        Ok(Node::Nothing) => {
            complaints.add_place(file, (1, 1), "this file is empty", SMALLEST);
            None
        }
        Ok(mut tree) => {
            mend(&mut tree, &Trail::root(file), complaints);
            Some(tree)
        }
        Err(error) => {
            let (place, wrong, right) = yaml_errors::explain(text, &error);
            // What ` #` cut off is most often what YAML then misses.
            if !cuts.iter().any(|cut| cut.line <= place.0) {
                complaints.add_place(file, place, wrong, right);
            }
            None
        }
    }
}

const SMALLEST: &str = "the smallest stage file is `stage: First light` and, below it, \
                        `set: [{song: Lantern hymn, tuning: quarter-comma-meantone}]`";

/// A comma inside a value between braces ends it, and the rest becomes a key with nothing behind it: `{E: 701,955 c}`,
/// `{song: Lantern, the hymn}`. Complains and joins the two again.
fn mend(node: &mut Node, trail: &Trail, complaints: &mut Complaints) {
    match node {
        Node::Map(entries) => {
            for index in (1..entries.len()).rev() {
                let (before, from_here) = entries.split_at_mut(index);
                let (key, value) = &mut before[index - 1];
                let Some((joined, wrong, right)) = rejoin(key, value, &from_here[0]) else {
                    continue;
                };
                let name = from_here[0].0.clone();
                complaints.add(&trail.then(Segment::Name(name)), wrong, right);
                *value = Node::Text(joined);
                entries.remove(index);
            }
            for (key, value) in entries {
                mend(value, &trail.then(Segment::Key(key.clone())), complaints);
            }
        }
        Node::List(items) => {
            for (index, item) in items.iter_mut().enumerate() {
                mend(item, &trail.then(Segment::Item(index)), complaints);
            }
        }
        _ => {}
    }
}

fn rejoin(key: &str, value: &Node, rest: &(String, Node)) -> Option<(String, String, String)> {
    let (Node::Text(start) | Node::Number(start), (end, Node::Nothing)) = (value, rest) else {
        return None;
    };
    let digit = |c: Option<char>| c.is_some_and(|c| c.is_ascii_digit());
    if digit(start.chars().next_back()) && digit(end.chars().next()) {
        let joined = format!("{start}.{end}");
        let right = format!("write the decimals after a point: {key}: {joined}");
        return Some((
            joined,
            String::from("a comma ends the number before it"),
            right,
        ));
    }
    // Keys of the language are small letters in one word, so this is part of a title.
    let part_of_title = end.contains(' ') || end.chars().any(|c| c.is_uppercase());
    part_of_title.then(|| {
        let joined = format!("{start}, {end}");
        let wrong = String::from("a comma between braces ends the text before it");
        let right = format!("put the text in quotes: {key}: \"{joined}\"");
        (joined, wrong, right)
    })
}

/// For an unknown key: words of its own, if it is one of the common slips.
pub fn unknown_key(name: &str, value: &Node, known: &[&str]) -> Option<(String, String)> {
    const MEANT: [(&str, &str); 11] = [
        ("on", "when"),
        ("then", "do"),
        ("action", "do"),
        ("title", "song"),
        ("temperament", "tuning"),
        ("key", "in"),
        ("chan", "channel"),
        ("name", "stage"),
        ("reference", "pitch"),
        ("split", "keys"),
        ("range", "keys"),
    ];
    let meant = MEANT
        .iter()
        .find(|(slip, right)| *slip == name && known.contains(right));
    if let Some((_, right)) = meant {
        return Some((
            format!("`{name}:` is not known here"),
            format!("the word is `{right}:`"),
        ));
    }
    if ["also", "turns"].contains(&name) && known.contains(&"tuning") {
        return Some((
            format!("`{name}` belongs to a tuning, not to a song"),
            String::from("write it under `tunings:`, beside the notes it is about"),
        ));
    }
    if *value != Node::Nothing {
        return None;
    }
    if let Some((key, rest)) = name.split_once(':')
        && known.contains(&key)
    {
        return Some((
            format!("`{name}` has no space after its colon, so it is one word"),
            format!("write `{key}: {}`", rest.trim()),
        ));
    }
    None
}

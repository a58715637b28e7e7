//! The small things that stand behind keys: words of a closed list, keys, channels, frequencies.
//!
//! Each complains for itself and gives nothing back, so that reading goes on.

use super::complaint::Complaints;
use super::expression::Expression;
use super::node::{At, nearest};
use crate::engine::plan::{ChannelSet, Values};
use crate::pitch::Interval;
use crate::tuning::{Key, Letter};

/// One word of a closed list.
pub fn choice<T: Copy>(at: &At<'_>, words: &[(&str, T)], complaints: &mut Complaints) -> Option<T> {
    let names: Vec<&str> = words.iter().map(|(name, _)| *name).collect();
    let typed = at.text(&one_of(&names), complaints)?;
    let found = words.iter().find(|(name, _)| *name == typed);
    if found.is_none() {
        let right = match nearest(&typed, &names) {
            Some(near) => format!("did you mean `{near}`? Known here: {}", names.join(", ")),
            None => format!("write {}", one_of(&names)),
        };
        complaints.add(&at.trail, format!("`{typed}` is not known here"), right);
    }
    found.map(|(_, value)| *value)
}

/// `a, b or c`.
pub fn one_of(names: &[&str]) -> String {
    match names {
        [] => String::from("nothing"),
        [only] => (*only).to_string(),
        [most @ .., last] => format!("{} or {last}", most.join(", ")),
    }
}

/// A key name with its octave.
pub fn key(at: &At<'_>, complaints: &mut Complaints) -> Option<Key> {
    let text = at.text("a key with its octave, such as C4", complaints)?;
    let key = Key::parse(&text);
    if key.is_none() {
        complaints.add(
            &at.trail,
            format!("`{text}` is not a key"),
            key_remedy(&text),
        );
    }
    key
}

/// How a misspelt key should have been written.
pub fn key_remedy(text: &str) -> String {
    if let Some(letter) = Letter::parse(text) {
        return format!("say which octave: {letter}4 is the one at middle C");
    }
    if let Ok(number) = text.parse::<u8>()
        && let Some(key) = Key::new(number)
    {
        return format!("write its name: key {number} is {key}");
    }
    let mut raised = text.to_string();
    if let Some(first) = raised.get_mut(..1) {
        first.make_ascii_uppercase();
    }
    match Key::parse(&raised) {
        Some(_) => format!("key names begin with a capital: {raised}"),
        None => String::from(
            "write a letter, # or b if it has one, and the octave, from C-1 to G9; middle C is C4",
        ),
    }
}

/// A key name without octave.
pub fn letter(at: &At<'_>, complaints: &mut Complaints) -> Option<Letter> {
    let text = at.text("a key without octave, such as D or Eb", complaints)?;
    let letter = Letter::parse(&text);
    if letter.is_none() {
        complaints.add(
            &at.trail,
            format!("`{text}` is not the name of a key"),
            letter_remedy(&text),
        );
    }
    letter
}

/// How a misspelt letter should have been written.
pub fn letter_remedy(text: &str) -> String {
    if let Some(letter) = text
        .find(|c: char| c.is_ascii_digit() || c == '-')
        .and_then(|split| Letter::parse(&text[..split]))
    {
        return format!("leave the octave out: {letter}");
    }
    let mut raised = text.to_string();
    if let Some(first) = raised.get_mut(..1) {
        first.make_ascii_uppercase();
    }
    match Letter::parse(&raised) {
        Some(letter) => format!("key names begin with a capital: {letter}"),
        None => String::from("write a letter from A to G, with # or b if it has one: C, F#, Eb"),
    }
}

/// `C2..B3`, `C2..`, `..B3`, or one key.
pub fn key_range(at: &At<'_>, complaints: &mut Complaints) -> Option<(Key, Key)> {
    let text = at.text("a range of keys such as C2..B3", complaints)?;
    let Some((low, high)) = text.split_once("..") else {
        return one_key_or_range(at, &text, complaints);
    };
    let end = |name: &str, open: Key| match name.trim() {
        "" => Some(open),
        name => Key::parse(name),
    };
    let lowest = end(low, Key::all().next()?);
    let highest = end(high, Key::all().next_back()?);
    let (Some(low_key), Some(high_key)) = (lowest, highest) else {
        let bad = if lowest.is_none() { low } else { high }.trim();
        complaints.add(
            &at.trail,
            format!("`{bad}` in `{text}` is not a key"),
            key_remedy(bad),
        );
        return None;
    };
    if low_key > high_key {
        complaints.add(
            &at.trail,
            format!("`{text}` runs downwards"),
            format!("write the lower key first: {high_key}..{low_key}"),
        );
        return None;
    }
    Some((low_key, high_key))
}

fn one_key_or_range(at: &At<'_>, text: &str, complaints: &mut Complaints) -> Option<(Key, Key)> {
    if let Some(key) = Key::parse(text) {
        return Some((key, key));
    }
    let right = match text.split_once('-') {
        Some((low, high)) if Key::parse(low.trim()).is_some() => {
            format!("two dots stand between: {}..{}", low.trim(), high.trim())
        }
        _ => String::from("write the lowest and the highest key: C2..B3"),
    };
    complaints.add(&at.trail, format!("`{text}` is not a range of keys"), right);
    None
}

/// `40..80`, `90..`, `..63`, or one number, all from 0 to 127.
pub fn values(at: &At<'_>, complaints: &mut Complaints) -> Option<Values> {
    let text = at.text("values such as 40..80", complaints)?;
    let end = |text: &str, open: Option<u8>| match (text.trim(), open) {
        ("", open) => open,
        (text, _) => text.parse().ok().filter(|value| *value <= 127),
    };
    let ends = match text.split_once("..") {
        Some((first, last)) => end(first, Some(0)).zip(end(last, Some(127))),
        None => end(&text, None).map(|value| (value, value)),
    };
    let (wrong, right) = match ends {
        None => (
            format!("`{text}` names no values"),
            String::from("values are 0 to 127: write 3, 40..80, 90.. or ..63"),
        ),
        Some((first, last)) if first > last => (
            format!("`{text}` runs downwards"),
            format!("write the lower value first: {last}..{first}"),
        ),
        Some((0, 127)) => (
            format!("`{text}` takes in every value, so nothing ever comes into it"),
            String::from("leave some out, as in 64.."),
        ),
        Some((first, last)) => return Some(Values { first, last }),
    };
    complaints.add(&at.trail, wrong, right);
    None
}

/// `3`, `1-4`, or a list of those; people count channels from 1.
pub fn channels(at: &At<'_>, complaints: &mut Complaints) -> Option<ChannelSet> {
    let mut set = ChannelSet::NONE;
    let mut good = true;
    for item in at.items() {
        let text = item.text("channels such as 1-16, 3 or [1, 2, 5]", complaints)?;
        let (low, high) = text.split_once('-').unwrap_or((&text, &text));
        let number = |text: &str| text.trim().parse::<u8>().ok();
        match (number(low), number(high)) {
            (Some(low), Some(high)) if 1 <= low && low <= high && high <= 16 => {
                set = (low..=high).fold(set, |set, channel| set.with(channel - 1));
            }
            _ => {
                good = false;
                complaints.add(
                    &item.trail,
                    format!("`{text}` is not a channel"),
                    "channels are 1 to 16: write 3, 1-4 or [1, 2, 5]",
                );
            }
        }
    }
    good.then_some(set)
}

/// `1-4, 9` for people.
pub fn spell_channels(set: ChannelSet) -> String {
    let mut runs: Vec<(u8, u8)> = Vec::new();
    for channel in set.iter().map(|channel| channel + 1) {
        match runs.last_mut() {
            Some((_, last)) if *last + 1 == channel => *last = channel,
            _ => runs.push((channel, channel)),
        }
    }
    let spelt: Vec<String> = runs
        .iter()
        .map(|(first, last)| match first == last {
            true => first.to_string(),
            false => format!("{first}-{last}"),
        })
        .collect();
    match spelt.is_empty() {
        true => String::from("none"),
        false => spelt.join(", "),
    }
}

/// A pitch expression that is a distance: `-50 c`, `3/2`, `narrow 1/4 syntonic`.
pub fn interval(at: &At<'_>, complaints: &mut Complaints) -> Option<Interval> {
    let text = at.text("a distance such as -50 c", complaints)?;
    match Expression::distance(&text) {
        Ok(log) => Some(log.interval()),
        Err(mistake) => {
            complaints.add(&at.trail, mistake.wrong, mistake.right);
            None
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn channels_are_spelt_as_people_write_them() {
        assert_eq!(spell_channels(ChannelSet(0b1000_0000_0000_1111)), "1-4, 16");
        assert_eq!(spell_channels(ChannelSet::NONE), "none");
    }
}

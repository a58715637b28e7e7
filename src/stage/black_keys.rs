//! `black_keys`: what the black keys are called, and over a chain of fifths which place each begins at.

use super::complaint::Complaints;
use super::node::{At, Node};
use super::tunings::TuningText;
use crate::engine::plan::TwoNames;
use crate::pitch::{Interval, Log};
use crate::tuning::{Letter, Scale};

/// Reads the list, and gives each key its first name and what goes with it. Back come those with two names, by pitch class.
pub fn read(
    at: &At<'_>,
    scale: &mut Scale,
    turned_to: Option<Letter>,
    complaints: &mut Complaints,
) -> [Option<TwoNames>; 12] {
    let mut two_names = [None; 12];
    let mut seen = [false; 12];
    for item in at.items() {
        let Some((first, second)) = names_of(&item, complaints) else {
            continue;
        };
        if std::mem::replace(&mut seen[first.pitch_class() as usize], true) {
            complaints.add(
                &item.trail,
                format!("the key {first} stands here twice"),
                "name each black key once, and both its names together: `G# or Ab`",
            );
            continue;
        }
        let mut apart = Log::ZERO;
        if let Scale::ByLetter(by_letter) = scale {
            // Names are those of the keys as turned, the scale is not turned yet.
            let home = by_letter.names[by_letter.home as usize];
            let along = turned_to.map_or(0, |letter| letter.place() - home.place());
            let unturned = |name: Letter| Letter::on_line(name.place() - along);
            if let Some(name) = unturned(first) {
                *by_letter = by_letter.renamed(name);
                let second_place = second
                    .and_then(unturned)
                    .and_then(|name| by_letter.place_of_name(name));
                let first_place = by_letter.places[name.pitch_class() as usize];
                apart = second_place
                    .zip(first_place)
                    .map_or(Log::ZERO, |(second, first)| second - first);
            }
        }
        two_names[first.pitch_class() as usize] = second.map(|second| TwoNames {
            first,
            second,
            apart: apart.interval(),
        });
    }
    two_names
}

/// `by_chord: yes` needs a key that can be two pitches.
pub fn check_choice(
    at: &At<'_>,
    two_names: &[Option<TwoNames>; 12],
    tuning: &TuningText,
    complaints: &mut Complaints,
) {
    let mut named = two_names.iter().flatten();
    if named.any(|names| names.apart != Interval::ZERO) {
        return;
    }
    let Some(names) = two_names.iter().flatten().next() else {
        complaints.add(
            &at.trail,
            "no black key has two names for the harmony to choose from",
            "give each key that may be chosen both of them, as in `black_keys: [G# or Ab, Eb or D#]`, or leave \
             `by_chord` out",
        );
        return;
    };
    complaints.add(
        &at.trail,
        format!(
            "there is nothing to choose: {} and {} are one pitch in {}",
            names.first, names.second, tuning.name
        ),
        "take a tuning by fifths that are all alike, such as quarter-comma-meantone, or one whose chain has both names, \
         or leave `by_chord` out",
    );
}

/// Over a scale from the tonic the list only says what the keys are called.
pub fn call(at: &At<'_>, names: &mut [Letter; 12]) {
    let Node::List(items) = at.node else {
        return;
    };
    for item in items {
        if let Node::Text(text) = item
            && let Some(name) = text.split(" or ").next().and_then(Letter::parse)
        {
            names[name.pitch_class() as usize] = name;
        }
    }
}

/// `C#`, or `G# or Ab`.
fn names_of(item: &At<'_>, complaints: &mut Complaints) -> Option<(Letter, Option<Letter>)> {
    let text = item.text("a black key such as C#, or G# or Ab", complaints)?;
    let parts: Vec<&str> = text.split(" or ").map(str::trim).collect();
    let letters: Option<Vec<Letter>> = parts.iter().map(|part| Letter::parse(part)).collect();
    let wrong = match letters.as_deref() {
        None => format!("`{text}` is not a black key"),
        Some([letter, ..]) if !is_black(*letter) => format!("{letter} is a white key"),
        Some([first]) => return Some((*first, None)),
        Some([first, second]) if first == second => format!("`{text}` says one name twice"),
        Some([first, second]) if first.pitch_class() == second.pitch_class() => {
            return Some((*first, Some(*second)));
        }
        Some([first, second]) => format!("{first} and {second} are two keys"),
        Some(_) => format!("`{text}` has more than two names"),
    };
    complaints.add(
        &item.trail,
        wrong,
        "write one of the five black keys, as C# or Db, or both its names: `C# or Db`",
    );
    None
}

/// Whether a name falls on one of the five black keys.
pub fn is_black(letter: Letter) -> bool {
    [1, 3, 6, 8, 10].contains(&letter.pitch_class())
}

//! `black_keys`: what the black keys are called, and over a chain of fifths which place each begins at.

use super::advice::Findings;
use super::complaint::Complaints;
use super::node::At;
use super::placing::turn;
use crate::pitch::{Interval, Log};
use crate::tuning::{ByLetter, Letter, Scale};

/// Reads the list and moves each key to its first name.
pub fn read(
    at: &At<'_>,
    scale: &mut Scale,
    turned_to: Option<Letter>,
    names: &mut [Letter; 12],
    found: &mut Findings,
) {
    let mut seen = [false; 12];
    for item in at.items() {
        let Some((first, second)) = names_of(&item, &mut found.complaints) else {
            continue;
        };
        let pitch_class = first.pitch_class() as usize;
        if std::mem::replace(&mut seen[pitch_class], true) {
            found.complaints.add(
                &item.trail,
                format!("the key {first} stands here twice"),
                "name each black key once; two names of one key are written `G# or Ab`",
            );
            continue;
        }
        names[pitch_class] = first;
        if let Scale::ByLetter(by_letter) = scale {
            move_to(by_letter, first, turned_to);
        }
        if second.is_some() {
            found.not_played("`black_keys` with two names, flipped while playing,");
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
        Some([letter, ..]) if ![1, 3, 6, 8, 10].contains(&letter.pitch_class()) => {
            format!("{letter} is a white key")
        }
        Some([first]) => return Some((*first, None)),
        Some([first, second]) if first.pitch_class() == second.pitch_class() && first != second => {
            return Some((*first, Some(*second)));
        }
        Some([first, second]) if first == second => format!("`{text}` says one name twice"),
        Some([first, second]) => format!("{first} and {second} are two keys"),
        Some(_) => format!("`{text}` has more than two names"),
    };
    complaints.add(
        &item.trail,
        wrong,
        "write one of the five black keys, as C# or Db, or both its names: C# or Db",
    );
    None
}

/// Over a chain of fifths, the key takes the place of this name, also beyond the end of the chain, by its last fifth.
fn move_to(by_letter: &mut ByLetter, name: Letter, turned_to: Option<Letter>) {
    let by = turn(by_letter, turned_to);
    let Some(name) = Letter::on_line(name.place() - by) else {
        return;
    };
    let Some(place) = on_chain(&by_letter.chain, name) else {
        return;
    };
    let pitch_class = name.pitch_class();
    by_letter.places[pitch_class as usize] = Some(near_key(place, pitch_class));
    by_letter.names[pitch_class as usize] = name;
}

fn on_chain(chain: &[(Letter, Log)], name: Letter) -> Option<Log> {
    if let Some((_, place)) = chain.iter().find(|(letter, _)| *letter == name) {
        return Some(*place);
    }
    let at = |place: i8| {
        let (_, log) = chain.iter().find(|(letter, _)| letter.place() == place)?;
        Some(*log)
    };
    let low = chain.iter().map(|(letter, _)| letter.place()).min()?;
    let high = chain.iter().map(|(letter, _)| letter.place()).max()?;
    let (end, before) = if name.place() > high {
        (high, high - 1)
    } else {
        (low, low + 1)
    };
    let step = at(end)? - at(before)?;
    Some(at(end)? + step.times(i64::from((name.place() - end).abs())))
}

/// The same place, by octaves as near as can be to where the key stands in equal temperament.
fn near_key(mut place: Log, pitch_class: u8) -> Log {
    let key = Interval::SEMITONE * i64::from(pitch_class);
    let half = Interval::from_cents(600);
    while place.interval() - key > half {
        place = place - Log::OCTAVE;
    }
    while key - place.interval() > half {
        place = place + Log::OCTAVE;
    }
    place
}

//! Tunings by letter as written: `fifths` and `offsets`; names of keys.

use super::body::{distance_at, letter_at};
use crate::pitch::{Interval, Log};
use crate::stage::complaint::{Complaints, Segment};
use crate::stage::expression::Expression;
use crate::stage::node::{At, Fields, Node};
use crate::tuning::{ByLetter, Letter, near_key};

/// More tempering than this is a mistake, such as the size of the whole fifth.
const TEMPERED_MAX: Interval = Interval::from_cents(100);
/// A larger offset from equal is a mistake, such as a place above C.
const OFFSET_MAX: Interval = Interval::from_cents(300);

/// `fifths: {chain: [...], each: ..., alter: {C-G: ...}}`.
pub(super) fn fifths(at: &At<'_>, complaints: &mut Complaints) -> Option<ByLetter> {
    let mut fields = at.fields("chain, each and alter", complaints)?;
    let (chain, each, alter) = (
        fields.take("chain"),
        fields.take("each"),
        fields.take("alter"),
    );
    if chain.is_none() {
        let right =
            "write chain: [Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#], or another row of fifths";
        complaints.add(&at.trail, "the chain of fifths is missing", right);
    }
    fields.finish(complaints);

    let each = match &each {
        Some(at) => tempering(at, complaints),
        None => Some(Log::ZERO),
    };
    let names = chain.and_then(|at| chain_names(&at, complaints));
    let altered = alter.map(|at| {
        (
            at.fields(
                "fifths and their sizes, such as {C-G: narrow 1/4 pythagorean}",
                complaints,
            ),
            at,
        )
    });
    let (names, each) = (names?, each?);
    let mut sizes = vec![each; names.len() - 1];
    if let Some((fields, _)) = altered {
        for (fifth, at) in fields?.take_all() {
            let place = fifth_in_chain(&fifth, &names, &at, complaints);
            let size = tempering(&at, complaints);
            sizes[place?] = size?;
        }
    }
    Some(chained(&names, &sizes))
}

/// How far a fifth is from pure.
fn tempering(at: &At<'_>, complaints: &mut Complaints) -> Option<Log> {
    let from_pure = distance_at(at, complaints)?;
    if from_pure.interval().abs() > TEMPERED_MAX {
        let wrong = format!(
            "{:.3} c is more than a fifth is ever tempered",
            from_pure.interval().cents()
        );
        complaints.add(
            &at.trail,
            wrong,
            "say how far the fifth is from pure, such as narrow 1/4 syntonic",
        );
        return None;
    }
    Some(from_pure)
}

fn chain_names(at: &At<'_>, complaints: &mut Complaints) -> Option<Vec<Letter>> {
    let items = at.items();
    let mut names: Vec<Letter> = Vec::with_capacity(items.len());
    for item in &items {
        let name = letter_at(item, complaints)?;
        if let Some(last) = names.last() {
            let next = Letter::on_line(last.place() + 1);
            if next != Some(name) {
                let right = match next {
                    Some(next) => format!("the fifth above {last} is {next}"),
                    None => format!("end the chain at {last}"),
                };
                complaints.add(
                    &item.trail,
                    format!("{name} is not a fifth above {last}"),
                    right,
                );
                return None;
            }
        }
        names.push(name);
    }
    if names.len() < 12 {
        let wrong = format!("the chain names {} keys", names.len());
        complaints.add(
            &at.trail,
            wrong,
            "name at least twelve, so that every key is in it",
        );
        return None;
    }
    Some(names)
}

/// Which fifth of the chain `C-G` is.
fn fifth_in_chain(
    fifth: &str,
    names: &[Letter],
    at: &At<'_>,
    complaints: &mut Complaints,
) -> Option<usize> {
    let mut trail = at.trail.clone();
    trail.steps.pop();
    let trail = trail.then(Segment::Name(fifth.to_string()));
    let ends = fifth
        .split_once('-')
        .and_then(|(low, high)| Some((Letter::parse(low.trim())?, Letter::parse(high.trim())?)));
    let Some((low, high)) = ends else {
        complaints.add(
            &trail,
            format!("`{fifth}` is not a fifth"),
            "name its two keys, such as C-G",
        );
        return None;
    };
    let found = names.windows(2).position(|pair| pair == [low, high]);
    if found.is_none() {
        let (first, last) = (names[0], names[names.len() - 1]);
        let right = if names.windows(2).any(|pair| pair == [high, low]) {
            format!("write it as {high}-{low}, upwards")
        } else if (low, high) == (last, first) {
            "it closes the circle and takes what the others leave; alter those".to_string()
        } else {
            format!("the chain goes from {first} up to {last}, one fifth at a time")
        };
        complaints.add(
            &trail,
            format!("{low}-{high} is not a fifth of this chain"),
            right,
        );
    }
    found
}

/// Lays a chain of fifths out; `sizes` are distances from pure.
fn chained(names: &[Letter], sizes: &[Log]) -> ByLetter {
    let mut chain = vec![(names[0], Log::ZERO)];
    let mut sum = Log::ZERO;
    for (name, size) in names[1..].iter().zip(sizes) {
        sum = sum + Log::of_ratio(3, 2) + *size;
        chain.push((*name, sum));
    }
    // A key with two names begins with its usual one, if the chain has it.
    let name_of = |key: u8| {
        let mut of_key = names.iter().filter(|name| name.pitch_class() == key);
        let usual = Letter::usual(key);
        let first = *of_key
            .next()
            .expect("twelve fifths in a row name every key");
        if names.contains(&usual) { usual } else { first }
    };
    let key_names: [Letter; 12] = std::array::from_fn(|key| name_of(key as u8));
    let place_in = |chain: &[(Letter, Log)], wanted: Letter| {
        let found = chain.iter().find(|(name, _)| *name == wanted);
        found.expect("key names come from the chain").1
    };
    let zero = place_in(&chain, key_names[0]);
    for (name, place) in &mut chain {
        *place = near_key(*name, *place - zero);
    }
    ByLetter {
        places: key_names.map(|name| Some(place_in(&chain, name))),
        names: key_names,
        home: 0,
        chain,
    }
}

/// `offsets: {C: +5.9, ...}`: cents from equal; keys not named stand at equal.
pub(super) fn offsets(at: &At<'_>, complaints: &mut Complaints) -> Option<ByLetter> {
    let fields = at.fields(
        "keys and their cents from equal, such as {C: +5.9, E: -2}",
        complaints,
    );
    let entries = entries(fields, complaints)?;
    let mut scale = equal();
    let mut good = Some(());
    for (name, at) in entries {
        let Some(offset) = offset(&at, complaints) else {
            good = None;
            continue;
        };
        let key = name.pitch_class() as usize;
        scale.names[key] = name;
        scale.places[key] = scale.places[key].map(|place| place + offset);
    }
    good?;
    Some(scale.from_c())
}

fn offset(at: &At<'_>, complaints: &mut Complaints) -> Option<Log> {
    let offset = match at.node {
        // A bare number is cents here, as in every tuner's table.
        Node::Number(number) => match Expression::distance(&format!("{number} c")) {
            Ok(offset) => offset,
            Err(mistake) => {
                complaints.add(&at.trail, mistake.wrong, mistake.right);
                return None;
            }
        },
        _ => distance_at(at, complaints)?,
    };
    if offset.interval().abs() > OFFSET_MAX {
        let wrong = format!("{} c is too far from equal", offset.interval().cents());
        complaints.add(
            &at.trail,
            wrong,
            "offsets are from equal temperament; write places above C under `notes`",
        );
        return None;
    }
    Some(offset)
}

/// Equal temperament with the usual names.
pub(super) fn equal() -> ByLetter {
    ByLetter {
        places: std::array::from_fn(|key| Some(Log::OCTAVE.part(key as i64, 12))),
        names: std::array::from_fn(|key| Letter::usual(key as u8)),
        home: 0,
        chain: Vec::new(),
    }
}

/// The entries of a map whose names are keys of the keyboard: every bad name is complained about, and two names for
/// one key.
pub(super) fn entries<'n>(
    fields: Option<Fields<'n>>,
    complaints: &mut Complaints,
) -> Option<Vec<(Letter, At<'n>)>> {
    let mut fields = fields?;
    let map = fields.trail.clone();
    let mut entries: Vec<(Letter, At<'n>)> = Vec::new();
    let mut good = Some(());
    for (name, at) in fields.take_all() {
        let trail = map.then(Segment::Name(name.clone()));
        let Some(letter) = Letter::parse(&name) else {
            let (wrong, mut right) = not_a_letter(&name);
            if is_number(&name) && !at.is_nothing() {
                right = "keys go by their letters, not by a number: C, C#, Eb".to_string();
            }
            complaints.add(&trail, wrong, right);
            good = None;
            continue;
        };
        let same = |(other, _): &&(Letter, At<'n>)| other.pitch_class() == letter.pitch_class();
        if let Some((other, _)) = entries.iter().find(same) {
            let wrong = format!("{letter} is the same key as {other}, which stands here already");
            complaints.add(&trail, wrong, "keep one of the two");
            good = None;
            continue;
        }
        entries.push((letter, at));
    }
    good?;
    Some(entries)
}

fn is_number(text: &str) -> bool {
    !text.is_empty() && text.chars().all(|c| c.is_ascii_digit())
}

/// What to say about a name that is no key.
pub(super) fn not_a_letter(text: &str) -> (String, String) {
    let right = "keys are called C, C#, Eb and so on: A to G, with # or b";
    let mut chars = text.chars();
    let capital = chars
        .next()
        .map(|first| first.to_ascii_uppercase().to_string() + chars.as_str());
    let capital = capital.filter(|name| Letter::parse(name).is_some());
    let plain = text.trim_end_matches(|c: char| c.is_ascii_digit() || c == '-');
    if is_number(text) {
        (
            format!("`{text}` stands where a key belongs"),
            "decimals take a point, not a comma: 5.9".to_string(),
        )
    } else if let Some(capital) = capital {
        (
            format!("`{text}` is not a key"),
            format!("did you mean `{capital}`?"),
        )
    } else if Letter::parse(plain).is_some() {
        (
            format!("`{text}` has an octave"),
            format!("a letter stands for the key in every octave: `{plain}`"),
        )
    } else {
        (format!("`{text}` is not a key"), right.to_string())
    }
}

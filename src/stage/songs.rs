//! Songs: the book, and tonight's set.

use super::advice::Findings;
use super::complaint::{Complaints, Trail};
use super::node::{At, Fields, Node, nearest};
use super::placing;
use super::rig::Rig;
use super::told::Told;
use super::tunings::{Library, Reference, TuningText};
use super::{Song, defaults, intonation};
use super::{inflections, parts, sends};
use crate::engine::plan::{ByHand, SongPlan};
use crate::intonation::Method;
use crate::limits::SONGS_MAX;
use crate::tuning::{Letter, Placement, Scale, Tuning};
use std::rc::Rc;
use std::sync::Arc;

/// A song for people and the same song for the engine.
#[derive(Clone)]
pub struct Entry {
    pub song: Song,
    pub plan: SongPlan,
}

/// What songs are read against: the rig, the tunings, and what the evening says for all of them.
pub struct Desk<'d, 'n> {
    pub rig: &'d Rig,
    pub tunings: &'d mut Library<'n>,
    pub pitch: Option<Reference>,
    pub programs_from: u8,
    pub found: &'d mut Findings,
    /// Tunings already put somewhere, shared by the songs that put them there again.
    pub placed: Vec<(Scale, Placement, Arc<Tuning>)>,
    /// Likewise what can be changed of a tuning by hand.
    pub by_hand: Vec<Arc<ByHand>>,
    /// What of it can be told by name.
    pub told: Told,
    /// The titles of the set in their order, also of songs that are written wrong.
    pub titles: Vec<String>,
    /// `songs` could not be read, so nobody knows which titles it has.
    pub book_is_lost: bool,
}

/// Tonight's songs in their order.
pub fn read(
    book: Option<&At<'_>>,
    set: Option<&At<'_>>,
    top: &At<'_>,
    desk: &mut Desk<'_, '_>,
) -> Vec<Entry> {
    let mut entries: Vec<(String, Option<Entry>)> = Vec::new();
    if let Some(at) = book {
        let wanted = "songs by title, as in `Lantern hymn: {tuning: vallotti}`";
        let songs = at.fields(wanted, &mut desk.found.complaints);
        desk.book_is_lost = songs.is_none();
        for (title, at) in songs.map(|mut songs| songs.take_all()).unwrap_or_default() {
            let entry = book_song(&title, &at, desk);
            entries.push((title, entry));
        }
    }
    let Some(set) = set else {
        if entries.is_empty() {
            desk.found.complaints.add(
                &top.trail,
                "there is no song",
                "write a set, as in `set: [{song: Lantern hymn, tuning: quarter-comma-meantone}]`",
            );
        }
        let place = book.map_or(&top.trail, |at| &at.trail);
        too_many(entries.len(), place, desk);
        desk.titles = entries.iter().map(|(title, _)| title.clone()).collect();
        return entries.into_iter().filter_map(|(_, entry)| entry).collect();
    };
    tonight(set, &entries, desk)
}

/// The songs of the set in their order.
fn tonight(set: &At<'_>, book: &[(String, Option<Entry>)], desk: &mut Desk<'_, '_>) -> Vec<Entry> {
    if let Node::Map(entries) = set.node
        && entries
            .iter()
            .all(|(key, _)| !SONG_KEYS.contains(&key.as_str()))
    {
        desk.found.complaints.add(
            &set.trail,
            "these are songs by title, and a set is the order in which they come",
            "write them under `songs:`; without `set` they are played in that order",
        );
        return Vec::new();
    }
    let items = set.items();
    if items.is_empty() {
        desk.found.complaints.add(
            &set.trail,
            "the set is empty",
            "name at least one song, or leave `set` out to play the book in its order",
        );
    }
    if let Some(first_too_many) = items.get(SONGS_MAX) {
        too_many(items.len(), &first_too_many.trail, desk);
    }
    let mut tonight = Vec::new();
    let mut whole: Vec<String> = Vec::new();
    for (index, item) in items.iter().enumerate().take(SONGS_MAX) {
        let entry = match item.node {
            Node::Map(_) => set_song(item, book, &mut whole, desk),
            _ => titled(item, &items, index, book, desk),
        };
        tonight.extend(entry);
    }
    tonight
}

fn too_many(count: usize, place: &Trail, desk: &mut Desk<'_, '_>) {
    if count > SONGS_MAX {
        desk.found.complaints.add(
            place,
            format!("there are {count} songs tonight"),
            format!("a set holds at most {SONGS_MAX}"),
        );
    }
}

fn book_song(title: &str, at: &At<'_>, desk: &mut Desk<'_, '_>) -> Option<Entry> {
    if at.is_nothing() {
        return song(title, at, None, desk);
    }
    let wanted = "a map such as `{tuning: quarter-comma-meantone, in: D minor}`";
    let fields = at.fields(wanted, &mut desk.found.complaints)?;
    song(title, at, Some(fields), desk)
}

/// A song that stands whole in the set, or `{song: Title}` for one of the book.
fn set_song(
    at: &At<'_>,
    book: &[(String, Option<Entry>)],
    whole: &mut Vec<String>,
    desk: &mut Desk<'_, '_>,
) -> Option<Entry> {
    let complaints = &mut desk.found.complaints;
    if let Some((wrong, right)) = title_as_key(at.node) {
        complaints.add(&at.trail, wrong, right);
        return None;
    }
    let mut fields = at.fields(
        "a title, or a map such as `{song: Title, tuning: vallotti}`",
        complaints,
    )?;
    let Some(title_at) = fields.take("song") else {
        if !fields.has("title") {
            complaints.add(
                &at.trail,
                "this song has no title",
                "begin it with its title: {song: Lantern hymn, ...}",
            );
        }
        song("", at, Some(fields), desk);
        return None;
    };
    let title = title_at.text("a title", complaints)?;
    desk.titles.push(title.clone());
    let known = book.iter().find(|(known, _)| *known == title);
    if let Some((_, entry)) = known {
        if fields.is_empty() {
            return entry.clone();
        }
        complaints.add(
            &title_at.trail,
            format!("`{title}` is in the book already"),
            "write only its title here, or give this song another one",
        );
        return None;
    }
    if whole.contains(&title) {
        complaints.add(
            &title_at.trail,
            format!("`{title}` stands in the set twice with settings of its own"),
            "write it once under `songs:` and only its title here",
        );
        return None;
    }
    whole.push(title.clone());
    song(&title, at, Some(fields), desk)
}

/// A song whose title has become a key: by a colon in it, or because its settings hang on it.
fn title_as_key(node: &Node) -> Option<(String, String)> {
    let Node::Map(entries) = node else {
        return None;
    };
    match entries.as_slice() {
        [(start, _)] if SONG_KEYS.contains(&start.as_str()) => None,
        [(start, Node::Text(end) | Node::Number(end))] => Some((
            format!("the colon in this title makes it a key with a value: `{start}: {end}`"),
            format!("put the title in quotes: \"{start}: {end}\""),
        )),
        [(title, Node::Map(_))] => Some((
            String::from("a song of the set does not hang on its title"),
            format!("write {{song: {title}, tuning: ...}}, or put it under `songs:`"),
        )),
        _ => None,
    }
}

/// A title of the book.
fn titled(
    at: &At<'_>,
    items: &[At<'_>],
    index: usize,
    book: &[(String, Option<Entry>)],
    desk: &mut Desk<'_, '_>,
) -> Option<Entry> {
    let complaints = &mut desk.found.complaints;
    let title = at.text(
        "a title, or a map such as `{song: Title, tuning: vallotti}`",
        complaints,
    )?;
    desk.titles.push(title.clone());
    if let Some((_, entry)) = book.iter().find(|(known, _)| same_title(known, &title)) {
        return entry.clone();
    }
    // A comma inside a title between brackets has made two of it.
    let joined = |first: &At<'_>, second: &At<'_>| match (first.node, second.node) {
        (Node::Text(first), Node::Text(second)) => Some(format!("{first}, {second}")),
        _ => None,
    };
    let in_book = |title: &String| book.iter().any(|(known, _)| known == title);
    if let Some(before) = index.checked_sub(1).and_then(|before| items.get(before))
        && joined(before, at).as_ref().is_some_and(in_book)
    {
        return None; // complained about with the title before
    }
    let whole = items
        .get(index + 1)
        .and_then(|next| joined(at, next))
        .filter(in_book);
    if let Some(whole) = whole {
        complaints.add(
            &at.trail,
            "a comma between brackets ends the title before it",
            format!("put the title in quotes: \"{whole}\""),
        );
        return None;
    }
    if desk.book_is_lost {
        return None;
    }
    let titles: Vec<&str> = book.iter().map(|(title, _)| title.as_str()).collect();
    let numbered = title
        .parse()
        .ok()
        .and_then(|n: usize| titles.get(n.checked_sub(1)?));
    let right = match (nearest(&title, &titles), numbered) {
        (Some(near), _) => format!("did you mean `{near}`?"),
        (None, Some(titled)) => format!("a set goes by titles: {titled}"),
        (None, None) => {
            format!("add it under `songs:`, or write it whole: {{song: {title}, tuning: ...}}")
        }
    };
    complaints.add(&at.trail, format!("no song is called `{title}`"), right);
    None
}

/// The same title, also where YAML has shortened a number (`1.50`) in one of the two places.
fn same_title(known: &str, title: &str) -> bool {
    let number = |text: &str| text.parse::<f64>().ok();
    known == title || number(known).is_some_and(|known| number(title) == Some(known))
}

const SONG_KEYS: [&str; 14] = [
    "song",
    "title",
    "tuning",
    "in",
    "pitch",
    "tonic",
    "turned_to",
    "black_keys",
    "transpose",
    "parts",
    "intonation",
    "begin_with",
    "by_line",
    "send",
];

/// Everything a song says. `fields` is `None` for a song that says nothing.
fn song(
    title: &str,
    at: &At<'_>,
    fields: Option<Fields<'_>>,
    desk: &mut Desk<'_, '_>,
) -> Option<Entry> {
    let mut fields = fields.unwrap_or_else(|| Fields::none(at.trail.clone()));
    let described = tuning(&mut fields, at, desk);
    let tuning_name = described.as_ref().map_or(String::new(), |d| d.name.clone());
    let placed = placing::read(&mut fields, described.as_deref(), at, desk);
    let in_keys = fields
        .take("in")
        .map(|at| in_keys(&at, &mut desk.found.complaints))
        .unwrap_or_default();
    let transpose_keys = fields
        .take("transpose")
        .map_or(0, |at| parts::transpose(&at, &mut desk.found.complaints));
    let method = intonation::read(
        fields.take("intonation").as_ref(),
        described.as_deref(),
        desk.found,
    );
    desk.told.follows |= method != Method::Fixed;
    let by_hand = inflections::read(&mut fields, described.as_deref(), placed.as_ref(), desk);
    let sends = fields.take("send");
    let sends = sends.map_or_else(Vec::new, |at| sends::read(&at, desk));
    let parts = fields.take("parts").map(|at| {
        let parts = parts::parts(&at, desk.rig, desk.found);
        super::pools::allot(&parts, desk.rig, &mut desk.found.complaints)
    });
    fields.finish(&mut desk.found.complaints);
    let (placed, by_hand) = (placed?, by_hand?);
    Some(Entry {
        plan: SongPlan {
            title: title.into(),
            tuning: Arc::clone(&placed.tuning),
            reference: placed.placement.hertz.pitch(),
            transpose_keys,
            method,
            parts: parts.filter(|parts| !parts.is_empty()).map(Arc::from),
            by_hand: Arc::clone(&by_hand),
            sends,
        },
        song: Song {
            title: title.to_string(),
            tuning_name,
            tuning_about: described.and_then(|d| d.about.clone()),
            scale: placed.scale,
            placement: placed.placement,
            tuning: placed.tuning,
            in_keys,
            names: placed.names,
            two_names: placed.two_names,
            transpose_keys,
            by_hand,
            follows: method != Method::Fixed,
        },
    })
}

fn tuning(
    fields: &mut Fields<'_>,
    song: &At<'_>,
    desk: &mut Desk<'_, '_>,
) -> Option<Rc<TuningText>> {
    let written = fields.take("tuning");
    let at = written.as_ref().unwrap_or(song);
    let name = match &written {
        Some(at) if matches!(at.node, Node::Map(_)) => {
            let wrong = "a tuning is described under `tunings:`, and a song only names it";
            let right = "write it there under a name of your own, and that name here";
            desk.found.complaints.add(&at.trail, wrong, right);
            return None;
        }
        Some(at) => at.text("the name of a tuning", &mut desk.found.complaints)?,
        None => String::from(defaults::TUNING),
    };
    let before = desk.found.complaints.count();
    let text = desk
        .tunings
        .find(&name, &at.trail, &mut desk.found.complaints);
    let silent = text.is_none() && desk.found.complaints.count() == before;
    if silent && !desk.tunings.names().contains(&name) {
        // Complained about where it was asked for first; this song needs the same remedy.
        let wrong = format!("there is no tuning `{name}`");
        let right = "as above: `trued chart --list` lists those there are";
        desk.found.complaints.add(&at.trail, wrong, right);
    }
    text
}

/// `D minor`, or a list of such: moves nothing, tells which chords matter.
fn in_keys(at: &At<'_>, complaints: &mut Complaints) -> Vec<(Letter, String)> {
    let mut keys = Vec::new();
    for item in at.items() {
        let Some(text) = item.text("a key such as D minor", complaints) else {
            continue;
        };
        let (tonic, mode) = text.split_once(' ').unwrap_or((&text, ""));
        match Letter::parse(tonic) {
            Some(letter) => keys.push((letter, mode.trim().to_string())),
            None => complaints.add(
                &item.trail,
                format!("`{text}` is not a key a piece is in"),
                match Letter::parse(&tonic.to_uppercase()) {
                    Some(_) => super::values::letter_remedy(tonic),
                    None => String::from("write its tonic and its mode: D minor, E phrygian, G"),
                },
            ),
        }
    }
    keys
}

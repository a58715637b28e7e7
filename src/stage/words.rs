//! The words of `tell`, which are also what stands after `do:`, as a closed list.
//!
//! Only the words: whether a song, a synth or a place of that name exists is asked by whoever knows them.

use super::expression::{self, Expression, Mistake};
use super::node::nearest;
use super::values::{letter_remedy, one_of};
use crate::engine::Inflected;
pub use crate::engine::TonicBy;
use crate::pitch::{Hertz, Log};
use crate::tuning::{Key, Letter};

/// What can be told.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Words {
    /// `next`, `next from TITLE`.
    Next {
        from: Option<String>,
    },
    Back,
    /// A number or a title; `None` for the song with the number of the program, in cues only.
    Song(Option<String>),
    Pitch {
        to: PitchNudge,
        now: bool,
    },
    /// Keys up or down; `None` for home.
    Transpose(Option<i8>),
    Tonic {
        to: TonicMove,
        by: TonicBy,
    },
    TonicHome,
    /// `tonic pivot`: on the key that is struck, in cues on keys only.
    TonicByKey(TonicBy),
    /// `inflect B half-flat`, with an octave for that key alone.
    Inflect {
        key: Inflected,
        place: String,
    },
    /// `inflect B +5 c`: so much from wherever it stands.
    InflectBy {
        key: Inflected,
        by: Log,
    },
    InflectHome,
    Turn(String),
    BlackKey(Letter),
    Root(Root),
    /// Harmonic sevenths, or plain ones.
    Sevenths {
        harmonic: bool,
    },
    Plain,
    Home,
    Resend(Option<String>),
    Panic,
    Fresh,
    Keep,
    Reload,
    Stop,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PitchNudge {
    By(Log),
    /// So many hertz up or down from the reference.
    ByHertz {
        up: bool,
        hertz: Hertz,
    },
    To(Hertz),
    Home,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TonicMove {
    To(Letter),
    NextKey,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Root {
    Hold,
    Free,
    NextKey,
}

/// First words, each with how the whole is written.
const FORMS: [(&str, &str); 19] = [
    ("next", "next, or next from TITLE"),
    ("back", "back"),
    ("song", "song 3, or song TITLE"),
    (
        "pitch",
        "pitch +1 c, pitch +0.1 Hz, pitch 416 Hz or pitch home, and `now` behind it to move held notes too",
    ),
    ("transpose", "transpose +2, or transpose home"),
    (
        "tonic",
        "tonic D, tonic next-key or tonic home; behind a key: absolute, pivot or equal",
    ),
    (
        "inflect",
        "inflect B half-flat (B4: that key alone), inflect B +5 c, inflect B home, or inflect home",
    ),
    ("turn", "turn NAME, a name under `turns` in the tuning"),
    ("black-key", "black-key Ab"),
    ("root", "root hold, root free or root next-key"),
    ("sevenths", "sevenths harmonic, or sevenths plain"),
    ("plain", "plain"),
    ("home", "home"),
    ("resend", "resend, or resend SYNTH"),
    ("panic", "panic"),
    ("fresh", "fresh"),
    ("keep", "keep"),
    ("reload", "reload"),
    ("stop", "stop"),
];

impl Words {
    /// Whether a cue can hold it: it lasts, and can be taken back. (`next` is over in a moment.)
    pub fn can_be_held(&self) -> bool {
        match self {
            Words::Pitch { .. }
            | Words::Transpose(_)
            | Words::Tonic { .. }
            | Words::TonicHome
            | Words::TonicByKey(_)
            | Words::Inflect { .. }
            | Words::InflectBy { .. }
            | Words::InflectHome
            | Words::Turn(_)
            | Words::BlackKey(_)
            | Words::Root(_)
            | Words::Sevenths { .. }
            | Words::Plain => true,
            Words::Next { .. }
            | Words::Back
            | Words::Song(_)
            | Words::Home
            | Words::Resend(_)
            | Words::Panic
            | Words::Fresh
            | Words::Keep
            | Words::Reload
            | Words::Stop => false,
        }
    }

    /// Reads what was told.
    ///
    /// # Errors
    /// What is wrong with it, and how it is written.
    pub fn parse(text: &str) -> Result<Words, Mistake> {
        let text = text.trim();
        let (first, rest) = text.split_once(char::is_whitespace).unwrap_or((text, ""));
        let rest = rest.trim();
        let Some((_, form)) = FORMS.iter().find(|(name, _)| *name == first) else {
            let names = FORMS.map(|(name, _)| name);
            let right = match nearest(first, &names) {
                Some(near) => format!("did you mean `{near}`?"),
                None => format!("the words are {}", one_of(&names)),
            };
            return Err(mistake(format!("`{first}` cannot be told"), right));
        };
        let words = match (first, rest) {
            ("back", "") => Some(Words::Back),
            ("plain", "") => Some(Words::Plain),
            ("home", "") => Some(Words::Home),
            ("panic", "") => Some(Words::Panic),
            ("fresh", "") => Some(Words::Fresh),
            ("keep", "") => Some(Words::Keep),
            ("reload", "") => Some(Words::Reload),
            ("stop", "") => Some(Words::Stop),
            ("song", title) => Some(Words::Song(named(title))),
            ("resend", synth) => Some(Words::Resend(named(synth))),
            ("turn", name) => named(name).map(Words::Turn),
            ("next", rest) => next(rest),
            ("pitch", rest) => pitch(rest)?,
            ("transpose", rest) => transpose(rest)?,
            ("tonic", rest) => tonic(rest)?,
            ("inflect", rest) => inflect(rest)?,
            ("black-key", rest) => black_key(rest)?,
            ("root", "hold") => Some(Words::Root(Root::Hold)),
            ("root", "free") => Some(Words::Root(Root::Free)),
            ("root", "next-key") => Some(Words::Root(Root::NextKey)),
            ("sevenths", "harmonic") => Some(Words::Sevenths { harmonic: true }),
            ("sevenths", "plain") => Some(Words::Sevenths { harmonic: false }),
            _ => None,
        };
        words.ok_or_else(|| {
            mistake(
                format!("`{text}` is not understood"),
                format!("write {form}"),
            )
        })
    }
}

fn mistake(wrong: impl Into<String>, right: impl Into<String>) -> Mistake {
    Mistake {
        wrong: wrong.into(),
        right: right.into(),
    }
}

fn named(name: &str) -> Option<String> {
    (!name.is_empty()).then(|| name.to_string())
}

fn next(rest: &str) -> Option<Words> {
    match rest.split_once(' ') {
        None if rest.is_empty() => Some(Words::Next { from: None }),
        Some(("from", title)) => Some(Words::Next {
            from: Some(named(title.trim())?),
        }),
        _ => None,
    }
}

fn pitch(rest: &str) -> Result<Option<Words>, Mistake> {
    let (rest, now) = match rest.strip_suffix(" now") {
        Some(rest) => (rest.trim(), true),
        None => (rest, false),
    };
    let to = match rest {
        "home" => PitchNudge::Home,
        rest if !rest.contains(|c: char| c.is_ascii_digit()) => return Ok(None),
        rest if rest.contains('=') => {
            return Err(mistake(
                "a nudge names no key: the song has its reference",
                "write pitch 416 Hz, or pitch +1 c",
            ));
        }
        rest if rest.parse::<f64>().is_ok() => {
            return Err(mistake(
                format!("`{rest}` has no unit"),
                "write pitch +1 c, or pitch 416 Hz",
            ));
        }
        rest if rest.starts_with(['+', '-']) && rest.to_lowercase().ends_with("hz") => {
            PitchNudge::ByHertz {
                up: rest.starts_with('+'),
                hertz: expression::hertz(&rest[1..])?,
            }
        }
        rest => match Expression::parse(rest)? {
            Expression::Distance(log) => PitchNudge::By(log),
            Expression::Absolute(..) => PitchNudge::To(expression::hertz(rest)?),
        },
    };
    Ok(Some(Words::Pitch { to, now }))
}

fn transpose(rest: &str) -> Result<Option<Words>, Mistake> {
    if rest == "home" {
        return Ok(Some(Words::Transpose(None)));
    }
    let Ok(keys) = rest.parse::<i64>() else {
        return Ok(None);
    };
    if !(-60..=60).contains(&keys) {
        return Err(mistake(
            format!("{keys} keys are more than five octaves"),
            "write 60 keys up or down at most, as in transpose +2",
        ));
    }
    Ok(Some(Words::Transpose(Some(keys as i8))))
}

fn tonic(rest: &str) -> Result<Option<Words>, Mistake> {
    if let Some(by) = tonic_by(rest) {
        return Ok(Some(Words::TonicByKey(by)));
    }
    let (to, by) = rest.split_once(' ').unwrap_or((rest, ""));
    let Some(by) = tonic_by(by.trim()) else {
        return Ok(None);
    };
    let to = match to {
        "home" if rest == "home" => return Ok(Some(Words::TonicHome)),
        "home" => return Ok(None),
        "next-key" => TonicMove::NextKey,
        name => TonicMove::To(letter(name)?),
    };
    Ok(Some(Words::Tonic { to, by }))
}

fn tonic_by(word: &str) -> Option<TonicBy> {
    match word {
        "" | "absolute" => Some(TonicBy::Absolute),
        "pivot" => Some(TonicBy::Pivot),
        "equal" => Some(TonicBy::Equal),
        _ => None,
    }
}

fn letter(name: &str) -> Result<Letter, Mistake> {
    Letter::parse(name).ok_or_else(|| {
        mistake(
            format!("`{name}` is not the name of a key"),
            letter_remedy(name),
        )
    })
}

fn inflect(rest: &str) -> Result<Option<Words>, Mistake> {
    if rest == "home" {
        return Ok(Some(Words::InflectHome));
    }
    let Some((name, place)) = rest.split_once(' ') else {
        return Ok(None);
    };
    let key = match (Letter::parse(name), Key::parse(name)) {
        (Some(letter), _) => Inflected::Everywhere(letter.pitch_class()),
        (None, Some(key)) => Inflected::Alone(key),
        (None, None) => return Err(no_key_to_inflect(name, place.trim())),
    };
    let place = place.trim();
    if place.starts_with(['+', '-']) {
        let by = Expression::distance(place)?;
        return Ok(Some(Words::InflectBy { key, by }));
    }
    if Expression::parse(place).is_ok() {
        return Err(mistake(
            format!("`{place}` has no sign, and is no name of a place"),
            format!("write inflect {name} +{place} to move it by ear"),
        ));
    }
    Ok(Some(Words::Inflect {
        key,
        place: place.to_string(),
    }))
}

fn no_key_to_inflect(name: &str, place: &str) -> Mistake {
    let is_key = |text: &str| Letter::parse(text).is_some() || Key::parse(text).is_some();
    let raised = letter_remedy(name);
    let right = match is_key(place) {
        true => format!("the key stands first: inflect {place} {name}"),
        false if raised.starts_with("key names") => raised,
        false => String::from("write a letter, and an octave for that key alone: B, Bb, B4"),
    };
    mistake(format!("`{name}` is not a key"), right)
}

fn black_key(rest: &str) -> Result<Option<Words>, Mistake> {
    if rest.is_empty() {
        return Ok(None);
    }
    let name = letter(rest)?;
    if !super::black_keys::is_black(name) {
        return Err(mistake(
            format!("{name} is a white key"),
            "name a black key: C# or Db, D# or Eb, F# or Gb, G# or Ab, A# or Bb",
        ));
    }
    Ok(Some(Words::BlackKey(name)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_form_of_the_language_is_understood() {
        for text in [
            "next",
            "next from Lantern hymn",
            "back",
            "song 3",
            "song Lantern hymn",
            "song",
            "pitch +1 c",
            "pitch -1 c now",
            "pitch 416 Hz",
            "pitch +0.1 Hz",
            "pitch home",
            "pitch home now",
            "transpose +2",
            "transpose -12",
            "transpose home",
            "tonic D",
            "tonic Eb pivot",
            "tonic D equal",
            "tonic next-key",
            "tonic next-key absolute",
            "tonic",
            "tonic home",
            "inflect B half-flat",
            "inflect B4 half-flat",
            "inflect B +5 c",
            "inflect B4 -3.5 c",
            "inflect B home",
            "inflect home",
            "turn saba",
            "black-key Ab",
            "root hold",
            "root free",
            "root next-key",
            "sevenths harmonic",
            "sevenths plain",
            "plain",
            "home",
            "resend",
            "resend organ",
            "panic",
            "fresh",
            "keep",
            "reload",
            "stop",
        ] {
            assert!(
                Words::parse(text).is_ok(),
                "{text}: {:?}",
                Words::parse(text)
            );
        }
        assert_eq!(
            Words::parse("next from Two manuals"),
            Ok(Words::Next {
                from: Some(String::from("Two manuals"))
            })
        );
    }

    #[test]
    fn what_is_not_understood_says_how_it_is_written() {
        for (text, right) in [
            ("nxt", "did you mean `next`?"),
            ("next song", "write next, or next from TITLE"),
            ("tonic d", "key names begin with a capital: D"),
            ("transpose 2.5", "write transpose +2, or transpose home"),
            (
                "black-key C",
                "name a black key: C# or Db, D# or Eb, F# or Gb, G# or Ab, A# or Bb",
            ),
            ("root", "write root hold, root free or root next-key"),
        ] {
            let error = Words::parse(text).expect_err(text);
            assert_eq!(error.right, right, "{text}");
        }
        assert!(Words::parse("").is_err());
    }
}

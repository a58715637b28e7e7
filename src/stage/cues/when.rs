//! What stands after `when`: one thing that a player does, with whom and on which channel.

use crate::engine::plan::{Bank, ChannelSet, Gesture, KeyboardId, Press, Values};
use crate::stage::complaint::{Complaints, Trail};
use crate::stage::naming::Scene;
use crate::stage::node::{At, Fields, Node};
use crate::stage::values::{channels, choice, key, key_range, one_of, spell_channels, values};
use crate::stage::{defaults, rig};
use crate::time::Span;
use crate::tuning::Key;

/// What stands after `when`.
pub struct When {
    pub trail: Trail,
    pub from: Option<KeyboardId>,
    pub channels: ChannelSet,
    /// Several for a range of keys.
    pub gestures: Vec<Gesture>,
    pub press: Press,
}

impl When {
    /// The keys that are struck, if it is about keys.
    pub fn keys(&self) -> impl Iterator<Item = Key> {
        self.gestures.iter().filter_map(|gesture| match gesture {
            Gesture::Note(key) => Some(*key),
            _ => None,
        })
    }

    /// Whether it brings a number that a song of the set can have.
    pub fn is_numbered(&self) -> bool {
        self.gestures.iter().any(|gesture| !gesture.is_pressed())
    }

    /// The gestures of both that one thing a player does would fire.
    pub fn shared<'w>(
        &'w self,
        other: &'w When,
    ) -> impl Iterator<Item = (Gesture, Gesture)> + use<'w> {
        let from = self.from == other.from || self.from.is_none() || other.from.is_none();
        let channels = self.channels.0 & other.channels.0 != 0;
        // A latching switch is as good as never let go, so it has no long press beside it either.
        let same_press = match (self.press, other.press) {
            (Press::Either, _) | (_, Press::Either) | (Press::Long(_), Press::Long(_)) => true,
            (one, other) => one == other,
        };
        // A press tells two cues apart only where one way down and up is that of both.
        let both =
            move |one: Gesture, other: Gesture| overlap(one, other) && (same_press || one != other);
        let pairs = self.gestures.iter().flat_map(move |one| {
            let others = other.gestures.iter();
            others.map(move |other| (*one, *other))
        });
        pairs.filter(move |(one, other)| from && channels && both(*one, *other))
    }
}

fn overlap(one: Gesture, other: Gesture) -> bool {
    let agree =
        |one: Option<u8>, other: Option<u8>| one.is_none() || other.is_none() || one == other;
    match (one, other) {
        (
            Gesture::Program { number, bank },
            Gesture::Program {
                number: other,
                bank: theirs,
            },
        ) => agree(number, other) && agree(bank.msb, theirs.msb) && agree(bank.lsb, theirs.lsb),
        (Gesture::SongSelect(one), Gesture::SongSelect(other)) => agree(one, other),
        (
            Gesture::Controller { number, values },
            Gesture::Controller {
                number: other,
                values: theirs,
            },
        ) => number == other && common(values, theirs).is_some(),
        (Gesture::Pressure(values), Gesture::Pressure(theirs)) => common(values, theirs).is_some(),
        (one, other) => one == other,
    }
}

fn common(one: Values, other: Values) -> Option<Values> {
    let (first, last) = (one.first.max(other.first), one.last.min(other.last));
    (first <= last).then_some(Values { first, last })
}

/// How two overlap: what is wrong with the later one, and what would be right.
pub fn clash(one: Gesture, other: Gesture, line: usize) -> (String, &'static str) {
    let values = match (one, other) {
        (Gesture::Controller { values, .. }, Gesture::Controller { values: theirs, .. })
        | (Gesture::Pressure(values), Gesture::Pressure(theirs)) => common(values, theirs),
        _ => None,
    };
    match (values, one) {
        (Some(Values { first, last }), _) if one != other => (
            match first == last {
                true => format!("value {first} has a cue already, on line {line}"),
                false => format!("values {first} to {last} have a cue already, on line {line}"),
            },
            "let one of the two end where the other begins, or tell them apart by `from` or `channel`",
        ),
        (_, Gesture::Note(key)) => (
            format!("{key} has a cue already, on line {line}"),
            "keep one of the two, or tell them apart by `from`, `channel` or `press`",
        ),
        _ => (
            format!("this gesture has a cue already, on line {line}"),
            "keep one of the two, or tell them apart by `from`, `channel` or `press`",
        ),
    }
}

/// A gesture on channels where no keyboard of the cue is listened to.
pub fn unheard(when: &When, number: usize, scene: &Scene<'_>) -> Option<String> {
    let keyboards = scene.rig.keyboards.iter().enumerate();
    let heard = keyboards
        .filter(|(index, _)| when.from.is_none_or(|from| from.index() == *index))
        .fold(ChannelSet::NONE, |all, (_, keyboard)| {
            ChannelSet(all.0 | keyboard.plan.channels.0)
        });
    (heard.0 & when.channels.0 == 0).then(|| {
        format!(
            "cue {number} waits on channel {}, and its keyboard is only heard on {}",
            spell_channels(when.channels),
            spell_channels(heard)
        )
    })
}

/// `when`, with a word of its own for a cue that has none.
pub fn take_when<'n>(
    fields: &mut Fields<'n>,
    cue: &At<'n>,
    complaints: &mut Complaints,
) -> Option<At<'n>> {
    let when = fields.take("when");
    if when.is_none() && !fields.has("on") {
        complaints.add(
            &cue.trail,
            "this cue has no gesture",
            "add `when: {controller: 82, from: keys}`",
        );
    }
    when
}

pub fn when(at: &At<'_>, scene: &Scene<'_>, complaints: &mut Complaints) -> Option<When> {
    let wanted = "a gesture such as `{controller: 82, from: keys}`, {program: any} or {note: D2}";
    let mut fields = at.fields(wanted, complaints)?;
    let from = fields
        .take("from")
        .map(|at| rig::keyboard_named(&at, scene.rig, complaints));
    let channel_at = fields.take("channel");
    let channels = match &channel_at {
        Some(at) => channels(at, complaints),
        None => Some(ChannelSet::ALL),
    };
    let gestures = gestures(&mut fields, at, scene.programs_from, complaints);
    let first = gestures.as_ref().and_then(|gestures| gestures.first());
    if let (Some(at), Some(Gesture::SongSelect(_))) = (&channel_at, first) {
        complaints.add(
            &at.trail,
            "a song select comes on no channel",
            "leave `channel` out",
        );
    }
    let press = press(&mut fields, first.copied(), complaints);
    fields.finish(complaints);
    Some(When {
        trail: at.trail.clone(),
        from: match from {
            Some(named) => Some(named?),
            None => None,
        },
        channels: channels?,
        gestures: gestures?,
        press,
    })
}

/// `press` and `long_ms`.
fn press(fields: &mut Fields<'_>, gesture: Option<Gesture>, complaints: &mut Complaints) -> Press {
    let press_at = fields.take("press");
    let usual_long = Span::from_millis(defaults::LONG_MS);
    let presses = [
        ("down", Press::Down),
        ("up", Press::Up),
        ("either", Press::Either),
        ("long", Press::Long(usual_long)),
    ];
    let mut press = match &press_at {
        Some(at) => choice(at, &presses, complaints).unwrap_or(Press::Down),
        None => Press::Down,
    };
    let what = gesture.filter(|gesture| !gesture.is_pressed()).map(name);
    if let (Some(at), Some(what)) = (&press_at, what) {
        complaints.add(
            &at.trail,
            format!("a {what} is neither pressed nor let go"),
            "leave `press` out",
        );
    }
    if let Some(at) = fields.take("long_ms") {
        let long_ms = at.whole("milliseconds", 100..=10_000, complaints);
        match (&mut press, long_ms) {
            (Press::Long(long), Some(long_ms)) => *long = Span::from_millis(long_ms as u64),
            (Press::Long(_), None) => {}
            _ => complaints.add(
                &at.trail,
                "`long_ms` belongs to a long press",
                "add `press: long`",
            ),
        }
    }
    press
}

/// What a gesture without a press is called.
pub fn name(gesture: Gesture) -> &'static str {
    match gesture {
        Gesture::SongSelect(_) => "song select",
        _ => "program change",
    }
}

const KINDS: [&str; 6] = [
    "program",
    "song_select",
    "controller",
    "pressure",
    "note",
    "notes",
];

/// Exactly one of `KINDS`, with what belongs to it.
fn gestures(
    fields: &mut Fields<'_>,
    when: &At<'_>,
    programs_from: u8,
    complaints: &mut Complaints,
) -> Option<Vec<Gesture>> {
    let kinds = KINDS.map(|kind| fields.take(kind));
    let (value, bank) = (fields.take("value"), fields.take("bank"));
    let count = kinds.iter().flatten().count();
    if count != 1 {
        not_one(count, when, complaints);
        return None;
    }
    let [program, song_select, controller, pressure, note, notes] = kinds;
    only_beside(
        &value,
        "value",
        "controller",
        controller.is_some(),
        complaints,
    );
    only_beside(&bank, "bank", "program", program.is_some(), complaints);
    let one = if let Some(at) = program {
        let number = number(&at, "any, or a program", programs_from, complaints);
        let bank = match bank {
            Some(at) => self::bank(&at, complaints),
            None => Some(Bank::ANY),
        };
        Gesture::Program {
            number: number?,
            bank: bank?,
        }
    } else if let Some(at) = song_select {
        Gesture::SongSelect(number(&at, "any, or a song", programs_from, complaints)?)
    } else if let Some(at) = controller {
        let number = at.whole("a controller", 0..=119, complaints);
        let values = match value {
            Some(at) => values(&at, complaints),
            None => Some(Values::SWITCH),
        };
        Gesture::Controller {
            number: number? as u8,
            values: values?,
        }
    } else if let Some(at) = pressure {
        Gesture::Pressure(self::pressure(&at, complaints)?)
    } else if let Some(at) = note {
        Gesture::Note(one_key(&at, complaints)?)
    } else {
        let (first, last) = notes.and_then(|at| key_range(&at, complaints))?;
        let keys = Key::all().filter(|key| (first..=last).contains(key));
        return Some(keys.map(Gesture::Note).collect());
    };
    Some(vec![one])
}

fn one_key(at: &At<'_>, complaints: &mut Complaints) -> Option<Key> {
    if let Node::Text(text) = at.node
        && text.contains("..")
    {
        let right = format!("write `notes: {text}`");
        complaints.add(&at.trail, format!("`{text}` is a range of keys"), right);
        return None;
    }
    key(at, complaints)
}

/// Complains of no gesture, or of several.
fn not_one(count: usize, when: &At<'_>, complaints: &mut Complaints) {
    let wrong = match count {
        0 => "no gesture is named here",
        _ => "two gestures are named here",
    };
    let kinds = KINDS.map(|kind| format!("`{kind}`"));
    let kinds = one_of(&kinds.each_ref().map(String::as_str));
    let right = format!("write one of {kinds}, as in `controller: 82`");
    complaints.add(&when.trail, wrong, right);
}

/// Complains of a key without the gesture that it belongs to.
fn only_beside(at: &Option<At<'_>>, key: &str, of: &str, it_is: bool, complaints: &mut Complaints) {
    if let Some(at) = at.as_ref().filter(|_| !it_is) {
        let right = format!("name the {of} beside it, or leave `{key}` out");
        complaints.add(&at.trail, format!("`{key}` belongs to a {of}"), right);
    }
}

/// `any`, or a number that people count from where programs begin.
fn number(
    at: &At<'_>,
    wanted: &str,
    programs_from: u8,
    complaints: &mut Complaints,
) -> Option<Option<u8>> {
    if matches!(at.node, Node::Text(text) if text == "any") {
        return Some(None);
    }
    let from = i64::from(programs_from);
    let number = at.whole(wanted, from..=127 + from, complaints)?;
    Some(Some((number - from) as u8))
}

/// `121`, what controller 0 says; or `121/3`, what controllers 0 and 32 say.
fn bank(at: &At<'_>, complaints: &mut Complaints) -> Option<Bank> {
    let text = at.text("a bank such as 121/3", complaints)?;
    let half = |text: &str| text.trim().parse().ok().filter(|half: &u8| *half <= 127);
    let (msb, lsb) = match text.split_once('/') {
        Some((msb, lsb)) => (half(msb), half(lsb).map(Some)),
        None => (half(&text), Some(None)),
    };
    let (Some(msb), Some(lsb)) = (msb, lsb) else {
        complaints.add(
            &at.trail,
            format!("`{text}` is not a bank"),
            "write what controller 0 says, 0 to 127, as in `bank: 121`, or what 0 and 32 say, as in `bank: 121/3`",
        );
        return None;
    };
    Some(Bank {
        msb: Some(msb),
        lsb,
    })
}

/// A hand never holds one value, so a single one is taken for the slip that it is.
fn pressure(at: &At<'_>, complaints: &mut Complaints) -> Option<Values> {
    let values = values(at, complaints)?;
    if values.first == values.last {
        let first = values.first;
        complaints.add(
            &at.trail,
            format!("no finger stays at a pressure of {first}"),
            format!("write `{first}..` for {first} and above"),
        );
        return None;
    }
    Some(values)
}

//! Cues: what a player does and what it makes happen.

use super::advice::Findings;
use super::complaint::{Complaints, Trail};
use super::naming::Scene;
use super::node::{At, Fields, Node};
use super::values::{channels, choice, key, spell_channels};
use super::words::Words;
use super::{defaults, rig};
use crate::engine::plan::{Act, ChannelSet, CuePlan, Gesture, KeyboardId, Press};
use crate::limits::CUES_MAX;
use crate::time::Span;

/// What stands after `when`.
struct When {
    trail: Trail,
    from: Option<KeyboardId>,
    channels: ChannelSet,
    gesture: Gesture,
    press: Press,
}

/// The cues this version plays; those it does not are advice.
pub fn read(at: &At<'_>, scene: &Scene<'_>, found: &mut Findings) -> Vec<CuePlan> {
    let items = at.items();
    if let Some(first_too_many) = items.get(CUES_MAX) {
        found.complaints.add(
            &first_too_many.trail,
            format!("this is cue number {}", CUES_MAX + 1),
            format!("a stage file holds at most {CUES_MAX} cues"),
        );
    }
    let mut seen: Vec<When> = Vec::new();
    let mut plans = Vec::new();
    for (index, item) in items.iter().take(CUES_MAX).enumerate() {
        let Some((when, plan)) = cue(item, index + 1, scene, found) else {
            continue;
        };
        if let Some(earlier) = seen.iter().find(|earlier| same_gesture(earlier, &when)) {
            let line = found.complaints.line_of(&earlier.trail);
            found.complaints.add(
                &when.trail,
                format!("this gesture has a cue already, on line {line}"),
                "keep one of the two, or tell them apart by `from`, `channel` or `press`",
            );
        }
        seen.push(when);
        plans.extend(plan);
    }
    plans
}

/// Whether one thing a player does would fire both.
fn same_gesture(one: &When, other: &When) -> bool {
    let programs = |gesture| matches!(gesture, Gesture::AnyProgram | Gesture::Program(_));
    let gesture = one.gesture == other.gesture
        || programs(one.gesture)
            && programs(other.gesture)
            && (one.gesture == Gesture::AnyProgram || other.gesture == Gesture::AnyProgram);
    let from = one.from == other.from || one.from.is_none() || other.from.is_none();
    let channels = one.channels.0 & other.channels.0 != 0;
    // A latching switch is as good as never let go, so it has no long press beside it either.
    let press = match (one.press, other.press) {
        (Press::Either, _) | (_, Press::Either) | (Press::Long(_), Press::Long(_)) => true,
        (one, other) => one == other,
    };
    gesture && from && channels && press
}

/// When a cue takes effect; true is armed until all keys and pedals are up.
const AT: [(&str, bool); 2] = [("quiet", true), ("now", false)];
/// How long what a cue does lasts.
const HELD: [(&str, ()); 1] = [("held", ())];

fn cue(
    at: &At<'_>,
    number: usize,
    scene: &Scene<'_>,
    found: &mut Findings,
) -> Option<(When, Option<CuePlan>)> {
    let wanted = "a map such as `{when: {controller: 82, from: keys}, do: next}`";
    let mut fields = at.fields(wanted, &mut found.complaints)?;
    let when_at = take_when(&mut fields, at, &mut found.complaints);
    let when = when_at
        .as_ref()
        .and_then(|at| when(at, scene, &mut found.complaints));
    // A gesture that is not understood may be any; its words are not blamed for that.
    let by_program = when
        .as_ref()
        .is_none_or(|when| when.gesture == Gesture::AnyProgram);
    let words = match fields.take("do") {
        Some(at) => words(&at, by_program, scene, &mut found.complaints),
        None => {
            let (wrong, right) = ("this cue does nothing", "add `do: next`, or other words");
            found.complaints.add(&at.trail, wrong, right);
            None
        }
    };
    let quiet = fields.take("at");
    let quiet = quiet.and_then(|at| choice(&at, &AT, &mut found.complaints));
    let while_at = fields.take("while");
    let held = (while_at.as_ref()).and_then(|at| choice(at, &HELD, &mut found.complaints));
    let pass = fields
        .take("pass")
        .and_then(|at| at.flag(&mut found.complaints));
    fields.finish(&mut found.complaints);
    let (when, words) = (when?, words?);
    if let Some(at) = while_at.filter(|_| held.is_some()) {
        check_held(&at, &when, &words, quiet, &mut found.complaints);
    }
    let act = act(&words, scene);
    if act.is_none() {
        found.not_played(format!("cue {number}: what it does"));
    }
    let worth_knowing = [
        unheard(&when, number, scene),
        unmoved(&words, number, scene),
    ];
    worth_knowing
        .into_iter()
        .flatten()
        .for_each(|line| found.advise(line));
    let plan = act.map(|act| CuePlan {
        from: when.from,
        channels: when.channels,
        gesture: when.gesture,
        press: when.press,
        act,
        held: held.is_some(),
        at_quiet: quiet.unwrap_or(false),
        pass: pass.unwrap_or(false),
    });
    Some((when, plan))
}

/// A tonic to be moved where no tuning has one; the root of chords that nobody follows.
fn unmoved(words: &Words, number: usize, scene: &Scene<'_>) -> Option<String> {
    let told = scene.names.told;
    match words {
        Words::Tonic { .. } if !told.tonics => Some(format!(
            "cue {number} moves the tonic, and tonight's tunings all go by letter: their keys keep their pitches"
        )),
        Words::Root(_) | Words::Sevenths { .. } if !told.follows => Some(format!(
            "cue {number} is about chords that are followed, and no song tonight has `intonation: chord-root`"
        )),
        _ => None,
    }
}

/// Complains of a cue that cannot be `while: held`.
fn check_held(
    at: &At<'_>,
    when: &When,
    words: &Words,
    quiet: Option<bool>,
    complaints: &mut Complaints,
) {
    let (wrong, right) = if let Gesture::AnyProgram | Gesture::Program(_) = when.gesture {
        (
            "a program change cannot be held",
            "take a note, a controller or a pedal",
        )
    } else if when.press != Press::Down {
        (
            "what is held lasts from the press to the release",
            "leave `press` out",
        )
    } else if quiet == Some(true) {
        (
            "what is held cannot wait for quiet",
            "leave `at: quiet` or `while: held` out",
        )
    } else if !words.can_be_held() {
        (
            "this is over in a moment, and cannot be held",
            "leave `while` out, or hold what lasts, as in `inflect B natural`",
        )
    } else {
        return;
    };
    complaints.add(&at.trail, wrong, right);
}

/// A gesture on channels where no keyboard of the cue is listened to.
fn unheard(when: &When, number: usize, scene: &Scene<'_>) -> Option<String> {
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
fn take_when<'n>(
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

fn when(at: &At<'_>, scene: &Scene<'_>, complaints: &mut Complaints) -> Option<When> {
    let wanted = "a gesture such as `{controller: 82, from: keys}`, {program: any} or {note: D2}";
    let mut fields = at.fields(wanted, complaints)?;
    let from = fields
        .take("from")
        .map(|at| rig::keyboard_named(&at, scene.rig, complaints));
    let channels = match fields.take("channel") {
        Some(at) => channels(&at, complaints),
        None => Some(ChannelSet::ALL),
    };
    let gesture = gesture(&mut fields, at, scene.programs_from, complaints);
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
    if let (Some(at), Some(Gesture::AnyProgram | Gesture::Program(_))) = (&press_at, gesture) {
        complaints.add(
            &at.trail,
            "a program change is neither pressed nor let go",
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
    fields.finish(complaints);
    Some(When {
        trail: at.trail.clone(),
        from: match from {
            Some(named) => Some(named?),
            None => None,
        },
        channels: channels?,
        gesture: gesture?,
        press,
    })
}

/// One of `program`, `controller` and `note`.
fn gesture(
    fields: &mut Fields<'_>,
    when: &At<'_>,
    programs_from: u8,
    complaints: &mut Complaints,
) -> Option<Gesture> {
    let (program, controller, note) = (
        fields.take("program"),
        fields.take("controller"),
        fields.take("note"),
    );
    let one = [&program, &controller, &note]
        .iter()
        .filter(|at| at.is_some())
        .count();
    if one != 1 {
        let wrong = if one == 0 {
            "no gesture is named here"
        } else {
            "two gestures are named here"
        };
        complaints.add(
            &when.trail,
            wrong,
            "write one of `program: any`, `program: 5`, `controller: 82` and `note: D2`",
        );
        return None;
    }
    if let Some(at) = program {
        if matches!(at.node, Node::Text(text) if text == "any") {
            return Some(Gesture::AnyProgram);
        }
        let from = i64::from(programs_from);
        let number = at.whole("any, or a program", from..=127 + from, complaints)?;
        return Some(Gesture::Program((number - from) as u8));
    }
    if let Some(at) = controller {
        let number = at.whole("a controller", 0..=119, complaints)?;
        return Some(Gesture::Controller(number as u8));
    }
    note.and_then(|at| key(&at, complaints)).map(Gesture::Note)
}

/// What stands after `do`, checked against songs, synths and tunings.
fn words(
    at: &At<'_>,
    by_program: bool,
    scene: &Scene<'_>,
    complaints: &mut Complaints,
) -> Option<Words> {
    let text = at.text("words of `tell`, such as next", complaints)?;
    let mistake = match Words::parse(&text) {
        Ok(Words::Song(None)) if by_program => return Some(Words::Song(None)),
        Ok(words) => match scene.missing(&words) {
            None => return Some(words),
            Some(mistake) => mistake,
        },
        Err(mistake) => mistake,
    };
    complaints.add(&at.trail, mistake.wrong, mistake.right);
    None
}

/// What the engine does for these words, if it can.
fn act(words: &Words, scene: &Scene<'_>) -> Option<Act> {
    match words {
        Words::Song(None) => Some(Act::SongByProgram),
        words => scene.names.resolve(words).ok().map(Act::Command),
    }
}

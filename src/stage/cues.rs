//! Cues: what a player does and what it makes happen.

mod when;

use super::advice::Findings;
use super::complaint::Complaints;
use super::naming::Scene;
use super::node::At;
use super::values::choice;
use super::words::{TonicMove, Words};
use crate::engine::plan::{Act, CuePlan, Gesture, Press};
use crate::limits::{CUES_MAX, GESTURES_MAX};
use crate::tuning::Letter;
use when::{When, clash, name, take_when, unheard, when};

/// The cues this version plays, one plan for each gesture; those it does not are advice.
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
        let Some((when, its_plans)) = cue(item, index + 1, scene, found) else {
            continue;
        };
        let clashes =
            (seen.iter()).find_map(|earlier| Some((earlier, when.shared(earlier).next()?)));
        if let Some((earlier, (one, other))) = clashes {
            let line = found.complaints.line_of(&earlier.trail);
            let (wrong, right) = clash(one, other, line);
            found.complaints.add(&when.trail, wrong, right);
        }
        let before = seen.iter().map(|when| when.gestures.len()).sum::<usize>();
        let all = before + when.gestures.len();
        if before <= GESTURES_MAX && all > GESTURES_MAX {
            found.complaints.add(
                &when.trail,
                format!("with this cue there are {all} gestures, each key of a range counted"),
                format!("cues have at most {GESTURES_MAX} together: make a range smaller"),
            );
        }
        seen.push(when);
        plans.extend(its_plans);
    }
    plans
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
) -> Option<(When, Vec<CuePlan>)> {
    let wanted = "a map such as `{when: {controller: 82, from: keys}, do: next}`";
    let mut fields = at.fields(wanted, &mut found.complaints)?;
    let when_at = take_when(&mut fields, at, &mut found.complaints);
    let when = when_at
        .as_ref()
        .and_then(|at| when(at, scene, &mut found.complaints));
    let words = match fields.take("do") {
        Some(at) => words(&at, when.as_ref(), scene, &mut found.complaints),
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
    let acts: Vec<(Gesture, Act)> = (when.gestures.iter())
        .filter_map(|gesture| Some((*gesture, act(*gesture, &words, scene)?)))
        .collect();
    if acts.is_empty() {
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
    let plan = |(gesture, act)| CuePlan {
        from: when.from,
        channels: when.channels,
        gesture,
        press: when.press,
        act,
        held: held.is_some(),
        at_quiet: quiet.unwrap_or(false),
        pass: pass.unwrap_or(false),
    };
    let plans = acts.into_iter().map(plan).collect();
    Some((when, plans))
}

/// A tonic to be moved where no tuning has one; the root of chords that nobody follows.
fn unmoved(words: &Words, number: usize, scene: &Scene<'_>) -> Option<String> {
    let told = scene.names.told;
    match words {
        Words::Tonic { .. } | Words::TonicByKey(_) if !told.tonics => Some(format!(
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
    let momentary = when.gestures.iter().find(|gesture| !gesture.is_pressed());
    let (wrong, right) = if let Some(gesture) = momentary {
        let wrong = format!("a {} cannot be held", name(*gesture));
        return complaints.add(&at.trail, wrong, "take a note, a controller or a pedal");
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

/// What stands after `do`, checked against songs, synths and tunings.
fn words(
    at: &At<'_>,
    when: Option<&When>,
    scene: &Scene<'_>,
    complaints: &mut Complaints,
) -> Option<Words> {
    let text = at.text("words of `tell`, such as next", complaints)?;
    let words = Words::parse(&text);
    // A gesture that is not understood may be any; its words are not blamed for that.
    let comes_along = match words {
        Ok(Words::Song(None)) => when.is_none_or(When::is_numbered),
        Ok(Words::TonicByKey(_)) => when.is_none_or(|when| when.keys().next().is_some()),
        _ => false,
    };
    let mistake = match words {
        Ok(words) if comes_along => return Some(words),
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
fn act(gesture: Gesture, words: &Words, scene: &Scene<'_>) -> Option<Act> {
    let words = match (words, gesture) {
        (Words::Song(None), _) => return Some(Act::SongByNumber),
        (Words::TonicByKey(by), Gesture::Note(key)) => &Words::Tonic {
            to: TonicMove::To(Letter::usual(key.pitch_class())),
            by: *by,
        },
        (words, _) => words,
    };
    scene.names.resolve(words).ok().map(Act::Command)
}

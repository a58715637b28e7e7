//! The body of one tuning: exactly one form, and what may stand beside it.

use super::other_places::{fits, read_also, read_turns, turn};
use super::{Library, OtherPlace, TuningText, Turn, by_letter, from_tonic, notes};
use crate::pitch::{Hertz, Log};
use crate::stage::complaint::Complaints;
use crate::stage::expression::{Expression, Mistake};
use crate::stage::node::{At, Fields, Node};
use crate::tuning::{ByLetter, Letter, Scale};

/// The ways to say what sounds; a tuning has one of them.
const FORMS: [&str; 7] = [
    "fifths",
    "offsets",
    "notes",
    "pitches",
    "equal",
    "harmonics",
    "like",
];

/// What a form gave: a scale, and the frequency it was written at.
pub(super) type Described = (Scale, Option<Hertz>);

/// Reads one tuning. Everything wrong with it is complained about at once.
pub(super) fn read(
    name: &str,
    at: &At<'_>,
    library: &mut Library<'_>,
    complaints: &mut Complaints,
) -> Option<TuningText> {
    let mut fields = at.fields(
        "a tuning: a map with one of fifths, offsets, notes, pitches, equal, harmonics, like",
        complaints,
    )?;
    let mut prose = |field| {
        let at: Option<At<'_>> = fields.take(field);
        at.and_then(|at| at.text("a text", complaints))
    };
    let (about, source, sure) = (prose("about"), prose("source"), prose("sure"));
    let beside = Beside::take(&mut fields);
    let form = one_form(&mut fields, complaints);
    fields.finish(complaints);

    let base = match &form {
        Some(("like", at)) => {
            let like = at.text("the name of a tuning", complaints);
            like.and_then(|like| library.find(&like, &at.trail, complaints))
        }
        _ => None,
    };
    let described = form.and_then(|(form, at)| match form {
        "fifths" => beside.by_letter(form, by_letter::fifths(&at, complaints), complaints),
        "offsets" => beside.by_letter(form, by_letter::offsets(&at, complaints), complaints),
        "notes" => beside.notes(&at, complaints),
        "pitches" => beside.pitches(&at, complaints),
        "equal" => beside.steps(form, from_tonic::equal(&at, complaints), complaints),
        "harmonics" => beside.steps(form, from_tonic::harmonics(&at, complaints), complaints),
        _ => {
            let base = base
                .as_ref()
                .map(|base| (base.scale.clone(), base.heard_at));
            beside.like(base, complaints)
        }
    });
    let changed = beside.change(described, complaints);
    let others = beside.others_of(base.as_deref(), complaints);
    let (scale, heard_at) = changed?;
    let (also, turns) = others?;
    fits(beside.also.as_ref(), &scale, &also, &turns, complaints)?;
    Some(TuningText {
        name: name.to_string(),
        about,
        source,
        sure,
        scale,
        also,
        turns,
        heard_at,
    })
}

/// The one form that is written. More than one is complained about, and then the first is read.
fn one_form<'n>(
    fields: &mut Fields<'n>,
    complaints: &mut Complaints,
) -> Option<(&'static str, At<'n>)> {
    let mut written: Vec<(&'static str, At<'n>)> = FORMS
        .into_iter()
        .filter_map(|form| Some((form, fields.take(form)?)))
        .collect();
    if written.is_empty() {
        let right = format!("write one of {}", FORMS.join(", "));
        complaints.add(&fields.trail, "nothing here says what sounds", right);
        return None;
    }
    let (first, _) = written[0];
    for (form, at) in written.drain(1..).collect::<Vec<_>>() {
        let wrong = format!("`{form}` stands beside `{first}`, and both say what sounds");
        complaints.add(&at.trail, wrong, "keep one of the two");
    }
    written.pop()
}

/// What may stand beside a form.
struct Beside<'n> {
    tonic: Option<At<'n>>,
    others: Option<At<'n>>,
    period: Option<At<'n>>,
    keys: Option<At<'n>>,
    every: Option<At<'n>>,
    turned_to: Option<At<'n>>,
    change: Option<At<'n>>,
    also: Option<At<'n>>,
    turns: Option<At<'n>>,
}

impl<'n> Beside<'n> {
    fn take(fields: &mut Fields<'n>) -> Beside<'n> {
        Beside {
            tonic: fields.take("tonic"),
            others: fields.take("others"),
            period: fields.take("period"),
            keys: fields.take("keys"),
            every: fields.take("every"),
            turned_to: fields.take("turned_to"),
            change: fields.take("change"),
            also: fields.take("also"),
            turns: fields.take("turns"),
        }
    }

    /// Fields that only a scale from the tonic has, beside one by letter.
    fn refuse_steps(&self, form: &str, complaints: &mut Complaints) {
        let steps = [
            ("period", &self.period),
            ("keys", &self.keys),
            ("every", &self.every),
        ];
        for (field, at) in steps {
            if let Some(at) = at {
                let wrong = format!(
                    "`{field}` does not go with `{form}`, whose pitches belong to named keys"
                );
                complaints.add(
                    &at.trail,
                    wrong,
                    "take it out, or write the tuning as pitches, equal or harmonics",
                );
            }
        }
    }

    /// Fields that only `notes` has.
    fn refuse_notes(&self, complaints: &mut Complaints) {
        if let Some(at) = &self.others {
            complaints.add(&at.trail, "`others` goes with `notes` only", "take it out");
        }
    }

    fn refuse_tonic(&self, right: &str, complaints: &mut Complaints) {
        if let Some(at) = &self.tonic {
            complaints.add(
                &at.trail,
                "`tonic` goes with `notes` only; this tuning has none of its own",
                right,
            );
        }
    }

    fn by_letter(
        &self,
        form: &str,
        scale: Option<ByLetter>,
        complaints: &mut Complaints,
    ) -> Option<Described> {
        self.refuse_steps(form, complaints);
        self.refuse_notes(complaints);
        self.refuse_tonic(
            "the key a piece is in changes nothing here; to turn it on purpose write `turned_to`",
            complaints,
        );
        let scale = self.turn(scale, complaints)?;
        Some((Scale::ByLetter(scale), None))
    }

    fn notes(&self, at: &At<'_>, complaints: &mut Complaints) -> Option<Described> {
        self.refuse_steps("notes", complaints);
        let notes = notes::notes(at, self.tonic.as_ref(), self.others.as_ref(), complaints);
        let heard_at = notes.as_ref().and_then(|(_, heard_at)| *heard_at);
        let scale = self.turn(notes.map(|(scale, _)| scale), complaints)?;
        Some((Scale::ByLetter(scale), heard_at))
    }

    fn turn(&self, scale: Option<ByLetter>, complaints: &mut Complaints) -> Option<ByLetter> {
        match &self.turned_to {
            None => scale,
            Some(at) => {
                let to = letter_at(at, complaints);
                Some(scale?.turned(to?))
            }
        }
    }

    /// Other places and turns, those of the tuning it is built on first. What is turned turns them along.
    fn others_of(
        &self,
        base: Option<&TuningText>,
        complaints: &mut Complaints,
    ) -> Option<(Vec<OtherPlace>, Vec<Turn>)> {
        let (mut also, mut turns) = base.map_or_else(Default::default, |base| {
            (base.also.clone(), base.turns.clone())
        });
        let named = read_also(self.also.as_ref(), &mut also, complaints);
        let turned = read_turns(self.turns.as_ref(), &also, &mut turns, complaints);
        named.and(turned)?;
        // Not understood, they are complained about elsewhere.
        let letter = |at: &Option<At<'_>>| match at.as_ref()?.node {
            Node::Text(text) => Letter::parse(text),
            _ => None,
        };
        if let Some(to) = letter(&self.turned_to) {
            let from = match base.map(|base| &base.scale) {
                Some(Scale::ByLetter(scale)) => scale.home,
                _ => letter(&self.tonic).unwrap_or(Letter::C).pitch_class(),
            };
            turn(&mut also, &mut turns, to.pitch_class() + 12 - from);
        }
        Some((also, turns))
    }

    fn pitches(&self, at: &At<'_>, complaints: &mut Complaints) -> Option<Described> {
        let pitches = from_tonic::pitches(at, self.period.as_ref(), complaints);
        let heard_at = pitches.as_ref().and_then(|(_, heard_at)| *heard_at);
        let scale = pitches.map(|(scale, _)| scale);
        let (scale, _) = self.mapped(scale.map(Scale::FromTonic), complaints)?;
        Some((scale, heard_at))
    }

    /// `equal` or `harmonics`.
    fn steps(
        &self,
        form: &str,
        scale: Option<crate::tuning::FromTonic>,
        complaints: &mut Complaints,
    ) -> Option<Described> {
        if let Some(at) = &self.period {
            let right = match form {
                "equal" => "take it out; `of` says what is divided",
                _ => "take it out; `to` says where the scale begins again",
            };
            complaints.add(
                &at.trail,
                format!("`period` does not go with `{form}`"),
                right,
            );
        }
        self.mapped(scale.map(Scale::FromTonic), complaints)
    }

    /// Puts a scale from the tonic on its keys.
    fn mapped(&self, scale: Option<Scale>, complaints: &mut Complaints) -> Option<Described> {
        self.refuse_notes(complaints);
        self.refuse_tonic(
            "step 0 sits on the tonic of the song: write it there",
            complaints,
        );
        if let Some(at) = &self.turned_to {
            complaints.add(
                &at.trail,
                "`turned_to` is for tunings by letter",
                "this one is moved by the tonic of the song",
            );
        }
        let map = from_tonic::key_map(self.keys.as_ref(), self.every.as_ref(), complaints);
        let mut scale = scale?;
        if let (Scale::FromTonic(scale), Some(map)) = (&mut scale, map?) {
            scale.map = map;
        }
        Some((scale, None))
    }

    fn like(&self, base: Option<Described>, complaints: &mut Complaints) -> Option<Described> {
        if let Some(at) = &self.period {
            complaints.add(
                &at.trail,
                "`period` goes with `pitches` only",
                "take it out",
            );
        }
        let (scale, heard_at) = base?;
        match scale {
            Scale::ByLetter(scale) => {
                let (scale, _) = self.by_letter("like", Some(scale), complaints)?;
                Some((scale, heard_at))
            }
            from_tonic => {
                let (scale, _) = self.mapped(Some(from_tonic), complaints)?;
                Some((scale, heard_at))
            }
        }
    }

    /// `change: {Bb: +3 c}`, added to whatever the key has.
    fn change(
        &self,
        described: Option<Described>,
        complaints: &mut Complaints,
    ) -> Option<Described> {
        let Some(at) = &self.change else {
            return described;
        };
        let fields = at.fields(
            "keys and what is added to them, such as {Bb: +3 c}",
            complaints,
        );
        let entries = by_letter::entries(fields, complaints);
        let mut changes = Some(Vec::new());
        for (letter, at) in entries? {
            match distance_at(&at, complaints) {
                Some(by) => changes
                    .iter_mut()
                    .for_each(|list: &mut Vec<_>| list.push((letter, by, at.clone()))),
                None => changes = None,
            }
        }
        let (mut scale, heard_at) = described?;
        for (letter, by, at) in changes? {
            let key = letter.pitch_class() as usize;
            match &mut scale {
                Scale::ByLetter(scale) if scale.places[key].is_none() => {
                    let wrong = format!("{letter} is silent in this tuning");
                    complaints.add(&at.trail, wrong, "change a key that sounds");
                    return None;
                }
                Scale::ByLetter(scale) => change_key(scale, key, by),
                Scale::FromTonic(scale) => scale.changes[key] = scale.changes[key] + by,
            }
        }
        let scale = match scale {
            Scale::ByLetter(scale) => Scale::ByLetter(scale.from_c()),
            from_tonic => from_tonic,
        };
        Some((scale, heard_at))
    }
}

fn change_key(scale: &mut ByLetter, key: usize, by: Log) {
    scale.places[key] = scale.places[key].map(|place| place + by);
    for (name, place) in &mut scale.chain {
        if name.pitch_class() as usize == key {
            *place = *place + by;
        }
    }
}

/// A distance where one belongs.
pub(super) fn distance_at(at: &At<'_>, complaints: &mut Complaints) -> Option<Log> {
    read_with(at, Expression::distance, complaints)
}

/// A distance or a frequency.
pub(super) fn pitch_at(at: &At<'_>, complaints: &mut Complaints) -> Option<Expression> {
    read_with(at, Expression::parse, complaints)
}

fn read_with<T>(
    at: &At<'_>,
    read: fn(&str) -> Result<T, Mistake>,
    complaints: &mut Complaints,
) -> Option<T> {
    let text = match at.node {
        Node::Nothing => String::new(), // the expression says what is missing
        _ => at.text("a pitch such as 3/2 or 702 c", complaints)?,
    };
    match read(&text) {
        Ok(value) => Some(value),
        Err(mistake) => {
            complaints.add(&at.trail, mistake.wrong, mistake.right);
            None
        }
    }
}

/// The name of a key.
pub(super) fn letter_at(at: &At<'_>, complaints: &mut Complaints) -> Option<Letter> {
    let text = at.text("the name of a key such as D or Eb", complaints)?;
    let letter = Letter::parse(&text);
    if letter.is_none() {
        let (wrong, right) = by_letter::not_a_letter(&text);
        complaints.add(&at.trail, wrong, right);
    }
    letter
}

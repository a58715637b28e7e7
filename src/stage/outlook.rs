//! What to expect of an evening: for `check`, and for the advice that goes with every stage.

use super::Song;
use super::circle::Circle;
use super::landing::where_c4_lands;
use super::values::spell_channels;
use crate::engine::Plan;
use crate::engine::plan::{Dialect, Follow, PartPlan, SongPlan, SynthPlan};
use crate::intonation::{Method, Ratios};
use crate::pitch::word::Bend;
use crate::pitch::{Interval, Pitch};
use crate::tuning::{Key, Pin, Tuning};
use std::sync::Arc;

/// Middle C further than this from equal surprises everybody.
const FAR: Interval = Interval::from_cents(50);
/// Further than this from a fixed instrument is heard as out of tune with it.
const BESIDE_FIXED: Interval = Interval::from_cents(5);
/// Five octaves that every keyboard has.
const EVERY_KEYBOARD: std::ops::RangeInclusive<u8> = 36..=96;

/// A synth as it will be played.
#[derive(Clone, Debug, PartialEq)]
pub struct SynthOutlook {
    pub dialect: &'static str,
    /// From 1.
    pub channels: Vec<u8>,
    /// The same as people write them: `1-9, 11-16`.
    pub channels_spelt: String,
    pub bend_range: u8,
    /// The furthest any key of tonight's songs sounds from where it is wanted.
    pub worst_rounding: Interval,
}

impl Song {
    /// Where middle C lands, and why.
    pub fn c4(&self) -> String {
        where_c4_lands(&self.scale, &self.placement, &self.tuning)
    }

    /// What closes the circle of fifths, and the wolves; nothing where there is no circle.
    pub fn circle(&self) -> Vec<String> {
        let circle = Circle::of(&self.as_it_begins(), &self.names);
        circle.map(|circle| circle.lines()).unwrap_or_default()
    }

    /// What a player should know before playing it.
    pub fn advice(&self) -> Vec<String> {
        let mut lines = Vec::new();
        let moved = self.moved_from_its_keys();
        lines.extend(moved.map(|moved| format!("{}: {moved}", self.title)));
        for (named, pairs) in self.pairs() {
            for pair in pairs.iter().filter(|pair| pair.is_harsh()) {
                lines.push(format!("{} in {named}: {pair}", self.title));
            }
        }
        let reference = self.placement.reference;
        let semitones = i64::from(Key::C4.number()) - i64::from(reference.number());
        let equal = self.placement.hertz.pitch() + Interval::SEMITONE * semitones;
        let far = |c4: Pitch| (c4 - equal).abs() > FAR;
        if self.placement.pin == Pin::Key && self.tuning.pitch(Key::C4).is_some_and(far) {
            lines.push(format!("{}: {}", self.title, self.c4()));
        }
        if let Some(lost) = out_of_reach(&self.tuning) {
            lines.push(format!("{}: {lost}", self.title));
        }
        lines
    }
}

/// How a song follows its harmony; nothing where every key stays where its tuning puts it.
pub fn intonation(plan: &Plan, song: usize) -> Option<String> {
    let method = plan.set.get(song)?.method;
    let settings = method.settings()?;
    let named = match method {
        Method::LeastSquares(_) => "least-squares: every chord as pure as it can be",
        _ => "chord-root: every chord is pure",
    };
    let ratios = match settings.ratios {
        Ratios::Pure => "",
        Ratios::PureWith7 => ", dominant sevenths 4:5:6:7",
        Ratios::Own(_) => ", by ratios of your own",
    };
    let near = match settings.drift_limit {
        None => "goes as far from the tuning as its notes carry it".to_string(),
        Some(limit) => {
            let beside = match limit > BESIDE_FIXED {
                true => "; beside fixed instruments write `drift_limit_cents: 5`",
                false => "",
            };
            format!(
                "stays within {} c of the tuning on average{beside}",
                limit.cents()
            )
        }
    };
    Some(format!("{named}{ratios}; what sounds {near}"))
}

/// Where a song has more different bends within five octaves than a part has channels: what then gives way.
pub fn crowding(plan: &Plan, song: usize) -> Option<String> {
    let song = plan.set.get(song)?;
    let SongPlan { tuning, method, .. } = song;
    let parts = plan.parts_of(song).iter();
    let parts = parts.filter(|part| part.tune && !part.mono);
    let crowded = parts.filter_map(|part| {
        if *method != Method::Fixed && part.follow != Follow::Nothing {
            return crowded_chords(plan, part);
        }
        let (low, high) = part.keys;
        let synth = &plan.synths[part.to.index()];
        let mut bends: Vec<u16> = Key::all()
            .filter(|key| EVERY_KEYBOARD.contains(&key.number()) && (low..=high).contains(key))
            .filter_map(|key| tuning.pitch(key))
            .filter_map(|pitch| {
                let wanted = pitch + part.offset;
                let bend = wanted - Pitch::of_key(wanted.nearest_key()?);
                Some(Bend::encode(bend, synth.bend_range).0.value())
            })
            .collect();
        bends.sort_unstable();
        bends.dedup();
        let channels = part.pool.count() as usize;
        (bends.len() > channels).then(|| {
            format!(
                "{} different bends and {channels} channels on {}: with more than {channels} of them held at \
                 once, one gives way",
                bends.len(),
                synth.name
            )
        })
    });
    crowded.into_iter().next()
}

/// In a chord that is followed each pitch class is moved by itself.
fn crowded_chords(plan: &Plan, part: &PartPlan) -> Option<String> {
    let (low, high) = part.keys;
    let classes = (usize::from(high.number() - low.number()) + 1).min(12);
    let channels = part.pool.count() as usize;
    (channels < classes).then(|| {
        let synth = &plan.synths[part.to.index()].name;
        format!(
            "{channels} channels on {synth}, and chords that are followed: with more than {channels} pitch classes held \
             at once, one goes along with another"
        )
    })
}

/// Keyboards whose single notes bend further than a synth that they play.
pub fn short_reach(plan: &Plan) -> Vec<String> {
    let mut lines = Vec::new();
    let lists = plan.set.iter().map(|song| plan.parts_of(song));
    for part in lists.flatten().filter(|part| part.pass.wheel) {
        let synth = &plan.synths[part.to.index()];
        let reach = synth.bend_range.semitones();
        for (index, keyboard) in plan.keyboards.iter().enumerate() {
            let plays = part.from.is_none_or(|from| from.index() == index);
            let bends = keyboard.finger_semitones;
            if !plays || !keyboard.sends_mpe() || bends <= reach {
                continue;
            }
            let line = format!(
                "single notes of {} bend by up to {bends} semitones, and {} by {reach}: further than that they stay \
                 there; write `bend_range: {bends}` at {}, or `dialect: mpe` if it knows that",
                keyboard.name, synth.name, synth.name
            );
            if !lines.contains(&line) {
                lines.push(line);
            }
        }
    }
    lines
}

/// Keys that every keyboard has and that stand outside of what MIDI can say.
fn out_of_reach(tuning: &Tuning) -> Option<String> {
    let lost: Vec<Key> = Key::all()
        .filter(|key| EVERY_KEYBOARD.contains(&key.number()))
        .filter(|key| {
            tuning
                .pitch(*key)
                .is_some_and(|pitch| pitch.nearest_key().is_none())
        })
        .collect();
    let (first, last) = (lost.first()?, lost.last()?);
    Some(format!(
        "the keys {first} to {last} stand beyond MIDI notes 0 to 127 and stay silent"
    ))
}

/// Each synth of a plan, as its songs will use it.
pub fn synths(plan: &Plan) -> Vec<SynthOutlook> {
    let mut played: Vec<(&PartPlan, &Arc<Tuning>)> = Vec::new();
    for song in &plan.set {
        for part in plan.parts_of(song).iter().filter(|part| part.tune) {
            let is_it = |(other, tuning): &(&PartPlan, &Arc<Tuning>)| {
                *other == part && Arc::ptr_eq(tuning, &song.tuning)
            };
            if !played.iter().any(is_it) {
                played.push((part, &song.tuning));
            }
        }
    }
    let synths = plan.synths.iter().enumerate();
    synths
        .map(|(index, synth)| {
            let here = played.iter().filter(|(part, _)| part.to.index() == index);
            SynthOutlook {
                dialect: match synth.dialect {
                    Dialect::Mpe { .. } => "mpe",
                    Dialect::ChannelBend => "channel-bend",
                },
                channels: synth.members.iter().map(|channel| channel + 1).collect(),
                channels_spelt: spell_channels(synth.members),
                bend_range: synth.bend_range.semitones(),
                worst_rounding: worst_rounding(synth, here),
            }
        })
        .collect()
}

fn worst_rounding<'p>(
    synth: &SynthPlan,
    played: impl Iterator<Item = &'p (&'p PartPlan, &'p Arc<Tuning>)>,
) -> Interval {
    let mut worst = Interval::ZERO;
    for (part, tuning) in played {
        for pitch in Key::all().filter_map(|key| tuning.pitch(key)) {
            let wanted = pitch + part.offset;
            let Some(number) = wanted.nearest_key() else {
                continue;
            };
            let bend = wanted - Pitch::of_key(number);
            let (word, _) = Bend::encode(bend, synth.bend_range);
            worst = worst.max((word.decode(synth.bend_range) - bend).abs());
        }
    }
    worst
}

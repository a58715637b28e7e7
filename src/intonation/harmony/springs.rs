//! The second method: every interval a spring, held and remembered notes anchors (adaptive least squares).

use super::{Harmony, fading};
use crate::intonation::chord::Chord;
use crate::intonation::least_squares::{Targets, Tone, Weight, solve};
use crate::intonation::pitch_classes::PitchClasses;
use crate::intonation::place::{self, Member};
use crate::intonation::settings::{Ratios, Settings};
use crate::intonation::shapes::{CORE_MAX, Shapes};
use crate::pitch::Interval;
use crate::time::{Span, Time};

/// Pulls in millionths, against 1 for each consonance; found on other chorales than those it is judged by.
const HELD: u64 = 1_000_000;
const YOUNG: u64 = 50_000;
const REMEMBERED: i64 = 60_000;
const LEASH: u64 = 60_000;
pub(in crate::intonation) const DISSONANCE: Weight = Weight::millionths(50_000);

const TONES: usize = 12;

impl Harmony {
    pub(super) fn stretch(
        &mut self,
        now: Time,
        chord: PitchClasses,
        settings: &Settings,
        shapes: &Shapes,
    ) {
        let core = self.core(chord);
        self.septimal = self.septimal_root(now, core, settings);
        let own;
        let targets = match &settings.ratios {
            Ratios::Own(offsets) => {
                own = own_targets(offsets);
                &own
            }
            _ if self.septimal.is_some() => &shapes.seven_limit,
            _ => &shapes.five_limit,
        };
        let mut members = [Member::default(); CORE_MAX];
        for (member, class) in members.iter_mut().zip(core.iter()) {
            *member = self.member(now, class, settings);
        }
        let members = &members[..core.count()];
        let mut at = self.pulled(now, members, targets, settings);
        let at = &mut at[..members.len()];
        if let Some(limit) = settings.drift_limit {
            place::keep_within(members, at, limit.microcents());
        }
        for (member, at) in members.iter().zip(at.iter()) {
            self.places[member.class as usize].target = *at;
        }
        self.attach(now, core, members, at, settings);
        // Sizes that were shared out are no ratio.
        self.chord = Chord {
            root: self.chord.root,
            ..Chord::default()
        };
    }

    /// Where the springs bring the members; what may not go so far is held where it may, and the others again.
    fn pulled(
        &self,
        now: Time,
        members: &[Member],
        targets: &Targets,
        settings: &Settings,
    ) -> [i64; TONES] {
        let tone = |member: &Member, held: Option<i64>| Tone {
            class: member.class,
            keys: member.keys as u8,
            rest: Interval::from_microcents(member.rest),
            anchor: match held {
                Some(at) => Some((Interval::from_microcents(at), Weight::MAX)),
                None => self.anchor(now, member, settings),
            },
        };
        let leash = match settings.drift_limit {
            Some(_) => Weight::millionths(LEASH),
            None => Weight::ZERO,
        };
        let mut held = [None; TONES];
        let mut at = [0; TONES];
        for round in 0..2 {
            let mut tones = [Tone::SILENT; TONES];
            for ((slot, member), held) in tones.iter_mut().zip(members).zip(held) {
                *slot = tone(member, held);
            }
            let solution = solve(&tones[..members.len()], targets, leash);
            at = solution.offsets.map(Interval::microcents);
            let mut clamped = false;
            for ((at, member), held) in at.iter_mut().zip(members).zip(&mut held) {
                if let Some((low, high)) = member.held {
                    let near = (*at - member.was).abs() < place::DEAD_BAND;
                    let within = if near {
                        member.was
                    } else {
                        (*at).clamp(low, high)
                    };
                    clamped |= !near && within != *at;
                    *at = within;
                    *held = Some(within);
                }
            }
            if !clamped || round == 1 {
                break;
            }
        }
        at
    }

    fn anchor(
        &self,
        now: Time,
        member: &Member,
        settings: &Settings,
    ) -> Option<(Interval, Weight)> {
        let place = &self.places[member.class as usize];
        let sounds_on = place.sounding > 0 && now.since(place.since) > Span::ZERO;
        let millionths = match place.let_go {
            _ if member.held.is_some() => HELD * member.pull.max(0) as u64 / place::HELD as u64,
            _ if sounds_on => YOUNG,
            Some(at) => fading(REMEMBERED, now.since(at), settings.memory) as u64,
            None => 0,
        };
        let at = Interval::from_microcents(member.was);
        (millionths > 0).then(|| (at, Weight::millionths(millionths)))
    }
}

fn own_targets(offsets: &[Interval; TONES]) -> Targets {
    let note = |semitones: usize| Interval::SEMITONE * semitones as i64 + offsets[semitones];
    Targets::of(&std::array::from_fn(note), DISSONANCE)
}

//! What sounds: keys that go down and up, pedals, and which pitch classes are the chord.

use super::{FADE, Harmony, Place};
use crate::intonation::pitch_classes::PitchClasses;
use crate::intonation::shapes::CORE_MAX;
use crate::pitch::Interval;
use crate::time::Time;
use crate::tuning::Key;

/// Over a year of nanoseconds.
const SINCE_MAX: u64 = (1 << 55) - 1;

impl Harmony {
    /// A key goes down, which at rest stands so far from equal. Its place is known after [`Harmony::solve`].
    pub fn press(&mut self, now: Time, key: Key, rest: Interval, counted: bool) {
        let state = &mut self.keys[key.number() as usize];
        let place = &mut self.places[key.pitch_class() as usize];
        if place.sounding == 0 {
            place.since = now;
            place.stepped = None;
            if place.let_go.is_none() {
                place.now = rest.microcents();
            }
        }
        place.sounding += (state.held == 0 && !state.rings) as u8;
        place.held += (state.held == 0) as u8;
        place.counted += (counted && state.held == state.uncounted) as u8;
        state.rings = false;
        state.held = state.held.saturating_add(1);
        state.uncounted += !counted as u8;
        place.rest = rest.microcents();
        self.struck |= counted;
        self.changed = true;
        self.note_key(key.number());
    }

    /// A key that has just been pressed has taken another name, and stands elsewhere at rest; where it stood under the
    /// name before is no memory of it.
    pub fn rename(&mut self, now: Time, key: Key, rest: Interval) {
        let place = &mut self.places[key.pitch_class() as usize];
        if place.since == now && place.rest != rest.microcents() {
            place.rest = rest.microcents();
            place.now = place.rest;
            place.let_go = None;
            self.changed = true;
        }
    }

    /// A note of a key ends; `rings`: a pedal keeps it sounding.
    pub fn release(&mut self, now: Time, key: Key, counted: bool, rings: bool) {
        let state = &mut self.keys[key.number() as usize];
        let place = &mut self.places[key.pitch_class() as usize];
        if state.held == 0 {
            return;
        }
        state.held -= 1;
        state.uncounted = state.uncounted.saturating_sub(!counted as u8);
        if counted && state.held == state.uncounted {
            place.counted -= 1;
            if place.counted == 0 {
                place.let_go = Some(now);
            }
        }
        if state.held == 0 {
            state.rings = rings;
            place.held -= 1;
            place.sounding -= !rings as u8;
        }
        self.changed = true;
        self.note_key(key.number());
    }

    /// The pedal is up: what only it held has ended.
    pub fn damp(&mut self) {
        while self.ringing_keys != 0 {
            let number = self.ringing_keys.trailing_zeros() as u8;
            self.keys[number as usize].rings = false;
            self.places[number as usize % 12].sounding -= 1;
            self.changed = true;
            self.note_key(number);
        }
    }

    /// Notes what has become of a key.
    fn note_key(&mut self, number: u8) {
        let state = &self.keys[number as usize];
        let counts = state.held > state.uncounted || state.rings;
        self.counted_keys = self.counted_keys & !(1 << number) | (counts as u128) << number;
        self.ringing_keys = self.ringing_keys & !(1 << number) | (state.rings as u128) << number;
    }

    /// The pitch classes that are the harmony now.
    pub(super) fn sounding_chord(&self, now: Time) -> PitchClasses {
        let lasts = |at: Time| now.since(at).nanos() < 2 * FADE.nanos();
        let counts = |place: &Place| {
            place.counted > 0
                || place.held == 0 && place.sounding > 0 && place.let_go.is_some_and(lasts)
        };
        (0..12u8)
            .filter(|class| counts(&self.places[*class as usize]))
            .collect()
    }

    pub(super) fn bass(&self, chord: PitchClasses) -> Option<u8> {
        let mut keys = self.counted_keys;
        while keys != 0 {
            let lowest = keys.trailing_zeros() as u8;
            if chord.has(lowest) {
                return Some(lowest % 12);
            }
            keys &= keys - 1;
        }
        None
    }

    /// At most as many pitch classes as there are shapes for: the bass, the root, and of the others those with most
    /// keys, held ones first, the longer the better.
    pub(super) fn core(&self, chord: PitchClasses) -> PitchClasses {
        let mut core = chord;
        if core.count() <= CORE_MAX {
            return core;
        }
        let bass = self.bass(chord);
        // All that decides in one number each, the class last: this is asked at every key of a glissando.
        let mut strengths = [u64::MAX; 12];
        for class in chord.iter() {
            let place = &self.places[class as usize];
            let stays = Some(class) == bass || Some(class) == self.chord.root;
            let older = SINCE_MAX - place.since.nanos().min(SINCE_MAX);
            let keys = place.counted.min(15) as u64;
            strengths[class as usize] =
                (stays as u64) << 63 | keys << 59 | older << 4 | class as u64;
        }
        while core.count() > CORE_MAX {
            let weakest = strengths.iter().fold(u64::MAX, |least, s| least.min(*s)) as u8 & 15;
            strengths[weakest as usize] = u64::MAX;
            core = core.without(weakest);
        }
        core
    }
}

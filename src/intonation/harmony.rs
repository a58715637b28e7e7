//! One harmonic context: which keys sound, where each pitch class of theirs stands, and where it is bound.
//!
//! All keys of a pitch class stand alike, so a context is twelve places. A place moves in two ways: it jumps while its
//! note is younger than the settle window, and glides after.

mod motion;
mod sounding;
pub(super) mod springs;

use super::candidates::{Candidates, is_dominant};
use super::chord::Chord;
use super::pitch_classes::PitchClasses;
use super::place::{self, Member};
use super::root;
use super::settings::{Method, Ratios, Settings};
use super::shapes::{CORE_MAX, Shapes};
use crate::limits::KEYS;
use crate::pitch::Interval;
use crate::time::{Span, Time};
use std::fmt;

/// A note under a pedal counts half after so long, and after twice that is no longer part of the chord.
const FADE: Span = Span::from_millis(700);
/// A held note weighs twice as much after so long, and no more than four times after thrice that.
const ROCK: Span = Span::from_millis(4_000);
/// What ended so shortly ago was part of the chord before.
const JUST: Span = Span::from_millis(100);
/// So long a dominant chord is remembered without its root.
const ROOTLESS: Span = Span::from_millis(1_000);

/// The state of one key.
#[derive(Clone, Copy, Default)]
struct KeyState {
    /// Notes of it that are held.
    held: u8,
    /// Of these, the ones that are not counted in the harmony.
    uncounted: u8,
    /// A released note of it rings on under a pedal.
    rings: bool,
}

/// One pitch class. Places in microcents from equal.
#[derive(Clone, Copy)]
struct Place {
    /// Keys of it that are held and counted; that are held; that sound at all.
    counted: u8,
    held: u8,
    sounding: u8,
    now: i64,
    target: i64,
    /// Where the tuning at rest puts it.
    rest: i64,
    /// Since when it has sounded.
    since: Time,
    /// When it last ceased to be held and counted.
    let_go: Option<Time>,
    /// Where it stood when it left the settle window, and at the last event: what limits its motion.
    began: i64,
    before: i64,
    /// When it last moved by a step.
    stepped: Option<Time>,
}

impl Place {
    const NEW: Place = Place {
        counted: 0,
        held: 0,
        sounding: 0,
        now: 0,
        target: 0,
        rest: 0,
        since: Time::START,
        let_go: None,
        began: 0,
        before: 0,
        stepped: None,
    };
}

/// How large dominant sevenths are.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sevenths {
    /// 7/4.
    Harmonic,
    /// 5-limit.
    Plain,
}

impl fmt::Display for Sevenths {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Sevenths::Harmonic => "harmonic",
            Sevenths::Plain => "plain",
        })
    }
}

/// How a context stands, for displays.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Standing {
    pub chord: Chord,
    /// Where the root stands from equal; nothing where there is none.
    pub anchor: Option<Interval>,
    /// How far what sounds stands from rest, on average.
    pub drift: Interval,
}

/// One harmonic context.
#[derive(Clone)]
pub struct Harmony {
    method: Method,
    keys: [KeyState; KEYS],
    /// Keys that have a part in the harmony, and keys that only a pedal keeps sounding; bit 0 is key 0.
    counted_keys: u128,
    ringing_keys: u128,
    places: [Place; 12],
    chord: Chord,
    /// The player holds the root by hand.
    locked: bool,
    /// In place of the song's own.
    sevenths: Option<Sevenths>,
    /// The root on which a harmonic seventh stands.
    septimal: Option<u8>,
    /// A note has been struck since the chord was last placed, not only let go.
    struck: bool,
    changed: bool,
    /// When the chord last changed, and how far it has returned since.
    event_at: Time,
    returned_at: Time,
    returned: i64,
    /// How long a step of a glide and one home take; `None` where there are none.
    glide_step: Option<Span>,
    return_step: Option<Span>,
    /// When something moves next.
    due: Option<Time>,
    /// How far what sounds stands from rest, on average, since it last moved.
    drift: i64,
}

const _: () = assert!(KEYS <= u128::BITS as usize);

impl Harmony {
    pub fn new() -> Harmony {
        Harmony {
            method: Method::Fixed,
            keys: [KeyState::default(); KEYS],
            counted_keys: 0,
            ringing_keys: 0,
            places: [Place::NEW; 12],
            chord: Chord::default(),
            locked: false,
            sevenths: None,
            septimal: None,
            struck: false,
            changed: false,
            event_at: Time::START,
            returned_at: Time::START,
            returned: 0,
            glide_step: None,
            return_step: None,
            due: None,
            drift: 0,
        }
    }

    /// Begins anew: what sounds now is no anchor, memory or harmony for what comes.
    pub fn begin(&mut self, method: Method) {
        let settings = method.settings();
        *self = Harmony {
            method,
            glide_step: settings.and_then(|s| motion::step_span(s.glide_per_s)),
            return_step: settings.and_then(|s| motion::step_span(s.return_per_s)),
            ..Harmony::new()
        };
    }

    pub fn is_adaptive(&self) -> bool {
        self.method != Method::Fixed
    }

    /// Whether something has happened since it was last solved.
    pub fn is_due(&self) -> bool {
        self.changed
    }

    /// Holds the root that is now, or another; in silence, that of the next chord. `free` lets it go.
    pub fn hold_root(&mut self, root: Option<u8>) {
        self.chord.root = root.map(|root| root % 12).or(self.chord.root);
        self.locked = true;
        self.changed = true;
    }

    pub fn free_root(&mut self) {
        self.locked = false;
        self.struck = true;
        self.changed = true;
    }

    /// `None`: as the song says.
    pub fn set_sevenths(&mut self, sevenths: Option<Sevenths>) {
        self.sevenths = sevenths;
    }

    /// Where a pitch class stands now, from equal.
    pub fn offset(&self, class: u8) -> Interval {
        Interval::from_microcents(self.places[class as usize % 12].now)
    }

    pub fn standing(&self) -> Standing {
        Standing {
            chord: self.chord,
            anchor: self.chord.root.map(|root| self.offset(root)),
            drift: Interval::from_microcents(self.drift),
        }
    }

    /// Finds the place of everything that sounds, for all that has happened at this instant.
    pub fn solve(&mut self, now: Time, shapes: &Shapes) {
        if !std::mem::take(&mut self.changed) {
            return;
        }
        let Some(settings) = self.method.settings().copied() else {
            return;
        };
        self.note_event(now);
        let chord = self.sounding_chord(now);
        let struck = std::mem::take(&mut self.struck);
        // What is left of a chord as it is let go is no new chord.
        if struck && (!self.locked || self.chord.root.is_none()) {
            let bass = self.bass(chord);
            self.chord.root = bass.and_then(|bass| root::root(chord, bass, self.chord.root));
        }
        if chord.is_empty() {
            self.chord = Chord {
                root: self.chord.root.filter(|_| self.locked),
                ..Chord::default()
            };
        } else {
            match self.method {
                Method::LeastSquares(_) => self.stretch(now, chord, &settings, shapes),
                _ => self.place_chord(now, chord, &settings, shapes),
            }
        }
        self.jump(now, &settings);
        self.glide(now);
    }

    fn place_chord(
        &mut self,
        now: Time,
        chord: PitchClasses,
        settings: &Settings,
        shapes: &Shapes,
    ) {
        let core = self.core(chord);
        self.septimal = self.septimal_root(now, core, settings);
        let candidates = Candidates::of(
            core,
            &settings.ratios,
            self.chord.root,
            self.septimal,
            shapes,
        );
        let mut members = [Member::default(); CORE_MAX];
        for (member, class) in members.iter_mut().zip(candidates.classes()) {
            *member = self.member(now, *class, settings);
        }
        let members = &mut members[..candidates.classes().len()];
        self.without_leash(now, members, settings);
        let limit = settings.drift_limit.map(Interval::microcents);
        let placed = place::place(members, &candidates, limit);
        for (member, at) in members.iter().zip(placed.at) {
            self.places[member.class as usize].target = at;
        }
        self.attach(now, core, members, &placed.at, settings);
        self.chord.count = if candidates.is_exact() {
            members.len() as u8
        } else {
            0
        };
        self.chord.points = placed.candidate.points;
        self.chord.classes = [0; CORE_MAX];
        for (class, member) in self.chord.classes.iter_mut().zip(members.iter()) {
            *class = member.class;
        }
    }

    /// The root over which the seventh is to be 7/4, if the chord is a dominant and its seventh is free to be so: one
    /// that is held, or struck again, keeps the size it has.
    fn septimal_root(&self, now: Time, core: PitchClasses, settings: &Settings) -> Option<u8> {
        let sevenths = self.sevenths.unwrap_or(match settings.ratios {
            Ratios::PureWith7 => Sevenths::Harmonic,
            _ => Sevenths::Plain,
        });
        let was = self.septimal;
        let lingers = |root: &u8| {
            let let_go = self.places[*root as usize].let_go;
            core.has(*root) || let_go.is_some_and(|at| now.since(at) < ROOTLESS)
        };
        let remembered = was.filter(lingers).filter(|root| is_dominant(core, *root));
        let of_chord = |root: &u8| core.has(*root) && is_dominant(core, *root);
        let root = remembered.or(self.chord.root.filter(of_chord))?;
        let seventh = &self.places[(root as usize + 10) % 12];
        let is_old = seventh.since < now && now.since(seventh.since) >= settings.settle;
        let again = seventh.let_go.is_some_and(|at| now.since(at) <= JUST);
        let keeps = is_old || again;
        let is_free = sevenths == Sevenths::Harmonic && !keeps;
        (is_free || was == Some(root) && keeps).then_some(root)
    }

    fn member(&self, now: Time, class: u8, settings: &Settings) -> Member {
        let place = &self.places[class as usize];
        let age = now.since(place.since);
        let sounds_on = place.sounding > 0 && age > Span::ZERO;
        let is_old = sounds_on && age >= settings.settle;
        let pull = match place.let_go {
            _ if is_old && place.counted > 0 => {
                let age = age.nanos().min(3 * ROCK.nanos());
                place::HELD + (place::HELD as u64 * age / ROCK.nanos()) as i64
            }
            Some(at) if is_old => fading(place::HELD, now.since(at), FADE),
            _ if sounds_on => place::YOUNG,
            Some(at) => fading(place::REMEMBERED, now.since(at), settings.memory),
            None => 0,
        };
        Member {
            class,
            keys: place.counted.max(1) as i64,
            rest: place.rest,
            was: place.now,
            pull,
            held: is_old.then(|| reach(place, settings)),
        }
    }

    /// Without a leash only common tones place a chord: those that sound, else those of the chord just before.
    fn without_leash(&self, now: Time, members: &mut [Member], settings: &Settings) {
        if settings.drift_limit.is_some() {
            return;
        }
        let sounds = |m: &Member| self.places[m.class as usize].since < now;
        let any_sounds = members.iter().any(sounds);
        for member in members.iter_mut().filter(|m| !sounds(m)) {
            let let_go = self.places[member.class as usize].let_go;
            let just = let_go.is_some_and(|at| now.since(at) <= JUST);
            member.pull = if just && !any_sounds { place::HELD } else { 0 };
        }
    }

    /// What sounds beyond the shape goes with it, each as well as it can; what only rings on is left alone.
    fn attach(
        &mut self,
        now: Time,
        core: PitchClasses,
        members: &[Member],
        at: &[i64],
        settings: &Settings,
    ) {
        let drift = place::away(members, &at[..members.len()]);
        for class in (0..12u8).filter(|class| !core.has(*class)) {
            let place = &self.places[class as usize];
            if place.held == 0 {
                self.places[class as usize].target = place.now;
                continue;
            }
            let mut target = place::attach(class, members, at, drift, place.rest);
            if let Some((low, high)) = self.member(now, class, settings).held {
                target = target.clamp(low, high);
                if (target - place.now).abs() < place::DEAD_BAND {
                    target = place.now;
                }
            }
            self.places[class as usize].target = target;
        }
    }

    /// How far what is held and counted stands from rest, on average.
    fn mean_away(&self, of: impl Fn(&Place) -> i64) -> i64 {
        let (mut away, mut keys) = (0, 0);
        for place in self.places.iter().filter(|place| place.counted > 0) {
            away += (of(place) - place.rest) * place.counted as i64;
            keys += place.counted as i64;
        }
        away / keys.max(1)
    }
}

impl Default for Harmony {
    fn default() -> Harmony {
        Harmony::new()
    }
}

/// How far a held note may be moved now, down and up: so much from where it is, twice that from where it began.
fn reach(place: &Place, settings: &Settings) -> (i64, i64) {
    let Some(limit) = settings.hold_limit.map(Interval::microcents) else {
        return (i64::MIN / 4, i64::MAX / 4);
    };
    let low = (place.now - limit).max(place.began - 2 * limit);
    let high = (place.now + limit).min(place.began + 2 * limit);
    (low.min(place.now), high.max(place.now))
}

/// A weight after some time: `e` times less for each `fade`, to within a tenth.
fn fading(weight: i64, since: Span, fade: Span) -> i64 {
    if fade == Span::ZERO {
        return 0;
    }
    if since.nanos() / 14 >= fade.nanos() {
        return 0; // less than a millionth
    }
    // e^-x = 2^-(x log2 e); between whole powers of two a straight line is near enough. A memory of minutes fits.
    let x = since.nanos() * 1_443 * 1_024 / 1_000 / fade.nanos();
    let whole = weight >> (x / 1_024).min(63);
    whole - whole * (x % 1_024) as i64 / 2_048
}

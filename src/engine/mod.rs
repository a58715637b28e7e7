//! The engine: bytes and times in, bytes and a deadline out.
//!
//! **What this room is**: the one thing that plays. Live, offline and under test it is the same.
//! **Start reading at** [`Engine`], then `traffic.rs` (what goes in and out), `plan.rs`, `notes.rs`, `choose.rs`.
//! **May know** `pitch/`, `midi/`, `tuning/`, `intonation/`, `time`, `limits`.
//! **Owns** the nine promises; each is counted in [`Counters`] where it must give way.
//! **Not here**: the stage file (`stage/`), ports and clocks (`ports/`), files (`offline/`).

mod armed;
mod beforehand;
mod by_chord;
mod by_hand;
mod channel;
mod choose;
mod commands;
mod controls;
mod cues;
mod dialect;
mod fingers;
mod following;
mod hearing;
mod held;
mod keyboard;
mod lamps;
mod lasting;
mod line;
mod mono;
mod next_key;
mod notes;
mod outbox;
mod parameters;
mod part;
mod parts;
pub mod plan;
mod records;
mod setup;
mod songs;
mod synth;
mod told;
pub mod traffic;
mod voices;
mod wire;
mod zones;

pub use plan::{KeyboardId, PartId, Plan, SynthId};
pub use told::{Told, ToldTonic};
pub use traffic::{
    Ask, Command, Counters, InflectTo, Inflected, Input, Link, Nudge, Onset, Output, Place, Report,
    RootTo, TonicBy, Weight,
};

use crate::intonation::{Harmony, Method, Shapes};
use crate::limits::{KEYBOARDS_MAX, PART_PLACES, SYNTHS_MAX, WAITING_PRESSES_MAX};
use crate::pitch::{Interval, Pitch};
use crate::time::Time;
use crate::tuning::Tuning;
use armed::Armed;
use by_chord::ByChord;
use by_hand::ByHand;
use cues::Presses;
use following::{HARMONIES, Waiting};
use held::Held;
use keyboard::{Keyboard, Source};
use lamps::Lamps;
use lasting::Lasting;
use line::Line;
use next_key::Wait;
use outbox::Outbox;
use part::Part;
use plan::{PartPlan, SongPlan};
use synth::{Rig, Synth};
use voices::{Voice, Voices};

/// Turns what a player does into what synths are told.
///
/// One thing goes in (`handle_input`, `handle_timeout` or `handle_plan`), then `poll_output` is drained to `None`, then
/// `poll_timeout` says when to come back. Nothing is allocated after [`Engine::new`].
pub struct Engine {
    plan: Box<Plan>,
    /// Place in the set of the song now playing.
    song: usize,
    /// Its own settings, copied, so that they outlive the plan they came from.
    playing: Playing,
    /// What was told for good, what cues hold on top of it, and what is so in force.
    latched: Lasting,
    held: Held,
    in_force: Lasting,
    /// Of what is in force. Over all songs.
    nudge: Interval,
    /// In place of the song's own.
    transposed: Option<i8>,
    /// Twelve-equal, whatever the song says.
    plain: bool,
    line: Line,
    next_key: Option<Wait>,
    keyboards: Vec<Keyboard>,
    /// Those of the song now playing, then those of songs before that still ring.
    parts: Vec<Part>,
    /// How many of them are the song's.
    playing_parts: usize,
    synths: Vec<Synth>,
    voices: Voices,
    out: Outbox,
    armed: Armed,
    presses: Presses,
    lamps: Lamps,
    shapes: Shapes,
    /// The stage's own first, then one for each part.
    harmonies: Vec<Harmony>,
    by_chord: ByChord,
    /// Presses of this instant that wait for their chord.
    waiting: Vec<Waiting>,
    /// Since when something waits for the harmony to be solved.
    chord_at: Option<Time>,
    strikes: u64,
    stepped_at: Option<Time>,
    stopping: bool,
}

/// What of a song decides pitch.
struct Playing {
    /// In force: what was told by hand is in it.
    tuning: Tuning,
    /// As the song begins.
    rest: Tuning,
    by_hand: ByHand,
    reference: Pitch,
    transpose_keys: i8,
    method: Method,
    /// The middle of what its keys stand from equal.
    level: Interval,
}

impl Playing {
    fn of(song: &SongPlan) -> Playing {
        Playing {
            tuning: (*song.tuning).clone(), // an array: no heap
            rest: (*song.tuning).clone(),
            by_hand: (*song.by_hand).clone(), // arrays too
            reference: song.reference,
            transpose_keys: song.transpose_keys,
            method: song.method,
            level: following::level(&song.tuning),
        }
    }
}

/// One channel of one keyboard, as far as a player's hand can be told apart.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct Hand {
    keyboard: KeyboardId,
    channel: u8,
}

impl Hand {
    fn new(keyboard: usize, channel: u8) -> Option<Hand> {
        KeyboardId::new(keyboard).map(|keyboard| Hand { keyboard, channel })
    }

    fn is_of(self, voice: &Voice) -> bool {
        voice.keyboard == self.keyboard && voice.heard_on == self.channel
    }
}

impl Engine {
    /// The only allocation: all tables at the size of `limits.rs`, whatever the plan needs now.
    ///
    /// # Panics
    /// If the plan breaks its own limits or its set is empty; `stage/` never makes such a plan.
    pub fn new(plan: Box<Plan>) -> Engine {
        let keyboards = (0..KEYBOARDS_MAX)
            .filter_map(KeyboardId::new)
            .map(|id| Keyboard::new(id, plan.keyboards.get(id.index())))
            .collect();
        let rig = |index: usize| Rig::of(plan.synths.get(index).unwrap_or(&plan.synths[0]));
        let synths = (0..SYNTHS_MAX)
            .map(|index| Synth::new(SynthId::new(index).expect("within limits"), rig(index)))
            .collect();
        let playing = Playing::of(&plan.set[0]);
        let lasting = Lasting::new(&playing.by_hand);
        let mut engine = Engine {
            song: 0,
            playing,
            latched: lasting,
            held: Held::new(),
            in_force: lasting,
            line: Line::new(),
            next_key: None,
            nudge: Interval::ZERO,
            transposed: None,
            plain: false,
            keyboards,
            parts: Vec::with_capacity(PART_PLACES),
            playing_parts: 0,
            synths,
            voices: Voices::new(),
            out: Outbox::new(),
            armed: Armed::new(),
            presses: Presses::new(),
            lamps: Lamps::new(),
            shapes: Shapes::new(),
            harmonies: harmonies(plan.set[0].method),
            by_chord: ByChord::new(),
            waiting: Vec::with_capacity(WAITING_PRESSES_MAX),
            chord_at: None,
            strikes: 0,
            stepped_at: None,
            stopping: false,
            plan,
        };
        engine.take_parts(Time::START);
        engine.begin_told();
        engine
    }

    /// Cannot fail; bad bytes are counted.
    pub fn handle_input(&mut self, now: Time, input: Input<'_>) {
        self.tick(now);
        if !matches!(input, Input::Midi { .. }) {
            self.play_chord();
        }
        match input {
            Input::Midi { keyboard, bytes } => self.bytes_in(now, keyboard, bytes),
            Input::KeyboardLost(keyboard) => self.let_go(now, keyboard),
            Input::Seat { keyboard, plays_as } => self.seat(now, keyboard, plays_as),
            Input::Synth { synth, link } if synth.index() < self.plan.synths.len() => {
                self.link_changed(now, synth, link);
            }
            Input::Synth { synth, link } if synth.index() < self.plan.ports() => {
                self.lamp_link_changed(synth, link);
            }
            Input::Synth { .. } => self.out.counters.ignored += 1,
            Input::Command(command) => self.command(now, command),
        }
        self.send_song(now);
    }

    /// To be called once `poll_timeout` has come; harmless earlier.
    pub fn handle_timeout(&mut self, now: Time) {
        self.tick(now);
        for index in 0..KEYBOARDS_MAX {
            if self.keyboards[index].gone_at().is_some_and(|at| at <= now) {
                self.keyboards[index].sensed_at = None;
                self.let_go(now, KeyboardId::new(index).expect("within limits"));
            }
        }
        for index in 0..self.plan.synths.len() {
            let id = self.synths[index].id;
            if self.synths[index].again_at.is_some_and(|at| at <= now) {
                self.synths[index].again_at = None;
                self.synths[index].song_due.again();
                self.set_up(now, id);
            }
            self.say_pieces(now, id);
            if self.synths[index].wire.take_freed() {
                self.say_gestures_left_out(now, id);
            }
        }
        self.glide(now);
        self.fire_long(now);
        self.when_silent(now);
        self.send_song(now);
    }

    /// A new plan takes over between two messages. The old one comes back, to be dropped off the hot path.
    ///
    /// Nothing that sounds is disturbed, but for notes of a part or synth that is no more. The song is found again by title and keeps its own settings until it is begun
    /// again, unless the plan says that edits count at once. A synth whose rig changed takes it on once silent.
    pub fn handle_plan(&mut self, now: Time, plan: Box<Plan>) -> Box<Plan> {
        self.tick(now);
        self.play_chord();
        self.swap_plan(now, plan)
    }

    /// Drain to `None` before time moves on.
    pub fn poll_output(&mut self) -> Option<Output<'_>> {
        self.play_chord();
        if self.out.is_drained() {
            self.show_lamps();
        }
        self.out.take()
    }

    /// How many synths the plan has; output ports beyond lead to lamps.
    pub fn synths(&self) -> usize {
        self.plan.synths.len()
    }

    /// When `handle_timeout` is next due.
    pub fn poll_timeout(&self) -> Option<Time> {
        let synths = self.synths.iter().take(self.plan.synths.len());
        let sensing = self.keyboards.iter().filter_map(Keyboard::gone_at);
        let due = synths.filter_map(|synth| synth.due_at(self.stopping));
        let harmonies = &self.harmonies[..self.contexts()];
        let glides = harmonies.iter().filter_map(Harmony::due_at);
        let due = sensing.chain(due).chain(self.presses.due_at());
        due.chain(glides).min()
    }

    pub fn report(&self) -> Report {
        let mut synths = self.synths.iter().take(self.plan.synths.len());
        let (tonic, tonic_from_home) = self.tonic_in_force();
        Report {
            song: self.song as u16,
            armed_song: self.armed_song(),
            armed: self.armed.len() as u8,
            nudge: self.nudge,
            transpose_keys: self.transpose_keys(),
            plain: self.plain,
            root_held: !matches!(self.in_force.root, RootTo::Free),
            sevenths: self.in_force.sevenths,
            standing: self.harmonies[0].standing(),
            tonic,
            tonic_moved: self.in_force.tonic.is_some(),
            tonic_from_home,
            waits_for_key: self.next_key.is_some(),
            places: self.in_force.shown(&self.playing.by_hand),
            alone: self.in_force.shown_alone(),
            black_keys: self.black_keys(),
            by_chord: self.playing.by_hand.by_chord.is_some(),
            told_names: std::array::from_fn(|key| {
                self.in_force.told_name(key, &self.playing.by_hand)
            }),
            voices: self.voices.len() as u16,
            counters: self.out.counters,
            stopped: self.stopping && synths.all(|synth| synth.left || !synth.up),
        }
    }

    fn tick(&mut self, now: Time) {
        self.play_chord_before(now);
        self.drop_silent_parts(now);
        for synth in &mut self.synths {
            synth.wire.tick(now);
        }
    }

    fn source(&mut self, hand: Hand) -> &mut Source {
        &mut self.keyboards[hand.keyboard.index()].sources[hand.channel as usize]
    }

    /// Whether a part is played by a hand. What comes in on a synth's drum channel is not the part's, unless the channel
    /// is one of an MPE zone.
    fn feeds(&self, part: &PartPlan, hand: Hand) -> bool {
        let drums = self.synths[part.to.index()].rig.drums;
        self.hears(part, hand) && (!drums.has(hand.channel) || self.is_in_zone(hand))
    }

    fn hears(&self, part: &PartPlan, hand: Hand) -> bool {
        let keyboard = self.plays_as(hand.keyboard);
        let known = self.plan.keyboards.get(keyboard.index());
        part.from.is_none_or(|from| from == keyboard)
            && part.hears.has(hand.channel)
            && known.is_some_and(|keyboard| keyboard.channels.has(hand.channel))
    }

    /// Does something for each part that a hand plays.
    fn for_parts(&mut self, hand: Hand, mut act: impl FnMut(&mut Engine, usize, &PartPlan)) {
        for index in 0..self.parts.len() {
            let part = self.parts[index].plan;
            if self.feeds(&part, hand) {
                act(self, index, &part);
            }
        }
    }

    fn drum_synths(&self, hand: Hand) -> SynthSet {
        let mut set = SynthSet::default();
        if self.is_in_zone(hand) {
            return set;
        }
        for part in self.parts_playing().filter(|part| self.hears(part, hand)) {
            if self.synths[part.to.index()].rig.drums.has(hand.channel) {
                set.add(part.to);
            }
        }
        set
    }

    /// The keyboard of the plan that a device plays as.
    fn plays_as(&self, id: KeyboardId) -> KeyboardId {
        self.keyboards[id.index()].plays_as
    }

    fn synths_of(&self, id: KeyboardId) -> SynthSet {
        let id = self.plays_as(id);
        let mut set = SynthSet::default();
        for part in self.parts_playing() {
            if part.from.is_none_or(|from| from == id) {
                set.add(part.to);
            }
        }
        set
    }
}

/// Some of the plan's synths.
#[derive(Clone, Copy, Default)]
struct SynthSet(u8);

const _: () = assert!(SYNTHS_MAX <= 8);

impl SynthSet {
    fn add(&mut self, id: SynthId) {
        self.0 |= 1 << id.index();
    }

    fn iter(self) -> impl Iterator<Item = SynthId> {
        (0..SYNTHS_MAX)
            .filter(move |index| self.0 >> index & 1 == 1)
            .filter_map(SynthId::new)
    }
}

fn harmonies(method: Method) -> Vec<Harmony> {
    let mut harmony = Harmony::new();
    harmony.begin(method);
    vec![harmony; HARMONIES]
}

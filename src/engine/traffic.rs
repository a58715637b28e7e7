//! What goes into the engine and what comes out: closed lists.

use super::by_hand::NameId;
use super::plan::{KeyboardId, PartId, SynthId};
use crate::intonation::{Sevenths, Standing};
use crate::pitch::{Interval, Pitch};
use crate::tuning::{Key, Letter, Tonic};
use std::fmt;

/// One thing that happened.
#[derive(Clone, Copy, Debug)]
pub enum Input<'a> {
    /// Bytes from a keyboard, in any portions: running status, cut messages and broken bytes are all right.
    Midi {
        keyboard: KeyboardId,
        bytes: &'a [u8],
    },
    /// The keyboard's port has gone: everything it held is let go.
    KeyboardLost(KeyboardId),
    /// From now on a device plays as `plays_as`, a keyboard of the plan, with hands of its own; what `keyboard` held
    /// is let go. Several devices can so play as one keyboard. Until told otherwise each plays as itself.
    Seat {
        keyboard: KeyboardId,
        plays_as: KeyboardId,
    },
    /// The state of a synth's port has changed. Synths start `Down`.
    Synth { synth: SynthId, link: Link },
    /// The player, or whoever looks after the daemon, wants something.
    Command(Command),
}

/// A synth's port, as the driver sees it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Link {
    /// Nothing can be sent; what sounded there is forgotten.
    Down,
    /// About to be taken away: what is open is let go.
    Going,
    /// Connected: the synth is set up at once.
    Up,
    /// Connected again after having been lost, or perhaps still waking: set up at once, and once more 2 s later.
    Back,
    /// The driver's outbox runs short: no new notes until `Easy`, everything owed still goes.
    Tight,
    Easy,
}

/// What can be asked of a running engine. Grows with the words of `tell`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Command {
    /// The n-th song of the set, from 0. Beyond the set: ignored and counted.
    Song(u16),
    Next,
    /// The next song, if the song of this place is still playing; else refused and counted.
    NextFrom(u16),
    Back,
    /// A ratio over all songs. With `held_too`, held notes move to their new place at once.
    Pitch {
        to: Nudge,
        held_too: bool,
    },
    /// So many keys up or down instead of the song's own transposition; `None` is the song's own again.
    Transpose(Option<i8>),
    /// Twelve-equal at the evening's reference; the second time back again. Outlasts songs.
    Plain,
    /// A place for a key, from the next note on.
    Inflect {
        key: Inflected,
        to: InflectTo,
    },
    /// Every key at its place in the tuning.
    InflectHome,
    /// The places of several keys under one name.
    Turn(NameId),
    /// A black key that stands for two notes is this one from the next note on.
    BlackKey(Letter),
    /// Step 0 on another key.
    Tonic {
        to: Letter,
        by: TonicBy,
    },
    /// The same for the next key that goes down.
    TonicNextKey(TonicBy),
    /// The tonic exactly where it once was: what is told after a restart.
    TonicAt(Tonic),
    /// Back to the song's own.
    TonicHome,
    /// The harmony keeps its root, or finds it again by itself.
    Root(RootTo),
    /// It is the next key that goes down.
    RootNextKey,
    /// How large dominant sevenths are, in place of the song's own.
    Sevenths(Sevenths),
    /// The song as it begins, not plain. The pitch nudge stays.
    Home,
    /// As if started anew: the first song, and nothing left of what was nudged, moved or armed.
    Fresh,
    /// Handed out as `Output::Ask`: not the engine's to do.
    Ask(Ask),
    /// Silence everything, change nothing else, set the synths up again.
    Panic,
    /// Set a synth up again (all of them for `None`).
    Resend(Option<SynthId>),
    /// A file has ended: note-offs and pedals up for what is open, nothing more.
    End,
    /// Going away: as `End`, and once the last tail has died each synth is left as its plan says.
    /// `Report::stopped` tells when nothing more will come.
    Stop,
}

/// What the root of the harmony does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum RootTo {
    /// Stays what it is now.
    Hold,
    /// Is this pitch class.
    At(u8),
    Free,
}

/// Where a pitch nudge goes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Nudge {
    /// This much further.
    By(Interval),
    /// As far as brings the reference of the song now playing here.
    To(Pitch),
    Home,
}

/// Which keys take another place.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Inflected {
    /// A pitch class, in all octaves.
    Everywhere(u8),
    Alone(Key),
}

impl fmt::Display for Inflected {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Inflected::Everywhere(pitch_class) => Letter::usual(*pitch_class).fmt(f),
            Inflected::Alone(key) => key.fmt(f),
        }
    }
}

impl Inflected {
    pub fn pitch_class(self) -> u8 {
        match self {
            Inflected::Everywhere(pitch_class) => pitch_class,
            Inflected::Alone(key) => key.pitch_class(),
        }
    }
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum InflectTo {
    Place(Place),
    /// So much from wherever it stands.
    By(Interval),
}

/// Where a key stands in its tuning.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Place {
    Home,
    Named(NameId),
}

/// What keeps its pitch when the tonic moves.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum TonicBy {
    /// The reference.
    #[default]
    Absolute,
    /// The new tonic, where it sounds now.
    Pivot,
    /// Nothing: the new tonic takes its place in equal temperament.
    Equal,
}

/// What a player asks of whoever looks after the daemon.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ask {
    /// Read the stage file again.
    Reload,
    /// Stop as on SIGTERM.
    Stop,
}

/// One thing to do, in order. Drain with `poll_output` until `None` before time moves on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Output<'a> {
    /// One whole message, or a bundle of whole messages that go out together or not at all. Each has its status byte.
    Send {
        synth: SynthId,
        weight: Weight,
        bytes: &'a [u8],
    },
    /// A note has just been started by the `Send` before. Told after `Engine::keep_records` only.
    Onset(Onset),
    /// A sounding note has been moved by the `Send` before: `target` and `sent` say where to. As `Onset`.
    Moved(Onset),
    /// For the desk. Nothing need be done where there is none.
    Ask(Ask),
}

/// How a driver that runs short treats an output.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Weight {
    /// Note-offs, pedals up, bends of sounding notes, set-up: never dropped, first in line.
    Owed,
    /// A note with all that must precede it.
    Note,
    /// Wheel, pressure, controllers: the newest value of each is enough.
    Control,
    /// Not ours: passed on in order.
    Through,
}

/// A note as it started, or as it stands once moved.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Onset {
    pub part: PartId,
    pub keyboard: KeyboardId,
    /// The key the player pressed (before any transposition).
    pub key: Key,
    pub velocity: u8,
    pub synth: SynthId,
    /// 0-15.
    pub channel: u8,
    /// The MIDI note number sent.
    pub number: u8,
    /// Where the tuning wants it; the player's wheel is not in it.
    pub target: Pitch,
    /// Where number and tuning bend put it.
    pub sent: Pitch,
    /// How the harmony stands that it follows.
    pub standing: Option<Standing>,
}

/// What gave way, and how often. All start at 0 and only grow.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Counters {
    /// Note-ons sent.
    pub notes: u64,
    /// Tuning bends sent (the player's wheel not counted).
    pub bends: u64,
    /// Notes ended early because no channel was left.
    pub stolen: u64,
    /// Tails bent because no other channel was left.
    pub tails_cut: u64,
    /// Notes that share a channel with others that the harmony moves differently, because none was free.
    pub moved_along: u64,
    /// Keys that are silent in the tuning, or out of reach.
    pub silent: u64,
    /// New notes refused (outbox short, no voice left, synth away, or `steal: none`).
    pub refused: u64,
    /// Bends held at the end of their range.
    pub clipped: u64,
    /// Input bytes that made no message.
    pub bad_bytes: u64,
    /// System exclusive messages too long or cut off.
    pub sysex_lost: u64,
    /// Commands that could not be followed (a program beyond the set, `next from` a song no longer playing).
    pub ignored: u64,
    /// Note-offs for which no note was open.
    pub orphans: u64,
    /// Outputs dropped because the engine's own outbox was full: always 0 unless a driver fails to drain it.
    pub overrun: u64,
}

/// A plain copy of the engine's state for status and tests.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Report {
    /// The song now playing, by place in the set, from 0.
    pub song: u16,
    /// The song that a cue `at: quiet` waits to begin.
    pub armed_song: Option<u16>,
    /// How many commands of cues `at: quiet` wait.
    pub armed: u8,
    /// The pitch nudge over all songs.
    pub nudge: Interval,
    /// The transposition now in force, the song's own or another. A part's comes on top.
    pub transpose_keys: i8,
    /// Twelve-equal, whatever the song says.
    pub plain: bool,
    /// The key of the tonic in force; `None` where the tuning goes by letter.
    pub tonic: Option<Letter>,
    /// It was moved by hand.
    pub tonic_moved: bool,
    /// How far it stands from where the reference would put it.
    pub tonic_from_home: Interval,
    /// The next key names a tonic.
    pub waits_for_key: bool,
    /// By pitch class: the place of its keys, and how far they were nudged from it.
    pub places: [(Place, Interval); 12],
    /// Pitch classes some of whose keys go alone, one bit each.
    pub alone: u16,
    /// By pitch class: what black keys with two names are now.
    pub black_keys: [Option<Letter>; 12],
    /// The harmony chooses between their names, but for those that were told theirs.
    pub by_chord: bool,
    /// By pitch class: what black keys were told to be, if it is not what they would be without.
    pub told_names: [Option<Letter>; 12],
    /// The root is held by hand.
    pub root_held: bool,
    /// Dominant sevenths are so by hand.
    pub sevenths: Option<Sevenths>,
    /// How the stage's harmony stands.
    pub standing: Standing,
    /// Keys held (voices whose note-off is still to come).
    pub voices: u16,
    pub counters: Counters,
    /// After `Command::Stop`: everything has been said.
    pub stopped: bool,
}

impl Report {
    /// Keys that are not at home, with their place and how far they were nudged from it.
    pub fn off_home(&self) -> impl Iterator<Item = (Letter, Place, Interval)> {
        let keys = self.places.iter().enumerate();
        keys.filter(|(_, (place, nudge))| *place != Place::Home || *nudge != Interval::ZERO)
            .map(|(key, (place, nudge))| (Letter::usual(key as u8), *place, *nudge))
    }

    /// Keys of which some octave goes alone.
    pub fn go_alone(&self) -> impl Iterator<Item = Letter> {
        (0..12u8)
            .filter(|key| self.alone >> key & 1 == 1)
            .map(Letter::usual)
    }
}

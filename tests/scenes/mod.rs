//! What the engine promises, as small stories: a script in, a transcript out.

/// Black keys that stand for two notes.
mod black_keys;
/// Black keys named by the harmony.
mod by_chord;
/// Presses, long and short; what waits until all hands are off.
mod cues;
/// Two runs of one script; a stream in portions.
mod determinism;
/// Keyboards that send each note on a channel of its own; the player's hands on their own part.
mod expressive;
/// Gestures besides switches and keys: values, pressure, banks, song select, ranges of keys.
mod gestures;
/// Chords that are pure, and what of them moves.
mod harmony;
/// Other places of keys, latched, held and by the line.
mod inflections;
/// Lamps of a controller.
mod lamps;
/// Keyboards and synths that go and come back, panic, a short outbox.
mod lost;
/// Mode messages, Reset All Controllers.
mod modes;
/// Parts of one voice.
mod mono;
/// Splits, layers, several keyboards and synths; parts of a song.
mod parts;
/// Damper, sostenuto, keys struck again.
mod pedals;
/// Poly pressure, CC88 and CC84.
mod prefixes;
/// Bend ranges told, and told again.
mod ranges;
/// Root and sevenths by hand.
mod root;
/// What a song says to the synths when it begins.
mod sends;
/// A new song under a ringing chord; one that waits for silence.
mod songs;
/// Too many pitches for the channels there are.
mod stealing;
/// The end of a file, and how synths are left.
mod stopping;
/// Words of `tell`, each as a story.
mod telling;
/// Drums, system exclusive, real-time, Active Sensing, System Reset.
mod through;
/// The tonic moved while playing.
mod tonic;
/// The reference trimmed by tenths of a hertz and by cents.
mod trim;
/// The player's wheel and what it means.
mod wheel;
/// Keys a tuning is good in, and those it is not.
mod wolves;

use crate::support::plans;
use trued::engine::Plan;
use trued::engine::plan::{ChannelSet, Dialect};

/// C 10 cents up, E 14 down, G 2 up, the rest equal; then equal.
fn two_songs(dialect: Dialect, range: u8) -> Plan {
    let mut crooked = [0.0; 12];
    (crooked[0], crooked[4], crooked[7]) = (10.0, -14.0, 2.0);
    let songs = vec![
        plans::song("Crooked", plans::offsets(crooked)),
        plans::song("Equal", plans::equal()),
    ];
    plans::plan(plans::synth("synth", dialect, range), songs)
}

fn plain() -> Plan {
    two_songs(Dialect::ChannelBend, 2)
}

fn mpe() -> Plan {
    two_songs(Dialect::Mpe { manager: 0 }, 48)
}

/// A plain synth with only so many channels, from channel 1 up.
fn few_channels(count: u32) -> Plan {
    let mut plan = plain();
    plan.synths[0].members = ChannelSet((1 << count) - 1);
    plan.parts[0].pool = plan.synths[0].members;
    plan
}

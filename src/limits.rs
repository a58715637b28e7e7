//! Every bound in the house, and the proofs that they agree with each other.
//!
//! The engine allocates by these once, when it is made, so a plan loaded later can never need more.

/// Keys of a keyboard, MIDI numbers 0-127.
pub const KEYS: usize = 128;
/// Channels of one MIDI port.
pub const CHANNELS: usize = 16;
pub const KEYBOARDS_MAX: usize = 8;
/// Synths, and keyboards with lamps: each has an output port of ours.
pub const SYNTHS_MAX: usize = 8;
pub const PARTS_MAX: usize = 16;
/// Parts that play, and as many of songs before that still ring.
pub const PART_PLACES: usize = 2 * PARTS_MAX;
/// Keys that wait below the one that sounds in a part of one voice.
pub const MONO_KEYS_MAX: usize = 16;
/// Keys held down at once, over all keyboards and layers. Pedal-held notes do not count: their note-off is out.
pub const VOICES_MAX: usize = 256;
/// Presses of one instant that can wait for each other to be one chord.
pub const WAITING_PRESSES_MAX: usize = 64;
/// Songs in a set (a program change reaches 128 of them; cues reach all).
pub const SONGS_MAX: usize = 512;
/// Controls held at once that may become long presses.
pub const PRESSES_MAX: usize = 64;
/// Controls held at once whose cues last `while: held`.
pub const HELD_MAX: usize = 64;
/// Commands that can wait for quiet.
pub const ARMED_MAX: usize = 64;
/// Other places of all keys of a tuning together.
pub const PLACES_MAX: usize = 96;
/// Keys of all turns of a tuning together.
pub const TURN_STEPS_MAX: usize = 128;
/// How far a key may be nudged from its place, up or down.
pub const INFLECT_MAX_CENTS: i64 = 100;
/// Keys of a keyboard that are remembered, to know whether the line comes from below or above.
pub const LINE_KEYS: usize = 8;
/// So long without a key down is a rest in the line.
pub const REST_MS: u64 = 500;
/// Cues in one stage file.
pub const CUES_MAX: usize = 128;
/// Their gestures, each key of a range counted: all are looked through at every message.
pub const GESTURES_MAX: usize = 256;
/// Lamps in one stage file.
pub const LAMPS_MAX: usize = 128;
/// Longest system exclusive message passed on whole; longer ones are dropped and counted.
pub const SYSEX_BYTES_MAX: usize = 64 * 1024;
/// Room in the engine for output that one input can cause.
pub const OUTBOX_BYTES: usize = 512 * 1024;
/// Outputs (messages or bundles) that one input can cause.
pub const OUTBOX_ITEMS: usize = 32 * 1024;
/// Bytes of the longest bundle that goes out whole: CC88, CC84, CC74, pressure, bend, catch-up is sent apart, note-on.
pub const BUNDLE_BYTES_MAX: usize = 24;

/// Pitch bend range a synth may be told, in semitones (MPE 1.1, 2.1).
pub const BEND_RANGE_MAX: u8 = 96;
/// How far the pitch nudge may go, up or down: further is a slip of the hand.
pub const NUDGE_MAX_CENTS: i64 = 1_200;
/// What is remembered from one run to the next; a longer file is none of ours.
pub const REMEMBERED_BYTES_MAX: usize = 64 * 1024;
pub const TAIL_MS_MAX: u64 = 60_000;
/// Active Sensing: a keyboard that sent FE once and is then silent this long has gone (MIDI 1.0, p. 32: over 300 ms).
pub const SENSING_MS: u64 = 330;
/// A synth that has just come back may not hear yet: its set-up is said once more after this long.
pub const SETTLE_MS: u64 = 2_000;
/// A General MIDI reset is done within 100 ms (GM2 4.9.1); set-up follows then.
pub const RESET_MS: u64 = 100;

// The worst single input is a panic: every voice off, then pedals, centring and set-up on every channel of every synth.
const _: () = assert!(VOICES_MAX + SYNTHS_MAX * CHANNELS * 160 <= OUTBOX_ITEMS);
const _: () =
    assert!(OUTBOX_BYTES >= SYNTHS_MAX * SYSEX_BYTES_MAX || OUTBOX_BYTES >= 2 * SYSEX_BYTES_MAX);
const _: () = assert!(OUTBOX_ITEMS * 3 + SYSEX_BYTES_MAX <= OUTBOX_BYTES);
const _: () = assert!(KEYBOARDS_MAX * CHANNELS <= 128 && SYNTHS_MAX * CHANNELS <= 128);

/// Things that can arrive at the ports between two cycles; more is read in the next one.
pub const INBOX_ARRIVALS: usize = 1024;
pub const INBOX_BYTES: usize = 2 * SYSEX_BYTES_MAX;
/// Messages that callbacks have brought and that wait for the score thread.
pub const FEED_MESSAGES: usize = 4 * 1024;
/// Messages and bundles that can wait for one synth's port while it is full.
pub const WAITING_ITEMS: usize = 8 * 1024;
pub const WAITING_BYTES: usize = 4 * SYSEX_BYTES_MAX;
/// Of these, kept for what is owed: every note-off, then a whole panic, and as much again.
pub const OWED_ITEMS: usize = 2 * (VOICES_MAX + CHANNELS * 160);
pub const OWED_BYTES: usize = SYSEX_BYTES_MAX;
const _: () =
    assert!(OWED_ITEMS + 1024 <= WAITING_ITEMS && OWED_BYTES + SYSEX_BYTES_MAX <= WAITING_BYTES);
const _: () = assert!(OWED_ITEMS * 3 <= OWED_BYTES && WAITING_BYTES <= u32::MAX as usize);

/// Combinations of just sizes that least squares tries for one chord.
pub const TRIALS_MAX: usize = 256;

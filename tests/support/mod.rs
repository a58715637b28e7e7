//! What the tests share: an independent receiver, a rig that drives the engine on a scripted clock, published figures.

/// What the binary's chart says of a song.
pub mod charts;
/// A small seeded generator, so that a failure can be played again.
pub mod dice;
/// The pitch of a partial in a sound.
pub mod estimator;
/// Messages as a MIDI file.
pub mod midi_file;
/// Plans put together by hand, for tests that need no stage file.
pub mod plans;
/// Tunings by the literature.
pub mod published;
/// Hears what was sent and says what sounded; knows nothing of trued.
pub mod receiver;
/// Engine, scripted clock and receivers; scripts in, transcripts out.
pub mod rig;
/// A small language for scripts and transcripts.
pub mod script;
/// A SoundFont that plays a bare sine.
pub mod sine_font;

/// Bytes written as in the standards: `90 3C 64`.
pub fn hex(text: &str) -> Vec<u8> {
    text.split_whitespace()
        .map(|byte| u8::from_str_radix(byte, 16).expect("two hexadecimal digits"))
        .collect()
}

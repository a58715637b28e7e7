//! Intonation that follows the chord, scored from the bytes the engine sends, on music nobody wrote for it.
//!
//! The chorales come out of the music21 corpus by `export.py`; the metrics are those of the table in `peers.md`. To look
//! at a method while working on it:
//!
//! ```sh
//! TAKE=dev INTONATION="{method: chord-root, hold_limit_cents: 4}" cargo test --test all table_of_chorales -- --nocapture
//! ```

/// Black keys named by the harmony, against the printed names.
mod by_chord;
/// The table: chorales in fixed tunings and by the method, beside what others make of them.
mod chorales;
/// Piano and jazz of our own.
mod compose;
/// Chorales and analyses, read by `export.py`.
mod corpus;
/// Voices put on one keyboard, and the keyboard's MIDI.
mod keyboard;
/// The table's published rows.
mod peers;
/// A keyboard through the engine, heard by the receiver.
mod played;
/// Chords that walk away.
mod pump;
/// Roots against analyses.
mod roots;
/// The metrics.
mod score;
mod score_tests;
/// The table as people read it.
mod table;
/// Piano and jazz beside the chorales.
mod textures;

pub use corpus::python;

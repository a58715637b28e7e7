//! One line a note, as JSON, at its onset.

use super::retune::Recording;
use serde::Serialize;

/// The names are fixed: other programs read them.
#[derive(Serialize)]
struct Line<'a> {
    t_ms: f64,
    /// As pressed.
    key: u8,
    velocity: u8,
    port: &'a str,
    /// 1-16.
    channel: u8,
    note: u8,
    target_cents: f64,
    sent_cents: f64,
    /// Of the chord, where the song follows it.
    root: Option<u8>,
    shape: Option<&'a str>,
    drift_cents: f64,
}

/// All lines, in order of onset.
pub fn write(recording: &Recording) -> String {
    let mut text = String::new();
    for note in &recording.notes {
        let onset = note.onset;
        let line = Line {
            t_ms: note.time.nanos() as f64 / 1e6,
            key: onset.key.number(),
            velocity: onset.velocity,
            port: &recording.synths[onset.synth.index()].name,
            channel: onset.channel + 1,
            note: onset.number,
            target_cents: onset.target.cents(),
            sent_cents: onset.sent.cents(),
            root: None,
            shape: None,
            drift_cents: 0.0,
        };
        text += &serde_json::to_string(&line).expect("numbers and text are always JSON");
        text.push('\n');
    }
    text
}

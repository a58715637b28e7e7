//! One line a note, as JSON: at its onset, and again whenever it is moved while it sounds.

use super::retune::Recording;
use crate::engine::Onset;
use crate::time::Time;
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
    shape: Option<String>,
    drift_cents: f64,
    /// It sounded already and was moved.
    #[serde(skip_serializing_if = "std::ops::Not::not")]
    retune: bool,
}

/// All lines, in order of time.
pub fn write(recording: &Recording) -> String {
    let begun = recording
        .notes
        .iter()
        .map(|note| (note.time, note.onset, false));
    let moved = recording
        .moved
        .iter()
        .map(|(time, onset)| (*time, *onset, true));
    let mut all: Vec<(Time, Onset, bool)> = begun.chain(moved).collect();
    // Stable: of one moment, what began comes before what moved.
    all.sort_by_key(|(time, ..)| *time);
    let mut text = String::new();
    for (time, onset, retune) in all {
        text += &serde_json::to_string(&line(recording, time, &onset, retune))
            .expect("numbers and text are always JSON");
        text.push('\n');
    }
    text
}

fn line<'a>(recording: &'a Recording, time: Time, onset: &Onset, retune: bool) -> Line<'a> {
    let chord = onset.standing.map(|standing| standing.chord);
    let numbers: Vec<String> = chord
        .iter()
        .flat_map(|chord| chord.ratio())
        .map(|number| number.to_string())
        .collect();
    Line {
        t_ms: time.nanos() as f64 / 1e6,
        key: onset.key.number(),
        velocity: onset.velocity,
        port: &recording.synths[onset.synth.index()].name,
        channel: onset.channel + 1,
        note: onset.number,
        target_cents: onset.target.cents(),
        sent_cents: onset.sent.cents(),
        root: chord.and_then(|chord| chord.root),
        shape: (!numbers.is_empty()).then(|| numbers.join(":")),
        drift_cents: onset
            .standing
            .map_or(0.0, |standing| standing.drift.cents()),
        retune,
    }
}

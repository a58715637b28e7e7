//! Repertoire rules (need N16): a tuning says in which keys it is good, and `check` warns when the piece is in another.
//!
//! In quarter-comma meantone the cadences on E-G#-B and A-C#-E are pure, and B-D# is 427.373 cents, because its D# is an Eb
//! (B. Ratte 1991, p. 153; six major and three minor keys are common practice).

use crate::support::rig::Rig;
use trued::stage::chords::good_keys;

fn songs(list: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}}}\nsynths: {{synth: {{port: virtual, tail_ms: 0}}}}\n{list}\n"
    ))
}

/// What is heard when the keys are struck together, above the lowest.
fn chord(rig: &mut Rig, keys: &str) -> Vec<f64> {
    let before = rig.heard().notes.len();
    let now = rig.now.nanos() / 1_000_000;
    let offs: Vec<String> = keys
        .split(' ')
        .map(|key| format!("{} off {key}", now + 20))
        .collect();
    rig.play(&format!(
        "{} chord {keys}\n{}\n{} wait",
        now + 10,
        offs.join("\n"),
        now + 30
    ));
    let notes = &rig.heard().notes[before..];
    let lowest = notes[0].onset_cents();
    notes
        .iter()
        .map(|note| note.onset_cents() - lowest)
        .collect()
}

#[test]
fn n16_a_piece_in_a_key_the_tuning_has_not_is_warned_of_and_sounds_so() {
    let mut rig =
        songs("set: [{song: Canzona, tuning: quarter-comma-meantone, in: [A minor, E minor]}]");
    let stage = rig.stage.as_ref().expect("a stage");
    assert_eq!(
        stage.advice,
        ["Canzona in E minor: the third B-D# is 427.4 c, 41.1 c wide (D# is played on Eb)"]
    );
    let song = &stage.set[0];
    let good = good_keys(&song.tuning, &song.names);
    assert_eq!(
        good.as_deref(),
        Some("no wolf in Bb, F, C, G, D, A major and in G, D, A minor")
    );
    // What is called good is heard to be, and what is warned of too.
    for pure in ["E3 G#3 B3", "A3 C#4 E4"] {
        assert!((chord(&mut rig, pure)[1] - 386.314).abs() < 0.03, "{pure}");
    }
    assert!((chord(&mut rig, "B3 D#4 F#4")[1] - 427.373).abs() < 0.03);
}

#[test]
fn n16_a_second_name_takes_the_warning_away_because_it_takes_the_wolf_away() {
    let mut rig = songs(
        "tunings: {long: {fifths: {chain: [Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#, D#], each: narrow 1/4 syntonic}}}\n\
         set: [{song: Canzona, tuning: long, in: E minor, black_keys: [Eb or D#]}]",
    );
    assert_eq!(rig.stage.as_ref().expect("a stage").advice, [""; 0]);
    rig.play("0 tell black-key D#");
    assert!((chord(&mut rig, "B3 D#4 F#4")[1] - 386.314).abs() < 0.03);
}

#[test]
fn n16_a_transposition_brings_the_wolf_of_another_key() {
    let mut rig =
        songs("set: [{song: Hymn, tuning: quarter-comma-meantone, in: G, transpose: -1}]");
    let advice = rig.stage.as_ref().expect("a stage").advice.join("\n");
    for said in [
        "Hymn: `transpose: -1` under an unequal tuning changes the key: G plays F#",
        "Hymn in G: the third G-B is 427.4 c, 41.1 c wide (transposed, it sounds as F#-Bb)",
    ] {
        assert!(advice.contains(said), "{advice}");
    }
    assert!((chord(&mut rig, "G3 B3 D4")[1] - 427.373).abs() < 0.03);
    // The remedy that is named: as low, and with the chords of G.
    assert!(advice.contains("write `pitch: A4 = 415.30 Hz`"), "{advice}");
    let mut mended =
        songs("set: [{song: Hymn, tuning: quarter-comma-meantone, in: G, pitch: A4 = 415.30 Hz}]");
    assert_eq!(mended.stage.as_ref().expect("a stage").advice, [""; 0]);
    assert!((chord(&mut mended, "G3 B3 D4")[1] - 386.314).abs() < 0.03);
}

/// The just scale on C has 40/27 from D to A, 21.506 narrow of the fifth; with D a comma lower that fifth is pure, and a piece
/// in D minor that begins so is not warned.
#[test]
fn n16_a_place_that_the_song_begins_with_counts() {
    let text = |begins: &str| {
        songs(&format!(
            "tunings: {{just: {{like: five-limit-scale, also: {{D: {{low: 10/9}}}}}}}}\n\
             set: [{{song: Motet, tuning: just, in: D minor{begins}}}]"
        ))
    };
    let mut rig = text("");
    let advice = rig.stage.as_ref().expect("a stage").advice.join("\n");
    assert!(
        advice.contains("Motet in D minor: the fifth D-A is 680.4 c, 21.5 c narrow"),
        "{advice}"
    );
    assert!((chord(&mut rig, "D3 A3")[1] - 680.449).abs() < 0.03);
    let mut rig = text(", begin_with: {D: low}");
    let advice = rig.stage.as_ref().expect("a stage").advice.join("\n");
    assert!(!advice.contains("D-A"), "{advice}");
    assert!((chord(&mut rig, "D3 A3")[1] - 701.955).abs() < 0.03);
}

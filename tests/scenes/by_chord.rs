//! The harmony names black keys (needs N03 and N16).
//!
//! Quarter-comma meantone above C: E 386.314, F 503.422, G# 772.627, Ab 813.686, B 1082.892, Eb 310.265, D# 269.206 cents
//! (the printed tables of meantone beyond twelve notes; Ab above G# by 128/125 = 41.059).

use crate::support::rig::Rig;
use crate::support::script::assert_heard;

/// C sounds as in equal temperament.
fn motet(black_keys: &str, more: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}}}\n\
         synths: {{synth: {{port: virtual, tail_ms: 0}}}}\n\
         set: [{{song: Motet, tuning: quarter-comma-meantone, by_chord: yes, black_keys: [{black_keys}]{more}, \
         pitch: {{key: A4, hz: 440, pin: tonic}}}}, {{song: Other, tuning: quarter-comma-meantone}}]\n\
         cues: [{{when: {{controller: 82}}, do: black-key Ab, while: held}}]\n"
    ))
}

fn two_names(more: &str) -> Rig {
    motet("C# or Db, Eb or D#, F#, G# or Ab, Bb", more)
}

/// What a script made the G# key sound, note by note, in cents above its C.
fn g_sharps(rig: &mut Rig, script: &str) -> Vec<f64> {
    let before = rig.heard().notes.len();
    rig.play(script);
    let notes = rig.heard().notes[before..].iter();
    let cents = notes.map(|note| (note.onset_cents() - 6000.0).rem_euclid(1200.0));
    cents
        .filter(|cents| (760.0..830.0).contains(cents))
        .map(|cents| (cents * 10.0).round() / 10.0)
        .collect()
}

const G_SHARP: f64 = 772.6;
const A_FLAT: f64 = 813.7;

#[test]
fn n03_e_major_has_g_sharp_and_f_minor_has_a_flat() {
    let mut rig = two_names("");
    assert_heard(
        &rig.play(
            "0 chord E4 G#4 B4
             900 off E4
             900 off G#4
             900 off B4
             1000 chord F4 G#4 C5",
        ),
        "0 64 sounds 6386.3
         0 68 sounds 6772.6
         0 71 sounds 7082.9
         900 64 ends
         900 68 ends
         900 71 ends
         1000 65 sounds 6503.4
         1000 68 sounds 6813.7
         1000 72 sounds 7200.0",
    );
    let names = rig.engine.report().black_keys;
    let names: Vec<String> = names
        .iter()
        .flatten()
        .map(|name| name.to_string())
        .collect();
    assert_eq!(names, ["C#", "Eb", "Ab"]);
}

#[test]
fn n16_every_cadence_has_its_pure_third() {
    // A third of a chord struck as one, above its root, in all of these keys one after the other.
    let mut rig = motet("C# or Db, Eb or D#, F# or Gb, G# or Ab, Bb or A#", "");
    let chords = [
        ("E3 G#3 B3", 386.3),
        ("A3 C#4 E4", 386.3),
        ("B3 D#4 F#4", 386.3),
        ("F#3 A#3 C#4", 386.3),
        ("C4 E4 G4", 386.3),
        ("C4 Eb4 G4", 310.3),
        ("F3 Ab3 C4", 310.3),
        ("Ab3 C4 Eb4", 386.3),
        ("Bb3 Db4 F4", 310.3),
        ("Db4 F4 Ab4", 386.3),
    ];
    for (place, (chord, third)) in (1..).zip(chords) {
        let before = rig.heard().notes.len();
        let at_ms = 1000 * place;
        let offs = chord
            .split(' ')
            .map(|key| format!("{} off {key}", at_ms + 900));
        let offs: Vec<String> = offs.collect();
        rig.play(&format!("{at_ms} chord {chord}\n{}", offs.join("\n")));
        let notes = &rig.heard().notes[before..];
        let above = |note: usize| notes[note].onset_cents() - notes[0].onset_cents();
        assert!((above(1) - third).abs() < 0.1, "{chord}: {}", above(1));
        assert!((above(2) - 696.6).abs() < 0.1, "{chord}: {}", above(2));
    }
}

#[test]
fn alone_a_key_is_its_first_name() {
    assert_eq!(g_sharps(&mut two_names(""), "0 on G#4 90"), [G_SHARP]);
    let mut other_way = motet("Ab or G#", "");
    assert_eq!(g_sharps(&mut other_way, "0 on G#4 90"), [A_FLAT]);
}

#[test]
fn a_key_that_sounds_keeps_its_name_in_every_octave() {
    let held = "0 chord E4 G#4 B4
                500 off E4
                500 off B4
                600 chord F4 C5 G#3
                700 off F4
                700 off C5
                700 off G#3
                700 off G#4
                800 chord F4 G#4 C5";
    assert_eq!(
        g_sharps(&mut two_names(""), held),
        [G_SHARP, G_SHARP, A_FLAT]
    );
    let under_a_pedal = "0 pedal down
                         0 chord E4 G#4 B4
                         500 off E4
                         500 off G#4
                         500 off B4
                         600 chord F4 C5 G#3
                         700 off F4
                         700 off C5
                         700 off G#3
                         800 on G#4 90
                         900 off G#4
                         1000 pedal up
                         1100 chord F4 G#4 C5";
    assert_eq!(
        g_sharps(&mut two_names(""), under_a_pedal),
        [G_SHARP, G_SHARP, G_SHARP, A_FLAT]
    );
}

#[test]
fn in_doubt_a_key_stays_what_it_is() {
    // G, D and D lie between the two names, a little towards the sharp.
    let doubt = "9000 chord G3 D4 G#4 D5";
    assert_eq!(g_sharps(&mut two_names(""), doubt), [G_SHARP]);
    let after_f_minor = "0 chord F4 G#4 C5\n500 off F4\n500 off G#4\n500 off C5";
    let mut rig = two_names("");
    assert_eq!(g_sharps(&mut rig, after_f_minor), [A_FLAT]);
    assert_eq!(g_sharps(&mut rig, doubt), [A_FLAT]);
}

#[test]
fn by_hand_goes_before_the_harmony_until_home() {
    let e_major = "chord E4 G#4 B4";
    let mut rig = two_names("");
    let script = |tell: &str, at: u64| {
        format!(
            "{at} {tell}\n{} {e_major}\n{} off E4\n{} off G#4\n{} off B4",
            at + 10,
            at + 90,
            at + 90,
            at + 90
        )
    };
    assert_eq!(
        g_sharps(&mut rig, &script("tell black-key Ab", 0)),
        [A_FLAT]
    );
    let told: Vec<String> = rig
        .engine
        .told()
        .black_keys()
        .map(|name| name.to_string())
        .collect();
    assert_eq!(told, ["Ab"]);
    assert_eq!(g_sharps(&mut rig, &script("tell home", 100)), [G_SHARP]);
    // What the harmony chooses is not told, so it is not remembered either.
    assert_eq!(rig.engine.told().black_keys().count(), 0);
    // Held it lasts as long.
    assert_eq!(g_sharps(&mut rig, &script("cc 82 127", 200)), [A_FLAT]);
    assert_eq!(g_sharps(&mut rig, &script("cc 82 0", 300)), [G_SHARP]);
    // The first name can be told, too.
    let f_minor = "410 chord F4 G#4 C5";
    assert_eq!(
        g_sharps(&mut rig, &format!("400 tell black-key G#\n{f_minor}")),
        [G_SHARP]
    );
    assert_eq!(rig.engine.told().black_keys().count(), 1);
}

#[test]
fn only_between_the_names_that_are_allowed() {
    let mut rig = motet("G# or Ab", "");
    rig.play("0 chord B3 Eb4 F#4");
    let third = rig.onsets[1].1.target - rig.onsets[0].1.target;
    assert!((third.cents() - 427.373).abs() < 0.001, "{third:?}");
}

#[test]
fn a_song_begins_with_first_names() {
    let mut rig = two_names("");
    let f_minor = "0 chord F4 G#4 C5\n50 off F4\n50 off G#4\n50 off C5";
    assert_eq!(g_sharps(&mut rig, f_minor), [A_FLAT]);
    assert_eq!(
        g_sharps(&mut rig, "100 next\n600 back\n700 on G#4 90"),
        [G_SHARP]
    );
}

#[test]
fn hands_that_spread_a_chord_name_it_by_what_has_come() {
    let mut rig = two_names("");
    let spread = "0 on F3 90\n20 on C4 90\n40 on G#4 90";
    assert_eq!(g_sharps(&mut rig, spread), [A_FLAT]);
}

#[test]
fn where_chords_are_followed_the_name_is_where_they_rest() {
    let mut rig = two_names(", intonation: chord-root");
    rig.play("0 chord E4 G#4 B4\n900 off E4\n900 off G#4\n900 off B4\n1000 chord F4 G#4 C5");
    let cents: Vec<f64> = rig
        .onsets
        .iter()
        .map(|(_, onset)| onset.target.cents())
        .collect();
    for (at, rest) in [(1, 6772.6), (4, 6813.7)] {
        assert!((cents[at] - rest).abs() <= 12.0, "{cents:?}");
    }
    assert!((cents[1] - cents[0] - 386.31).abs() < 0.02, "{cents:?}");
    assert!((cents[4] - cents[3] - 315.64).abs() < 0.02, "{cents:?}");
}

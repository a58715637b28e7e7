//! One black key stands for two notes (need N03).
//!
//! Quarter-comma meantone above C: G# 772.627, Ab 813.686, Eb 310.265, D# 269.206 cents (the printed tables of meantone
//! beyond twelve notes; Ab above G# by 128/125 = 41.059).

use crate::support::rig::Rig;
use crate::support::script::assert_heard;

/// C sounds as in equal temperament.
fn canzona(more: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}}}\n\
         synths: {{synth: {{port: virtual, tail_ms: 0}}}}\n\
         tunings: {{long: {{fifths: {{chain: [Ab, Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#, D#], \
         each: narrow 1/4 syntonic}}}}}}\n\
         set: [{{song: Canzona, tuning: long, black_keys: [C#, Eb or D#, F#, G# or Ab, Bb]{more}, \
         pitch: {{key: A4, hz: 440, pin: tonic}}}}, {{song: Other, tuning: long}}]\n"
    ))
}

#[test]
fn n03_the_other_note_of_a_black_key_from_the_next_note_on() {
    let mut rig = canzona("");
    assert_heard(
        &rig.play(
            "0 on G#4 90
             10 tell black-key Ab
             20 on Ab3 90
             30 off G#4
             40 on G#4 90
             50 off Ab3
             60 off G#4
             70 on Eb4 90
             80 off Eb4
             90 tell black-key D#
             100 on Eb4 90
             110 off Eb4
             120 tell black-key G#
             130 on G#4 90
             140 off G#4",
        ),
        "0 68 sounds 6772.6
         20 56 sounds 5613.7
         30 68 ends
         40 68 sounds 6813.7
         50 56 ends
         60 68 ends
         70 63 sounds 6310.3
         80 63 ends
         100 63 sounds 6269.2
         110 63 ends
         130 68 sounds 6772.6
         140 68 ends",
    );
}

#[test]
fn a_song_change_and_home_put_black_keys_back() {
    for back in ["next\n500 back", "home"] {
        let mut rig = canzona("");
        rig.play(&format!(
            "0 tell black-key Ab\n10 {}",
            if back == "home" { "tell home" } else { back }
        ));
        rig.play("600 on G#4 90");
        assert_eq!(rig.onsets[0].1.target.cents().round(), 6773.0, "{back}");
    }
}

#[test]
fn a_key_with_one_name_is_never_flipped() {
    let mut rig = canzona("");
    rig.play("0 next\n10 tell black-key Ab\n20 on G#4 90");
    assert_eq!(rig.engine.report().counters.ignored, 1);
    // The second song's G# key is the last G# or Ab of the chain.
    let stage = rig.stage.as_ref().expect("a stage");
    let at_rest = stage.set[1]
        .tuning
        .pitch(trued::tuning::Key::parse("G#4").expect("a key"));
    assert_eq!(Some(rig.onsets[0].1.target), at_rest);
}

#[test]
fn what_the_song_turns_on_purpose_turns_both_names() {
    // Turned so that C's place is D's: the chain runs from Bb to E#, and the G# key may be G# alone; Eb may be D#.
    let mut rig = canzona(", turned_to: D");
    rig.play("0 on Eb4 90\n10 tell black-key D#\n20 on Eb4 90");
    let apart = rig.onsets[0].1.target - rig.onsets[1].1.target;
    assert!((apart.cents() - 41.059).abs() < 0.001, "{apart:?}");
}

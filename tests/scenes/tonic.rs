//! The tonic moved while playing (need N06), apart from reference and transposition (N04).
//!
//! The just scale in C puts A at 5/3 (884.359 cents) and D at 9/8 (203.910): D-A is 40/27, a comma of 21.506 narrow.

use crate::support::rig::Rig;
use crate::support::script::assert_heard;

fn just(cues: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
         synths: {{synth: {{port: virtual, tail_ms: 0}}}}\n\
         tunings: {{just: {{pitches: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 45/32, 3/2, 8/5, 5/3, 9/5, 15/8]}}}}\n\
         set: [{{song: Motet, tuning: just, pitch: C4 = 261.625565 Hz}}, {{song: Well, tuning: vallotti}}]\n\
         cues: [{cues}]\n"
    ))
}

/// From the C of equal temperament, so that the numbers are those of the scale.
#[test]
fn n06_three_ways_to_move_it_and_a_sure_way_back() {
    for (told, d, a, c) in [
        // The reference stays: C, now 9/5 above the tonic, sounds as before. So D is 9/5 below it: 10/9 above the C below.
        ("tonic D", 6182.4, 6884.4, 6000.0),
        ("tonic D absolute", 6182.4, 6884.4, 6000.0),
        // D stays where it was, and all others count from it.
        ("tonic D pivot", 6203.9, 6905.9, 6021.5),
        ("tonic D equal", 6200.0, 6902.0, 6017.6),
    ] {
        let mut rig = just("");
        rig.play(&format!(
            "0 tell {told}\n10 on D4 90\n20 on A4 90\n30 on C4 90\n40 tell tonic home\n50 on C5 90"
        ));
        let heard: Vec<f64> = rig
            .onsets
            .iter()
            .map(|(_, o)| (o.target.cents() * 10.0).round() / 10.0)
            .collect();
        assert_eq!(heard, [d, a, c, 7200.0], "{told}");
    }
}

#[test]
fn n06_how_far_it_has_gone_is_reported() {
    let mut rig = just("");
    // Round four chords, each by a pivot: D from C (9/8), G from D (4/3 up), C from G (4/3): a comma sharp.
    rig.play("0 tell tonic D pivot\n10 tell tonic G pivot\n20 tell tonic C pivot");
    let report = rig.engine.report();
    assert_eq!(
        report.tonic.map(|letter| letter.to_string()).as_deref(),
        Some("C")
    );
    // 9/8 x 4/3 x 4/3 = 2: no comma here, the way by A brings one.
    assert!(report.tonic_from_home.cents().abs() < 1e-5);
    rig.play("30 tell tonic A pivot\n40 tell tonic D pivot\n50 tell tonic G pivot\n60 tell tonic C pivot");
    // 5/3 x 4/3 x 4/3 x 4/3 = 320/81, which is two octaves less 81/80.
    let far = rig.engine.report().tonic_from_home.cents();
    assert!((far + 21.506).abs() < 0.001, "{far}");
    rig.play("70 tell tonic home");
    assert_eq!(rig.engine.report().tonic_from_home.cents(), 0.0);
}

#[test]
fn n07_held_notes_stay_and_none_sticks() {
    let mut rig = just("");
    assert_heard(
        &rig.play(
            "0 on D4 90
             10 pedal down
             20 tell tonic D pivot
             30 on A4 90
             40 tell tonic home
             50 off D4
             60 off A4
             70 pedal up",
        ),
        "0 62 sounds 6203.9
         30 69 sounds 6905.9
         50 62 let go, held by a pedal
         60 69 let go, held by a pedal
         70 62 ends
         70 69 ends",
    );
}

#[test]
fn n06_a_pedal_and_the_next_key_which_is_silent() {
    let mut rig = just("{when: {controller: 67}, do: tonic next-key pivot, while: held}");
    assert_heard(
        &rig.play(
            "0 cc 67 127
             10 on D4 90
             20 on A4 90
             30 off D4
             40 off A4
             50 cc 67 0
             60 cc 67 127
             70 cc 67 0
             80 on C4 90
             90 off C4",
        ),
        "20 69 sounds 6905.9
         40 69 ends
         80 60 sounds 6021.5
         90 60 ends",
    );
    assert_eq!(rig.engine.report().counters.orphans, 0);
}

#[test]
fn the_next_key_sounds_where_the_cue_passes_it_on_and_the_wait_is_told_off() {
    let mut rig = just(
        "{when: {note: C2, from: pads}, do: tonic next-key pivot, pass: yes}, {when: {note: D2, from: pads}, do: tonic home}",
    );
    let heard = rig.play("0 second on C2 90\n5 second off C2\n10 on D4 90\n20 off D4");
    assert!(heard.contains("10 62 sounds 6203.9"), "{heard}");
    assert!(!rig.engine.report().waits_for_key);
    rig.play("30 second on C2 90\n35 second off C2");
    assert!(rig.engine.report().waits_for_key);
    rig.play("40 second on D2 90\n45 second off D2");
    assert!(!rig.engine.report().waits_for_key);
    for ends in ["second lost", "next", "tell home"] {
        rig.play(&format!("1000 second on C2 90\n1000 {ends}"));
        assert!(!rig.engine.report().waits_for_key, "{ends}");
        rig.play("1000 song 1");
    }
}

#[test]
fn a_tuning_by_letter_takes_no_tonic() {
    let mut rig = just("");
    rig.play("0 next\n10 tell tonic D\n20 tell tonic next-key\n30 tell tonic home\n40 on D4 90");
    assert_eq!(rig.engine.report().counters.ignored, 3);
    assert_eq!(rig.engine.report().tonic, None);
    assert_eq!(rig.onsets.len(), 1);
}

#[test]
fn n04_transposition_moves_keys_the_tonic_the_scale_and_pitch_everything() {
    let mut rig = just("");
    let mut last = |script: &str| {
        rig.play(script);
        let (_, onset) = rig.onsets.last().expect("a note");
        (onset.target.cents() * 10.0).round() / 10.0
    };
    assert_eq!(last("0 on A4 90\n1 off A4"), 6884.4);
    assert_eq!(
        last("10 tell transpose -1\n11 on Bb4 90\n12 off Bb4"),
        6884.4,
        "as the A key sounded"
    );
    assert_eq!(
        last("20 tell transpose home\n21 tell pitch -100 c\n22 on A4 90\n23 off A4"),
        6784.4
    );
    assert_eq!(
        last("30 tell pitch home\n31 tell tonic A\n32 on A4 90\n33 off A4"),
        6884.4 + 0.0
    );
}

#[test]
fn scales_of_other_counts_of_keys_take_a_tonic_too() {
    let mut rig = Rig::of(
        "keyboards: {keys: {port: virtual}}\nsynths: {synth: {port: virtual}}\n\
         set: [{song: A, tuning: bohlen-pierce}]\n\
         cues: [{when: {controller: 67}, do: tonic next-key equal, while: held}]\n",
    );
    rig.play("0 cc 67 127\n10 on D5 90\n20 off D5\n30 on D5 90\n40 on Eb6 90");
    let cents: Vec<f64> = rig.onsets.iter().map(|(_, o)| o.target.cents()).collect();
    assert_eq!(cents[0], 7400.0);
    // Thirteen keys to the twelfth, 3/1 = 1901.955 cents.
    assert!((cents[1] - cents[0] - 1901.955).abs() < 0.001, "{cents:?}");
}

//! What a cue can hear besides switches and keys: values of a controller, pressure, banks, song select, ranges of keys.

use crate::support::rig::Rig;
use crate::support::script::assert_heard;

/// Five songs at A = 440, the last a just scale in C.
fn evening(cues: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
         synths: {{synth: {{port: virtual, tail_ms: 0}}}}\n\
         tunings: {{just: {{pitches: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 45/32, 3/2, 8/5, 5/3, 9/5, 15/8]}}}}\n\
         set: [{{song: A}}, {{song: B}}, {{song: C}}, {{song: D}}, {{song: E, tuning: just, pitch: C4 = 261.625565 Hz}}]\n\
         cues: [{cues}]\n"
    ))
}

fn song(rig: &mut Rig, script: &str) -> u16 {
    rig.play(script);
    rig.engine.report().song
}

#[test]
fn values_of_one_controller_are_cues_of_their_own() {
    let mut rig = evening(
        "{when: {controller: 20, value: 1}, do: song A}, {when: {controller: 20, value: 2}, do: song B}, \
         {when: {controller: 20, value: 40..80}, do: song C}, {when: {controller: 20, value: 100..}, do: song D}",
    );
    assert_eq!(song(&mut rig, "10 cc 20 2"), 1);
    assert_eq!(song(&mut rig, "20 cc 20 1"), 0);
    assert_eq!(song(&mut rig, "30 cc 20 41"), 2);
    assert_eq!(
        song(&mut rig, "40 song 1\n50 cc 20 79"),
        0,
        "it is in already"
    );
    assert_eq!(song(&mut rig, "60 cc 20 81\n70 cc 20 80"), 2);
    assert_eq!(song(&mut rig, "80 cc 20 90"), 2);
    assert_eq!(song(&mut rig, "90 cc 20 127"), 3);
    // All of the controller is theirs.
    assert_eq!(rig.heard().controller(0, 20), None);
}

#[test]
fn a_button_that_sends_one_value_over_and_over_is_pressed_each_time() {
    let mut rig = evening("{when: {controller: 20, value: 3}, do: next}");
    assert_eq!(song(&mut rig, "10 cc 20 3"), 1);
    assert_eq!(song(&mut rig, "1000 cc 20 3"), 2);
    assert_eq!(song(&mut rig, "2000 cc 20 4\n3000 cc 20 3"), 3);
    let mut nought = evening("{when: {controller: 20, value: 0}, do: next}");
    assert_eq!(song(&mut nought, "10 cc 20 0"), 1, "the first time too");
}

#[test]
fn from_one_range_into_another_what_was_held_is_let_go_first() {
    let mut rig = evening(
        "{when: {controller: 20, value: 90..}, do: transpose +5, while: held}, \
         {when: {controller: 20, value: 40..80}, do: transpose +2, while: held}",
    );
    let mut at = |script: &str| {
        rig.play(script);
        rig.engine.report().transpose_keys
    };
    assert_eq!(at("10 cc 20 60"), 2);
    assert_eq!(at("20 cc 20 100"), 5);
    assert_eq!(at("30 cc 20 50"), 2);
    assert_eq!(at("40 cc 20 85"), 0);
    assert_eq!(at("50 cc 20 127\n60 lost"), 0);
}

#[test]
fn pressure_is_a_switch_where_a_cue_says_how_deep() {
    let mut rig = evening("{when: {pressure: 90..}, do: next}");
    assert_eq!(
        song(&mut rig, "10 on C4 90\n20 send D0 40\n30 send D0 59"),
        0
    );
    assert_eq!(song(&mut rig, "40 send D0 5A"), 1);
    assert_eq!(song(&mut rig, "900 send D0 7F\n910 send D0 00"), 1);
    let mark = rig.sent.len();
    assert_eq!(song(&mut rig, "1000 send D0 7F\n1010 send D0 10"), 2);
    assert_eq!(rig.sent_since(mark), [""; 0], "the synth hears none of it");
    let mut passed = evening("{when: {pressure: 90.., press: up}, do: next, pass: yes}");
    passed.play("10 on C4 90");
    let mark = passed.sent.len();
    assert_eq!(song(&mut passed, "20 send D0 64"), 0);
    assert_eq!(passed.sent_since(mark), ["D0 64"]);
    assert_eq!(song(&mut passed, "30 send D0 00"), 1);
}

#[test]
fn a_long_deep_press_is_another_cue_than_a_short_one() {
    let mut rig = evening(
        "{when: {pressure: 90..}, do: next}, {when: {pressure: 90.., press: long}, do: song E}",
    );
    assert_eq!(song(&mut rig, "10 send D0 70\n300 send D0 00"), 1);
    assert_eq!(song(&mut rig, "1000 send D0 70\n1799 wait"), 1);
    assert_eq!(song(&mut rig, "1800 wait\n1900 send D0 00"), 4);
}

#[test]
fn a_program_of_a_bank_is_not_that_of_another() {
    let mut rig = evening(
        "{when: {program: 5, bank: 1/2}, do: song B}, {when: {program: 5, bank: 3}, do: song C}, \
         {when: {program: any, bank: 7}, do: song}",
    );
    assert_eq!(song(&mut rig, "10 program 4"), 0, "bank 0");
    assert_eq!(song(&mut rig, "20 cc 0 1\n21 cc 32 2\n22 program 4"), 1);
    assert_eq!(song(&mut rig, "30 cc 32 9\n31 program 4"), 1);
    assert_eq!(
        song(&mut rig, "40 cc 0 3\n41 program 4"),
        2,
        "whatever controller 32 says"
    );
    assert_eq!(
        song(&mut rig, "50 cc 0 7\n51 program 3"),
        3,
        "a number is a place in the set"
    );
    assert_eq!(rig.heard().program(0), Some(4), "the last that no cue took");
}

#[test]
fn song_select_comes_on_no_channel_and_counts_like_programs() {
    let mut rig = Rig::of(
        "keyboards: {keys: {port: virtual, channel: 3}}\nsynths: {synth: {port: virtual}}\n\
         set: [{song: A}, {song: B}, {song: C}, {song: D}]\n\
         cues: [{when: {song_select: any, from: keys}, do: song}]\n",
    );
    let mark = rig.sent.len();
    assert_eq!(song(&mut rig, "10 send F3 02"), 2);
    assert_eq!(song(&mut rig, "20 send F3 7F"), 2);
    assert_eq!(rig.engine.report().counters.ignored, 1, "beyond the set");
    assert!(
        !rig.sent_since(mark)
            .iter()
            .any(|sent| sent.starts_with("F3"))
    );
    let mut one = evening("{when: {song_select: 4}, do: song E, pass: yes}");
    let mark = one.sent.len();
    assert_eq!(song(&mut one, "10 send F3 02"), 0);
    assert_eq!(song(&mut one, "20 send F3 03"), 4);
    let passed = one.sent_since(mark);
    assert!(passed.contains(&"F3 02".to_string()) && passed.contains(&"F3 03".to_string()));
}

/// 9/8 is 203.910 cents, 5/3 884.359.
#[test]
fn n06_a_range_of_keys_names_tonics_directly() {
    for (by, d, a) in [
        // C, 9/8 below D, keeps its place: D is 10/9 above it.
        ("", 6182.4, 6884.4),
        (" pivot", 6203.9, 6905.9),
        (" equal", 6200.0, 6902.0),
    ] {
        let mut rig = evening(&format!(
            "{{when: {{notes: C1..B1, from: pads}}, do: tonic{by}}}"
        ));
        let heard = rig.play(
            "0 song 5\n10 second on D1 90\n20 second off D1\n30 on D4 90\n40 on A4 90\n50 on D1 90",
        );
        assert_heard(
            &heard,
            &format!(
                "30 62 sounds {d:.1}\n40 69 sounds {a:.1}\n50 26 sounds {:.1}",
                d - 3600.0
            ),
        );
        assert_eq!(
            rig.engine.report().tonic.map(|t| t.to_string()).as_deref(),
            Some("D")
        );
        rig.play("60 second on Eb1 90");
        assert_eq!(
            rig.engine.report().tonic.map(|t| t.to_string()).as_deref(),
            Some("Eb")
        );
    }
}

#[test]
fn n06_such_keys_can_hold_a_tonic_and_may_sound() {
    let mut rig = evening("{when: {notes: C1..B1}, do: tonic pivot, while: held, pass: yes}");
    let heard = rig.play("0 song 5\n10 on D1 90\n20 on A4 90\n30 off D1\n40 off A4\n50 on A4 90");
    assert_heard(
        &heard,
        "10 26 sounds 2603.9\n20 69 sounds 6905.9\n30 26 ends\n40 69 ends\n50 69 sounds 6884.4",
    );
    // Two held: the latest is meant, and what is left when it goes is the other.
    let tonic = |rig: &Rig| rig.engine.report().tonic.map(|t| t.to_string());
    rig.play("60 on F1 90\n70 on G1 90");
    assert_eq!(tonic(&rig).as_deref(), Some("G"));
    rig.play("80 off G1");
    assert_eq!(tonic(&rig).as_deref(), Some("F"));
    rig.play("90 lost");
    assert_eq!(tonic(&rig).as_deref(), Some("C"));
}

#[test]
fn a_key_for_the_next_key_is_none_of_a_cue() {
    let mut rig =
        evening("{when: {controller: 67}, do: tonic next-key}, {when: {notes: C1..B1}, do: tonic}");
    rig.play("0 song 5\n10 cc 67 127\n20 on E1 90\n30 off E1");
    let report = rig.engine.report();
    assert!(report.waits_for_key, "E1 names a tonic by itself");
    assert_eq!(report.tonic.map(|t| t.to_string()).as_deref(), Some("E"));
}

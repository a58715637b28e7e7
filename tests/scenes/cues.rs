//! Cues: every form of a press, what waits for quiet, what is taken away from the synth.

use crate::support::rig::Rig;
use crate::support::script::assert_heard;

/// Five songs, and one cue on controller 82 unless more are given.
fn evening(cues: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
         synths: {{synth: {{port: virtual}}}}\n\
         set: [{{song: A}}, {{song: B}}, {{song: C}}, {{song: D}}, {{song: E}}]\n\
         cues: [{cues}]\n"
    ))
}

fn song(rig: &mut Rig, script: &str) -> u16 {
    rig.play(script);
    rig.engine.report().song
}

#[test]
fn down_fires_on_rising_through_64_and_up_on_falling() {
    let mut down = evening("{when: {controller: 82}, do: next}");
    assert_eq!(song(&mut down, "10 cc 82 63"), 0);
    assert_eq!(song(&mut down, "20 cc 82 64\n30 cc 82 127\n40 cc 82 0"), 1);
    let mut up = evening("{when: {controller: 82, press: up}, do: next}");
    assert_eq!(song(&mut up, "10 cc 82 0\n20 cc 82 127"), 0);
    assert_eq!(song(&mut up, "30 cc 82 64"), 0);
    assert_eq!(song(&mut up, "40 cc 82 63"), 1);
}

#[test]
fn either_fires_on_both_edges_of_a_latching_switch() {
    let mut rig = evening("{when: {controller: 84, press: either}, do: next}");
    assert_eq!(song(&mut rig, "10 cc 84 127"), 1);
    assert_eq!(song(&mut rig, "1000 cc 84 0"), 2);
    assert_eq!(song(&mut rig, "2000 cc 84 127"), 3);
    assert_eq!(
        song(&mut rig, "2100 cc 84 0"),
        3,
        "within 400 ms it is a bounce"
    );
}

#[test]
fn a_long_press_fires_while_held_and_once() {
    let mut rig = evening("{when: {controller: 82, press: long, long_ms: 1500}, do: next}");
    assert_eq!(song(&mut rig, "10 cc 82 127\n1509 wait"), 0);
    assert_eq!(song(&mut rig, "1510 wait"), 1);
    assert_eq!(song(&mut rig, "9000 cc 82 0"), 1);
    assert_eq!(
        song(&mut rig, "9100 cc 82 127\n10599 cc 82 0\n12000 wait"),
        1
    );
}

#[test]
fn beside_a_long_press_the_short_one_waits_for_the_release() {
    for press in ["down", "up"] {
        let mut rig = evening(&format!(
            "{{when: {{note: D2, press: {press}}}, do: next}},\n\
             {{when: {{note: D2, press: long}}, do: song E}}"
        ));
        assert_eq!(song(&mut rig, "10 on D2 90\n300 wait"), 0);
        assert_eq!(song(&mut rig, "400 off D2"), 1, "short");
        assert_eq!(
            song(&mut rig, "1000 on D2 90\n1800 wait"),
            4,
            "long, after the usual 800 ms"
        );
        assert_eq!(
            song(&mut rig, "1900 back\n3000 off D2"),
            3,
            "a long one is no short one as well"
        );
        assert!(rig.heard().notes.is_empty() && rig.engine.report().counters.orphans == 0);
    }
}

#[test]
fn a_lost_keyboard_lets_go_its_presses_and_fires_nothing() {
    let mut rig = evening(
        "{when: {controller: 82, press: long}, do: next}, {when: {controller: 83, press: up}, do: next}",
    );
    assert_eq!(
        song(&mut rig, "10 cc 82 127\n20 cc 83 127\n100 lost\n5000 wait"),
        0
    );
    assert!(rig.engine.poll_timeout().is_none());
    // Where it is plugged in again its switch is up as far as anybody knows.
    assert_eq!(song(&mut rig, "6000 cc 83 0\n6500 cc 82 127\n7300 wait"), 1);
}

#[test]
fn programs_count_from_one_and_beyond_the_set_they_are_counted() {
    let mut rig = evening("{when: {program: any, channel: 1}, do: song}");
    assert_eq!(song(&mut rig, "10 program 2"), 2);
    assert_eq!(song(&mut rig, "20 program 9"), 2);
    assert_eq!(rig.engine.report().counters.ignored, 1);
    assert_eq!(rig.heard().program(0), None, "it is taken from the synth");
    let mut one = evening("{when: {program: 5}, do: song B, pass: yes}");
    assert_eq!(song(&mut one, "10 program 3"), 0);
    assert_eq!(song(&mut one, "20 program 4\n30 on C4 90"), 1);
    assert_eq!(one.heard().program(0), Some(4), "it goes on as well");
}

#[test]
fn at_quiet_is_armed_now_and_in_force_when_all_hands_are_off() {
    let mut rig = evening("{when: {controller: 82}, do: next, at: quiet}");
    assert_eq!(
        song(
            &mut rig,
            "10 on C4 90\n20 pedal down\n30 second on E4 90\n40 cc 82 127\n41 cc 82 0"
        ),
        0
    );
    assert_eq!(rig.engine.report().armed_song, Some(1));
    assert_eq!(
        song(&mut rig, "600 cc 82 127\n601 cc 82 0\n700 off C4"),
        0,
        "it does not arm twice"
    );
    assert_eq!(rig.engine.report().armed, 1);
    assert_eq!(song(&mut rig, "800 second off E4"), 0);
    assert_eq!(song(&mut rig, "900 pedal up"), 1);
    assert_eq!(
        (rig.engine.report().armed, rig.engine.report().armed_song),
        (0, None)
    );
    assert_eq!(
        song(&mut rig, "2000 cc 82 127"),
        2,
        "where all is quiet it is in force at once"
    );
}

#[test]
fn keys_that_sound_nothing_are_held_all_the_same_and_those_of_cues_are_not() {
    let mut rig = evening(
        "{when: {controller: 82}, do: next, at: quiet}, {when: {note: D2, from: pads}, do: back, at: quiet}",
    );
    assert_eq!(
        song(&mut rig, "10 synth tight\n20 on C4 90\n30 cc 82 127"),
        0
    );
    assert_eq!(rig.engine.report().counters.refused, 1);
    assert_eq!(song(&mut rig, "40 off C4"), 1);
    assert_eq!(
        song(&mut rig, "1000 second on D2 90"),
        0,
        "the cue's own key is not in the way"
    );
}

#[test]
fn a_cue_s_own_pedal_is_in_the_way_only_where_it_passes() {
    let mut taken = evening("{when: {controller: 67}, do: next, at: quiet}");
    assert_eq!(song(&mut taken, "10 cc 67 127"), 1);
    let mut passed = evening("{when: {controller: 67}, do: next, at: quiet, pass: yes}");
    assert_eq!(song(&mut passed, "10 cc 67 127"), 0);
    assert_eq!(song(&mut passed, "20 cc 67 0"), 1);
}

#[test]
fn a_song_chosen_otherwise_takes_the_place_of_the_armed_one() {
    let mut rig = evening("{when: {controller: 82}, do: next, at: quiet}");
    assert_eq!(
        song(
            &mut rig,
            "10 on C4 90\n20 cc 82 127\n500 tell song D\n600 off C4"
        ),
        3
    );
}

#[test]
fn panic_fires_nothing_that_is_armed() {
    let mut rig = evening("{when: {controller: 82}, do: next, at: quiet}");
    assert_eq!(song(&mut rig, "10 on C4 90\n20 cc 82 127\n500 panic"), 0);
    assert_eq!(rig.engine.report().armed_song, Some(1));
    assert_eq!(song(&mut rig, "600 off C4"), 1);
}

#[test]
fn a_lost_keyboard_is_quiet() {
    let mut rig = evening("{when: {controller: 82}, do: next, at: quiet}");
    assert_eq!(
        song(
            &mut rig,
            "10 second on C4 90\n20 cc 82 127\n500 second lost"
        ),
        1
    );
}

#[test]
fn what_a_cue_hears_is_taken_away_unless_it_passes() {
    let mut rig = evening(
        "{when: {note: C2}, do: panic}, {when: {note: E2}, do: plain, pass: yes}, \
         {when: {controller: 11, press: long}, do: home}, {when: {controller: 64, from: pads}, do: next}",
    );
    let heard = rig.play(
        "10 on C2 90
         20 off C2
         30 on E2 90
         40 off E2
         50 cc 11 90
         60 cc 11 20
         70 on A4 90
         80 second cc 64 127
         90 off A4",
    );
    assert_heard(
        &heard,
        "30 40 sounds 4000.0
         40 40 ends
         70 69 sounds 6900.0
         90 69 ends",
    );
    assert_eq!(rig.heard().controller(0, 11), None);
    assert!(rig.engine.report().plain && rig.engine.report().song == 1);
}

#[test]
fn up_fires_for_a_key_that_sounds_as_well() {
    let mut rig = evening("{when: {note: E2, press: up}, do: next, pass: yes}");
    assert_eq!(song(&mut rig, "10 on E2 90\n20 wait"), 0);
    assert_eq!(song(&mut rig, "30 off E2"), 1);
    assert!(rig.heard().stuck().is_empty());
}

#[test]
fn a_cue_counts_on_its_own_keyboard_and_channel() {
    let mut rig = evening("{when: {controller: 82, from: keys, channel: 1}, do: next}");
    assert_eq!(song(&mut rig, "10 second cc 82 127\n20 send B1 52 7F"), 0);
    assert_eq!(song(&mut rig, "30 cc 82 127"), 1);
}

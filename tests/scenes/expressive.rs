//! Expressive keyboards: each note on a channel of its own, with bend, pressure and brightness of its own. And the
//! ordinary player's wheel and pressure, for their own part only.

use crate::support::rig::Rig;
use crate::support::script::assert_heard;

/// An expressive keyboard and an ordinary one on a synth; C is 10 cents up, E 14 down.
fn rig(keys: &str, synth: &str, parts: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual, sends: mpe{keys}}}, pads: {{port: virtual}}}}\n\
         synths: {{organ: {{port: virtual{synth}}}}}\n\
         {parts}\n\
         tunings: {{crooked: {{like: equal-12, change: {{C: +10 c, E: -14 c}}}}}}\n\
         set: [{{song: One, tuning: crooked}}]\n"
    ))
}

const MPE: &str = ", dialect: mpe";
const WIDE: &str = ", bend_range: 48";

/// The notes of the first synth that are held or pedalled: number and cents, rounded to a tenth.
fn sounding(rig: &Rig) -> Vec<(u8, f64)> {
    let notes = rig.heard().sounding().into_iter();
    let rounded = |cents: f64| (cents * 10.0).round() / 10.0;
    notes
        .map(|note| (note.number, rounded(note.cents())))
        .collect()
}

/// Half a step of 48 semitones, and of a wheel of two that an MPE synth's manager carries.
const HALF_STEP_CENTS: f64 = 4800.0 / 8192.0 / 2.0 + 200.0 / 8192.0 / 2.0 + 1e-6;

#[track_caller]
fn assert_sounding(rig: &Rig, wanted: &[(u8, f64)]) {
    let heard = sounding(rig);
    let near = |((number, cents), (n, c)): (&(u8, f64), &(u8, f64))| {
        number == n && (cents - c).abs() <= HALF_STEP_CENTS + 0.05
    };
    let alike = heard.len() == wanted.len() && heard.iter().zip(wanted).all(near);
    assert!(alike, "heard {heard:?}, wanted {wanted:?}");
}

/// A quarter of a semitone up, of a full bend of 48: 8192 + 43 (25.2 cents; MIDI 1.0 p. 19).
#[test]
fn a_finger_s_bend_comes_before_its_note_and_is_in_its_onset() {
    for synth in [MPE, WIDE] {
        let mut rig = rig("", synth, "");
        rig.play("10 send E1 2B 40 91 3C 64\n20 send 92 40 64");
        assert_sounding(&rig, &[(60, 6035.2), (64, 6386.0)]);
        assert!(rig.heard().notes.iter().all(|note| note.pitch.len() == 1));
    }
}

#[test]
fn each_finger_moves_its_own_note_by_so_much_from_its_tuning() {
    for synth in [MPE, WIDE] {
        let mut rig = rig("", synth, "");
        rig.play("10 send 91 3C 64 92 40 64 93 43 64\n100 send E2 00 50");
        // 0x50 << 7 = 10240: a quarter of 48 semitones up.
        assert_sounding(&rig, &[(60, 6010.0), (64, 7586.0), (67, 6700.0)]);
        rig.play("200 send E2 00 40 E3 2B 40");
        assert_sounding(&rig, &[(60, 6010.0), (64, 6386.0), (67, 6725.2)]);
    }
}

#[test]
fn once_the_key_is_up_its_finger_moves_nothing_of_what_rings() {
    // MPE 1.1, 2.2.6; a pedal changes nothing of it.
    for synth in [MPE, WIDE] {
        let mut rig = rig("", synth, "");
        rig.play("10 send B0 40 7F 91 3C 64\n100 send E1 00 41\n200 send 81 3C 40");
        let mark = rig.sent.len();
        rig.play("300 send E1 00 60 D1 50 B1 4A 20");
        assert_eq!(rig.sent_since(mark), Vec::<String>::new());
        assert_sounding(&rig, &[(60, 6085.0)]);
        // The next note on that member begins where the finger is now.
        rig.play("400 send 91 43 64");
        assert_sounding(&rig, &[(60, 6085.0), (67, 6700.0 + 2400.0)]);
    }
}

#[test]
fn pressure_and_brightness_reach_the_channel_of_their_own_note() {
    for synth in [MPE, WIDE] {
        let mut rig = rig("", synth, "");
        rig.play("10 send D1 05 B1 4A 30 91 3C 64 92 40 64\n20 send D2 60 B2 4A 70");
        let heard = rig.heard();
        let [first, second] = &heard.notes[..] else {
            panic!("two notes");
        };
        assert_ne!(first.channel, second.channel);
        assert_eq!(
            (
                heard.pressure(first.channel),
                heard.controller(first.channel, 74)
            ),
            (5, Some(0x30))
        );
        assert_eq!(
            (
                heard.pressure(second.channel),
                heard.controller(second.channel, 74)
            ),
            (0x60, Some(0x70))
        );
        let first = first.channel;
        // Both were told before the note.
        let messages = rig.sent_since(0);
        let place = |text: String| messages.iter().position(|message| *message == text);
        let on = place(format!("9{first:X} 3C 64"));
        assert!(place(format!("D{first:X} 05")) < on && place(format!("B{first:X} 4A 30")) < on);
        assert!(rig.heard().prohibited.is_empty() && rig.heard().repeats.is_empty());
    }
}

#[test]
fn brightness_that_a_finger_has_left_does_not_colour_the_next_ordinary_note() {
    for synth in [
        ", dialect: mpe, channels: 1-2",
        ", bend_range: 48, channels: 2",
    ] {
        let mut rig = rig("", synth, "");
        rig.play("10 send B1 4A 70 91 3C 64\n100 send 81 3C 40\n5000 second on D4 100");
        assert_eq!(rig.heard().controller(1, 74), Some(64));
        rig.play(
            "6000 second off D4\n6100 second cc 74 20\n8000 send 91 3C 64\n8100 send 81 3C 40",
        );
        assert_eq!(rig.heard().controller(1, 74), Some(0x70));
        rig.play("12000 second on D4 100");
        let of_part = if synth.contains("mpe") { 64 } else { 20 };
        assert_eq!(rig.heard().controller(1, 74), Some(of_part));
    }
}

#[test]
fn the_manager_s_wheel_and_pedals_are_the_whole_part_s() {
    for synth in [MPE, WIDE] {
        let mut rig = rig("", synth, "");
        rig.play("10 send 91 3C 64 92 43 64 E1 00 41\n100 send E0 00 60 B0 40 7F\n200 send 81 3C 40 82 43 40");
        assert_sounding(&rig, &[(60, 6010.0 + 75.0 + 100.0), (67, 6800.0)]);
        rig.play("300 send B0 40 00");
        assert_sounding(&rig, &[]);
    }
}

#[test]
fn pedals_and_programs_on_a_member_are_not_heard() {
    // MPE 1.1, 2.3 and appendix E: they are the manager's.
    let mut rig = rig("", WIDE, "");
    let mark = rig.sent.len();
    rig.play("10 send B1 40 7F C1 05 B1 01 40 B1 07 20");
    assert_eq!(rig.sent_since(mark), Vec::<String>::new());
    rig.play("20 send 91 3C 64\n100 send 81 3C 40");
    assert_sounding(&rig, &[]);
}

#[test]
fn a_zone_and_ranges_told_by_the_keyboard_are_obeyed() {
    // MPE 1.0, 2.1.2, example 1: a lower zone of seven. Then RPN 0 on one member: 24 semitones, for all of them.
    let mut rig = rig("", MPE, "");
    rig.play(
        "10 send B0 79 00 64 06 65 00 06 07
         20 send B3 64 00 65 00 06 18
         30 send E1 00 50 91 3C 64
         40 send E9 00 50 99 43 64",
    );
    // Channel 10 is ordinary now, and what bends there is the part's wheel: a quarter of two semitones.
    assert_sounding(&rig, &[(60, 6010.0 + 600.0 + 50.0), (67, 6750.0)]);
    assert_eq!(rig.heard().zones(), [15, 0], "the synth's zone is its own");
}

#[test]
fn a_new_zone_lets_go_of_what_its_channels_held() {
    // MPE 1.1, 2.2.3.
    let mut rig = rig("", WIDE, "");
    rig.play("10 send 91 3C 64 9C 43 64\n100 send B0 64 06 65 00 06 07");
    assert_sounding(&rig, &[(60, 6010.0)]);
    rig.play("200 send 81 3C 40 8C 43 40");
    assert!(rig.heard().stuck().is_empty() && rig.heard().orphans.is_empty());
}

#[test]
fn an_upper_zone_and_a_bend_range_of_one_s_own() {
    let mut rig = rig(", channel: 9-16, bend_range: 12", WIDE, "");
    rig.play("10 send E8 00 50 98 43 64\n20 send EF 00 60\n30 send 91 40 64");
    // A quarter of 12 semitones; the manager's wheel is half of two. Channel 2 is not this keyboard's.
    assert_sounding(&rig, &[(67, 6700.0 + 300.0 + 100.0)]);
}

#[test]
fn a_keyboard_of_which_nothing_is_said_stays_ordinary_whatever_it_says() {
    let mut rig = rig("", WIDE, "");
    rig.play(
        "10 second send B0 64 06 65 00 06 0F\n20 second send 91 43 64\n30 second send E1 00 60",
    );
    assert_sounding(&rig, &[(67, 6800.0)]);
}

#[test]
fn a_member_on_channel_ten_is_no_drum() {
    let mut rig = rig("", ", bend_range: 48, drums: [10]", "");
    rig.play("10 send E9 2B 40 99 3C 64\n100 send E9 00 41");
    assert_sounding(&rig, &[(60, 6085.0)]);
    assert_ne!(rig.heard().notes[0].channel, 9);
    rig.play("200 second send 99 26 64");
    assert_eq!(
        rig.heard().notes[1].channel,
        9,
        "the other keyboard's drums are drums"
    );
}

#[test]
fn fingers_share_a_channel_only_where_none_is_free_and_then_the_first_leads() {
    let mut rig = rig("", ", bend_range: 48, channels: 1-2", "");
    // Three keys that stand alike; two channels.
    rig.play("10 send 91 43 64\n20 send 92 45 64\n30 send 93 47 64");
    let channels: Vec<u8> = rig.heard().notes.iter().map(|note| note.channel).collect();
    assert_eq!(channels, [0, 1, 0]);
    assert_eq!(rig.engine.report().counters.moved_along, 1);
    rig.play("100 send E3 00 41");
    assert_sounding(&rig, &[(67, 6700.0), (69, 6900.0), (71, 7100.0)]);
    rig.play("200 send E1 00 41");
    assert_sounding(&rig, &[(67, 6775.0), (69, 6900.0), (71, 7175.0)]);
    // The first goes; the note that went along follows its own finger from its next move on.
    rig.play("300 send 81 43 40\n400 send E3 00 42");
    assert_sounding(&rig, &[(69, 6900.0), (71, 7250.0)]);
    rig.play("500 send 82 45 40 83 47 40");
    assert!(rig.heard().stuck().is_empty());
}

#[test]
fn a_finger_does_not_take_what_a_pedal_holds_along() {
    let mut rig = rig("", WIDE, "");
    rig.play("10 second on G4 100\n20 second pedal down\n30 second off G4\n100 send 91 43 64\n200 send E1 00 41");
    assert_sounding(&rig, &[(67, 6700.0), (67, 6775.0)]);
}

#[test]
fn what_a_part_does_not_pass_a_finger_does_not_do() {
    let mut rig = rig("", WIDE, "parts: [{from: keys, pass: [pedals]}]");
    rig.play("10 send E1 00 50 D1 40 B1 4A 20 91 3C 64\n20 send E1 00 60 D1 50 B1 4A 30");
    assert_sounding(&rig, &[(60, 6010.0)]);
    let channel = rig.heard().notes[0].channel;
    assert_eq!(
        (
            rig.heard().pressure(channel),
            rig.heard().controller(channel, 74)
        ),
        (0, None)
    );
}

#[test]
fn a_lost_expressive_keyboard_lets_go_and_begins_anew() {
    let mut rig = rig("", MPE, "");
    rig.play(
        "10 send B0 40 7F E1 00 50 91 3C 64 D1 40
         50 send B1 64 00 65 00 06 0C
         100 lost
         200 send 91 43 64 E2 00 50 92 45 64",
    );
    assert_sounding(&rig, &[(67, 6700.0), (69, 6900.0 + 1200.0)]);
    assert!(rig.heard().orphans.is_empty());
}

#[test]
fn reset_all_controllers_of_the_manager_rests_all_fingers() {
    // MPE 1.1, table 6: on the manager it is for the whole zone.
    for synth in [MPE, WIDE] {
        let mut rig = rig("", synth, "");
        rig.play("10 send E1 00 50 91 3C 64 D1 40\n20 send E0 00 60\n100 send B0 79 00");
        assert_sounding(&rig, &[(60, 6010.0)]);
        assert_eq!(rig.heard().pressure(rig.heard().notes[0].channel), 0);
    }
}

#[test]
fn a_slow_wire_thins_fingers_and_brings_them_to_their_last_place() {
    for synth in [MPE, WIDE] {
        let mut rig = rig("", &format!("{synth}, bytes_per_s: 3125"), "");
        rig.play("500 send 91 3C 64\n600 send 92 43 64");
        let before = rig.heard().messages;
        for step in 0..400u64 {
            rig.until(trued::time::Time::from_millis(1000 + step));
            let place = (step % 64) as u8 + 32;
            rig.midi(0, &[0xE1, 0, place, 0xD1, place, 0xB1, 74, place]);
        }
        rig.until(trued::time::Time::from_millis(2000));
        // 399 % 64 + 32 = 47: 47 << 7 of 8192, so 17 of 64 half-ranges below the middle.
        assert_sounding(&rig, &[(60, 6010.0 - 4800.0 * 17.0 / 64.0), (67, 6700.0)]);
        let channel = rig.heard().notes[0].channel;
        assert_eq!(
            (
                rig.heard().pressure(channel),
                rig.heard().controller(channel, 74)
            ),
            (47, Some(47))
        );
        // Of 1,200 messages; the wire carries 1,250 bytes in that time.
        assert!(rig.heard().messages - before < 600, "thinned");
    }
}

#[test]
fn an_edit_that_makes_a_keyboard_expressive_lets_go_of_what_it_held() {
    let text = |sends: &str| {
        format!(
            "keyboards: {{keys: {{port: virtual, sends: {sends}}}}}\nsynths: {{organ: {{port: virtual, bend_range: 48}}}}\n\
             set: [{{song: One, tuning: equal-12}}]\n"
        )
    };
    let mut rig = Rig::of(&text("plain"));
    rig.play("10 send 91 3C 64");
    let other = Rig::of(&text("mpe"));
    rig.plan(&other.stage.expect("a stage").plan_offline());
    assert_sounding(&rig, &[]);
    rig.play("100 send 81 3C 40 91 3C 64 92 43 64 E1 00 41");
    assert_sounding(&rig, &[(60, 6075.0), (67, 6700.0)]);
}

/// The player's wheel, vibrato and pressure act on what that player plays: not on the drone, not on the drums.
#[test]
fn n08_bend_vibrato_and_pressure_act_on_the_player_s_part_alone() {
    for (synth, late) in [(WIDE, false), (MPE, true)] {
        let mut rig = Rig::of(&format!(
            "keyboards: {{melody: {{port: virtual}}, drone: {{port: virtual}}}}\n\
             synths: {{organ: {{port: virtual{synth}}}}}\n\
             parts: [{{from: melody}}, {{from: drone, follow: no}}]\n\
             set: [{{song: One, tuning: quarter-comma-meantone}}]\n"
        ));
        let heard = rig.play(
            "10 second on A3 80
             20 on A4 100
             100 wheel 10240
             150 cc 1 70
             200 send D0 55
             300 wheel 8192
             400 off A4
             500 second off A3",
        );
        assert_heard(
            &heard,
            "10 57 sounds 5700.0
             20 69 sounds 6900.0
             100 69 moves to 6949.8
             300 69 moves to 6900.0
             400 69 ends
             500 57 ends",
        );
        let heard = rig.heard();
        let [drone, melody] = &heard.notes[..] else {
            panic!("two notes");
        };
        assert_eq!(
            (
                heard.pressure(melody.channel),
                heard.pressure(drone.channel)
            ),
            (0x55, 0)
        );
        if !late {
            assert_eq!(heard.controller(melody.channel, 1), Some(70));
            assert_eq!(heard.controller(drone.channel, 1), None);
        }
    }
}

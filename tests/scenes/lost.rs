//! Cables come out. Nothing sticks, and what comes back is set up anew.

use super::{mpe, plain};
use crate::support::rig::{Rig, keyboard_id};
use crate::support::script::assert_heard;
use trued::engine::Input;
use trued::time::Time;

#[test]
fn a_lost_keyboard_lets_go_of_keys_pedals_wheel_and_pressure() {
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        let heard = rig.play(
            "10 on A4 90
             20 pedal down
             30 on D4 90
             40 off D4
             50 second on F4 90
             60 send D0 30
             100 lost
             200 second off F4",
        );
        assert_heard(
            &heard,
            "10 69 sounds 6900.0
             30 62 sounds 6200.0
             40 62 let go, held by a pedal
             50 65 sounds 6500.0
             100 69 ends
             100 62 ends
             200 65 ends",
        );
        assert!((0..16).all(|channel| rig.heard().pressure(channel) == 0));
        rig.play("300 on A4 90\n310 off A4");
        let last = &rig.heard().notes[rig.heard().notes.len() - 1];
        assert!(last.end.is_some(), "no pedal holds it");
    }
}

#[test]
fn a_lost_wheel_goes_home() {
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        rig.play("10 second on A4 90\n20 wheel 9000\n30 lost");
        assert_eq!(rig.heard().notes[0].cents(), 6900.0);
        assert_eq!(
            rig.heard().sounding().len(),
            1,
            "the other keyboard still holds it"
        );
    }
}

#[test]
fn several_devices_play_as_one_keyboard_and_one_goes() {
    for mut plan in [plain(), mpe()] {
        // Only the first keyboard plays, and its wheel reaches a semitone: so does that of a device that plays as it.
        plan.parts[0].from = Some(keyboard_id(0));
        plan.keyboards[0].wheel_semitones = 1;
        let mut rig = Rig::ready(&plan);
        let one_more = keyboard_id(5);
        rig.midi(5, &[0x90, 60, 90]);
        assert!(rig.heard().notes.is_empty(), "not yet one of the rig");
        rig.input(Input::Seat {
            keyboard: one_more,
            plays_as: keyboard_id(0),
        });
        rig.play("10 on A4 90\n20 pedal down\n30 send F0 7D 01");
        rig.midi(5, &[0x90, 69, 90, 0xB0, 64, 127]);
        rig.midi(5, &[0x90, 62, 90]);
        // The sysex under way from the first is not cut by the second's notes.
        rig.play("40 send 02 F7\n50 off A4");
        assert_eq!(rig.engine.report().counters.sysex_lost, 0);
        let sysex = rig.sent.iter().filter(|s| s.bytes[0] == 0xF0);
        assert_eq!(
            sysex.map(|s| &s.bytes[..]).collect::<Vec<_>>(),
            [[0xF0, 0x7D, 1, 2, 0xF7]]
        );
        rig.input(Input::KeyboardLost(one_more));
        assert!(rig.heard().stuck().is_empty());
        // The first still holds its pedal: what rings under it goes on, until its player lifts it.
        assert!(!rig.heard().sounding().is_empty());
        rig.play("100 pedal up");
        assert!(rig.heard().sounding().is_empty());
        rig.midi(5, &[0x90, 69, 90, 0xE0, 127, 127]);
        let highest = rig.heard().notes[rig.heard().notes.len() - 1].cents();
        assert!((highest - 7000.0).abs() < 1.0, "{highest}");
        rig.input(Input::KeyboardLost(one_more));
        assert!(rig.heard().sounding().is_empty() && rig.heard().orphans.is_empty());
    }
}

#[test]
fn a_message_cut_off_with_the_cable_is_forgotten() {
    let mut rig = Rig::ready(&plain());
    let heard = rig.play("10 send 90 45\n20 lost\n30 send 45 40\n40 on A4 90");
    assert_heard(&heard, "40 69 sounds 6900.0");
}

#[test]
fn a_synth_that_comes_back_is_set_up_at_once_and_once_more_after_two_seconds() {
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        let setups = rig.heard().setups;
        rig.play("10 send B0 07 50\n20 send C0 05\n30 on C4 90\n100 synth down\n150 on E4 90\n200 off C4");
        let after_down = rig
            .sent
            .iter()
            .filter(|s| s.at.nanos() > 100_000_000)
            .count();
        assert_eq!(after_down, 0, "nothing is sent to a synth that is away");
        let before = rig.heard().setups;
        let heard = rig.play("300 synth back\n400 on C4 90\n450 off C4");
        assert_heard(&heard, "400 60 sounds 6010.0\n450 60 ends");
        let channel = rig.heard().notes[rig.heard().notes.len() - 1].channel;
        let speaks = if rig.heard().zones()[0] > 0 {
            0
        } else {
            channel
        };
        assert_eq!(rig.heard().controller(speaks, 7), Some(0x50));
        assert_eq!(rig.heard().program(speaks), Some(5));
        assert!(rig.heard().setups > before);
        let once = rig.heard().setups - before;
        rig.play("2299 wait");
        assert_eq!(rig.heard().setups, before + once);
        rig.play("4500 wait");
        assert!(rig.heard().setups > before + once && once >= setups);
        assert!(rig.heard().stuck().is_empty() && rig.heard().orphans.is_empty());
        assert_eq!(rig.heard().zones_while_sounding, 0);
    }
}

#[test]
fn panic_silences_all_with_every_note_off_and_the_next_note_is_in_tune() {
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        rig.play(
            "10 on C4 90
             20 pedal down
             25 sostenuto down
             30 on E4 90
             40 off E4
             50 second on G4 90
             60 next
             100 panic",
        );
        assert!(rig.heard().sounding().is_empty() && rig.heard().stuck().is_empty());
        assert!(rig.heard().orphans.is_empty());
        assert_eq!(rig.engine.report().song, 1, "the song stays");
        rig.until(Time::from_millis(150));
        let heard = rig.play("200 on E4 90\n300 off E4");
        assert_heard(&heard, "200 64 sounds 6400.0\n300 64 ends");
        assert_eq!(rig.heard().zones_while_sounding, 0);
    }
}

#[test]
fn a_short_outbox_refuses_new_notes_and_still_ends_the_old_ones() {
    let mut rig = Rig::ready(&plain());
    let heard = rig.play(
        "10 on A4 90
         20 synth tight
         30 on D4 90
         40 off A4
         50 off D4
         60 synth easy
         70 on D4 90",
    );
    assert_heard(
        &heard,
        "10 69 sounds 6900.0\n40 69 ends\n70 62 sounds 6200.0",
    );
    assert_eq!(rig.engine.report().counters.refused, 1);
    assert!(rig.heard().orphans.is_empty());
}

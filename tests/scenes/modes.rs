//! Channel mode messages end a player's own notes and go no further; Reset All Controllers is passed on and mended.

use super::{mpe, plain};
use crate::support::rig::Rig;
use crate::support::script::assert_heard;

#[test]
fn mode_messages_become_note_offs_of_the_keyboard_that_sent_them() {
    // 120, and 123-127, which are each also an All Notes Off (MIDI 1.0 p. 20).
    for plan in [plain(), mpe()] {
        for number in [120, 123, 124, 125, 126, 127] {
            let mut rig = Rig::ready(&plan);
            let heard = rig.play(&format!(
                "10 on A4 90\n10 second on D4 90\n50 send B0 {number:02X} 00\n90 second off D4"
            ));
            assert_heard(
                &heard,
                "10 69 sounds 6900.0
                 10 62 sounds 6200.0
                 50 69 ends
                 90 62 ends",
            );
            assert!(rig.heard().modes.is_empty(), "{number} was forwarded");
            assert!(rig.heard().orphans.is_empty() && rig.heard().stuck().is_empty());
        }
    }
}

#[test]
fn a_note_off_after_all_notes_off_is_no_orphan_on_the_wire() {
    let mut rig = Rig::ready(&plain());
    rig.play("10 on A4 90\n20 send B0 7B 00\n30 off A4");
    assert!(rig.heard().orphans.is_empty());
    assert_eq!(rig.engine.report().counters.orphans, 1);
}

#[test]
fn after_reset_all_controllers_the_tuning_is_said_again() {
    // RP-015: bend to the centre, pedals up, 11 to 127; 7, 10 and bend ranges stay.
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        rig.play("10 send B0 07 50\n10 send B0 0B 30\n10 on C4 90\n20 wheel 10000\n30 pedal down\n40 on E4 90\n45 off E4");
        rig.play("50 send B0 79 00");
        let heard = rig.heard();
        let cents: Vec<i64> = heard
            .sounding()
            .iter()
            .map(|n| n.cents().round() as i64)
            .collect();
        assert_eq!(
            cents,
            [6010],
            "at its tuned pitch without the wheel, and the pedal is up"
        );
        let speaks = if plan.synths[0].bend_range.semitones() == 48 {
            0
        } else {
            heard.notes[0].channel
        };
        assert_eq!(heard.controller(speaks, 7), Some(0x50));
        assert_eq!(heard.controller(speaks, 11), Some(127));
        assert!(heard.modes.iter().all(|m| m.message[1] == 121));
        assert!(heard.repeats.is_empty(), "{:02X?}", heard.repeats);
        let next = rig.play("60 on G4 90");
        assert!(next.contains("60 67 sounds 670"), "{next}");
    }
}

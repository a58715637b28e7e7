//! Damper and sostenuto, and keys struck again under them.

use super::{mpe, plain};
use crate::support::rig::Rig;
use crate::support::script::assert_heard;

#[test]
fn the_damper_holds_and_lets_go() {
    for plan in [plain(), mpe()] {
        assert_heard(
            &Rig::ready(&plan)
                .play("10 on A4 90\n20 pedal down\n30 off A4\n40 on D4 90\n50 off D4\n60 pedal up"),
            "10 69 sounds 6900.0
             30 69 let go, held by a pedal
             40 62 sounds 6200.0
             50 62 let go, held by a pedal
             60 69 ends
             60 62 ends",
        );
    }
}

#[test]
fn sostenuto_holds_only_what_was_down() {
    // GM2 3.3.9.
    for plan in [plain(), mpe()] {
        assert_heard(
            &Rig::ready(&plan).play(
                "10 on A4 90
                 20 sostenuto down
                 30 on D4 90
                 40 off A4
                 50 off D4
                 60 sostenuto up",
            ),
            "10 69 sounds 6900.0
             30 62 sounds 6200.0
             40 69 let go, held by a pedal
             50 62 ends
             60 69 ends",
        );
    }
}

#[test]
fn a_note_under_the_pedal_is_not_moved_by_those_that_follow() {
    // Twelve different places and three octaves of each, under one pedal.
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        let mut script = "10 pedal down\n".to_owned();
        for (count, name) in ["C", "E", "G", "A", "D", "F#"]
            .iter()
            .cycle()
            .take(18)
            .enumerate()
        {
            let (at, key) = (20 + 10 * count, format!("{name}{}", 3 + count / 6));
            script += &format!("{at} on {key} 90\n{} off {key}\n", at + 5);
        }
        rig.play(&script);
        assert_eq!(rig.heard().notes.len(), 18);
        assert!(rig.heard().moves.is_empty(), "{:?}", rig.heard().moves);
    }
}

#[test]
fn a_key_struck_again_under_the_pedal_stays_on_its_channel() {
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        rig.play("10 pedal down\n20 on C4 90\n30 off C4\n40 on E4 90\n50 on C4 90\n60 off C4");
        let notes = &rig.heard().notes;
        assert_eq!(notes[0].channel, notes[2].channel);
        assert!(rig.heard().moves.is_empty());
    }
}

#[test]
fn a_key_struck_again_while_held_is_two_notes_with_two_ends() {
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        rig.play("10 on C4 90\n20 on C4 80\n30 off C4\n40 off C4");
        let heard = rig.heard();
        assert_eq!(heard.notes.len(), 2);
        assert_ne!(heard.notes[0].channel, heard.notes[1].channel);
        assert!(heard.stuck().is_empty() && heard.orphans.is_empty());
    }
}

#[test]
fn a_pedal_is_down_while_any_keyboard_holds_it() {
    for plan in [plain(), mpe()] {
        assert_heard(
            &Rig::ready(&plan).play(
                "10 pedal down
                 20 second pedal down
                 30 on A4 90
                 40 off A4
                 50 pedal up
                 60 second pedal up",
            ),
            "30 69 sounds 6900.0
             40 69 let go, held by a pedal
             60 69 ends",
        );
    }
}

#[test]
fn half_a_pedal_reaches_the_synth_as_it_came() {
    // MIDI 1.0 p. 12: 64-69 may carry any value.
    let mut rig = Rig::ready(&mpe());
    rig.play("10 send B0 40 2A");
    assert_eq!(rig.heard().controller(0, 64), Some(0x2A));
}

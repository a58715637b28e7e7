//! What is not ours passes, in order and untouched; what must not pass does not.

use super::{mpe, plain};
use crate::support::rig::Rig;
use crate::support::script::assert_heard;

fn sent(rig: &mut Rig, script: &str) -> Vec<String> {
    let mark = rig.sent.len();
    rig.play(script);
    rig.sent_since(mark)
}

#[test]
fn drums_come_out_byte_for_byte_and_nothing_is_added() {
    // GM2 3.6, 4.7: a rhythm channel is not bent or re-keyed.
    let mut rig = Rig::ready(&plain());
    let out = sent(
        &mut rig,
        "10 send 99 26 64\n20 send 89 26 40\n30 send B9 07 50\n40 send C9 08\n50 send E9 10 40",
    );
    assert_eq!(
        out,
        ["99 26 64", "89 26 40", "B9 07 50", "C9 08", "E9 10 40"]
    );
}

#[test]
fn a_drum_channel_carries_no_note_of_ours() {
    let mut rig = Rig::ready(&plain());
    for key in 0..30u8 {
        rig.midi(0, &[0x90, 40 + key, 64]);
    }
    assert!(rig.heard().notes.iter().all(|note| note.channel != 9));
    assert_eq!(rig.heard().bend_cents(9), 0.0);
}

#[test]
fn system_messages_pass_in_order_with_notes_between() {
    let mut rig = Rig::ready(&mpe());
    let out = sent(
        &mut rig,
        "10 send F0 7D 01 02 F7 F8 F2 10 20
         10 on A4 100
         10 send F3 05 F6 F1 12 FA FB FC",
    );
    let others: Vec<&String> = out.iter().filter(|m| m.starts_with('F')).collect();
    assert_eq!(
        others,
        [
            "F0 7D 01 02 F7",
            "F8",
            "F2 10 20",
            "F3 05",
            "F6",
            "F1 12",
            "FA",
            "FB",
            "FC"
        ]
    );
    let note = out.iter().position(|m| m.starts_with('9'));
    assert!(out.iter().position(|m| m == "F2 10 20") < note);
    assert!(note < out.iter().position(|m| m == "F3 05"));
}

#[test]
fn real_time_inside_a_sysex_comes_out_before_it() {
    // MIDI 1.0 p. 29-30.
    let mut rig = Rig::ready(&plain());
    assert_eq!(
        sent(&mut rig, "10 send F0 7E F8 7F 06 01 F7"),
        ["F8", "F0 7E 7F 06 01 F7"]
    );
}

#[test]
fn system_reset_lets_go_and_is_not_echoed() {
    // MIDI 1.0 p. 33: under no condition should this message be echoed.
    let mut rig = Rig::ready(&plain());
    let heard = rig.play("10 pedal down\n20 on A4 100\n30 send FF\n40 wait");
    assert_heard(&heard, "20 69 sounds 6900.0\n30 69 ends");
    assert!(rig.heard().system.is_empty(), "{:?}", rig.heard().system);
}

#[test]
fn active_sensing_is_watched_and_not_forwarded() {
    // MIDI 1.0 p. 32: after one FE, more than 300 ms of silence turns the voices off; judged at 330.
    let mut rig = Rig::ready(&plain());
    let heard = rig.play("10 send FE\n10 on A4 100\n300 send FE\n500 wait\n1000 wait");
    assert_heard(&heard, "10 69 sounds 6900.0\n630 69 ends");
    assert!(rig.heard().system.is_empty());
    // Once fallen silent it is a keyboard without sensing again.
    assert_heard(
        &rig.play("2000 on D4 100\n12000 off D4"),
        "2000 62 sounds 6200.0\n12000 62 ends",
    );
}

#[test]
fn without_active_sensing_silence_means_nothing() {
    assert_heard(
        &Rig::ready(&plain()).play("10 on A4 100\n10000 off A4"),
        "10 69 sounds 6900.0\n10000 69 ends",
    );
}

#[test]
fn a_general_midi_reset_passes_and_set_up_follows_it() {
    // GM2 4.9.1: done within 100 ms.
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        let setups = rig.heard().setups;
        let heard = rig.play("10 send F0 7E 7F 09 01 F7\n109 wait");
        assert_heard(&heard, "");
        assert_eq!(rig.heard().setups, setups);
        assert_heard(&rig.play("200 on C4 90"), "200 60 sounds 6010.0");
        assert_eq!(rig.heard().setups, 2 * setups);
    }
}

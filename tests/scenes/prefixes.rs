//! What belongs to one note: CC88 and CC84 before it, pressure on its key.

use super::{mpe, plain};
use crate::support::rig::Rig;

/// Bytes sent after set-up, a message each.
fn sent(rig: &mut Rig, script: &str) -> Vec<String> {
    let mark = rig.sent.len();
    rig.play(script);
    rig.sent_since(mark)
}

#[test]
fn the_low_half_of_a_velocity_travels_with_its_note() {
    // CA-031: CC88 is for the next note on the same channel; other messages may stand between.
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        // E4 takes a channel first, so that C4 finds itself on another than the keyboard's.
        let out = sent(
            &mut rig,
            "10 on E4 90\n20 send B0 58 40 90 3C 64\n30 on G4 90",
        );
        let channel = rig.heard().notes[1].channel;
        let prefix = out.iter().position(|m| *m == format!("B{channel:X} 58 40"));
        let note = out.iter().position(|m| *m == format!("9{channel:X} 3C 64"));
        assert!(prefix.is_some() && prefix < note, "{out:?}");
        assert_eq!(out.iter().filter(|m| m.contains(" 58 ")).count(), 1);
    }
}

#[test]
fn a_portamento_source_travels_with_its_note() {
    // MIDI 1.0 p. 16: CC84 names the key from which the next note on that channel glides.
    let mut rig = Rig::ready(&plain());
    let out = sent(&mut rig, "10 on E4 90\n20 send B0 54 40 90 3C 64");
    let channel = rig.heard().notes[1].channel;
    let prefix = out.iter().position(|m| *m == format!("B{channel:X} 54 40"));
    let note = out.iter().position(|m| *m == format!("9{channel:X} 3C 64"));
    assert!(prefix.is_some() && prefix < note, "{out:?}");
}

#[test]
fn poly_pressure_becomes_the_pressure_of_the_note_s_own_member() {
    // MPE 1.1, 2.2.7: A0 3C 40 from the keyboard is D(member) 40, never A(member).
    let mut rig = Rig::ready(&mpe());
    let out = sent(&mut rig, "10 on E4 90\n20 on C4 90\n30 send A0 3C 40");
    let channel = rig.heard().notes[1].channel;
    assert_eq!(out.last(), Some(&format!("D{channel:X} 40")));
    assert!(rig.heard().prohibited.is_empty());
}

#[test]
fn members_that_share_have_the_highest_pressure_and_none_before_the_next_note() {
    let mut rig = Rig::ready(&mpe());
    rig.play("10 on C4 90\n10 on C5 90\n20 send A0 3C 40\n30 send A0 48 20");
    let channel = rig.heard().notes[0].channel;
    assert_eq!(
        rig.heard().notes[1].channel,
        channel,
        "one pitch offset, one channel"
    );
    assert_eq!(rig.heard().pressure(channel), 0x40);
    rig.play("40 off C4");
    assert_eq!(rig.heard().pressure(channel), 0x20);
    rig.play("50 off C5\n60 on C3 90");
    let again = rig.heard().notes[2].channel;
    assert_eq!(rig.heard().pressure(again), 0);
}

#[test]
fn a_plain_synth_gets_poly_pressure_on_the_note_it_sounds() {
    let mut rig = Rig::ready(&plain());
    let out = sent(&mut rig, "10 on E4 90\n20 on C4 90\n30 send A0 3C 40");
    let channel = rig.heard().notes[1].channel;
    assert_eq!(out.last(), Some(&format!("A{channel:X} 3C 40")));
}

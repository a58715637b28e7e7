//! What a song says to the synths when it begins: once, to whom it is for, and only when no key and no pedal is down.

use crate::support::rig::Rig;
use trued::time::Time;

const SYSEX: &str = "F0 7D 01 02 F7";

/// The second song has messages for both synths, and comes once more.
fn evening() -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
         synths: {{organ: {{port: virtual, channels: 1-2, tail_ms: 0}}, bass: {{port: virtual, channels: 1, tail_ms: 0}}}}\n\
         parts: [{{from: keys, to: organ}}, {{from: pads, to: bass}}]\n\
         songs:\n\
         \x20 Plain:\n\
         \x20 Said: {{send: [{{program: 20}}, {{controller: 7, value: 90, to: bass}}, {{sysex: {SYSEX}, to: organ}}]}}\n\
         set: [Plain, Said, Plain, Said]\n"
    ))
}

/// Whole messages to a synth from a mark on, without its set-up (bends, ranges).
fn said(rig: &Rig, mark: usize, synth: usize) -> Vec<String> {
    let of_song = |message: &String| {
        message.starts_with('C') || message.starts_with("F0") || message.contains(" 07 5A")
    };
    let sent = rig.sent[mark..].iter().filter(|sent| sent.synth == synth);
    let spelt = sent.map(|sent| {
        let bytes: Vec<String> = sent.bytes.iter().map(|b| format!("{b:02X}")).collect();
        bytes.join(" ")
    });
    spelt.filter(of_song).collect()
}

#[test]
fn once_and_to_the_synth_it_is_for() {
    let mut rig = evening();
    let mark = rig.sent.len();
    rig.play("10 next\n20 wait");
    assert_eq!(said(&rig, mark, 0), [SYSEX, "C0 13", "C1 13"]);
    rig.play(
        "30 second on C3 90\n40 second off C3\n50 on C4 90\n60 off C4\n70 on D4 90\n80 off D4",
    );
    assert_eq!(
        said(&rig, mark, 1),
        ["B0 07 5A"],
        "before the first note of its part"
    );
    assert_eq!(
        said(&rig, mark, 0),
        [SYSEX, "C0 13", "C1 13"],
        "and no more"
    );
}

#[test]
fn only_when_no_key_and_no_pedal_is_down() {
    for (down, up) in [
        ("on C4 90", "off C4"),
        ("pedal down", "pedal up"),
        ("sostenuto down", "sostenuto up"),
        ("second on C3 90", "second off C3"),
    ] {
        let mut rig = evening();
        rig.play(&format!("10 {down}"));
        let mark = rig.sent.len();
        rig.play("20 next\n30 on E4 90\n40 off E4");
        assert_eq!(said(&rig, mark, 0), [""; 0], "{down}");
        rig.play(&format!("50 {up}"));
        assert!(said(&rig, mark, 0).contains(&SYSEX.to_string()), "{up}");
    }
}

#[test]
fn a_song_that_was_passed_over_says_nothing_and_one_begun_again_says_it_again() {
    let mut rig = evening();
    let mark = rig.sent.len();
    rig.play("10 on C4 90\n20 next\n500 next\n600 off C4");
    assert_eq!(
        said(&rig, mark, 0),
        [""; 0],
        "the third song is on, and has nothing to say"
    );
    // The same song once more: as it begins, whatever was before.
    let mark = rig.sent.len();
    rig.play("1000 next\n1010 wait");
    assert!(said(&rig, mark, 0).contains(&SYSEX.to_string()));
    let mark = rig.sent.len();
    rig.play("2000 back\n2500 next\n2510 wait");
    let again = said(&rig, mark, 0);
    assert!(again.contains(&SYSEX.to_string()), "{again:?}");
}

#[test]
fn what_a_synth_forgot_is_said_again_to_it_alone_and_the_player_s_own_program_stays() {
    let mut rig = evening();
    rig.play("10 next\n20 program 40\n30 wait");
    let mark = rig.sent.len();
    rig.play("1000 synth down\n2000 synth back\n2500 wait");
    let again = said(&rig, mark, 0);
    assert!(again.contains(&SYSEX.to_string()), "{again:?}");
    assert!(again.contains(&"C0 28".to_string()), "{again:?}");
    assert!(!again.contains(&"C0 13".to_string()), "{again:?}");
    assert_eq!(
        said(&rig, mark, 1),
        [""; 0],
        "the other has forgotten nothing"
    );
    let mark = rig.sent.len();
    rig.until(Time::from_millis(10_000));
    rig.play("10000 tell resend organ\n10500 wait");
    assert!(said(&rig, mark, 0).contains(&SYSEX.to_string()));
}

#[test]
fn two_devices_that_play_as_one_keyboard_are_both_asked_whether_all_is_quiet() {
    use crate::support::rig::keyboard_id;
    use trued::engine::Input;
    let mut rig = evening();
    // Beyond the keyboards of the plan: one more device that plays as the first.
    rig.input(Input::Seat {
        keyboard: keyboard_id(2),
        plays_as: keyboard_id(0),
    });
    rig.midi(2, &[0xB0, 64, 127]);
    let mark = rig.sent.len();
    rig.play("20 next\n30 wait");
    assert_eq!(said(&rig, mark, 0), [""; 0]);
    rig.midi(2, &[0xB0, 64, 0]);
    assert!(said(&rig, mark, 0).contains(&SYSEX.to_string()));
}

/// A bank is two messages, in order: its number by controller 0, then the program (MIDI 1.0, p. 18).
#[test]
fn a_bank_and_a_program_of_it() {
    for dialect in ["channel-bend", "mpe"] {
        let mut rig = Rig::of(&format!(
            "keyboards: {{keys: {{port: virtual}}}}\nsynths: {{organ: {{port: virtual, dialect: {dialect}, tail_ms: 0}}}}\n\
             set: [{{song: One}}, {{song: Two, send: [{{controller: 0, value: 3}}, {{program: 5}}]}}]\n"
        ));
        let mark = rig.sent.len();
        rig.play("10 next\n500 on C4 90\n510 off C4");
        let sent = rig.sent_since(mark);
        let place = |wanted: &str| sent.iter().position(|message| message == wanted);
        assert!(
            place("B0 00 03").is_some() && place("B0 00 03") < place("C0 04"),
            "{dialect}: {sent:?}"
        );
    }
}

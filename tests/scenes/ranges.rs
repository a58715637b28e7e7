//! The bend range agrees with the synth (need N09): it is told by RPN 0 before the first note, again whenever the synth may
//! have forgotten it, and the receiver, which has a strange range at power-on, then sounds what was meant.

use crate::support::rig::Rig;
use trued::time::{Span, Time};

fn quarter_tone(dialect: &str, range: u8) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}}}\n\
         synths: {{synth: {{port: virtual, dialect: {dialect}, bend_range: {range}, tail_ms: 0}}}}\n\
         tunings: {{half: {{like: equal-12, change: {{E: -50 c}}}}}}\n\
         set: [{{song: Half, tuning: half}}]\n"
    ))
}

/// Strikes E4, which is to sound a quarter-tone low.
fn strikes_true(rig: &mut Rig, range: u8) {
    rig.until(rig.now + Span::from_millis(10));
    rig.midi(0, &[0x90, 64, 90]);
    rig.until(rig.now + Span::from_millis(10));
    rig.midi(0, &[0x80, 64, 64]);
    let heard = rig.heard().notes.last().expect("a note").onset_cents();
    let half_step = f64::from(range) * 100.0 / 8192.0 / 2.0 + 1e-6;
    assert!(
        (heard - 6350.0).abs() <= half_step,
        "{heard} at range {range}"
    );
}

#[test]
fn n09_told_at_once_and_whenever_the_synth_may_have_forgotten_it() {
    for (dialect, members) in [("channel-bend", 0..9u8), ("mpe", 1..16)] {
        for range in [1u8, 2, 12, 48, 96] {
            let mut rig = quarter_tone(dialect, range);
            for channel in members.clone() {
                assert_eq!(rig.heard().range_cents(channel), f64::from(range) * 100.0);
            }
            strikes_true(&mut rig, range);
            // Switched off and on again, with the plug in: it is told when somebody asks for it.
            let now = rig.now;
            rig.receivers[0].power_cycle(std::time::Duration::from_nanos(now.nanos()));
            assert_eq!(rig.heard().range_cents(4), 700.0);
            rig.tell("resend");
            rig.until(now + Span::from_millis(500));
            strikes_true(&mut rig, range);
            // Pulled out and put back: without anybody.
            let at = rig.now.nanos() / 1_000_000;
            rig.play(&format!(
                "{} synth down\n{} synth back\n{} wait",
                at + 10,
                at + 20,
                at + 600
            ));
            strikes_true(&mut rig, range);
            // A reset that passes through, and a program that may bring a range of its own.
            let at = rig.now.nanos() / 1_000_000;
            rig.play(&format!(
                "{} send F0 7E 7F 09 01 F7\n{} wait",
                at + 10,
                at + 500
            ));
            strikes_true(&mut rig, range);
            assert_eq!(rig.heard().range_cents(4), f64::from(range) * 100.0);
        }
    }
}

#[test]
fn n09_rpn_0_in_its_full_form_before_the_first_bend() {
    let rig = quarter_tone("channel-bend", 12);
    let sent = rig.sent_since(0);
    // MIDI 1.0, table 3a: RPN 0 is the bend range, data entry its semitones, then its cents; then the null parameter, so
    // that a stray data entry changes nothing.
    let first = [
        "B0 65 00", "B0 64 00", "B0 06 0C", "B0 26 00", "B0 65 7F", "B0 64 7F",
    ];
    let begins = sent.iter().position(|message| message == first[0]);
    let begins = begins.expect("it is told");
    assert_eq!(sent[begins..begins + first.len()], first);
    assert!(
        sent[..begins]
            .iter()
            .all(|message| !message.starts_with('E'))
    );
    assert!(rig.now >= Time::START);
}

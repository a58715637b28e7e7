//! The end of a file leaves things as they ring; going away leaves a synth as a stranger would want it.

use super::{mpe, plain};
use crate::support::rig::Rig;
use crate::support::script::assert_heard;
use trued::engine::plan::Leave;
use trued::time::Time;

const HELD: &str = "10 on C4 90\n20 pedal down\n30 on E4 90\n40 off E4\n";

#[test]
fn the_end_of_a_file_is_note_offs_and_pedals_up_and_nothing_more() {
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        rig.play(HELD);
        let mark = rig.sent.len();
        rig.play("100 end\n9000 wait");
        let out = rig.sent_since(mark);
        let known =
            |m: &String| m.starts_with('8') || (m.starts_with('B') && m.ends_with(" 40 00"));
        assert!(!out.is_empty() && out.iter().all(known), "{out:?}");
        assert!(rig.heard().sounding().is_empty() && rig.heard().stuck().is_empty());
        assert!(rig.heard().moves.is_empty() && rig.heard().repeats.is_empty());
    }
}

#[test]
fn an_end_with_nothing_open_says_nothing() {
    let mut rig = Rig::ready(&plain());
    rig.play("10 on C4 90\n20 off C4");
    let mark = rig.sent.len();
    rig.play("30 end\n9000 wait");
    assert_eq!(rig.sent_since(mark), Vec::<String>::new());
}

#[test]
fn stopping_waits_for_the_last_tail_and_leaves_synths_plain() {
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        rig.play(HELD);
        rig.play("100 stop");
        assert!(rig.heard().sounding().is_empty(), "silenced at once");
        assert!(!rig.engine.report().stopped);
        rig.play("1590 wait");
        assert!(
            !rig.engine.report().stopped && rig.heard().moves.is_empty(),
            "the tails ring"
        );
        rig.play("1700 on A4 90\n2000 wait");
        assert!(rig.engine.report().stopped);
        let heard = rig.heard();
        assert!(heard.stuck().is_empty() && heard.moves.is_empty());
        assert_eq!(heard.zones(), [0, 0]);
        for channel in plan.synths[0].members.iter() {
            assert_eq!(
                (heard.bend_cents(channel), heard.range_cents(channel)),
                (0.0, 200.0),
                "channel {channel}"
            );
            assert!(heard.controller(channel, 64).is_none_or(|value| value == 0));
        }
        assert_eq!(heard.notes.len(), 2, "no note begins once stopping");
    }
}

#[test]
fn a_synth_to_be_left_as_is_is_only_silenced() {
    let mut plan = plain();
    plan.synths[0].leave = Leave::AsIs;
    let mut rig = Rig::ready(&plan);
    rig.play(HELD);
    let setups = rig.heard().setups;
    rig.until(Time::from_millis(90));
    assert_heard(&rig.play("100 stop\n3000 wait"), "100 60 ends\n100 64 ends");
    assert!(rig.engine.report().stopped);
    assert_eq!(rig.heard().setups, setups);
    assert_eq!(
        rig.heard().bend_cents(rig.heard().notes[0].channel).round(),
        10.0
    );
}

#[test]
fn with_nothing_sounding_it_stops_at_once() {
    let mut rig = Rig::ready(&plain());
    rig.play("5000 stop");
    assert!(rig.engine.report().stopped);
}

/// Whatever a guest has told: one word brings the evening back as it was, and the synths are left as a stranger wants them.
/// (That nothing is written into the stage file is told where the daemon is: `remembered::daemon`.)
#[test]
fn n17_a_guest_leaves_no_trace() {
    let mut rig = Rig::of(
        "keyboards: {keys: {port: virtual}}\nsynths: {synth: {port: virtual, bend_range: 12, tail_ms: 0}}\n\
         tunings: {just: {like: five-limit-scale, also: {E: {high: 81/64}}}}\n\
         set: [{song: One, tuning: just}, {song: Two}]\n",
    );
    let c_and_e = |rig: &mut Rig, at: u64| {
        rig.play(&format!(
            "{at} on C4 90\n{at} on E4 90\n{} off C4\n{} off E4",
            at + 10,
            at + 10
        ));
        let notes = &rig.heard().notes;
        [&notes[notes.len() - 2], &notes[notes.len() - 1]].map(|note| note.onset_cents())
    };
    let at_first = c_and_e(&mut rig, 10);
    rig.play(
        "100 tell inflect E high\n110 tell tonic D pivot\n120 tell pitch +7 c\n130 tell transpose +2\n140 tell song 2\n150 tell plain",
    );
    assert_ne!(c_and_e(&mut rig, 200), at_first);
    rig.play("300 tell fresh");
    assert_eq!(c_and_e(&mut rig, 400), at_first);
    rig.play("500 stop\n600 wait");
    assert!(rig.engine.report().stopped);
    for channel in (0..16).filter(|channel| *channel != 9) {
        let left = (
            rig.heard().bend_cents(channel),
            rig.heard().range_cents(channel),
        );
        assert_eq!(left, (0.0, 200.0), "channel {channel}");
    }
}

//! A song change: what sounds keeps its pitch, what begins takes the new tuning, and only what differs is sent.

use super::{mpe, plain};
use crate::support::rig::Rig;
use crate::support::script::assert_heard;
use trued::time::Time;

const SCRIPT: &str = "10 on C4 100
    10 on E4 100
    500 next
    600 on C5 100
    600 on E3 100
    700 off C4
    700 off E4
    900 on C4 100";

#[test]
fn a_ringing_chord_keeps_its_pitch_on_a_plain_synth() {
    assert_heard(
        &Rig::ready(&plain()).play(SCRIPT),
        "10 60 sounds 6010.0
         10 64 sounds 6386.0
         600 72 sounds 7200.0
         600 52 sounds 5200.0
         700 60 ends
         700 64 ends
         900 60 sounds 6000.0",
    );
}

#[test]
fn a_ringing_chord_keeps_its_pitch_in_an_mpe_zone() {
    // In steps of 0.586 cents.
    assert_heard(
        &Rig::ready(&mpe()).play(SCRIPT),
        "10 60 sounds 6010.0
         10 64 sounds 6385.9
         600 72 sounds 7200.0
         600 52 sounds 5200.0
         700 60 ends
         700 64 ends
         900 60 sounds 6000.0",
    );
}

#[test]
fn nothing_is_sent_for_a_song_change_while_something_sounds() {
    let mut rig = Rig::ready(&plain());
    rig.play("10 on C4 100");
    let mark = rig.sent.len();
    rig.play("500 song 2\n600 song 1\n700 song 2\n800 wait");
    assert_eq!(rig.sent_since(mark), Vec::<String>::new());
    assert_eq!(rig.engine.report().song, 1);
}

#[test]
fn set_up_is_said_again_once_the_tails_have_died() {
    for plan in [plain(), mpe()] {
        let mut rig = Rig::ready(&plan);
        let setups = rig.heard().setups;
        rig.play("10 on C4 100\n500 next\n1000 off C4\n2400 wait");
        assert_eq!(rig.heard().setups, setups, "its tail of 1500 ms rings");
        rig.until(Time::from_millis(2600));
        assert_eq!(rig.heard().setups, 2 * setups);
        assert_eq!(rig.heard().zones_while_sounding, 0);
    }
}

#[test]
fn songs_beyond_the_set_are_ignored_and_counted() {
    let mut rig = Rig::ready(&plain());
    rig.play("10 song 9\n20 back\n1000 next\n2000 next");
    let report = rig.engine.report();
    assert_eq!((report.song, report.counters.ignored), (1, 3));
}

#[test]
fn a_second_press_of_next_within_400_ms_is_a_bounce() {
    let mut rig = Rig::ready(&plain());
    rig.play("10 next\n300 back");
    assert_eq!(rig.engine.report().song, 1);
    rig.play("500 back");
    assert_eq!(rig.engine.report().song, 0);
}

//! The player's wheel: what it means, where it goes, and that it never changes what a key is tuned to.

use super::{mpe, plain, two_songs};
use crate::support::rig::Rig;
use crate::support::script::assert_heard;
use trued::engine::plan::Dialect;

#[test]
fn n08_the_wheel_adds_to_the_tuning_of_what_sounds_and_of_what_comes() {
    let plan = two_songs(Dialect::ChannelBend, 12);
    assert_heard(
        &Rig::ready(&plan).play(
            "10 on C4 100
             20 on A4 100
             100 wheel 12288
             200 on D4 100
             300 wheel 8192",
        ),
        "10 60 sounds 6010.0
         20 69 sounds 6900.0
         100 60 moves to 6110.0
         100 69 moves to 7000.0
         200 62 sounds 6300.0
         300 60 moves to 6010.0
         300 69 moves to 6900.0
         300 62 moves to 6200.0",
    );
}

/// A melody over another player's drone, and drums beside them: the wheel and the pressure of the one reach her notes alone.
#[test]
fn n08_what_one_player_bends_and_presses_is_no_business_of_another_part() {
    for dialect in ["channel-bend", "mpe"] {
        let mut rig = Rig::of(&format!(
            "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
             synths: {{organ: {{port: virtual, dialect: {dialect}, bend_range: 12}}, kit: {{port: virtual}}}}\n\
             parts: [{{from: keys, to: organ}}, {{from: pads, to: organ}}, {{from: pads, keys: C1, to: kit, tune: no}}]\n\
             set: [{{song: One, tuning: quarter-comma-meantone}}]\n"
        ));
        rig.play("10 second on D3 90\n20 on D4 90\n30 second on C1 90\n40 wheel 12288\n50 send D0 50\n60 wheel 0");
        let notes = &rig.heard().notes;
        let (drone, melody) = (&notes[0], &notes[1]);
        assert_eq!(drone.pitch.len(), 1, "{dialect}: {:?}", drone.pitch);
        let path: Vec<f64> = melody
            .pitch
            .iter()
            .map(|(_, cents)| cents - melody.onset_cents())
            .collect();
        for (heard, wanted) in path.iter().zip([0.0, 100.0, -200.0]) {
            assert!((heard - wanted).abs() < 0.08, "{dialect}: {path:?}");
        }
        assert_eq!(path.len(), 3, "{dialect}: {path:?}");
        let pressure = |channel| rig.heard().pressure(channel);
        assert_eq!(
            (pressure(drone.channel), pressure(melody.channel)),
            (0, 0x50),
            "{dialect}"
        );
        assert!(
            rig.receivers[1]
                .notes
                .iter()
                .all(|note| note.pitch.len() == 1)
        );
    }
}

#[test]
fn under_mpe_the_wheel_is_the_manager_s() {
    let mut rig = Rig::ready(&mpe());
    let heard = rig.play("10 on A4 100\n100 wheel 12288\n200 off A4\n300 wheel 8192");
    assert_heard(
        &heard,
        "10 69 sounds 6900.0
         100 69 moves to 7000.0
         200 69 ends
         300 69 moves to 6900.0",
    );
    assert_eq!(rig.heard().bend_cents(0), 0.0);
}

#[test]
fn bend_range_from_the_keyboard_says_what_the_wheel_means_and_goes_no_further() {
    // RPN 0 (MIDI 1.0 p. 18): seven semitones, on synths of range 12.
    for dialect in [Dialect::ChannelBend, Dialect::Mpe { manager: 0 }] {
        let plan = two_songs(dialect, 12);
        let mut rig = Rig::ready(&plan);
        let heard = rig.play(
            "10 on A4 100
             20 send B0 65 00 64 00 06 07 26 00 65 7F 64 7F
             30 wheel 0
             40 wheel 8192",
        );
        assert_heard(
            &heard,
            "10 69 sounds 6900.0
             30 69 moves to 6200.0
             40 69 moves to 6900.0",
        );
        for member in 1..9 {
            assert_eq!(rig.heard().range_cents(member), 1200.0);
        }
    }
}

#[test]
fn data_entry_on_the_null_parameter_changes_nothing() {
    // GM2 3.4.5.
    let mut rig = Rig::ready(&plain());
    let mark = rig.sent.len();
    rig.play("10 send B0 65 7F 64 7F 06 0C 26 00");
    assert_eq!(rig.sent_since(mark), Vec::<String>::new());
}

#[test]
fn a_wheel_that_does_not_move_says_nothing() {
    let mut rig = Rig::ready(&plain());
    rig.play("10 on A4 100\n20 wheel 9000");
    let mark = rig.sent.len();
    rig.play("30 wheel 9000");
    assert_eq!(rig.sent_since(mark), Vec::<String>::new());
}

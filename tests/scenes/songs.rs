//! A song change: what sounds keeps its pitch, what begins takes the new tuning, and only what differs is sent.

use super::{mpe, plain};
use crate::support::published::FIVE_TUNINGS;
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

/// All twelve keys from C4, by the published figures of the tuning in this place of the set.
fn sounds_whole(rig: &mut Rig, place: usize) {
    let tuning = &FIVE_TUNINGS[place];
    let before = rig.heard().notes.len();
    for key in 60..72 {
        rig.midi(0, &[0x90, key, 90]);
        rig.midi(0, &[0x80, key, 64]);
    }
    for (key, note) in (60..72).zip(&rig.heard().notes[before..]) {
        let (heard, wanted) = (note.onset_cents(), tuning.key_cents(key));
        assert!(
            (heard - wanted).abs() < 0.0123,
            "{key} of {}: {heard}, not {wanted}",
            tuning.name
        );
    }
}

#[test]
fn n02_a_whole_tuning_is_recalled_in_one_action_in_concert_order() {
    let songs = FIVE_TUNINGS
        .iter()
        .map(|tuning| format!("{{song: In {0}, tuning: {0}}}", tuning.name));
    let mut rig = Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}}}\nsynths: {{synth: {{port: virtual}}}}\nset: [{}]\n\
         cues: [{{when: {{controller: 82}}, do: next}}, {{when: {{controller: 83}}, do: back}}, \
         {{when: {{program: any, channel: 16}}, do: song}}]\n",
        songs.collect::<Vec<String>>().join(", ")
    ));
    sounds_whole(&mut rig, 0);
    for (action, place) in [
        ("cc 82 127", 1),
        ("cc 82 127", 2),
        ("cc 83 127", 1),
        ("send CF 04", 4),
        ("send CF 00", 0),
        ("tell song 4", 3),
        ("tell next", 4),
    ] {
        let at = rig.now.nanos() / 1_000_000 + 500;
        let mark = rig.sent.len();
        rig.play(&format!("{at} {action}"));
        // Nothing is sent for the change itself: bends come with the notes that need them.
        let bends = rig
            .sent_since(mark)
            .iter()
            .filter(|m| m.starts_with('E'))
            .count();
        assert_eq!(bends, 0, "{action}");
        assert_eq!(rig.engine.report().song as usize, place, "{action}");
        sounds_whole(&mut rig, place);
        rig.play(&format!("{} cc 82 0\n{} cc 83 0", at + 10, at + 10));
    }
}

/// The same song twice in a set: each time as it begins, and `next` goes on from the second one.
#[test]
fn the_same_song_twice_begins_anew_and_goes_on_from_where_it_stands() {
    let mut rig = Rig::of(
        "keyboards: {keys: {port: virtual}}\nsynths: {synth: {port: virtual, tail_ms: 0}}\n\
         tunings: {crooked: {like: equal-12, change: {C: +10 c}, also: {C: {high: 30 c}}}}\n\
         songs: {Hymn: {tuning: crooked, pitch: A4 = 440 Hz}, Ballad: , Last: }\nset: [Hymn, Ballad, Hymn, Last]\n",
    );
    let c4 = |rig: &mut Rig, at: u64| {
        rig.play(&format!("{at} on C4 90\n{} off C4", at + 10));
        rig.heard()
            .notes
            .last()
            .expect("a note")
            .onset_cents()
            .round()
    };
    assert_eq!(c4(&mut rig, 10), 6010.0);
    rig.play("100 tell inflect C +5 c");
    assert_eq!(c4(&mut rig, 110), 6015.0);
    rig.play("500 next");
    assert_eq!(c4(&mut rig, 510), 6000.0);
    rig.play("1000 next");
    assert_eq!(
        c4(&mut rig, 1010),
        6010.0,
        "what was told in the first place is over"
    );
    rig.play("1500 next");
    assert_eq!(rig.engine.report().song, 3);
    rig.play("2000 tell song Hymn");
    assert_eq!(
        rig.engine.report().song,
        0,
        "by title, the first of the two"
    );
}

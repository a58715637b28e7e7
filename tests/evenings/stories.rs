//! What each example teaches, as its comments say it.

use super::config;
use crate::support::charts::Chart;
use crate::support::rig::Rig;

/// What was sounded by the latest note, in cents.
fn last(rig: &Rig) -> f64 {
    rig.heard().notes.last().expect("a note").onset_cents()
}

/// No note ever moved, and none is stuck.
fn all_stayed(rig: &Rig) {
    let heard = rig.heard();
    assert!(heard.moves.is_empty(), "{:?}", heard.moves);
    assert!(heard.stuck().is_empty() && heard.orphans.is_empty());
}

fn near(heard: f64, wanted: f64) {
    assert!((heard - wanted).abs() < 0.0123, "{heard}, not {wanted}");
}

fn near_between(heard: f64, wanted: f64) {
    assert!((heard - wanted).abs() < 0.0245, "{heard}, not {wanted}");
}

/// From one note to another, by their places among all that were struck.
fn interval(rig: &Rig, low: usize, high: usize) -> f64 {
    let notes = &rig.heard().notes;
    notes[high].onset_cents() - notes[low].onset_cents()
}

/// 415 Hz is 101.27 cents below 440. A meantone third is 386.314, its wolf 427.373 (Ratte 1991, p. 153).
#[test]
fn evensong_by_reference_and_by_transposition() {
    let path = config("evensong.yaml");
    let mut rig = Rig::of_file(&path);
    rig.play("10 on A4 90\n100 off A4\n200 on G4 90\n210 on B4 90\n300 off G4\n310 off B4");
    near(
        rig.heard().notes[0].onset_cents(),
        6900.0 + 1200.0 * (415f64 / 440.0).log2(),
    );
    near_between(interval(&rig, 1, 2), 386.314);
    rig.play(
        "2000 cc 82 127\n2010 cc 82 0\n2100 on G4 90\n2110 on B4 90\n2200 off G4\n2210 off B4",
    );
    near_between(interval(&rig, 3, 4), 427.373);
    // What G plays now is the F# of the chart.
    near(
        rig.heard().notes[3].onset_cents(),
        Chart::of(&path, "Lamp hymn a semitone down").cents(66),
    );
    all_stayed(&rig);
}

/// Ab lies 128/125 = 41.059 cents above G#, and Eb as much above D#.
#[test]
fn evensong_a_black_key_is_two_notes() {
    let path = config("evensong.yaml");
    let chart = Chart::of(&path, "Long canzona");
    let mut rig = Rig::of_file(&path);
    rig.play("0 song 3\n10 on G#4 90\n20 cc 67 127\n30 on Ab3 90");
    near(rig.heard().notes[0].onset_cents(), chart.cents(68));
    near(last(&rig), chart.cents(56) + 41.059);
    rig.play("40 cc 67 0\n50 off G#4\n60 on G#4 90");
    near(last(&rig), chart.cents(68));
    rig.play("70 cc 69 127\n80 on Eb4 90");
    near(last(&rig), chart.cents(63) - 41.059);
    rig.play("90 cc 69 0\n100 off Eb4\n110 off G#4\n120 off Ab3\n130 on Eb4 90\n140 off Eb4");
    near(last(&rig), chart.cents(63));
    all_stayed(&rig);
}

/// 5/4, 3/2, 7/4 and 16/9, 9/5 by their ratios; half a step at range 12 is 0.073 cents, for two notes twice that.
#[test]
fn close_harmony_is_pure_in_every_key_and_the_seventh_when_it_is_asked_for() {
    let ratio = |over: f64, under: f64| 1200.0 * (over / under).log2();
    let near =
        |heard: f64, wanted: f64| assert!((heard - wanted).abs() < 0.147, "{heard}, {wanted}");
    for song in 1..=3 {
        for root in 48..60u8 {
            let mut rig = Rig::of_file(&config("close-harmony.yaml"));
            rig.play(&format!("0 song {song}"));
            let keys = [root, root + 4, root + 7, root + 10];
            let chord: Vec<u8> = keys.iter().flat_map(|key| [0x90, *key, 90]).collect();
            rig.midi(0, &chord);
            near(interval(&rig, 0, 1), ratio(5.0, 4.0));
            near(interval(&rig, 0, 2), ratio(3.0, 2.0));
            let seventh = interval(&rig, 0, 3);
            match song {
                3 => near(seventh, ratio(7.0, 4.0)),
                _ => assert!(seventh > 990.0, "{seventh} is no plain seventh"),
            }
        }
    }
    let mut rig = Rig::of_file(&config("close-harmony.yaml"));
    rig.play("0 cc 67 127\n10 chord G3 B3 D4 F4\n20 wait");
    near(interval(&rig, 0, 3), ratio(7.0, 4.0));
    rig.play("900 off G3\n900 off B3\n900 off D4\n900 off F4\n910 cc 67 0\n6000 chord G3 B3 D4 F4\n6010 wait");
    assert!(interval(&rig, 4, 7) > 990.0);
    rig.play("6500 off G3\n6500 off B3\n6500 off D4\n6500 off F4");
    assert!(rig.heard().stuck().is_empty() && rig.heard().orphans.is_empty());
}

/// What the pedal of the example is for: the root stays while what stands over it changes.
#[test]
fn close_harmony_keeps_a_root_that_is_held() {
    let mut rig = Rig::of_file(&config("close-harmony.yaml"));
    let root = |rig: &Rig| rig.engine.report().standing.chord.root;
    rig.play("10 chord C3 E4 G4\n500 cc 69 127\n600 off E4\n600 off G4\n600 chord F4 A4\n700 wait");
    assert_eq!(root(&rig), Some(0));
    rig.play("1000 cc 69 0\n1100 off F4\n1100 off A4\n1100 chord F4 A4\n1200 wait");
    assert_eq!(root(&rig), Some(5));
    rig.play("1300 off C3\n1300 off F4\n1300 off A4");
    assert!(rig.heard().stuck().is_empty() && rig.heard().orphans.is_empty());
}

/// E at home is 145 cents above D, natural 9/8 (203.910), flat 90; G flat 400; B at home 850, natural 27/16 (905.865).
#[test]
fn maqam_by_pads_by_turns_by_ear_and_by_the_line() {
    let path = config("maqam.yaml");
    let d4 = 6900.0 + 1200.0 * (293.66f64 / 440.0).log2();
    let mut rig = Rig::of_file(&path);
    // A pad under a held note: what sounds stays, what comes is natural, and then B is half-flat again.
    rig.play("10 on B4 90\n20 second on C2 90\n30 on B5 90");
    near(rig.heard().notes[0].onset_cents(), d4 + 850.0);
    near(last(&rig), d4 + 1200.0 + 905.865);
    rig.play("40 second off C2\n50 off B4\n60 off B5\n70 on B4 90\n80 off B4");
    near(last(&rig), d4 + 850.0);
    // Two things at once: a turn that is latched, another that is held.
    rig.play("100 second on D2 90\n110 second off D2\n120 on G4 90\n130 off G4");
    near(last(&rig), d4 + 400.0);
    rig.play("140 second on E2 90\n150 on E4 90\n160 off E4");
    near(last(&rig), d4 + 90.0);
    rig.play("170 second off E2\n180 on E4 90\n190 off E4");
    near(last(&rig), d4 + 145.0);
    // To the singer, and home.
    rig.play("200 second on G2 90\n210 second off G2\n220 second on G2 90\n230 second off G2\n240 on E4 90\n250 off E4");
    near(last(&rig), d4 + 155.0);
    rig.play("260 second on F2 90\n270 second off F2\n280 on E4 90\n290 off E4\n300 on G4 90\n310 off G4");
    near(
        rig.heard().notes[rig.heard().notes.len() - 2].onset_cents(),
        d4 + 145.0,
    );
    near(last(&rig), d4 + 498.045);
    // The longa begins with B natural, and its E goes by the line.
    rig.play("1000 cc 82 127\n1010 cc 82 0\n2000 on B4 90\n2010 off B4");
    near(last(&rig), d4 + 905.865);
    rig.play("2700 on D4 90\n2800 on E4 90\n2810 off D4\n2820 off E4");
    near(last(&rig), d4 + 203.910);
    rig.play("2900 on F4 90\n2950 on E4 90\n2960 off F4\n2970 off E4");
    near(last(&rig), d4 + 145.0);
    all_stayed(&rig);
    assert_eq!(rig.engine.report().counters.ignored, 0);
}

/// 9/8 is 203.910, 3/2 is 701.955; the comma between 9/8 and 10/9 is 21.506.
#[test]
fn tonic_by_pedal_and_next_key_and_the_low_second() {
    let path = config("tonic.yaml");
    let mut rig = Rig::of_file(&path);
    rig.play("0 song 2\n10 on C4 90\n20 off C4\n30 second on D2 90\n40 on D4 90\n50 off D4\n60 second off D2\n70 on D4 90\n80 off D4");
    near_between(interval(&rig, 0, 1), 203.910 - 21.506);
    near_between(interval(&rig, 0, 2), 203.910);
    // The key struck under the pedal is silent; D stays where it was, and A is now a pure fifth above it.
    rig.play("100 cc 67 127\n110 on D4 90\n120 off D4\n130 cc 67 0\n140 on D4 90\n150 on A4 90\n160 off D4\n170 off A4");
    assert_eq!(rig.heard().notes.len(), 5);
    near_between(interval(&rig, 2, 3), 0.0);
    near_between(interval(&rig, 3, 4), 701.955);
    rig.play("200 second on C2 90\n210 second off C2\n220 on A4 90\n230 off A4");
    near(last(&rig), Chart::of(&path, "Motet in C").cents(69));
    all_stayed(&rig);
}

#[test]
fn two_manuals_need_two_bends_and_drums_none() {
    let mut rig = Rig::of_file(&config("two-manuals.yaml"));
    for key in 40..88u8 {
        rig.midi(0, &[0x90, key, 90]);
        rig.midi(1, &[0x90, key, 90]);
        rig.midi(0, &[0x80, key, 64]);
        rig.midi(1, &[0x80, key, 64]);
    }
    rig.midi(1, &[0x99, 35, 100]);
    rig.midi(1, &[0x89, 35, 64]);
    let mut channels: Vec<u8> = rig.heard().notes.iter().map(|note| note.channel).collect();
    channels.sort_unstable();
    channels.dedup();
    assert_eq!(channels.len(), 2, "one channel for each manual");
    for pair in rig.heard().notes.chunks(2) {
        near_coarse(pair[1].onset_cents() - pair[0].onset_cents(), 50.0);
    }
    assert_eq!(rig.receivers[1].notes.len(), 1);
    assert_eq!(rig.receivers[1].notes[0].onset_cents(), 3500.0);
}

/// Half a step at range 48 is 0.293 cents.
fn near_coarse(heard: f64, wanted: f64) {
    assert!((heard - wanted).abs() < 0.587, "{heard}, not {wanted}");
}
